"""What one table of forces of a study does: where, along what, at which multiple, how strongly."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from vib.drive.aim import Aim, aim_along, aim_turning
from vib.drive.strength import (
    Strength,
    grown,
    permissible_unbalance,
    piston,
    pulled,
    stroke,
)
from vib.errors import ModelError
from vib.study.excitations import Excitation, Force
from vib.study.forces import Push
from vib.study.motions import Crank, Strokes, Unbalance
from vib.system import System


@dataclass(frozen=True, eq=False)
class Term:
    """A force; ``order`` is a multiple of the excitation's own speed, or None with a ``fixed_hz``."""

    aim: Aim
    order: float | None
    fixed_hz: float | None
    strength: Strength


def terms_of(system: System, excitation: Excitation, row: Force) -> Iterator[Term]:
    """The terms of one table of an excitation.

    Raises
    ------
    ModelError
        An axis, a mass or a direction is missing; blows that overlap.
    """
    if isinstance(row, Unbalance):
        yield from _unbalance(system, excitation, row)
    elif isinstance(row, Crank):
        places = row.places or (row.at or "",) * len(row.throws)
        for order in row.multiples():
            for place, throw in zip(places, row.throws, strict=True):
                strength = piston(row, throw, int(order))
                yield Term(aim_along(system, place, row.along), order, None, strength)
    elif isinstance(row, Strokes):
        fastest = max(high for _, high in excitation.speed_ranges)
        if row.duration is not None and row.duration * fastest >= 1:
            raise ModelError(
                f"{excitation.name}: strokes: a blow of {1e3 * row.duration:.4g} ms takes longer than a "
                f"stroke at {60 * fastest:.4g} strokes a minute"
            )
        for order in row.multiples():
            yield Term(aim_along(system, row.at or "", row.along), order, None, stroke(row, int(order)))
    else:
        yield from _push(system, excitation, row)


def _push(system: System, excitation: Excitation, row: Push) -> Iterator[Term]:
    place = row.at or ""
    if row.turning:
        aim = aim_turning(system, place, shaft_axis(system, excitation, place))
    else:
        aim = aim_along(system, place, row.along)
    fixed = not row.multiples()
    stated = 1.0 if fixed else row.at_speed or max(high for _, high in excitation.speed_ranges)
    for multiple, amplitude, phase in row.rows:
        strength = grown(amplitude, phase, row.growth, stated)
        yield Term(aim, None if fixed else multiple, multiple if fixed else None, strength)


def _unbalance(system: System, excitation: Excitation, row: Unbalance) -> Iterator[Term]:
    place = row.at or ""
    amount = row.amount
    if row.grade is not None:
        mass = row.mass if row.mass is not None else _rotor_mass(system, place)
        if mass is None:
            raise ModelError(
                f"{excitation.name}: unbalance: a grade needs the mass of the rotor, and no body that spins "
                f'is at "{place}"; write mass = "..."'
            )
        stated = row.at_speed or max(high for _, high in excitation.speed_ranges)
        amount = permissible_unbalance(row.grade, mass, stated)
    assert amount is not None
    if row.along is not None or system.anatomy is None:
        if row.planes is not None:
            raise ModelError(f"{excitation.name}: unbalance: planes need a structure and a turning force")
        yield Term(aim_along(system, place, row.along), 1.0, None, pulled(amount, row.phase))
        return
    axis = shaft_axis(system, excitation, place)
    shares = [(place, 1.0)] if row.planes is None else _levers(system, excitation, row, axis)
    for where, share in shares:
        yield Term(aim_turning(system, where, axis), 1.0, None, pulled(share * amount, row.phase))


def _levers(
    system: System, excitation: Excitation, row: Unbalance, axis: tuple[float, float, float]
) -> list[tuple[str, float]]:
    """What each plane carries: the lever of the other one about the mass centre over their distance."""
    centre, first, second = (
        float(np.dot(axis, _position(system, name))) for name in (row.at or "", *(row.planes or ()))
    )
    if first == second or not min(first, second) < centre < max(first, second):
        raise ModelError(
            f'{excitation.name}: unbalance: the mass centre "{row.at}" does not lie between the planes along '
            "the shaft; give each plane an amount of its own"
        )
    share = (second - centre) / (second - first)
    planes = row.planes or ("", "")
    return [(planes[0], share), (planes[1], 1 - share)]


def shaft_axis(system: System, excitation: Excitation, place: str) -> tuple[float, float, float]:
    """The axis that a force of an excitation turns about: stated, or that of a body that spins.

    Raises
    ------
    ModelError
        There is neither, or bodies that spin with it have different axes.
    """
    if excitation.axis is not None:
        return excitation.axis
    spinning = [(row.shaft, body) for row in system.rotations for body in row.bodies]
    for _, body in spinning:
        if body.name == place:
            return body.axis
    axes = {body.axis for shaft, body in spinning if shaft == excitation.name}
    if len(axes) != 1:
        raise ModelError(
            f'{excitation.name}: which way the shaft points is not known: write axis = "x" (a body that '
            "spins with it would say so too)"
        )
    return axes.pop()


def _rotor_mass(system: System, place: str) -> float | None:
    return next((body.mass_kg for row in system.rotations for body in row.bodies if body.name == place), None)


def _position(system: System, name: str) -> tuple[float, float, float]:
    anatomy = system.anatomy
    if anatomy is None or name not in anatomy.places:
        raise ModelError(f"{name}: there is no such point or body")
    return anatomy.places[name].position_m
