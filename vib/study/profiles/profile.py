"""The properties of a cross section, and how they come from its outline and walls."""

from __future__ import annotations

import math
from dataclasses import dataclass

from vib.errors import ModelError
from vib.study.profiles.outlines import Loop, Point, integrate, millimetres, polyline
from vib.study.profiles.walls import Wall, shear_area

Polyline = tuple[Point, ...]

OFF_SHEAR_CENTRE = "the shear centre is not at the centroid; bending and torsion are computed as if it were"
THICK_WALLS = "thick walls: the torsion constant and the shear areas may be 10 % or more off"


@dataclass(frozen=True)
class Profile:
    """The properties of a cross section, SI floats.

    ``area`` (m^2); ``second_moment_y``, ``second_moment_z`` (m^4) about the principal axes through the
    centroid, which stand turned by ``principal_angle`` (rad, from y towards z) from the drawn axes;
    ``torsion_constant`` (m^4, St Venant); ``shear_area_y``, ``shear_area_z`` (m^2) for a force along the
    principal y and z axis, ``math.inf`` for no shear flexibility. ``centroid`` (m) is the place of the
    centroid from the lower left corner of the drawn outline; ``shear_centre`` (m) the place of the shear
    centre from the centroid, in drawn axes; both for information. ``outline`` holds closed polylines
    of (y, z) in m about the centroid, in drawn axes; the first is the outer one, the others are holes.
    ``remarks`` say in words what was assumed.
    """

    name: str
    area: float
    second_moment_y: float
    second_moment_z: float
    torsion_constant: float
    shear_area_y: float
    shear_area_z: float
    principal_angle: float = 0.0
    centroid: Point = (0.0, 0.0)
    shear_centre: Point = (0.0, 0.0)
    outline: tuple[Polyline, ...] = ()
    remarks: tuple[str, ...] = ()

    @property
    def polar_moment(self) -> float:
        """Second moment about the centroid for rotary inertia about x, Iy + Iz, in m^4."""
        return self.second_moment_y + self.second_moment_z


def assemble(
    name: str,
    loops: tuple[Loop, ...],
    *,
    torsion: float,
    shear: tuple[float, float] | list[Wall],
    shear_centre: Point | None = None,
    remarks: tuple[str, ...] = (),
) -> Profile:
    """Integrate the outline and turn to principal axes; ``shear`` may be walls.

    ``shear_centre`` is in the axes of the outline; None means at the centroid.
    """
    found = integrate(loops)
    y, z = found.centroid
    zz, yy, yz = found.about_centroid()
    turn = _principal_angle(zz, yy, yz)
    cos, sin = math.cos(turn), math.sin(turn)
    first = zz * cos**2 + yy * sin**2 - 2 * yz * sin * cos
    second = zz * sin**2 + yy * cos**2 + 2 * yz * sin * cos
    if isinstance(shear, list):
        shear = (shear_area(shear, turn), shear_area(shear, turn + math.pi / 2))
        # Walls that are hardly walls any more: no more than a solid rectangle has.
        most = 5 / 6 * found.area
        if max(shear) > most:
            shear = (min(shear[0], most), min(shear[1], most))
            remarks = tuple(dict.fromkeys((*remarks, THICK_WALLS)))
        # No section is stiffer than with the warping k y z of the best k (minimum of potential energy).
        most = 4 * first * second / (first + second)
        if torsion > most:
            torsion = most
            remarks = tuple(dict.fromkeys((*remarks, THICK_WALLS)))
    outline = tuple(polyline(loop, (y, z)) for loop in loops)
    low_y, low_z = (min(point[k] for point in outline[0]) for k in (0, 1))
    offset = (0.0, 0.0) if shear_centre is None else (shear_centre[0] - y, shear_centre[1] - z)
    return Profile(
        name=name,
        area=found.area,
        second_moment_y=first,
        second_moment_z=second,
        torsion_constant=torsion,
        shear_area_y=shear[0],
        shear_area_z=shear[1],
        principal_angle=turn,
        centroid=(-low_y, -low_z),
        shear_centre=offset,
        outline=outline,
        remarks=remarks if shear_centre is None else (OFF_SHEAR_CENTRE, *remarks),
    )


def _principal_angle(zz: float, yy: float, yz: float) -> float:
    """The smallest turn from the drawn to the principal axes, in rad; +45 degrees if both are as small."""
    round_off = 1e-12 * (zz + yy)
    if abs(yz) <= round_off:
        return 0.0
    if abs(zz - yy) <= round_off:
        return math.pi / 4
    return 0.5 * math.atan(-2 * yz / (zz - yy))


def positive(**lengths: float) -> None:
    """Refuse what is not a finite number above zero, by its name."""
    for name, value in lengths.items():
        if not (math.isfinite(value) and value > 0.0):
            raise ModelError(f"{name}: must be above zero, got {value:g}")


def not_negative(**lengths: float) -> None:
    """Refuse what is not a finite number of zero or more, by its name."""
    for name, value in lengths.items():
        if not (math.isfinite(value) and value >= 0.0):
            raise ModelError(f"{name}: must not be negative, got {value:g}")


def thinner(wall: float, wall_name: str, side: float, side_name: str, walls: int) -> None:
    """Refuse ``walls`` walls that leave nothing of the side."""
    if walls * wall >= side:
        part = "half of " if walls == 2 else ""
        raise ModelError(
            f"{wall_name}: {millimetres(wall)} must be less than {part}{side_name}, {millimetres(side)}; "
            f"give a smaller {wall_name} or a larger {side_name}"
        )


def sizes(*lengths: float) -> str:
    """Lengths in m as short text in mm, for the names of profiles."""
    return " x ".join(f"{length * 1000:.6g}" for length in lengths) + " mm"


def thick(thickness: float, side: float, part: float) -> tuple[str, ...]:
    """The remark on thick walls if a wall is thicker than ``side / part``."""
    return (THICK_WALLS,) if thickness * part > side * (1 + 1e-9) else ()
