"""Tolerances of a study: what may be written, what it means, and studies with other values."""

import math
import pickle

import pytest
from hypothesis import given
from hypothesis import strategies as some

import vib
from vib.errors import StudyError

STUDY = """
title = "Mast with a weight +- nothing"
[units]
length = "mm"
[points]
A = [0, 0, 0]
"5 +- 1" = [0, 0, 900]
from = [0, 0, 0]
[sections.leg]
shape = "rectangle"
width = "50 mm"
height = 40
[[members]]
section = "leg"
material = "structural steel"
runs = [["A", "5 +- 1"]]
[[bodies]]
name = "weight"
mass = "120 kg"
carried_by = "5 +- 1"
[[supports]]
at = "A"
hold = "all"
[[springs]]
between = ["5 +- 1", "ground"]
stiffness = { x = "2 kN/mm" }
dashpot = { x = "300 N s/m" }
[damping]
ratio = "2 %"
[[excitations]]
name = "fan"
speed = "1480 rpm"
"""


def read(tmp_path, *changes):
    text = STUDY
    for old, new in changes:
        assert old in text
        text = text.replace(old, new)
    file = tmp_path / "mast.toml"
    file.write_text(text, encoding="utf-8")
    return vib.read(file)


@pytest.mark.parametrize(
    ("old", "new", "path", "expected"),
    [
        ('"2 kN/mm"', '"2 kN/mm +- 20 %"', "springs[0].stiffness.x", (1.6e6, 2e6, 2.4e6)),
        ('"2 kN/mm"', '"2 kN/mm ± 0.3 kN/mm"', "springs[0].stiffness.x", (1.7e6, 2e6, 2.3e6)),
        ('"2 kN/mm"', '{from = "1 kN/mm", to = "4 kN/mm"}', "springs[0].stiffness.x", (1e6, 2.5e6, 4e6)),
        ("height = 40", 'height = "40 +- 2"', "sections.leg.height", (0.038, 0.04, 0.042)),
        ("height = 40", "height = {value = 40, tolerance = 2}", "sections.leg.height", (0.038, 0.04, 0.042)),
        ("[0, 0, 900]", '[0, 0, "900 +/- 5 mm"]', "points.5 +- 1[2]", None),
        ("[0, 0, 900]", '[0, 0, "900 mm +/- 5 mm"]', "points.5 +- 1[2]", (0.895, 0.9, 0.905)),
        ('"120 kg"', '"120 kg +- 5 %"', "bodies[0].mass", (114.0, 120.0, 126.0)),
        ('"300 N s/m"', '"300 N s/m +- 50 %"', "springs[0].dashpot.x", (150.0, 300.0, 450.0)),
        ('"2 %"', '"2 % +- 50 %"', "damping.ratio", (0.01, 0.02, 0.03)),
        ('"2 %"', '"0.02 +- 0.005"', "damping.ratio", (0.015, 0.02, 0.025)),
        ('"1480 rpm"', '"1500 rpm +- 2 %"', "excitations[0].speed", (24.5, 25.0, 25.5)),
    ],
)
def test_ways_to_write_a_tolerance(tmp_path, old, new, path, expected):
    if expected is None:
        with pytest.raises(StudyError, match="write the unit with both"):
            read(tmp_path, (old, new))
        return
    study = read(tmp_path, (old, new))
    found = study.tolerances
    assert list(found) == [path]
    assert (found[path].low, found[path].nominal, found[path].high) == pytest.approx(expected, rel=1e-12)
    assert found[path].distribution == "uniform"


def test_a_lognormal_tolerance_reaches_as_far_down_as_up_in_ratio(tmp_path):
    new = '{value = "2 kN/mm", tolerance = "100 %", distribution = "lognormal", group = "mounts"}'
    found = read(tmp_path, ('"2 kN/mm"', new)).tolerances["springs[0].stiffness.x"]
    assert (found.low, found.high) == pytest.approx((1e6, 4e6))
    assert (found.group, found.correlation) == ("mounts", 1.0)


def test_a_standard_deviation_covers_95_per_cent_with_1_96_of_it(tmp_path):
    """1.96 standard deviations hold 95 %: JCGM 100:2008, 4.3.4."""
    new = '{value = "120 kg", standard_deviation = "5 kg", distribution = "normal"}'
    found = read(tmp_path, ('"120 kg"', new)).tolerances["bodies[0].mass"]
    assert found.high - found.nominal == pytest.approx(1.96 * 5.0, rel=1e-4)


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        ('"2 kN/mm"', '"2 kN/mm +- 120 %"', r"reaches -400 N/mm: must be at least 0"),
        ('"2 kN/mm"', '"2 kN/mm +- 3 mm"', "not a unit of stiffness"),
        ('"2 kN/mm"', '"2 kN/mm +- 0 %"', "must be greater than zero"),
        ('"2 kN/mm"', '"2 kN/mm +- 1 % +- 2 %"', "one tolerance"),
        ('"2 kN/mm"', '{value = "2 kN/mm +- 1 %", tolerance = "1 %"}', "write one of them"),
        ('"2 kN/mm"', '{value = "2 kN/mm"}', "a tolerance is a table"),
        ('"2 kN/mm"', '{from = "2 kN/mm"}', "a tolerance is a table"),
        ('"2 kN/mm"', '{from = "2 kN/mm", to = "1 kN/mm"}', "from must be less than to"),
        ('"2 kN/mm"', '{value = "2 kN/mm", tolerance = "1 %", distribution = "even"}', "distribution: "),
        ('"2 kN/mm"', '{value = "2 kN/mm", tolerance = "1 %", correlation = 0.5}', "goes with group"),
        ('"2 kN/mm"', '{value = "2 kN/mm", standard_deviation = "1 %"}', 'goes with distribution = "normal"'),
        ("[0, 0, 900]", '["0 mm +- 5 %", 0, 900]', "of zero is nothing"),
        ('"2 %"', '"2 % +- 0.5 %"', "percentage points or a share"),
        ('shape = "rectangle"', 'shape = {value = "rectangle", tolerance = "1 %"}', "expected text"),
        ("height = 40", "height = {value = 40, tolerence = 2}", "height"),
    ],
)
def test_what_is_wrong_is_said(tmp_path, old, new, message):
    with pytest.raises(StudyError, match=message):
        read(tmp_path, (old, new))


