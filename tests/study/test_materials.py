"""The table of materials."""

import pytest

from vib.errors import ModelError
from vib.study.materials import MATERIALS, find_material

# What the standards print, entered once more and apart from the table (from memory): E in GPa, nu, kg/m^3.
# The ranges are those of EN 1561 (EN-GJL-250), EN 1563 (EN-GJS-400-18), EN 1992-1-1 table 3.1 and 3.1.3
# (secant modulus of 33 GPa for C30/37), EN 1993-1-1 3.2.6, EN 1993-1-4 2.1.3, EN 1999-1-1 3.2.5.
PRINTED = {
    "structural steel": ((210, 210), (0.3, 0.3), (7850, 7850)),
    "stainless steel": ((200, 200), (0.3, 0.3), (7900, 8000)),
    "grey cast iron": ((103, 118), (0.26, 0.26), (7200, 7200)),
    "ductile iron": ((169, 169), (0.275, 0.275), (7100, 7100)),
    "aluminium": ((70, 70), (0.3, 0.3), (2700, 2700)),
    "concrete": ((33, 33), (0.2, 0.2), (2400, 2500)),
}


def test_figures_are_those_of_the_standards():
    assert {material.name for material in MATERIALS} == set(PRINTED)
    for material in MATERIALS:
        modulus, ratio, density = PRINTED[material.name]
        assert modulus[0] * 1e9 <= material.youngs_modulus <= modulus[1] * 1e9
        assert ratio[0] <= material.poissons_ratio <= ratio[1]
        assert density[0] <= material.density <= density[1]
        assert "EN 1" in material.source
        assert "from memory" in material.source


def test_shear_modulus_of_steel():
    """EN 1993-1-1, 3.2.6: G is about 81 000 N/mm^2 (from memory)."""
    assert find_material("structural steel").shear_modulus == pytest.approx(81e9, rel=0.005)


@pytest.mark.parametrize(
    ("name", "found"),
    [
        ("Structural  Steel", "structural steel"),
        ("steel", "structural steel"),
        ("stainless-steel", "stainless steel"),
        ("GREY_CAST_IRON", "grey cast iron"),
        ("gray iron", "grey cast iron"),
        ("aluminum", "aluminium"),
        ("nodular iron", "ductile iron"),
    ],
)
def test_names_are_tolerant(name, found):
    assert find_material(name).name == found


def test_unknown_name_suggests_the_nearest():
    with pytest.raises(ModelError, match=r"no material is named 'alumnium'; did you mean aluminium"):
        find_material("alumnium")


def test_unknown_name_without_a_neighbour_lists_all():
    with pytest.raises(ModelError, match=r"'zz'; known: structural steel, .*concrete"):
        find_material("zz")
