"""The speed-frequency diagram (Campbell diagram): where an order of a running speed meets a mode."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

import numpy as np

from vib.show.figures.canvas import BAD, COLOURS, DASHES, FAINT, INK, Picture, legend, sheet, short, style
from vib.show.figures.curves import draw_curves
from vib.show.numbers import significant

if TYPE_CHECKING:
    from matplotlib.axes import Axes

    from vib.modes import Modes
    from vib.screening import Screening
    from vib.screening.screening import SpeedDiagram
    from vib.speeds import SpeedCurves

_MOST_LABELS = 14
_ORDERS = tuple(colour for colour in COLOURS if colour not in (BAD, COLOURS[4], INK))


def speed_pictures(screening: Screening, modes: Modes, curves: Sequence[SpeedCurves] = ()) -> list[Picture]:
    """One diagram per excitation; modes that change with its speed as curves."""
    turning = {shaft.shaft: shaft for shaft in curves}
    return [
        speed_picture(screening, diagram, modes, f"speeds_{number:02d}", turning.get(diagram.excitation))
        for number, diagram in enumerate(screening.diagrams, start=1)
    ]


def speed_picture(
    screening: Screening,
    diagram: SpeedDiagram,
    modes: Modes,
    name: str,
    curves: SpeedCurves | None = None,
) -> Picture:
    """Modes as lines or curves, orders with their bands as wedges, running speeds shaded, meetings marked."""
    with style():
        figure = sheet(7.2, 4.0)
        axes = figure.add_subplot()
        top_speed = diagram.speed_to * 60.0
        axes.set_title(f"Modes against {short(diagram.excitation)}")
        handles = _draw_orders(axes, diagram) if diagram.orders else []
        handles += _draw_fixed(axes, diagram)
        handles += _draw_running(axes, diagram)
        if curves is None:
            handles += _draw_modes(axes, screening, diagram, modes)
        else:
            handles += draw_curves(axes, curves)
        axes.set_xlim(0.0, top_speed or 1.0)
        axes.set_ylim(0.0, diagram.frequency_to_hz)
        axes.set_ylabel("frequency, Hz")
        if diagram.orders:
            axes.set_xlabel("running speed, rpm")
        else:
            axes.set_xticks([])
            axes.set_xlabel("fixed frequencies: no running speed")
        legend(
            axes,
            [handle for handle, _ in handles],
            [label for _, label in handles],
            loc="upper left",
            bbox_to_anchor=(1.17, 1.0),
        )
    return Picture(name, figure, f"Speed-frequency diagram of {diagram.excitation}")


def _draw_orders(axes: Axes, diagram: SpeedDiagram) -> list[tuple[Any, str]]:
    handles = []
    speeds = np.array([0.0, diagram.speed_to])
    for number, order in enumerate(diagram.orders):
        colour = _ORDERS[number % len(_ORDERS)]
        line = order * speeds
        axes.fill_between(
            speeds * 60,
            line * (1 - diagram.band),
            line * (1 + diagram.band),
            color=colour,
            alpha=0.13,
            lw=0,
            zorder=1,
        )
        (handle,) = axes.plot(
            speeds * 60, line, color=colour, ls=DASHES[number % len(DASHES)], lw=1.3, zorder=3
        )
        handles.append((handle, f"order {order:g} ± {100 * diagram.band:.3g} %"))
        _label_order(axes, diagram, order, colour)
    return handles


def _label_order(axes: Axes, diagram: SpeedDiagram, order: float, colour: str) -> None:
    """The order's number where its line leaves the diagram."""
    leaves_right = order * diagram.speed_to <= diagram.frequency_to_hz
    place = (
        (diagram.speed_to * 60, order * diagram.speed_to)
        if leaves_right
        else (diagram.frequency_to_hz / order * 60, diagram.frequency_to_hz)
    )
    axes.annotate(
        f"{order:g}×",
        place,
        xytext=(-3, 3) if leaves_right else (-4, -9),
        textcoords="offset points",
        ha="right",
        color=colour,
        fontsize=7.5,
        fontweight="bold",
        annotation_clip=False,
        bbox={"boxstyle": "square,pad=0.1", "fc": "white", "ec": "none", "alpha": 0.8},
        zorder=6,
    )


