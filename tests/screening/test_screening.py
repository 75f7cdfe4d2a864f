"""Screening: the verdicts, what is covered, and the laws that hold for any modes and speeds."""

import itertools
import json

import numpy as np
import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st

from vib.errors import ModelError, UnitError
from vib.screening import Verdict, highest_needed_hz, screen
from vib.screening.screening import merged

SPEEDS = st.floats(1.0, 200.0)
FREQUENCIES = st.floats(0.5, 2000.0)
BANDS = st.floats(0.0, 0.6)


def test_the_band_of_a_running_speed(modes_at, excitation):
    """Bands and flagged modes of a machine at 1480 rpm.

    Source: STD-BAND, common practice, no source; the definition is abs(f - f_exc) <= 0.20 f_exc.
    """
    frequencies = [18.9, 20.3, 24.1, 29.3, 30.2, 41.0, 49.1, 60.0]
    found = screen(modes_at(frequencies), [excitation(speed="1480 rpm", orders=[1, 2])])
    once, twice = found.lines
    assert (once.band_from_hz, once.band_to_hz) == pytest.approx((19.733333333, 29.6), rel=1e-9)
    assert (twice.band_from_hz, twice.band_to_hz) == pytest.approx((39.466666667, 59.2), rel=1e-9)
    for line, flagged in ((once, [20.3, 24.1, 29.3]), (twice, [41.0, 49.1])):
        rows = [row for row in found.rows if row.line == line]
        assert [row.frequency_hz for row in rows if row.inside] == flagged
        assert [row.frequency_hz for row in rows if row.verdict is Verdict.CLEAR] == [
            f for f in frequencies if f not in flagged
        ]
    assert not found.clear
    assert found.verdict == "Modes 2, 3, 4, 6 and 7 lie inside a band and can be driven."


def test_separation_is_signed_and_zero_in_a_range(modes_at, excitation):
    found = screen(modes_at([8.0, 20.0, 36.0]), [excitation(speed=["600 rpm", "1800 rpm"])])
    assert [row.separation for row in found.rows] == pytest.approx([-0.2, 0.0, 0.2], abs=1e-12)
    assert found.lines[0].band_from_hz == pytest.approx(8.0)
    assert found.lines[0].band_to_hz == pytest.approx(36.0)


def test_fixed_frequencies_have_no_speeds_to_avoid(modes_at, excitation):
    found = screen(modes_at([100.0]), [excitation(frequencies=["100 Hz", "300 Hz"])])
    assert [row.verdict for row in found.rows] == [Verdict.INSIDE, Verdict.CLEAR]
    assert [row.speeds_to_avoid for row in found.rows] == [None, None]
    assert found.keep_out == ()


def test_a_list_of_speeds_makes_a_line_for_each(modes_at, excitation):
    found = screen(modes_at([25.0]), [excitation(speeds=["900 rpm", "1500 rpm"], orders=[1, 0.5])])
    assert [(line.order, line.from_hz) for line in found.lines] == [(1, 15), (1, 25), (0.5, 7.5), (0.5, 12.5)]
    assert [row.inside for row in found.rows] == [False, True, False, False]


def test_the_error_bar_widens_the_band(modes_at, excitation):
    near = screen(modes_at([31.0], errors=[1.5]), [excitation(speed="1500 rpm")])
    assert near.rows[0].counts
    assert near.rows[0].note == "only its error bar reaches into the band"
    assert screen(modes_at([31.0], errors=[0.5]), [excitation(speed="1500 rpm")]).clear


def test_an_own_band_wins_over_the_common_one(modes_at, excitation):
    own, common = excitation(speed="1500 rpm", band="10 %"), excitation(name="mill", speed="1500 rpm")
    assert [line.band for line in screen(modes_at([28.0]), [own, common], band="15 %").lines] == [0.1, 0.15]
    with pytest.raises(UnitError, match="band: must be at least 0 and less than 1, got 20"):
        screen(modes_at([28.0]), [own], band=20)


def test_modes_that_do_not_reach_are_never_clear(modes_at, excitation):
    lines = [excitation(speed="1500 rpm", orders=[1, 4])]
    assert highest_needed_hz(lines, accuracy=0.0) == pytest.approx(120.0)
    short = screen(modes_at([10.0], reach=100.0), lines)
    assert not short.clear
    assert not short.covered
    assert any("Not covered: the modes are complete up to 100 Hz only" in said for said in short.remarks)
    assert "Not shown to be clear" in short.verdict
    unknown = screen(modes_at([10.0], reach=None), lines)
    assert not unknown.clear
    assert screen(modes_at([10.0], reach=120.0), lines).clear


def test_rigid_and_overdamped_modes_are_not_screened(modes_at, excitation):
    system_modes = modes_at([0.0, 25.0, 25.0], ratios=[0.0, 1.0, 0.01], rigid=1)
    found = screen(system_modes, [excitation(speed="1500 rpm")])
    assert [row.mode for row in found.rows] == [3]
    assert found.not_screened == ((1, "rigid-body mode at 0 Hz"), (2, "overdamped: does not oscillate"))


def test_heavily_damped_modes_do_not_count(modes_at, excitation):
    found = screen(modes_at([25.0, 26.0], ratios=[0.70, 0.75]), [excitation(speed="1500 rpm")])
    assert [row.verdict for row in found.rows] == [Verdict.INSIDE, Verdict.TOO_DAMPED]
    assert "no peak" in found.rows[1].note


