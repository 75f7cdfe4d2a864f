"""Thin walls of a cross section: shear areas from the flow along them.

They follow the energy method: A_s = I^2 / integral(Q^2 / t ds) along the middle lines of the walls,
Q being the first moment of the area between a free end and the place (D. J. Zhuravskii's shear formula;
S. P. Timoshenko, Strength of Materials, Part I: shear flow and strain energy of shear; from memory). Unlike
cuts straight across the section this counts the flow along flanges, which is up to a fifth of the energy of
a square hollow section. Lengths are metres throughout.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

Point = tuple[float, float]


@dataclass(frozen=True)
class Wall:
    """A straight wall from ``start`` to ``end`` (middle line) of constant ``thickness``.

    ``fed_by`` holds the indices of the earlier walls whose ends meet its start; a wall fed by none starts
    at a free edge, or on a line of symmetry where the flow is zero.
    """

    start: Point
    end: Point
    thickness: float
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
        energy += square * length / wall.thickness
        inertia += wall.thickness * length * (h0 * h0 + h0 * h1 + h1 * h1) / 3
    return inertia**2 / energy


def _centroid(walls: list[Wall]) -> Point:
    areas = [wall.thickness * math.dist(wall.start, wall.end) for wall in walls]
    total = sum(areas)
    y = sum(a * (w.start[0] + w.end[0]) / 2 for a, w in zip(areas, walls, strict=True)) / total
    z = sum(a * (w.start[1] + w.end[1]) / 2 for a, w in zip(areas, walls, strict=True)) / total
    return y, z
