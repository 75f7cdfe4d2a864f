"""Forced response as blocks: extremes over time, steady part, shares of the modes, peaks over frequency."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np

from vib.show.blocks import Block, Bullets, Column, Facts, Heading, Sentence, Table, text_column
from vib.show.numbers import percent, significant
from vib.show.tables.ring import KINDS
from vib.show.words import CAUTION, caution
from vib.units import UnitSystem, shown, shown_unit

if TYPE_CHECKING:
    from vib.response.frequency import FrequencyResponse
    from vib.response.respond import Response

_MOST_OUTPUTS = 4
_MOST_PEAKS = 8
_ROUNDING = 1e-9  # of the largest response of its kind; what is below is no response


@dataclass(frozen=True, eq=False)
class Responses:
    """What `vib respond` found: over time, over frequency, or both."""

    title: str
    record: Response | None
    lines: FrequencyResponse | None

    @property
    def stable(self) -> bool:
        """False if anything grows."""
        return all(one.stable for one in (self.record, self.lines) if one is not None)

    @property
    def remarks(self) -> tuple[str, ...]:
        """Remarks of both, each once."""
        every = [remark for one in (self.record, self.lines) if one is not None for remark in one.remarks]
        return tuple(dict.fromkeys(every))


def respond_blocks(found: Responses, units: UnitSystem) -> list[Block]:
    """All that the ``respond`` command shows."""
    blocks: list[Block] = [Heading(found.title), response_stability(found)]
    if found.record is not None:
        blocks += record_blocks(found.record, units)
    if found.lines is not None:
        blocks += line_blocks(found.lines)
    return [*blocks, caution()]


def response_stability(found: Responses) -> Sentence:
    """Whether what is not driven dies away."""
    if not found.stable:
        return Sentence("The system is UNSTABLE: its motion grows by itself.", "bad")
    return Sentence("The system is stable: what is not driven dies away or stays small.", "good")


def record_blocks(record: Response, units: UnitSystem) -> list[Block]:
    """The response over time: loads, extremes, steady part, shares of the modes, method."""
    blocks: list[Block] = [Sentence("Loads:"), Bullets(record.loads)]
    for turning in (False, True):
        table = _extreme_table(record, turning, units)
        if table is not None:
            blocks.append(table)
    if record.relative_m is not None:
        blocks.append(_relative_table(record, units))
    if record.steady:
        blocks.append(_steady_table(record, units))
    if record.shares:
        blocks.append(_share_table(record))
    worst = max(record.truncations.values(), default=0.0)
    left_out = "nothing, the model is complete"
    if worst:
        listed = ", ".join(f"{name} {percent(share, 2)} %" for name, share in record.truncations.items())
        left_out = f"by comparison with half as many modes: {listed}"
    rows = (
        ("record", f"{significant(float(record.time_s[-1]), 4)} s: {record.duration_note}"),
        ("step", f"{significant(float(record.time_s[1]), 4)} s: {record.step_note}"),
        ("method", f"exact within each step; {record.method}"),
        ("model", record.model),
        ("left out", left_out),
    )
    return [*blocks, Facts(rows)]


def _extreme_table(record: Response, turning: bool, units: UnitSystem) -> Table | None:
    outputs = [
        name for name, angle in zip(record.freedoms, record.rotational, strict=True) if angle == turning
    ]
    if not outputs:
        return None
    found = {(one.output, one.quantity): one for one in record.extremes}
    quantities = ("displacement", "velocity", "acceleration")
    rows = []
    for output in outputs:
        row = [output]
        for quantity, kind in zip(quantities, KINDS[turning], strict=True):
            one = found[output, quantity]
            row += [significant(shown(one.value, kind, units)), significant(one.time_s, 3)]
        rows.append(tuple(row))
    columns = [text_column("output")]
    for quantity, kind in zip(quantities, KINDS[turning], strict=True):
        columns += [Column(quantity, shown_unit(kind, units)), Column("at", "s")]
    title = "Largest angles in the record" if turning else "Largest in the record"
    return Table(title, tuple(columns), tuple(rows))


def _relative_table(record: Response, units: UnitSystem) -> Table:
    """The largest displacement against the moving ground, which is what strains the structure."""
    rows = []
    for column, (name, turning) in enumerate(zip(record.freedoms, record.rotational, strict=True)):
        moved = record.relative_m[:, column] if record.relative_m is not None else np.zeros(1)
        place, kind = int(np.argmax(np.abs(moved))), KINDS[turning][0]
        size = f"{significant(shown(float(moved[place]), kind, units))} {shown_unit(kind, units)}"
        rows.append((name, size, significant(float(record.time_s[place]), 3)))
    columns = (text_column("output"), text_column("against the ground"), Column("at", "s"))
    return Table("Largest displacement against the moving ground", columns, tuple(rows))


def _steady_table(record: Response, units: UnitSystem) -> Table:
    rows = []
    for steady in record.steady:
        omega = 2 * np.pi * steady.frequency_hz
        for name, turning, amplitude in zip(
            record.freedoms, record.rotational, steady.amplitude, strict=True
        ):
            kinds = KINDS[turning]
            rows.append(
                (
                    significant(steady.frequency_hz),
                    name,
                    significant(shown(abs(amplitude), kinds[0], units)),
                    significant(shown(omega * abs(amplitude) / np.sqrt(2), kinds[1], units)),
                    significant(float(np.degrees(np.angle(amplitude))), 3),
                )
            )
    turning = bool(record.rotational) and all(record.rotational)
    columns = (
        Column("frequency", "Hz"),
        text_column("output"),
        Column("displacement amplitude", shown_unit(KINDS[turning][0], units)),
        Column("velocity rms", shown_unit(KINDS[turning][1], units)),
        Column("phase", "deg"),
    )
    return Table("Steady part, when all else has died away", columns, tuple(rows))


def _share_table(record: Response) -> Table:
    outputs = record.freedoms[:_MOST_OUTPUTS]
    rows = tuple(
        (
            f"{significant(share.frequency_hz, 4)}{' (several)' if share.clustered else ''}",
            percent(share.damping_ratio),
            *(_share(float(part)) for part in share.shares[: len(outputs)]),
        )
        for share in record.shares
    )
    columns = (
        Column("natural", "Hz"),
        Column("damping", "%"),
        *(Column(f"share of {name}", "%") for name in outputs),
    )
    return Table("Modes, and their share of each largest displacement", columns, rows)


def _share(share: float) -> str:
    return "0" if abs(share) < 5e-4 else f"{100 * share:.1f}"


def response_unit(lines: FrequencyResponse, output: int, given: int, kind: str) -> str:
    """The SI unit of one pair of channels, as text."""
    if lines.ground:
        same = lines.rotational_outputs[output] == lines.rotational_inputs[given]
        return "" if same else ("rad/m" if lines.rotational_outputs[output] else "m/rad")
    order = ("receptance", "mobility", "accelerance").index(kind)
    motion = ("rad" if lines.rotational_outputs[output] else "m") + ("", "/s", "/s^2")[order]
    force = "N m" if lines.rotational_inputs[given] else "N"
    return f"{motion}/({force})" if " " in force else f"{motion}/{force}"


def peak_lines(size: Sequence[float] | Any, most: int = _MOST_PEAKS) -> list[int]:
    """The lines at which an amplitude (k,) has its largest local maxima, ascending."""
    values = np.asarray(size)
    if len(values) < 3:
        return [int(np.argmax(values))] if len(values) else []
    inner = np.flatnonzero((values[1:-1] >= values[:-2]) & (values[1:-1] > values[2:])) + 1
    chosen = inner[np.argsort(-values[inner], kind="stable")[:most]]
    return sorted(chosen.tolist()) or [int(np.argmax(values))]


def _largest(lines: FrequencyResponse, output: int, given: int) -> float:
    """The largest response of all pairs of channels of the same unit."""
    outputs = np.array(lines.rotational_outputs) == lines.rotational_outputs[output]
    inputs = np.array(lines.rotational_inputs) == lines.rotational_inputs[given]
    return float(np.abs(lines.receptance[:, outputs][:, :, inputs]).max())


def line_blocks(lines: FrequencyResponse) -> list[Block]:
    """The response over frequency: its peaks, and the method."""
    kind = "receptance"
    word = "transmissibility" if lines.ground else kind
    rows = []
    for given, source in enumerate(lines.inputs):
        for output, name in enumerate(lines.outputs):
            found = lines.receptance[:, output, given]
            if np.abs(found).max() < _ROUNDING * _largest(lines, output, given):
                rows.append((f"{name} by {source}", "-", "0 (rounding)", "-", "-"))
                continue
            for place in peak_lines(np.abs(found)):
                rows.append(
                    (
                        f"{name} by {source}",
                        significant(float(lines.lines_hz[place]), 5),
                        significant(float(abs(found[place]))),
                        response_unit(lines, output, given, kind) or "-",
                        significant(float(np.degrees(np.angle(found[place]))), 3),
                    )
                )
    columns = (
        text_column("channels"),
        Column("line", "Hz"),
        Column(word),
        text_column("unit"),
        Column("phase", "deg"),
    )
    facts = (
        (
            "lines",
            f"{len(lines.lines_hz)} from {significant(float(lines.lines_hz.min()))} to "
            f"{significant(float(lines.lines_hz.max()))} Hz; peaks lie between lines",
        ),
        ("method", lines.method),
        (
            "left out",
            "nothing"
            if not lines.error.any()
            else f"at most {percent(lines.relative_error, 2)} % of the largest response",
        ),
    )
    return [Table(f"Peaks of the {word}", columns, tuple(rows)), Facts(facts)]


def respond_document(found: Responses) -> dict[str, Any]:
    """What ``vib respond --json`` prints."""
    document: dict[str, Any] = {"title": found.title, "stable": found.stable}
    if found.record is not None:
        document["record"] = _record_document(found.record)
    if found.lines is not None:
        document["frequency_response"] = _lines_document(found.lines)
    return {**document, "remarks": list(found.remarks), "caution": CAUTION}


_NAMES = {
    False: ("displacement_m", "velocity_m_s", "acceleration_m_s2"),
    True: ("angle_rad", "angular_velocity_rad_s", "angular_acceleration_rad_s2"),
}


def _record_document(record: Response) -> dict[str, Any]:
    quantities = ("displacement", "velocity", "acceleration")
    outputs = []
    for column, (name, turning) in enumerate(zip(record.freedoms, record.rotational, strict=True)):
        arrays = (record.displacement_m, record.velocity_m_s, record.acceleration_m_s2)
        entry: dict[str, Any] = {"name": name}
        entry |= {key: array[:, column] for key, array in zip(_NAMES[turning], arrays, strict=True)}
        if record.relative_m is not None:
            entry["relative_rad" if turning else "relative_m"] = record.relative_m[:, column]
        entry["largest"] = [
            {_NAMES[turning][quantities.index(one.quantity)]: one.value, "time_s": one.time_s}
            for one in record.extremes
            if one.output == name
        ]
        outputs.append(entry)
    return {
        "loads": list(record.loads),
        "time_s": record.time_s,
        "outputs": outputs,
        "steady": [
            {
                "frequency_hz": one.frequency_hz,
                "outputs": [
                    {
                        "name": name,
                        "amplitude_rad" if turning else "amplitude_m": abs(amplitude),
                        "phase_deg": float(np.degrees(np.angle(amplitude))),
                        "error_rad" if turning else "error_m": error,
                    }
                    for name, turning, amplitude, error in zip(
                        record.freedoms, record.rotational, one.amplitude, one.error, strict=True
                    )
                ],
            }
            for one in record.steady
        ],
        "modes": [
            {
                "frequency_hz": one.frequency_hz,
                "damping_ratio": one.damping_ratio,
                "eigenvalue": {"real_per_s": one.eigenvalue.real, "imag_rad_per_s": one.eigenvalue.imag},
                "clustered": one.clustered,
                "share_of_largest": one.shares,
            }
            for one in record.shares
        ],
        "model": record.model,
        "method": record.method,
        "truncation": dict(record.truncations),
        "step_note": record.step_note,
        "duration_note": record.duration_note,
    }


def _lines_document(lines: FrequencyResponse) -> dict[str, Any]:
    kinds = ("receptance",) if lines.ground else ("receptance", "mobility", "accelerance")
    pairs = []
    for given, source in enumerate(lines.inputs):
        for output, name in enumerate(lines.outputs):
            pair: dict[str, Any] = {"input": source, "output": name}
            for kind in kinds:
                values = lines.of(kind)[:, output, given]  # type: ignore[arg-type]
                pair["transmissibility" if lines.ground else kind] = {
                    "unit": response_unit(lines, output, given, kind),
                    "real": values.real,
                    "imag": values.imag,
                }
            pair["error"] = lines.error[:, output, given]
            pairs.append(pair)
    return {"frequency_hz": lines.lines_hz, "channels": pairs, "method": lines.method}
