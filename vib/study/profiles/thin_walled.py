"""Open thin-walled sections: I and H, T, channels, angles."""

from __future__ import annotations

import math

from vib.errors import ModelError
from vib.study.profiles.outlines import Corner, rounded
from vib.study.profiles.profile import Profile, assemble, not_negative, positive, sizes, thick, thinner
from vib.study.profiles.torsion import (
    angle_torsion,
    channel_torsion,
    crossed_torsion,
    crossed_torsion_remarks,
)
from vib.study.profiles.walls import Leg, Wall, add_leg, core_flow


def i_section(
    height: float, width: float, web_thickness: float, flange_thickness: float, root_radius: float = 0.0
) -> Profile:
    """A doubly symmetric I or H section with parallel flanges, web upright.

    Raises
    ------
    ModelError
        A dimension not above zero (the radius may be zero), or walls and radii that do not fit.
    """
    positive(height=height, width=width, web_thickness=web_thickness, flange_thickness=flange_thickness)
    not_negative(root_radius=root_radius)
    thinner(flange_thickness, "flange_thickness", height, "height", 2)
    thinner(web_thickness, "web_thickness", width, "width", 1)
    w, b, z, f, r = web_thickness / 2, width / 2, height / 2, flange_thickness, root_radius
    right = [
        Corner(b, -z), Corner(b, -z + f), Corner(w, -z + f, r, "root_radius"),
        Corner(w, z - f, r, "root_radius"), Corner(b, z - f), Corner(b, z),
    ]  # fmt: skip
    corners = right + [Corner(-c.y, -c.z, c.radius, c.label) for c in right]
    return assemble(
        f"I {sizes(height, width, web_thickness, f)}",
        (rounded(corners),),
        torsion=crossed_torsion(2, height, width, web_thickness, f, r),
        shear=_i_walls(height, width, web_thickness, f, r),
        remarks=(
            *crossed_torsion_remarks(web_thickness, f, r),
            *thick(max(web_thickness, f), min(width, height), 4),
        ),
    )


def t_section(
    height: float, width: float, web_thickness: float, flange_thickness: float, root_radius: float = 0.0
) -> Profile:
    """A T section, flange on top; ``height`` is over all.

    Raises
    ------
    ModelError
        A dimension not above zero (the radius may be zero), or walls and radii that do not fit.
    """
    positive(height=height, width=width, web_thickness=web_thickness, flange_thickness=flange_thickness)
    not_negative(root_radius=root_radius)
    thinner(flange_thickness, "flange_thickness", height, "height", 1)
    thinner(web_thickness, "web_thickness", width, "width", 1)
    w, b, f, r = web_thickness / 2, width / 2, flange_thickness, root_radius
    corners = [
        Corner(-w, 0), Corner(w, 0), Corner(w, height - f, r, "root_radius"), Corner(b, height - f),
        Corner(b, height), Corner(-b, height), Corner(-b, height - f),
        Corner(-w, height - f, r, "root_radius"),
    ]  # fmt: skip
    return assemble(
        f"T {sizes(height, width, web_thickness, f)}",
        (rounded(corners),),
        torsion=crossed_torsion(1, height, width, web_thickness, f, r),
        shear=_t_walls(height, width, web_thickness, f, r),
        remarks=(
            *crossed_torsion_remarks(web_thickness, f, r),
            *thick(max(web_thickness, f), min(width, height), 4),
        ),
        shear_centre=(0.0, height - f / 2),
    )


def channel(
    height: float, width: float, web_thickness: float, flange_thickness: float, root_radius: float = 0.0
) -> Profile:
    """A channel with parallel flanges that point to +y, web upright at the left.

    Raises
    ------
    ModelError
        A dimension not above zero (the radius may be zero), or walls and radii that do not fit.
    """
    return tapered_channel(height, width, web_thickness, flange_thickness, 0.0, root_radius, 0.0)


def tapered_channel(
    height: float,
    width: float,
    web_thickness: float,
    flange_thickness: float,
    flange_slope: float,
    root_radius: float = 0.0,
    toe_radius: float = 0.0,
    thickness_at: float | None = None,
) -> Profile:
    """A channel whose flanges taper by ``flange_slope`` (0.08 for 8 %) on their inner faces.

    ``flange_thickness`` is measured at ``thickness_at`` from the free edge; at half the width if not given.
    The torsion constant takes the corner formula for parallel flanges with the thickness at the web, which
    is 1 to 2 % low for an 8 % slope.

    Raises
    ------
    ModelError
        A dimension not above zero (slope and radii may be zero), or walls and radii that do not fit.
    """
    positive(height=height, width=width, web_thickness=web_thickness, flange_thickness=flange_thickness)
    not_negative(flange_slope=flange_slope, root_radius=root_radius, toe_radius=toe_radius)
    thinner(web_thickness, "web_thickness", width, "width", 1)
    at = width / 2 if thickness_at is None else thickness_at
    tip = flange_thickness - flange_slope * at
    root = flange_thickness + flange_slope * (width - web_thickness - at)
    if tip <= 0.0:
        raise ModelError(
            f"flange_slope: {flange_slope:g} leaves no thickness at the free edge; give a smaller slope"
        )
    thinner(root, "flange_thickness", height, "height", 2)
    z, t, r = height / 2, web_thickness, root_radius
    corners = [
        Corner(0, -z), Corner(width, -z), Corner(width, -z + tip, toe_radius, "toe_radius"),
        Corner(t, -z + root, r, "root_radius"), Corner(t, z - root, r, "root_radius"),
        Corner(width, z - tip, toe_radius, "toe_radius"), Corner(width, z), Corner(0, z),
    ]  # fmt: skip
    mean = (tip + root) / 2
    line, m = width - t / 2, z - mean / 2
    offset = t / 2 - 3 * mean * line**2 / (6 * line * mean + 2 * m * t)
    return assemble(
        f"channel {sizes(height, width, t, flange_thickness)}",
        (rounded(corners),),
        torsion=channel_torsion(height, width, t, tip, root, r),
        shear=_channel_walls(height, width, t, tip, root, r),
        shear_centre=(offset, 0.0),
        remarks=thick(max(t, root), min(width, height), 4),
    )


