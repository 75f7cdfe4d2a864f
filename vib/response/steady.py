"""Steady answers of a system whose matrices follow a shaft: complete where affordable, else reduced.

Three ways, each of the whole damped model at the speed asked for:

* a solve of the dynamic stiffness at every point, for small systems and where damping acts everywhere;
* residues of all undamped modes, with dashpots and spinning bodies put back exactly (`residue_sum`);
* the same with the lowest modes and the flexibility of the others, whose error is bounded.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import scipy.sparse as sparse
import scipy.sparse.linalg as sparse_linalg

from vib.errors import AccuracyError, ModelError
from vib.massless import acts_on, dense, root_scale, split_mass
from vib.response.at_speeds import AtSpeeds, as_sparse
from vib.response.exponential import Array
from vib.response.first_order import flexibility
from vib.response.receptance import ALL_MODES, has_massless, known_modes
from vib.response.residue_sum import Complex, Dashpots, ModalSum, coupled, remainder
from vib.solve.damping import ModalDamping
from vib.solve.localised import MOST_RANK, MOST_TOUCHED, Localised, localise

SOLVED = 60  # freedoms up to which the dynamic stiffness is solved at every point anyway
DENSE = 400  # beyond, sparse
# with ratios the alternative is a dense solve at every point, and many directions are worth their while
_MOST_TOUCHED, _MOST_RANK = 1200, 240
_BATCH = 4_000_000  # complex numbers at a time


@dataclass(frozen=True, eq=False)
class Steady:
    """Displacements along ``outputs`` (n, o) per harmonic force along ``inputs`` (n, i) at any speed.

    ``method`` says in words how, ``complete`` whether nothing is left out.
    """

    ways: _Solves | _Residues
    method: str
    complete: bool

    def __call__(self, speed_hz: Array, omega: Array) -> tuple[Complex, Array]:
        """At speeds (k,) of the reference shaft and as many angular frequencies: (k, o, i), and its bound."""
        return self.ways(speed_hz, omega)


def steady(family: AtSpeeds, top_hz: float, highest: float, outputs: Array, inputs: Array) -> Steady:
    """Choose a way.

    Parameters
    ----------
    family
        The system at any speed.
    top_hz
        The highest speed, rev/s.
    highest
        The highest angular frequency, rad/s.
    outputs, inputs
        (n, o) and (n, i).

    Raises
    ------
    AccuracyError
        The system is large and its damping such that the error of a reduced model could not be stated.
    """
    size = family.system.size
    residues = None if size <= SOLVED else _residues(family, top_hz, highest, outputs, inputs)
    if residues is not None:
        return Steady(residues, residues.words, residues.summed.remainder is None)
    ways = _Solves(family, outputs, inputs, _law_matrix(family))
    return Steady(ways, f"the dynamic stiffness of all {size} freedoms solved at every point", complete=True)


def _law_matrix(family: AtSpeeds) -> Array | None:
    """Damping stated by ratios as a matrix: M Phi diag(2 ratio w) Phi' M over all undamped modes."""
    system = family.system
    law = system.damping_law
    if not (law.ratio or law.bands or law.material):
        return None
    if system.unsymmetric:
        raise ModelError(
            "damping: ratios are those of undamped modes, which a system with circulatory forces does not "
            "have; state dashpots, Rayleigh damping or a damping matrix"
        )
    if system.size > ALL_MODES:
        raise AccuracyError(
            "run-up: damping by ratios together with damping that acts everywhere needs all modes, which a "
            "system of this size has too many of; state Rayleigh damping or dashpots"
        )
    undamped, seen = known_modes(system, np.zeros(1))
    moved = np.asarray(system.mass @ undamped.shapes)
    return np.asarray((moved * (2 * seen.law * undamped.angular)) @ moved.T)


