"""Malformed and hostile study files: every fault names its entry and how to mend it."""

import pytest

from vib.errors import StudyError
from vib.study import read

GOOD = """\
title = "Test frame"
[units]
length = "mm"
[materials.steel]
youngs_modulus = "210 GPa"
poissons_ratio = 0.3
density = "7850 kg/m^3"
[sections.leg]
shape = "rectangle"
width = 50
height = 50
[points]
A = [0, 0, 0]
B = [0, 0, 900]
[[members]]
name = "legs"
section = "leg"
material = "steel"
runs = [["A", "B"]]
[[bodies]]
name = "motor"
mass = "80 kg"
carried_by = "B"
[[supports]]
at = "A"
hold = "all"
[[springs]]
between = ["B", "ground"]
stiffness = {x = "2 kN/mm"}
[damping]
ratio = 0.01
[[excitations]]
name = "fan"
speed = "1480 rpm"
at = "motor"
[impact]
at = "motor"
along = "x"
impulse = "12 N s"
"""

# what is replaced, by what, the entry that must be named, a part of the message, the line (None: not asked)
CASES = [
    ('"2 kN/mm"', '"2 kN/m^2"', "springs[0].stiffness.x", "not a unit of stiffness", 29),
    ('"2 kN/mm"', '"-2 kN/mm"', "springs[0].stiffness.x", "at least 0", 29),
    ('"2 kN/mm"', "2000", "springs[0].stiffness.x", "add stiffness =", 29),
    ('{x = "2 kN/mm"}', "{}", "springs[0]", "neither stiffness nor dashpot", 27),
    ('{x = "2 kN/mm"}', '{q = "2 kN/mm"}', "springs[0].stiffness.q", "unknown key", 29),
    ('["B", "ground"]', '["B", "B"]', "springs[0].between", 'both ends are "B"', 28),
    ('["B", "ground"]', '["B"]', "springs[0].between", "expected two names", 28),
    ('["B", "ground"]', '["B", "grund"]', "springs[0].between[1]", 'did you mean "ground"', 28),
    ('"80 kg"', '"80 lbf"', "bodies[0].mass", "A force is not a mass", 22),
    ('"80 kg"', '"0 kg"', "bodies[0].mass", "greater than 0", 22),
    ('"80 kg"', '"nan kg"', "bodies[0].mass", "expected a mass", 22),
    ('"80 kg"', "nan", "bodies[0].mass", "finite", 22),
    ('"80 kg"', "inf", "bodies[0].mass", "finite", 22),
    ('"80 kg"', "1979-05-27", "bodies[0].mass", "expected a mass", 22),
    ('"80 kg"', "{a = 1}", "bodies[0].mass", "expected a mass", 22),
    ('carried_by = "B"', 'carried_by = "motr"', "bodies[0].carried_by", 'no point is named "motr"', 23),
    ('carried_by = "B"', "carried_by = []", "bodies[0].carried_by", "a list of names", 23),
    ('carried_by = "B"', 'carried_by = ["A", "B"]', "bodies[0]", "centre is needed", 20),
    (
        'carried_by = "B"',
        'carried_by = "B"\ninertia = [1, 2, 3]',
        "bodies[0].inertia[0]",
        "add inertia =",
        24,
    ),
    (
        'carried_by = "B"',
        'carried_by = "B"\ninertia = ["1 kg m^2", "1 kg m^2", "1 kg m^2"]\n'
        'products = ["2 kg m^2", "0 kg m^2", "0 kg m^2"]',
        "bodies[0]",
        "a principal moment is negative",
        20,
    ),
    ('name = "motor"', 'name = "A"', "bodies[0].name", "already the name of a point", 21),
    ('name = "motor"', 'name = "\\u001b[31mred"', "bodies[0].name", "printable", 21),
    ('name = "motor"', 'name = ""', "bodies[0].name", "must not be empty", 21),
    ('name = "motor"', "name = 5", "bodies[0].name", "expected text", 21),
    ('"1480 rpm"', '"1480 mm"', "excitations[0].speed", "not a unit of running speed", 34),
    ('"1480 rpm"', '["1800 rpm", "900 rpm"]', "excitations[0].speed", "must go upwards", 34),
    ('"1480 rpm"', '["1 rpm", "2 rpm", "3 rpm"]', "excitations[0].speed", "speeds = [...]", 34),
    ('speed = "1480 rpm"', "orders = [1]", "excitations[0]", "needs a speed", 32),
    ('speed = "1480 rpm"', 'speed = "1480 rpm"\norders = [0]', "excitations[0]", "greater than zero", 32),
    ('speed = "1480 rpm"', 'speed = "1480 rpm"\nband = 20', "excitations[0]", "20 % is written 0.2", 32),
    ("ratio = 0.01", "ratio = 1.5", "damping.ratio", "2 % is written", 31),
    ("ratio = 0.01", "ratoi = 0.01", "damping.ratoi", 'did you mean "ratio"', 31),
    ("ratio = 0.01", 'rayleigh = [["5 Hz", 0.01]]', "damping.rayleigh[1]", "is missing", 31),
    ("ratio = 0.01", 'rayleigh = [["5 Hz", 0.5], ["80 Hz", 0.01]]', "damping.rayleigh", "feed energy", 31),
    ("ratio = 0.01", 'ranges = [["9 Hz", "5 Hz", 0.01]]', "damping.ranges", "upwards", 31),
    (
        "ratio = 0.01",
        'ranges = [["0 Hz", "9 Hz", 0.1], ["5 Hz", "12 Hz", 0.1]]',
        "damping.ranges",
        "overlap",
        31,
    ),
    ('impulse = "12 N s"', 'impulse = "12 N"', "impact.impulse", "not a unit of impulse", 39),
    ('impulse = "12 N s"', "", "impact", "exactly one of", 36),
    ('impulse = "12 N s"', 'impulse = "1 N s"\npull = "1 N"', "impact", "has impulse, pull", 36),
    ('along = "x"\n', 'along = "sideways"\n', "impact.along", "expected one of x", 38),
    ('hold = "all"', 'hold = "al"', "supports[0].hold", '"all", "translations"', 26),
    ('at = "A"', 'at = ["A", "A"]', "supports[0].at", "stands there 2 times", 25),
    ('runs = [["A", "B"]]', 'runs = [["A", "A"]]', "members[0].runs[0]", "to itself", 19),
    ('runs = [["A", "B"]]', 'runs = [["A"]]', "members[0].runs[0]", "two or more points", 19),
    ('runs = [["A", "B"]]', "runs = []", "members[0].runs", "", 19),
    ('material = "steel"', 'material = "steal"', "members[0].material", 'did you mean "steel"', 18),
    ('section = "leg"', 'section = "leq"', "members[0].section", 'did you mean "leg"', 17),
    ('section = "leg"', 'section = "leg"\nup = [0, 0, 0]', "members[0].up", "must not be zero", 18),
    ("height = 50", "", "sections.leg", "needs height", 8),
    ("height = 50", "height = 50\ndiameter = 3", "sections.leg", "does not take diameter", 8),
    ("height = 50", "height = 0", "sections.leg.height", "greater than 0", 11),
    ('shape = "rectangle"\nwidth = 50\nheight = 50', 'shape = "IPE 201"', "sections.leg", "IPE 200", 8),
    ("poissons_ratio = 0.3", "poissons_ratio = 0.7", "materials.steel", "at most 0.5", 4),
    ('density = "7850 kg/m^3"', "", "materials.steel", "missing density", 4),
    ('youngs_modulus = "210 GPa"', 'youngs_modulus = "210 gpa"', "materials.steel.youngs_modulus", "GPa", 5),
    ("A = [0, 0, 0]", "A = [0, 0]", "points.A", "three lengths", 13),
    ("A = [0, 0, 0]", 'A = [0, 0, "0 degC"]', "points.A[2]", "offset temperature", 13),
    ("A = [0, 0, 0]", "A = [0, 0, 0]\nground = [0, 0, 1]", "points.ground", "fixed ground", 14),
    ('length = "mm"', 'length = "kg"', "units.length", "not a unit of length", 3),
    ('length = "mm"', 'lenght = "mm"', "units.lenght", 'did you mean "length"', 3),
    ('length = "mm"', 'length = "mm"\noutput = "metric"', "units.output", "'si' or 'us'", 4),
    ('title = "Test frame"', 'title = "a\\nb"', "title", "printable", 1),
    ('title = "Test frame"', "suports = 1", "suports", 'did you mean "supports"', 1),
    ('title = "Test frame"', "accuracy = 0.5", "accuracy", "at most 20 %", 1),
    ("[damping]", "[matrices]\nmass = [[1]]\nstiffness = [[1]]\n[damping]", "the file", "not both", None),
]