def _draw_fixed(axes: Axes, diagram: SpeedDiagram) -> list[tuple[Any, str]]:
    handles = []
    for number, frequency in enumerate(diagram.frequencies_hz):
        axes.axhspan(
            frequency * (1 - diagram.band),
            frequency * (1 + diagram.band),
            color=COLOURS[4],
            alpha=0.18,
            lw=0,
            zorder=1,
        )
        line = axes.axhline(frequency, color=COLOURS[4], ls=(0, (6, 1.5, 1.5, 1.5)), lw=1.4, zorder=2)
        if number == 0:
            handles.append((line, f"fixed frequency ± {100 * diagram.band:.3g} %"))
    return handles


def _draw_running(axes: Axes, diagram: SpeedDiagram) -> list[tuple[Any, str]]:
    """Running speeds as a grey stripe, or a line for a single speed."""
    handle: Any = None
    for low, high in diagram.running:
        if high > low:
            handle = axes.axvspan(low * 60, high * 60, facecolor="#d9d9d9", alpha=0.75, lw=0, zorder=0)
            for edge in (low, high):
                axes.axvline(edge * 60, color=FAINT, lw=0.8, zorder=1)
        else:
            handle = axes.axvline(low * 60, color=INK, lw=2.4, alpha=0.45, zorder=1)
    return [(handle, "running speed")] if handle is not None else []


def _draw_modes(
    axes: Axes, screening: Screening, diagram: SpeedDiagram, modes: Modes
) -> list[tuple[Any, str]]:
    rows = [row for row in screening.rows if row.line.excitation == diagram.excitation]
    objected = {row.mode for row in rows if row.counts}
    handles = {}
    seen: list[float] = []
    shown = {row.mode: row.frequency_hz for row in rows if row.frequency_hz <= diagram.frequency_to_hz}
    for mode, frequency in shown.items():
        bad = mode in objected
        line = axes.axhline(
            frequency,
            color=BAD if bad else INK,
            lw=1.5 if bad else 0.8,
            ls="-" if bad else (0, (1, 1.5)),
            zorder=2,
        )
        handles["mode inside a band" if bad else "mode"] = line
        if len(shown) <= _MOST_LABELS and all(
            abs(frequency - other) > 0.03 * diagram.frequency_to_hz for other in seen
        ):
            seen.append(frequency)
            axes.annotate(
                f"mode {mode}: {significant(frequency, 3)} Hz",
                (1.0, frequency),
                xycoords=("axes fraction", "data"),
                xytext=(3, -2.5),
                textcoords="offset points",
                fontsize=6.5,
                color=BAD if bad else INK,
                annotation_clip=False,
            )
    meeting = _draw_meetings(axes, diagram, rows)
    return [(line, label) for label, line in handles.items()] + meeting


def _draw_meetings(axes: Axes, diagram: SpeedDiagram, rows: list[Any]) -> list[tuple[Any, str]]:
    """Where an order's line crosses a mode: filled if the mode can be driven, hollow if hardly."""
    places: dict[bool, set[tuple[float, float]]] = {True: set(), False: set()}
    for row in rows:
        if row.line.order:
            speed = row.frequency_hz / row.line.order
            if 0 < speed <= diagram.speed_to and row.frequency_hz <= diagram.frequency_to_hz:
                places[row.drivable].add((speed * 60, row.frequency_hz))
    handles: list[tuple[Any, str]] = []
    for drivable, inside, words in (
        (True, INK, "order meets mode"),
        (False, "white", "meets, can't drive it"),
    ):
        if places[drivable]:
            across = np.array(sorted(places[drivable]))
            (dots,) = axes.plot(
                *across.T, ls="none", marker="o", ms=5, mfc=inside, mec=INK, mew=0.9, zorder=5
            )
            handles.append((dots, words))
    return handles
