"""Studies that scatter, invented."""

import pytest

import vib

# two masses that swing apart from each other: one along x, one along y, each on its own spring
SWAP = """
title = "Two tables side by side"
[units]
length = "mm"
[points]
A = [0, 0, 0]
B = [1000, 0, 0]
[[bodies]]
name = "one"
mass = "100 kg"
carried_by = "A"
[[bodies]]
name = "other"
mass = "100 kg"
carried_by = "B"
[[supports]]
at = "A"
hold = ["y", "z", "rx", "ry", "rz"]
[[supports]]
at = "B"
hold = ["x", "z", "rx", "ry", "rz"]
[[springs]]
name = "under one"
between = ["A", "ground"]
stiffness = { x = "400 N/mm +- 30 %" }
[[springs]]
name = "under other"
between = ["B", "ground"]
stiffness = { y = "440 N/mm +- 30 %" }
[damping]
ratio = 0.01
[[excitations]]
name = "shaker"
frequencies = ["10.5 Hz"]
band = "4 %"
"""

# a mast whose two swaying modes are close to each other and trade places
FRAME = """
title = "Mast with an oblong foot"
[units]
length = "mm"
[points]
A = [0, 0, 0]
B = [0, 0, 1500]
[sections.mast]
shape = "rectangle"
width = 60
height = 64
[materials.steel]
like = "structural steel"
youngs_modulus = "210 GPa +- 5 %"
[[members]]
name = "mast"
section = "mast"
material = "steel"
runs = [["A", "B"]]
[[bodies]]
name = "head"
mass = "80 kg +- 10 %"
carried_by = "B"
[[springs]]
name = "foot"
between = ["A", "ground"]
stiffness = { x = "50 kN/mm", y = "50 kN/mm", z = "50 kN/mm", rz = "90 kN m/rad" }
[[springs]]
name = "tilting foot"
between = ["A", "ground"]
stiffness = { rx = "300 kN m/rad +- 40 %", ry = "260 kN m/rad +- 40 %" }
[damping]
ratio = 0.01
[[excitations]]
name = "pump"
speed = "288 rpm"
at = "head"
band = "5 %"
"""

# the same with an unbalance and a standard to judge by
DRIVEN = (
    FRAME.replace('speed = "288 rpm"', 'speed = "330 rpm"')
    + """
axis = "x"
unbalance = { amount = "3 kg mm" }
[severity]
group = 2
support = "flexible"
places = ["head"]
[[severity.limits]]
name = "house rule"
velocity_rms = "3 mm/s"
"""
)


@pytest.fixture(scope="session")
def studies(tmp_path_factory):
    """A study from its text."""
    folder = tmp_path_factory.mktemp("scatter")

    def make(text=SWAP, *changes):
        for old, new in changes:
            assert old in text
            text = text.replace(old, new)
        file = folder / "study.toml"
        file.write_text(text, encoding="utf-8")
        return vib.read(file)

    return make
