"""Mode shapes: a structure at rest and displaced, or the bars of a bare matrix."""

from __future__ import annotations

from itertools import pairwise
from typing import TYPE_CHECKING, Any

import numpy as np

from vib.show.figures.canvas import COLOURS, FAINT, INK, Picture, sheet, short, style
from vib.show.figures.space import Array, bare_axes, draw_at_rest, draw_triad, extent, moved, on_paper, smooth
from vib.show.figures.surface import outline, paint
from vib.show.numbers import significant

if TYPE_CHECKING:
    from matplotlib.axes import Axes

    from vib.modes import Modes
    from vib.system import Anatomy, MeshView

_SIZE = 0.13  # largest displacement drawn, as a share of the longest diagonal
_MOST_BARS = 40
_LEVELS = 12  # steps of the colour scale
_STROKES = 60  # pieces a member is drawn with, about
_NOTHING = 1e-7  # motion of points beside that of the freedoms, below which there is none


def shape_picture(modes: Modes, index: int, up: str = "z") -> Picture:
    """One mode; of a complex shape, the moment of the largest motion."""
    number = index + 1
    frequency = f"{significant(modes.frequencies_hz[index], 4)} Hz"
    name = f"mode_{number:02d}"
    anatomy = modes.system.anatomy
    shape = np.asarray(modes.shapes[:, index])
    with style():
        figure = sheet(3.4, 2.7 if anatomy is not None else 2.2)
        axes = figure.add_subplot()
        axes.set_title(f"Mode {number}: {frequency}")
        if anatomy is not None and (len(anatomy.wireframe.nodes_m) or anatomy.mesh is not None):
            _draw_structure(axes, anatomy, np.real(shape), up)
        else:
            _draw_bars(axes, modes, shape)
    return Picture(name, figure, f"Mode {number} at {frequency}: {modes.descriptions[index]}")


def _draw_structure(axes: Axes, anatomy: Anatomy, shape: Array, up: str) -> None:
    from matplotlib.collections import LineCollection

    wireframe = anatomy.wireframe
    shift = moved(wireframe, shape)
    amplitude = np.linalg.norm(shift, axis=1)
    largest = float(amplitude.max(initial=0.0))
    if largest <= _NOTHING * extent(wireframe.nodes_m) * float(np.abs(shape).max(initial=0.0)):
        # what is left is round-off, which must not be blown up to a shape
        shift, amplitude, largest = np.zeros_like(shift), np.zeros_like(amplitude), 0.0
        axes.text(0.5, 0.02, "turns on the spot: no point moves", transform=axes.transAxes, ha="center")
    else:
        shift = shift * (_SIZE * extent(wireframe.nodes_m) / largest)
        amplitude = amplitude / largest
    bare_axes(axes)
    draw_at_rest(axes, wireframe, up)
    if anatomy.mesh is not None:
        _draw_surface(axes, anatomy.mesh, shape, largest, extent(wireframe.nodes_m), up)
    away = wireframe.nodes_m + shift
    members = {part.name for part in anatomy.parts if part.kind == "members"}
    strokes: dict[int, list[Array]] = {}
    for part, nodes in wireframe.lines:
        track = list(nodes)
        if part in members:
            between = min(6, max(1, round(_STROKES / len(track))))
            sizes = smooth(amplitude[track][:, None], between)[:, 0]
            _collect(strokes, on_paper(smooth(away[track], between), up), sizes)
        else:
            axes.plot(*on_paper(away[track], up).T, color=INK, lw=0.6, ls=(0, (1.5, 1.5)), zorder=2)
    colours = _motion_colours()
    for level, lines in sorted(strokes.items()):
        colour = colours(level / (_LEVELS - 1))
        axes.add_collection(
            LineCollection(lines, colors=[colour], linewidths=1.9, capstyle="round", zorder=3 + level / 100)
        )
    _draw_bodies(axes, anatomy, shape, largest, up)
    axes.autoscale_view()
    draw_triad(axes, up, 0.09)