def angle(
    height: float, width: float, thickness: float, root_radius: float = 0.0, toe_radius: float = 0.0
) -> Profile:
    """An angle: ``height`` upright at the left, ``width`` along the bottom to +y.

    Its principal axes are turned: by +45 degrees for equal legs, y then being the strong axis.

    Raises
    ------
    ModelError
        A dimension not above zero (the radii may be zero), or walls and radii that do not fit.
    """
    positive(height=height, width=width, thickness=thickness)
    not_negative(root_radius=root_radius, toe_radius=toe_radius)
    thinner(thickness, "thickness", height, "height", 1)
    thinner(thickness, "thickness", width, "width", 1)
    a, b, t = height, width, thickness
    corners = [
        Corner(0, 0), Corner(b, 0), Corner(b, t, toe_radius, "toe_radius"),
        Corner(t, t, root_radius, "root_radius"), Corner(t, a, toe_radius, "toe_radius"), Corner(0, a),
    ]  # fmt: skip
    return assemble(
        f"angle {sizes(a, b, t)}",
        (rounded(corners),),
        torsion=angle_torsion(a, b, t, root_radius),
        shear=_angle_walls(a, b, t, root_radius),
        shear_centre=(t / 2, t / 2),
        remarks=thick(t, min(a, b), 6),
    )


def _i_walls(height: float, width: float, web: float, flange: float, radius: float) -> list[Wall]:
    walls: list[Wall] = []
    top = _crossing_flange(walls, height / 2, -1.0, width, web, flange, radius)
    inside = height / 2 - flange
    add_leg(walls, Leg((0.0, inside), (0.0, -inside), (0.0, 0.0), web, web, radius, radius), top)
    _crossing_flange(walls, -height / 2, 1.0, width, web, flange, radius)
    return walls


def _t_walls(height: float, width: float, web: float, flange: float, radius: float) -> list[Wall]:
    walls: list[Wall] = []
    _crossing_flange(walls, height, -1.0, width, web, flange, radius)
    add_leg(walls, Leg((0.0, 0.0), (0.0, height - flange), (0.0, 0.0), web, web, radius))
    return walls


def _crossing_flange(
    walls: list[Wall], face: float, inward: float, width: float, web: float, flange: float, radius: float
) -> tuple[int, ...]:
    """Both halves of a flange with its flat face at z = ``face``, up to the middle of the web."""
    ends = []
    middle = face + inward * flange / 2
    for side in (-0.5, 0.5):
        leg = Leg((side * width, face), (side * web, face), (0.0, inward), flange, flange, radius)
        last = add_leg(walls, leg)
        walls.append(
            Wall((side * web, middle), (0.0, middle), flange, core_flow(flange, web, radius), (last,))
        )
        ends.append(len(walls) - 1)
    return tuple(ends)


def _channel_walls(
    height: float, width: float, web: float, tip: float, root: float, radius: float
) -> list[Wall]:
    walls: list[Wall] = []
    ends = []
    for up in (1.0, -1.0):
        face, middle = up * height / 2, up * (height / 2 - root / 2)
        last = add_leg(walls, Leg((width, face), (web, face), (0.0, -up), tip, root, radius))
        # Twice the thickness: the whole block of the corner, though the flow turns at its middle.
        walls.append(Wall((web, middle), (web / 2, middle), 2 * root, core_flow(root, web, radius), (last,)))
        ends.append(len(walls) - 1)
    inside = height / 2 - root
    add_leg(walls, Leg((0.0, inside), (0.0, -inside), (1.0, 0.0), web, web, radius, radius), (ends[0],))
    return walls


def _angle_walls(height: float, width: float, thickness: float, radius: float) -> list[Wall]:
    walls: list[Wall] = []
    t = thickness
    add_leg(walls, Leg((0.0, height), (0.0, t), (1.0, 0.0), t, t, radius))
    add_leg(walls, Leg((width, 0.0), (t, 0.0), (0.0, 1.0), t, t, radius))
    # The flow hardly works in the block of the corner.
    walls.append(Wall((0.0, t / 2), (t, t / 2), t, math.inf))
    return walls
