"""Zones, classes, support and separation margins, each by the prediction of a machine that drives itself."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

import vib
from tests.references.common import Check, Entry, covers, study
from vib.severity import Severity
from vib.severity.margins import wanted_margin

_SPEED_HZ = 25.0
_MASS = 100.0


def _judged(natural_hz: tuple[float, float, float], force: float, table: str) -> Severity:
    """A block on three springs with these natural frequencies, driven along z at 25 Hz."""
    stiffness = ", ".join(
        f'{axis} = "{_MASS * (2 * np.pi * f) ** 2!r} N/m"' for axis, f in zip("xyz", natural_hz, strict=True)
    )
    built = study(
        f"""
[points]
A = ["0 m", "0 m", "0 m"]
[[bodies]]
name = "machine"
mass = "{_MASS} kg"
carried_by = "A"
[[springs]]
between = ["A", "ground"]
stiffness = {{{stiffness}}}
[damping]
ratio = 0.02
[[excitations]]
name = "shaft"
speed = "{_SPEED_HZ} Hz"
at = "machine"
along = "z"
forces = {{order = 1, amplitude = "{force!r} N"}}
[severity]
{table}
"""
    )
    run_up = vib.run_up(built, speeds_hz=[_SPEED_HZ])
    assert built.severity is not None
    return vib.judge(run_up, built.severity, run_up.system.modes())


def _force_for(natural_hz: float, velocity_m_s: float) -> float:
    """Amplitude along z that gives this r.m.s. velocity at 25 Hz, by the closed form of one mass."""
    omega, own = 2 * np.pi * _SPEED_HZ, 2 * np.pi * natural_hz
    receptance = 1 / (_MASS * abs(own**2 - omega**2 + 2j * 0.02 * own * omega))
    return float(np.sqrt(2) * velocity_m_s / (omega * receptance))


def _edges(natural_hz: float, table: str, values: list[float]) -> Iterator[tuple[str, float, float]]:
    """The zones just below and just above each boundary of velocity, as numbers from 0 (A) to 3 (D)."""
    for number, (pair, value) in enumerate(zip(("A/B", "B/C", "C/D"), values, strict=True)):
        for word, factor, zone in (("below", 1 - 1e-6, number), ("above", 1 + 1e-6, number + 1)):
            force = _force_for(natural_hz, 1e-3 * value * factor)
            row = next(row for row in _judged((natural_hz,) * 3, force, table).rows if row.axis == "z")
            yield f"{word} {pair}", float("ABCD".index(row.zones["velocity_rms"])), float(zone)


@covers("STD-ZONES")
def zones(entry: Entry) -> Iterator[Check]:
    """Both groups on both kinds of support; the support is judged from 60 Hz and 10 Hz against 25 Hz."""
    for group in (1, 2):
        for stand, natural in (("rigid", 60.0), ("flexible", 10.0)):
            name = f"group{group}_{stand}"
            found = _judged((natural,) * 3, 100.0, f"group = {group}").rows[-1]
            for limits, key, scale in zip(found.limits, ("v", "s"), (1e3, 1e6), strict=True):
                wanted = entry["expected"][f"{name}_{key}"]
                for pair, ours, value in zip(("A/B", "B/C", "C/D"), limits.values, wanted, strict=True):
                    yield Check(f"{name}, {pair}, {limits.quantity}", scale * ours, value, 1e-12)
            velocities = entry["expected"][f"{name}_v"]
            for what, ours, value in _edges(natural, f"group = {group}", velocities):
                yield Check(f"{name}, zone {what}", ours, value, 0.0, absolute=True)


@covers("STD-CLASS")
def classes(entry: Entry) -> Iterator[Check]:
    """The four classes of machines in general."""
    for name, wanted in entry["expected"].items():
        table = f'machine_class = "{name}"'
        (limits,) = _judged((60.0,) * 3, 100.0, table).rows[-1].limits
        for pair, ours, value in zip(("A/B", "B/C", "C/D"), limits.values, wanted, strict=True):
            yield Check(f"class {name}, {pair}, mm/s", 1e3 * ours, value, 1e-12)
        for what, zone, value in _edges(60.0, table, wanted):
            yield Check(f"class {name}, zone {what}", zone, value, 0.0, absolute=True)


@covers("STD-SUPPORT")
def support(entry: Entry) -> Iterator[Check]:
    """Three natural frequencies along x, y and z against one running speed."""
    naturals = entry["inputs"]["f_n"]
    found = _judged(tuple(naturals), 100.0, "group = 1").supports
    for axis, natural, wanted in zip("xyz", naturals, entry["expected"]["class"], strict=True):
        ours = found[axis]
        yield Check(f"ratio at {natural:g} Hz", ours.ratio or 0.0, natural / entry["inputs"]["f_rot"], 1e-9)
        same = float(ours.stand == wanted)
        yield Check(f"{natural:g} Hz is {wanted} (1: yes)", same, 1.0, 0.0, absolute=True)


@covers("STD-SM")
def separation(entry: Entry) -> Iterator[Check]:
    """The margin asked for by the amplification factor, below and above the running speeds."""
    for amplification, below, above in entry["expected"]["rows"]:
        ours = 100 * wanted_margin(amplification, above=False)
        yield Check(f"amplification {amplification:g}, below, %", ours, below, 1e-6, absolute=True)
        ours = 100 * wanted_margin(amplification, above=True)
        yield Check(f"amplification {amplification:g}, above, %", ours, above, 1e-6, absolute=True)