def test_an_unstable_mode_is_never_clear(modes_at, excitation):
    found = screen(modes_at([90.0], ratios=[-0.01]), [excitation(speed="1500 rpm")])
    assert not found.clear
    assert "unstable" in found.verdict
    assert "unstable" in found.rows[0].note


def test_no_excitations_and_double_names_are_errors(modes_at, excitation):
    with pytest.raises(ModelError, match="there are none to screen against"):
        screen(modes_at([25.0]), [])
    with pytest.raises(ModelError, match="'fan' is there more than once"):
        screen(modes_at([25.0]), [excitation(speed="1500 rpm")] * 2)


def test_a_mode_that_is_hardly_driven_does_not_count(modes_at, excitation):
    shapes = [[1.0, 0.04], [0.04, 1.0]]
    found = screen(modes_at([25.0, 26.0], shapes=shapes), [excitation(speed="1500 rpm", at="1")])
    assert [row.drive for row in found.rows] == pytest.approx([1.0, 0.04])
    assert [row.verdict for row in found.rows] == [Verdict.INSIDE, Verdict.HARDLY_DRIVEN]
    assert found.keep_out[0].ranges == ((25 / 1.2, 25 / 0.8),)  # the mode at 26 Hz can't be driven


def test_keep_out_speeds_say_how_far_they_are_complete(modes_at, excitation):
    found = screen(modes_at([30.0], reach=120.0), [excitation(speed="1500 rpm", orders=[1, 2])])
    assert found.keep_out[0].ranges == ((12.5, 18.75), (25.0, 37.5))
    assert found.keep_out[0].complete_below == pytest.approx(120 / 2.4)


def test_the_diagram_reaches_beyond_the_running_speed(modes_at, excitation):
    found = screen(modes_at([30.0]), [excitation(speed=["600 rpm", "1500 rpm"], orders=[1, 2])])
    diagram = found.diagrams[0]
    assert diagram.running == ((10.0, 25.0),)
    assert diagram.speed_to == pytest.approx(30.0)
    assert diagram.frequency_to_hz > found.needed_up_to_hz


def test_to_dict_is_json_with_units_in_its_names(modes_at, excitation):
    found = screen(modes_at([24.0, 90.0]), [excitation(speed="1500 rpm", orders=[1])])
    back = json.loads(json.dumps(found.to_dict(), allow_nan=False))
    row = back["rows"][0]
    assert row["frequency_hz"] == 24.0
    assert row["excitation_from_hz"] == row["excitation_to_hz"] == 25.0
    assert row["separation"] == pytest.approx(-0.04)
    assert row["speed_from_rpm"] == pytest.approx(60 * 24 / 1.2)
    assert row["verdict"] == "inside the band"
    assert back["keep_out"][0]["speeds"][0]["speed_to_rpm"] == pytest.approx(60 * 24 / 0.8)


def off_the_edge(row):
    """Not so near to an edge of the band that round-off decides."""
    edges = np.array([row.line.band_from_hz, row.line.band_to_hz])
    return np.abs(row.frequency_hz / edges - 1).min() > 1e-9


@settings(deadline=None)
@given(FREQUENCIES, SPEEDS, SPEEDS, BANDS, st.floats(0.25, 12.0), st.floats(1e-3, 1e3))
def test_scaling_all_frequencies_together_changes_no_verdict(
    modes_at, excitation, f, one, other, band, order, scale
):
    assume(one != other)
    low, high = sorted((one, other))

    def judged(factor):
        entry = excitation(speed=[f"{low * factor!r} Hz", f"{high * factor!r} Hz"], orders=[order], band=band)
        return screen(modes_at([f * factor]), [entry]).rows[0]

    row = judged(1.0)
    assume(off_the_edge(row))
    assert judged(scale).verdict == row.verdict
    assert judged(scale).separation == pytest.approx(row.separation, abs=1e-12)


@settings(deadline=None)
@given(FREQUENCIES, SPEEDS, BANDS, BANDS, st.floats(0, 5.0))
def test_widening_the_band_never_turns_inside_into_clear(modes_at, excitation, f, speed, one, other, error):
    narrow, wide = (
        screen(modes_at([f], errors=[error]), [excitation(speed=f"{speed!r} Hz", band=band)]).rows[0].inside
        for band in sorted((one, other))
    )
    assert wide or not narrow


@settings(deadline=None)
@given(FREQUENCIES, st.floats(0.25, 12.0), st.floats(1e-6, 0.6), st.floats(0, 5.0), SPEEDS)
def test_the_speeds_to_avoid_are_those_whose_band_holds_the_mode(
    modes_at, excitation, f, order, band, error, speed
):
    modes = modes_at([f], errors=[error])

    def row_at(running):
        return screen(modes, [excitation(speed=f"{running!r} Hz", orders=[order], band=band)]).rows[0]

    row = row_at(speed)
    low, high = row.speeds_to_avoid
    assume(min(abs(speed / edge - 1) for edge in (low, high) if edge) > 1e-9)
    assert row.inside == (low <= speed <= high)
    assert row_at(high * (1 - 1e-9)).inside
    assert not row_at(high * (1 + 1e-9)).inside


@settings(deadline=None)
@given(st.lists(st.tuples(st.floats(0, 100), st.floats(0, 20)).map(lambda pair: (pair[0], sum(pair)))))
def test_merged_ranges_hold_the_same_points(ranges):
    found = merged(ranges)
    assert all(high < low for (_, high), (low, _) in itertools.pairwise(found))
    for point in [edge for pair in ranges for edge in pair] + [50.0]:
        assert any(low <= point <= high for low, high in found) == any(
            low <= point <= high for low, high in ranges
        )