def _draw_surface(axes: Axes, mesh: MeshView, shape: Array, largest: float, size: float, up: str) -> None:
    outline(axes, mesh, up, FAINT)
    shift = np.asarray(mesh.motion @ shape, dtype=np.float64).reshape(-1, 3)
    level = np.zeros(len(shift))
    if largest > 0:
        level = np.clip(np.linalg.norm(shift, axis=1) / largest, 0.0, 1.0)
        shift = shift * (_SIZE * size / largest)
    paint(axes, mesh, up, shift=shift if largest > 0 else None, colours=_motion_colours(), level=level)


def _collect(strokes: dict[int, list[Array]], paper: Array, sizes: Array) -> None:
    """Cut a line into strokes of about one amplitude, and put each with its level of colour."""
    middle = np.clip((sizes[:-1] + sizes[1:]) / 2, 0.0, 1.0)
    levels = np.round(middle * (_LEVELS - 1)).astype(int)
    edges = [0, *(np.flatnonzero(np.diff(levels)) + 1), len(levels)]
    for start, end in pairwise(edges):
        strokes.setdefault(int(levels[start]), []).append(paper[start : end + 1])


def _draw_bodies(axes: Axes, anatomy: Anatomy, shape: Array, largest: float, up: str) -> None:
    """The centre of each rigid body, at rest and displaced."""
    scale = _SIZE * extent(anatomy.wireframe.nodes_m) / largest if largest > 0 else 0.0
    for part in anatomy.parts:
        place = anatomy.places.get(part.name) if part.kind == "body" else None
        if place is None:
            continue
        rest = np.array(place.position_m)
        shift = np.asarray(place.motion @ shape).ravel()[:3] * scale
        (at_rest,), (away,) = on_paper(rest, up), on_paper(rest + shift, up)
        axes.plot(*at_rest, marker="o", ms=5, mfc="white", mec=FAINT, mew=0.8, zorder=2)
        axes.plot(*away, marker="o", ms=6, mfc=INK, mec="white", mew=0.8, zorder=4)


def _motion_colours() -> Any:
    """From faint (at rest) to dark (largest motion): reads the same in colour, in grey and colour-blind."""
    import matplotlib
    from matplotlib.colors import LinearSegmentedColormap

    full = matplotlib.colormaps["cividis_r"]
    return LinearSegmentedColormap.from_list("motion", full(np.linspace(0.22, 1.0, 64)))


def _draw_bars(axes: Axes, modes: Modes, shape: Any) -> None:
    """One bar per freedom, the largest 1; for a complex shape also the part a quarter of a cycle later."""
    largest = float(np.abs(shape).max(initial=0.0)) or 1.0
    real = np.real(shape) / largest
    numbers = np.arange(1, len(shape) + 1)
    axes.axhline(0.0, color=INK, lw=0.7)
    if len(shape) <= _MOST_BARS:
        axes.vlines(numbers, 0.0, real, color=COLOURS[0], lw=2.2)
        axes.plot(numbers, real, "o", color=COLOURS[0], ms=4.5)
    else:
        axes.plot(numbers, real, "-", color=COLOURS[0], lw=1.2)
    if np.iscomplexobj(shape):
        axes.plot(numbers, np.imag(shape) / largest, "D", mfc="white", mec=COLOURS[1], ms=4, ls="none")
    axes.set_ylim(-1.25, 1.25)
    axes.set_xlim(0.4, len(shape) + 0.6)
    axes.set_ylabel("motion (largest = 1)")
    names = [str(freedom) for freedom in modes.system.freedoms]
    if len(names) <= 12:
        axes.set_xticks(numbers)
        slant = max(len(name) for name in names) > 4
        axes.set_xticklabels(
            [short(name, 16) for name in names],
            rotation=35 if slant else 0,
            ha="right" if slant else "center",
        )
    axes.set_xlabel("freedom (hollow: a quarter cycle later)" if np.iscomplexobj(shape) else "freedom")
