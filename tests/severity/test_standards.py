"""Zone boundaries, bands, the support rule and separation margins against the tables of the standards."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

import vib
from vib.severity.margins import critical_speeds, half_power, judge_margins, wanted_margin
from vib.severity.standards import band_from_hz, boundaries, outside_scope
from vib.severity.support import judge_support
from vib.study.severity import Severity


def table(**entries):
    return Severity.model_validate(entries)


# ISO 10816-3:2009, carried over in ISO 20816-3:2022; figures from memory. Velocity mm/s,
# displacement um, r.m.s.
ZONES = {
    (1, "rigid"): ((2.3, 4.5, 7.1), (29, 57, 90)),
    (1, "flexible"): ((3.5, 7.1, 11.0), (45, 90, 140)),
    (2, "rigid"): ((1.4, 2.8, 4.5), (22, 45, 71)),
    (2, "flexible"): ((2.3, 4.5, 7.1), (37, 71, 113)),
}


@pytest.mark.parametrize(("group", "stand"), ZONES)
def test_zone_boundaries_by_group_and_support(group, stand):
    velocity, displacement = boundaries(table(group=group), stand)
    assert 1e3 * np.array(velocity.values) == pytest.approx(ZONES[group, stand][0], rel=1e-12)
    assert 1e6 * np.array(displacement.values) == pytest.approx(ZONES[group, stand][1], rel=1e-12)
    for one in (velocity, displacement):
        assert one.source == f"ISO 20816-3:2022, group {group}, {stand} support, figures from memory"


# ISO 10816-1:1995 annex B; figures from memory. Velocity mm/s r.m.s.
@pytest.mark.parametrize(
    ("name", "wanted"),
    [("I", (0.71, 1.8, 4.5)), ("II", (1.12, 2.8, 7.1)), ("III", (1.8, 4.5, 11.2)), ("IV", (2.8, 7.1, 18.0))],
)
def test_zone_boundaries_by_class(name, wanted):
    (velocity,) = boundaries(table(machine_class=name), "rigid")
    assert 1e3 * np.array(velocity.values) == pytest.approx(wanted, rel=1e-12)
    assert velocity.source == f"ISO 10816-1:1995 annex B, class {name}, figures from memory"


def test_large_machines_in_general_are_judged_by_how_they_stand():
    large = table(standard="ISO 10816-1", power="160 kW")
    assert "class III" in boundaries(large, "rigid")[0].source
    assert "class IV" in boundaries(large, "flexible")[0].source
    older = table(standard="ISO 10816-3", group=2)
    assert boundaries(older, "rigid")[0].source.startswith("ISO 10816-3:2009, group 2")
    own = table(limits=[{"force": "1 N"}])
    assert boundaries(own, "rigid") == ()
    assert band_from_hz(own, 5.0) == 0


def test_a_level_on_a_boundary_belongs_to_the_better_zone():
    (velocity, _) = boundaries(table(group=1), "rigid")
    levels = (0.0, 2.3e-3, 2.31e-3, 4.5e-3, 4.51e-3, 7.1e-3, 7.11e-3, 1.0)
    assert "".join(velocity.zone(level) for level in levels) == "AABBCCDD"


@given(st.floats(0, 1), st.floats(0, 1))
def test_more_vibration_is_never_a_better_zone(first, second):
    (velocity, _) = boundaries(table(group=2), "flexible")
    low, high = sorted((first, second))
    assert velocity.zone(low) <= velocity.zone(high)


def test_below_600_rpm_the_band_reaches_down_to_2_hz():
    """ISO 20816-3, from memory: 10 Hz to 1000 Hz, 2 Hz to 1000 Hz below 600 r/min."""
    assert band_from_hz(table(group=1), np.array([599.9, 600.0, 1480.0]) / 60).tolist() == [2, 10, 10]


TURN = 'rx = "1e9 N m/rad", ry = "1e9 N m/rad", rz = "1e9 N m/rad", '


def test_speeds_that_the_standard_is_not_for_are_told():
    """120 r/min to 30 000 r/min (ISO 20816-3) and 15 000 r/min (ISO 10816-3), from memory."""
    new, old = table(group=1), table(group=1, standard="ISO 10816-3")
    assert [len(outside_scope(new, rpm / 60)) for rpm in (119, 120, 30000, 30001)] == [1, 0, 0, 1]
    assert [len(outside_scope(old, rpm / 60)) for rpm in (119, 120, 15000, 15001)] == [1, 0, 0, 1]
    assert outside_scope(table(machine_class="I"), 1.0) == ()


BLOCK = """
[points]
A = ["0 m", "0 m", "0 m"]
[[bodies]]
name = "machine"
mass = "100 kg"
carried_by = "A"
[[springs]]
between = ["A", "ground"]
stiffness = {{x = "{x} N/m", y = "{y} N/m", z = "{z} N/m"}}
[damping]
ratio = 0.01
"""


def block_modes(folder, x, y, z):
    stiffness = {axis: 100 * (2 * np.pi * f) ** 2 for axis, f in zip("xyz", (x, y, z), strict=True)}
    path = folder / "block.toml"
    path.write_text(BLOCK.format(**stiffness), encoding="utf-8")
    return vib.read(path).system().modes()


def test_a_support_is_rigid_from_a_quarter_above_the_running_speed_on(tmp_path):
    """ISO 10816-3:2009, ISO 20816-3:2022, from memory: 30, 31.25 and 32 Hz against 25 Hz."""
    modes = block_modes(tmp_path, 30.0, 31.25, 32.0)
    found = judge_support(modes, table(group=1), ["machine"], 25.0)
    assert [found[axis].stand for axis in "xyz"] == ["flexible", "rigid", "rigid"]
    assert [found[axis].ratio for axis in "xyz"] == pytest.approx([1.2, 1.25, 1.28], rel=1e-9)
    assert [found[axis].mode for axis in "xyz"] == [1, 2, 3]
    assert "ISO 20816-3:2022" in found["x"].source
    assert found["x"].stand_at(24.0) == "rigid"
    assert found["z"].stand_at(25.7) == "flexible"


def test_a_stated_support_is_not_judged(tmp_path):
    modes = block_modes(tmp_path, 30.0, 31.25, 32.0)
    found = judge_support(modes, table(group=1, support={"x": "rigid"}), ["machine"], 25.0)
    assert (found["x"].stand, found["x"].stated, found["x"].source) == ("rigid", True, "stated in the study")
    assert not found["y"].stated
    assert judge_support(modes, table(machine_class="I"), ["machine"], 25.0) == {}


def test_a_support_that_modes_do_not_reach_is_said_to_be_unknown(tmp_path):
    path = tmp_path / "block.toml"
    path.write_text(BLOCK.format(x=1e5, y=1e9, z=1e9), encoding="utf-8")
    modes = vib.read(path).system().modes(count=1)
    short = type(modes)(**{**vars(modes), "complete_below_hz": 20.0})
    far = type(modes)(**{**vars(modes), "complete_below_hz": 40.0})
    unknown = judge_support(short, table(group=1), ["machine"], 25.0)["y"]
    assert (unknown.known, unknown.stand) == (False, "rigid")
    assert "not known, taken as rigid" in unknown.words
    known = judge_support(far, table(group=1), ["machine"], 25.0)["y"]
    assert (known.known, known.stand) == (True, "rigid")
    assert known.ratio == pytest.approx(1.6)


def test_a_part_that_swings_by_itself_says_nothing_of_the_support(tmp_path):
    """A pipe of 1 kg at 8 Hz on a machine that stands at 60 Hz: the machine hardly moves in its mode."""
    text = BLOCK.format(**dict.fromkeys("xyz", 100 * (2 * np.pi * 60) ** 2))
    text = text.replace("A = [", 'P = ["0 m", "0 m", "1 m"]\nA = [').replace(
        "stiffness = {", f"stiffness = {{{TURN}"
    )
    pipe = (2 * np.pi * 8) ** 2
    text += (
        '[[bodies]]\nname = "pipe"\nmass = "1 kg"\ncarried_by = "P"\n[[springs]]\nbetween = ["P", "A"]\n'
        f'stiffness = {{{TURN}x = "{pipe} N/m", y = "{9 * pipe} N/m", z = "{pipe} N/m"}}\n'
    )
    path = tmp_path / "pipe.toml"
    path.write_text(text, encoding="utf-8")
    modes = vib.read(path).system().modes()
    found = judge_support(modes, table(group=2), ["machine"], 25.0)
    assert found["z"].natural_hz == pytest.approx(60, rel=0.02)
    assert judge_support(modes, table(group=2), ["pipe"], 25.0)["z"].natural_hz == pytest.approx(8, rel=0.02)


# API 617 / API RP 684, formulas and caps from memory: AF, margin below and above the running range, %
@pytest.mark.parametrize(
    ("amplification", "below", "above"),
    [
        (2.5, 0.0, 10.0),
        (3.0, 5.6666667, 15.666667),
        (4.0, 10.2, 20.2),
        (5.0, 12.142857, 22.142857),
        (8.0, 14.384615, 24.384615),
        (10.0, 15.0, 25.0),
        (20.0, 16.0, 26.0),
        (50.0, 16.0, 26.0),
        (np.inf, 16.0, 26.0),
        (2.49, 0.0, 0.0),
    ],
)
def test_margins_by_amplification_factor(amplification, below, above):
    assert 100 * wanted_margin(amplification, above=False) == pytest.approx(below, rel=1e-7, abs=1e-12)
    assert 100 * wanted_margin(amplification, above=True) == pytest.approx(above, rel=1e-7, abs=1e-12)


@pytest.mark.parametrize("ratio", [0.01, 0.05, 0.1])
def test_half_power_points_of_one_mass(ratio):
    """Receptance of one mass: peak at sqrt(1 - 2 z^2), half power at sqrt(1 - 2 z^2 -+ 2 z sqrt(1 - z^2)).

    Source: the closed form of the receptance, solved for half of the squared peak.
    """
    speeds = np.linspace(0.2, 2.0, 20001)
    curve = 1 / np.sqrt((1 - speeds**2) ** 2 + (2 * ratio * speeds) ** 2)
    (peak,) = half_power(30 * speeds, curve)
    middle, half = 1 - 2 * ratio**2, 2 * ratio * np.sqrt(1 - ratio**2)
    width = np.sqrt(middle + half) - np.sqrt(middle - half)
    # a parabola and straight lines on steps of 9e-5 of the peak
    assert peak.speed_hz == pytest.approx(30 * np.sqrt(middle), rel=1e-5)
    assert peak.amplification == pytest.approx(np.sqrt(middle) / width, rel=1e-3)


def test_peaks_that_are_not_resolved_are_left_out():
    speeds = np.linspace(20, 40, 21)
    narrow = 1 / np.sqrt((1 - (speeds / 30) ** 2) ** 2 + (0.02 * speeds / 30) ** 2)
    assert half_power(speeds, narrow) == ()  # fewer than five points between the half-power points
    fine = np.linspace(29.9, 40, 2001)
    cut = 1 / np.sqrt((1 - (fine / 30) ** 2) ** 2 + (0.02 * fine / 30) ** 2)
    assert half_power(fine, cut) == ()  # the lower half-power point lies before the run-up begins
    assert half_power(speeds, np.ones(21)) == ()
    assert half_power(speeds, speeds) == ()


def test_margins_of_critical_speeds_around_the_running_range(tmp_path):
    modes = block_modes(tmp_path, 20.0, 27.0, 33.0)
    nothing = np.zeros((2, 0))
    found = judge_margins(
        critical_speeds(modes, (), (0, 0)), table(group=1), [(24.0, 28.0)], np.array([1.0, 2.0]), nothing
    )
    below, inside, above = found
    assert (below.below, inside.below, above.below) == (True, None, False)
    assert [one.actual for one in found] == pytest.approx([1 / 6, 0.0, 5 / 28], rel=1e-6)
    assert [one.wanted for one in found] == pytest.approx([0.16, 0.26, 0.26], rel=1e-9)
    assert [one.met for one in found] == [True, False, False]
    assert all(one.amplification == pytest.approx(50, rel=1e-6) for one in found)
    assert all("damping ratio 0.01" in one.amplification_source for one in found)
    assert all(one.source == "API 617 / API RP 684, formula from memory" for one in found)
    own = judge_margins(
        critical_speeds(modes, (), (0, 0)),
        table(group=1, separation_margin="17 %"),
        [(24.0, 28.0)],
        np.array([1.0, 2.0]),
        nothing,
    )
    assert [one.met for one in own] == [False, False, True]
    assert own[0].source == "the study"
    assert judge_margins((), table(group=1), [(24.0, 28.0)], np.array([1.0, 2.0]), nothing) == ()


def test_the_peak_of_the_run_up_wins_over_the_damping_ratio(tmp_path):
    modes = block_modes(tmp_path, 20.0, 60.0, 90.0)
    speeds = np.linspace(5, 40, 7001)
    x = speeds / 20
    curve = x**2 / np.sqrt((1 - x**2) ** 2 + (0.02 * x) ** 2)
    (found,) = judge_margins(
        critical_speeds(modes, (), (0, 0)), table(group=1), [(24.0, 24.0)], speeds, curve[:, np.newaxis]
    )
    assert found.seen
    assert found.amplification_source == "half-power points of the run-up"
    assert found.amplification == pytest.approx(50, rel=2e-3)  # of order ratio squared, and the steps
    assert found.critical_hz == pytest.approx(
        20 / np.sqrt(1 - 2e-4), rel=1e-5
    )  # peak of an unbalance response
