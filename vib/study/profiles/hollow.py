"""Hollow sections: circular, square, rectangular."""

from __future__ import annotations

import itertools
import math

from vib.errors import ModelError
from vib.study.profiles.outlines import Corner, circle, millimetres, rounded
from vib.study.profiles.profile import Profile, assemble, not_negative, positive, sizes, thick, thinner
from vib.study.profiles.torsion import hollow_torsion
from vib.study.profiles.walls import Wall, shear_area

_CORNER_PIECES = 4


def circular_hollow(diameter: float, thickness: float) -> Profile:
    """A circular hollow section (tube); ``diameter`` is the outer one.

    The shear area is the energy value without the effect of Poisson's ratio, 6 (1 + m^2)^2 A /
    (7 (1 + m^2)^2 + 20 m^2), m inner over outer diameter: G. R. Cowper, J. Appl. Mech. 33 (1966) 335-340
    (from memory), hollow circle with nu = 0; A/2 for a thin wall.

    Raises
    ------
    ModelError
        A dimension that is not above zero, or a thickness of half the diameter or more.
    """
    positive(diameter=diameter, thickness=thickness)
    thinner(thickness, "thickness", diameter, "diameter", 2)
    outer, inner = diameter / 2, diameter / 2 - thickness
    area = math.pi * (outer**2 - inner**2)
    m = (inner / outer) ** 2
    share = 6 * (1 + m) ** 2 / (7 * (1 + m) ** 2 + 20 * m)
    return assemble(
        f"circular hollow {sizes(diameter, thickness)}",
        (circle((0.0, 0.0), outer), circle((0.0, 0.0), inner, hole=True)),
        torsion=math.pi * (outer**4 - inner**4) / 2,
        shear=(share * area, share * area),
    )


def square_hollow(
    width: float, thickness: float, outer_radius: float | None = None, inner_radius: float | None = None
) -> Profile:
    """A square hollow section; see ``rectangular_hollow``.

    Raises
    ------
    ModelError
        As ``rectangular_hollow``.
    """
    return rectangular_hollow(width, width, thickness, outer_radius, inner_radius)


def rectangular_hollow(
    width: float,
    height: float,
    thickness: float,
    outer_radius: float | None = None,
    inner_radius: float | None = None,
) -> Profile:
    """A rectangular hollow section.

    Corner radii: without ``outer_radius`` the corners are sharp; without ``inner_radius`` it is
    ``outer_radius - thickness``, not less than zero.

    Raises
    ------
    ModelError
        A dimension not above zero, a thickness of half a side or more, or a radius that does not fit.
    """
    positive(width=width, height=height, thickness=thickness)
    thinner(thickness, "thickness", width, "width", 2)
    thinner(thickness, "thickness", height, "height", 2)
    remarks = (
        () if outer_radius is not None else ("the corners are taken as sharp: no outer_radius was given",)
    )
    outer = 0.0 if outer_radius is None else outer_radius
    inner = max(outer - thickness, 0.0) if inner_radius is None else inner_radius
    not_negative(outer_radius=outer, inner_radius=inner)
    # Along the diagonal of a corner the wall is sqrt(2) t - (sqrt(2) - 1) (outer - inner) thick.
    if (math.sqrt(2) - 1) * (outer - inner) >= math.sqrt(2) * thickness:
        raise ModelError(
            f"outer_radius: {millimetres(outer)} leaves no wall at the corners; give an inner_radius near "
            "outer_radius - thickness"
        )
    inside_y, inside_z = width - 2 * thickness, height - 2 * thickness
    return assemble(
        f"rectangular hollow {sizes(width, height, thickness)}",
        (
            rounded(_box(width, height, outer, "outer_radius")),
            rounded(_box(inside_y, inside_z, inner, "inner_radius")[::-1]),
        ),
        torsion=hollow_torsion(width, height, thickness, (outer + inner) / 2),
        shear=_hollow_shear(width, height, thickness, outer, inner),
        remarks=(*remarks, *thick(thickness, min(width, height), 5)),
    )


def _box(width: float, height: float, radius: float, label: str) -> list[Corner]:
    y, z = width / 2, height / 2
    return [Corner(a, b, radius, label) for a, b in ((-y, -z), (y, -z), (y, z), (-y, z))]


def _hollow_shear(
    width: float, height: float, thickness: float, outer: float, inner: float
) -> tuple[float, float]:
    """Shear areas along y and z in m^2, with corners of the two radii."""
    # Across a corner the flow finds the wall along its diagonal; the square, which counts the shorter way on
    # the inside as well, is our own choice from two-dimensional solutions.
    diagonal = math.sqrt(2) - (math.sqrt(2) - 1) * (outer - inner) / thickness
    corner = thickness * diagonal**2
    radius = (outer + inner) / 2
    return (
        2 * shear_area(_half(height, width, thickness, radius, corner), math.pi / 2),
        2 * shear_area(_half(width, height, thickness, radius, corner), math.pi / 2),
    )


def _half(width: float, height: float, thickness: float, radius: float, corner: float) -> list[Wall]:
    """The right half, cut where symmetry leaves no flow for an upright force; ``corner``: flow in corners."""
    y, z = (width - thickness) / 2, (height - thickness) / 2
    if radius > thickness / 2:
        r = min(radius, y, z)
        turns = [math.pi / 2 * k / _CORNER_PIECES for k in range(_CORNER_PIECES + 1)]
        bend = [(y - r + r * math.sin(a), z - r + r * math.cos(a)) for a in turns]
    else:
        bend = [(y - thickness / 2, z), (y, z), (y, z - thickness / 2)]
    line = [(0.0, z), *bend, *[(a, -b) for a, b in reversed(bend)], (0.0, -z)]
    straight = {0, len(bend), 2 * len(bend)}
    walls: list[Wall] = []
    for number, (start, end) in enumerate(itertools.pairwise(line)):
        flow = thickness if number in straight else corner
        if math.dist(start, end) > 0.0:
            walls.append(Wall(start, end, thickness, flow, (len(walls) - 1,) if walls else ()))
    return walls
