"""Frequencies of cubes, blocks and thick plates of solids against converged and closed-form values.

All in units of the side and the shear modulus: Omega = omega a sqrt(density / shear modulus).
"""

import numpy as np
import pytest

from tests.structure.cells.meshes import angular_frequencies, cube
from vib.structure.cells import FAMILIES, Properties
from vib.structure.sparsity import Group, assemble

SHEAR_ONE = Properties(youngs_modulus=2.6, poissons_ratio=0.3, density=1.0)
SECOND_ORDER = ["tetra10", "hexahedron20", "hexahedron27", "wedge15", "pyramid13"]
FIRST_ORDER = ["tetra", "hexahedron", "wedge", "pyramid"]

# Free cube after six rigid modes; independent computation: Legendre Ritz series of total degree 18 and 20.
# The triplet 4.44288 = sqrt(2) pi is Lame's, exact (H. H. Demarest, J. Acoust. Soc. Am. 49 (1971) 768).
FREE_CUBE = [2.85605] * 2 + [3.84597] * 3 + [3.91125] * 3 + [4.44288] * 3 + [4.57278] * 3
# Cube clamped on one face: bending pair, torsion, axial, bending pair; independent computation, 4 digits.
CLAMPED_CUBE = [1.076, 1.076, 1.464, 2.573, 2.848, 2.848]


def assembled(kind, nodes, cells):
    return assemble(nodes, [Group(FAMILIES[kind], cells, SHEAR_ONE)])


@pytest.mark.parametrize("kind", SECOND_ORDER)
def test_free_cube(kind):
    """Within 0.5 % of converged values, rigid modes six and multiplicities complete."""
    across = 5 if kind in ("tetra10", "wedge15") else 4
    nodes, cells = cube(kind, (across,) * 3)
    found = angular_frequencies(
        assembled(kind, nodes, cells), np.zeros(3 * len(nodes), dtype=bool), 20, shift=-1.0
    )
    assert found[5] < 1e-5
    np.testing.assert_allclose(found[6:], FREE_CUBE, rtol=5e-3)


@pytest.mark.parametrize("kind", ["hexahedron20", "hexahedron27"])
def test_clamped_cube(kind):
    """Uniform cells of a quarter of the side: 0.9 % above the limit, for the clamped edge is singular."""
    nodes, cells = cube(kind, (4, 4, 4))
    held = np.repeat(nodes[:, 0] < 1e-9, 3)
    found = angular_frequencies(assembled(kind, nodes, cells), held, 6)
    np.testing.assert_allclose(found, CLAMPED_CUBE, rtol=9e-3)
    assert (found > np.array(CLAMPED_CUBE) * (1 - 5e-4)).all()  # from above, but for the four digits


@pytest.mark.parametrize(
    ("kind", "coarse", "order"),
    [(kind, 3 if kind == "tetra10" else 2, 4) for kind in SECOND_ORDER]
    + [(kind, 3, 2) for kind in FIRST_ORDER],
)
def test_frequencies_converge_at_the_theoretical_order(kind, coarse, order):
    """Cube between frictionless walls: shear modes at exactly sqrt(2) pi (closed form, sines and cosines).

    Elements of degree p err by h^(2p) (G. Strang, G. J. Fix, An Analysis of the Finite Element Method (1973),
    ch. 6); 0.5 is left for coarse meshes.
    """
    errors = []
    for across in (coarse, 2 * coarse):
        nodes, cells = cube(kind, (across,) * 3)
        held = (nodes < 1e-9) | (nodes > 1 - 1e-9)
        found = angular_frequencies(assembled(kind, nodes, cells), held, 3, shift=15.0)
        errors.append(np.mean(found) / (2**0.5 * np.pi) - 1)
    assert np.log2(errors[0] / errors[1]) > order - 0.5
    assert errors[1] > 0


@pytest.mark.parametrize(("kind", "counts"), [("hexahedron20", (8, 8, 2))])
@pytest.mark.parametrize(
    ("height", "expected"),
    [
        (0.1, [0.931499203, 2.22599265, 2.22599265, 3.4207286]),
        (0.2, [1.7103643, 3.75552368, 3.75552368, 5.44426717]),
    ],
)
def test_thick_plate(kind, counts, height, expected):
    """Simply supported plate of solids within 0.5 % of three-dimensional elasticity.

    Source: S. Srinivas, C. V. Joga Rao, A. K. Rao, J. Sound Vib. 12 (1970) 187-199; values recomputed from
    the Rayleigh-Lamb equation.
    """
    nodes, cells = cube(kind, counts)
    sides = [(nodes[:, axis] < 1e-9) | (nodes[:, axis] > 1 - 1e-9) for axis in range(2)]
    held = np.column_stack([sides[1], sides[0], sides[0] | sides[1]])
    assembly = assembled(kind, nodes * [1, 1, height], cells)
    found = angular_frequencies(assembly, held, 8)
    bending = [value for value in found if abs(value / np.pi % 1) > 0.01 or value < 3]
    # in-plane shear waves lie at whole multiples of pi and sqrt(2) pi, apart from the bending ones
    bending = [value for value in bending if abs(value - 2**0.5 * np.pi) > 0.01]
    np.testing.assert_allclose(bending[:4], expected, rtol=5e-3)


def test_first_order_tetrahedra_are_too_stiff_and_say_so():
    nodes, cells = cube("tetra", (4, 4, 4))
    held = np.zeros(3 * len(nodes), dtype=bool)
    stiff = angular_frequencies(assembled("tetra", nodes, cells), held, 20, -1.0)
    assert (stiff[6:] > 1.03 * np.array(FREE_CUBE)).all()
    assert "too stiff" in FAMILIES["tetra"].remark
    assert FAMILIES["tetra10"].remark == ""
