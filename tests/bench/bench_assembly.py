"""Assembly of stiffness and mass of second-order tetrahedra: ours and scikit-fem's, on the same cells.

`compare(size)` times both in turn and refuses to give a ratio where the two matrices differ.
"""

from __future__ import annotations

import time
from dataclasses import dataclass
from importlib import import_module
from typing import Any

import numpy as np

from vib.structure.cells import FAMILIES, Properties
from vib.structure.sparsity import Group, assemble

STEEL = Properties(youngs_modulus=210e9, poissons_ratio=0.3, density=7850.0)
# cells across the section of a block of 3 : 1 : 1, and so about 11,000, 65,000 and 250,000 freedoms
ACROSS = {"s": 5, "m": 9, "l": 15}


@dataclass(frozen=True)
class Comparison:
    """Times in s for ``freedoms``; ``ratio`` is theirs over ours, None where scikit-fem is not installed."""

    freedoms: int
    ours_s: float
    theirs_s: float | None
    ratio: float | None


def block(across: int) -> tuple[np.ndarray, np.ndarray]:
    """Corner nodes and four-node cells of a block of 3 x 1 x 1 m, each brick cut into six tetrahedra."""
    counts = (3 * across, across, across)
    steps = [np.linspace(0, length, count + 1) for length, count in zip((3, 1, 1), counts, strict=True)]
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


def ours(nodes: np.ndarray, cells: np.ndarray) -> tuple[float, Any, Any]:
    """Seconds, stiffness and mass."""
    nodes, cells = second_order(nodes, cells)
    start = time.perf_counter()
    found = assemble(nodes, [Group(FAMILIES["tetra10"], cells, STEEL)])
    return time.perf_counter() - start, found.stiffness, found.mass


def theirs(nodes: np.ndarray, cells: np.ndarray) -> tuple[float, Any, Any]:
    """Seconds, stiffness and mass of scikit-fem; the mesh is not timed, the basis is part of the work."""
    skfem, helpers, elasticity = (
        import_module(name) for name in ("skfem", "skfem.helpers", "skfem.models.elasticity")
    )
    mesh = skfem.MeshTet(nodes.T.copy(), cells.T.copy())
    start = time.perf_counter()
    basis = skfem.Basis(mesh, skfem.ElementVector(skfem.ElementTetP2()), intorder=4)
    stiffness = elasticity.linear_elasticity(*elasticity.lame_parameters(210e9, 0.3)).assemble(basis)
    mass = skfem.BilinearForm(lambda u, v, w: 7850.0 * helpers.dot(u, v)).assemble(basis)
    return time.perf_counter() - start, stiffness, mass


def compare(size: str = "s") -> Comparison:
    """Both assemblies on one block; times are those of this machine as loaded now, so only the ratio counts.

    Raises
    ------
    AssertionError
        The matrices differ in size, mass or energy norm.
    """
    nodes, cells = block(ACROSS[size])
    seconds, stiffness, mass = ours(nodes, cells)
    try:
        other_seconds, other_stiffness, other_mass = theirs(nodes, cells)
    except ModuleNotFoundError:
        return Comparison(stiffness.shape[0], seconds, None, None)
    for one, other in ((stiffness, other_stiffness), (mass, other_mass)):
        assert one.shape == other.shape
        # the numbering differs; traces of the matrix and of its square do not
        np.testing.assert_allclose(one.diagonal().sum(), other.diagonal().sum(), rtol=1e-10)
        np.testing.assert_allclose(np.vdot(one.data, one.data), np.vdot(other.data, other.data), rtol=1e-10)
    return Comparison(stiffness.shape[0], seconds, other_seconds, other_seconds / seconds)


if __name__ == "__main__":
    import sys

    print(compare(sys.argv[1] if len(sys.argv) > 1 else "s"))
