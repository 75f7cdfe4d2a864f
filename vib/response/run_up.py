"""What a machine does over its range of speeds under all that shakes it: the noun `RunUp`."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from vib.response.exponential import Array
from vib.response.residue_sum import Complex
from vib.system import System

Along = str | Sequence[float] | None


@dataclass(frozen=True, eq=False)
class Line:
    """One kind of force of one excitation at one order of its shaft, or at one fixed frequency.

    ``source`` is the word for the force in the study ("unbalance", "blades", ...); ``order`` the multiple of
    the excitation's own running speed, None for a fixed frequency; ``frequency_hz`` (k,).
    """

    excitation: str
    source: str
    order: float | None
    frequency_hz: Array

    @property
    def words(self) -> str:
        """Such as "fan unbalance, order 1"."""
        if self.order is None:
            return f"{self.excitation} {self.source}, {self.frequency_hz[0]:.4g} Hz"
        return f"{self.excitation} {self.source}, order {self.order:.6g}"


@dataclass(frozen=True)
class Resonance:
    """Where a line meets a mode: ``speed_hz`` of the reference shaft, ``frequency_hz`` and ratio there.

    ``line`` counts `RunUp.lines` from 0; ``mode`` counts modes from 1 by frequency, rigid ones included, at
    that speed.
    """

    speed_hz: float
    line: int
    mode: int
    frequency_hz: float
    damping_ratio: float


@dataclass(frozen=True, eq=False)
class Transmitted:
    """Forces on what carries the machine, q components of supports and of springs to the ground.

    ``names`` (q,) such as "A x"; ``owners`` (q,) the support's point, or the spring with its point, and
    ``components`` (q,) global axes, rotations for moments; ``kinds`` (q,) "support" or "spring";
    ``force_n`` (k, lines, q) complex phasors of the force on the ground, N and N m.
    """

    names: tuple[str, ...]
    owners: tuple[str, ...]
    components: tuple[str, ...]
    kinds: tuple[str, ...]
    force_n: Complex


@dataclass(frozen=True, kw_only=True, eq=False)
class RunUp:
    """Steady vibration of p outputs at k speeds under every line of every excitation; SI units.

    Attributes
    ----------
    system
        That was used (for a structure perhaps a finer division than the one given), at its stated speed.
    shaft
        The excitation whose running speed varies, the reference shaft; "" where nothing turns.
    speed_hz
        (k,) its speeds, rev/s, ascending.
    service_hz
        Its running speeds as the study states them, as (from, to).
    lines
        What shakes: see `Line`.
    groups
        Numbers of the lines that are of the same frequency at every speed, group by group.
    outputs, places, rotational
        (p,) names such as "motor y", (place, component) of each, and whether it is an angle.
    displacement_m
        (k, lines, p) complex phasors, m (rad): displacement = Re(phasor exp(2 pi i f t)), the mark on the
        reference shaft at its zero at t = 0. NaN where the system is unstable.
    error_m
        (k, lines, p) bound of the error by modes left out; 0 where none are.
    transmitted
        Forces on supports and mounts; None for bare matrices.
    resonances
        Where lines meet modes, by speed.
    stable_at
        (k,) False where something grows by itself: there is no steady vibration at these speeds.
    method
        How it was computed, in words.
    errors
        What is known of the numerical error, in words.
    remarks
        What the reader should know, in words.
    """

    system: System
    shaft: str
    speed_hz: Array
    service_hz: tuple[tuple[float, float], ...]
    lines: tuple[Line, ...]
    groups: tuple[tuple[int, ...], ...]
    outputs: tuple[str, ...]
    places: tuple[tuple[str, Along], ...]
    rotational: tuple[bool, ...]
    displacement_m: Complex
    error_m: Array
    transmitted: Transmitted | None
    resonances: tuple[Resonance, ...]
    stable_at: NDArray[np.bool_]
    method: str
    errors: tuple[str, ...]
    remarks: tuple[str, ...]

    @property
    def stable(self) -> bool:
        """False if the system is unstable at any of the speeds."""
        return bool(self.stable_at.all())

    @property
    def in_service(self) -> NDArray[np.bool_]:
        """(k,) whether a speed is one at which the machine runs; all where nothing turns."""
        if not self.service_hz:
            return np.ones(len(self.speed_hz), dtype=bool)
        found = np.zeros(len(self.speed_hz), dtype=bool)
        for low, high in self.service_hz:
            found |= (self.speed_hz >= low * (1 - 1e-12)) & (self.speed_hz <= high * (1 + 1e-12))
        return found

    @property
    def frequency_hz(self) -> Array:
        """(k, groups) frequency of each group of lines."""
        return np.stack([self.lines[group[0]].frequency_hz for group in self.groups], axis=1)

    @property
    def combined_m(self) -> Complex:
        """(k, groups, p) displacement with lines of the same frequency added as vectors."""
        return summed(self.displacement_m, self.groups)

    @property
    def displacement_rms_m(self) -> Array:
        """(k, p) r.m.s. over time of the displacement with all lines; infinite where unstable."""
        return self._over_lines(self.combined_m, power=0)

    @property
    def velocity_rms_m_s(self) -> Array:
        """(k, p) r.m.s. over time of the velocity with all lines; infinite where unstable."""
        return self._over_lines(self.combined_m, power=1)

    @property
    def displacement_peak_m(self) -> Array:
        """(k, p) upper bound of the displacement: the sum of the amplitudes; infinite where unstable."""
        return self._bounded(np.abs(self.combined_m).sum(axis=1))

    @property
    def transmitted_rms_n(self) -> Array:
        """(k, q) r.m.s. over time of the transmitted forces with all lines; infinite where unstable."""
        return self._over_lines(summed(self._forces(), self.groups), power=0)

    @property
    def transmitted_peak_n(self) -> Array:
        """(k, q) upper bound of the transmitted forces: the sum of the amplitudes."""
        return self._bounded(np.abs(summed(self._forces(), self.groups)).sum(axis=1))

    def _forces(self) -> Complex:
        if self.transmitted is None:
            return np.zeros((len(self.speed_hz), len(self.lines), 0), np.complex128)
        return self.transmitted.force_n

    def _over_lines(self, phasors: Complex, power: int) -> Array:
        rates = (2 * np.pi * self.frequency_hz[:, :, None]) ** power
        return self._bounded(np.sqrt(((rates * np.abs(phasors)) ** 2).sum(axis=1) / 2))

    def _bounded(self, values: Array) -> Array:
        return np.where(np.isfinite(values), values, np.inf)

    def to_dict(self) -> dict[str, Any]:
        """Plain values; speeds in rpm."""
        velocity, peak = self.velocity_rms_m_s, self.displacement_peak_m
        return {
            "shaft": self.shaft,
            "speeds_rpm": (60 * self.speed_hz).tolist(),
            "stable": self.stable,
            "lines": [
                {"excitation": line.excitation, "source": line.source, "order": line.order}
                for line in self.lines
            ],
            "outputs": [
                {
                    "output": name,
                    "velocity_rms_m_s": _plain(velocity[:, column]),
                    "displacement_peak_m": _plain(peak[:, column]),
                }
                for column, name in enumerate(self.outputs)
            ],
            "transmitted": []
            if self.transmitted is None
            else [
                {"at": name, "kind": kind, "peak_n": _plain(values)}
                for name, kind, values in zip(
                    self.transmitted.names, self.transmitted.kinds, self.transmitted_peak_n.T, strict=True
                )
            ],
            "resonances": [
                {
                    "speed_rpm": 60 * row.speed_hz,
                    "line": self.lines[row.line].words,
                    "mode": row.mode,
                    "frequency_hz": row.frequency_hz,
                    "damping_ratio": row.damping_ratio,
                }
                for row in self.resonances
            ],
            "method": self.method,
            "errors": list(self.errors),
            "remarks": list(self.remarks),
        }


def summed(phasors: Complex, groups: Sequence[Sequence[int]]) -> Complex:
    """(k, groups, p): lines (k, lines, p) of the same frequency added as vectors."""
    return np.stack([phasors[:, list(group)].sum(axis=1) for group in groups], axis=1)


def _plain(values: Array) -> list[float | None]:
    return [float(value) if np.isfinite(value) else None for value in values]
