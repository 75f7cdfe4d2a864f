"""Eigenvalues of many samples whose damping, or spinning bodies, turn the undamped modes into each other."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from vib.system import Array

Complex = NDArray[np.complex128]
STILL = 1e-9  # part of the lowest frequency below which an eigenvalue is that of a motion at rest


class Pairs(NamedTuple):
    """The lowest k eigenvalues of N samples, one of each conjugate pair, those at rest first.

    ``values`` (N, k), 1/s; ``shapes`` (N, r, k) in the coordinates that were given; ``growth`` (N,) the real
    part of the eigenvalue that decays least, of all of them.
    """

    values: Complex
    shapes: Complex
    growth: Array


def eigenpairs(squares: Array, linear: Array, rigid: int, count: int) -> Pairs:
    """Solve (l^2 + l D + S) y = 0 of samples in coordinates of undamped modes.

    Parameters
    ----------
    squares
        (N, r) squared angular frequencies S, the first ``rigid`` zero, the others positive.
    linear
        (N, r, r) damping and gyroscopic matrix D.
    count
        How many to return; at most ``r``.

    References
    ----------
    The scaling [[0, W], [-W, -D]] with W^2 = S: F. Tisseur, K. Meerbergen, SIAM Review 43 (2001) 235-286.
    """
    samples, rank = squares.shape
    elastic = np.arange(rigid, rank)
    size = len(elastic) + rank
    state = np.zeros((samples, size, size))
    weight = np.sqrt(squares[:, rigid:])
    first = np.arange(len(elastic))
    state[:, first, len(elastic) + elastic] = weight
    state[:, len(elastic) + elastic, first] = -weight
    state[:, len(elastic) :, len(elastic) :] = -linear
    values, vectors = np.linalg.eig(state)
    floor = STILL * weight[:, :1] if len(elastic) else np.zeros((samples, 1))
    # a motion at rest has two eigenvalues at zero, its position and its speed: the position is known
    dropped = (values.imag < 0) | (np.abs(values) <= floor)
    key = np.where(dropped, np.inf, np.abs(values))
    order = np.argsort(key, axis=1, kind="stable")[:, : max(count - rigid, 0)]
    chosen = np.take_along_axis(values, order, axis=1).astype(np.complex128)
    shapes = np.take_along_axis(vectors[:, len(elastic) :], order[:, None], axis=2)
    still = np.zeros((samples, rank, min(rigid, count)), dtype=np.complex128)
    still[:, np.arange(still.shape[2]), np.arange(still.shape[2])] = 1.0
    return Pairs(
        np.concatenate([np.zeros((samples, still.shape[2])), chosen], axis=1),
        np.concatenate([still, shapes], axis=2),
        np.where(dropped, -np.inf, values.real).max(axis=1),
    )
