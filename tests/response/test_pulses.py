"""Half-sine and rectangular pulses on a single mass, against the handbook formulas."""

from __future__ import annotations

import numpy as np
import pytest

from vib.response.groups import take_apart
from vib.response.motion import HalfSine, Motion
from vib.response.ring import ring
from vib.response.transition import constant_input
from vib.system import System

# Natural period 1 s, static deflection 1 m under the peak force.
SQUARE = (2 * np.pi) ** 2
MASS = System(mass=[[1.0]], stiffness=[[SQUARE]])

# SHOCK-HS of the project's reference collection; source there: Ayre, half-cycle sine pulse, in Harris & Crede
# (eds.), Shock and Vibration Handbook, checked by integration. Duration over period, largest response over
# static deflection, amplitude after the pulse.
HALF_SINE = [
    (0.1, 0.396273548456, 0.396273548456),
    (0.25, 0.942809041582, 0.942809041582),
    (0.5, 1.57079632679, 1.57079632679),
    (0.75, 1.76335575688, 1.69705627485),
    (1.0, 1.73205080757, 1.33333333333),
    (1.5, 1.5, 0.0),
    (2.0, 1.26807535506, 0.533333333333),
    (2.5, 1.08253175473, 0.0),
    (4.0, 1.12549457487, 0.253968253968),
]


@pytest.mark.parametrize(("duration", "largest", "after"), HALF_SINE)
def test_half_sine_reference(duration, largest, after):
    found = MASS.ring(pulse=(SQUARE, duration), at="1")
    assert abs(found.peaks[0].value) == pytest.approx(largest, abs=1e-10)
    assert abs(found.contributions.weights[0, 0]) == pytest.approx(after, abs=1e-10)
    assert found.contributions.origin_s == duration


def test_largest_half_sine_response():
    """The peak factor 1.768457654 lies at a duration of 0.8099367859 periods (same source)."""
    found = MASS.ring(pulse=(SQUARE, 0.8099367859), at="1")
    assert found.peaks[0].value == pytest.approx(1.768457654, abs=1e-9)


@pytest.mark.parametrize(("duration", "largest"), [(0.1, 0.61803398875), (0.4, 1.90211303259), (0.8, 2.0)])
def test_rectangular_pulse_reference(duration, largest):
    """SHOCK-RECT (Ayre, same handbook), by the exact answer to a constant input, then free."""
    a = np.array([[0.0, 1.0], [-SQUARE, 0.0]])
    times = np.linspace(0, duration, 4001)
    during = constant_input(a, [[0.0], [SQUARE]], times).input_effect[:, 0, 0]
    end = constant_input(a, [[0.0], [SQUARE]], duration).input_effect[:, 0]
    free = ring(MASS, displacement=end[:1], velocity=end[1:], duration=2.0)
    found = max(np.abs(during).max(), abs(free.peaks[0].value))
    assert found == pytest.approx(largest, abs=1e-6)  # the sampled part of the pulse: 4000 steps


CASES = {
    "undamped, at resonance": System(mass=[[1.0]], stiffness=[[np.pi**2 / 0.25]]),
    "damped": System(mass=[[1.0]], stiffness=[[40.0]], damping=[[0.7]]),
    "critical": System(mass=[[1.0]], stiffness=[[4.0]], damping=[[4.0]]),
    "stiffly overdamped": System(mass=[[1.0]], stiffness=[[1.0]], damping=[[3000.0]]),
    "free": System(mass=np.diag([1.0, 2.0]), stiffness=[[5.0, -5.0], [-5.0, 5.0]]),
}


