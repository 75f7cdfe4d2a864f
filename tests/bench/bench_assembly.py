"""Assembly of stiffness and mass of second-order tetrahedra: ours and scikit-fem's, on the same cells."""

from __future__ import annotations

from importlib import import_module
from typing import Any

import numpy as np

from tests.bench.case import Case
from vib.structure.cells import FAMILIES, Properties
from vib.structure.sparsity import Group, assemble

STEEL = Properties(youngs_modulus=210e9, poissons_ratio=0.3, density=7850.0)
# cells across the section of a block of 3 : 1 : 1, and so about 11,000, 65,000 and 250,000 freedoms
ACROSS = {"s": 5, "m": 9, "l": 15}


def block(across: int) -> tuple[np.ndarray, np.ndarray]:
    """Corner nodes and four-node cells of a block of 3 x 1 x 1 m."""
    return bricks((3 * across, across, across), (3.0, 1.0, 1.0))


def bricks(
    counts: tuple[int, int, int], lengths: tuple[float, float, float]
) -> tuple[np.ndarray, np.ndarray]:
    """Corner nodes and four-node cells of a block, each of its bricks cut into six tetrahedra."""
    steps = [np.linspace(0, length, count + 1) for length, count in zip(lengths, counts, strict=True)]
    nodes = np.stack(np.meshgrid(*steps, indexing="ij"), axis=-1).reshape(-1, 3)
    number = np.arange(len(nodes)).reshape([count + 1 for count in counts])
    low, high = slice(None, -1), slice(1, None)
    diagonal = number[low, low, low].ravel(), number[high, high, high].ravel()
    ring = [
        number[index].ravel()
        for index in (
            (high, low, low),
            (high, high, low),
            (low, high, low),
            (low, high, high),
            (low, low, high),
            (high, low, high),
        )
    ]
    cells = [np.stack([diagonal[0], ring[k], ring[(k + 1) % 6], diagonal[1]], axis=1) for k in range(6)]
    return nodes, np.vstack(cells)


def second_order(nodes: np.ndarray, cells: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """The same cells with a node in the middle of each edge."""
    ends = np.sort(cells[:, [[0, 1], [1, 2], [2, 0], [0, 3], [1, 3], [2, 3]]], axis=2).reshape(-1, 2)
    _, kept, place = np.unique(ends @ [len(nodes), 1], return_index=True, return_inverse=True)
    return (
        np.vstack([nodes, nodes[ends[kept]].mean(axis=1)]),
        np.hstack([cells, len(nodes) + place.reshape(len(cells), 6)]),
    )


def ours(given: tuple[np.ndarray, np.ndarray]) -> list[float]:
    """Both matrices by our assembly."""
    nodes, cells = second_order(*given)
    found = assemble(nodes, [Group(FAMILIES["tetra10"], cells, STEEL)])
    return _summed(found.stiffness, found.mass)


def theirs(given: tuple[np.ndarray, np.ndarray]) -> list[float]:
    """Both matrices by scikit-fem; the basis is part of the work."""
    skfem, helpers, elasticity = (
        import_module(name) for name in ("skfem", "skfem.helpers", "skfem.models.elasticity")
    )
    nodes, cells = given
    mesh = skfem.MeshTet(nodes.T.copy(), cells.T.copy())
    basis = skfem.Basis(mesh, skfem.ElementVector(skfem.ElementTetP2()), intorder=4)
    stiffness = elasticity.linear_elasticity(*elasticity.lame_parameters(210e9, 0.3)).assemble(basis)
    mass = skfem.BilinearForm(lambda u, v, w: 7850.0 * helpers.dot(u, v)).assemble(basis)
    return _summed(stiffness, mass)


def _summed(stiffness: Any, mass: Any) -> list[float]:
    """The numbering differs; the traces of the matrices and the norms do not. Scaled alike."""
    scale = 1e11 / 7850.0
    return [
        stiffness.diagonal().sum(),
        scale * mass.diagonal().sum(),
        float(np.sqrt(np.vdot(stiffness.data, stiffness.data))),
        scale * float(np.sqrt(np.vdot(mass.data, mass.data))),
    ]


CASES = [
    Case(
        name="assembly",
        work="assembly of K and M, second-order tetrahedra",
        alternative="scikit-fem",
        prepare=lambda size: block(ACROSS[size]),
        ours=ours,
        theirs=theirs,
        rtol=1e-10,
        packages=("skfem",),
        theirs_sizes=("s", "m"),
    )
]
