"""Excitations: unbalance by balance grade, shared by two planes."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

import numpy as np

import vib
from tests.references.common import Check, Entry, covers, study


def rotor(mass: float, speed: float, grade: float, levers: tuple[float, float] | None = None) -> vib.Study:
    """A rotor on two soft bearings with an unbalance by grade; levers in m, speed in r/min, grade in mm/s."""
    a, b = levers or (1.0, 1.0)
    planes = ', planes = ["A", "B"]' if levers else ""
    return study(
        f"""
[points]
A = ["{-a} m", "0 m", "0 m"]
B = ["{b} m", "0 m", "0 m"]
[[bodies]]
name = "rotor"
mass = "{mass} kg"
centre = ["0 m", "0 m", "0 m"]
inertia = ["1 kg m^2", "2 kg m^2", "2 kg m^2"]
carried_by = ["A", "B"]
spin = {{ axis = "x", shaft = "shaft" }}
[[springs]]
between = [["A", "ground"], ["B", "ground"]]
stiffness = {{ x = "1 kN/m", y = "1 kN/m", z = "1 kN/m", rx = "1 N m/rad" }}
[[excitations]]
name = "shaft"
speed = "{speed} rpm"
at = "rotor"
unbalance = {{ grade = "G {grade}", mass = "{mass} kg"{planes} }}
"""
    )


def pulls(built: vib.Study, speed: float) -> dict[str, Any]:
    """Force in the first direction across the shaft, N, by place, at the service speed."""
    from vib.drive import drive

    found = drive(built.system(), built.excitations)
    forces = found.forces(found.lines[0], np.array([speed / 60]))[0]
    return {aim.place: force for aim, force in zip(found.inputs, forces, strict=True) if force.real}


@covers("STD-G")
def grades(entry: Entry) -> Iterator[Check]:
    for grade, *distances in entry["expected"]["rows"]:
        for speed, distance in zip((600, 1500, 3000, 6000, 15000), distances, strict=True):
            omega = 2 * np.pi * speed / 60
            # 1 kg: the unbalance in g mm is the distance in micrometres
            found = 1e6 * pulls(rotor(1.0, speed, grade), speed)["rotor"] / omega**2
            yield Check(f"G {grade:g} at {speed} r/min, um", complex(found), distance, 1e-6)


@covers("STD-G-EX", "STD-G-TURB")
def planes(entry: Entry) -> Iterator[Check]:
    given, expected = entry["inputs"], entry["expected"]
    levers = given["L_A"], given["L_B"]
    omega = 2 * np.pi * given["n"] / 60
    found = pulls(rotor(given["m"], given["n"], given["G"], levers), given["n"])
    tolerance = entry["tolerance"]["rel"]
    for plane in ("A", "B"):
        amount = 1e6 * found[plane] / omega**2
        yield Check(f"plane {plane}, g mm", complex(amount), expected[f"U_{plane}"], tolerance)
    whole = sum(found.values())
    yield Check("both, g mm", complex(1e6 * whole / omega**2), expected["U_per"], tolerance)
    if "force_at_speed" in expected:
        yield Check("force at speed, N", complex(whole), expected["force_at_speed"], tolerance)
