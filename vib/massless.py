"""Motions without mass: found exactly, condensed where undamped, turned into first-order states where damped.

A motion z with mass z = 0 has no second-order equation of its own. Without damping it follows the others at
once (static condensation, R. J. Guyan, AIAA J. 3 (1965) 380, exact here because there is no mass to neglect);
with a dashpot it follows with a first-order lag and brings one real eigenvalue.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any, NamedTuple

import numpy as np
import scipy.linalg
import scipy.sparse as sparse
from numpy.typing import NDArray

from vib.errors import MatrixError

Array = NDArray[np.float64]
Matrix = Any
EPS = float(np.finfo(float).eps)


def dense(matrix: Matrix) -> Array:
    """A matrix as a dense array."""
    return np.asarray(matrix.toarray() if sparse.issparse(matrix) else matrix, dtype=np.float64)


def root_scale(diagonal: Array) -> Array:
    """1 / sqrt of the magnitude of each diagonal entry, 1 where it is zero."""
    size = np.abs(diagonal)
    return np.where(size > 0, 1 / np.sqrt(np.where(size > 0, size, 1.0)), 1.0)


def acts_on(matrix: Matrix, motions: Array) -> bool:
    """Whether a matrix (n, n) makes any force of the motions (n, k), beyond cancellation round-off."""
    if not motions.shape[1]:
        return False
    force, terms = np.abs(matrix @ motions), abs(matrix) @ np.abs(motions)
    return bool((force > 256 * EPS * terms).any())


@dataclass(frozen=True, eq=False)
class MassSplit:
    """The motions with mass, ``massive`` (n, p), and without, ``massless`` (n, z); together a basis.

    ``labels`` holds for each column of ``massive``, then of ``massless``, the freedom that it is, or -1
    for a combination of several.
    """

    massive: Array
    massless: Array
    labels: tuple[int, ...]


def split_mass(mass: Matrix) -> MassSplit:
    """Motions with and without mass, told freedom by freedom and then within each coupled block.

    A block counts as singular where an eigenvalue of it, scaled to a unit diagonal, is below its size times
    the round-off unit, so the verdict does not depend on units or on how heavy the parts are.
    """
    size = mass.shape[0]
    diagonal = np.asarray(mass.diagonal())
    heavy: list[_Column] = []
    light: list[_Column] = [_Column(int(i)) for i in np.flatnonzero(diagonal == 0)]
    with_mass = np.flatnonzero(diagonal != 0)
    blocks = [with_mass] if _regular(_scaled_block(mass, with_mass)) else _blocks(mass, with_mass)
    for block in blocks:
        scaled = _scaled_block(mass, block)
        if len(block) == 1 or _regular(scaled):
            heavy += [_Column(int(i)) for i in block]
            continue
        scale, slack = root_scale(diagonal[block]), 4 * len(block) * EPS
        values, vectors = scipy.linalg.eigh(scaled)
        for value, vector in zip(values, vectors.T, strict=True):
            (light if value <= slack else heavy).append(_Column(-1, block, scale * vector))
    basis = np.zeros((size, size))
    for number, column in enumerate([*heavy, *light]):
        if column.label >= 0:
            basis[column.label, number] = 1.0
        else:
            basis[column.rows, number] = column.values
    labels = tuple(column.label for column in [*heavy, *light])
    return MassSplit(basis[:, : len(heavy)], basis[:, len(heavy) :], labels)


class _Column(NamedTuple):
    """One motion: a single freedom ``label``, or -1 and ``values`` in ``rows``."""

    label: int
    rows: Any = None
    values: Any = None


def _scaled_block(mass: Matrix, rows: NDArray[np.intp]) -> Array:
    inner = mass[rows][:, rows] if sparse.issparse(mass) else mass[np.ix_(rows, rows)]
    scale = root_scale(np.asarray(mass.diagonal())[rows])
    return np.asarray(scale[:, None] * dense(inner) * scale)


def _regular(scaled: Array) -> bool:
    """Whether no eigenvalue of a block of unit diagonal is within round-off of zero."""
    slack = 4 * len(scaled) * EPS
    return (
        not len(scaled) or scipy.linalg.lapack.dpotrf(scaled - slack * np.eye(len(scaled)), lower=1)[1] == 0
    )


def _blocks(mass: Matrix, kept: NDArray[np.intp]) -> list[NDArray[np.intp]]:
    """The freedoms with mass, grouped by what the off-diagonal masses couple."""
    from scipy.sparse.csgraph import connected_components  # 20 ms to import, and seldom needed

    pattern = sparse.csr_array(mass)[kept][:, kept]
    number, labels = connected_components(pattern, directed=False)
    order = np.argsort(labels, kind="stable")
    starts = np.searchsorted(labels[order], np.arange(number))
    return [kept[part] for part in np.split(order, starts[1:])] if len(kept) else []


@dataclass(frozen=True, eq=False)
class Condensed:
    """An undamped system on its motions with mass only.

    ``mass`` and ``stiffness`` (p, p); ``lift`` (n, p) gives all freedoms from the p motions; ``idle``
    (n, k) are motions with neither mass nor stiffness.
    """

    mass: Array
    stiffness: Array
    lift: Array
    idle: Array


def condense(mass: Matrix, stiffness: Matrix) -> Condensed:
    """Eliminate the motions without mass by the static equilibrium they are always in.

    Raises
    ------
    MatrixError
        A motion without mass is coupled to the others but has no stiffness of its own, so that it
        can't be in equilibrium (only possible with an indefinite stiffness).
    """
    split = split_mass(mass)
    whole_mass, whole = dense(mass), dense(stiffness)
    size, light = whole.shape[0], split.massless
    if light.shape[1] == 0:
        return Condensed(whole_mass, whole, np.eye(size), np.zeros((size, 0)))
    heavy = split.massive
    inner, side = light.T @ whole @ light, light.T @ whole @ heavy
    scale = root_scale(np.diag(inner))
    values, vectors = scipy.linalg.eigh(scale[:, None] * inner * scale)
    held = np.abs(values) > 4 * len(values) * EPS
    basis = scale[:, None] * vectors
    loose = basis[:, ~held]
    coupling = loose.T @ side
    if coupling.size and np.abs(coupling).max() > 1e3 * EPS * np.abs(loose.T @ light.T @ whole).max():
        raise MatrixError(
            "mass and stiffness: a motion without mass is pulled by the others but has no stiffness of its "
            f"own ({_mostly(light @ loose[:, 0])}); give it mass or stiffness."
        )
    follow = -basis[:, held] @ ((basis[:, held].T @ side) / values[held, None])
    condensed = heavy.T @ whole @ heavy + side.T @ follow
    return Condensed(
        mass=heavy.T @ whole_mass @ heavy,
        stiffness=(condensed + condensed.T) / 2,
        lift=heavy + light @ follow,
        idle=light @ loose,
    )


def _mostly(vector: Array, names: Sequence[str] | None = None) -> str:
    """The freedoms that a motion consists of most, in words."""
    largest = np.argsort(-np.abs(vector))[:3]
    kept = [int(i) for i in largest if abs(vector[i]) > 0.1 * np.abs(vector).max()]
    label = [names[i] if names else str(i + 1) for i in sorted(kept)]
    return ("freedom " if len(label) == 1 else "freedoms ") + ", ".join(label)


@dataclass(frozen=True, eq=False)
class FirstOrder:
    """x' = rate x + input f, q = shape x + give f, for forces f (n,) on the freedoms q (n,).

    The states x are the p motions with mass, their velocities, then the lagging motions without mass.
    ``labels`` names each state by freedom (-1: a
    combination) and ``order`` by kind: 0 displacement, 1 velocity, 2 lagging displacement.
    """

    rate: Array
    input: Array
    shape: Array
    give: Array
    labels: tuple[int, ...]
    order: tuple[int, ...]


def first_order(mass: Matrix, damping: Matrix, stiffness: Matrix, names: Sequence[str]) -> FirstOrder:
    """The first-order form with every motion without mass eliminated or turned into a lag.

    ``damping`` includes gyroscopic terms. With z = V1 a + V2 b, V2 spanning the undamped part of the
    massless motions, b follows algebraically and a' from the dashpots.

    Raises
    ------
    MatrixError
        A motion that has neither mass, damping nor stiffness, or a motion without mass that velocities
        of others act on without a dashpot of its own.
    """
    split = split_mass(mass)
    heavy, light = split.massive, split.massless
    p, z = heavy.shape[1], light.shape[1]
    k, c = dense(stiffness), dense(damping)
    kpp, kpz, kzp, kzz = _quarters(k, heavy, light)
    cpp, cpz, czp, czz = _quarters(c, heavy, light)
    terms = _quarters(np.abs(c), np.abs(heavy), np.abs(light))
    cpz, czp, czz = (
        np.where(np.abs(part) > 256 * EPS * term, part, 0.0)
        for part, term in zip((cpz, czp, czz), terms[1:], strict=True)
    )
    u1, u2, v1, v2 = _damped_parts(czz)
    if v2.shape[1] and max(_size(cpz @ v2), _size(u2.T @ czp)) > 1e3 * EPS * max(_size(cpz), _size(czp)):
        raise MatrixError(
            "damping: velocities act on a motion without mass that has no dashpot of its own "
            f"({_mostly(light @ v2[:, 0], names)}); give it mass or a dashpot."
        )
    quick = u2.T @ kzz @ v2
    if v2.shape[1]:
        left, right = root_scale(np.abs(quick).max(axis=1)), root_scale(np.abs(quick).max(axis=0))
        values = scipy.linalg.svd((left**2)[:, None] * quick, full_matrices=True)
        if values[1][-1] <= 4 * z * EPS * max(values[1][0], 1.0) or not right.all():
            loose = light @ v2 @ values[2][-1]
            raise MatrixError(
                f"mass, damping and stiffness: {_mostly(loose, names)} can move without mass, damping or "
                "stiffness; give that motion one of them, or leave it out."
            )
    algebra = v2 @ np.linalg.solve(quick, u2.T) if v2.shape[1] else np.zeros((z, z))
    z_p, z_a, z_f = -algebra @ kzp, v1 - algebra @ kzz @ v1, algebra
    lag = np.linalg.solve(u1.T @ czz @ v1, u1.T) if v1.shape[1] else np.zeros((0, z))
    zeros = np.zeros((p, p))
    rate_a = np.hstack([-lag @ (kzp + kzz @ z_p), -lag @ czp, -lag @ kzz @ z_a])
    force_a = lag @ (np.eye(z) - kzz @ z_f) @ light.T
    inertia = scipy.linalg.cho_factor(heavy.T @ dense(mass) @ heavy)
    carry = cpz @ v1
    rate_v = np.hstack([-(kpp + kpz @ z_p), -cpp, -kpz @ z_a]) - carry @ rate_a
    force_v = heavy.T - kpz @ z_f @ light.T - carry @ force_a
    rate_p = np.hstack([zeros, np.eye(p), np.zeros((p, v1.shape[1]))])
    rate = np.vstack([rate_p, scipy.linalg.cho_solve(inertia, rate_v), rate_a])
    force = np.vstack([np.zeros((p, len(k))), scipy.linalg.cho_solve(inertia, force_v), force_a])
    shape = np.hstack([heavy + light @ z_p, np.zeros((len(k), p)), light @ z_a])
    labels = split.labels[:p] * 2 + _lag_labels(v1, split.labels[p:])
    order = (0,) * p + (1,) * p + (2,) * v1.shape[1]
    return FirstOrder(rate, force, shape, light @ z_f @ light.T, labels, order)


def _quarters(matrix: Array, heavy: Array, light: Array) -> tuple[Array, Array, Array, Array]:
    onto_heavy, onto_light = matrix @ heavy, matrix @ light
    return heavy.T @ onto_heavy, heavy.T @ onto_light, light.T @ onto_heavy, light.T @ onto_light


def _size(matrix: Array) -> float:
    return float(np.abs(matrix).max()) if matrix.size else 0.0


def _damped_parts(damping: Array) -> tuple[Array, Array, Array, Array]:
    """Left and right bases of the damped part (u1, v1) and of the undamped part (u2, v2)."""
    size = len(damping)
    if not damping.any():
        none, every = np.zeros((size, 0)), np.eye(size)
        return none, every, none, every
    scale = root_scale(np.abs(damping).max(axis=1))
    u, values, vt = scipy.linalg.svd(scale[:, None] * damping * scale)
    rank = int((values > 4 * size * EPS * values[0]).sum())
    left, right = scale[:, None] * u, scale[:, None] * vt.T
    if rank == size:  # keep the freedoms themselves as states
        return np.eye(size), np.zeros((size, 0)), np.eye(size), np.zeros((size, 0))
    return left[:, :rank], left[:, rank:], right[:, :rank], right[:, rank:]


def _lag_labels(basis: Array, labels: tuple[int, ...]) -> tuple[int, ...]:
    single = (np.count_nonzero(basis, axis=0) == 1) & (np.abs(basis).max(axis=0, initial=0.0) == 1.0)
    return tuple(
        labels[int(np.argmax(np.abs(column)))] if alone else -1
        for column, alone in zip(basis.T, single, strict=True)
    )
