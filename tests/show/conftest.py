"""Small studies that everything can be shown of."""

from __future__ import annotations

from pathlib import Path

import pytest

from vib.show.page import Findings
from vib.show.tables.ring import start_words

# names that a drawing program, a browser or a formula parser might take for more than text
EVIL = "<script>alert(1)</script> $x^2$ & _under \"quoted\" '{{ 7 * 7 }}'"

STUDY = """
title = '''{title}'''
[sections.tube]
shape = "SHS 60x60x4"
[points]
A = ["0 m", "0 m", "0 m"]
B = ["0 m", "0 m", "1 m"]
"$C$ <b>" = ["0.8 m", "0 m", "1 m"]
D = ["0.8 m", "0 m", "0 m"]
[[members]]
name = "_legs $a_1$ <i>"
section = "tube"
material = "structural steel"
runs = [["A", "B"], ["D", "$C$ <b>"]]
[[members]]
name = "beam"
section = "tube"
material = "structural steel"
runs = [["B", "$C$ <b>"]]
[[bodies]]
name = "motor <svg onload=x>"
mass = "40 kg"
centre = ["0.4 m", "0 m", "1.2 m"]
inertia = ["1 kg m^2", "1 kg m^2", "1 kg m^2"]
carried_by = ["B", "$C$ <b>"]
[[supports]]
at = ["A"]
hold = "all"
[[supports]]
at = ["D"]
hold = ["x", "z"]
[[springs]]
name = "foot & pad"
between = ["D", "ground"]
stiffness = {{y = "2 kN/mm", rx = "2 kN m/rad", rz = "2 kN m/rad"}}
[damping]
ratio = 0.01
"""

FORCES = """
[[excitations]]
name = "fan </title> $1$"
speed = ["600 rpm", "3000 rpm"]
orders = [1, 2]
at = "motor <svg onload=x>"
along = "y"
[[excitations]]
name = "mains"
frequencies = ["100 Hz"]
[impact]
at = "motor <svg onload=x>"
along = "y"
pulse = {peak = "100 N", duration = "2 ms"}
duration = "0.3 s"
"""


def findings_of(path: Path, count: int = 4) -> Findings:
    import vib
    from vib.cli.starts import StartOptions, start_arguments
    from vib.structure.survey import survey

    study = vib.read(path)
    modes = study.system().modes(count=count)
    ring, start = None, ""
    if study.impact is not None:
        arguments = start_arguments(study, StartOptions())
        ring = modes.system.ring(**arguments, modes=modes)
        start = start_words(arguments, "si")
    screening = vib.screen(modes, study.excitations) if study.excitations else None
    return Findings(study, survey(study), modes, ring, screening, "si", start)


@pytest.fixture(scope="session")
def frame(tmp_path_factory: pytest.TempPathFactory) -> Findings:
    """A frame whose names are as hostile as they may be."""
    path = tmp_path_factory.mktemp("frame") / "frame.toml"
    path.write_text(STUDY.format(title=EVIL) + FORCES, encoding="utf-8")
    return findings_of(path)


@pytest.fixture(scope="session")
def bare(tmp_path_factory: pytest.TempPathFactory) -> Findings:
    """Matrices with an unstable mode, without excitations and impact."""
    path = tmp_path_factory.mktemp("bare") / "bare.toml"
    path.write_text(
        'title = "Bare"\n[units]\nmass = "kg"\nstiffness = "N/m"\ndamping = "N s/m"\n[matrices]\n'
        "mass = [[1, 0], [0, 2]]\nstiffness = [[30, -10], [-10, 10]]\ndamping = [[0.1, 0], [0, -0.5]]\n"
    )
    return findings_of(path, count=2)
