"""Rigid arms, and the elimination of constraint rows."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from vib.system import Array


def arms(reach: Array) -> Array:
    """How the tip of a rigid arm moves with its root: u_tip = G u_root.

    Parameters
    ----------
    reach
        (..., 3) from root to tip, m.

    Returns
    -------
    array
        (..., 6, 6); small rotations, so u_tip = u + theta x reach (any text on rigid-body kinematics).
    """
    reach = np.asarray(reach, dtype=float)
    x, y, z = reach[..., 0], reach[..., 1], reach[..., 2]
    moved = np.zeros((*reach.shape[:-1], 6, 6))
    moved[..., range(6), range(6)] = 1.0
    moved[..., 0, 4], moved[..., 0, 5] = z, -y
    moved[..., 1, 3], moved[..., 1, 5] = -z, x
    moved[..., 2, 3], moved[..., 2, 4] = y, -x
    return moved


def turned(axes: Array) -> Array:
    """(..., 3, 3) axes as rows -> (..., 6, 6): components along them of translations and rotations."""
    both = np.zeros((*axes.shape[:-2], 6, 6))
    both[..., :3, :3] = axes
    both[..., 3:, 3:] = axes
    return both


def eliminate(rows: Array, scale: Array, tolerance: float = 1e-9) -> tuple[NDArray[np.bool_], Array]:
    """Solve rows @ u = 0 for as many components of u as the rows determine.

    Gauss-Jordan elimination with complete pivoting, so that the multipliers stay bounded; rows that say
    nothing new vanish.

    Parameters
    ----------
    rows
        (k, m) constraints.
    scale
        (m,) typical size of each component, so that lengths and angles can be weighed.
    tolerance
        Relative to the largest scaled entry: what is smaller counts as zero.

    Returns
    -------
    free, expansion
        ``free`` (m,): the components that remain; ``expansion`` (m, m): u = expansion @ u, with columns
        of zeros for the components that went.
    """
    work = rows * scale
    size = work.shape[1]
    free = np.ones(size, dtype=bool)
    limit = tolerance * np.abs(work).max(initial=0.0)
    solved: list[tuple[int, int]] = []
    open_rows = np.ones(len(work), dtype=bool)
    while open_rows.any() and free.any():
        candidates = np.abs(work) * open_rows[:, None] * free
        row, column = (int(i) for i in np.unravel_index(np.argmax(candidates), candidates.shape))
        if candidates[row, column] <= limit:
            break
        work[row] /= work[row, column]
        others = np.arange(len(work)) != row
        work[others] -= np.outer(work[others, column], work[row])
        open_rows[row], free[column] = False, False
        solved.append((row, column))
    expansion = np.diag(free.astype(float))
    for row, column in solved:
        multipliers = np.where(np.abs(work[row]) > 1e-13, -work[row], 0.0)
        expansion[column, free] = (scale[column] * multipliers / scale)[free]
    return free, expansion
