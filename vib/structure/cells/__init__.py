"""Cells of a mesh: one file per family, and this index of them by kind.

Solids (three freedoms per node) and shells (six). Kinds and node numbering are those of meshio (and VTK).
Rooms: `family` what each offers; `solid` all isoparametric solids, with `polynomial` and `quadrature` beneath
them; `triangle` the shell facet, from `membrane`, `bending` and `facet`, and `split` the shells made of it;
`checks` cells that can't be computed; `surplus` the shape functions that solids lack, by `edges` and faces.
"""

from __future__ import annotations

from vib.structure.cells.checks import check_cells
from vib.structure.cells.family import Family, Properties, Stresses
from vib.structure.cells.hexahedron import Hexahedron
from vib.structure.cells.hexahedron20 import Hexahedron20
from vib.structure.cells.hexahedron27 import Hexahedron27
from vib.structure.cells.pyramid import Pyramid
from vib.structure.cells.pyramid13 import Pyramid13
from vib.structure.cells.quad import Quad
from vib.structure.cells.quad8 import Quad8
from vib.structure.cells.quad9 import Quad9
from vib.structure.cells.tetra import Tetra
from vib.structure.cells.tetra10 import Tetra10
from vib.structure.cells.triangle import Triangle
from vib.structure.cells.triangle6 import Triangle6
from vib.structure.cells.wedge import Wedge
from vib.structure.cells.wedge15 import Wedge15

FAMILIES: dict[str, Family] = {
    family.kind: family
    for family in (
        Tetra(),
        Tetra10(),
        Hexahedron(),
        Hexahedron20(),
        Hexahedron27(),
        Wedge(),
        Wedge15(),
        Pyramid(),
        Pyramid13(),
        Triangle(),
        Triangle6(),
        Quad(),
        Quad8(),
        Quad9(),
    )
}

__all__ = ["FAMILIES", "Family", "Properties", "Stresses", "check_cells"]
