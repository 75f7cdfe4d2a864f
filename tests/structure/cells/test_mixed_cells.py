"""Cells of different families side by side: no gaps, no spurious forces."""

import numpy as np
import pytest
from scipy.sparse.linalg import spsolve

from tests.structure.cells.meshes import bricks
from vib.structure.cells import FAMILIES, Properties, check_cells
from vib.structure.cells.solid import Solid
from vib.structure.sparsity import Group, assemble

MATERIAL = Properties(youngs_modulus=7.0, poissons_ratio=0.3, density=1.0)
FACES = [[0, 1, 2, 3], [4, 7, 6, 5], [0, 4, 5, 1], [1, 5, 6, 2], [2, 6, 7, 3], [3, 7, 4, 0]]
SECOND = {"hexahedron": "hexahedron20", "wedge": "wedge15", "pyramid": "pyramid13", "tetra": "tetra10"}


def corner_mesh() -> tuple[np.ndarray, dict[str, np.ndarray]]:
    """2 x 2 x 2 distorted bricks: five whole, two of wedges, one of pyramids with one cut into tetrahedra."""
    nodes, cells = bricks((2, 2, 2))
    nodes = nodes + np.random.default_rng(8).uniform(-0.06, 0.06, size=nodes.shape)
    centre = len(nodes)
    nodes = np.vstack([nodes, nodes[cells[0]].mean(axis=0)])
    pyramids = np.array([[*cells[0][face], centre] for face in FACES])
    # an outer face: node 0 of the block belongs to three faces on its outside
    outer, inner = pyramids[0], pyramids[1:]
    a, b, c, d, top = outer
    tetrahedra = np.array([[a, b, c, top], [a, c, d, top]])
    sides = cells[[6, 7]]
    wedges = np.vstack([sides[:, [0, 1, 2, 4, 5, 6]], sides[:, [0, 2, 3, 4, 6, 7]]])
    return nodes, {"hexahedron": cells[1:6], "wedge": wedges, "pyramid": inner, "tetra": tetrahedra}


def second_order(nodes: np.ndarray, kinds: dict[str, np.ndarray]) -> tuple[np.ndarray, dict[str, np.ndarray]]:
    places = {}
    for kind, cells in kinds.items():
        first, second = FAMILIES[kind], FAMILIES[SECOND[kind]]
        assert isinstance(first, Solid)
        assert isinstance(second, Solid)
        places[SECOND[kind]] = first.shape(second.reference * (1 - 1e-13)) @ nodes[cells]
    flat = np.vstack([place.reshape(-1, 3) for place in places.values()])
    _, kept, number = np.unique(np.round(flat, 7), axis=0, return_index=True, return_inverse=True)
    numbers = np.split(
        number.ravel(), np.cumsum([place.shape[0] * place.shape[1] for place in places.values()])
    )
    return flat[kept], {
        kind: part.reshape(place.shape[:2])
        for (kind, place), part in zip(places.items(), numbers, strict=False)
    }


@pytest.mark.parametrize("order", [1, 2])
def test_constant_stress_through_a_mixed_patch(order: int) -> None:
    """Outside given, inside solved for: the linear field comes out (B. M. Irons' patch test)."""
    nodes, kinds = corner_mesh()
    if order == 2:
        nodes, kinds = second_order(nodes, kinds)
    for kind, cells in kinds.items():
        check_cells(FAMILIES[kind], nodes[cells])
    groups = [Group(FAMILIES[kind], cells, MATERIAL) for kind, cells in kinds.items()]
    assembly = assemble(nodes, groups)
    assert assembly.pattern.size == 3 * len(nodes)
    inside = _inside(len(nodes), kinds)
    # the middle of the block and of the pyramids; with the edges that meet there and the wedges' common one
    assert inside.sum() == (2 if order == 1 else 2 + 6 + 8 + 1)
    field = (nodes @ np.array([[0.3, -0.2, 0.5], [0.1, 0.4, -0.6], [0.7, 0.2, -0.1]])).ravel()
    free = np.repeat(inside, 3)
    matrix = assembly.stiffness
    found = spsolve(matrix[free][:, free].tocsc(), -matrix[free][:, ~free] @ field[~free])
    np.testing.assert_allclose(found, field[free], atol=1e-12)


def _inside(count: int, kinds: dict[str, np.ndarray]) -> np.ndarray:
    """Nodes on no outer face; a face that two cells share is not outer."""
    faces: dict[tuple[int, ...], set[int]] = {}
    seen: dict[tuple[int, ...], int] = {}
    for kind, cells in kinds.items():
        family = FAMILIES[kind]
        assert isinstance(family, Solid)
        for cell in cells:
            for face in _face_nodes(family):
                key = tuple(sorted(int(node) for node in cell[face[face < family.corners]]))
                seen[key] = seen.get(key, 0) + 1
                faces.setdefault(key, set()).update(int(node) for node in cell[face])
    inside = np.ones(count, dtype=bool)
    for key, nodes in faces.items():
        if seen[key] == 1:
            inside[list(nodes)] = False
    return inside


def _face_nodes(family: Solid) -> list[np.ndarray]:
    """Nodes of each plane face of the reference cell."""
    points = family.reference
    normals = [
        [1, 0, 0],
        [0, 1, 0],
        [0, 0, 1],
        [1, 1, 1],
        [1, 0, 1],
        [-1, 0, 1],
        [0, 1, 1],
        [0, -1, 1],
        [1, 1, 0],
    ]
    found: list[np.ndarray] = []
    for normal in normals:
        height = points @ normal
        for level in (height.min(), height.max()):
            face = np.flatnonzero(np.abs(height - level) < 1e-9)
            flat = points[face] - points[face].mean(axis=0)
            if np.linalg.matrix_rank(flat, tol=1e-9) == 2:
                found.append(face)
    return found
