"""Run-up: against dense solutions made by hand here, balances of force, laws, peaks, and what is refused."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

import vib
from vib.errors import ModelError

TAU = 2 * np.pi

SKID = """
title = "Rotor on a skid"
[units]
length = "m"
mass = "kg"
inertia = "kg m^2"
[points]
A = [0, 0, 0]
B = [2, 0, 0]
C = [2, 1, 0]
D = [0, 1, 0]
P = [0.4, 0.5, 0.6]
Q = [1.6, 0.5, 0.6]
p = [0.4, 0.5, 0.6]
q = [1.6, 0.5, 0.6]
[[bodies]]
name = "skid"
mass = 900
centre = [1.0, 0.5, 0.1]
inertia = [90, 300, 370]
carried_by = ["A", "B", "C", "D", "P", "Q"]
[[bodies]]
name = "rotor"
mass = 250
centre = [0.9, 0.5, 0.6]
inertia = [20, 26, 26]
carried_by = ["p", "q"]
[bodies.spin]
axis = "x"
shaft = "fan"
[[springs]]
name = "isolators"
between = [["A", "ground"], ["B", "ground"], ["C", "ground"], ["D", "ground"]]
stiffness = { x = "300 N/mm", y = "350 N/mm", z = "500 N/mm" }
dashpot = { x = "1 kN s/m", y = "1.2 kN s/m", z = "2 kN s/m" }
[[springs]]
name = "bearings"
between = [["p", "P"], ["q", "Q"]]
stiffness = { x = "20 kN/mm", y = "12 kN/mm", z = "30 kN/mm", rx = "1 kN m/rad" }
dashpot = { x = "3 kN s/m", y = "4 kN s/m", z = "6 kN s/m", rx = "5 N m s/rad" }
[[excitations]]
name = "fan"
speed = ["300 rpm", "4200 rpm"]
at = "rotor"
unbalance = { grade = "G 6.3", at_speed = "3000 rpm", phase = "30 deg" }
"""


def study_of(tmp_path: Path, text: str) -> vib.Study:
    file = tmp_path / "study.toml"
    file.write_text(text)
    return vib.read(file)


def skew(reach):
    x, y, z = reach
    return np.array([[0, -z, y], [z, 0, -x], [-y, x, 0]], dtype=float)


def lever(reach):
    """Displacement of a point of a rigid body from the six components of its centre."""
    return np.hstack([np.eye(3), -skew(reach)])


def skid_matrices():
    """M, C, K and the gyroscopic matrix per rad/s of two rigid bodies, 12 freedoms, by hand."""
    skid, rotor = np.array([1.0, 0.5, 0.1]), np.array([0.9, 0.5, 0.6])
    mass = np.diag([900.0] * 3 + [90, 300, 370] + [250.0] * 3 + [20, 26, 26])
    stiffness, damping = np.zeros((12, 12)), np.zeros((12, 12))
    for corner in ([0, 0, 0], [2, 0, 0], [2, 1, 0], [0, 1, 0]):
        row = np.zeros((3, 12))
        row[:, :6] = lever(np.array(corner) - skid)
        stiffness += row.T @ np.diag([3e5, 3.5e5, 5e5]) @ row
        damping += row.T @ np.diag([1e3, 1.2e3, 2e3]) @ row
    for x in (0.4, 1.6):
        place = np.array([x, 0.5, 0.6])
        row = np.zeros((3, 12))
        row[:, :6], row[:, 6:] = -lever(place - skid), lever(place - rotor)
        stiffness += row.T @ np.diag([2e7, 1.2e7, 3e7]) @ row
        damping += row.T @ np.diag([3e3, 4e3, 6e3]) @ row
        stiffness[np.ix_([3, 9], [3, 9])] += 1e3 * np.array([[1, -1], [-1, 1]])
        damping[np.ix_([3, 9], [3, 9])] += 5 * np.array([[1, -1], [-1, 1]])
    gyroscopic = np.zeros((12, 12))
    # I' + Ip W x turning: the momentum Ip W e_x follows the tilt, see any text on spinning tops
    gyroscopic[9:, 9:] = -20 * skew([1.0, 0, 0])
    return mass, damping, stiffness, gyroscopic


def skid_answer(speeds, unbalance, phase):
    """Displacements (k, 12) by a dense solve at each speed."""
    mass, damping, stiffness, gyroscopic = skid_matrices()
    found = []
    for n in speeds:
        w = TAU * n
        force = np.zeros(12, complex)
        force[7], force[8] = 1, -1j  # y, then z a quarter turn later: cos, sin
        force *= unbalance * w**2 * np.exp(1j * phase)
        found.append(np.linalg.solve(stiffness - w**2 * mass + 1j * w * (damping + w * gyroscopic), force))
    return np.array(found)


def test_a_rotor_on_a_skid_equals_a_dense_solution_by_hand(tmp_path):
    run = vib.run_up(
        study_of(tmp_path, SKID),
        watch=[(body, axis) for body in ("skid", "rotor") for axis in ("x", "y", "z", "rx", "ry", "rz")],
    )
    unbalance = 250 * 6.3e-3 / (TAU * 50)
    wanted = skid_answer(run.speed_hz, unbalance, np.radians(30))
    top = np.abs(wanted).max(axis=0)
    assert (np.abs(run.displacement_m[:, 0] - wanted)[:, top > 0] / top[top > 0]).max() < 1e-9
    velocity = TAU * run.speed_hz[:, None] * np.abs(wanted) / np.sqrt(2)
    assert np.allclose(run.velocity_rms_m_s, velocity, rtol=1e-8, atol=1e-15)
    corners = {"A": [0, 0, 0], "B": [2, 0, 0], "C": [2, 1, 0], "D": [0, 1, 0]}
    for name, corner in corners.items():
        moved = wanted[:, :6] @ lever(np.array(corner) - np.array([1.0, 0.5, 0.1])).T
        for axis, (k, c) in enumerate(((3e5, 1e3), (3.5e5, 1.2e3), (5e5, 2e3))):
            column = run.transmitted.names.index(f"isolators {name} {'xyz'[axis]}")
            force = (k + 1j * TAU * run.speed_hz * c) * moved[:, axis]
            assert np.allclose(run.transmitted.force_n[:, 0, column], force, rtol=1e-7, atol=1e-9)
