"""Thin walls of a cross section: shear areas from the flow along them.

They follow the energy method: A_s = I^2 / integral(Q^2 / t ds) along the middle lines of the walls, Q being
the first moment of the area between a free end and the place (D. J. Zhuravskii's shear formula; S. P.
Timoshenko, Strength of Materials, Part I: shear flow and strain energy of shear; from memory). Unlike cuts
straight across the section this counts the flow along flanges, up to a fifth of the energy of a square
hollow section. Tests hold the results to a two-dimensional solution of the shear problem. Lengths are
metres throughout.
"""

from __future__ import annotations

import math
from itertools import pairwise
from typing import NamedTuple

Point = tuple[float, float]

_STRIPS = 4


class Wall(NamedTuple):
    """A straight strip of wall from ``start`` to ``end`` (middle line).

    ``thickness`` times length is the area it carries, ``flow`` the thickness that the shear flow finds; at a
    rounded junction the area is shared between two walls, but either flow finds all of it.
    ``fed_by`` holds the indices of the earlier walls whose ends meet its start; a wall fed by none starts
    at a free edge, or on a line of symmetry where the flow is zero.
    """

    start: Point
    end: Point
    thickness: float
    flow: float
    fed_by: tuple[int, ...] = ()


def shear_area(walls: list[Wall], direction: float) -> float:
    """Shear area in m^2 for a force at the angle ``direction`` (rad, from y towards z).

    The direction must be a principal one of the walls.
    """
    cy, cz = _centroid(walls)
    cos, sin = math.cos(direction), math.sin(direction)
    inertia = energy = 0.0
    ends: list[float] = []
    for wall in walls:
        length = math.dist(wall.start, wall.end)
        h0 = (wall.start[0] - cy) * cos + (wall.start[1] - cz) * sin
        h1 = (wall.end[0] - cy) * cos + (wall.end[1] - cz) * sin
        begin = sum(ends[i] for i in wall.fed_by)
        # Q(u) = begin + a u + b u^2 for u from 0 to 1
        a, b = wall.thickness * length * h0, wall.thickness * length * (h1 - h0) / 2
        ends.append(begin + a + b)
        square = begin**2 + begin * a + (a**2 + 2 * begin * b) / 3 + a * b / 2 + b**2 / 5
        energy += square * length / wall.flow
        inertia += wall.thickness * length * (h0 * h0 + h0 * h1 + h1 * h1) / 3
    return inertia**2 / energy


def _centroid(walls: list[Wall]) -> Point:
    areas = [wall.thickness * math.dist(wall.start, wall.end) for wall in walls]
    total = sum(areas)
    y = sum(a * (w.start[0] + w.end[0]) / 2 for a, w in zip(areas, walls, strict=True)) / total
    z = sum(a * (w.start[1] + w.end[1]) / 2 for a, w in zip(areas, walls, strict=True)) / total
    return y, z


class Leg(NamedTuple):
    """A straight leg of a section from ``start`` to ``end``, tapering from ``thin`` to ``thick``.

    The line from start to end is the flat face of the leg and ``inward`` the unit vector to its other face;
    (0, 0) means that the line is the middle of the leg and both faces are alike. ``radius`` is that of the
    rounding where the leg ends, on its inward face or on both; ``start_radius`` where it starts.
    """

    start: Point
    end: Point
    inward: Point
    thin: float
    thick: float
    radius: float
    start_radius: float = 0.0


def add_leg(walls: list[Wall], leg: Leg, fed_by: tuple[int, ...] = ()) -> int:
    """Append a leg as strips of constant thickness; the index of its last strip."""
    length = math.dist(leg.start, leg.end)
    faces = 2 if leg.inward == (0.0, 0.0) else 1
    for low, high in _cuts(length, leg.start_radius, leg.radius):
        middle = (low + high) / 2
        base = leg.thin + (leg.thick - leg.thin) * middle / length
        fillet = faces * (
            _fillet(leg.start_radius, low, high) + _fillet(leg.radius, length - high, length - low)
        )
        carried = base + fillet / 2
        at = [
            (
                leg.start[0] + (leg.end[0] - leg.start[0]) * s / length + leg.inward[0] * carried / 2,
                leg.start[1] + (leg.end[1] - leg.start[1]) * s / length + leg.inward[1] * carried / 2,
            )
            for s in (low, high)
        ]
        walls.append(Wall(at[0], at[1], carried, base + fillet, fed_by))
        fed_by = (len(walls) - 1,)
    return len(walls) - 1


def _cuts(length: float, start_radius: float, radius: float) -> list[tuple[float, float]]:
    """Where a leg is cut into strips: evenly, and evenly within its roundings."""
    places = [length * k / _STRIPS for k in range(_STRIPS + 1)]
    places += [min(start_radius * k / _STRIPS, length) for k in range(_STRIPS + 1)]
    places += [max(length - radius * k / _STRIPS, 0.0) for k in range(_STRIPS + 1)]
    places.sort()
    return [(a, b) for a, b in pairwise(places) if b - a > 1e-9 * length]


def _fillet(radius: float, low: float, high: float) -> float:
    """Mean height, between two distances from the corner, of a rounding r - sqrt(r^2 - (r - u)^2)."""
    if low >= radius:
        return 0.0

    def under(u: float) -> float:
        across = radius - u
        root = math.sqrt(max(radius**2 - across**2, 0.0))
        return radius * u + (across * root + radius**2 * math.asin(min(across / radius, 1.0))) / 2

    return (under(min(high, radius)) - under(low)) / (high - low)


def core_flow(flange: float, web: float, root_radius: float) -> float:
    """The thickness that the flow finds where a flange crosses the web.

    The flange and a quarter of what it can spread into: our own choice, from two-dimensional solutions.
    """
    return flange + (web + root_radius) / 4
