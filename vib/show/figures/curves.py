"""Modes against the speed of a shaft as curves, with whirl, critical speeds and onset of instability."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import numpy as np

from vib.show.figures.canvas import BAD, COLOURS, DASHES, INK, Picture, legend, sheet, short, style

if TYPE_CHECKING:
    from matplotlib.axes import Axes

    from vib.speeds import SpeedCurves

_LINES = {
    "forward": (COLOURS[0], "-", "mode, forward whirl"),
    "backward": (COLOURS[1], "--", "mode, backward whirl"),
    "flat": (INK, ":", "mode without whirl"),
    "unknown": (INK, "-", "mode"),
}


def curve_picture(curves: SpeedCurves, name: str) -> Picture:
    """The curves of one shaft with the lines of the orders that have critical speeds."""
    with style():
        figure = sheet(7.2, 4.0)
        axes = figure.add_subplot()
        axes.set_title(f"Modes against the speed of {short(curves.shaft)}")
        top = float(curves.speeds_hz[-1])
        handles = draw_curves(axes, curves)
        for number, order in enumerate(sorted({row.order for row in curves.critical})):
            colour, dashes = COLOURS[2 + number % 3], DASHES[number % len(DASHES)]
            (line,) = axes.plot([0, 60 * top], [0, order * top], color=colour, ls=dashes, lw=1.0, zorder=1)
            handles.append((line, f"order {order:g}"))
        axes.set_xlim(0.0, 60 * top)
        axes.set_ylim(0.0, 1.08 * float(curves.frequencies_hz.max(initial=0.0)) or 1.0)
        axes.set_xlabel("running speed, rpm")
        axes.set_ylabel("frequency, Hz")
        legend(
            axes,
            [handle for handle, _ in handles],
            [label for _, label in handles],
            loc="upper left",
            bbox_to_anchor=(1.03, 1.0),
        )
    return Picture(name, figure, f"Modes against the speed of {curves.shaft}")


def draw_curves(axes: Axes, curves: SpeedCurves) -> list[tuple[Any, str]]:
    """Every curve in the line of its whirl; what is drawn, with its words."""
    handles: dict[str, Any] = {}
    speeds, frequencies = 60 * curves.speeds_hz, curves.frequencies_hz
    for mode in range(frequencies.shape[1]):
        whirls = [row[mode] for row in curves.whirls]
        start = 0
        for stop in range(1, len(whirls) + 1):
            if stop < len(whirls) and whirls[stop] == whirls[start]:
                continue
            colour, dashes, words = _LINES[whirls[start]]
            span = slice(start, min(stop + 1, len(whirls)))
            (line,) = axes.plot(
                speeds[span], frequencies[span, mode], color=colour, ls=dashes, lw=1.2, zorder=4
            )
            handles[words] = line
            start = stop
    if curves.critical:
        met = np.array([(60 * row.speed_hz, row.frequency_hz) for row in curves.critical])
        (dots,) = axes.plot(*met.T, ls="none", marker="o", ms=5, mfc=INK, mec=INK, zorder=5)
        handles["critical speed"] = dots
    if curves.onset is not None:
        handles["motion grows from here"] = axes.axvline(60 * curves.onset.speed_hz, color=BAD, lw=1.5)
    return [(line, words) for words, line in handles.items()]
