"""Which mode of a sample is which nominal mode: by shape, each at most once."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import linear_sum_assignment

from vib.system import Array

Indices = NDArray[np.intp]


def follow(likeness: Array) -> Indices:
    """The mode (N, m) of each sample that is most like each nominal mode, taken together.

    Parameters
    ----------
    likeness
        (N, k, m) modal assurance between k modes of each sample and m nominal modes, k >= m.

    References
    ----------
    Optimal assignment: H. W. Kuhn, Naval Research Logistics Quarterly 2 (1955) 83-97; the criterion:
    R. J. Allemang, D. L. Brown, Proc. 1st International Modal Analysis Conference (1982) 110-116.
    """
    count, _, wanted = likeness.shape
    best = likeness.argmax(axis=1)
    # shapes are orthogonal: one that is more than half like a nominal mode can't be bettered elsewhere
    sure = (likeness.max(axis=1) > 0.5).all(axis=1)
    sure &= np.array([len(set(row)) == wanted for row in best.tolist()], dtype=bool)
    for number in np.flatnonzero(~sure):
        rows, columns = linear_sum_assignment(likeness[number], maximize=True)
        best[number, columns] = rows
    return np.asarray(best.reshape(count, wanted))


def first_left_out(followed: Indices, known: int) -> Indices:
    """The lowest of ``known`` modes that is among none of those followed (N, m); ``known`` where none is."""
    used = np.zeros((len(followed), known + 1), dtype=bool)
    np.put_along_axis(used, followed, values=True, axis=1)
    return np.asarray(np.argmin(used, axis=1))
