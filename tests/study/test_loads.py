"""Loads, motion of the ground and records of a study file: what is read, and the faults that are named."""

from __future__ import annotations

import numpy as np
import pytest

import vib
from vib.errors import StudyError
from vib.response.from_study import ground_of, lines_of, loads_of, watched
from vib.response.signals import Constant, Harmonic, Impulse, Points, Sweep

FRAME = """
[units]
length = "mm"
[points]
A = [0, 0, 0]
[[bodies]]
name = "block"
mass = "12 kg"
carried_by = "A"
[[springs]]
between = ["A", "ground"]
stiffness = {x = "1 kN/m", y = "1 kN/m", z = "3 kN/m"}
"""


def read(folder, text, **files):
    for name, content in files.items():
        (folder / f"{name}.csv").write_text(content, encoding="utf-8")
    path = folder / "study.toml"
    path.write_text(FRAME + text, encoding="utf-8")
    return vib.read(path)


def load(course, along='"x"', more=""):
    return f'[[loads]]\nat = "block"\nalong = {along}\n{course}\n{more}\n'


@pytest.mark.parametrize(
    ("text", "wanted"),
    [
        (load('constant = "2 kN"', more='start = "1 s"\nend = "3 s"'), Constant(2000.0, 1.0, 3.0)),
        (load('impulse = "3 N s"', more='start = "20 ms"'), Impulse(3.0, 0.02)),
        (
            load('harmonic = {amplitude = "5 N", frequency = "1500 rpm", phase = "90 deg"}'),
            Harmonic(5.0, 25.0, np.pi / 2),
        ),
        (load('half_sine = {peak = "5 N", duration = "10 ms"}'), Harmonic(5.0, 50.0, 0.0, 0.0, 0.01)),
        (
            load(
                'sweep = {amplitude = "1 lbf", frequencies = ["2 Hz", "20 Hz"], duration = "1 min", '
                'kind = "exponential"}'
            ),
            Sweep(4.4482216152605, 2.0, 20.0, 60.0, True),
        ),
        (load('harmonic = {amplitude = "5 N m", frequency = "2 Hz"}', '"rz"'), Harmonic(5.0, 2.0)),
    ],
)
def test_loads_are_read_in_si(tmp_path, text, wanted):
    (found,) = loads_of(read(tmp_path, text))
    assert type(found.signal) is type(wanted)
    for name, value in vars(wanted).items():
        assert getattr(found.signal, name) == pytest.approx(value), name
    assert found.at == "block"
    assert found.name == "load 1"


def test_a_record_is_read_with_its_units(tmp_path):
    content = "# made up\n time [ms] ; pull [kN] \n0;1\n\n10;-2\n# a remark\n30;0.5\n"
    (found,) = loads_of(read(tmp_path, load('file = "pull.csv"', more='start = "1 s"'), pull=content))
    assert isinstance(found.signal, Points)
    np.testing.assert_allclose(found.signal.times_s, [1.0, 1.01, 1.03])
    np.testing.assert_allclose(found.signal.values, [1000, -2000, 500])


@pytest.mark.parametrize(
    ("unit", "words", "first"), [("g_0", "acceleration", 9.80665), ("mm/s", "velocity", 0), ("mm", "disp", 0)]
)
def test_the_unit_says_what_of_the_ground_was_recorded(tmp_path, unit, words, first):
    text = '[base_motion]\nalong = "z"\nfile = "floor.csv"\n'
    ground = ground_of(read(tmp_path, text, floor=f"time [s],floor [{unit}]\n0,1\n1,2\n2,1\n"))
    assert ground is not None
    assert words in ground.words
    if first:
        assert ground.acceleration.value(np.array([0.0]))[0] == pytest.approx(first)


