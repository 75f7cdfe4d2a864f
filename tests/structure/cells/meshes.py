"""Meshes of the unit square and the unit cube for every family, and the modes of what stands on them."""

from itertools import permutations

import numpy as np
from scipy.sparse.linalg import eigsh

from vib.structure.cells import FAMILIES
from vib.structure.cells.solid import Solid
from vib.structure.sparsity import Assembly

Array = np.ndarray


def tetrahedra(counts: tuple[int, int, int]) -> tuple[Array, Array]:
    """Nodes of the unit cube and four-node cells: each brick cut into six tetrahedra (Kuhn's division)."""
    nodes, number = _lattice(counts)
    cells = []
    for order in permutations(range(3)):
        corner = [0, 0, 0]
        path = [_corner(number, corner)]
        for axis in order:
            corner[axis] = 1
            path.append(_corner(number, corner))
        if np.linalg.det(np.eye(3)[list(order)]) < 0:
            path[1], path[2] = path[2], path[1]
        cells.append(np.stack(path, axis=1))
    return nodes, np.vstack(cells)


def bricks(counts: tuple[int, int, int]) -> tuple[Array, Array]:
    """Nodes of the unit cube and eight-node cells."""
    nodes, number = _lattice(counts)
    corners = [(0, 0, 0), (1, 0, 0), (1, 1, 0), (0, 1, 0), (0, 0, 1), (1, 0, 1), (1, 1, 1), (0, 1, 1)]
    return nodes, np.stack([_corner(number, list(corner)) for corner in corners], axis=1)


def cube(kind: str, counts: tuple[int, int, int]) -> tuple[Array, Array]:
    """Nodes of the unit cube and cells of any solid kind."""
    if kind.startswith("tetra"):
        nodes, cells = tetrahedra(counts)
        return (nodes, cells) if kind == "tetra" else raised(nodes, cells, "tetra", kind)
    nodes, cells = bricks(counts)
    if kind.startswith("wedge"):
        cells = np.vstack([cells[:, [0, 1, 2, 4, 5, 6]], cells[:, [0, 2, 3, 4, 6, 7]]])
        return (nodes, cells) if kind == "wedge" else raised(nodes, cells, "wedge", kind)
    if kind.startswith("pyramid"):
        centre = len(nodes) + np.arange(len(cells))
        nodes = np.vstack([nodes, nodes[cells].mean(axis=1)])
        faces = [[0, 1, 2, 3], [4, 7, 6, 5], [0, 4, 5, 1], [1, 5, 6, 2], [2, 6, 7, 3], [3, 7, 4, 0]]
        cells = np.vstack([np.column_stack([cells[:, face], centre]) for face in faces])
        return (nodes, cells) if kind == "pyramid" else raised(nodes, cells, "pyramid", kind)
    return (nodes, cells) if kind == "hexahedron" else raised(nodes, cells, "hexahedron", kind)


def raised(nodes: Array, cells: Array, kind: str, to: str) -> tuple[Array, Array]:
    """Second-order cells in the place of first-order ones; nodes that coincide are merged."""
    first, second = FAMILIES[kind], FAMILIES[to]
    assert isinstance(first, Solid)
    assert isinstance(second, Solid)
    inside = second.reference * (1 - 1e-13)  # off the apex of pyramids
    places = (first.shape(inside) @ nodes[cells]).reshape(-1, 3)
    _, kept, place = np.unique(np.round(places, 6), axis=0, return_index=True, return_inverse=True)
    return places[kept], place.reshape(len(cells), -1)


def square(kind: str, across: int) -> tuple[Array, Array]:
    """Nodes of the unit square in z = 0 and quads or pairs of triangles, all cut along the same diagonal."""
    steps = np.linspace(0, 1, across + 1)
    x, y = np.meshgrid(steps, steps, indexing="ij")
    nodes = np.column_stack([x.ravel(), y.ravel(), np.zeros(x.size)])
    number = np.arange(len(nodes)).reshape(across + 1, across + 1)
    cells = np.stack([number[:-1, :-1], number[1:, :-1], number[1:, 1:], number[:-1, 1:]], axis=-1)
    cells = cells.reshape(-1, 4)
    return nodes, cells if kind == "quad" else np.vstack([cells[:, [0, 1, 2]], cells[:, [0, 2, 3]]])


def angular_frequencies(assembly: Assembly, held: Array, count: int, shift: float = 0.0) -> Array:
    """The lowest ones, rad/s; ``held`` (freedoms,) marks what can't move, ``shift`` is in (rad/s)^2."""
    free = ~held.ravel()
    stiffness = assembly.stiffness[free][:, free].tocsc()
    mass = assembly.mass[free][:, free].tocsc()
    start = np.random.default_rng(1).normal(size=stiffness.shape[0])
    squares = eigsh(stiffness, count, mass, sigma=shift, v0=start, return_eigenvectors=False)
    return np.asarray(np.sqrt(np.abs(np.sort(squares))))


def _lattice(counts: tuple[int, int, int]) -> tuple[Array, Array]:
    steps = [np.linspace(0, 1, count + 1) for count in counts]
    nodes = np.stack(np.meshgrid(*steps, indexing="ij"), axis=-1).reshape(-1, 3)
    return nodes, np.arange(len(nodes)).reshape([count + 1 for count in counts])


def _corner(number: Array, corner: list[int]) -> Array:
    along = [slice(1, None) if high else slice(None, -1) for high in corner]
    return np.asarray(number[tuple(along)].ravel())
