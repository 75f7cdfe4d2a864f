"""Sweeps drawn: curves against one quantity, maps over two."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import numpy as np

from vib.show.figures.canvas import BAD, COLOURS, DASHES, INK, Picture, legend, sheet, short, style
from vib.show.figures.scatter import draw_bands, stretch
from vib.show.numbers import significant
from vib.show.tables.quantities import entry_words
from vib.units import UnitSystem, shown, shown_unit

if TYPE_CHECKING:
    from matplotlib.axes import Axes

    from vib.scatter.sweep import Sweep, Swept
    from vib.screening import Line

_MOST_CURVES, _MOST_MAPS = 10, 6
_EDGE = {"colors": BAD, "linewidths": 1.6}
Handles = list[tuple[Any, str]]


def sweep_pictures(found: Sweep, units: UnitSystem) -> list[Picture]:
    """Curves of one quantity; of two a map of each mode, and of each output."""
    if len(found.swept) == 1:
        return [curves_picture(found, units)]
    maps = [map_picture(found, units)]
    return [*maps, level_map_picture(found, units)] if found.outputs else maps


def _lines(found: Sweep) -> list[Line]:
    if not found.study.excitations:
        return []
    from vib.screening import excitation_lines

    return list(excitation_lines(found.study.excitations))


def _axis(found: Sweep, one: Swept, units: UnitSystem) -> tuple[Any, str, float]:
    """Values as shown, the label with the unit, and the nominal value as shown."""
    scale = 100.0 if one.kind == "ratio" else float(shown(1.0, one.kind, units))
    unit = "%" if one.kind == "ratio" else shown_unit(one.kind, units)
    return one.values * scale, f"{short(entry_words(found.study, one.path))}, {unit}", one.nominal * scale


def _elastic(found: Sweep, most: int) -> list[int]:
    return [mode for mode in range(found.modes.count) if found.modes.frequencies_hz[mode] > 0][:most]


def _look(place: int) -> dict[str, Any]:
    return {"color": COLOURS[place % len(COLOURS)], "ls": DASHES[place % len(DASHES)], "zorder": 4}


def curves_picture(found: Sweep, units: UnitSystem) -> Picture:
    """Frequencies over the quantity with the bands of what shakes; below them damping and levels."""
    values, label, nominal = _axis(found, found.swept[0], units)
    damped = bool(np.nanmax(found.damping_ratios, initial=0.0) > 0)
    count = 1 + damped + bool(found.outputs)
    with style():
        figure = sheet(7.2, 2.2 + 1.6 * count)
        panels: Any = figure.subplots(
            count, 1, sharex=True, squeeze=False, height_ratios=(2, *(1,) * (count - 1))
        )[:, 0]
        panels[0].set_title(f"Modes against {short(entry_words(found.study, found.swept[0].path))}")
        legends = [_draw_frequencies(panels[0], found, values)]
        if damped:
            _draw_damping(panels[1], found, values)
            legends.append([])
        if found.outputs:
            legends.append(_draw_levels(panels[-1], found, values, units))
        if values.min() <= nominal <= values.max():
            marks = [panel.axvline(nominal, color=INK, lw=1.0, ls=(0, (4, 2)), zorder=3) for panel in panels]
            legends[0].append((marks[0], "value of the study"))
        if values.min() > 0 and np.allclose(np.diff(np.log(values)), np.log(values[1] / values[0])):
            panels[0].set_xscale("log")
        panels[0].set_xlim(values.min(), values.max())
        panels[-1].set_xlabel(label)
        for panel, handles in zip(panels, legends, strict=True):
            beside = {"loc": "upper left", "bbox_to_anchor": (1.01, 1.0)}
            legend(panel, [one for one, _ in handles], [words for _, words in handles], **beside)
    return Picture("sweep", figure, f"Modes against {label}")


def _draw_frequencies(axes: Axes, found: Sweep, values: Any) -> Handles:
    handles: Handles = []
    modes = _elastic(found, _MOST_CURVES)
    for place, mode in enumerate(modes):
        (line,) = axes.plot(values, found.frequencies_hz[:, mode], **_look(place))
        handles.append((line, f"mode {mode + 1}"))
    drawn = found.frequencies_hz[:, modes]
    handles += draw_bands(axes, _lines(found), vertical=False)
    stretch(axes, "y", float(np.nanmin(drawn)), float(np.nanmax(drawn)))
    axes.set_ylabel("frequency, Hz")
    return handles


def _draw_damping(axes: Axes, found: Sweep, values: Any) -> None:
    for place, mode in enumerate(_elastic(found, _MOST_CURVES)):
        axes.plot(values, 100 * found.damping_ratios[:, mode], **_look(place))
    axes.set_ylabel("damping ratio, %")
    axes.set_ylim(bottom=min(0.0, 100 * float(np.nanmin(found.damping_ratios))))


def _draw_levels(axes: Axes, found: Sweep, values: Any, units: UnitSystem) -> Handles:
    """R.m.s. velocity of each output; the boundaries of zones where all have the same."""
    handles: Handles = []
    scale = float(shown(1.0, "velocity", units))
    for place, name in enumerate(found.outputs[:_MOST_CURVES]):
        level = scale * found.velocity_rms_m_s[:, place]
        (line,) = axes.plot(values, np.where(np.isfinite(level), level, np.nan), **_look(place))
        handles.append((line, name))
    top = axes.get_ylim()[1]
    worst = int(np.argmax(np.nan_to_num(found.velocity_rms_m_s, posinf=0.0).max(axis=0)))
    for boundary in found.boundaries[worst]:
        if boundary.quantity == "velocity_rms":
            for value, zone in zip(boundary.values, ("B", "C", "D"), strict=True):
                if scale * value < 1.3 * top:
                    line = axes.axhline(scale * value, color=BAD, lw=0.9, ls=(0, (6, 2)), zorder=2)
                    axes.annotate(
                        f"zone {zone}", (1.0, scale * value), xycoords=("axes fraction", "data"),
                        xytext=(-3, 2), textcoords="offset points", ha="right", fontsize=6.5, color=BAD,
                    )  # fmt: skip
            handles.append((axes.lines[-1], f"zones of {found.outputs[worst]}"))
    axes.set_ylim(bottom=0.0)
    axes.set_ylabel(f"velocity, {shown_unit('velocity', units)} r.m.s.")
    return handles


def map_picture(found: Sweep, units: UnitSystem) -> Picture:
    """One panel a mode: its frequency over both quantities as levels, the edges of bands as lines."""
    modes = _elastic(found, _MOST_MAPS)
    edges = [edge for line in _lines(found) for edge in (line.band_from_hz, line.band_to_hz)]
    titles = [f"mode {m + 1}: {significant(found.modes.frequencies_hz[m], 4)} Hz nominal" for m in modes]
    with style():
        figure = _maps(
            found,
            units,
            [found.frequencies_hz[:, :, mode] for mode in modes],
            titles,
            [[(edge, f"band {significant(edge, 3)} Hz") for edge in edges]] * len(modes),
            "frequency, Hz",
        )
    return Picture("sweep_map", figure, "Natural frequencies over two quantities")


def level_map_picture(found: Sweep, units: UnitSystem) -> Picture:
    """One panel an output: its r.m.s. velocity over both quantities, the boundaries of zones as lines."""
    scale, unit = float(shown(1.0, "velocity", units)), shown_unit("velocity", units)
    moving = np.nan_to_num(found.velocity_rms_m_s, posinf=0.0).max(axis=(0, 1))
    picked = [int(q) for q in np.argsort(-moving)[:_MOST_MAPS] if moving[q] > 0.01 * moving.max(initial=0.0)]
    marks = [
        [
            (scale * value, f"zone {zone}")
            for one in found.boundaries[q]
            if one.quantity == "velocity_rms"
            for value, zone in zip(one.values, ("B", "C", "D"), strict=True)
        ]
        for q in picked
    ]
    with style():
        figure = _maps(
            found,
            units,
            [scale * found.velocity_rms_m_s[:, :, q] for q in picked],
            [found.outputs[q] for q in picked],
            marks,
            f"velocity, {unit} r.m.s.",
        )
    return Picture("sweep_level_map", figure, "R.m.s. velocity over two quantities")


def _maps(
    found: Sweep,
    units: UnitSystem,
    grids: list[Any],
    titles: list[str],
    marks: list[list[tuple[float, str]]],
    bar_label: str,
) -> Any:
    """One filled map a grid (k1, k2), with marked levels as lines; call it inside `style`."""
    from matplotlib.patheffects import withStroke

    (across, label_x, nominal_x), (up, label_y, nominal_y) = (_axis(found, one, units) for one in found.swept)
    columns = min(2, len(grids)) or 1
    rows = -(-len(grids) // columns) or 1
    figure = sheet(7.2, 0.4 + 2.5 * rows)
    panels: Any = figure.subplots(rows, columns, squeeze=False, sharex=True, sharey=True)
    for axes in panels.ravel()[len(grids) :]:
        axes.set_visible(False)
    for axes, raw, title, marked in zip(panels.ravel(), grids, titles, marks, strict=False):
        grid = np.where(np.isfinite(raw), raw, np.nan).T
        least, most = float(np.nanmin(grid)), float(np.nanmax(grid))
        axes.grid(visible=False)
        flat = most - least <= 1e-6 * abs(most)
        filled = axes.contourf(
            across, up, grid, levels=[least * (1 - 1e-6), most * (1 + 1e-6)] if flat else 12, cmap="cividis"
        )
        figure.colorbar(filled, ax=axes).set_label(bar_label)
        inside = {value: words for value, words in sorted(marked) if least < value < most}
        if inside:
            drawn = axes.contour(across, up, grid, levels=list(inside), **_EDGE)
            labels = axes.clabel(drawn, fmt=inside, fontsize=6.5, colors=[INK])
            halo = withStroke(linewidth=2.0, foreground="white")
            for label in labels:
                label.set_path_effects([halo])
        axes.plot([nominal_x], [nominal_y], ls="none", marker="o", ms=4, mfc="white", mec=INK, clip_on=True)
        axes.set_xlim(across.min(), across.max())
        axes.set_ylim(up.min(), up.max())
        axes.set_title(title, fontsize=7.5)
        axes.locator_params(axis="x", nbins=4)
    for axes in panels[-1]:
        axes.set_xlabel(label_x)
    for axes in panels[:, 0]:
        axes.set_ylabel(label_y)
    return figure
