"""Modes over the speed from a few speeds: as full solutions give them, and in full where those lack them."""

from __future__ import annotations

import numpy as np
import pytest

import vib
from vib import speed_basis
from vib.solve.search import solve_system
from vib.speed_basis import SpeedBasis
from vib.speeds import at_speed

COUNT = 10


@pytest.fixture(scope="module")
def skid():
    study = vib.read("models/fan_skid.toml")
    return study.system(), study.system().rotations[0].shaft


def test_speeds_in_between_are_as_full_solutions_give_them(skid):
    system, shaft = skid
    basis = SpeedBasis(COUNT)
    for speed in (0.1, 40.0, 20.0):
        basis.solve(at_speed(system, shaft, speed))
    taken = basis.full
    assert 2 <= taken <= 3
    for speed in (5.0, 28.0):
        there = at_speed(system, shaft, speed)
        found, exact = basis.solve(there), solve_system(there, COUNT, None, certify=False).damped
        np.testing.assert_allclose(found.values, exact.values, rtol=speed_basis.LEFT, atol=1e-8)
    assert basis.full == taken


def test_a_basis_that_lacks_the_modes_gives_way_to_a_full_solution(skid, monkeypatch):
    system, shaft = skid
    basis = SpeedBasis(COUNT)
    basis.solve(at_speed(system, shaft, 0.1))
    monkeypatch.setattr(speed_basis, "LEFT", 0.0)
    found = basis.solve(at_speed(system, shaft, 40.0))
    assert basis.full == 2
    exact = solve_system(at_speed(system, shaft, 40.0), COUNT, None, certify=False).damped
    np.testing.assert_array_equal(found.values, exact.values)
