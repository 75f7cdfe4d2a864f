"""Modes of a cantilever block of second-order tetrahedra: ours, eigsh as it comes, a floor.

The block is that of `bench_assembly`, held at one end. The floor is one factorisation plus as many solves, in
blocks, as the search takes; ours has the proof that no mode is missing on top, a second factorisation.
"""

from __future__ import annotations

from dataclasses import dataclass
from importlib import import_module
from typing import Any

import numpy as np
import scipy.sparse as sparse
import scipy.sparse.linalg as sparse_linalg

from tests.bench.bench_assembly import ACROSS, STEEL, block, bricks, second_order
from tests.bench.case import Case
from vib.solve.backends import pardiso
from vib.solve.backends.choice import factor
from vib.solve.backends.fronts import Fronts
from vib.solve.lanczos import BLOCK, lowest_modes
from vib.structure.cells import FAMILIES
from vib.structure.sparsity import Group, assemble

COUNT = 20
SOLVES = 14  # blocks of BLOCK columns that COUNT modes of this block need at the least; the search takes 18


@dataclass(frozen=True, eq=False)
class Matrices:
    """Mass and stiffness of the held block."""

    mass: Any
    stiffness: Any


def held(given: tuple[np.ndarray, np.ndarray]) -> Matrices:
    """Matrices by our assembly, without the freedoms of the held end."""
    nodes, cells = second_order(*given)
    found = assemble(nodes, [Group(FAMILIES["tetra10"], cells, STEEL)])
    keep = np.flatnonzero(np.repeat(nodes[:, 0] > 0, 3))
    mass, stiffness = (sparse.csr_array(m)[keep][:, keep] for m in (found.mass, found.stiffness))
    return Matrices(mass, stiffness)


def prepared(size: str) -> Matrices:
    """The matrices; their assembly is not timed here."""
    return held(block(ACROSS[size]))


def _summed(values: Any) -> list[float]:
    """Angular frequencies over the first one, and that one."""
    angular = np.sqrt(np.sort(values))
    return [float(angular[0]), *(angular[1:] / angular[0]).tolist()]


def ours(given: Matrices) -> list[float]:
    """The lowest modes, proved complete, by the best library at hand."""
    return _summed(lowest_modes(given.mass, given.stiffness, count=COUNT).values)


def ours_plain(given: Matrices) -> list[float]:
    """The same without any extra."""
    return _summed(lowest_modes(given.mass, given.stiffness, count=COUNT, backend=Fronts.backend).values)


def theirs(given: Matrices) -> list[float]:
    """SciPy's shift-invert Lanczos with its default factorisation; no proof."""
    values = sparse_linalg.eigsh(
        given.stiffness, COUNT, given.mass, sigma=0, return_eigenvectors=True, v0=np.ones(given.mass.shape[0])
    )[0]
    return _summed(values)


def floor(given: Matrices) -> list[float]:
    """One factorisation and the block solves."""
    return _floor(given, pardiso.Pardiso.backend if pardiso.installed() else Fronts.backend)


def floor_plain(given: Matrices) -> list[float]:
    """One factorisation of our own and the block solves."""
    return _floor(given, Fronts.backend)


def _floor(given: Matrices, backend: str) -> list[float]:
    columns = np.random.default_rng(1).standard_normal((given.mass.shape[0], BLOCK))
    with factor(given.stiffness, symmetric=True, backend=backend) as made:
        for _ in range(SOLVES):
            columns = made.solve(given.mass @ columns)
            columns /= np.abs(columns).max(axis=0)
    return []


def whole(given: tuple[np.ndarray, np.ndarray]) -> list[float]:
    """From the mesh to modes."""
    return ours(held(given))


def whole_plain(given: tuple[np.ndarray, np.ndarray]) -> list[float]:
    """From the mesh to modes without any extra."""
    return ours_plain(held(given))


def whole_theirs(given: tuple[np.ndarray, np.ndarray]) -> list[float]:
    """From the mesh to modes by scikit-fem and eigsh."""
    skfem, helpers, elasticity = (
        import_module(name) for name in ("skfem", "skfem.helpers", "skfem.models.elasticity")
    )
    nodes, cells = given
    mesh = skfem.MeshTet(nodes.T.copy(), cells.T.copy())
    basis = skfem.Basis(mesh, skfem.ElementVector(skfem.ElementTetP2()), intorder=4)
    stiffness = elasticity.linear_elasticity(*elasticity.lame_parameters(210e9, 0.3)).assemble(basis)
    mass = skfem.BilinearForm(lambda u, v, w: 7850.0 * helpers.dot(u, v)).assemble(basis)
    keep = np.setdiff1d(np.arange(mass.shape[0]), basis.get_dofs(lambda x: x[0] < 1e-9).all())
    return theirs(Matrices(mass[keep][:, keep], stiffness[keep][:, keep]))


EIGSH = "scipy.sparse.linalg.eigsh, sigma=0"
CASES = [
    Case(
        name="modes",
        work=f"{COUNT} modes from matrices, with the extra fast if installed",
        alternative=EIGSH,
        prepare=prepared,
        ours=ours,
        theirs=theirs,
        floor=floor,
        theirs_sizes=("s", "m"),
    ),
    Case(
        name="modes-plain",
        work=f"{COUNT} modes from matrices, no extra",
        alternative=EIGSH,
        prepare=prepared,
        ours=ours_plain,
        theirs=theirs,
        floor=floor_plain,
        sizes=("s", "m"),
        theirs_sizes=("s", "m"),
    ),
    Case(
        name="mesh-to-modes",
        work=f"assembly and {COUNT} modes, with the extra fast if installed",
        alternative=f"scikit-fem and {EIGSH}",
        prepare=lambda size: block(ACROSS[size]),
        ours=whole,
        theirs=whole_theirs,
        packages=("skfem",),
        theirs_sizes=("s", "m"),
    ),
    Case(
        name="mesh-to-modes-plain",
        work=f"assembly and {COUNT} modes, no extra",
        alternative=f"scikit-fem and {EIGSH}",
        prepare=lambda size: block(ACROSS[size]),
        ours=whole_plain,
        theirs=whole_theirs,
        packages=("skfem",),
        sizes=("s", "m"),
        theirs_sizes=("s", "m"),
    ),
    Case(
        name="million",
        work=f"{COUNT} modes of 959,040 freedoms, from the mesh",
        alternative="none",
        prepare=lambda _: bricks((96, 18, 22), (4.8, 0.9, 1.1)),
        ours=whole,
        theirs=None,
        sizes=("l",),
    ),
]
