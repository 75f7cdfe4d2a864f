"""A system whose gyroscopic and circulatory terms follow a reference shaft."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace
from functools import cached_property
from typing import Any

import numpy as np
import scipy.sparse as sparse

from vib.response.receptance import symmetric_part
from vib.system import Matrix, System


@dataclass(frozen=True, eq=False)
class AtSpeeds:
    """Matrices at any speed of the reference shaft, rev/s.

    ``gyroscopic`` (n, n) is of what keeps its speed, None where nothing does; ``stiffness`` holds the
    circulatory terms of what keeps its speed; ``turning`` and ``following`` are gyroscopic and circulatory
    terms per rev/s of the reference shaft, None where nothing follows it. ``speeds`` are (kept, ratio) of
    every shaft: it turns at kept + ratio times the speed of the reference shaft, rev/s.
    """

    system: System
    gyroscopic: Matrix | None
    stiffness: Matrix
    turning: Matrix | None
    following: Matrix | None
    speeds: Mapping[str, tuple[float, float]]

    @cached_property
    def straight(self) -> System:
        """The system without circulatory forces, whose undamped modes are those of every speed."""
        return symmetric_part(self.system)

    @property
    def varies(self) -> bool:
        """Whether anything but the forces changes with the speed."""
        return self.turning is not None or self.following is not None

    def linear_at(self, speed_hz: float) -> Matrix | None:
        """Damping and gyroscopic terms (n, n) at a speed; None where there are none."""
        return _sum([self.system.damping, self.gyroscopic_at(speed_hz)])

    def gyroscopic_at(self, speed_hz: float) -> Matrix | None:
        """The gyroscopic matrix (n, n) at a speed; None where nothing spins."""
        return _sum([self.gyroscopic, None if self.turning is None else speed_hz * self.turning])

    def stiffness_at(self, speed_hz: float) -> Matrix:
        """The stiffness (n, n) at a speed."""
        return self.stiffness if self.following is None else self.stiffness + speed_hz * self.following

    def system_at(self, speed_hz: float) -> System:
        """The system at a speed; a structure that is not to be cut otherwise."""
        if not self.varies:
            return self.system
        gyroscopic = self.gyroscopic_at(speed_hz)
        if gyroscopic is not None:
            gyroscopic = (gyroscopic - gyroscopic.T) / 2
        rotations = tuple(
            replace(row, speed_hz=self.speeds[row.shaft][0] + self.speeds[row.shaft][1] * speed_hz)
            for row in self.system.rotations
        )
        anatomy = self.system.anatomy
        if anatomy is not None:
            anatomy = replace(anatomy, division=None, discretisation=None)
        return replace(
            self.system,
            gyroscopic=gyroscopic,
            stiffness=self.stiffness_at(speed_hz),
            anatomy=anatomy,
            rotations=rotations,
        )


def at_speeds(system: System, ratios: Mapping[str, float], held: Mapping[str, float]) -> AtSpeeds:
    """A system with its shafts tied to a reference shaft.

    Parameters
    ----------
    system
        Its matrices hold every rotation at ``Rotation.speed_hz``.
    ratios
        Speed of a shaft over that of the reference shaft.
    held
        Speeds, rev/s, of shafts that turn by themselves. A shaft in neither keeps the speed it has.
    """
    gyroscopic, stiffness = system.gyroscopic, system.stiffness
    turning: list[Any] = []
    following: list[Any] = []
    speeds: dict[str, tuple[float, float]] = {}
    for row in system.rotations:
        ratio, kept = ratios.get(row.shaft, 0.0), held.get(row.shaft, row.speed_hz)
        speeds[row.shaft] = (0.0, ratio) if ratio else (kept, 0.0)
        change = 2 * np.pi * ((0.0 if ratio else kept) - row.speed_hz)
        if row.gyroscopic is not None:
            gyroscopic = _sum([gyroscopic, change * row.gyroscopic])
            turning += [2 * np.pi * ratio * row.gyroscopic] if ratio else []
        if row.circulatory is not None:
            stiffness = stiffness + change * row.circulatory
            following += [2 * np.pi * ratio * row.circulatory] if ratio else []
    return AtSpeeds(system, gyroscopic, stiffness, _sum(turning), _sum(following), speeds)


def _sum(terms: list[Any]) -> Matrix | None:
    there = [term for term in terms if term is not None]
    return sum(there[1:], there[0]) if there else None


def as_sparse(matrix: Matrix | None, size: int) -> Matrix:
    """A csr_array, empty for None."""
    return sparse.csr_array((size, size)) if matrix is None else sparse.csr_array(matrix)
