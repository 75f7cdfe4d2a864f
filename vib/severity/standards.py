"""Zone boundaries and evaluation bands of the vibration standards, each figure with its source in words."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any, Literal

from vib.study.severity import Severity as Table
from vib.study.severity import Stand

Quantity = Literal["velocity_rms", "displacement_rms"]
Zone = Literal["A", "B", "C", "D"]
ZONES: tuple[Zone, ...] = ("A", "B", "C", "D")

_EDITIONS = {
    "ISO 20816-3": "ISO 20816-3:2022",
    "ISO 10816-3": "ISO 10816-3:2009",
    "ISO 10816-1": "ISO 10816-1:1995 annex B",
}
FROM_MEMORY = "figures from memory"

# ISO 10816-3:2009, carried over in ISO 20816-3:2022 (from memory, as that it was): boundaries A/B, B/C, C/D
# in mm/s r.m.s. and in micrometres r.m.s.
_BY_GROUP: dict[tuple[int, Stand], tuple[tuple[float, ...], tuple[float, ...]]] = {
    (1, "rigid"): ((2.3, 4.5, 7.1), (29, 57, 90)),
    (1, "flexible"): ((3.5, 7.1, 11.0), (45, 90, 140)),
    (2, "rigid"): ((1.4, 2.8, 4.5), (22, 45, 71)),
    (2, "flexible"): ((2.3, 4.5, 7.1), (37, 71, 113)),
}
# ISO 10816-1:1995 annex B, from memory: mm/s r.m.s.
_BY_CLASS: dict[str, tuple[float, ...]] = {
    "I": (0.71, 1.8, 4.5),
    "II": (1.12, 2.8, 7.1),
    "III": (1.8, 4.5, 11.2),
    "IV": (2.8, 7.1, 18.0),
}

BAND_TO_HZ = 1000.0
_SLOWEST_RPM = 120
_BAND_FROM_HZ, _SLOW_BAND_FROM_HZ, _SLOW_HZ = 10.0, 2.0, 600.0 / 60.0

MEANING: dict[Zone, str] = {
    "A": "as of a machine newly put into service",
    "B": "acceptable for unrestricted long running",
    "C": "not suited to long running: for a limited time until it is mended",
    "D": "severe enough to cause damage",
}


@dataclass(frozen=True)
class Boundaries:
    """The zone boundaries A/B, B/C and C/D of one quantity, SI, and where they come from."""

    quantity: Quantity
    values: tuple[float, float, float]
    source: str

    def zone(self, level: float) -> Zone:
        """The zone of a level; one on a boundary belongs to the better zone."""
        return ZONES[sum(level > value * (1 + 1e-12) for value in self.values)]

    def to_dict(self) -> dict[str, Any]:
        """Plain values, the unit in the names."""
        unit = "m_s" if self.quantity == "velocity_rms" else "m"
        names = (f"a_b_{unit}", f"b_c_{unit}", f"c_d_{unit}")
        return {
            "quantity": self.quantity,
            **dict(zip(names, self.values, strict=True)),
            "source": self.source,
        }


def boundaries(table: Table, stand: Stand) -> tuple[Boundaries, ...]:
    """What the standard of a [severity] table asks on a support that is rigid or flexible.

    ISO 20816-3 has boundaries of velocity and of displacement, and the worse zone counts; ISO 10816-1 has
    velocity only. Empty where the table names no standard.
    """
    if table.rules is None:
        return ()
    edition = _EDITIONS[table.rules]
    if table.machine_group is not None:
        source = f"{edition}, group {table.machine_group}, {stand} support, {FROM_MEMORY}"
        velocities, displacements = _BY_GROUP[table.machine_group, stand]
        return (
            Boundaries("velocity_rms", _scaled(velocities, 1e3), source),
            Boundaries("displacement_rms", _scaled(displacements, 1e6), source),
        )
    named = table.class_on(stand)
    assert named is not None
    return (
        Boundaries(
            "velocity_rms", _scaled(_BY_CLASS[named], 1e3), f"{edition}, class {named}, {FROM_MEMORY}"
        ),
    )


def band_from_hz(table: Table, speed_hz: Any) -> Any:
    """Lower end (Hz) of the band in which r.m.s. values are formed at running speeds (rev/s).

    10 Hz, and 2 Hz below 600 r/min (ISO 20816-3, from memory); 0 where the table names no standard.
    """
    import numpy as np

    if table.rules is None:
        return np.zeros_like(np.asarray(speed_hz, dtype=np.float64))
    return np.where(np.asarray(speed_hz) < _SLOW_HZ * (1 - 1e-12), _SLOW_BAND_FROM_HZ, _BAND_FROM_HZ)


def band_words(table: Table) -> str:
    """The band in words, with its source; "" where the table names no standard."""
    if table.rules is None:
        return ""
    return (
        f"r.m.s. values hold what lies between 10 Hz and 1000 Hz, below 600 r/min between 2 Hz and 1000 Hz "
        f"({_EDITIONS[table.rules]}, {FROM_MEMORY}); lines outside that band are left out of them"
    )


def outside_scope(table: Table, speed_hz: float) -> tuple[str, ...]:
    """A remark where the running speed (rev/s) is one that the standard is not for.

    ISO 20816-3: 120 r/min to 30 000 r/min, ISO 10816-3: 120 r/min to 15 000 r/min; both from memory.
    """
    fastest = {"ISO 20816-3": 30000, "ISO 10816-3": 15000}.get(table.rules or "")
    if fastest is None or _SLOWEST_RPM <= 60 * speed_hz * (1 + 1e-9) <= fastest * (1 + 2e-9):
        return ()
    return (
        f"{table.rules} is for running speeds from {_SLOWEST_RPM} to {fastest} r/min (from memory), not for "
        f"{60 * speed_hz:.5g} r/min: its zones say little here.",
    )


def _scaled(values: tuple[float, ...], per_si: float) -> tuple[float, float, float]:
    first, second, third = (value / per_si for value in values)
    return first, second, third
