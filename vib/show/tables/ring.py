"""The free response as blocks: peaks, times to die away, and what each mode has to do with it."""

from __future__ import annotations

from collections.abc import Mapping
from typing import TYPE_CHECKING, Any

from vib.show.blocks import Block, Column, Facts, Heading, Sentence, Table, text_column, unit_label
from vib.show.numbers import percent, significant
from vib.show.words import CAUTION, caution
from vib.units import UnitSystem, shown, shown_unit

if TYPE_CHECKING:
    from vib.response.decay import Peak
    from vib.response.ring import Ring

_MOST_OUTPUTS = 4
# kinds of quantity of displacement, velocity and acceleration: of a place, and of an angle
KINDS = {
    False: ("length", "velocity", "acceleration"),
    True: ("angle", "angular_velocity", "angular_acceleration"),
}


def start_words(arguments: Mapping[str, Any], units: UnitSystem) -> str:
    """What sets it ringing, in words, from the SI arguments of `vib.response.ring.ring`."""
    along = arguments.get("along")
    turning = isinstance(along, str) and along.lstrip("+-").startswith("r")
    place = str(arguments.get("at"))
    if isinstance(along, str):
        place += f" {'about' if turning else 'along'} {along.replace('r', '') if turning else along}"
    elif along is not None:
        place += f" along ({', '.join(f'{part:.3g}' for part in along)})"
    if "pulse" in arguments:
        peak, lasts = arguments["pulse"]
        size = _text(peak, ("force", "moment")[turning], units)
        return f"half-sine pulse of {size} lasting {_text(lasts, 'time', units)} at {place}"
    for name, (words, *kinds) in _STARTS.items():
        if name in arguments:
            return words.format(_text(arguments[name], kinds[turning], units), place)
    return ""


_STARTS = {
    "impulse": ("impulse of {} at {}", "impulse", "angular_impulse"),
    "pull": ("steady pull of {} at {}, let go", "force", "moment"),
    "displacement": ("pulled by {} at {}, let go", "length", "angle"),
    "velocity": ("started with {} at {}, all else at rest", "velocity", "angular_velocity"),
}


def _text(value: float, kind: str, units: UnitSystem) -> str:
    return f"{shown(value, kind, units):.4g} {unit_label(shown_unit(kind, units))}"


def ring_blocks(ring: Ring, title: str, start: str, units: UnitSystem) -> list[Block]:
    """All that the ``ring`` command shows."""
    blocks: list[Block] = [Heading(title), Sentence(f"Start: {start}."), ring_stability(ring)]
    for turning in (False, True):
        table = peak_table(ring, turning, units)
        if table is not None:
            blocks.append(table)
    blocks += [fall_table(ring), share_table(ring), ring_facts(ring), caution()]
    return blocks


def ring_stability(ring: Ring) -> Sentence:
    """Whether the motion dies away."""
    if not ring.stable:
        return Sentence("The system is UNSTABLE: the motion grows by itself.", "bad")
    if any(fall.envelope_to_1_percent_s is None for fall in ring.falls):
        return Sentence("The motion does not grow, but some of it does not die away.", "careful")
    return Sentence("The motion dies away.", "good")


def peak_table(ring: Ring, turning: bool, units: UnitSystem) -> Table | None:
    """Peak displacement, velocity and acceleration of the outputs that are angles, or that are not."""
    outputs = [name for name, angle in zip(ring.freedoms, ring.rotational, strict=True) if angle == turning]
    if not outputs:
        return None
    peaks = {(peak.output, peak.quantity): peak for peak in ring.peaks}
    quantities = ("displacement", "velocity", "acceleration")
    rows = []
    for output in outputs:
        row = [output]
        for quantity, kind in zip(quantities, KINDS[turning], strict=True):
            row += _peak(peaks[output, quantity], kind, units)
        rows.append(tuple(row))
    columns = [text_column("output")]
    for quantity, kind in zip(quantities, KINDS[turning], strict=True):
        columns += [Column(quantity, shown_unit(kind, units)), Column("at", "s")]
    return Table("Peaks of angles" if turning else "Peaks", tuple(columns), tuple(rows))


