"""Whether a machine stands rigidly or flexibly along each axis, judged as the standard does.

ISO 20816-3:2022 (ISO 10816-3:2009), figures from memory: a support is rigid in a direction if the lowest
natural frequency of machine and support together in that direction is above the main excitation frequency
(mostly the running speed) by at least 25 %; otherwise it is flexible.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from vib.amplitudes import amplitude, greatest_translation
from vib.severity.standards import FROM_MEMORY
from vib.study.severity import Severity as Table
from vib.study.severity import Stand

if TYPE_CHECKING:
    from vib.modes import Modes

Array = NDArray[np.float64]
AXES = ("x", "y", "z")

RIGID_RATIO = 1.25
_SOURCE = f"ISO 20816-3:2022 (ISO 10816-3:2009), {FROM_MEMORY}"
_ROUND_OFF = 1e-9
# conventions of this package for "a natural frequency in that direction": the places that are judged move in
# it, and along that axis to more than a side effect
LEAST_MOTION = 0.1  # of the greatest motion of the mode anywhere
LEAST_SHARE = 0.3  # of the squared motion of the places


@dataclass(frozen=True)
class Support:
    """How the machine stands along one axis.

    Attributes
    ----------
    axis
        "x", "y" or "z".
    stand
        "rigid" or "flexible" at the highest running speed.
    stated
        The study says so; nothing was judged.
    natural_hz, mode
        Lowest natural frequency along the axis and its number; None where no mode found is one.
    above_hz
        Where there is none: no such mode lies below this frequency (0: not known).
    main_hz
        The highest main excitation frequency, Hz.
    source
        Where the rule comes from, or that the study states it.
    """

    axis: str
    stand: Stand
    stated: bool
    natural_hz: float | None
    mode: int | None
    above_hz: float
    main_hz: float
    source: str

    @property
    def ratio(self) -> float | None:
        """Natural over main excitation frequency, or a lower bound of it; None where neither is known."""
        found = self.natural_hz if self.natural_hz is not None else self.above_hz
        return found / self.main_hz if self.natural_hz is not None or self.above_hz else None

    @property
    def known(self) -> bool:
        """Whether it is stated, or follows from modes that reach far enough."""
        return self.stated or self.natural_hz is not None or _rigid(self.above_hz, self.main_hz)

    @property
    def words(self) -> str:
        """What was found, in a sentence."""
        if self.stated:
            return f"{self.stand}, as the study states"
        wanted = f"rigid from {RIGID_RATIO:g} times {self.main_hz:.4g} Hz on"
        if self.natural_hz is not None:
            return (
                f"{self.stand}: the lowest natural frequency along {self.axis} is {self.natural_hz:.4g} Hz "
                f"(mode {self.mode}), {self.ratio:.3g} times the main excitation frequency; {wanted}"
            )
        if self.known:
            return f"rigid: no natural frequency along {self.axis} below {self.above_hz:.4g} Hz; {wanted}"
        return (
            f"not known, taken as rigid, which has the stricter limits: no mode along {self.axis} was found, "
            f"and the modes do not reach far enough; {wanted}"
        )

    def stand_at(self, speed_hz: float) -> Stand:
        """Rigid or flexible at another running speed, rev/s."""
        if self.stated:
            return self.stand
        if self.natural_hz is not None:
            return "rigid" if _rigid(self.natural_hz, speed_hz) else "flexible"
        return "rigid"

    def to_dict(self) -> dict[str, Any]:
        """Plain values, frequencies in Hz."""
        return {
            "axis": self.axis,
            "support": self.stand,
            "stated": self.stated,
            "known": self.known,
            "natural_frequency_hz": self.natural_hz,
            "mode": self.mode,
            "main_excitation_hz": self.main_hz,
            "ratio": self.ratio,
            "rigid_from_ratio": None if self.stated else RIGID_RATIO,
            "words": self.words,
            "source": self.source,
        }


def judge_support(modes: Modes, table: Table, places: Sequence[str], main_hz: float) -> Mapping[str, Support]:
    """The support along x, y and z; empty where no limit depends on it.

    A mode is one along an axis where the judged places move by at least a tenth of its greatest motion, and
    at least three tenths of their squared motion is along the axis (conventions of this program: the standard
    speaks of "the lowest natural frequency in that direction" only).

    Parameters
    ----------
    modes
        Of a structure, rigid-body modes included, best up to 1.25 times ``main_hz``.
    table
        Says how the machine stands, or leaves it to be judged.
    places
        The points and bodies that are judged.
    main_hz
        Highest main excitation frequency, Hz.
    """
    if not table.needs_support:
        return {}
    along = modes_along(modes, places)
    return {
        axis: _judged(modes, getattr(table.support, axis), axis, row, main_hz)
        for axis, row in zip(AXES, along, strict=True)
    }


def modes_along(modes: Modes, places: Sequence[str]) -> NDArray[np.bool_]:
    """(3, m) whether each mode is one along x, y, z at the places; all false for bare matrices."""
    anatomy = modes.system.anatomy
    shapes = np.asarray(modes.shapes)
    if anatomy is None or not places:
        return np.zeros((3, shapes.shape[1]), dtype=bool)
    moved = np.stack([np.asarray(anatomy.places[name].motion @ shapes)[:3] for name in places])
    squared = (np.abs(moved) ** 2).sum(axis=0)
    whole = squared.sum(axis=0)
    share = np.divide(squared, whole, out=np.zeros_like(squared), where=whole > 0)
    greatest = greatest_translation(modes.system, shapes)
    found: NDArray[np.bool_] = (share >= LEAST_SHARE) & (
        amplitude(moved).max(axis=0) >= LEAST_MOTION * greatest
    )
    return found


def _judged(
    modes: Modes, stated: Stand | None, axis: str, along: NDArray[np.bool_], main_hz: float
) -> Support:
    if stated is not None:
        return Support(axis, stated, True, None, None, 0.0, main_hz, "stated in the study")
    lowest = int(np.argmax(along)) if along.any() else None
    if lowest is None:
        reach = modes.complete_below_hz or 0.0
        return Support(axis, "rigid", False, None, None, reach, main_hz, _SOURCE)
    natural = float(modes.frequencies_hz[lowest])
    stand: Stand = "rigid" if _rigid(natural, main_hz) else "flexible"
    return Support(axis, stand, False, natural, lowest + 1, 0.0, main_hz, _SOURCE)


def _rigid(natural_hz: float, main_hz: float) -> bool:
    return natural_hz >= RIGID_RATIO * main_hz * (1 - _ROUND_OFF)