def test_a_group_has_one_correlation(tmp_path):
    spread = '{{value = "{}", tolerance = "5 %", group = "g", correlation = {}}}'
    with pytest.raises(StudyError, match=r'group "g" has the correlation 0\.5 elsewhere'):
        read(
            tmp_path,
            ('"120 kg"', spread.format("120 kg", 0.5)),
            ('"2 kN/mm"', spread.format("2 kN/mm", 0.7)),
        )


def test_entries_of_matrices_take_no_tolerance(tmp_path):
    file = tmp_path / "chain.toml"
    file.write_text(
        '[units]\nmass = "kg"\nstiffness = "N/m"\n[matrices]\nmass = [[1]]\nstiffness = [["8 +- 10 %"]]\n'
    )
    with pytest.raises(StudyError, match="entries of a matrix take no tolerance"):
        vib.read(file)


def test_every_other_command_sees_the_value(tmp_path):
    with_tolerance = read(tmp_path, ('"2 kN/mm"', '"2 kN/mm +- 20 %"'), ('"2 %"', '"2 % +- 50 %"'))
    assert with_tolerance.model_dump() == read(tmp_path).model_dump()


@given(stiffness=some.floats(0.0, 1e12), height=some.floats(1e-3, 10.0), mass=some.floats(1e-3, 1e6))
def test_a_varied_study_is_the_one_that_a_file_with_these_values_gives(
    tmp_path_factory, stiffness, height, mass
):
    folder = tmp_path_factory.mktemp("studies")
    study = read(folder, ('"2 kN/mm"', '"2 kN/mm +- 20 %"'))
    varied = study.varied(
        {"springs[0].stiffness.x": stiffness, "points.5 +- 1[2]": height, "bodies[0].mass": mass}
    )
    written = read(
        folder,
        ('"2 kN/mm"', f'"{stiffness!r} N/m"'),
        ("[0, 0, 900]", f'[0, 0, "{height!r} m"]'),
        ('"120 kg"', f'"{mass!r} kg"'),
    )
    assert varied.model_dump() == written.model_dump()
    assert study.springs[0].stiffness.x == pytest.approx(2e6)


def test_a_varied_study_varies_again(tmp_path):
    once = read(tmp_path, ('"2 kN/mm"', '"2 kN/mm +- 20 %"')).varied({"springs[0].stiffness.x": 1e6})
    assert once.tolerances == {}
    twice = once.varied({"bodies[0].mass": 7.0, "springs[0].stiffness.ry": 5.0})
    assert (twice.springs[0].stiffness.x, twice.bodies[0].mass) == (1e6, 7.0)
    assert twice.springs[0].stiffness.ry == 5.0
    assert pickle.loads(pickle.dumps(twice)).varied({"damping.ratio": 0.5}).bodies[0].mass == 7.0


@pytest.mark.parametrize(
    ("path", "value", "message"),
    [
        ("springs[0].stiffness.x", -1.0, r"must be at least 0 \(with springs\[0\].stiffness.x = -1 in SI"),
        ("springs[1].stiffness.x", 1.0, "there is no such entry"),
        ("springs[0].stiffnes.x", 1.0, "unknown key"),
        ("sections.leg.hight", 1.0, "unknown key"),
        ("beams.leg", 1.0, "there is no such entry"),
        ("title", 1.0, "title"),
        ("bodies[0].inertia[0]", math.nan, "bodies"),
    ],
)
def test_what_cannot_vary_so_is_named(tmp_path, path, value, message):
    with pytest.raises(StudyError, match=message):
        read(tmp_path).varied({path: value})


def test_the_kind_of_an_entry(tmp_path):
    study = read(tmp_path)
    assert study.kind_of("springs[0].stiffness.x") == "stiffness"
    assert study.kind_of("springs[0].stiffness.rx") == "rotational_stiffness"
    assert study.kind_of("damping.ratio", 0.1) == "ratio"


def test_what_follows_a_shaft_follows_it_in_the_varied_study_only(tmp_path):
    belt = 'speed = "1480 rpm"\n[[excitations]]\nname = "belt"\nshaft = "fan"\nratio = 0.5'
    study = read(tmp_path, ('speed = "1480 rpm"', belt))
    varied = study.varied({"excitations[0].speed": 10.0})
    assert varied.excitations[1].speed_ranges == ((5.0, 5.0),)
    assert study.excitations[1].speed_ranges == (pytest.approx((1480 / 120, 1480 / 120)),)
    assert study.varied({"excitations[1].ratio": 2.0}).excitations[1].speed_ranges[0][0] == pytest.approx(
        2 * 1480 / 60
    )