@pytest.mark.parametrize("name", CASES)
def test_pulse_obeys_the_equation_of_motion(name):
    """M q'' + C q' + K q = f at every instant, and no jump of q and q' at both ends of the pulse."""
    system = CASES[name]
    tau, peak = 0.5, 7.0
    times = np.array([0.0, 1e-6, 0.1, 0.31, 0.4999, 0.5, 0.7, 3.0])
    found = ring(system, pulse=(peak, tau), at="1", times=times)
    force = np.zeros((len(times), system.size))
    force[:, 0] = np.where(times < tau, peak * np.sin(np.pi * times / tau), 0.0)
    damping = np.zeros((system.size,) * 2) if system.damping is None else system.damping
    terms = [
        found.acceleration_m_s2 @ system.mass,
        found.velocity_m_s @ damping,
        found.displacement_m @ system.stiffness,
    ]
    size = max(np.abs(term).max() for term in terms)
    np.testing.assert_allclose(sum(terms), force, rtol=0, atol=1e-11 * size)
    assert np.abs(found.displacement_m[0]).max() < 1e-15
    assert np.abs(found.velocity_m_s[0]).max() < 1e-14
    step = 1e-9
    ends = ring(system, pulse=(peak, tau), at="1", times=[tau - step, tau])
    jump = np.diff(ends.displacement_m, axis=0) - step * ends.velocity_m_s[1]
    assert np.abs(jump).max() < 1e-12 * max(1.0, np.abs(found.displacement_m).max())
    assert np.abs(np.diff(ends.velocity_m_s, axis=0)).max() < 10 * step * peak + 1e-12


@pytest.mark.parametrize("name", ["damped", "critical", "free"])
def test_pulse_against_small_constant_steps(name):
    """Independent path: the pulse as 4000 constant pieces, each answered exactly (error about step^2)."""
    system = CASES[name]
    n, tau, steps = system.size, 0.5, 4000
    damping = np.zeros((n, n)) if system.damping is None else system.damping
    inverse = np.linalg.inv(system.mass)
    a = np.block([[np.zeros((n, n)), np.eye(n)], [-inverse @ system.stiffness, -inverse @ damping]])
    b = np.concatenate([np.zeros(n), inverse[:, 0]])[:, None]
    piece = constant_input(a, b, tau / steps)
    state = np.zeros(2 * n)
    for middle in (np.arange(steps) + 0.5) * tau / steps:
        state = piece.transition @ state + piece.input_effect[:, 0] * np.sin(np.pi * middle / tau)
    found = ring(system, pulse=(1.0, tau), at="1", times=[tau])
    np.testing.assert_allclose(found.displacement_m[0], state[:n], rtol=1e-6)
    np.testing.assert_allclose(found.velocity_m_s[0], state[n:], rtol=1e-6)


def test_short_pulse_is_an_impulse():
    """A half sine of peak p and duration d holds the impulse 2 p d / pi."""
    d, times = 1e-5, [0.2, 0.9]
    pulse = ring(CASES["damped"], pulse=(np.pi / (2 * d), d), at="1", times=times)
    blow = ring(CASES["damped"], impulse=1.0, at="1", times=np.array(times) - d / 2)
    np.testing.assert_allclose(pulse.displacement_m, blow.displacement_m, rtol=1e-8)


def test_pulse_on_a_massless_freedom_moves_it_at_once():
    system = System(mass=np.diag([1.0, 0.0]), stiffness=[[100.0, -100.0], [-100.0, 200.0]])
    found = system.ring(pulse=(5.0, 0.1), at="2", times=[0.05, 0.3])
    q = found.displacement_m[0]
    assert 200 * q[1] - 100 * q[0] == pytest.approx(5.0, rel=1e-13)  # its own equilibrium, at the peak
    assert 200 * found.displacement_m[1, 1] == pytest.approx(100 * found.displacement_m[1, 0], rel=1e-13)


def test_envelope_is_not_defined_during_the_pulse():
    found = CASES["damped"].ring(pulse=(1.0, 0.5), at="1", times=[0.2, 0.6])
    assert np.isnan(found.envelope_m[0, 0])
    assert found.envelope_m[1, 0] >= abs(found.displacement_m[1, 0])


def test_parts_add_up_during_the_pulse():
    matrix = np.array([[0.0, 1.0, 0.0], [-9.0, -0.3, 0.0], [0.0, 0.0, -2.0]])
    motion = Motion(
        take_apart(matrix),
        np.array([[1.0, 0.0, 1.0]]),
        np.zeros(3),
        HalfSine(0.4, np.array([0, 1.0, 3.0]), np.zeros(1)),
    )
    for time in (0.1, 0.4, 1.3):
        assert motion.by_part(time).sum() == pytest.approx(motion(np.array([time]))[0, 0], rel=1e-13)