def test_lines_and_outputs(tmp_path):
    text = load('constant = "1 N"') + (
        '[response]\nfrequencies = ["1 Hz", "100 Hz"]\nlines = 3\nspacing = "logarithmic"\n'
        'watch = ["block", "block z"]\n'
    )
    study = read(tmp_path, text)
    lines = lines_of(study)
    assert lines is not None
    np.testing.assert_allclose(lines, [1, 10, 100])
    assert watched(study) == [("block", "x"), ("block", "z")]
    assert lines_of(read(tmp_path, "")) is None


FAULTS = [
    (load(""), "needs exactly one of constant, impulse, harmonic, half_sine, sweep, file; has none"),
    (load('constant = "1 N"\nimpulse = "1 N s"'), "exactly one of .*; has constant, impulse|has .*constant"),
    (load('constant = "1 kg"'), "force"),
    (load('constant = "0 N"'), "must not be zero"),
    (load('harmonic = {amplitude = "1 m", frequency = "1 Hz"}'), "force"),
    (load('harmonic = {amplitude = "1 N", frequency = "0 Hz"}'), "greater than 0"),
    (load('harmonic = {amplitude = "1 N", frequency = "1 Hz"}', '"rx"'), "moment"),
    (load('sweep = {amplitude = "1 N", frequencies = ["1 Hz"], duration = "1 s"}'), "two frequencies"),
    (load('impulse = "1 N s"', more='end = "1 s"'), "end goes with constant and harmonic only"),
    (load('constant = "1 N"', more='start = "2 s"\nend = "1 s"'), "end must be later"),
    (load('constant = "1 N"').replace("block", "blok"), 'did you mean "block"'),
    (load('file = "none.csv"'), 'there is no file "none.csv"'),
    ('[base_motion]\nalong = "x"\n', "needs exactly one of"),
    ('[base_motion]\nalong = "up"\nfile = "a.csv"\n', "base_motion.along"),
    ('[response]\nfrequencies = ["9 Hz", "1 Hz"]\n', "must go upwards"),
    ('[response]\nwatch = ["blok z"]\n', 'no point or body is named "blok z"|named "blok"'),
    ("[response]\nlines = 1\n", "response.lines"),
]


@pytest.mark.parametrize(("text", "message"), FAULTS)
def test_faults_are_named(tmp_path, text, message):
    with pytest.raises(StudyError, match=message):
        read(tmp_path, text)


@pytest.mark.parametrize(
    ("content", "message"),
    [
        ("", "is empty"),
        ("time,force\n0,1\n1,2\n", "name two columns with their units"),
        ("time [s],force [mm]\n0,1\n1,2\n", '"mm" is not a unit of a force'),
        ("time [kg],force [N]\n0,1\n1,2\n", "first column"),
        ("time [s],force [N]\n0,1\n1,x\n", "line 3: expected two numbers"),
        ("time [s],force [N]\n0,1\n1,2,3\n", "line 3: expected two numbers"),
        ("time [s],force [N]\n0,1\n", "at least two"),
        ("time [s],force [N]\n0,1\n1,nan\n", "row 2: every number must be finite"),
        ("time [s],force [N]\n0,1\n0,2\n", "row 2: times must ascend"),
    ],
)
def test_faults_of_a_record_are_named_with_entry_and_line(tmp_path, content, message):
    with pytest.raises(StudyError, match=rf"loads\[0\].file \(line \d+\): .*{message}"):
        read(tmp_path, load('file = "pull.csv"'), pull=content)


def test_matrices_have_no_ground(tmp_path):
    path = tmp_path / "study.toml"
    path.write_text(
        '[units]\nmass = "kg"\nstiffness = "N/m"\n[matrices]\nmass = [[1]]\nstiffness = [[1]]\n'
        '[base_motion]\nalong = "x"\nharmonic = {amplitude = "1 m/s^2", frequency = "1 Hz"}\n',
        encoding="utf-8",
    )
    with pytest.raises(StudyError, match="base_motion needs a structure"):
        vib.read(path)
