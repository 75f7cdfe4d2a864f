"""Scatter drawn: frequencies against the bands of what shakes, histograms, and what it all comes from."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Any, Literal

import numpy as np

from vib.show.figures.canvas import BAD, COLOURS, INK, Picture, legend, sheet, short, style
from vib.show.numbers import significant
from vib.show.tables.quantities import factor_words
from vib.show.tables.scatter import elastic, strongest
from vib.units import UnitSystem, shown, shown_unit

if TYPE_CHECKING:
    from matplotlib.axes import Axes

    from vib.scatter.levels import Levels
    from vib.scatter.scatter import Ranking, Scatter
    from vib.screening import Line

_MOST_MODES, _MOST_RANKED, _MOST_FACTORS, _MOST_LEVELS = 12, 6, 6, 6
_FAR = 4.0  # ratio of the ends of an axis from which it is logarithmic
_BANDS = (COLOURS[4], COLOURS[5], COLOURS[3], COLOURS[2])
_HATCHES = ("", "//", "\\\\", "..")


def scatter_pictures(found: Scatter, units: UnitSystem) -> list[Picture]:
    """The overview and the histograms, levels where there are any, and what the scatter comes from."""
    modes = elastic(found)
    if not modes:
        return []
    pictures = [range_picture(found), histogram_picture(found)]
    if found.levels is not None:
        pictures.append(level_picture(found.levels, units))
    ranking = found.ranking
    if ranking is not None and any(strongest(ranking.frequencies.total[:, mode]) for mode in modes):
        pictures.append(ranking_picture(found, ranking))
    return pictures


def range_picture(found: Scatter) -> Picture:
    """One row a mode: all samples, half and 95 % of them, the nominal value; bands as stripes across."""
    modes = elastic(found)[:_MOST_MODES]
    with style():
        figure = sheet(7.2, 1.3 + 0.26 * len(modes))
        axes = figure.add_subplot()
        axes.set_title("Natural frequencies and the bands of what shakes")
        handles = draw_bands(axes, _lines(found), vertical=True)
        for row, mode in enumerate(modes):
            own = found.frequencies_hz[mode]
            at = {percent: estimate.value for percent, estimate in own.percentiles.items()}
            axes.plot([own.least, own.most], [row, row], color=INK, lw=0.8, zorder=3)
            axes.plot(
                [at[2.5], at[97.5]], [row, row], color=COLOURS[0], lw=3.5, solid_capstyle="butt", zorder=4
            )
            axes.plot(
                [at[25.0], at[75.0]], [row, row], color=COLOURS[0], lw=8, solid_capstyle="butt", zorder=4
            )
            axes.plot(
                [own.nominal], [row], ls="none", marker="o", ms=2.6, mfc="white", mec=INK, mew=0.6, zorder=6
            )
        drawn = axes.get_lines()[-4:]
        handles = [
            *zip(drawn, ("all samples", "95 % of them", "half of them", "nominal"), strict=True),
            *handles,
        ]
        own_ranges = [found.frequencies_hz[mode] for mode in modes]
        stretch(axes, "x", min(own.least for own in own_ranges), max(own.most for own in own_ranges))
        axes.set_yticks(range(len(modes)), [f"mode {mode + 1}" for mode in modes])
        axes.set_ylim(len(modes) - 0.4, -0.6)
        axes.grid(visible=False, axis="y")
        axes.set_xlabel("frequency, Hz")
        legend(
            axes,
            [one for one, _ in handles],
            [words for _, words in handles],
            loc="upper left",
            bbox_to_anchor=(1.01, 1.0),
        )
    return Picture(
        "scatter_ranges", figure, "Scatter of the natural frequencies against the excitation bands"
    )


def stretch(axes: Axes, which: Literal["x", "y"], low: float, high: float) -> None:
    """An axis of frequency over a range: logarithmic, with plain numbers, where its ends lie far apart."""
    from matplotlib.ticker import FuncFormatter, LogLocator, NullFormatter

    axis = axes.xaxis if which == "x" else axes.yaxis
    margin = 0.05 * (high - low) or 0.05 * high or 1.0
    ends = (low - margin, high + margin)
    if high > _FAR * low > 0:
        (axes.set_xscale if which == "x" else axes.set_yscale)("log")
        axis.set_major_locator(LogLocator(subs=(1.0, 2.0, 5.0)))
        axis.set_major_formatter(FuncFormatter(lambda value, _: f"{value:g}"))
        axis.set_minor_formatter(NullFormatter())
        ends = (low / 1.15, high * 1.15)
    (axes.set_xlim if which == "x" else axes.set_ylim)(*ends)


def _lines(found: Scatter) -> list[Line]:
    return [] if found.chances is None else [row.line for row in found.chances.by_line]


def draw_bands(axes: Axes, lines: Sequence[Line], *, vertical: bool) -> list[tuple[Any, str]]:
    """The nominal bands as stripes; colour and hatching tell the excitations apart."""
    handles: dict[str, Any] = {}
    names = list(dict.fromkeys(line.excitation for line in lines))
    for line in lines:
        number = names.index(line.excitation)
        draw = axes.axvspan if vertical else axes.axhspan
        handles[line.excitation] = draw(
            line.band_from_hz,
            line.band_to_hz,
            facecolor=_BANDS[number % len(_BANDS)],
            edgecolor="white",
            hatch=_HATCHES[number % len(_HATCHES)],
            alpha=0.3,
            lw=0,
            zorder=1,
        )
    return [(handle, f"band of {short(name, 24)}") for name, handle in handles.items()]


def histogram_picture(found: Scatter) -> Picture:
    """One panel a mode: how often each frequency comes, with the bands and the nominal value."""
    modes = elastic(found)[:_MOST_MODES]
    columns = min(3, len(modes))
    rows = -(-len(modes) // columns)
    with style():
        figure = sheet(7.2, 0.5 + 1.65 * rows)
        panels: Any = figure.subplots(rows, columns, squeeze=False)
        for axes in panels.ravel()[len(modes) :]:
            axes.set_visible(False)
        for mode, axes in zip(modes, panels.ravel(), strict=False):
            own = found.frequencies_hz[mode]
            values = found.batch.frequencies_hz[:, mode]
            draw_bands(axes, _lines(found), vertical=True)
            bins = np.linspace(own.least, own.most, 1 + _bins(len(values))) if own.most > own.least else 1
            counts, edges = np.histogram(values, bins)
            axes.stairs(100 * counts / len(values), edges, fill=True, color=COLOURS[0], alpha=0.75, zorder=3)
            axes.axvline(own.nominal, color=INK, lw=1.2, ls=(0, (4, 2)), zorder=4)
            margin = 0.12 * (own.most - own.least) or 0.01 * own.most
            axes.set_xlim(own.least - margin, own.most + margin)
            axes.set_title(f"mode {mode + 1}: {significant(own.nominal, 4)} Hz nominal", fontsize=7.5)
            axes.tick_params(labelsize=7)
        for axes in panels[:, 0]:
            axes.set_ylabel("samples, %")
        for axes in panels[-1]:
            axes.set_xlabel("frequency, Hz")
    return Picture("scatter_histograms", figure, "How often each natural frequency comes")


def level_picture(levels: Levels, units: UnitSystem) -> Picture:
    """One panel an output that moves: how often each level comes, with the boundaries of the zones."""
    scale = float(shown(1.0, "velocity", units))
    values = np.where(np.isfinite(levels.velocity_rms_m_s), scale * levels.velocity_rms_m_s, np.nan)
    moving = np.nanmax(np.nan_to_num(values), axis=0)
    picked = [int(q) for q in np.argsort(-moving)[:_MOST_LEVELS] if moving[q] >= 0.01 * moving.max()]
    columns = min(2, len(picked)) or 1
    rows = -(-len(picked) // columns) or 1
    with style():
        figure = sheet(7.2, 0.5 + 1.9 * rows)
        panels: Any = figure.subplots(rows, columns, squeeze=False)
        for axes in panels.ravel()[len(picked) :]:
            axes.set_visible(False)
        for output, axes in zip(picked, panels.ravel(), strict=False):
            level = levels.outputs[output]
            own = values[:, output][np.isfinite(values[:, output])]
            counts, edges = np.histogram(own, _bins(len(own)))
            axes.stairs(100 * counts / len(own), edges, fill=True, color=COLOURS[0], alpha=0.75, zorder=3)
            axes.axvline(scale * level.velocity_m_s.nominal, color=INK, lw=1.2, ls=(0, (4, 2)), zorder=4)
            for boundary in level.boundaries:
                marks = zip(boundary.values, ("B", "C", "D"), strict=True)
                for value, zone in marks if boundary.quantity == "velocity_rms" else ():
                    if scale * value < 1.1 * own.max():
                        _mark_zone(axes, scale * value, zone)
            axes.set_xlim(left=0.0)
            axes.set_title(level.output, fontsize=7.5)
            axes.set_xlabel(f"velocity, {shown_unit('velocity', units)} r.m.s.")
        for axes in panels[:, 0]:
            axes.set_ylabel("samples, %")
    return Picture("scatter_levels", figure, "How often each level comes at the worst running speed")


def _mark_zone(axes: Axes, value: float, zone: str) -> None:
    axes.axvline(value, color=BAD, lw=1.2, zorder=4)
    axes.annotate(
        f"zone {zone}", (value, 1.0), xycoords=("data", "axes fraction"), xytext=(3, -8),
        textcoords="offset points", fontsize=6.5, color=BAD, zorder=5,
    )  # fmt: skip


def _bins(count: int) -> int:
    """How many bars show so many samples without showing their chance."""
    return min(30, max(1, int(2 * count**0.4)))


def ranking_picture(found: Scatter, ranking: Ranking) -> Picture:
    """One panel a mode: total effects as bars, their part of the first order darker, errors as whiskers."""
    modes = elastic(found)[:_MOST_RANKED]
    columns = min(2, len(modes))
    rows = -(-len(modes) // columns)
    own = ranking.frequencies
    most = max([1, *(len(strongest(own.total[:, mode])[:_MOST_FACTORS]) for mode in modes)])
    with style():
        figure = sheet(7.2, 0.5 + rows * (0.65 + 0.2 * most))
        panels: Any = figure.subplots(rows, columns, squeeze=False, sharex=True)
        for axes in panels.ravel()[len(modes) :]:
            axes.set_visible(False)
        for mode, axes in zip(modes, panels.ravel(), strict=False):
            factors = strongest(own.total[:, mode])[:_MOST_FACTORS]
            places = np.arange(len(factors))
            total, first = 100 * own.total[factors, mode], 100 * own.first[factors, mode]
            light = axes.barh(places, total, height=0.7, color=COLOURS[5], label="total")
            dark = axes.barh(
                places, np.clip(first, 0, None), height=0.35, color=COLOURS[0], label="first order"
            )
            whiskers = {"fmt": "none", "ecolor": INK, "elinewidth": 0.8, "capsize": 2}
            axes.errorbar(total, places, xerr=100 * own.total_error[factors, mode], **whiskers)
            axes.set_yticks(
                places,
                [short(factor_words(found.study, ranking.factors[row]), 30) for row in factors],
                fontsize=7,
            )
            axes.set_ylim(most - 0.4, -0.6)
            axes.grid(visible=False, axis="y")
            axes.set_title(
                f"mode {mode + 1}: {significant(found.modes.frequencies_hz[mode], 4)} Hz", fontsize=7.5
            )
        panels[0, 0].set_xlim(0.0, 110.0)
        for axes in panels[-1]:
            axes.set_xlabel("share of the variance, %")
        legend(panels[0, -1], [light, dark], ["total, with its interval", "first order"], loc="lower right")
    return Picture("scatter_ranking", figure, "Which quantities the scatter of each frequency comes from")
