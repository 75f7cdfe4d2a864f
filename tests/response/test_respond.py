"""Response of systems to loads and to a moving ground: limits, steady parts, reduced models, refusals."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
import scipy.sparse as sparse

import vib
from tests.references.forced import mounted
from vib.errors import ModelError
from vib.response import forced as forcing
from vib.response.loads import GroundQuantity, Load, harmonic_ground, recorded_ground
from vib.response.respond import respond
from vib.response.signals import Constant, Harmonic, Impulse, Samples, half_sine

WATCH = [("m", "z")]


def single(damping=0.8):
    return vib.System(mass=[[2.0]], damping=[[damping]], stiffness=[[800.0]])


def test_a_pulse_and_a_blow_agree_with_the_ring():
    pulse = respond(single(), loads=[Load(half_sine(5.0, 0.02), "1")], duration_s=1.0, step_s=0.01)
    ring = single().ring(pulse=(5.0, 0.02), at="1", times=pulse.time_s)
    for name in ("displacement_m", "velocity_m_s"):
        wanted = getattr(ring, name)
        np.testing.assert_allclose(getattr(pulse, name), wanted, atol=1e-12 * np.abs(wanted).max())
    blow = respond(single(), loads=[Load(Impulse(3.0), "1")], duration_s=1.0, step_s=0.01)
    wanted = single().ring(impulse=3.0, at="1", times=blow.time_s).acceleration_m_s2
    np.testing.assert_allclose(blow.acceleration_m_s2, wanted, atol=1e-10 * np.abs(wanted).max())


def test_the_record_obeys_the_equation_of_motion():
    system = single()
    load = Load(Harmonic(4.0, 2.5, 0.3), "1")
    found = respond(system, loads=[load], duration_s=2.0, step_s=0.003)
    force = 2.0 * found.acceleration_m_s2 + 0.8 * found.velocity_m_s + 800.0 * found.displacement_m
    np.testing.assert_allclose(force[:, 0], load.signal.value(found.time_s), atol=1e-10)


def test_the_end_of_a_long_record_is_the_steady_part():
    found = respond(single(8.0), loads=[Load(Harmonic(4.0, 2.5, 0.3), "1")], duration_s=20.0, step_s=0.01)
    (steady,) = found.steady
    turn = np.exp(2j * np.pi * 2.5 * found.time_s[-50:])
    np.testing.assert_allclose(found.displacement_m[-50:, 0], (steady.amplitude[0] * turn).imag, atol=1e-12)


def test_a_slow_ground_carries_everything_along():
    """At a fiftieth of the natural frequency all moves with the ground, but for its square: 1 / 2500."""
    ground = harmonic_ground(0.01, 0.1, "z", quantity="displacement")
    found = respond(mounted(0.1).system(), ground=ground, watch=WATCH, duration_s=60.0, step_s=0.02)
    wanted = 0.01 * np.sin(2 * np.pi * 0.1 * found.time_s)
    late = found.time_s > 20
    np.testing.assert_allclose(found.displacement_m[late, 0], wanted[late], atol=0.01 / 2000)
    assert found.relative_m is not None
    np.testing.assert_allclose(found.displacement_m[:, 0] - found.relative_m[:, 0], wanted, atol=1e-12)


def test_a_recorded_ground_is_the_same_in_all_three_quantities():
    """One smooth motion recorded as acceleration, velocity and displacement, finely."""
    times = np.arange(0, 2.0001, 0.001)
    travel = 0.002 * np.sin(np.pi * times / 2) ** 4
    speed = np.gradient(travel, times, edge_order=2)
    rate = np.gradient(speed, times, edge_order=2)
    recorded: tuple[tuple[GroundQuantity, Any], ...] = (
        ("acceleration", rate),
        ("velocity", speed),
        ("displacement", travel),
    )
    found = [
        respond(
            mounted(0.05).system(),
            ground=recorded_ground(times, values, "z", quantity=quantity),
            watch=WATCH,
            duration_s=2.0,
            step_s=0.001,
        ).displacement_m[:, 0]
        for quantity, values in recorded
    ]
    for other in found[1:]:
        np.testing.assert_allclose(other, found[0], atol=2e-4 * np.abs(found[0]).max())


def test_a_ground_at_constant_acceleration_bends_the_spring_statically():
    times = np.array([0.0, 1000.0])
    ground = recorded_ground(times, [1.5, 1.5], "z", quantity="acceleration")
    found = respond(mounted(0.2).system(), ground=ground, watch=WATCH, duration_s=30.0, step_s=0.02)
    assert found.relative_m is not None
    stiffness = (2 * np.pi * 5.0) ** 2
    assert found.relative_m[-1, 0] == pytest.approx(-1.5 / stiffness, rel=1e-9)
    assert found.acceleration_m_s2[-1, 0] == pytest.approx(1.5, rel=1e-9)


def test_shares_add_up_to_the_largest_displacement():
    system = vib.System(mass=np.eye(2), stiffness=np.array([[300.0, -100], [-100, 200]]))
    found = respond(system, loads=[Load(half_sine(1.0, 0.3), "1")], duration_s=3.0, step_s=0.01)
    total = sum(share.shares for share in found.shares)
    np.testing.assert_allclose(total, 1.0, atol=2e-3)  # a mode of less than 1e-3 is not listed
    assert [share.frequency_hz for share in found.shares] == sorted(s.frequency_hz for s in found.shares)


def long_chain(size=140):
    stiffness = 1e4 * (2 * np.eye(size) - np.eye(size, k=1) - np.eye(size, k=-1))
    damping = np.zeros((size, size))
    damping[50, 50] = 200.0
    return vib.System(
        mass=sparse.csr_array(np.eye(size)),
        stiffness=sparse.csr_array(stiffness),
        damping=sparse.csr_array(damping),
    )


@pytest.mark.parametrize("signal", [half_sine(1.0, 0.4), Harmonic(1.0, 1.0), Constant(1.0)])
def test_a_reduced_model_is_within_what_it_states(monkeypatch, signal):
    arguments: dict[str, Any] = {
        "loads": [Load(signal, "20")],
        "watch": ["20", "90"],
        "duration_s": 8.0,
        "step_s": 0.02,
    }
    reduced = respond(long_chain(), **arguments)
    monkeypatch.setattr(forcing, "FULL_SIZE", 1000)
    whole = respond(long_chain(), **arguments)
    assert reduced.model.startswith("reduced")
    assert whole.model.startswith("complete")
    for name, quantity in (("displacement_m", "displacement"), ("velocity_m_s", "velocity")):
        wanted = getattr(whole, name)
        gap = np.abs(getattr(reduced, name) - wanted).max() / np.abs(wanted).max()
        assert gap <= reduced.truncations[quantity] + 1e-9
        assert quantity == "velocity" or gap < 0.02  # a step has a front, which takes many modes


def test_the_step_is_a_part_of_that_of_the_record():
    record = Samples(np.random.default_rng(0).normal(size=200), 0.005)
    found = respond(single(), loads=[Load(record, "1")], duration_s=1.0)
    ratio = 0.005 / found.time_s[1]
    assert ratio == pytest.approx(round(ratio), abs=1e-9)
    assert "whole part" in found.step_note


def test_a_growing_motion_is_never_fine():
    found = respond(single(-0.5), loads=[Load(Harmonic(1.0, 1.0), "1")], duration_s=1.0, step_s=0.01)
    assert not found.stable
    assert not found.steady
    assert "UNSTABLE" in found.remarks[0]


@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        ({}, "nothing acts"),
        ({"loads": [Load(Constant(1.0), "9")]}, "9"),
        ({"loads": [Load(Constant(1.0), "1")], "step_s": -1.0}, "step: it must be longer"),
        ({"loads": [Load(Constant(1.0), "1")], "duration_s": 0.0}, "duration: it must be longer"),
        ({"loads": [Load(Constant(1.0), "1")], "duration_s": 1e9}, "give a shorter duration"),
        ({"ground": harmonic_ground(1.0, 1.0, "z")}, "needs a structure"),
    ],
)
def test_what_can_not_be_done_is_said(arguments, message):
    with pytest.raises(ModelError, match=message):
        respond(single(), **arguments)


def test_a_blow_where_there_is_no_mass_is_refused():
    system = vib.System(mass=np.diag([1.0, 0.0]), stiffness=np.array([[30.0, -10], [-10, 20]]))
    with pytest.raises(ModelError, match="no mass"):
        respond(system, loads=[Load(Impulse(1.0), "2")], duration_s=1.0, step_s=0.1)
    found = respond(system, loads=[Load(Constant(2.0), "2")], duration_s=1.0, step_s=0.1)
    assert found.displacement_m[0, 1] == pytest.approx(0.1)  # it gives way at once: 2 N / 20 N/m
