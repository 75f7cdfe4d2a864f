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
