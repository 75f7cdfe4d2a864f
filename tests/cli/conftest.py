"""Studies small enough that a command takes no time, and a way to run commands in this process."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path

import pytest

from vib.cli import run

CHAIN = """
title = "Two masses in line"
[units]
mass = "kg"
stiffness = "N/m"
damping = "N s/m"
[matrices]
mass = [[1, 0], [0, 1]]
stiffness = [[200, -100], [-100, 100]]
damping = [[0.4, -0.2], [-0.2, 0.2]]
[[excitations]]
name = "motor"
speed = "{speed}"
orders = [1]
[impact]
at = "1"
impulse = "1 N s"
duration = "1 s"
"""

UNSTABLE = """
title = "Grows"
[units]
mass = "kg"
stiffness = "N/m"
damping = "N s/m"
[matrices]
mass = [[1]]
stiffness = [[100]]
damping = [[-0.5]]
[[excitations]]
name = "motor"
speed = "3000 rpm"
orders = [1]
"""

BEAM = """
title = "Flat bar, clamped"
[sections.flat]
shape = "flat"
width = "60 mm"
thickness = "8 mm"
[points]
A = ["0 m", "0 m", "0 m"]
B = ["0.5 m", "0 m", "0 m"]
[[members]]
name = "bar"
section = "flat"
material = "structural steel"
runs = [["A", "B"]]
[[supports]]
at = "A"
hold = "all"
[damping]
ratio = 0.01
"""


BLOCK = """
title = "Block on a spring"
[points]
A = ["0 m", "0 m", "0 m"]
[[bodies]]
name = "block"
mass = "12 kg"
inertia = ["1 kg m^2", "1 kg m^2", "1 kg m^2"]
carried_by = "A"
[[springs]]
between = ["A", "ground"]
stiffness = {x = "1 kN/m", y = "1 kN/m", z = "3 kN/m", rx = "5 N m/rad", ry = "5 N m/rad", rz = "5 N m/rad"}
dashpot = {x = "5 N s/m", y = "5 N s/m", z = "5 N s/m"}
[damping]
ratio = 0.02
[impact]
at = "block"
along = "z"
impulse = "6 N s"
duration = "0.5 s"
"""


@dataclass(frozen=True)
class Done:
    status: int
    out: str
    err: str


@pytest.fixture
def vib(capsys: pytest.CaptureFixture[str]) -> Callable[..., Done]:
    """Run one command in this process: its exit status, standard output and standard error."""

    def called(*arguments: object) -> Done:
        status = run([str(argument) for argument in arguments])
        said = capsys.readouterr()
        return Done(status, said.out, said.err)

    return called


@pytest.fixture
def chain(tmp_path: Path) -> Path:
    """Modes at 0.98 and 2.58 Hz, far from the motor at 50 Hz."""
    return _written(tmp_path / "chain.toml", CHAIN.format(speed="3000 rpm"))


@pytest.fixture
def resonant(tmp_path: Path) -> Path:
    """The motor turns at 1 Hz, the first mode is at 0.98 Hz."""
    return _written(tmp_path / "resonant.toml", CHAIN.format(speed="60 rpm"))


@pytest.fixture
def unstable(tmp_path: Path) -> Path:
    return _written(tmp_path / "unstable.toml", UNSTABLE)


@pytest.fixture
def beam(tmp_path: Path) -> Path:
    return _written(tmp_path / "beam.toml", BEAM)


@pytest.fixture
def block(tmp_path: Path) -> Path:
    """A structure of six freedoms that is struck."""
    return _written(tmp_path / "block.toml", BLOCK)


def _written(path: Path, text: str) -> Path:
    path.write_text(text, encoding="utf-8")
    return path