@dataclass(frozen=True, eq=False)
class _Solves:
    """A solve at every point."""

    family: AtSpeeds
    outputs: Array
    inputs: Array
    law: Array | None

    def __call__(self, speed_hz: Array, omega: Array) -> tuple[Complex, Array]:
        size = self.family.system.size
        shape = (omega.size, self.outputs.shape[1], self.inputs.shape[1])
        found = np.empty(shape, np.complex128)
        with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
            if size > DENSE and self.law is None:
                for number in range(omega.size):
                    found[number] = self._sparse(float(speed_hz[number]), float(omega[number]))
            else:
                step = max(1, _BATCH // size**2)
                for first in range(0, omega.size, step):
                    piece = slice(first, first + step)
                    found[piece] = self._dense(speed_hz[piece], omega[piece])
        return found, np.zeros(shape)

    def _dense(self, speed_hz: Array, omega: Array) -> Complex:
        family = self.family
        still = [dense(matrix) for matrix in (family.stiffness, family.system.mass)]
        linear = _dense(family.linear_at(0.0), family.system.size)
        if self.law is not None:
            linear = linear + self.law
        turning, following = (_dense(one, family.system.size) for one in (family.turning, family.following))
        w, n = omega[:, None, None], speed_hz[:, None, None]
        whole = still[0] + n * following - w**2 * still[1] + 1j * w * (linear + n * turning)
        scale = root_scale(np.abs(np.einsum("kii->ki", whole)).max(axis=0))
        scaled = scale[:, None] * whole * scale
        try:
            answer = np.linalg.solve(scaled, (scale[:, None] * self.inputs)[None])
        except np.linalg.LinAlgError:  # a point is exactly at an undamped resonance
            answer = np.full((omega.size, *self.inputs.shape), np.inf, np.complex128)
            for number, matrix in enumerate(scaled):
                if np.linalg.cond(matrix) < 1 / np.finfo(float).eps:
                    answer[number] = np.linalg.solve(matrix, scale[:, None] * self.inputs)
        return np.asarray((self.outputs.T * scale) @ answer)

    def _sparse(self, speed_hz: float, omega: float) -> Complex:
        family, size = self.family, self.family.system.size
        linear = as_sparse(family.linear_at(speed_hz), size)
        whole = as_sparse(family.stiffness_at(speed_hz), size) - omega**2 * as_sparse(
            family.system.mass, size
        )
        whole = sparse.csc_array(whole + 1j * omega * linear)
        try:
            solver = sparse_linalg.splu(whole)
        except RuntimeError:
            return np.full((self.outputs.shape[1], self.inputs.shape[1]), np.inf, np.complex128)
        answer = solver.solve(self.inputs.astype(np.complex128))
        answer += solver.solve(self.inputs - whole @ answer)
        return np.asarray(self.outputs.T @ answer)


def _dense(matrix: object, size: int) -> Array:
    return np.zeros((size, size)) if matrix is None else dense(matrix)


@dataclass(frozen=True, eq=False)
class _Residues:
    """Modes summed up, with a term of low rank that follows the speed put back.

    ``linear`` and ``constant`` (q, q) hold at ``top_hz``; ``per_hz`` is how they grow with the speed.
    """

    summed: ModalSum
    basis: Array | None
    linear: Array
    constant: Array
    per_hz: tuple[Array, Array]
    top_hz: float
    counts: tuple[int, int]
    words: str

    def __call__(self, speed_hz: Array, omega: Array) -> tuple[Complex, Array]:
        with np.errstate(divide="ignore", invalid="ignore"):
            if self.basis is None:
                return self.summed(omega), self.summed.error(omega)
            off = (speed_hz - self.top_hz)[:, None, None]
            dashpots = Dashpots(
                self.basis, self.linear + off * self.per_hz[0], self.constant + off * self.per_hz[1]
            )
            return coupled(self.summed, omega, *self.counts, dashpots)


def _residues(
    family: AtSpeeds, top_hz: float, highest: float, outputs: Array, inputs: Array
) -> _Residues | None:
    """Set the sum up, or None where damping acts everywhere or on motions without mass."""
    system = family.system_at(top_hz)
    law = system.damping_law
    stated = law.ratio or law.bands or law.material
    if system.unsymmetric and stated:
        return None
    light = split_mass(system.mass).massless if has_massless(system) else np.zeros((system.size, 0))
    linear = as_sparse(family.linear_at(top_hz), system.size)
    if acts_on(linear, light):
        return None
    undamped, seen = known_modes(family.straight, np.array([highest]))
    alone = seen.proportional and system.gyroscopic is None and not system.unsymmetric
    split = None
    if not alone:
        split = localise(
            as_sparse(system.mass, system.size),
            linear,
            as_sparse(system.stiffness, system.size),
            most_touched=_MOST_TOUCHED if stated else MOST_TOUCHED,
            most_rank=_MOST_RANK if stated else MOST_RANK,
        )
        if split is None:
            return None
    elif not undamped.complete and seen.rayleigh is None:
        return None
    return _set_up(family, top_hz, highest, (outputs, inputs, light), seen, split)


def _set_up(
    family: AtSpeeds,
    top_hz: float,
    highest: float,
    vectors: tuple[Array, Array, Array],
    seen: ModalDamping,
    split: Localised | None,
) -> _Residues:
    modes = seen.undamped
    outputs, inputs, light = vectors
    basis = None
    if split is None:
        rates = seen.total
        a, b = seen.rayleigh or (0.0, 0.0)
        rows, columns = outputs, inputs
    else:
        a, b = split.mass_part, split.stiffness_part
        rates = a + b * modes.values + 2 * seen.law * modes.angular
        basis = dense(split.basis)
        rows, columns = np.hstack([outputs, basis]), np.hstack([inputs, basis])
    rest = None
    if not modes.complete:
        straight = family.straight
        rest = remainder(straight.mass, straight.stiffness, modes, rows, columns, highest, seen.law_limit)
    direct = flexibility(family.straight, light)
    summed = ModalSum(
        modes.values,
        rates,
        rows.T @ modes.shapes,
        columns.T @ modes.shapes,
        None if direct is None else rows.T @ direct @ columns,
        rest,
        a,
        b,
        modes.errors,
    )
    none = np.zeros((0, 0))
    return _Residues(
        summed,
        basis,
        none if split is None else split.linear,
        none if split is None else split.constant,
        (none, none) if split is None else _growth(family, split),
        top_hz,
        (outputs.shape[1], inputs.shape[1]),
        _words(len(modes.values), rest is None, 0 if rest is None else len(rest.moments), split),
    )


def _growth(family: AtSpeeds, split: Localised) -> tuple[Array, Array]:
    """How the term on the basis grows per rev/s: P matrix P', P the pseudo-inverse of the basis.

    The columns of the basis times the scale are orthonormal (`localise`), which P makes use of.
    """
    basis = dense(split.basis)
    straight = (family.stiffness + family.stiffness.T) / 2
    scale = root_scale(np.asarray(straight.diagonal()))
    inverse = (basis * scale[:, None]).T * scale
    terms = []
    for matrix in (family.turning, family.following):
        if matrix is None:
            terms.append(np.zeros((basis.shape[1],) * 2))
        else:
            skew = (matrix - matrix.T) / 2
            terms.append(inverse @ np.asarray(skew @ inverse.T))
    return terms[0], terms[1]


def _words(count: int, complete: bool, terms: int, split: Localised | None) -> str:
    words = f"residues of {'all' if complete else 'the lowest'} {count} undamped modes"
    if not complete:
        words += f" and {terms} terms of the static correction for the others"
    if split is not None:
        words += f"; dashpots and spinning bodies put back exactly in {split.rank} directions at every speed"
    return words
