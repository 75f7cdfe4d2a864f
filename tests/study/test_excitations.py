"""What shakes the machine, as read from a file: what it is screened against, who follows whom, and faults."""

from __future__ import annotations

from pathlib import Path

import pytest

import vib
from vib.errors import StudyError

HEAD = """
title = "A block"
[points]
A = ["0 m", "0 m", "0 m"]
B = ["1 m", "0 m", "0 m"]
[[bodies]]
name = "block"
mass = "100 kg"
centre = ["0.4 m", "0 m", "0 m"]
inertia = ["3 kg m^2", "4 kg m^2", "5 kg m^2"]
carried_by = ["A", "B"]
[[springs]]
between = [["A", "ground"], ["B", "ground"]]
stiffness = { x = "1 kN/mm", y = "1 kN/mm", z = "1 kN/mm", rx = "1 kN m/rad" }
[[excitations]]
name = "fan"
"""


def read(tmp_path: Path, text: str) -> vib.Study:
    file = tmp_path / "study.toml"
    file.write_text(HEAD + text)
    return vib.read(file)


def test_what_forces_bring_is_screened_against(tmp_path):
    study = read(
        tmp_path,
        'speed = "1480 rpm"\nat = "block"\naxis = "x"\nfrequencies = ["9 Hz"]\n'
        'unbalance = { amount = "20 g mm" }\nblades = { count = 8, along = "y", amplitude = "9 N" }\n'
        'mains = { frequency = "50 Hz", along = "rx", amplitude = "2 N m" }\n',
    )
    (fan,) = study.excitations
    assert fan.orders == (1.0, 8.0)
    assert fan.frequencies == (9.0, 100.0)
    found = vib.screen(study.system().modes(), study.excitations)
    assert {(line.order, line.from_hz) for line in found.lines} == {
        (1.0, 1480 / 60),
        (8.0, 8 * 1480 / 60),
        (None, 9.0),
        (None, 100.0),
    }


def test_orders_that_are_given_stay_beside_those_of_forces(tmp_path):
    study = read(
        tmp_path,
        'speed = "1480 rpm"\nat = "block"\norders = [3, 1]\n'
        'forces = [{ order = 1, along = "y", amplitude = "9 N" }, '
        '{ order = 0.5, along = "z", amplitude = "1 N" }]\n',
    )
    assert study.excitations[0].orders == (3.0, 1.0, 0.5)


def test_a_force_takes_place_and_direction_from_its_excitation(tmp_path):
    study = read(
        tmp_path,
        'speed = "1480 rpm"\nat = "block"\nalong = "rz"\n'
        'forces = [{ order = 1, amplitude = "9 N m" }, '
        '{ order = 2, at = "A", along = "y", amplitude = "2 N" }]\n',
    )
    first, second = study.excitations[0].forces
    assert (first.at, first.along, first.amplitude) == ("block", "rz", 9.0)
    assert (second.at, second.along, second.amplitude) == ("A", "y", 2.0)


def test_shafts_that_follow(tmp_path):
    study = read(
        tmp_path,
        'speed = ["600 rpm", "1200 rpm"]\n[[excitations]]\nname = "pump"\nshaft = "motor"\nratio = 0.5\n'
        '[[excitations]]\nname = "motor"\nshaft = "fan"\nratio = 3\n',
    )
    assert study.excitations[1].speed_ranges == ((15.0, 30.0),)
    assert study.excitations[2].speed_ranges == ((30.0, 60.0),)
    screened = vib.screen(study.system().modes(), study.excitations)
    assert [(line.from_hz, line.to_hz) for line in screened.lines] == [(10, 20), (15, 30), (30, 60)]


def test_a_grade_is_a_velocity(tmp_path):
    for grade in ("G 2.5", "G2.5", "2.5 mm/s"):
        study = read(
            tmp_path,
            f'speed = "900 rpm"\nat = "block"\nunbalance = {{ grade = "{grade}", mass = "20 kg" }}\n',
        )
        assert study.excitations[0].unbalance[0].grade == pytest.approx(2.5e-3)


SPEED = 'speed = "900 rpm"\nat = "block"\n'


