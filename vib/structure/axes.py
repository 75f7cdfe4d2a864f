"""The local axes of members: x from start to end, z towards `up`, then turned about x."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from vib.system import Array

# a member this close to the study's up (as a sine) counts as standing along it: 1 mm in a metre
STANDING = 1e-3
_PARALLEL = 1e-6


def unit_axis(name: str) -> Array:
    """The unit vector of "x", "y" or "z"."""
    axis: Array = np.eye(3)["xyz".index(name)]
    return axis


def standing(along: Array, up: str) -> NDArray[np.bool_]:
    """(s,) which of the unit directions (s, 3) stand along the study's up."""
    sine: Array = np.linalg.norm(np.cross(along, unit_axis(up)), axis=1)
    return sine < STANDING


def default_up(along: Array, up: str) -> Array:
    """(s, 3): the study's up, and for members along it the next axis (z -> x, x -> y, y -> z)."""
    following = unit_axis("xyz"[("xyz".index(up) + 1) % 3])
    return np.where(standing(along, up)[:, None], following, unit_axis(up))


def parallel(along: Array, up: Array) -> NDArray[np.bool_]:
    """(s,) where ``up`` (s, 3) is no help because it lies along the member."""
    sine: Array = np.linalg.norm(np.cross(along, up), axis=1)
    return sine < _PARALLEL


def member_axes(along: Array, up: Array, turn: Array) -> Array:
    """The axes of each member as rows x, y, z of (s, 3, 3).

    Parameters
    ----------
    along
        (s, 3) unit vectors from start to end.
    up
        (s, 3) direction towards which z is turned; not parallel to ``along``.
    turn
        (s,) rad, from y towards z.
    """
    side = np.cross(up, along)
    side /= np.linalg.norm(side, axis=1)[:, None]
    return turn_about_x(np.stack([along, side, np.cross(along, side)], axis=1), turn)


def turn_about_x(axes: Array, angle: Array) -> Array:
    """Axes (s, 3, 3) turned about their own x by (s,) rad, from y towards z; right angles stay exact."""
    cos, sin = np.cos(angle), np.sin(angle)
    cos, sin = (np.where(np.abs(value) < 1e-15, 0.0, value)[:, None] for value in (cos, sin))
    x, y, z = axes[:, 0], axes[:, 1], axes[:, 2]
    return np.stack([x, cos * y + sin * z, cos * z - sin * y], axis=1)
