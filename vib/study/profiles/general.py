"""A section given by its properties."""

from __future__ import annotations

import math

from vib.study.profiles.profile import Profile, positive


def general(
    area: float,
    second_moment_y: float,
    second_moment_z: float,
    torsion_constant: float,
    shear_area_y: float | None = None,
    shear_area_z: float | None = None,
) -> Profile:
    """A section given by its properties about its principal axes; no shear area means no shear flexibility.

    Raises
    ------
    ModelError
        A property that is not above zero.
    """
    positive(
        area=area,
        second_moment_y=second_moment_y,
        second_moment_z=second_moment_z,
        torsion_constant=torsion_constant,
    )
    remarks = []
    for axis, value in (("y", shear_area_y), ("z", shear_area_z)):
        if value is None:
            remarks.append(f"shear_area_{axis} was not given: no shear flexibility along {axis}")
        else:
            positive(**{f"shear_area_{axis}": value})
    return Profile(
        name="general",
        area=area,
        second_moment_y=second_moment_y,
        second_moment_z=second_moment_z,
        torsion_constant=torsion_constant,
        shear_area_y=math.inf if shear_area_y is None else shear_area_y,
        shear_area_z=math.inf if shear_area_z is None else shear_area_z,
        remarks=tuple(remarks),
    )
