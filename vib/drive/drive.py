"""All that shakes a system, as lines of harmonic forces: the noun `Drive`."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field

import numpy as np

from vib.drive.aim import Aim
from vib.drive.strength import Complex, Strength, blow_rest, shaken, times
from vib.drive.terms import Term, terms_of
from vib.drive.train import Array, Train, train
from vib.errors import ModelError
from vib.study.excitations import Excitation
from vib.study.motions import Shaking, Strokes
from vib.system import COMPONENTS, System

_BLOWS_LEFT_OUT = 0.01  # of their mean square: said where it is more


@dataclass(frozen=True, eq=False)
class DriveLine:
    """Forces of one kind of one excitation at one order of its shaft, or at one fixed frequency.

    ``order`` counts turns of the excitation's own ``shaft``; None with a ``fixed_hz``. ``terms`` pair the
    number of an input with the strength of the force there, ``shaking`` an axis of the ground from 0 to 5
    with the strength of its displacement.
    """

    excitation: str
    source: str
    order: float | None
    fixed_hz: float | None
    terms: tuple[tuple[int, Strength], ...]
    shaking: tuple[tuple[int, Strength], ...] = ()


@dataclass(frozen=True, eq=False)
class Drive:
    """Every force on a system, as phasors that grow with the speed of a reference shaft.

    Attributes
    ----------
    train
        The reference shaft and how fast the others turn.
    inputs
        (i,) where and along what a unit force acts, all weights real.
    directions
        (n, i) the same as forces on the freedoms; zero where the place is held along them.
    lines
        What acts at which multiple of the speed.
    remarks
        What was taken for granted, in words.
    """

    train: Train
    inputs: tuple[Aim, ...]
    directions: Array
    lines: tuple[DriveLine, ...]
    remarks: tuple[str, ...]

    @property
    def shakes_ground(self) -> bool:
        """Whether any line moves the ground."""
        return any(line.shaking for line in self.lines)

    def frequency_hz(self, line: DriveLine, speed_hz: Array) -> Array:
        """Frequency (k,) of a line at speeds (k,) of the reference shaft."""
        if line.fixed_hz is not None or line.order is None:
            return np.full(len(speed_hz), line.fixed_hz)
        return line.order * self.train.speed(line.excitation, speed_hz)

    def rate(self, line: DriveLine) -> float:
        """Frequency of a line over the speed of the reference shaft; 0 where it does not follow it."""
        return 0.0 if line.order is None else line.order * self.train.ratios.get(line.excitation, 0.0)

    def forces(self, line: DriveLine, speed_hz: Array) -> Complex:
        """Phasors (k, i) of the forces of a line on the inputs, N and N m."""
        return self._sum(line.terms, line, speed_hz, len(self.inputs))

    def ground_m(self, line: DriveLine, speed_hz: Array) -> Complex:
        """Phasors (k, 6) of the motion of the ground by a line, m and rad about the origin."""
        return self._sum(line.shaking, line, speed_hz, len(COMPONENTS))

    def groups(self) -> tuple[tuple[int, ...], ...]:
        """Numbers of the lines that keep the same frequency at every speed, in the order of the lines.

        Lines that follow the reference shaft are of one frequency where their multiples are; so are lines of
        one frequency that turns with no shaft, and those of one shaft that turns by itself. Machines that
        merely turn equally fast drift against each other and don't add as vectors.
        """
        found: dict[tuple[str, float], list[int]] = {}
        for number, line in enumerate(self.lines):
            rate = self.rate(line)
            if rate:
                key = ("", round(rate, 12))
            elif line.order is not None:
                key = (line.excitation, round(line.order, 12))
            else:
                key = (" fixed", round(line.fixed_hz or 0.0, 12))
            found.setdefault(key, []).append(number)
        return tuple(tuple(group) for group in found.values())

    def _sum(
        self, terms: Sequence[tuple[int, Strength]], line: DriveLine, speed_hz: Array, size: int
    ) -> Complex:
        own = speed_hz if line.order is None else self.train.speed(line.excitation, speed_hz)
        found = np.zeros((len(speed_hz), size), np.complex128)
        for number, strength in terms:
            found[:, number] += strength(own)
        return found


def drive(
    system: System,
    excitations: Sequence[Excitation],
    *,
    shaft: str | None = None,
    held_hz: Mapping[str, float] | None = None,
) -> Drive:
    """The forces of excitations on a system.

    Parameters
    ----------
    system
        Its places say how a force acts on the freedoms, its rotations which body spins with which shaft.
    excitations
        As in a study; those without forces are left out, which a remark says.
    shaft, held_hz
        The reference shaft, and the speeds of machines that don't follow it; see `vib.drive.train.train`.

    Raises
    ------
    ModelError
        Nothing drives, an unknown place or shaft, an axis or a mass that is missing, overlapping blows.
    """
    found = train(excitations, shaft, held_hz)
    gathered = _Gathered(system, found)
    silent = []
    for excitation in excitations:
        if not any(True for _ in excitation.acting()):
            silent.append(excitation.name)
        gathered.add(excitation)
    if not gathered.lines:
        raise ModelError(
            "excitations: none of them states a force; give [[excitations]] an unbalance, forces, blades, ..."
        )
    if silent:
        gathered.remarks.append(f"No force is stated for {', '.join(silent)}: screened against only.")
    directions = np.stack(gathered.columns, axis=1) if gathered.columns else np.zeros((system.size, 0))
    return Drive(
        found, tuple(gathered.numbers), directions, tuple(gathered.lines), (*found.remarks, *gathered.remarks)
    )


@dataclass(eq=False)
class _Gathered:
    """Lines and inputs as they are found."""

    system: System
    train: Train
    numbers: dict[Aim, int] = field(default_factory=dict)
    columns: list[Array] = field(default_factory=list)
    lines: list[DriveLine] = field(default_factory=list)
    remarks: list[str] = field(default_factory=list)

    def add(self, excitation: Excitation) -> None:
        """The lines of one excitation, kind by kind and order by order."""
        merged: dict[tuple[str, float | None, float | None], list[tuple[int, Strength]]] = {}
        for source, row in excitation.acting():
            if isinstance(row, Shaking):
                self._shake(excitation, row)
                continue
            for term in terms_of(self.system, excitation, row):
                inputs = merged.setdefault((source, term.order, term.fixed_hz), [])
                inputs += self._inputs(excitation, source, term)
            if isinstance(row, Strokes):
                self._say_rest(excitation, row)
        self.lines += [
            DriveLine(excitation.name, source, order, fixed, tuple(inputs))
            for (source, order, fixed), inputs in merged.items()
        ]

    def _inputs(self, excitation: Excitation, source: str, term: Term) -> list[tuple[int, Strength]]:
        """Numbers of the inputs of a term, each with its strength."""
        found, moves = [], False
        for factor, aim, column in term.aim.parts(self.system):
            moves |= bool(column.any())
            if aim not in self.numbers:
                self.numbers[aim] = len(self.columns)
                self.columns.append(column)
            found.append((self.numbers[aim], times(factor, term.strength)))
        if not moves:
            self.remarks.append(
                f"{excitation.name}: {source}: {term.aim.place} is held along the force: it shakes nothing."
            )
        return found

    def _shake(self, excitation: Excitation, row: Shaking) -> None:
        if self.system.anatomy is None:
            raise ModelError(
                f"{excitation.name}: ground: a motion of the ground needs a structure; bare matrices don't "
                "say what they stand on"
            )
        axis = COMPONENTS.index(row.along.lstrip("-"))
        sign = -1.0 if row.along.startswith("-") else 1.0
        strength = times(sign, shaken(row))
        self.lines.append(
            DriveLine(excitation.name, "ground", row.order, row.frequency, (), ((axis, strength),))
        )

    def _say_rest(self, excitation: Excitation, row: Strokes) -> None:
        slowest = min(low for low, _ in excitation.speed_ranges)
        rest = blow_rest(row, slowest)
        if rest > _BLOWS_LEFT_OUT:
            self.remarks.append(
                f"{excitation.name}: {row.harmonics} orders of the blows are computed; those above hold "
                f"{rest:.1%} of their mean square at {60 * slowest:.4g} strokes a minute (harmonics = ...)."
            )
