"""Common materials: elastic constants and density, with where each figure comes from.

All figures are entered from memory of the standards named and are to be confirmed against the edition in
force; a study can override any of them.
"""

from __future__ import annotations

import difflib
from dataclasses import dataclass

from vib.errors import ModelError


@dataclass(frozen=True)
class MaterialData:
    """A material.

    ``youngs_modulus`` in Pa, ``poissons_ratio``, ``density`` in kg/m^3; ``source`` says in words where each
    figure comes from.
    """

    name: str
    youngs_modulus: float
    poissons_ratio: float
    density: float
    source: str

    @property
    def shear_modulus(self) -> float:
        """E / (2 (1 + nu)) in Pa: the material is isotropic."""
        return self.youngs_modulus / (2 * (1 + self.poissons_ratio))


_STEEL = MaterialData(
    "structural steel", 210e9, 0.30, 7850.0,
    "E and nu: EN 1993-1-1, 3.2.6; density: as EN 10210-2 and EN 10219-2 use for masses (from memory)",
)  # fmt: skip

MATERIALS: tuple[MaterialData, ...] = (
    _STEEL,
    MaterialData(
        "stainless steel", 200e9, 0.30, 7900.0,
        "E and nu: EN 1993-1-4, 2.1.3, austenitic grades; density: EN 10088-1, grade 1.4301 (from memory)",
    ),
    MaterialData(
        "grey cast iron", 110e9, 0.26, 7200.0,
        "EN 1561, annex on other properties, grade EN-GJL-250, E 103 to 118 GPa (from memory)",
    ),
    MaterialData(
        "ductile iron", 169e9, 0.275, 7100.0,
        "EN 1563, annex on other properties, grade EN-GJS-400-18 (from memory)",
    ),
    MaterialData(
        "aluminium", 70e9, 0.30, 2700.0,
        "EN 1999-1-1, 3.2.5 (from memory)",
    ),
    MaterialData(
        "concrete", 33e9, 0.20, 2500.0,
        "E (secant) and nu: EN 1992-1-1, table 3.1, C30/37, and 3.1.3, uncracked; density: EN 1991-1-1 "
        "table A.1, reinforced, 25 kN/m^3 (from memory)",
    ),
)  # fmt: skip

_OTHER_NAMES = {
    "steel": "structural steel",
    "cast iron": "grey cast iron",
    "gray cast iron": "grey cast iron",
    "grey iron": "grey cast iron",
    "gray iron": "grey cast iron",
    "ductile cast iron": "ductile iron",
    "nodular iron": "ductile iron",
    "aluminum": "aluminium",
}


def find_material(name: str) -> MaterialData:
    """The material of that name; case, hyphens, underscores and extra spaces do not matter.

    Raises
    ------
    ModelError
        No such material; the message suggests the nearest names.
    """
    known = {material.name: material for material in MATERIALS}
    plain = " ".join(name.lower().replace("_", " ").replace("-", " ").split())
    plain = _OTHER_NAMES.get(plain, plain)
    if plain in known:
        return known[plain]
    near = difflib.get_close_matches(plain, [*known, *_OTHER_NAMES], n=3)
    hint = f"did you mean {' or '.join(near)}?" if near else f"known: {', '.join(known)}"
    raise ModelError(
        f"no material is named {name!r}; {hint} "
        "Or give youngs_modulus, poissons_ratio and density under a name of your own"
    )
