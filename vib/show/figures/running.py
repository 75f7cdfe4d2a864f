"""A run-up drawn: levels over speed with modes and zones marked, spectra over speed, orders over speed."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from vib.show.figures.canvas import BAD, COLOURS, DASHES, FAINT, INK, Picture, legend, sheet, short, style
from vib.show.tables.ring import KINDS
from vib.units import UnitSystem, shown, shown_unit

if TYPE_CHECKING:
    from matplotlib.axes import Axes

    from vib.response.run_up import RunUp
    from vib.severity import Severity

Array = NDArray[np.float64]
_MOST_PLACES = 8
_MOST_CURVES = 6
_MOST_SPECTRA = 40
_MOST_MARKS = 12
_WIDE_RANGE = 30.0  # of the highest over the middle level; beyond it the axis is logarithmic
_DECADES = 4.0
_FAINT = 1e-3  # of the strongest line; what is below is not drawn
_TALLEST = 5.0  # steps of speed that the tallest stick spans


def run_up_pictures(run_up: RunUp, severity: Severity | None, units: UnitSystem) -> list[Picture]:
    """Per place a run-up curve; of the output that moves fastest the spectra and the orders over speed."""
    places = list(dict.fromkeys(place for place, _ in run_up.places))[:_MOST_PLACES]
    several = len(run_up.speed_hz) > 1
    pictures = []
    if several:
        pictures += [
            curve_picture(run_up, place, severity, units, f"run_up_{number:02d}")
            for number, place in enumerate(places, start=1)
        ]
    straight = [column for column, turning in enumerate(run_up.rotational) if not turning] or [0]
    highest = np.where(np.isfinite(run_up.velocity_rms_m_s), run_up.velocity_rms_m_s, 0.0).max(axis=0)
    worst = max(straight, key=lambda column: float(highest[column]))
    if not several:
        return [line_picture(run_up, worst, units, "lines")]
    pictures.append(spectra_picture(run_up, worst, units, "waterfall"))
    pictures.append(order_picture(run_up, worst, units, "orders"))
    return pictures


def line_picture(run_up: RunUp, output: int, units: UnitSystem, name: str) -> Picture:
    """The lines of one output at a single speed, or where nothing turns: velocity over frequency."""
    kind = KINDS[run_up.rotational[output]][1]
    values = _shown(_velocity(run_up, output)[:1], kind, units)[0]
    with style():
        figure = sheet(7.2, 3.0)
        axes = figure.add_subplot()
        axes.set_title(f"Lines: {short(run_up.outputs[output])}")
        axes.vlines(run_up.frequency_hz[0], 0.0, values, color=COLOURS[0], lw=2.0, zorder=3)
        axes.plot(run_up.frequency_hz[0], values, ls="none", marker="o", ms=4, color=COLOURS[0], zorder=3)
        axes.set_xlim(0.0, 1.1 * float(run_up.frequency_hz.max()))
        axes.set_ylim(0.0, 1.15 * float(values.max()) or 1.0)
        axes.set_xlabel("frequency, Hz")
        axes.set_ylabel(f"velocity, {shown_unit(kind, units)} r.m.s.")
    return Picture(name, figure, f"Lines of {run_up.outputs[output]} over frequency")


def curve_picture(
    run_up: RunUp, place: str, severity: Severity | None, units: UnitSystem, name: str
) -> Picture:
    """Velocity r.m.s. of one place over the speed; modes that lines meet and running speeds are marked."""
    columns = [
        column
        for column, (one, _) in enumerate(run_up.places)
        if one == place and not run_up.rotational[column]
    ] or [column for column, (one, _) in enumerate(run_up.places) if one == place]
    turning = run_up.rotational[columns[0]]
    kind = KINDS[turning][1]
    with style():
        figure = sheet(7.2, 3.8)
        axes = figure.add_subplot()
        axes.set_title(f"Run-up of {short(run_up.shaft or 'the machine')}: {short(place)}", pad=22)
        values = _shown(run_up.velocity_rms_m_s[:, columns], kind, units)
        handles: list[tuple[Any, str]] = []
        for number, column in enumerate(columns[:_MOST_CURVES]):
            look = {"color": COLOURS[number], "ls": DASHES[number], "lw": 1.3}
            (line,) = axes.plot(60 * run_up.speed_hz, values[:, number], zorder=4, **look)
            handles.append((line, run_up.outputs[column]))
        _scale(axes, values)
        if severity is not None and not turning:
            handles += _draw_boundaries(axes, severity, place, units)
        handles += _draw_service(axes, run_up)
        _mark_modes(axes, run_up, columns)
        axes.set_xlim(60 * float(run_up.speed_hz[0]), 60 * float(run_up.speed_hz[-1]))
        axes.set_xlabel("running speed, rpm")
        axes.set_ylabel(f"velocity, {shown_unit(kind, units)} r.m.s.")
        _below(axes, handles)
    return Picture(name, figure, f"Vibration of {place} over the running speed")


def spectra_picture(run_up: RunUp, output: int, units: UnitSystem, name: str) -> Picture:
    """Lines over frequency, one row of sticks for each speed (waterfall): orders fan out, modes stand."""
    kind = KINDS[run_up.rotational[output]][1]
    rows = _evenly(run_up.speed_hz, _MOST_SPECTRA)
    frequency, rpm = run_up.frequency_hz[rows], 60 * run_up.speed_hz[rows]
    velocity = _velocity(run_up, output)[rows]
    greatest = float(velocity.max()) or 1.0
    strong = velocity.max(axis=0) >= _FAINT * greatest
    step = _step(rpm)
    height = _TALLEST * step
    with style():
        figure = sheet(7.2, 4.8)
        axes = figure.add_subplot()
        axes.set_title(f"Lines over the speed: {short(run_up.outputs[output])}")
        for base, where, size in zip(rpm, frequency[:, strong], velocity[:, strong], strict=True):
            axes.axhline(base, color="#e4e4e4", lw=0.6, zorder=1)
            tops = base + height * size / greatest
            axes.vlines(where, base, tops, color=COLOURS[0], lw=1.5, zorder=3)
            axes.plot(where, tops, ls="none", marker="o", ms=1.6, color=COLOURS[0], zorder=3)
        right = 1.05 * float(frequency[:, strong].max())
        met = [one for one in _met(run_up) if one < right]
        for one in met:
            natural = axes.axvline(one, color=BAD, ls=DASHES[2], lw=0.9, zorder=2)
        axes.set_xlim(0.0, right)
        axes.set_ylim(float(rpm[0]) - 0.5 * step, float(rpm[-1]) + 1.1 * height)
        axes.set_xlabel("frequency, Hz")
        axes.set_ylabel("running speed, rpm")
        axes.grid(visible=False)
        tallest = f"{float(shown(greatest, kind, units)):.3g} {shown_unit(kind, units)} r.m.s."
        (stick,) = axes.plot([], [], color=COLOURS[0], lw=1.5)
        handles = [(stick, f"line, the tallest {tallest}")]
        _below(axes, handles + ([(natural, "natural frequency that a line meets")] if met else []))
    return Picture(name, figure, f"Waterfall of {run_up.outputs[output]}: lines over frequency and speed")


def order_picture(run_up: RunUp, output: int, units: UnitSystem, name: str) -> Picture:
    """What each line adds to one output over the speed, the strongest ones."""
    kind = KINDS[run_up.rotational[output]][1]
    velocity = _velocity(run_up, output)
    highest = velocity.max(axis=0)
    strongest = np.argsort(-highest, kind="stable")[:_MOST_CURVES]
    strongest = np.sort(strongest[highest[strongest] >= _FAINT * highest.max()])
    with style():
        figure = sheet(7.2, 3.6)
        axes = figure.add_subplot()
        axes.set_title(f"Orders over the speed: {short(run_up.outputs[output])}", pad=22)
        handles: list[tuple[Any, str]] = []
        values = _shown(velocity[:, strongest], kind, units)
        total = _shown(run_up.velocity_rms_m_s[:, [output]], kind, units)
        (line,) = axes.plot(60 * run_up.speed_hz, total[:, 0], color=FAINT, lw=2.6, zorder=2)
        handles.append((line, "all lines"))
        for number, group in enumerate(strongest):
            look = {"color": COLOURS[number], "ls": DASHES[number], "lw": 1.2}
            (line,) = axes.plot(60 * run_up.speed_hz, values[:, number], zorder=4, **look)
            handles.append((line, _group_words(run_up, run_up.groups[group])))
        _scale(axes, np.hstack([values, total]))
        handles += _draw_service(axes, run_up)
        _mark_modes(axes, run_up, [output])
        axes.set_xlim(60 * float(run_up.speed_hz[0]), 60 * float(run_up.speed_hz[-1]))
        axes.set_xlabel("running speed, rpm")
        axes.set_ylabel(f"velocity, {shown_unit(kind, units)} r.m.s.")
        _below(axes, handles)
    return Picture(name, figure, f"What each line adds to {run_up.outputs[output]} over the running speed")


def _shown(values: Array, kind: str, units: UnitSystem) -> Array:
    """In the unit shown; a gap where there is no steady vibration."""
    return np.where(np.isfinite(values), values, np.nan) * float(shown(1.0, kind, units))


def _scale(axes: Axes, values: Array) -> None:
    """Logarithmic where peaks would flatten all else."""
    finite = values[np.isfinite(values) & (values > 0)]
    if finite.size and finite.max() > _WIDE_RANGE * np.median(finite):
        from matplotlib.ticker import FuncFormatter, NullFormatter

        axes.set_yscale("log")
        axes.set_ylim(float(max(finite.min(), finite.max() / 10**_DECADES)) / 1.5, float(finite.max()) * 2)
        axes.yaxis.set_major_formatter(FuncFormatter(lambda value, _: f"{value:g}"))
        axes.yaxis.set_minor_formatter(NullFormatter())
    else:
        axes.set_ylim(0.0, float(finite.max()) * 1.12 if finite.size else 1.0)


def _draw_boundaries(axes: Axes, severity: Severity, place: str, units: UnitSystem) -> list[tuple[Any, str]]:
    """The zone boundaries of velocity that the place was judged by, as far as the picture reaches."""
    limits = [
        limit
        for row in severity.rows
        if row.place == place
        for limit in row.limits
        if limit.quantity == "velocity_rms"
    ]
    if not limits:
        return []
    handles: list[tuple[Any, str]] = []
    _, top = axes.get_ylim()
    for pair, value in zip(("A/B", "B/C", "C/D"), limits[0].values, strict=True):
        level = shown(value, "velocity", units)
        if level > 1.5 * top:
            continue
        line = axes.axhline(level, color=INK, lw=0.8, ls=DASHES[3], zorder=3)
        axes.annotate(
            pair,
            (1.0, level),
            xycoords=("axes fraction", "data"),
            xytext=(3, -2.5),
            textcoords="offset points",
            fontsize=7,
            annotation_clip=False,
        )
        axes.set_ylim(top=max(axes.get_ylim()[1], 1.1 * level))
        if not handles:
            handles.append(
                (line, f"zones by {limits[0].source.split(',')[0].split(' annex')[0]}, from memory")
            )
    return handles


def _draw_service(axes: Axes, run_up: RunUp) -> list[tuple[Any, str]]:
    handle: Any = None
    if run_up.in_service.all():  # nothing to tell them from
        return []
    for low, high in run_up.service_hz:
        if high > low:
            handle = axes.axvspan(60 * low, 60 * high, facecolor="#d9d9d9", alpha=0.6, lw=0, zorder=0)
        else:
            handle = axes.axvline(60 * low, color=INK, lw=3.0, alpha=0.25, zorder=1)
    return [(handle, "running speed")] if handle is not None else []


def _mark_modes(axes: Axes, run_up: RunUp, columns: list[int]) -> None:
    """Ticks above the curve where lines meet modes: the number of the mode, and the order that meets it.

    Of many the ones at which the outputs move fastest.
    """
    velocity = np.nan_to_num(run_up.velocity_rms_m_s[:, columns], posinf=0.0).max(axis=1)
    inside = [row for row in run_up.resonances if run_up.speed_hz[0] <= row.speed_hz <= run_up.speed_hz[-1]]
    ranked = sorted(inside, key=lambda row: -float(np.interp(row.speed_hz, run_up.speed_hz, velocity)))
    taken: list[float] = []
    span = float(run_up.speed_hz[-1] - run_up.speed_hz[0]) or 1.0
    for row in ranked:
        if len(taken) >= _MOST_MARKS:
            break
        axes.axvline(60 * row.speed_hz, ymin=0.97, ymax=1.0, color=BAD, lw=1.2, zorder=5, clip_on=False)
        if all(abs(row.speed_hz - other) > 0.075 * span for other in taken):
            taken.append(row.speed_hz)
            order = run_up.lines[row.line].order
            text = f"mode {row.mode}" + (f"\n{order:.4g}×" if order is not None else "")
            axes.annotate(
                text,
                (60 * row.speed_hz, 1.0),
                xycoords=("data", "axes fraction"),
                xytext=(0, 2),
                textcoords="offset points",
                ha="center",
                va="bottom",
                fontsize=6.5,
                color=BAD,
                annotation_clip=False,
            )


def _met(run_up: RunUp) -> list[float]:
    """The natural frequencies that lines meet, each once."""
    found: list[float] = []
    for frequency in sorted(row.frequency_hz for row in run_up.resonances):
        if not found or frequency > 1.005 * found[-1]:
            found.append(frequency)
    return found[:_MOST_MARKS]


def _evenly(speed_hz: Array, most: int) -> list[int]:
    """Numbers of at most so many speeds, about evenly spaced."""
    wanted = np.linspace(speed_hz[0], speed_hz[-1], most)
    return sorted({int(np.argmin(np.abs(speed_hz - speed))) for speed in wanted})


def _step(rpm: Array) -> float:
    return float(np.median(np.diff(rpm)))


def _group_words(run_up: RunUp, group: tuple[int, ...]) -> str:
    words = [run_up.lines[number].words for number in group]
    return words[0] if len(words) == 1 else f"{words[0]} and {len(words) - 1} more"


def _velocity(run_up: RunUp, output: int) -> Array:
    """(k, groups) r.m.s. velocity of an output by the lines of each frequency; 0 where unstable."""
    rates = 2 * np.pi * run_up.frequency_hz
    return np.asarray(np.nan_to_num(rates * np.abs(run_up.combined_m[:, :, output])) / np.sqrt(2))


def _below(axes: Axes, handles: list[tuple[Any, str]]) -> None:
    legend(
        axes,
        [handle for handle, _ in handles],
        [label for _, label in handles],
        loc="upper left",
        bbox_to_anchor=(0.0, -0.13),
        ncols=3,
    )
