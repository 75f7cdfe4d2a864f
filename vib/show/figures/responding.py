"""Forced response drawn: records over time; frequency response by amplitude and phase, parts, and polar."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import numpy as np

from vib.show.figures.canvas import COLOURS, DASHES, INK, Picture, legend, sheet, short, style
from vib.show.figures.ringing import thinned
from vib.show.tables.respond import Responses, response_unit
from vib.units import UnitSystem, shown, shown_unit

if TYPE_CHECKING:
    from vib.response.frequency import FrequencyResponse
    from vib.response.respond import Response

_MOST_PANELS = 8
_MOST_CURVES = 6
_KINDS = ("receptance", "mobility", "accelerance")


def respond_pictures(found: Responses, units: UnitSystem) -> list[Picture]:
    """Records of the first outputs, then the frequency response of each input."""
    pictures = []
    if found.record is not None:
        pictures += [
            record_picture(found.record, output, units)
            for output in range(min(len(found.record.freedoms), _MOST_PANELS))
        ]
    if found.lines is not None:
        for given in range(min(len(found.lines.inputs), _MOST_PANELS)):
            for kind in _KINDS[: 1 if found.lines.ground else 3]:
                pictures.append(amplitude_picture(found.lines, given, kind))
            pictures += [parts_picture(found.lines, given), polar_picture(found.lines, given)]
    return pictures


def record_picture(record: Response, output: int, units: UnitSystem) -> Picture:
    """Displacement and acceleration of one output over time."""
    turning, name = record.rotational[output], record.freedoms[output]
    with style():
        figure = sheet(7.0, 3.6)
        rows: Any = figure.subplots(2, 1, sharex=True)
        kinds = ("angle", "angular_acceleration") if turning else ("length", "acceleration")
        arrays = (record.displacement_m, record.acceleration_m_s2)
        words = ("angle" if turning else "displacement", "acceleration")
        for axes, kind, array, word in zip(rows, kinds, arrays, words, strict=True):
            scale = float(shown(1.0, kind, units))
            axes.plot(*thinned(record.time_s, array[:, output] * scale), color=INK, lw=0.9)
            axes.set_ylabel(f"{word}, {shown_unit(kind, units)}")
        if record.relative_m is not None:
            scale = float(shown(1.0, kinds[0], units))
            (line,) = rows[0].plot(
                *thinned(record.time_s, record.relative_m[:, output] * scale),
                color=COLOURS[1],
                lw=0.8,
                ls=DASHES[1],
            )
            legend(rows[0], [rows[0].lines[0], line], ["absolute", "against the ground"], loc="upper right")
        rows[0].set_title(short(name))
        rows[1].set_xlabel("time, s")
        rows[1].set_xlim(0.0, float(record.time_s[-1]))
    return Picture(f"respond_{output + 1:02d}", figure, f"Response of {name} over time")


def amplitude_picture(lines: FrequencyResponse, given: int, kind: str) -> Picture:
    """Amplitude and phase over frequency, logarithmic amplitude."""
    word = "transmissibility" if lines.ground else kind
    values = lines.of(kind)  # type: ignore[arg-type]
    with style():
        figure = sheet(7.0, 4.2)
        rows: Any = figure.subplots(2, 1, sharex=True, height_ratios=(2, 1))
        rows[0].set_title(short(f"{word}, {lines.inputs[given]}"))
        handles = []
        for place, output in enumerate(range(min(len(lines.outputs), _MOST_CURVES))):
            found = values[:, output, given]
            look = {"color": COLOURS[place], "ls": DASHES[place], "lw": 1.1}
            (line,) = rows[0].plot(lines.lines_hz, np.maximum(np.abs(found), 1e-300), **look)
            rows[1].plot(lines.lines_hz, np.degrees(np.angle(found)), **look)
            handles.append(line)
        rows[0].set_yscale("log")
        _plain_ticks(rows[0].yaxis)
        _across(lines, rows)
        unit = response_unit(lines, 0, given, kind)
        rows[0].set_ylabel(f"{word}{', ' + unit if unit else ''}")
        rows[1].set_ylabel("phase, deg")
        rows[1].set_ylim(-185, 185)
        rows[1].set_yticks([-180, -90, 0, 90, 180])
        legend(rows[0], handles, list(lines.outputs[:_MOST_CURVES]), loc="best")
    return Picture(
        f"{word}_{given + 1:02d}", figure, f"Amplitude and phase of the {word} by {lines.inputs[given]}"
    )


def parts_picture(lines: FrequencyResponse, given: int) -> Picture:
    """Real and imaginary part over frequency."""
    word = "transmissibility" if lines.ground else "receptance"
    with style():
        figure = sheet(7.0, 3.8)
        rows: Any = figure.subplots(2, 1, sharex=True)
        rows[0].set_title(short(f"{word}, {lines.inputs[given]}"))
        handles = []
        for place, output in enumerate(range(min(len(lines.outputs), _MOST_CURVES))):
            found = lines.receptance[:, output, given]
            look = {"color": COLOURS[place], "ls": DASHES[place], "lw": 1.1}
            (line,) = rows[0].plot(lines.lines_hz, found.real, **look)
            rows[1].plot(lines.lines_hz, found.imag, **look)
            handles.append(line)
        _across(lines, rows)
        unit = response_unit(lines, 0, given, "receptance")
        for axes, part in zip(rows, ("real", "imaginary"), strict=True):
            axes.set_ylabel(f"{part} part{', ' + unit if unit else ''}")
        legend(rows[0], handles, list(lines.outputs[:_MOST_CURVES]), loc="best")
    return Picture(f"parts_{given + 1:02d}", figure, f"Real and imaginary part by {lines.inputs[given]}")


def polar_picture(lines: FrequencyResponse, given: int) -> Picture:
    """The imaginary over the real part of the mobility, where a lone mode draws a circle.

    D. J. Ewins, Modal Testing, chapter on the circle of a viscously damped mode (from memory).
    """
    word = "transmissibility" if lines.ground else "mobility"
    with style():
        figure = sheet(4.6, 4.6)
        axes = figure.add_subplot()
        axes.set_title(short(f"{word}, {lines.inputs[given]}"))
        handles = []
        for place, output in enumerate(range(min(len(lines.outputs), _MOST_CURVES))):
            found = lines.mobility[:, output, given]
            (line,) = axes.plot(found.real, found.imag, color=COLOURS[place], ls=DASHES[place], lw=1.0)
            handles.append(line)
        unit = response_unit(lines, 0, given, "mobility")
        axes.set_aspect("equal", adjustable="datalim")
        axes.set_xlabel(f"real part{', ' + unit if unit else ''}")
        axes.set_ylabel(f"imaginary part{', ' + unit if unit else ''}")
        legend(axes, handles, list(lines.outputs[:_MOST_CURVES]), loc="best")
    return Picture(f"polar_{given + 1:02d}", figure, f"Polar picture of the {word} by {lines.inputs[given]}")


def _across(lines: FrequencyResponse, rows: Any) -> None:
    low, high = float(lines.lines_hz.min()), float(lines.lines_hz.max())
    if low > 0 and high > 30 * low:
        rows[1].set_xscale("log")
        _plain_ticks(rows[1].xaxis)
    if high > low:
        rows[1].set_xlim(low, high)
    rows[1].set_xlabel("frequency, Hz")


def _plain_ticks(axis: Any) -> None:
    """Powers of ten as numbers: our style writes text as it is, so "$10^3$" would stand there."""
    from matplotlib.ticker import FuncFormatter, NullFormatter

    axis.set_major_formatter(FuncFormatter(lambda value, _: f"{value:g}"))
    axis.set_minor_formatter(NullFormatter())
