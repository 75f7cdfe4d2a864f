"""Outlines of cross sections: polygons with rounded corners, and their exact area integrals.

Axes: y to the right (width), z up (height). An outer loop runs anticlockwise, a hole clockwise, so
that holes subtract by themselves. Lengths are metres throughout.
"""

from __future__ import annotations

import math
from typing import NamedTuple

from vib.errors import ModelError

Point = tuple[float, float]


class Corner(NamedTuple):
    """A corner of a polygon at (y, z), rounded to ``radius`` by an arc tangent to both sides.

    ``label`` is the name of the radius in messages.
    """

    y: float
    z: float
    radius: float = 0.0
    label: str = "radius"


class Arc(NamedTuple):
    """The arc of ``radius`` about ``centre`` from ``start`` to ``end``, less than half a turn.

    ``sign`` is +1 where it bulges outwards of an anticlockwise chord polygon, -1 where it cuts in.
    """

    centre: Point
    radius: float
    start: Point
    end: Point
    sign: int


class Loop(NamedTuple):
    """A closed loop: the chord polygon ``points`` and the ``arcs`` that stand on some of its sides.

    ``arcs[i]`` stands on the side from ``points[i]`` to the next point, None where that is straight.
    """

    points: tuple[Point, ...]
    arcs: tuple[Arc | None, ...]


class AreaIntegrals(NamedTuple):
    """Integrals over an area: 1, y, z (m^2, m^3), z^2, y^2 and y z (m^4)."""

    area: float
    first_y: float
    first_z: float
    zz: float
    yy: float
    yz: float

    @property
    def centroid(self) -> Point:
        """The centroid (y, z) in m."""
        return self.first_y / self.area, self.first_z / self.area

    def about_centroid(self) -> tuple[float, float, float]:
        """Integrals of z^2, y^2 and y z about the centroid, in m^4."""
        y, z = self.centroid
        return self.zz - z * self.first_z, self.yy - y * self.first_y, self.yz - y * self.first_z


def rounded(corners: list[Corner]) -> Loop:
    """The loop through ``corners``, each rounded to its radius.

    Raises
    ------
    ModelError
        A radius needs more of a side than there is; the message names the radius.
    """
    count = len(corners)
    reaches = [_reach(corners[i - 1], corners[i], corners[(i + 1) % count]) for i in range(count)]
    for i in range(count):
        here, there = corners[i], corners[(i + 1) % count]
        side = math.hypot(there.y - here.y, there.z - here.z)
        if reaches[i] + reaches[(i + 1) % count] > side * (1 + 1e-9):
            worst = here if reaches[i] >= reaches[(i + 1) % count] else there
            raise ModelError(
                f"{worst.label}: {millimetres(worst.radius)} does not fit on a side of {millimetres(side)}; "
                f"give a smaller {worst.label}"
            )
    points: list[Point] = []
    arcs: list[Arc | None] = []
    for i in range(count):
        before, here, after = corners[i - 1], corners[i], corners[(i + 1) % count]
        if reaches[i] == 0.0:
            points.append((here.y, here.z))
            arcs.append(None)
            continue
        arc = _arc(before, here, after, reaches[i])
        points += [arc.start, arc.end]
        arcs += [arc, None]
    return Loop(tuple(points), tuple(arcs))


def _unit(start: Corner, end: Corner) -> Point:
    length = math.hypot(end.y - start.y, end.z - start.z)
    return (end.y - start.y) / length, (end.z - start.z) / length


def _reach(before: Corner, here: Corner, after: Corner) -> float:
    """How far along either side the rounding of the corner ``here`` reaches, in m."""
    if here.radius == 0.0:
        return 0.0
    u, v = _unit(here, before), _unit(here, after)
    half = 0.5 * math.atan2(abs(u[0] * v[1] - u[1] * v[0]), u[0] * v[0] + u[1] * v[1])
    return here.radius / math.tan(half)


def _arc(before: Corner, here: Corner, after: Corner, reach: float) -> Arc:
    u, v = _unit(here, before), _unit(here, after)
    start = (here.y + reach * u[0], here.z + reach * u[1])
    end = (here.y + reach * v[0], here.z + reach * v[1])
    distance = math.hypot(reach, here.radius) / math.hypot(u[0] + v[0], u[1] + v[1])
    centre = (here.y + distance * (u[0] + v[0]), here.z + distance * (u[1] + v[1]))
    turn = v[0] * u[1] - v[1] * u[0]
    return Arc(centre, here.radius, start, end, 1 if turn > 0 else -1)


