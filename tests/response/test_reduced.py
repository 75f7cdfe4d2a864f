"""Reduced models of larger systems: against the complete model, with their own statement of error."""

from __future__ import annotations

import numpy as np
import pytest
import scipy.sparse as sparse

import vib.response.assemble as assembling
from vib.system import DampingLaw, System


def chain(size, dashpots=(), law=DampingLaw(), held=True):  # noqa: B008 - the law is frozen
    """Masses of 1 kg on springs of 10 kN/m, sparse; dashpots of 50 N s/m to ground."""
    diagonal = np.full(size, 2.0)
    diagonal[-1] = 1.0
    diagonal[0] = 2.0 if held else 1.0
    side = -np.ones(size - 1)
    stiffness = 1e4 * sparse.diags_array([side, diagonal, side], offsets=[-1, 0, 1]).tocsr()
    damping = sparse.lil_array((size, size))
    for place in dashpots:
        damping[place, place] = 50.0
    return System(
        mass=sparse.eye_array(size).tocsr(),
        stiffness=stiffness,
        damping=damping.tocsr() if dashpots else None,
        damping_law=law,
    )


def both(monkeypatch, system, watch, **start):
    times = np.linspace(0, 3, 151)
    reduced = system.ring(**start, watch=watch, times=times)
    monkeypatch.setattr(assembling, "FULL_SIZE", system.size)
    complete = system.ring(**start, watch=watch, times=times)
    assert reduced.model.startswith("reduced")
    assert complete.model.startswith("complete")
    assert complete.truncation == 0
    return reduced, complete


@pytest.mark.parametrize(
    "start",
    [
        {"pulse": (5.0, 0.2), "at": "60"},
        {"pull": 5.0, "at": "60"},
        {"impulse": 1.0, "at": "60"},
    ],
    ids=lambda start: next(iter(start)),
)
def test_error_is_within_what_is_stated(monkeypatch, start):
    system = chain(110, dashpots=(50,), law=DampingLaw(ratio=0.01))
    reduced, complete = both(monkeypatch, system, ["60", "10"], **start)
    assert reduced.truncation > 0
    for name, got, want in (
        ("displacement", reduced.displacement_m, complete.displacement_m),
        ("velocity", reduced.velocity_m_s, complete.velocity_m_s),
        ("acceleration", reduced.acceleration_m_s2, complete.acceleration_m_s2),
    ):
        stated = reduced.truncations[name]
        if stated > 0.2:  # no bound, and it says so
            assert any("Not settled" in remark and name in remark for remark in reduced.remarks)
        else:
            # stated over the first two slow periods and for all outputs together; hence the factor
            assert np.abs(got - want).max() <= 1.5 * stated * np.abs(want).max()
    assert any("cut to its lower modes" in remark for remark in reduced.remarks)


def test_free_reduced_system_drifts_exactly(monkeypatch):
    system = chain(130, dashpots=(), held=False)
    monkeypatch.setattr(assembling, "UNCOUPLED_SIZE", 0)
    found = system.ring(pulse=(130.0, 0.5), at="65", watch=["1", "65"], times=[200.0, 1000.0])
    # momentum 2 p d / pi over the whole mass of 130 kg; the elastic part stays below some millimetres
    speed = 2 * 130.0 * 0.5 / np.pi / 130.0
    expected = speed * (np.array([200.0, 1000.0]) - 0.25)
    np.testing.assert_allclose(found.displacement_m, expected[:, None] * np.ones(2), atol=0.2)
    np.testing.assert_allclose(np.diff(found.displacement_m.mean(axis=1)), speed * 800.0, rtol=1e-3)
    assert found.model.startswith("reduced")
    assert any("drifts away" in remark for remark in found.remarks)


def test_pull_is_exact_at_the_start(monkeypatch):
    """Static corrections hold the static answer whatever the number of modes."""
    system = chain(140, dashpots=(50,))
    found = system.ring(pull=5.0, at="100", watch=["100", "30"], times=[0.0])
    # springs in a row from ground: 100 of them to the pulled mass
    np.testing.assert_allclose(found.displacement_m[0], [5.0 * 100 / 1e4, 5.0 * 30 / 1e4], rtol=1e-10)


def test_initial_state_is_exact_at_the_start():
    system = chain(140, dashpots=(50,))
    place = np.sin(np.arange(140) * 2.1)
    speed = np.cos(np.arange(140) * 1.3)
    found = system.ring(displacement=place, velocity=speed, times=[0.0])
    np.testing.assert_allclose(found.displacement_m[0], place, atol=1e-9)
    np.testing.assert_allclose(found.velocity_m_s[0], speed, atol=1e-8)
    assert found.displacement_m.shape == (1, 140)


def test_uncoupled_damping_needs_no_reduction():
    system = chain(140, law=DampingLaw(ratio=0.02))
    found = system.ring(impulse=1.0, at="60", watch=["60"], times=[0.1])
    assert found.model == "complete first-order model, 280 states"
    assert found.method == "eigenvalues"


def test_spread_damping_is_left_to_the_modes(monkeypatch):
    """More damped freedoms than static corrections are made for: still within what is stated."""
    system = chain(140, dashpots=tuple(range(0, 140, 2)))
    reduced, complete = both(monkeypatch, system, ["60"], pulse=(5.0, 0.2), at="60")
    error = np.abs(reduced.displacement_m - complete.displacement_m).max()
    assert error <= 1.5 * max(reduced.truncation, 1e-9) * np.abs(complete.displacement_m).max()
