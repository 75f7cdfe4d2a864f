"""Solid sections: rectangle, flat, round bar."""

from __future__ import annotations

import math
from dataclasses import replace

from vib.study.profiles.outlines import Corner, circle, rounded
from vib.study.profiles.profile import Profile, assemble, positive, sizes
from vib.study.profiles.torsion import rectangle_torsion


def rectangle(width: float, height: float) -> Profile:
    """A solid rectangle.

    Raises
    ------
    ModelError
        A dimension that is not above zero.
    """
    positive(width=width, height=height)
    half_y, half_z = width / 2, height / 2
    corners = [
        Corner(-half_y, -half_z),
        Corner(half_y, -half_z),
        Corner(half_y, half_z),
        Corner(-half_y, half_z),
    ]
    area = width * height
    return assemble(
        f"rectangle {sizes(width, height)}",
        (rounded(corners),),
        torsion=rectangle_torsion(width, height),
        shear=(5 / 6 * area, 5 / 6 * area),
    )


def flat(width: float, thickness: float) -> Profile:
    """A flat bar lying down: ``width`` along y, ``thickness`` along z.

    Raises
    ------
    ModelError
        A dimension that is not above zero.
    """
    positive(width=width, thickness=thickness)
    return replace(rectangle(width, thickness), name=f"flat {sizes(width, thickness)}")


def round_bar(diameter: float) -> Profile:
    """A solid round bar.

    Raises
    ------
    ModelError
        A diameter that is not above zero.
    """
    positive(diameter=diameter)
    area = math.pi * diameter**2 / 4
    return assemble(
        f"round bar {sizes(diameter)}",
        (circle((0.0, 0.0), diameter / 2),),
        torsion=math.pi * diameter**4 / 32,
        shear=(0.9 * area, 0.9 * area),
    )
