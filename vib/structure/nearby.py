"""Places that coincide, found without comparing each with all."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from vib.system import Array

SKEW = np.array([0.5377, 0.6180, 0.5736])  # a direction that no structure has any reason to share


def pairs_at_one_place(places: Array, tolerance: float) -> Iterator[tuple[int, int]]:
    """Pairs of numbers (i < j) of places (k, 3) no farther apart than the tolerance along any axis.

    Sorted along a skew line, neighbours in space are neighbours in order.
    """
    shadow = places @ SKEW
    order = np.argsort(shadow, kind="stable")
    for step in range(1, len(order)):
        a, b = order[:-step], order[step:]
        near = shadow[b] - shadow[a] <= tolerance * SKEW.sum()
        if not near.any():
            return
        same = near & (np.abs(places[a] - places[b]).max(axis=1) <= tolerance)
        yield from ((int(min(i, j)), int(max(i, j))) for i, j in zip(a[same], b[same], strict=True))