def _peak(peak: Peak, kind: str, units: UnitSystem) -> tuple[str, str]:
    return significant(shown(peak.value, kind, units)), significant(peak.time_s, 3)


def fall_table(ring: Ring) -> Table:
    """When each output has fallen to a tenth and a hundredth of its peak, and stays below."""
    rows = tuple(
        (
            fall.output,
            significant(fall.record_to_10_percent_s, 3),
            significant(fall.record_to_1_percent_s, 3),
            significant(fall.envelope_to_10_percent_s, 3),
            significant(fall.envelope_to_1_percent_s, 3),
        )
        for fall in ring.falls
    )
    columns = (
        text_column("output"),
        Column("motion to 10 %", "s"),
        Column("motion to 1 %", "s"),
        Column("envelope to 10 %", "s"),
        Column("envelope to 1 %", "s"),
    )
    return Table("Fallen for good to a share of its peak", columns, rows)


def share_table(ring: Ring) -> Table:
    """The modes that ring: decrement, time to fall, share of each output's displacement at its peak."""
    outputs = ring.freedoms[:_MOST_OUTPUTS]
    rows = tuple(
        (
            f"{significant(mode.frequency_hz, 4)}{' (several)' if mode.clustered else ''}",
            percent(mode.damping_ratio),
            significant(mode.logarithmic_decrement, 3),
            significant(mode.fall_to_1_percent_s, 3),
            *(_share(float(share)) for share in mode.share_of_peak[: len(outputs)]),
        )
        for mode in ring.modes
    )
    columns = (
        Column("natural", "Hz"),
        Column("damping", "%"),
        Column("log. decrement"),
        Column("to 1 %", "s"),
        *(Column(f"share of {name}", "%") for name in outputs),
    )
    return Table("Modes that ring, and their share of each peak displacement", columns, rows)


def _share(share: float) -> str:
    return "0" if abs(share) < 5e-4 else f"{100 * share:.1f}"


def ring_facts(ring: Ring) -> Facts:
    """How it was computed."""
    rows = [
        (
            "record",
            f"{significant(float(ring.time_s[-1]), 4)} s in {len(ring.time_s)} times: {ring.duration_note}",
        ),
        ("method", f"{ring.method}, condition number {significant(ring.condition, 3)}"),
        ("model", ring.model),
        ("left out", _truncation(ring)),
    ]
    if len(ring.freedoms) > _MOST_OUTPUTS:
        rows.append(("shares", f"of the first {_MOST_OUTPUTS} outputs; all are in --json"))
    return Facts(tuple(rows))


def _truncation(ring: Ring) -> str:
    worst = max(ring.truncations.values(), default=0.0)
    if worst == 0:
        return "nothing, the model is complete"
    told = ", ".join(f"{name} {significant(100 * share, 2)} %" for name, share in ring.truncations.items())
    return f"by the modes left out: {told}"


def ring_document(ring: Ring, title: str) -> dict[str, Any]:
    """What ``vib ring --json`` prints."""
    return {"title": title, **ring.to_dict(), "caution": CAUTION}


def history_columns(ring: Ring) -> dict[str, Any]:
    """Columns of the history file: time, then displacement, velocity, acceleration of each output."""
    columns: dict[str, Any] = {"time_s": ring.time_s}
    for name, array, units in (
        ("displacement", ring.displacement_m, ("m", "rad")),
        ("velocity", ring.velocity_m_s, ("m_s", "rad_s")),
        ("acceleration", ring.acceleration_m_s2, ("m_s2", "rad_s2")),
    ):
        for position, output in enumerate(ring.freedoms):
            columns[f"{name}_{units[ring.rotational[position]]} {output}"] = array[:, position]
    return columns
