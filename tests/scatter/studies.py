"""Small invented studies with quantities to vary."""

import numpy as np
from scipy.stats import qmc

import vib
from vib.scatter.family import Family, nominal_value

FRAME = """
title = "Two-storey frame on mounts"
[units]
length = "m"
[materials.steel]
youngs_modulus = "210 GPa"
poissons_ratio = 0.3
density = "7850 kg/m^3"
[sections.post]
shape = "square hollow"
width = "80 mm"
thickness = "5 mm"
[sections.beam]
shape = "rectangle"
width = "60 mm"
height = "90 mm"
[points]
A0 = [0, 0, 0]
B0 = [1.4, 0, 0]
A1 = [0, 0, 1]
B1 = [1.4, 0, 1]
A2 = [0, 0, 1.9]
B2 = [1.4, 0, 1.9]
[[members]]
name = "posts"
section = "post"
material = "steel"
runs = [["A0", "A1", "A2"], ["B0", "B1", "B2"]]
[[members]]
name = "beams"
section = "beam"
material = "steel"
runs = [["A1", "B1"], ["A2", "B2"]]
[[bodies]]
name = "motor"
mass = "140 kg"
centre = [0.2, 0.1, 2.2]
inertia = ["4 kg m^2", "5 kg m^2", "3 kg m^2"]
carried_by = ["A2"]
[[springs]]
name = "mounts"
between = [["A0", "ground"], ["B0", "ground"]]
[springs.stiffness]
x = "3 kN/mm"
y = "2 kN/mm"
z = "6 kN/mm"
rx = "90 kN m/rad"
ry = "90 kN m/rad"
rz = "50 kN m/rad"
"""
QUANTITIES = (
    "springs[0].stiffness.x",
    "springs[0].stiffness.z",
    "bodies[0].mass",
    "materials.steel.youngs_modulus",
    "materials.steel.density",
    "sections.post.thickness",
)
DASHPOT = """[springs.dashpot]
x = "4 kN s/m"
y = "3 kN s/m"
z = "9 kN s/m"
"""

# three bodies that move along x alone, each on a spring and a dashpot of its own: all in closed form
BODIES = """
[units]
length = "m"
[points]
A = [0, 0, 0]
B = [1, 0, 0]
C = [2, 0, 0]
[[bodies]]
mass = "10 kg"
carried_by = "A"
[[bodies]]
mass = "10 kg"
carried_by = "B"
[[bodies]]
mass = "10 kg"
carried_by = "C"
[[supports]]
at = ["A", "B", "C"]
hold = ["y", "z", "rx", "ry", "rz"]
[[springs]]
between = ["A", "ground"]
stiffness = { x = "40 kN/m" }
dashpot = { x = "100 N s/m" }
[[springs]]
between = ["B", "ground"]
stiffness = { x = "60 kN/m" }
dashpot = { x = "50 N s/m" }
[[springs]]
between = ["C", "ground"]
stiffness = { x = "90 kN/m" }
dashpot = { x = "400 N s/m" }
"""


def study(folder, text):
    file = folder / "study.toml"
    file.write_text(text)
    return vib.read(file)


def family(folder, text, quantities=QUANTITIES, spread=0.2, count=8):
    """A family whose quantities lie so far either way of their nominal values."""
    read = study(folder, text)
    nominal = {path: nominal_value(read, path) for path in quantities}
    bounds = {path: (value * (1 - spread), value * (1 + spread)) for path, value in nominal.items()}
    return Family.from_study(read, bounds, count=count)


def samples(made, count, seed=3):
    """Random samples within the bounds of a family."""
    drawn = qmc.LatinHypercube(len(made.nominal), seed=seed).random(count)
    return np.asarray(qmc.scale(drawn, made.bounds[:, 0], made.bounds[:, 1]))


def dense(matrix):
    return matrix.toarray() if hasattr(matrix, "toarray") else np.asarray(matrix)