def circle(centre: Point, radius: float, *, hole: bool = False) -> Loop:
    """A whole circle; clockwise if it is a hole."""
    angles = [math.pi * k / 4 for k in range(8)]
    points = [(centre[0] + radius * math.cos(a), centre[1] + radius * math.sin(a)) for a in angles]
    if hole:
        points.reverse()
    sign = -1 if hole else 1
    arcs = [Arc(centre, radius, points[i], points[(i + 1) % 8], sign) for i in range(8)]
    return Loop(tuple(points), tuple(arcs))


def integrate(loops: tuple[Loop, ...]) -> AreaIntegrals:
    """Area integrals of what the loops enclose, exact to round-off.

    Chord polygons by Green's theorem, plus or minus the circular segments on the chords, for which the
    moments about the centre of the circle are in closed form (half-angle a, u along the bisector):
    area r^2 (a - sin a cos a); u: 2/3 r^3 sin^3 a; u^2: r^4/4 (a - sin a cos a + 2 sin^3 a cos a);
    v^2: r^4/12 (3 a - 3 sin a cos a - 2 sin^3 a cos a). Own derivation, checked in tests on a fine grid.
    """
    parts = [_polygon(loop.points) for loop in loops]
    parts += [_segment(arc) for loop in loops for arc in loop.arcs if arc is not None]
    return AreaIntegrals(*(math.fsum(column) for column in zip(*parts, strict=True)))


def _polygon(points: tuple[Point, ...]) -> tuple[float, ...]:
    area = first_y = first_z = zz = yy = yz = 0.0
    for (y0, z0), (y1, z1) in zip(points, points[1:] + points[:1], strict=True):
        cross = y0 * z1 - y1 * z0
        area += cross / 2
        first_y += cross * (y0 + y1) / 6
        first_z += cross * (z0 + z1) / 6
        zz += cross * (z0 * z0 + z0 * z1 + z1 * z1) / 12
        yy += cross * (y0 * y0 + y0 * y1 + y1 * y1) / 12
        yz += cross * (2 * y0 * z0 + y0 * z1 + y1 * z0 + 2 * y1 * z1) / 24
    return area, first_y, first_z, zz, yy, yz


def _segment(arc: Arc) -> tuple[float, ...]:
    cy, cz = arc.centre
    a0 = math.atan2(arc.start[1] - cz, arc.start[0] - cy)
    a1 = math.atan2(arc.end[1] - cz, arc.end[0] - cy)
    sweep = math.remainder(a1 - a0, 2 * math.pi)
    half, middle = abs(sweep) / 2, a0 + sweep / 2
    s, c, r = math.sin(half), math.cos(half), arc.radius
    area = arc.sign * r**2 * (half - s * c)
    along = arc.sign * 2 / 3 * r**3 * s**3
    uu = arc.sign * r**4 / 4 * (half - s * c + 2 * s**3 * c)
    vv = arc.sign * r**4 / 12 * (3 * half - 3 * s * c - 2 * s**3 * c)
    uy, uz = math.cos(middle), math.sin(middle)
    sy, sz = along * uy, along * uz
    yy, zz, yz = uu * uy * uy + vv * uz * uz, uu * uz * uz + vv * uy * uy, (uu - vv) * uy * uz
    return (
        area,
        sy + cy * area,
        sz + cz * area,
        zz + 2 * cz * sz + cz * cz * area,
        yy + 2 * cy * sy + cy * cy * area,
        yz + cy * sz + cz * sy + cy * cz * area,
    )


def polyline(loop: Loop, origin: Point, *, pieces: int = 8) -> tuple[Point, ...]:
    """The closed loop as points (y, z) in m about ``origin``; each arc in ``pieces`` chords, for drawing."""
    drawn: list[Point] = []
    for point, arc in zip(loop.points, loop.arcs, strict=True):
        drawn.append(point)
        if arc is None:
            continue
        cy, cz = arc.centre
        a0 = math.atan2(arc.start[1] - cz, arc.start[0] - cy)
        a1 = math.atan2(arc.end[1] - cz, arc.end[0] - cy)
        sweep = math.remainder(a1 - a0, 2 * math.pi)
        for k in range(1, pieces):
            angle = a0 + sweep * k / pieces
            drawn.append((cy + arc.radius * math.cos(angle), cz + arc.radius * math.sin(angle)))
    drawn.append(drawn[0])
    return tuple((y - origin[0], z - origin[1]) for y, z in drawn)


def millimetres(length: float) -> str:
    """A length in m as short text in mm, for messages."""
    return f"{length * 1000:.6g} mm"
