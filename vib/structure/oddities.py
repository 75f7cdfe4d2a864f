"""What looks like a slip of the pen in a structure that can be built: said, not mended."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterator

import numpy as np

from vib.structure.layout import Layout
from vib.system import Array

_SAME = 1e-6  # of the structure's extent
_CHUNK = 2_000_000


def oddities(layout: Layout) -> Iterator[str]:
    """Points used by nothing, at one place, or on a member without being joined; members given twice."""
    names = layout.point_names
    unused = [names[i] for i in np.flatnonzero(layout.ties.unused)]
    for name in unused:
        yield f"point {name} is used by no member, body or spring"
    for a, b in _pairs_at_one_place(layout.coordinates_m, _SAME * layout.extent_m):
        yield f"points {names[a]} and {names[b]} are at the same place but not joined by it"
    for s, point in _points_on_stretches(layout):
        yield (
            f"point {names[point]} lies on {layout.stretches.labels[s]} but is not joined to it; "
            "to join them, name the point in the run"
        )
    ends = Counter(frozenset(pair) for pair in layout.stretches.ends.tolist())
    for pair in (pair for pair, times in ends.items() if times > 1):
        both = " and ".join(names[point] for point in sorted(pair))
        yield f"{ends[pair]} members run side by side between points {both}"


def _pairs_at_one_place(places: Array, tolerance: float) -> Iterator[tuple[int, int]]:
    """Sorted along a skew line, neighbours in space are neighbours in order."""
    shadow = places @ np.array([0.5377, 0.6180, 0.5736])
    order = np.argsort(shadow, kind="stable")
    for step in range(1, len(order)):
        a, b = order[:-step], order[step:]
        near = shadow[b] - shadow[a] <= tolerance
        if not near.any():
            return
        same = near & (np.abs(places[a] - places[b]).max(axis=1) <= tolerance)
        yield from ((int(min(i, j)), int(max(i, j))) for i, j in zip(a[same], b[same], strict=True))


def _points_on_stretches(layout: Layout) -> Iterator[tuple[int, int]]:
    """(stretch, point) where a point lies between the ends of a stretch that does not join it."""
    stretches, points = layout.stretches, layout.coordinates_m
    tolerance = _SAME * layout.extent_m
    block = max(1, _CHUNK // max(1, len(points)))
    for first in range(0, len(stretches.labels), block):
        mine = slice(first, first + block)
        away = points[None] - stretches.tips_m[mine, :1]
        x = stretches.axes[mine, 0]
        along = np.einsum("spi,si->sp", away, x)
        aside = np.abs(away - along[..., None] * x[:, None]).max(axis=2)
        between = (along > tolerance) & (along < stretches.bars.length[mine, None] - tolerance)
        for s, point in zip(*np.nonzero(between & (aside <= tolerance)), strict=True):
            if point not in stretches.ends[first + s] and not layout.ties.unused[point]:
                yield first + int(s), int(point)
