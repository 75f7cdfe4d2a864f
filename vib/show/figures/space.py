"""How a structure in space is seen on paper: a parallel view from the side and a little above."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import ArrayLike, NDArray

from vib.show.figures.canvas import FAINT, INK

if TYPE_CHECKING:
    from matplotlib.axes import Axes

    from vib.system import Wireframe

Array = NDArray[np.float64]

# not quite the isometric angles: there, the near and the far corner of a box would fall together
_ROUND, _ABOVE = math.radians(-58.0), math.radians(24.0)


def view(up: str = "z") -> Array:
    """The (2, 3) matrix from space to paper, with the axis ``up`` upright."""
    right = (-math.sin(_ROUND), math.cos(_ROUND), 0.0)
    raised = (
        -math.cos(_ROUND) * math.sin(_ABOVE),
        -math.sin(_ROUND) * math.sin(_ABOVE),
        math.cos(_ABOVE),
    )
    # a cyclic change of axes keeps the right hand
    turn = "xyz".index(up) + 1
    return np.roll(np.array([right, raised]), turn, axis=1)


def on_paper(points: ArrayLike, up: str = "z") -> Array:
    """(k, 3) points as (k, 2) places on paper."""
    found: Array = np.asarray(points, dtype=np.float64).reshape(-1, 3) @ view(up).T
    return found


def extent(points: Array) -> float:
    """The longest diagonal of a cloud of points in space; 1 where all are one point."""
    if not len(points):
        return 1.0
    length = float(np.linalg.norm(points.max(axis=0) - points.min(axis=0)))
    return length or 1.0


def moved(wireframe: Wireframe, shape: ArrayLike) -> Array:
    """(k, 3) displacements of the nodes of a wireframe for freedoms ``shape`` (n,)."""
    found: Array = np.asarray(wireframe.motion @ np.asarray(shape), dtype=np.float64).reshape(-1, 3)
    return found


def smooth(track: Array, between: int = 5) -> Array:
    """A smooth curve through places (k, d) equally spaced along a member: the cubic spline through them.

    A member's nodes are exact, its shape between them is not a straight line. The third derivative is
    continuous at the first and last inner node ("not-a-knot"; de Boor, A Practical Guide to Splines, 1978,
    chapter IV); three nodes give the parabola.
    """
    count = len(track)
    if count < 3 or count > 60:
        return track
    steps = np.linspace(0.0, count - 1.0, (count - 1) * between + 1)
    if count == 3:
        s = steps[:, None]
        found: Array = track[0] * (1 - s) * (2 - s) / 2 + track[1] * s * (2 - s) + track[2] * s * (s - 1) / 2
        return found
    bend = _second_derivatives(track)
    left = np.minimum(steps.astype(int), count - 2)
    a, b = (left + 1 - steps)[:, None], (steps - left)[:, None]
    curved: Array = (a**3 - a) * bend[left] + (b**3 - b) * bend[left + 1]
    found = a * track[left] + b * track[left + 1] + curved / 6
    return np.asarray(found, dtype=np.float64)


def _second_derivatives(track: Array) -> Array:
    count = len(track)
    matrix, right = np.zeros((count, count)), np.zeros_like(track)
    for i in range(1, count - 1):
        matrix[i, i - 1 : i + 2] = (1.0, 4.0, 1.0)
        right[i] = 6 * (track[i - 1] - 2 * track[i] + track[i + 1])
    matrix[0, :3] = matrix[-1, -3:] = (1.0, -2.0, 1.0)
    return np.asarray(np.linalg.solve(matrix, right), dtype=np.float64)


def sheet_height(points: Array, up: str, width: float, least: float, most: float) -> float:
    """Height of a sheet, inches, on which the points fill the width."""
    across, high = np.ptp(on_paper(points, up), axis=0) if len(points) else (1.0, 0.0)
    return float(np.clip(width * high / across if across else most, least, most))


def bare_axes(axes: Axes) -> None:
    """No frame, no ticks, equal scales."""
    axes.set_axis_off()
    axes.set_aspect("equal", adjustable="datalim")
    axes.margins(0.08)


def draw_triad(axes: Axes, up: str, size: float = 0.11) -> None:
    """The three directions as arrows in the lower left corner."""
    figure = axes.get_figure(root=True)
    assert figure is not None
    matrix = view(up)
    width, height = figure.get_size_inches()
    inches = size * min(width, height)
    corner = np.array([0.045 * width + inches * 0.35, 0.05 * height + inches * 0.6])
    inch = figure.dpi_scale_trans
    for column, name in enumerate("xyz"):
        tip = corner + inches * matrix[:, column]
        label = corner + 1.3 * inches * matrix[:, column]
        axes.annotate(
            "",
            xy=tuple(tip),
            xytext=tuple(corner),
            xycoords=inch,
            textcoords=inch,
            arrowprops={
                "arrowstyle": "-|>",
                "color": INK,
                "lw": 0.8,
                "mutation_scale": 6,
                "shrinkA": 0,
                "shrinkB": 0,
            },
            annotation_clip=False,
        )
        axes.text(
            float(label[0]),
            float(label[1]),
            name,
            transform=inch,
            ha="center",
            va="center",
            fontsize=7,
            color=INK,
        )


def draw_at_rest(axes: Axes, wireframe: Wireframe, up: str) -> None:
    """The structure as thin grey lines."""
    from matplotlib.collections import LineCollection

    paper = on_paper(wireframe.nodes_m, up)
    lines = [paper[list(nodes)] for _, nodes in wireframe.lines]
    axes.add_collection(LineCollection(lines, colors=FAINT, linewidths=0.6, zorder=1))
