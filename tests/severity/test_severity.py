"""Levels in the band, zones at the worst running speed, own limits, and the words that go with them."""

import json

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

import vib
from vib.errors import ModelError
from vib.severity import judge
from vib.show.documents import to_json

RIGID = {"group": 2, "support": "rigid"}


def amplitude(velocity_rms_mm_s, frequency_hz):
    """Displacement amplitude, m, of a sine of this r.m.s. velocity."""
    return 1e-3 * velocity_rms_mm_s * np.sqrt(2) / (2 * np.pi * frequency_hz)


def test_one_sine_is_judged_by_its_velocity(run_up, table):
    """2 mm/s r.m.s. at 25 Hz is 12.7 um r.m.s.: zone B and A of group 2, rigid (ISO 20816-3, from memory)."""
    found = judge(run_up([25.0], [(1, None)], [amplitude(2.0, 25.0)]), table(**RIGID))
    (row,) = found.rows
    assert row.velocity_rms_m_s == pytest.approx(2e-3, rel=1e-12)
    assert row.displacement_rms_m == pytest.approx(2e-3 / (2 * np.pi * 25), rel=1e-12)
    assert row.zones == {"velocity_rms": "B", "displacement_rms": "A"}
    assert (row.zone, found.zone, row.support, found.acceptable) == ("B", "B", "rigid", True)
    assert row.decided_by is not None
    assert row.decided_by.source == "ISO 20816-3:2022, group 2, rigid support, figures from memory"
    assert found.verdict.startswith(
        "Zone B (acceptable for unrestricted long running) at motor y, 1500 rpm; ISO 2"
    )
    assert "between 10 Hz and 1000 Hz" in found.band


def test_a_slow_machine_is_judged_by_its_displacement(run_up, table):
    """3 mm/s r.m.s. at 5 Hz is 95 um r.m.s.: zone C by velocity, D by displacement."""
    found = judge(run_up([5.0], [(1, None)], [amplitude(3.0, 5.0)]), table(**RIGID))
    (row,) = found.rows
    assert row.zones == {"velocity_rms": "C", "displacement_rms": "D"}
    assert row.decided_by is not None
    assert row.decided_by.quantity == "displacement_rms"
    assert (row.zone, found.acceptable) == ("D", False)


def test_lines_outside_the_band_are_left_out(run_up, table):
    """10 Hz to 1000 Hz, from 2 Hz on below 600 r/min (ISO 20816-3, from memory)."""
    lines = [(1, None), (0.3, None), (60, None)]
    moved = [amplitude(v, f) for v, f in ((2.0, 20.0), (5.0, 6.0), (5.0, 1200.0))]
    fast = judge(run_up([20.0], lines, moved), table(**RIGID)).rows[0]
    assert fast.velocity_rms_m_s == pytest.approx(2e-3, rel=1e-12)
    slow = [amplitude(v, f) for v, f in ((3.0, 9.0), (4.0, 2.7), (1.0, 540.0))]
    row = judge(run_up([9.0], lines, slow), table(**RIGID)).rows[0]
    assert row.velocity_rms_m_s == pytest.approx(1e-3 * np.sqrt(9 + 16 + 1), rel=1e-12)
    assert row.displacement_rms_m == pytest.approx(np.linalg.norm(slow) / np.sqrt(2), rel=1e-12)
    own = judge(run_up([20.0], lines, moved), table(limits=[{"velocity_rms": "5 mm/s"}])).own[0]
    assert own.level == pytest.approx(1e-3 * np.sqrt(4 + 25 + 25), rel=1e-12)


@given(st.lists(st.floats(0.01, 20), min_size=2, max_size=5), st.floats(0, 6.3))
def test_lines_of_one_frequency_add_as_vectors_others_by_their_squares(run_up, table, sizes, angle):
    moved = [amplitude(size, 25.0 * (order + 1)) for order, size in enumerate(sizes)]
    lines = [(order + 1, None) for order in range(len(sizes))]
    found = judge(run_up([25.0], lines, moved), table(**RIGID)).rows[0]
    assert found.velocity_rms_m_s == pytest.approx(1e-3 * np.linalg.norm(sizes), rel=1e-9)
    same = [amplitude(sizes[0], 25.0), amplitude(sizes[1], 25.0) * np.exp(1j * angle)]
    both = judge(run_up([25.0], [(1, None), (1, None)], same), table(**RIGID)).rows[0]
    wanted = 1e-3 * abs(sizes[0] + sizes[1] * np.exp(1j * angle))
    assert both.velocity_rms_m_s == pytest.approx(wanted, rel=1e-9, abs=1e-15)


def test_only_running_speeds_are_judged_and_the_worst_is_shown(run_up, table):
    speeds = [20.0, 24.0, 25.0, 26.0, 30.0]
    moved = [amplitude(v, f) for v, f in zip((50.0, 1.0, 3.0, 2.0, 40.0), speeds, strict=True)]
    found = judge(run_up(speeds, [(1, None)], moved, service=((24.0, 26.0),)), table(**RIGID))
    assert (found.rows[0].speed_hz, found.zone, found.speeds_hz) == (25.0, "C", (24.0, 26.0))
    without = judge(run_up(speeds, [(1, None)], moved, service=()), table(**RIGID))
    assert (without.rows[0].speed_hz, without.zone) == (20.0, "D")