@pytest.mark.parametrize(("old", "new", "entry", "message", "line"), CASES)
def test_one_fault_is_named_with_entry_and_line(tmp_path, old, new, entry, message, line):
    assert GOOD.count(old) >= 1, "the case replaces nothing"
    file = tmp_path / "study.toml"
    file.write_text(GOOD.replace(old, new, 1))
    with pytest.raises(StudyError) as caught:
        read(file)
    faults = caught.value.faults
    entries = [fault.entry or "the file" for fault in faults]
    assert entry in entries, str(caught.value)
    fault = faults[entries.index(entry)]
    assert message in fault.message
    assert line is None or fault.line == line
    assert str(file) in str(caught.value)
    assert all("\n" not in str(fault) for fault in faults)


def test_the_good_study_reads(tmp_path):
    file = tmp_path / "study.toml"
    file.write_text(GOOD)
    assert read(file).bodies[0].mass == 80.0


def test_several_faults_come_in_one_go_in_the_order_of_the_file(tmp_path):
    file = tmp_path / "study.toml"
    text = (
        GOOD.replace("80 kg", "80 lbf")
        .replace('["A", "B"]', '["A", "Q"]')
        .replace("ratio = 0.01", "ratio = 3")
    )
    file.write_text(text)
    with pytest.raises(StudyError) as caught:
        read(file)
    entries = [fault.entry for fault in caught.value.faults]
    assert entries == ["members[0].runs[0][1]", "bodies[0].mass", "damping.ratio"]


@pytest.mark.parametrize(
    ("content", "message"),
    [
        (b"", "nothing to study"),
        (b"title = ", "not valid TOML"),
        (b"a = 1\na = 2", "not valid TOML"),
        (b"\xff\xfe\x00", "not UTF-8"),
        (b"a = " + b"[" * 5000 + b"]" * 5000, "nested too deeply"),
        (b"a = " + b"9" * 5000, "not valid TOML"),
        (b"members = 5", "expected a list"),
        (b"points = 5", "expected a table"),
        (b"[[points]]\nA = [0, 0, 0]", "expected a table"),
        (b"members = [5]", "expected a table"),
        (b"[members]\nname = 'x'", "expected a list"),
    ],
)
def test_what_is_no_study_file_is_said(tmp_path, content, message):
    file = tmp_path / "study.toml"
    file.write_bytes(content)
    with pytest.raises(StudyError, match=message):
        read(file)


def test_missing_files_and_folders_are_said(tmp_path):
    with pytest.raises(StudyError, match="no such file"):
        read(tmp_path / "none.toml")
    with pytest.raises(StudyError, match="is a folder"):
        read(tmp_path)
    with pytest.raises(StudyError, match="cannot be read"):
        read("a\0b.toml")
