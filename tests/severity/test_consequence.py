"""What a screening says of the level where a line meets a mode; it never hides the coincidence."""

import json

import numpy as np
import pytest

import vib
from vib.screening import screen
from vib.show.documents import to_json
from vib.study.excitations import Excitation

NATURAL = 26.0
SPEEDS = np.array([20.0, 24.0, 25.9, 26.0, 26.1, 30.0])


@pytest.fixture
def modes():
    omega = 2 * np.pi * NATURAL
    return vib.System(mass=[[1.0]], stiffness=[[omega**2]], damping=[[2 * 0.01 * omega]]).modes()


def excitation(**entries):
    return Excitation.model_validate({"name": "fan", **entries})


def level(row):
    """The consequence of a row, which must have one."""
    assert row.consequence is not None
    return row.consequence


def amplitudes(velocity_rms_mm_s):
    """(k,) displacement amplitude, m, of sines at the running speeds."""
    return 1e-3 * np.asarray(velocity_rms_mm_s) * np.sqrt(2) / (2 * np.pi * SPEEDS)


def test_the_level_is_that_where_line_and_mode_meet(modes, run_up, table):
    given = run_up(SPEEDS, [(1, None), (2, None)], np.stack([amplitudes([1, 1, 3, 4, 3, 9]), np.ones(6)], 1))
    found = screen(
        modes,
        [excitation(speed="1480 rpm", orders=[1, 2])],
        run_ups=[given],
        severity=table(group=1, support="rigid"),
    )
    once, twice = found.rows
    assert level(once).velocity_rms_m_s == pytest.approx(4e-3, rel=1e-12)
    assert (level(once).zone, level(once).frequency_hz) == ("B", 26.0)
    assert (level(once).output, level(once).meets) == ("motor y", True)
    assert level(once).source == "ISO 20816-3:2022, group 1, rigid support, figures from memory"
    assert twice.consequence is None  # outside the band


@pytest.mark.parametrize(("rms", "zone"), [(0.1, "A"), (3.0, "B"), (6.0, "C"), (99.0, "D")])
def test_a_coincidence_counts_however_harmless_it_is(modes, run_up, table, rms, zone):
    given = run_up(SPEEDS, [(1, None)], amplitudes(np.full(6, rms)))
    lines = [excitation(speed="1480 rpm")]
    plain = screen(modes, lines)
    found = screen(modes, lines, run_ups=[given], severity=table(group=1, support="rigid"))
    assert len(found.objections) == len(plain.objections) == 1
    assert not found.clear
    assert found.verdict.startswith(plain.verdict)
    assert f"zone {zone} at worst" in found.verdict
    assert "ISO 20816-3:2022" in found.verdict
    assert ("does no harm" in found.verdict) == (zone in "AB")


def test_without_a_table_there_is_a_level_but_no_zone(modes, run_up):
    given = run_up(SPEEDS, [(1, None)], amplitudes(np.full(6, 2.0)))
    (row,) = screen(modes, [excitation(speed="1480 rpm")], run_ups=[given]).rows
    assert level(row).velocity_rms_m_s == pytest.approx(2e-3)
    assert level(row).zone is None


def test_an_excitation_without_a_force_says_so(modes, run_up, table):
    given = run_up(SPEEDS, [(1, None)], amplitudes(np.full(6, 0.1)))
    lines = [excitation(speed="1480 rpm"), excitation(name="pump", speed="1500 rpm")]
    found = screen(modes, lines, run_ups=[given], severity=table(group=1, support="rigid"))
    assert [row.consequence is None for row in found.rows] == [False, True]
    assert "not known for pump, order 1: no force is stated there" in found.verdict
    assert "does no harm" not in found.verdict
    document = json.loads(to_json(found.to_dict()))
    assert document["rows"][0]["consequence"]["zone"] == "A"
    assert document["rows"][1]["consequence"] is None


def test_a_fixed_frequency_is_judged_as_it_runs(modes, run_up, table):
    given = run_up(SPEEDS, [(None, 24.0)], np.full(6, 2e-5))
    lines = [excitation(frequencies=["24 Hz"])]
    found = screen(modes, lines, run_ups=[given], severity=table(group=1, support="rigid"))
    (row,) = found.rows
    assert not level(row).meets
    assert level(row).velocity_rms_m_s == pytest.approx(2e-5 / np.sqrt(2) * 2 * np.pi * 24)
    assert "As it runs" in found.verdict


def test_forces_of_one_line_add_as_vectors(modes, run_up):
    moved = amplitudes(np.full(6, 2.0))
    given = run_up(SPEEDS, [(1, None), (1, None)], np.stack([moved, -0.5 * moved], 1))
    (row,) = screen(modes, [excitation(speed="1480 rpm")], run_ups=[given]).rows
    assert level(row).velocity_rms_m_s == pytest.approx(1e-3)
