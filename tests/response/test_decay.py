"""Decrement, envelope, times to fall and peaks, against closed forms."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from vib.response.decay import cycles_to, damping_from_decrement, logarithmic_decrement
from vib.system import System

# DECAY-LD of the project's reference collection (definition in ISO 2041): ratio, decrement, ratio of maxima.
DECREMENTS = [
    (0.001, 0.006283188448775, 0.9937365095029),
    (0.01, 0.06283499490009, 0.9390984169337),
    (0.02, 0.1256888464272, 0.8818892070747),
    (0.05, 0.3145527022888, 0.7301153801794),
    (0.1, 0.6314838833997, 0.5318020829443),
    (0.2, 1.282549830162, 0.277329255639),
    (0.5, 3.627598728468, 0.02657993347642),
]


@pytest.mark.parametrize(("ratio", "decrement", "successive"), DECREMENTS)
def test_decrement_reference(ratio, decrement, successive):
    assert logarithmic_decrement(ratio) == pytest.approx(decrement, rel=1e-12)
    assert damping_from_decrement(1.0, successive) == pytest.approx(
        ratio, rel=1e-9
    )  # 13 digits of a logarithm
    (row,) = single(ratio).ring(impulse=1.0, at="1").modes
    assert row.logarithmic_decrement == pytest.approx(decrement, rel=1e-10)


@pytest.mark.parametrize("ratio", [1.0, 1.5, -1.0, float("nan")])
def test_no_decrement_without_swings(ratio):
    assert logarithmic_decrement(ratio) is None


def test_decrement_over_several_periods():
    """DECAY-N: (10, 2) over 5, (3.2, 2.9) over 4 periods. DECAY-HALF: cycles to one half at 2 %."""
    assert damping_from_decrement(10, 2, 5) == pytest.approx(0.0511629050149, rel=1e-11)
    assert damping_from_decrement(3.2, 2.9, 4) == pytest.approx(0.0039167760024, rel=1e-9)
    assert cycles_to(0.5, 0.02) == pytest.approx(5.51478671548, rel=1e-11)


def single(ratio, mass=3.0, hertz=12.0):
    omega = 2 * np.pi * hertz
    return System(mass=[[mass]], damping=[[2 * ratio * mass * omega]], stiffness=[[mass * omega**2]])


def test_impulse_reference():
    """DECAY-IMP and DECAY-ENV (Harris & Crede, Shock and Vibration Handbook): 3 kg, 12 Hz, 6 %, 1.8 N s."""
    found = single(0.06).ring(impulse="1.8 N s", at="1")
    peak = found.peaks[0]
    assert peak.time_s == pytest.approx(0.0200732447958, rel=1e-10)
    assert peak.value == pytest.approx(0.00726695034702, rel=1e-10)
    extrema = [0.0200732447958, 0.0618151145719, 0.103556984348, 0.145298854124]
    values = [0.00726695034702, -0.00601647144565, 0.00498117187097, -0.00412402409491]
    np.testing.assert_allclose(found.motion(np.array(extrema))[:, 0], values, rtol=1e-10)
    assert found.contributions.envelope([0.020870934888])[0, 0] == pytest.approx(0.00725384230644, rel=1e-10)


@pytest.mark.parametrize(("k", "share"), [(1, -0.729247614288), (2, 0.531802082944), (3, -0.38781540026)])
def test_release_reference(k, share):
    """DECAY-REL: let go at rest, 10 %: extremes at half periods."""
    damped = 2 * np.pi * 12 * np.sqrt(1 - 0.01)
    found = single(0.1).ring(displacement=0.002, at="1", times=[k * np.pi / damped])
    assert found.displacement_m[0, 0] / 0.002 == pytest.approx(share, rel=1e-10)
    assert abs(found.velocity_m_s[0, 0]) < 1e-14
    assert found.peaks[0].value == pytest.approx(0.002, rel=1e-12)
    assert found.peaks[0].time_s == 0


def test_times_to_fall_of_one_mode():
    """Envelope J/(m wd) exp(-z w t) against 10 % and 1 % of the first peak."""
    found = single(0.06).ring(impulse=1.8, at="1")
    decay, height = 0.06 * 2 * np.pi * 12, abs(found.contributions.weights[0, 0])
    peak = found.peaks[0].value
    fall = found.falls[0]
    assert fall.envelope_to_10_percent_s == pytest.approx(np.log(height / (0.1 * peak)) / decay, rel=1e-10)
    assert fall.envelope_to_1_percent_s == pytest.approx(np.log(height / (0.01 * peak)) / decay, rel=1e-10)
    assert 0 < fall.envelope_to_10_percent_s - fall.record_to_10_percent_s < 1 / 24  # half a swing at most
    assert found.modes[0].fall_to_10_percent_s == pytest.approx(np.log(10) / decay, rel=1e-12)
    # the length rests on the sampled peak, which 20 samples a swing cut by at most 1.3 %
    assert 0 <= found.time_s[-1] - fall.envelope_to_1_percent_s <= 0.013 / decay


def test_times_to_fall_at_critical_damping():
    """(1 + w t) exp(-w t) = 0.1 and 0.01; roots of the closed form by mpmath."""
    import mpmath

    found = System(mass=[[2.0]], damping=[[8.0]], stiffness=[[8.0]]).ring(displacement=0.01, at="1")
    for level, got in (
        (0.1, found.falls[0].record_to_10_percent_s),
        (0.01, found.falls[0].record_to_1_percent_s),
    ):
        root = float(mpmath.findroot(lambda t, level=level: (1 + 2 * t) * mpmath.exp(-2 * t) - level, 3))
        assert got == pytest.approx(root, rel=1e-9)
    assert found.falls[0].envelope_to_1_percent_s == pytest.approx(
        found.falls[0].record_to_1_percent_s, rel=1e-9
    )


systems = st.tuples(
    st.floats(0.002, 0.3), st.floats(0.002, 0.3), st.floats(1.0, 6.0), st.floats(-1, 1), st.integers(0, 1)
)


@settings(max_examples=20, deadline=None)
@given(systems)
def test_after_the_time_to_fall_the_motion_stays_below(numbers):
    one, two, spread, coupling, place = numbers
    stiffness = np.array([[10.0, coupling], [coupling, 10.0 * spread]])
    system = System(mass=np.eye(2), stiffness=stiffness, damping=np.diag([one, two * spread]))
    found = system.ring(impulse=1.0, at=str(place + 1))
    size = abs(found.peaks[place].value)
    fall = found.falls[place]
    assert fall.envelope_to_10_percent_s is not None
    times = np.linspace(fall.envelope_to_10_percent_s, 3 * fall.envelope_to_10_percent_s + 1, 5000)
    assert np.abs(found.motion(times)[:, place]).max() <= 0.1 * size * (1 + 1e-9)
    envelope = found.contributions.envelope(times)[:, place]
    assert np.all(np.abs(found.motion(times)[:, place]) <= envelope * (1 + 1e-9) + 1e-14)
    assert np.abs(found.displacement_m[:, place]).max() <= size * (1 + 1e-9)


def test_peaks_are_found_between_samples():
    """Even from a record of a few arbitrary times the peaks are those of the motion itself."""
    found = single(0.06).ring(impulse=1.8, at="1", times=[0.5, 0.1])
    assert found.peaks[0].value == pytest.approx(0.00726695034702, rel=1e-10)
    assert found.peaks[1].value == pytest.approx(0.6, rel=1e-12)
    # acceleration: largest where its derivative vanishes, checked on a fine grid
    fine = found.motion(np.linspace(0, 0.1, 200_001), 2)[:, 0]
    assert abs(found.peaks[2].value) == pytest.approx(np.abs(fine).max(), rel=1e-8)


def test_undamped_motion_never_falls():
    found = single(0.0).ring(impulse=1.0, at="1")
    assert found.falls[0].envelope_to_10_percent_s is None
    assert found.falls[0].record_to_10_percent_s is None
    assert found.modes[0].fall_to_1_percent_s is None
    assert "20 periods" in found.duration_note
    assert found.time_s[-1] == pytest.approx(20 / 12, rel=1e-9)


def test_automatic_record_is_fine_enough_and_capped_aloud():
    found = single(0.02).ring(impulse=1.0, at="1")
    assert np.diff(found.time_s).max() <= 1 / 12 / 20 * (1 + 1e-9)
    slow = System(mass=np.eye(2), stiffness=np.diag([1.0, 1e6]) + 0.5, damping=np.diag([1e-3, 1e-3]))
    capped = slow.ring(velocity=[1.0, 50.0])
    assert len(capped.time_s) == 10_001
    assert "capped" in capped.duration_note
    assert any("Give a duration" in remark for remark in capped.remarks)
