"""Machines that the tests of run-ups share, and what they do with them."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np

import vib

TAU = 2 * np.pi

SKID = """
title = "Rotor on a skid"
[units]
length = "m"
mass = "kg"
inertia = "kg m^2"
[points]
A = [0, 0, 0]
B = [2, 0, 0]
C = [2, 1, 0]
D = [0, 1, 0]
P = [0.4, 0.5, 0.6]
Q = [1.6, 0.5, 0.6]
p = [0.4, 0.5, 0.6]
q = [1.6, 0.5, 0.6]
[[bodies]]
name = "skid"
mass = 900
centre = [1.0, 0.5, 0.1]
inertia = [90, 300, 370]
carried_by = ["A", "B", "C", "D", "P", "Q"]
[[bodies]]
name = "rotor"
mass = 250
centre = [0.9, 0.5, 0.6]
inertia = [20, 26, 26]
carried_by = ["p", "q"]
[bodies.spin]
axis = "x"
shaft = "fan"
[[springs]]
name = "isolators"
between = [["A", "ground"], ["B", "ground"], ["C", "ground"], ["D", "ground"]]
stiffness = { x = "300 N/mm", y = "350 N/mm", z = "500 N/mm" }
dashpot = { x = "1 kN s/m", y = "1.2 kN s/m", z = "2 kN s/m" }
[[springs]]
name = "bearings"
between = [["p", "P"], ["q", "Q"]]
stiffness = { x = "20 kN/mm", y = "12 kN/mm", z = "30 kN/mm", rx = "1 kN m/rad" }
dashpot = { x = "3 kN s/m", y = "4 kN s/m", z = "6 kN s/m", rx = "5 N m s/rad" }
[[excitations]]
name = "fan"
speed = ["300 rpm", "4200 rpm"]
at = "rotor"
unbalance = { grade = "G 6.3", at_speed = "3000 rpm", phase = "30 deg" }
"""

FRAME = """
title = "Fan on a frame"
[units]
length = "mm"
mass = "kg"
inertia = "kg m^2"
[materials.steel]
youngs_modulus = "210 GPa"
poissons_ratio = 0.30
density = "7850 kg/m^3"
[sections.tube]
shape = "rectangular hollow"
width = 80
height = 120
thickness = 5
[points]
A = [0, 0, 0]
B = [1500, 0, 0]
E = [0, 0, 900]
F = [1500, 0, 900]
G = [750, 0, 900]
H = [750, 500, 900]
[[members]]
section = "tube"
material = "steel"
runs = [["A", "E"], ["B", "F"], ["E", "G", "F"]]
[[members]]
name = "arm"
section = "tube"
material = "steel"
runs = [["G", "H"]]
offset_end = [0, 0, -60]
releases = { end = ["rx"] }
[[bodies]]
name = "fan"
mass = 120
centre = [750, 300, 1100]
inertia = [5, 9, 8]
carried_by = ["G", "H"]
[bodies.spin]
axis = "y"
shaft = "fan"
inertia = 6
[[supports]]
at = ["A", "B"]
hold = "all"
%s
[damping]
rayleigh = [["5 Hz", 0.01], ["80 Hz", 0.02]]
[[excitations]]
name = "fan"
speed = ["300 rpm", "3000 rpm"]
at = "fan"
unbalance = { amount = "900 g mm" }
blades = { count = 3, along = "y", amplitude = "30 N" }
forces = { order = 2, along = "rz", amplitude = "20 N m", phase = "40 deg" }
"""

AT_THE_ARM = '[[supports]]\nat = "H"\nhold = ["y", "rx"]\n'
MOUNTS = """[[springs]]
name = "mounts"
between = [["H", "ground"]]
stiffness = { x = "80 N/mm", z = "200 N/mm", rz = "9 kN m/rad" }
dashpot = { z = "300 N s/m" }
x_axis = [0.6, 0.8, 0]
y_axis = "z"
"""


def ran(study: Any, **arguments: Any) -> Any:
    """A run-up, for tests that look into it freely."""
    return vib.run_up(study, **arguments)


def study_of(tmp_path: Path, text: str) -> vib.Study:
    file = tmp_path / "study.toml"
    file.write_text(text)
    return vib.read(file)


def skew(reach):
    x, y, z = reach
    return np.array([[0, -z, y], [z, 0, -x], [-y, x, 0]], dtype=float)


def dynamic(system, speed, omega):
    """The dynamic stiffness with the gyroscopic matrix turned to another speed, dense."""
    turning = sum(
        (TAU * (speed - row.speed_hz) * row.gyroscopic.toarray() for row in system.rotations),
        np.zeros((system.size, system.size)),
    )
    linear = turning
    for matrix in (system.damping, system.gyroscopic):
        if matrix is not None:
            linear = linear + matrix.toarray()
    return system.stiffness.toarray() - omega**2 * system.mass.toarray() + 1j * omega * linear
