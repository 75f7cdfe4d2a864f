"""What looks like a slip of the pen in a structure that can be built: said, not mended."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterator

import numpy as np

from vib.structure.layout import Layout
from vib.structure.nearby import SKEW, pairs_at_one_place

_SAME = 1e-6  # of the structure's extent
_CHUNK = 2_000_000


def oddities(layout: Layout) -> Iterator[str]:
    """Points used by nothing, at one place, or on a member without being joined; members given twice;
    inertia that no body has."""
    names = layout.point_names
    unused = [names[i] for i in np.flatnonzero(layout.ties.unused)]
    for name in unused:
        yield f"point {name} is used by no member, body or spring"
    for a, b in pairs_at_one_place(layout.coordinates_m, _SAME * layout.extent_m):
        yield f"points {names[a]} and {names[b]} are at the same place but not joined by it"
    for s, point in _points_on_stretches(layout):
        yield (
            f"point {names[point]} lies on {layout.stretches.labels[s]} but is not joined to it; "
            "to join them, name the point in the run"
        )
    moments = np.linalg.eigvalsh(layout.bodies.mass[:, 3:, 3:])
    for name, (low, middle, high) in zip(layout.bodies.names, moments.tolist(), strict=True):
        if high > (low + middle) * (1 + 1e-9):
            yield (
                f"no body has such moments of inertia as {name}: the greatest, {high:.4g} kg m^2, is more "
                f"than the other two together ({low:.4g} and {middle:.4g}); they are used as given"
            )
    ends = Counter(frozenset(pair) for pair in layout.stretches.ends.tolist())
    for pair in (pair for pair, times in ends.items() if times > 1):
        both = " and ".join(names[point] for point in sorted(pair))
        yield f"{ends[pair]} members run side by side between points {both}"


def _points_on_stretches(layout: Layout) -> Iterator[tuple[int, int]]:
    """(stretch, point) where a point lies between the ends of a stretch that does not join it."""
    stretches, points = layout.stretches, layout.coordinates_m
    tolerance = _SAME * layout.extent_m
    order = np.argsort(points @ SKEW, kind="stable")
    shadow = points[order] @ SKEW
    # only points whose shadow falls into that of the stretch can lie on it
    ends = np.sort(stretches.tips_m @ SKEW, axis=1) + 2 * tolerance * np.array([-1, 1])
    first, last = np.searchsorted(shadow, ends[:, 0]), np.searchsorted(shadow, ends[:, 1])
    block = max(1, _CHUNK // max(1, len(points)))
    for start in range(0, len(stretches.labels), block):
        counts = (last - first)[start : start + block]
        s = np.repeat(np.arange(start, start + len(counts)), counts)
        step = np.arange(len(s)) - np.repeat(np.cumsum(counts) - counts, counts)
        point = order[first[s] + step]
        away = points[point] - stretches.tips_m[s, 0]
        x = stretches.axes[s, 0]
        along = (away * x).sum(axis=1)
        aside = np.abs(away - along[:, None] * x).max(axis=1)
        on = (aside <= tolerance) & (along > tolerance) & (along < stretches.bars.length[s] - tolerance)
        on &= (stretches.ends[s] != point[:, None]).all(axis=1) & ~layout.ties.unused[point]
        yield from ((int(i), int(j)) for i, j in zip(s[on], point[on], strict=True))
