"""Run-up of a rotor on a flexible skid: ours, and a dense solve at every speed, on the same matrices."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

import vib
from tests.bench.case import Case
from tests.references.common import study

BAYS = {"s": 3, "m": 6, "l": 12}
SPEEDS = {"s": 200, "m": 200, "l": 100}
CHECKED = 3  # speeds that both sides are compared at


@dataclass(frozen=True, eq=False)
class Skid:
    """A study, its modes, and the speeds (k,) of its shaft, rev/s."""

    built: vib.Study
    modes: vib.Modes
    speeds: Any


def prepare(size: str) -> Skid:
    """Two long beams with cross beams on dashpots, a spinning rotor in the first bay."""
    bays = BAYS[size]
    points = [f"P{j}x{i} = [{0.6 * i}, {1.5 * j}, 0]" for j in range(2) for i in range(bays + 1)]
    runs = [[f"P{j}x{i}" for i in range(bays + 1)] for j in range(2)]
    runs += [[f"P0x{i}", f"P1x{i}"] for i in range(bays + 1)]
    corners = [[f"P{j}x{i}", "ground"] for j in range(2) for i in (0, bays)]
    built = study(
        f"""
[units]
length = "m"
[points]
{chr(10).join(points)}
[sections.beam]
shape = "rectangular hollow"
width = 0.1
height = 0.2
thickness = 0.008
[materials.steel]
like = "structural steel"
[[members]]
section = "beam"
material = "steel"
runs = {runs}
[[bodies]]
name = "rotor"
mass = "400 kg"
centre = [0.3, 0.75, 0.5]
inertia = ["30 kg m^2", "40 kg m^2", "40 kg m^2"]
carried_by = ["P0x0", "P1x0", "P0x1", "P1x1"]
spin = {{ axis = "x", shaft = "fan" }}
[[springs]]
between = {corners}
stiffness = {{ x = "1 kN/mm", y = "1 kN/mm", z = "2 kN/mm" }}
dashpot = {{ x = "1 kN s/m", y = "1 kN s/m", z = "2 kN s/m" }}
[[excitations]]
name = "fan"
speed = ["600 rpm", "3000 rpm"]
at = "rotor"
unbalance = {{ amount = "900 g mm" }}
""".replace("'", '"')
    )
    return Skid(built, built.system().modes(up_to=60.0), np.linspace(10, 50, SPEEDS[size]))


def ours_run_up(given: Skid) -> Sequence[float]:
    """Phasors of two outputs at every speed."""
    run = vib.run_up(
        given.built, speeds_hz=given.speeds, watch=[("rotor", "y"), ("rotor", "z")], modes=given.modes
    )
    return _summed(run.displacement_m[:, 0])


def solved_run_up(given: Skid) -> Sequence[float]:
    """The same from the matrices at each speed, dense."""
    system: Any = given.modes.system
    mass, stiffness, damping = (
        matrix.toarray() for matrix in (system.mass, system.stiffness, system.damping)
    )
    turning = system.rotations[0].gyroscopic.toarray()
    y, z = system.direction("rotor", "y"), system.direction("rotor", "z")
    found = []
    for speed in given.speeds.tolist():
        w = 2 * np.pi * speed
        matrix = stiffness - w**2 * mass + 1j * w * (damping + w * turning)
        motion = np.linalg.solve(matrix, 9e-4 * w**2 * (y - 1j * z))
        found.append([y @ motion, z @ motion])
    return _summed(np.array(found))


def _summed(displacement: Any) -> Sequence[float]:
    places = np.linspace(0, len(displacement) - 1, CHECKED).astype(int)
    return [float(value) for value in np.abs(displacement[places]).ravel()]


CASES = (
    Case(
        "run-up",
        "rotor on a skid, 100 to 200 speeds",
        "numpy.linalg.solve at every speed",
        prepare,
        ours_run_up,
        solved_run_up,
        rtol=1e-6,
    ),
)