def test_the_support_is_judged_at_each_speed(run_up, table, monkeypatch):
    """30 Hz along y: rigid up to 24 Hz. 1.5 mm/s is zone B on a rigid, A on a flexible support."""
    from vib.severity import judging as room
    from vib.severity.support import Support

    stand = Support("y", "flexible", False, 30.0, 2, 0.0, 26.0, "by hand")
    monkeypatch.setattr(room, "judge_support", lambda *_: {"y": stand})
    speeds = [22.0, 24.0, 24.5, 26.0]
    moved = [amplitude(1.5, f) for f in speeds]
    found = judge(run_up(speeds, [(1, None)], moved), table(group=2))
    assert (found.zone, found.rows[0].support) == ("B", "rigid")
    assert found.rows[0].speed_hz in (22.0, 24.0)
    above = judge(run_up(speeds[2:], [(1, None)], moved[2:]), table(group=2))
    assert (above.zone, above.rows[0].support) == ("A", "flexible")


def test_own_limits_name_themselves(run_up, table):
    limits = [
        {"name": "order 7", "velocity_rms": "2.5 mm/s", "displacement_peak": "0.2 mm", "at": ["motor"]},
        {"displacement_rms": "1 um", "at": ["motor z"], "name": "z only"},
        {"force": "100 N", "name": "floor"},
    ]
    moved = [[amplitude(2.0, 25.0), 1e-7, 1e-4]]
    places = (("motor", "y"), ("motor", "z"), ("motor", "rx"))
    given = run_up([25.0], [(1, None)], moved, places=places, forces=[[[60 + 80j, 999.0]]])
    found = judge(given, table(limits=limits))
    assert [(one.output, one.quantity, one.exceeded, one.source) for one in found.own] == [
        ("motor y", "velocity_rms", False, "order 7"),
        ("motor z", "velocity_rms", False, "order 7"),
        ("motor y", "displacement_peak", False, "order 7"),
        ("motor z", "displacement_peak", False, "order 7"),
        ("motor z", "displacement_rms", False, "z only"),
        ("foot z", "force", False, "floor"),
    ]
    assert found.own[-1].level == pytest.approx(100.0, rel=1e-12)
    assert found.zone is None
    assert found.acceptable
    assert found.verdict == "Every limit of your own is kept."
    strict = judge(given, table(limits=[{"velocity_rms": "1.9 mm/s"}]))
    assert not strict.acceptable
    assert strict.verdict == "1 limit of your own is exceeded."
    assert "Angles are not judged." in found.remarks


def test_limits_that_nothing_is_compared_with_are_faults(run_up, table):
    given = run_up([25.0], [(1, None)], [amplitude(2.0, 25.0)])
    with pytest.raises(ModelError, match='own limits: "pump" is not among the outputs'):
        judge(given, table(limits=[{"at": "pump", "velocity_rms": "1 mm/s"}]))
    with pytest.raises(ModelError, match="own limits: force: there are no supports"):
        judge(given, table(limits=[{"force": "1 N"}]))


def test_an_unstable_machine_has_no_zone_but_the_worst(run_up, table):
    found = judge(run_up([24.0, 25.0], [(1, None)], [amplitude(1.0, 24.0), np.nan]), table(**RIGID))
    assert (found.zone, found.stable, found.acceptable) == ("D", False, False)
    assert found.verdict.startswith("The machine is unstable")
    document = json.loads(to_json(found.to_dict()))
    assert document["places"][0]["velocity_rms_m_s"] is None


def test_the_main_excitation_may_be_another_shaft(run_up, table):
    given = run_up([25.0], [(1, None)], [amplitude(1.0, 25.0)])
    with pytest.raises(ModelError, match=r'severity\.main: "pump" has no force'):
        judge(given, table(**RIGID, main="pump"))


def test_where_nothing_turns_the_strongest_line_is_the_main_one(run_up, table):
    given = run_up([0.0], [(None, 100.0), (None, 8.0)], [amplitude(1, 100.0), amplitude(2, 8.0)], shaft="")
    found = judge(given, table(**RIGID))
    assert found.main_hz == (8.0, 8.0)
    assert found.margins == ()
    assert found.rows[0].velocity_rms_m_s == pytest.approx(1e-3 * np.sqrt(5), rel=1e-12)
    assert "rpm" not in found.verdict


def test_a_study_without_a_table_is_told(run_up):
    with pytest.raises(ModelError, match=r"the study has no \[severity\] table"):
        judge(run_up([25.0], [(1, None)], [1e-4]), None)


def test_angles_alone_cannot_be_judged(run_up, table):
    with pytest.raises(ModelError, match="there is no place to judge"):
        judge(run_up([25.0], [(1, None)], [1e-4], places=(("motor", "rx"),)), table(**RIGID))


def test_every_number_from_a_standard_names_it(run_up, table):
    found = judge(run_up([25.0], [(1, None)], [amplitude(2.0, 25.0)]), table(**RIGID))
    for limit in found.to_dict()["places"][0]["limits"]:
        assert "ISO 20816-3:2022" in limit["source"]
        assert "from memory" in limit["source"]
    assert "ISO 20816-3:2022" in found.verdict
    assert "ISO 20816-3:2022" in found.band
    assert vib.judge is judge
