"""How fine the members must be cut: modes at two densities, their difference as error bar, and refinement."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from vib.errors import AccuracyError
from vib.progress import tell
from vib.solve.damped import Damped
from vib.solve.search import Solution, solve_system
from vib.system import Discretisation, Division, System

Array = NDArray[np.float64]

# Halving the pieces leaves at most a quarter of the error of rods (order h^2; a sixteenth for beams, h^4), so
# the finer frequency is off by at most a third of the difference; half is taken. Where the difference
# itself is above LARGE the orders do not hold yet and the whole of it is taken.
FRACTION = 0.5
LARGE = 0.02
ROUNDS = 6
LARGEST = 60_000  # freedoms beyond which members are not cut any finer


@dataclass(frozen=True, eq=False)
class Converged:
    """A solution on a division that is fine enough (or as fine as was sane), with the error that is left.

    ``errors`` (m,) rad/s: of the division alone.
    """

    system: System
    solution: Solution
    errors: Array
    remarks: tuple[str, ...]


def converged_modes(system: System, count: int | None, limit: float | None) -> Converged:
    """Solve on two divisions and refine until the error of every frequency is within the accuracy asked.

    The coarser division spans a subspace of the finer one, so that undamped frequencies fall from one to
    the next and never below the true ones (R. Courant, D. Hilbert, Methods of Mathematical Physics I,
    chapter VI): real modes are compared by number (`_fall`), complex ones with the nearest eigenvalue.
    """
    division = _division(system)
    if division is None:
        solution = solve_system(system, count, limit)
        if system.anatomy is None or system.anatomy.discretisation is None:
            return Converged(system, solution, np.zeros(len(solution.damped.values)), ())
        return _of_cells(system, solution, system.anatomy.discretisation)
    if count is None and limit is None:
        return _every_mode(system, division)
    solution = solve_system(system, count, limit)
    for _ in range(ROUNDS):
        planned = _planned(system, division, solution, limit if count is None else None)
        if planned is not None:
            system, division, solution = _solved(planned, count, limit)
        coarse = division.coarser()
        if coarse is None:
            coarse = system
            system, division, solution = _solved(division.finer(), count, limit)
        errors = _errors(solution.damped, coarse)
        size = np.abs(solution.damped.values)
        if (errors <= division.accuracy * size).all():
            remark = (
                f"Members are cut into pieces ({system.size} freedoms) so that, by comparison with half as "
                f"many pieces, every frequency is within {100 * division.accuracy:.2g} %."
            )
            return Converged(system, solution, errors, (remark,))
        if system.size > LARGEST // 2:
            break
        system, division, solution = _solved(division.finer(), count, limit)
    errors = _errors(solution.damped, division.coarser() or system)
    worst = int((errors > division.accuracy * np.abs(solution.damped.values)).sum())
    remark = (
        f"Members were cut as finely as is sane ({system.size} freedoms); {worst} frequencies are still not "
        f"within {100 * division.accuracy:.2g} %, their error bars say how far off they may be."
    )
    return Converged(system, solution, errors, (remark,))


def _of_cells(system: System, solution: Solution, cells: Discretisation) -> Converged:
    """A mesh as it is, with the error that its cells leave."""
    damped = solution.damped
    number = len(damped.values)
    size = np.where(np.arange(number) < damped.rigid, 0.0, np.abs(damped.values))
    finer = cells.finer() if number else None
    remarks: tuple[str, ...] = ()
    tell("estimating the error of the mesh")
    if finer is None:
        errors, told, remarks = cells.errors(damped.shapes, size)
    else:
        compared = np.abs(solve_system(finer.system, number, None, certify=False).damped.values)
        errors = size.copy()
        known = min(number, len(compared))
        errors[:known] = finer.factor * np.abs(size[:known] - compared[:known])
        errors[: damped.rigid] = 0.0
        told = finer.words
    errors = errors + cells.member_errors(damped.shapes, size)
    elastic = size > 0
    relative = errors[elastic] / size[elastic]
    worst, asked = 100 * float(relative.max(initial=0.0)), 100 * cells.accuracy
    if worst <= asked:
        remark = f"The mesh is used as it is ({system.size} freedoms); {told}, it is within {worst:.2g} %."
    else:
        remark = (
            f"The mesh is too coarse for {int((relative > cells.accuracy).sum())} of {len(relative)} modes "
            f"to be within {asked:.2g} %: {told}, their error bars reach {worst:.2g} %. A mesh is not "
            "refined by itself; use smaller cells, or cells of second order."
        )
    return Converged(system, solution, errors, (remark, *remarks))


def _division(system: System) -> Division | None:
    return system.anatomy.division if system.anatomy else None


def _solved(system: System, count: int | None, limit: float | None) -> tuple[System, Division, Solution]:
    division = _division(system)
    if division is None:
        raise AccuracyError("The finer division of a structure lost its way to be cut otherwise.")
    return system, division, solve_system(system, count, limit)


def _planned(system: System, division: Division, solution: Solution, limit: float | None) -> System | None:
    """The division made for the highest frequency, where it is finer than the present one."""
    highest = max(float(np.abs(solution.damped.values[-1:]).max(initial=0.0)), limit or 0.0)
    planned = division.for_frequency(highest / (2 * np.pi)) if highest > 0 else system
    return planned if planned.size > system.size else None


def _errors(fine: Damped, coarse: System) -> Array:
    """Error of each magnitude that the division leaves, rad/s; all where the coarser has no such mode."""
    number = len(fine.values)
    size = np.abs(fine.values)
    found = solve_system(coarse, number + 2, None, certify=False).damped
    errors = size.copy()
    real = fine.proportional and found.proportional
    if real and bool(
        (fine.values.imag[fine.rigid :] > 0).all() and (found.values.imag[found.rigid :] > 0).all()
    ):
        known = min(number, len(found.values))
        errors[:known] = _fall(size[:known], np.abs(found.values[:known]))
    elif len(found.values):
        errors = np.abs(fine.values[:, None] - found.values).min(axis=1)
    errors[: fine.rigid] = 0.0
    return np.where(errors > LARGE * size, errors, FRACTION * errors)


def _fall(fine: Array, coarse: Array) -> Array:
    """How far each frequency may have fallen from the coarser division, both in ascending order.

    By number, except where modes may have changed places on the way: modes whose falls overlap are taken
    together, and each may have come from the highest of them.
    """
    reach = np.maximum.accumulate(np.maximum(coarse, fine))
    last = np.append(fine[1:] > reach[:-1], True)
    top = np.minimum.accumulate(np.where(last, reach, np.inf)[::-1])[::-1]
    return np.asarray(top - fine)


def _every_mode(system: System, division: Division) -> Converged:
    """All modes of one division: the upper ones belong to the division rather than to the structure."""
    coarse = division.coarser()
    if coarse is None:
        coarse = system
        system, division, solution = _solved(division.finer(), None, None)
    else:
        solution = solve_system(system, None, None)
    remark = (
        "All modes of one division were asked for: it was not refined, and the upper frequencies describe "
        "the division rather than the structure, as their error bars show."
    )
    return Converged(system, solution, _errors(solution.damped, coarse), (remark,))