@pytest.mark.parametrize(
    ("text", "entry", "message"),
    [
        (
            SPEED + "unbalance = {}",
            "unbalance[0]",
            "needs either grade (with the mass of the rotor) or amount",
        ),
        (SPEED + 'unbalance = { amount = "9 kg" }', "unbalance[0].amount", "not a unit of unbalance"),
        (SPEED + 'unbalance = { amount = "9 g mm", mass = "2 kg" }', "unbalance[0]", "go with grade"),
        (SPEED + 'unbalance = { grade = "X 6" }', "unbalance[0].grade", "expected a velocity"),
        (SPEED + 'unbalance = { grade = "G 0", mass = "1 kg" }', "unbalance[0].grade", "greater than zero"),
        (
            SPEED + 'unbalance = { amount = "9 g mm", at = "C" }',
            "unbalance.at",
            'no point or body is named "C"',
        ),
        (SPEED + 'unbalance = { amount = "9 g mm", planes = ["A", "X"] }', "unbalance.planes[1]", '"X"'),
        (SPEED + 'unbalance = { amount = "9 g mm", along = "rx" }', "excitations[0]", "not about one"),
        (SPEED + 'blades = { count = 7, amplitude = "9 N" }', "blades.along", "is missing"),
        (SPEED + 'blades = { along = "x", amplitude = "9 N" }', "blades[0].count", "is missing"),
        (
            SPEED + 'blades = { count = 7, along = "rx", amplitude = "9 N" }',
            "excitations[0]",
            "blades: amplitude",
        ),
        (
            SPEED + 'blades = { count = 7, turning = true, along = "x", amplitude = "9 N" }',
            "blades[0]",
            "leave along",
        ),
        (
            SPEED + 'forces = { along = "x", amplitude = "9 N" }',
            "forces[0]",
            "exactly one of order, frequency",
        ),
        (SPEED + 'forces = { order = 0, along = "x", amplitude = "9 N" }', "forces[0]", "greater than zero"),
        (
            SPEED + 'forces = { order = 1, along = "x", amplitude = "0 N" }',
            "excitations[0]",
            "must not be zero",
        ),
        (SPEED + 'forces = { order = 1, along = "x" }', "forces[0]", "amplitude is missing"),
        (SPEED + 'forces = { table = [[1]], along = "x" }', "forces[0].table", "expected rows"),
        (
            SPEED + 'forces = { order = 1, at_speed = "9 rpm", along = "x", amplitude = "9 N" }',
            "forces[0]",
            "at_speed",
        ),
        (
            SPEED + 'belt = { pulley = "1 m", length = "2 m", along = "x", amplitude = "9 N" }',
            "belt[0]",
            "longer",
        ),
        (
            SPEED + 'crank = { along = "z", mass = "1 kg", radius = "1 m", rod = "1 m" }',
            "crank[0]",
            "longer than",
        ),
        (
            SPEED
            + 'crank = { along = "z", mass = "1 kg", radius = "1 m", rod = "3 m", places = ["A", "B"] }',
            "crank[0]",
            "1 are needed",
        ),
        (SPEED + 'strokes = { along = "z", peak = "1 kN" }', "strokes[0]", "either duration or share"),
        (SPEED + 'ground = { along = "z", order = 1 }', "ground[0]", "exactly one of displacement"),
        (
            SPEED + 'mains = { frequency = "50 Hz", amplitude = "9 N", along = "x", turning = true }',
            "mains[0]",
            "",
        ),
        (SPEED + "ratio = 2", "excitations[0]", "ratio goes with shaft"),
        (SPEED + 'shaft = "fan"', "excitations[0]", "speed or shaft, not both"),
        ('shaft = "fan"', "excitations[0].shaft", "follows its own speed"),
        ('shaft = "pump"', "excitations[0].shaft", 'no excitation is named "pump"'),
        (
            'shaft = "hum"\n[[excitations]]\nname = "hum"\nfrequencies = ["9 Hz"]',
            "excitations[0].shaft",
            "no running speed that could be followed",
        ),
        (
            'frequencies = ["9 Hz"]\nat = "block"\nunbalance = { amount = "9 g mm" }',
            "excitations[0]",
            "unbalance goes with the running speed",
        ),
        ('speed = "9 rpm"\nunbalance = { amount = "9 g mm" }', "excitations[0]", "unbalance: needs at"),
        (SPEED + 'unbalence = { amount = "9 g mm" }', "excitations[0].unbalence", 'did you mean "unbalance"'),
    ],
)
def test_a_fault_names_its_entry(tmp_path, text, entry, message):
    with pytest.raises(StudyError) as caught:
        read(tmp_path, text + "\n")
    found = [(fault.entry, fault.message) for fault in caught.value.faults]
    assert any(entry in where and message in what for where, what in found), found
