"""The table [severity]: group and class of the machine, its own limits, and the faults that are named."""

from __future__ import annotations

import pytest

import vib
from vib.errors import StudyError

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
[[excitations]]
name = "fan"
speed = "1480 rpm"
[[excitations]]
name = "mains"
frequencies = ["100 Hz"]
[severity]
"""


def severity(folder, text, frame=FRAME):
    path = folder / "study.toml"
    path.write_text(frame + text, encoding="utf-8")
    return vib.read(path).severity


# the bounds of groups and classes: ISO 20816-3:2022 and ISO 10816-1:1995, from memory
@pytest.mark.parametrize(
    ("text", "group"),
    [
        ("group = 1", 1),
        ("group = 2", 2),
        ('power = "15 kW"', 2),
        ('power = "300 kW"', 2),
        ('power = "300.1 kW"', 1),
        ('power = "50 MW"', 1),
        ('power = "40 hp"', 2),  # 29.8 kW
        ('power = "450 hp"', 1),  # 336 kW
        ('shaft_height = "160 mm"', 2),
        ("shaft_height = 314.9", 2),
        ('shaft_height = "315 mm"', 1),
        ('standard = "ISO 10816-3"\npower = "22 kW"', 2),
    ],
)
def test_the_group_follows_from_power_or_shaft_height(tmp_path, text, group):
    found = severity(tmp_path, text)
    assert found.machine_group == group
    assert found.rules == ("ISO 10816-3" if "10816" in text else "ISO 20816-3")
    assert f"group {group}" in found.machine_words
    assert found.needs_support
    assert found.class_on("rigid") is None


@pytest.mark.parametrize(
    ("text", "rigid", "flexible"),
    [
        ('machine_class = "II"', "II", "II"),
        ('standard = "ISO 10816-1"\npower = "15 kW"', "I", "I"),
        ('standard = "ISO 10816-1"\npower = "75 kW"', "II", "II"),
        ('standard = "ISO 10816-1"\npower = "76 kW"', "III", "IV"),
    ],
)
def test_the_class_follows_from_power_and_support(tmp_path, text, rigid, flexible):
    found = severity(tmp_path, text)
    assert (found.class_on("rigid"), found.class_on("flexible")) == (rigid, flexible)
    assert found.machine_group is None
    assert found.needs_support == (rigid != flexible)
    assert "ISO 10816-1" in found.machine_words


def test_own_limits_are_read_in_si(tmp_path):
    found = severity(
        tmp_path,
        '[[severity.limits]]\nname = "order 7"\nat = "block x"\nvelocity_rms = "0.2 in/s"\n'
        'displacement_peak = "2 mil"\n[[severity.limits]]\nforce = "1 kip"\n',
    )
    first, second = found.limits
    assert found.rules is None
    assert first.velocity_rms == pytest.approx(0.00508, rel=1e-12)
    assert first.displacement_peak == pytest.approx(50.8e-6, rel=1e-12)
    assert (first.name, second.name, first.at, second.at) == ("order 7", "own limits", ("block x",), None)
    assert second.force == pytest.approx(4448.2216152605, rel=1e-12)


def test_the_support_is_stated_for_all_axes_or_for_some(tmp_path):
    assert severity(tmp_path, 'group = 1\nsupport = "rigid"').support.y == "rigid"
    some = severity(tmp_path, 'group = 1\nsupport = {z = "flexible"}').support
    assert (some.x, some.y, some.z) == (None, None, "flexible")


@pytest.mark.parametrize(
    ("text", "entry", "said"),
    [
        ("", "severity", "says nothing to judge by"),
        ("group = 3", "severity.group", r"expected 1 \(large machines\) or 2 \(medium machines\)"),
        ("group = true", "severity.group", "expected 1"),
        (
            'group = 1\npower = "20 kW"',
            "severity",
            "exactly one of group, power, shaft_height; there is group, p",
        ),
        (
            'group = 1\nmachine_class = "I"',
            "severity",
            "ISO 10816-1 needs exactly one of machine_class, power",
        ),
        ('standard = "ISO 20816-3"', "severity", "there is none of them"),
        ('standard = "ISO 10816-1"\ngroup = 1', "severity", "group does not go with ISO 10816-1"),
        ('standard = "ISO 99"', "severity.standard", "ISO 20816-3"),
        ('power = "14.9 kW"', "severity", 'from 15 kW to 50 MW .*not of 14.9 kW.*standard = "ISO 10816-1"'),
        ('power = "51 MW"', "severity", "not of 51000 kW"),
        ('power = "20 kN"', "severity.power", "not a unit of power"),
        ('shaft_height = "159 mm"', "severity", "shaft heights from 160 mm up"),
        ('group = 1\nsupport = "soft"', "severity.support", "expected .rigid., .flexible. or a table"),
        ('group = 1\nplaces = ["blok"]', r"severity.places\[0\]", 'did you mean "block"'),
        ('group = 1\nplaces = "block q"', "severity.places", "no point or body"),
        ('group = 1\nmain = "fin"', "severity.main", 'did you mean "fan"'),
        ('group = 1\nmain = "mains"', "severity.main", "has no running speed that is needed to judge by"),
        ("group = 1\nseparation_margin = 15", "severity.separation_margin", "must be less than 1"),
        ('group = 1\n[[severity.limits]]\nname = "a"', r"severity.limits\[0\]", "names no limit"),
        (
            'group = 1\n[[severity.limits]]\nat = "block"\nforce = "1 N"',
            r"severity.limits\[0\]",
            "force holds for every support",
        ),
        (
            'group = 1\n[[severity.limits]]\nat = ["block", "A z", "B"]\nvelocity_rms = "1 mm/s"',
            r"severity.limits\[0\].at\[2\]",
            "no point or body",
        ),
        (
            'group = 1\n[[severity.limits]]\nvelocity_rms = "0 mm/s"',
            r"severity.limits\[0\].velocity_rms",
            "greater than 0",
        ),
        ('group = 1\nzone = "A"', "severity.zone", "unknown key"),
    ],
)
def test_faults_name_their_entry(tmp_path, text, entry, said):
    with pytest.raises(StudyError, match=rf"{entry}[ :].*{said}") as error:
        severity(tmp_path, text)
    assert len(error.value.faults) == 1


def test_matrices_need_the_support_to_be_stated(tmp_path):
    matrices = '[matrices]\nmass = {rows = [[1]], unit = "kg"}\nstiffness = {rows = [[9]], unit = "N/m"}\n'
    with pytest.raises(StudyError, match=r"severity\.support is needed with \[matrices\]"):
        severity(tmp_path, "[severity]\ngroup = 1", matrices)
    assert severity(tmp_path, '[severity]\ngroup = 1\nsupport = "rigid"', matrices).support.x == "rigid"
    assert severity(tmp_path, '[severity]\nmachine_class = "I"', matrices).support.x is None
