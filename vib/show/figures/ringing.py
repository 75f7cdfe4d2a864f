"""The free response drawn: history with envelope, and what each mode adds to the peak."""

from __future__ import annotations

from itertools import pairwise
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from vib.show.figures.canvas import COLOURS, FAINT, INK, Picture, legend, sheet, short, style
from vib.show.numbers import significant
from vib.units import UnitSystem, shown, shown_unit

if TYPE_CHECKING:
    from matplotlib.axes import Axes

    from vib.response.ring import Ring

Array = NDArray[np.float64]

_MOST_PANELS = 8
_MOST_BARS = 12
_MOST_OUTPUTS = 3
_BINS = 1200


def ring_pictures(ring: Ring, units: UnitSystem) -> list[Picture]:
    """A history per output, and the contributions."""
    found = [history_picture(ring, output, units) for output in range(min(len(ring.freedoms), _MOST_PANELS))]
    if ring.modes:
        found.append(share_picture(ring))
    return found


def history_picture(ring: Ring, output: int, units: UnitSystem) -> Picture:
    """Displacement of one output over time with its envelope and its peak."""
    kind = "angle" if ring.rotational[output] else "length"
    unit, scale = shown_unit(kind, units), float(shown(1.0, kind, units))
    name = ring.freedoms[output]
    with style():
        figure = sheet(7.0, 2.5)
        axes = figure.add_subplot()
        axes.set_title(short(name))
        rest = float(ring.contributions.constant[output]) * scale
        envelope = ring.envelope_m[:, output] * scale
        high = thinned(ring.time_s, envelope)
        shade = axes.fill_between(high[0], rest - high[1], rest + high[1], color=COLOURS[5], alpha=0.22, lw=0)
        for sign in (1, -1):
            axes.plot(high[0], rest + sign * high[1], color=COLOURS[0], lw=0.7, ls=(0, (4, 2)))
        times, moves = thinned(ring.time_s, ring.displacement_m[:, output] * scale)
        (line,) = axes.plot(times, moves, color=INK, lw=0.9)
        handles = [(line, "motion"), (shade, "envelope")]
        handles += _mark(axes, ring, output, scale, unit)
        axes.set_xlim(float(ring.time_s.min()), float(ring.time_s.max()))
        _hold_height(axes, moves, rest)
        axes.set_xlabel("time, s")
        axes.set_ylabel(f"{'angle' if kind == 'angle' else 'displacement'}, {unit}")
        legend(axes, [h for h, _ in handles], [w for _, w in handles], loc="upper right", ncols=len(handles))
    return Picture(f"ring_{output + 1:02d}", figure, f"Displacement of {name} over time")


def _mark(axes: Axes, ring: Ring, output: int, scale: float, unit: str) -> list[tuple[Any, str]]:
    """The peak, and where the motion has fallen for good."""
    name = ring.freedoms[output]
    peak = next(peak for peak in ring.peaks if peak.output == name and peak.quantity == "displacement")
    (dot,) = axes.plot(
        peak.time_s, peak.value * scale, "o", ms=5, mfc=COLOURS[1], mec="white", ls="none", zorder=5
    )
    handles: list[tuple[Any, str]] = [(dot, f"peak {significant(peak.value * scale, 3)} {unit}")]
    fall = ring.falls[output]
    end = float(ring.time_s.max())
    for when, words in ((fall.record_to_10_percent_s, "10 %"), (fall.record_to_1_percent_s, "1 %")):
        if when is not None and 0 < when < end:
            axes.axvline(when, color=FAINT, lw=0.9, ls=(0, (2, 1.5)), zorder=1)
            axes.annotate(
                words,
                (when, 0.0),
                xycoords=("data", "axes fraction"),
                xytext=(2, 3),
                textcoords="offset points",
                fontsize=7,
                color=INK,
            )
    return handles


def _hold_height(axes: Axes, moves: Array, rest: float) -> None:
    """The motion fills the height, with room for the legend; an envelope far above it is cut off."""
    reach = float(np.abs(moves - rest).max(initial=0.0)) or 1.0
    axes.set_ylim(rest - 1.15 * reach, rest + 1.5 * reach)


def share_picture(ring: Ring) -> Picture:
    """Bars: each mode's signed share of the displacement peak of the first outputs."""
    outputs = ring.freedoms[:_MOST_OUTPUTS]
    sizes = np.array([np.abs(mode.share_of_peak[: len(outputs)]).max() for mode in ring.modes])
    chosen = np.sort(np.argsort(-sizes, kind="stable")[:_MOST_BARS])
    modes = [ring.modes[index] for index in chosen]
    with style():
        figure = sheet(7.0, 0.8 + 0.26 * len(modes) * max(1.0, 0.6 * len(outputs)))
        axes = figure.add_subplot()
        axes.set_title("What each mode adds to the peak displacement")
        rows = np.arange(len(modes), dtype=float)
        height = 0.8 / len(outputs)
        handles = []
        for number in range(len(outputs)):
            bars = axes.barh(
                rows + (number - (len(outputs) - 1) / 2) * height,
                [100 * float(mode.share_of_peak[number]) for mode in modes],
                height=0.92 * height,
                color=COLOURS[number],
                hatch=("", "///", "...")[number],
                edgecolor="white",
                linewidth=0,
                zorder=2,
            )
            handles.append(bars)
        axes.axvline(0.0, color=INK, lw=0.7)
        axes.set_yticks(rows)
        axes.set_yticklabels([f"{significant(mode.frequency_hz, 4)} Hz" for mode in modes])
        axes.invert_yaxis()
        axes.grid(axis="y", visible=False)
        axes.set_xlabel("share of the displacement at its peak, %")
        legend(axes, handles, outputs, loc="upper left", bbox_to_anchor=(1.0, 1.0))
    return Picture("ring_shares", figure, "Share of each mode in the peak displacements")


def thinned(times: Array, values: Array) -> tuple[Array, Array]:
    """A record that draws the same: the smallest and largest value of each narrow stripe of time."""
    order = np.argsort(times, kind="stable")
    times, values = times[order], values[order]
    if len(times) <= 2 * _BINS:
        return times, values
    edges = np.linspace(0, len(times), _BINS + 1).astype(int)
    kept: list[int] = []
    for low, high in pairwise(edges):
        part = values[low:high]
        if np.isnan(part).all():
            kept.append(int(low))
            continue
        kept += sorted({int(low + np.nanargmin(part)), int(low + np.nanargmax(part))})
    return times[kept], values[kept]
