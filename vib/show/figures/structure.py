"""The model drawn: members by group, bodies, springs, supports, points, and the members' own axes."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from typing import TYPE_CHECKING, Any

import numpy as np

from vib.show.figures.canvas import COLOURS, DASHES, FAINT, INK, Picture, legend, sheet, short, style
from vib.show.figures.space import Array, bare_axes, draw_triad, extent, on_paper, sheet_height
from vib.show.figures.surface import paint

Places = dict[str, tuple[float, float, float]]

if TYPE_CHECKING:
    from matplotlib.axes import Axes

    from vib.study import Study
    from vib.system import Anatomy, System

_MOST_LABELS = 40
_MEMBERS = tuple(colour for colour in COLOURS if colour != COLOURS[3])  # springs have that one
# paler than lines, so that what is drawn on the faces stands out
_TINTS = ("#b9d3e6", "#f2cfb0", "#b7dccb", "#e6c6d8", "#f0dfb4", "#d7d7d7")
_COIL = 0.035  # length of a spring to ground, as a share of the longest diagonal


def structure_picture(study: Study, system: System, frames: Iterable[tuple[Array, Array]] = ()) -> Picture:
    """The model.

    Parameters
    ----------
    study, system
        The study and its system, which has an anatomy.
    frames
        Middle (3,) and own axes (3, 3), rows x, y, z, of members, to be drawn as small arrows.
    """
    anatomy = system.anatomy
    assert anatomy is not None
    up = study.up
    with style():
        places = _all_places(study, anatomy)
        size = extent(places)
        figure = sheet(7.0, 1.1 + sheet_height(places, up, 6.2, 1.5, 4.4))
        axes = figure.add_subplot()
        bare_axes(axes)
        handles = _draw_mesh(axes, anatomy, up) + _draw_members(axes, anatomy, up)
        drawn_frames = _draw_frames(axes, frames, size, up)
        handles += _draw_bodies(axes, study, anatomy, up)
        at = _places(study, anatomy)
        handles += _draw_springs(axes, study, at, size, up)
        handles += _draw_supports(axes, study, at, up)
        _name_points(axes, at, up)
        # a study of one place only is not blown up to fill the sheet
        middle = on_paper(places.mean(axis=0), up)
        axes.update_datalim(middle + 0.12 * size * np.array([[-1.0, -1.0], [1.0, 1.0]]))
        axes.autoscale_view()
        draw_triad(axes, up, 0.085)
        handles += drawn_frames
        legend(
            axes,
            [handle for handle, _ in handles],
            [label for _, label in handles],
            loc="upper center",
            bbox_to_anchor=(0.5, -0.01),
            ncols=3,
        )
    return Picture("model", figure, f"Drawing of the model: {study.title}")


def _all_places(study: Study, anatomy: Anatomy) -> Array:
    nodes = np.asarray(anatomy.wireframe.nodes_m, dtype=np.float64).reshape(-1, 3)
    named = list(_places(study, anatomy).values())
    return np.concatenate([nodes, np.array(named, dtype=np.float64).reshape(-1, 3)])


def _places(study: Study, anatomy: Anatomy) -> dict[str, tuple[float, float, float]]:
    """Where each point of the study is; those found in a mesh are known to the structure only."""
    found = {}
    for name, point in study.points.items():
        if isinstance(point, tuple):
            found[name] = point
        elif name in anatomy.places:
            found[name] = anatomy.places[name].position_m
    return found


def _draw_mesh(axes: Axes, anatomy: Anatomy, up: str) -> list[tuple[Any, str]]:
    """The outer faces of a mesh, a tint for each region."""
    from matplotlib.patches import Patch

    if anatomy.mesh is None:
        return []
    names = [part.name for part in anatomy.parts if part.kind == "cells"]
    tints = {name: _TINTS[number % len(_TINTS)] for number, name in enumerate(names)}
    paint(axes, anatomy.mesh, up, by_part=tints)
    return [(Patch(facecolor=tint, edgecolor=INK, lw=0.4), name) for name, tint in tints.items()]


def _draw_members(axes: Axes, anatomy: Anatomy, up: str) -> list[tuple[Any, str]]:
    from matplotlib.collections import LineCollection
    from matplotlib.lines import Line2D

    paper = on_paper(anatomy.wireframe.nodes_m, up)
    handles: list[tuple[Any, str]] = []
    groups = [part.name for part in anatomy.parts if part.kind == "members"]
    for number, name in enumerate(groups):
        look = {"colors": _MEMBERS[number % len(_MEMBERS)], "linestyles": [DASHES[number % len(DASHES)]]}
        lines = [
            paper[list(nodes)] for part, nodes in anatomy.wireframe.lines if part == name and len(nodes) > 1
        ]
        axes.add_collection(LineCollection(lines, linewidths=2.2, zorder=2, capstyle="round", **look))
        key = Line2D([], [], color=_MEMBERS[number % len(_MEMBERS)], ls=DASHES[number % len(DASHES)], lw=2.2)
        handles.append((key, name))
    return handles


def _draw_bodies(axes: Axes, study: Study, anatomy: Anatomy, up: str) -> list[tuple[Any, str]]:
    handle, at = None, _places(study, anatomy)
    for body in study.bodies:
        place = anatomy.places.get(body.name)
        if place is None:
            continue
        (centre,) = on_paper(np.array(place.position_m), up)
        for carrier in body.carried_by:
            (foot,) = on_paper(np.array(at[carrier]), up)
            axes.plot(*np.stack([centre, foot]).T, color=INK, lw=0.7, ls=(0, (1.5, 1.5)), zorder=2)
        (handle,) = axes.plot(*centre, marker="o", ms=9, mfc=INK, mec="white", ls="none", zorder=5)
        _label(axes, centre, body.name, bold=True)
    return [(handle, "body (rigid), at its centre of mass")] if handle is not None else []


def _draw_springs(axes: Axes, study: Study, at: Places, size: float, up: str) -> list[tuple[Any, str]]:
    """A zigzag between two points, or from a point to the ground: below it, beside it where a support is."""
    handle = None
    held = {name for support in study.supports for name in support.at}
    for spring in study.springs:
        for pair in spring.between:
            points = [name for name in pair if name != "ground"]
            paper = on_paper(np.array([at[name] for name in points]), up)
            if len(points) == 1:
                aside = points[0] in held
                reach = np.array([-1.6, 0.0] if aside else [0.0, -1.0]) * _COIL * size
                paper = np.stack([paper[0], paper[0] + reach])
                _hatch(axes, paper[1], 0.014 * size, upright=aside)
            track = _zigzag(paper[0], paper[1], 0.009 * size)
            (handle,) = axes.plot(*track.T, color=COLOURS[3], lw=1.2, zorder=4, solid_joinstyle="miter")
    return [(handle, "spring or dashpot")] if handle is not None else []


def _zigzag(start: Array, end: Array, width: float) -> Array:
    along = end - start
    length = float(np.linalg.norm(along))
    if length == 0:
        return np.stack([start, end])
    across = np.array([-along[1], along[0]]) / length * width
    shares = np.array([0.0, 0.15, 0.24, 0.38, 0.52, 0.66, 0.80, 0.88, 1.0])
    sides = np.array([0, 0, 1, -1, 1, -1, 1, 0, 0])
    found: Array = start + shares[:, None] * along + sides[:, None] * across
    return found


def _hatch(axes: Axes, place: Array, width: float, *, upright: bool) -> None:
    """The ground: a short line with strokes behind it."""
    along, behind = np.array([width, 0.0]), np.array([-0.5 * width, -0.6 * width])
    if upright:
        along, behind = along[::-1], behind[::-1]
    axes.plot(*np.stack([place - along, place + along]).T, color=INK, lw=1.0, zorder=4)
    for step in np.linspace(-0.8, 1.0, 4):
        foot = place + step * along
        axes.plot(*np.stack([foot, foot + behind]).T, color=INK, lw=0.6, zorder=4)


def _draw_supports(axes: Axes, study: Study, at: Places, up: str) -> list[tuple[Any, str]]:
    """A filled foot where all six components are held, a hollow one where some are free."""
    held: dict[str, set[str]] = {}
    for support in study.supports:
        for name in support.at:
            held.setdefault(name, set()).update(support.hold)
    full = [name for name, components in held.items() if len(components) == 6]
    some = [name for name in held if name not in full]
    handles: list[tuple[Any, str]] = []
    for names, inside, words in ((full, INK, "support, all held"), (some, "white", "support, partly held")):
        if names:
            paper = on_paper(np.array([at[name] for name in names]), up)
            (handle,) = axes.plot(*paper.T, marker=_FOOT, ms=11, mfc=inside, mec=INK, ls="none", zorder=3)
            handles.append((handle, words))
    for name in some if len(some) <= _MOST_LABELS else ():
        told = " ".join(
            component for component in ("x", "y", "z", "rx", "ry", "rz") if component in held[name]
        )
        (place,) = on_paper(np.array(at[name]), up)
        axes.annotate(
            f"holds {told}",
            tuple(place),
            xytext=(0, -13),
            textcoords="offset points",
            fontsize=6,
            ha="center",
            va="top",
        )
    return handles


# a triangle that hangs below the point it holds
_FOOT = ((0.0, 0.0), (-0.6, -1.0), (0.6, -1.0), (0.0, 0.0))


def _name_points(axes: Axes, at: Places, up: str) -> None:
    paper = on_paper(np.array(list(at.values())), up)
    axes.plot(*paper.T, ls="none", marker="o", ms=2.6, color=INK, zorder=4)
    if len(at) <= _MOST_LABELS:
        for name, place in zip(at, paper, strict=True):
            _label(axes, place, name)


def _label(axes: Axes, place: Sequence[float] | Array, text: str, bold: bool = False) -> None:
    axes.annotate(
        short(text, 24),
        (float(place[0]), float(place[1])),
        xytext=(6, -11) if bold else (3.5, 2.5),
        textcoords="offset points",
        fontsize=7.5 if bold else 6.5,
        fontweight="bold" if bold else "normal",
        zorder=6,
        bbox={"boxstyle": "square,pad=0.08", "fc": "white", "ec": "none", "alpha": 0.7},
    )


def _draw_frames(
    axes: Axes, frames: Iterable[tuple[Array, Array]], size: float, up: str
) -> list[tuple[Any, str]]:
    """The members' own y (open head) and z (filled head) in their middle; x runs from start to end."""
    from matplotlib.lines import Line2D

    length = 0.035 * size
    drawn = False
    for middle, own in frames:
        drawn = True
        for row, filled in ((1, False), (2, True)):
            start, end = on_paper(np.stack([middle, middle + length * own[row]]), up)
            axes.annotate(
                "",
                xy=tuple(end),
                xytext=tuple(start),
                arrowprops={
                    "arrowstyle": "-|>" if filled else "->",
                    "color": "#555555" if filled else FAINT,
                    "lw": 0.8,
                    "mutation_scale": 5,
                    "shrinkA": 0,
                    "shrinkB": 0,
                },
                zorder=3,
            )
    if not drawn:
        return []
    return [
        (Line2D([], [], color="#555555", lw=0.8, marker="^", ms=3.5), "member's own z (height)"),
        (Line2D([], [], color=FAINT, lw=0.8, marker="^", ms=3.5, mfc="white"), "member's own y (width)"),
    ]
