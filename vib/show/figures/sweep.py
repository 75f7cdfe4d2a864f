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
    from vib.scatter.sweep import Sweep, Swept
    from vib.screening import Line

_MOST_CURVES, _MOST_MAPS = 10, 6


def sweep_pictures(found: Sweep, units: UnitSystem) -> list[Picture]:
    """Curves of one quantity, or one map a mode of two."""
    if len(found.swept) == 1:
        return [curves_picture(found, units)]
    return [map_picture(found, units)]


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


def curves_picture(found: Sweep, units: UnitSystem) -> Picture:
    """Frequencies over the quantity with the bands of what shakes, damping below."""
    values, label, nominal = _axis(found, found.swept[0], units)
    modes = [mode for mode in range(found.modes.count) if found.modes.frequencies_hz[mode] > 0][:_MOST_CURVES]
    damped = bool(np.nanmax(found.damping_ratios[:, modes], initial=0.0) > 0)
    with style():
        figure = sheet(7.2, 5.2 if damped else 3.8)
        rows: Any = figure.subplots(
            1 + damped, 1, sharex=True, squeeze=False, height_ratios=(2, 1)[: 1 + damped]
        )
        axes = rows[0, 0]
        axes.set_title("Modes against one quantity")
        handles = []
        for place, mode in enumerate(modes):
            look: dict[str, Any] = {
                "color": COLOURS[place % len(COLOURS)], "ls": DASHES[place % len(DASHES)], "zorder": 4
            }  # fmt: skip
            (line,) = axes.plot(values, found.frequencies_hz[:, mode], **look)
            handles.append((line, f"mode {mode + 1}"))
            if damped:
                rows[1, 0].plot(values, 100 * found.damping_ratios[:, mode], **look)
        handles += draw_bands(axes, _lines(found), vertical=False)
        shown_hz = found.frequencies_hz[:, modes]
        stretch(axes, "y", float(np.nanmin(shown_hz)), float(np.nanmax(shown_hz)))
        axes.set_ylabel("frequency, Hz")
        if damped:
            rows[1, 0].set_ylabel("damping ratio, %")
            rows[1, 0].set_ylim(bottom=0.0)
        if values.min() <= nominal <= values.max():
            for panel in rows[:, 0]:
                line = panel.axvline(nominal, color=INK, lw=1.0, ls=(0, (4, 2)), zorder=3)
            handles.append((line, "value of the study"))
        if values.min() > 0 and np.allclose(np.diff(np.log(values)), np.log(values[1] / values[0])):
            axes.set_xscale("log")
        axes.set_xlim(values.min(), values.max())
        rows[-1, 0].set_xlabel(label)
        legend(
            axes, [one for one, _ in handles], [words for _, words in handles],
            loc="upper left", bbox_to_anchor=(1.01, 1.0),
        )  # fmt: skip
    return Picture("sweep", figure, f"Modes against {label}")


def map_picture(found: Sweep, units: UnitSystem) -> Picture:
    """One panel a mode: its frequency over both quantities as levels, the edges of bands as lines."""
    (across, label_x, nominal_x), (up, label_y, nominal_y) = (_axis(found, one, units) for one in found.swept)
    modes = [mode for mode in range(found.modes.count) if found.modes.frequencies_hz[mode] > 0][:_MOST_MAPS]
    columns = min(2, len(modes))
    rows = -(-len(modes) // columns)
    with style():
        figure = sheet(7.2, 0.4 + 2.5 * rows)
        panels: Any = figure.subplots(rows, columns, squeeze=False, sharex=True, sharey=True)
        for axes in panels.ravel()[len(modes) :]:
            axes.set_visible(False)
        for mode, axes in zip(modes, panels.ravel(), strict=False):
            grid = found.frequencies_hz[:, :, mode].T
            axes.grid(visible=False)
            flat = bool(np.ptp(grid) <= 1e-6 * np.abs(grid).max())
            levels = 12 if not flat else [grid.min() * (1 - 1e-6), grid.max() * (1 + 1e-6)]
            filled = axes.contourf(across, up, grid, levels=levels, cmap="cividis")
            bar = figure.colorbar(filled, ax=axes)
            bar.set_label("frequency, Hz")
            edges = [edge for line in _lines(found) for edge in (line.band_from_hz, line.band_to_hz)]
            inside = sorted({edge for edge in edges if grid.min() < edge < grid.max()})
            if inside:
                drawn = axes.contour(across, up, grid, levels=inside, colors=BAD, linewidths=1.6)
                axes.clabel(drawn, fmt=lambda value: f"band {significant(value, 3)} Hz", fontsize=6.5)
            axes.plot(
                [nominal_x], [nominal_y], ls="none", marker="o", ms=4, mfc="white", mec=INK, clip_on=True
            )
            axes.set_xlim(across.min(), across.max())
            axes.set_ylim(up.min(), up.max())
            nominal = significant(found.modes.frequencies_hz[mode], 4)
            axes.set_title(f"mode {mode + 1}: {nominal} Hz at the values of the study", fontsize=7.5)
        for axes in panels[-1]:
            axes.set_xlabel(label_x)
        for axes in panels[:, 0]:
            axes.set_ylabel(label_y)
    return Picture("sweep_map", figure, f"Natural frequencies over {label_x} and {label_y}")
