"""Receptance of a system between directions: by residues with dashpots put back, or by complex poles."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
import scipy.sparse as sparse

from vib.errors import AccuracyError
from vib.massless import acts_on, dense, split_mass
from vib.modes import find_modes
from vib.response.every_mode import every_mode
from vib.response.exponential import EPS, Array
from vib.response.first_order import RingModel, flexibility, full_model
from vib.response.groups import Part, take_apart
from vib.response.reduced import LowestModes, corrections, reduced_model
from vib.response.residue_sum import (
    Complex,
    Dashpots,
    ModalSum,
    coupled,
    remainder,
)
from vib.response.stability import judged
from vib.solve.damping import ModalDamping, modal_damping
from vib.solve.localised import Localised, localise
from vib.solve.undamped import Undamped
from vib.system import System

ALL_MODES = 1500  # freedoms up to which every mode is summed
BEYOND = 2.0  # how far beyond the highest line modes are computed, where not all are
_MOST_STATES_BY_POLES = 4000


@dataclass(frozen=True, eq=False)
class Receptance:
    """``values`` and the bound ``error`` (k, o, i), and how they were found."""

    values: Complex
    error: Array
    method: str
    stable: bool
    complete: bool
    rounding: float = 0.0
    remarks: tuple[str, ...] = ()


def receptance(system: System, omega: Array, outputs: Array, inputs: Array) -> Receptance:
    """Displacements along ``outputs`` (n, o) per harmonic force along ``inputs`` (n, i) at (k,) rad/s.

    Infinite or NaN where an undamped mode is hit exactly; the caller says what that means.
    """
    light = split_mass(system.mass).massless if has_massless(system) else np.zeros((system.size, 0))
    law = system.damping_law.ratio or system.damping_law.bands or system.damping_law.material
    if system.unsymmetric and law:
        return _by_poles(full_model(system), omega, outputs, inputs)  # says why that can't be
    terms = [matrix for matrix in (system.damping, system.gyroscopic) if matrix is not None]
    if any(acts_on(matrix, light) for matrix in terms):
        return _by_poles(full_model(system), omega, outputs, inputs)
    straight = symmetric_part(system)
    undamped, seen = known_modes(straight, omega)
    split = None if _diagonal(system, seen) else _localised(system)
    if split is None and not _diagonal(system, seen):
        return _without_low_rank(system, undamped, omega, outputs, inputs)
    return _by_residues(system, seen, split, omega, outputs, inputs, light)


def has_massless(system: System) -> bool:
    """Whether motions without mass are looked for."""
    return system.size <= ALL_MODES or bool((np.asarray(system.mass.diagonal()) == 0).any())


def symmetric_part(system: System) -> System:
    """What the undamped modes are taken from: without circulatory forces, and then without damping."""
    if not system.unsymmetric:
        return system
    stiffness = (system.stiffness + system.stiffness.T) / 2
    return replace(system, stiffness=stiffness, damping=None, gyroscopic=None, unsymmetric=False)


def known_modes(system: System, omega: Array) -> tuple[Undamped, ModalDamping]:
    """All undamped modes of a system of moderate size, else those well beyond the highest line."""
    if system.size <= ALL_MODES:
        undamped = every_mode(system)
    else:
        bare = System(mass=system.mass, stiffness=system.stiffness)
        modes = find_modes(bare, up_to=max(BEYOND * float(omega.max()) / (2 * np.pi), 1e-6))
        if modes.complete_below_hz is None:
            raise AccuracyError(
                "frequency response: it could not be shown that no mode is missing, so what is left out has "
                "no bound"
            )
        squares = (2 * np.pi * modes.frequencies_hz) ** 2
        undamped = Undamped(
            values=np.where(modes.eigenvalues.real > 0, -squares, squares),
            shapes=np.asarray(modes.shapes.real),
            errors=2 * np.pi * modes.errors_hz,
            rigid=modes.rigid_body_count,
            complete=False,
            certified=2 * np.pi * modes.complete_below_hz,
        )
    return undamped, modal_damping(system, undamped)


def _diagonal(system: System, seen: ModalDamping) -> bool:
    """Whether the modes stay uncoupled."""
    return seen.proportional and system.gyroscopic is None and not system.unsymmetric


def _localised(system: System) -> Localised | None:
    zero = sparse.csr_array((system.size, system.size))
    linear = zero
    for matrix in (system.damping, system.gyroscopic):
        linear = linear if matrix is None else sparse.csr_array(linear + sparse.csr_array(matrix))
    return localise(sparse.csr_array(system.mass), linear, sparse.csr_array(system.stiffness))


def _by_residues(
    system: System,
    seen: ModalDamping,
    split: Localised | None,
    omega: Array,
    outputs: Array,
    inputs: Array,
    light: Array,
) -> Receptance:
    modes = seen.undamped
    if split is None:
        rates = seen.total
        a, b = seen.rayleigh or (0.0, 0.0)
        rows, columns, dashpots = outputs, inputs, None
    else:
        a, b = split.mass_part, split.stiffness_part
        rates = a + b * modes.values + 2 * seen.law * modes.angular
        basis = dense(split.basis)
        rows, columns = np.hstack([outputs, basis]), np.hstack([inputs, basis])
        dashpots = Dashpots(basis, split.linear, split.constant)
    if not modes.complete and seen.rayleigh is None and split is None:
        # proportional otherwise than a M + b K: what the modes left out have is not known mode by mode
        raise AccuracyError(
            "frequency response: the damping of the modes left out is not known; state it as Rayleigh "
            "damping, as ratios, or as dashpots"
        )
    rest = None
    if not modes.complete:
        rest = remainder(
            system.mass, system.stiffness, modes, rows, columns, float(omega.max()), seen.law_limit
        )
    direct = flexibility(system, light)
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
    with np.errstate(divide="ignore", invalid="ignore"):
        if dashpots is None:
            values = summed(omega)
            error = summed.error(omega)
        else:
            values, error = coupled(summed, omega, outputs.shape[1], inputs.shape[1], dashpots)
    count = len(modes.values)
    words = f"residues of {'all' if modes.complete else 'the lowest'} {count} undamped modes"
    if rest is not None:
        words += f" and {len(rest.moments)} terms of the flexibility of the others"
    if dashpots is not None:
        words += f"; damping that couples them put back exactly in {dashpots.count} directions"
    stable, remarks = _stability(system, seen)
    return Receptance(values, error, words, stable, modes.complete, remarks=remarks)


def _stability(system: System, seen: ModalDamping) -> tuple[bool, tuple[str, ...]]:
    """Whether anything grows: told from the modes where those are all and uncoupled."""
    if (seen.undamped.values < 0).any() and seen.proportional:
        return False, ()
    if seen.undamped.complete and _diagonal(system, seen):
        slack = 1e-12 * np.abs(seen.total).max(initial=0.0)
        return not bool((seen.total < -slack).any()), ()
    return judged(system)


def _without_low_rank(
    system: System, undamped: Undamped, omega: Array, outputs: Array, inputs: Array
) -> Receptance:
    """Damping that couples the modes everywhere: complex poles of the complete or of a reduced model."""
    if 2 * system.size <= _MOST_STATES_BY_POLES:
        return _by_poles(full_model(system), omega, outputs, inputs)
    if system.unsymmetric:
        raise AccuracyError(
            "frequency response: damping or circulatory forces that act everywhere in a system of this size "
            "have no way here whose error could be stated; reduce the system, or localise them"
        )
    directions = np.hstack([outputs, inputs])
    fixed = corrections(system, undamped, directions)
    fine = reduced_model(system, undamped, fixed)
    lowest = LowestModes(system)
    coarse = reduced_model(system, lowest(max(1, len(undamped.values) // 2)), fixed)
    answers = [_by_poles(model, omega, outputs, inputs) for model in (fine, coarse)]
    gap = np.abs(answers[0].values - answers[1].values)
    remark = (
        "Damping couples all modes, so a reduced model was used; its error is an estimate (the difference "
        "to half as many modes), not a bound."
    )
    return replace(answers[0], error=gap, complete=False, remarks=(*answers[0].remarks, remark))


def _by_poles(model: RingModel, omega: Array, outputs: Array, inputs: Array) -> Receptance:
    """Sum over the poles of the first-order model; clusters by a small solve per line."""
    parts = take_apart(model.matrix)
    rows, load = outputs.T @ model.shape, model.load @ inputs
    found = np.zeros((omega.size, rows.shape[0], load.shape[1]), np.complex128)
    singles = [part for part in parts.parts if part.single]
    s: Complex = (1j * omega).astype(np.complex128)
    with np.errstate(divide="ignore", invalid="ignore"):
        if singles:
            found += _single_poles(singles, s, rows, load)
        for part in parts.parts:
            if not part.single:
                found += _cluster(part, s, rows, load)
    if model.direct is not None:
        found += outputs.T @ model.direct @ inputs
    growing = max((float(part.eigenvalues.real.max()) - part.rounding for part in parts.parts), default=-1.0)
    return Receptance(
        found,
        np.zeros(found.shape),
        f"poles of the first-order model, {len(model.matrix)} states ({parts.method})",
        growing <= 0,
        True,
        EPS * parts.condition,
    )


def _single_poles(singles: list[Part], s: Complex, rows: Array, load: Array) -> Complex:
    values = np.concatenate([part.eigenvalues for part in singles])
    right = rows @ np.hstack([part.right for part in singles])
    left = np.vstack([part.left for part in singles]) @ load
    table = (right[:, None, :] * left.T[None, :, :]).reshape(-1, len(values)).T
    paired = np.array([part.factor == 2 for part in singles])
    found = (1 / (s[:, None] - values)) @ table
    if paired.any():
        found += (1 / (s[:, None] - values[paired].conj())) @ table[paired].conj()
    return np.asarray(found).reshape(s.size, right.shape[0], left.shape[1])


def _cluster(part: Part, s: Complex, rows: Array, load: Array) -> Complex:
    size = len(part.eigenvalues)
    right, left = rows @ part.right, part.left @ load
    matrices = s[:, None, None] * np.eye(size) - part.block
    try:
        found = right @ np.linalg.solve(matrices, np.broadcast_to(left, (s.size, *left.shape)))
        if part.factor == 2:
            other = s[:, None, None] * np.eye(size) - part.block.conj()
            pushed = np.broadcast_to(left.conj(), (s.size, *left.shape))
            found = found + right.conj() @ np.linalg.solve(other, pushed)
    except np.linalg.LinAlgError:  # a line is exactly at one of them
        found = np.full((s.size, right.shape[0], left.shape[1]), np.inf)
    return np.asarray(found)
