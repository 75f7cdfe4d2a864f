"""Modes against speed: critical speeds, whirl and onset of instability against closed forms."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tests.references.common import study
from vib.errors import MatrixError, ModelError, StudyError
from vib.speeds import at_speed, speed_curves
from vib.system import Rotation, System

TURN = 2 * np.pi


def tilting(polar, *, speed=300.0, spin=None, stiffness=(2000.0, 2000.0)):
    """A body that can only tilt: transverse moment 0.05 kg m^2 on rotational springs, spin in rad/s."""
    spin = spin or f'axis = "z", speed = "{speed / TURN!r} Hz"'
    return study(f"""
[points]
A = ["0 m", "0 m", "0 m"]
[[bodies]]
name = "rotor"
mass = "10 kg"
inertia = ["0.05 kg m^2", "0.05 kg m^2", "{polar!r} kg m^2"]
carried_by = "A"
spin = {{ {spin} }}
[[supports]]
at = "A"
hold = ["x", "y", "z", "rz"]
[[springs]]
between = ["A", "ground"]
stiffness = {{ rx = "{stiffness[0]!r} N m/rad", ry = "{stiffness[1]!r} N m/rad" }}
[[excitations]]
name = "drive"
speed = ["100 rpm", "1000 rpm"]
""")


@settings(max_examples=15, deadline=None)
@given(st.floats(0.005, 0.0999), st.floats(0.0, 900.0))
def test_tilt_of_a_spinning_body(polar, speed):
    """w = g W / 2 +- sqrt((g W / 2)^2 + k / It), g = Ip / It.

    Source: J. P. Den Hartog, Mechanical Vibrations, chapter on gyroscopic effects; G. Genta, Dynamics of
    Rotating Systems (2005), chapter 4; both from memory. Their product is k / It whatever the speed.
    """
    system = tilting(polar).system()
    found = at_speed(system, "rotor", speed / TURN).modes().damped_frequencies_hz * TURN
    half = polar / 0.05 * speed / 2
    far = half + np.sqrt(half**2 + 2000 / 0.05)
    np.testing.assert_allclose(found, [2000 / 0.05 / far, far], rtol=1e-11)


@pytest.mark.parametrize("ratio", [0.4, 1.8])
def test_critical_speeds_of_a_tilting_rotor(ratio):
    """w = W gives W = sqrt(k / (It - Ip)) forward and sqrt(k / (It + Ip)) backward; none forward for g > 1.

    Source: as above. Speeds to 1e-11: roots of the system, not points of a grid.
    """
    curves = speed_curves(tilting(0.05 * ratio).system(), "rotor", count=2, top_hz=80.0)
    found: dict[str, float] = {row.whirl: row.speed_hz * TURN for row in curves.critical}
    expected: dict[str, float] = {"backward": np.sqrt(2000 / (0.05 * (1 + ratio)))}
    if ratio < 1:
        expected["forward"] = np.sqrt(2000 / (0.05 * (1 - ratio)))
    assert set(found) == set(expected)
    for whirl, speed in expected.items():
        assert found[whirl] == pytest.approx(speed, rel=1e-11)
    assert curves.onset is None
    assert curves.whirls[-1] == ("backward", "forward")


def test_overhung_disc():
    """Den Hartog's disc at the end of a massless shaft: one forward critical speed, of translation and tilt.

    Source: J. P. Den Hartog, Mechanical Vibrations, gyroscopic effect on an overhung disc (from memory); the
    number from the quartic with 12 EI/L^3, 6 EI/L^2, 4 EI/L at w = W.
    """
    moment = np.pi * 0.03**4 / 64
    disc = study(f"""
[materials.shaft]
youngs_modulus = "206 GPa"
poissons_ratio = 0.3
density = "0 kg/m^3"
[sections.round]
area = "{np.pi * 0.03**2 / 4!r} m^2"
second_moment_y = "{moment!r} m^4"
second_moment_z = "{moment!r} m^4"
torsion_constant = "{2 * moment!r} m^4"
[points]
A = ["0 m", "0 m", "0 m"]
B = ["0.5 m", "0 m", "0 m"]
[[members]]
section = "round"
material = "shaft"
runs = [["A", "B"]]
[[supports]]
at = "A"
hold = "all"
[[bodies]]
name = "disc"
mass = "16 kg"
inertia = ["0.24 kg m^2", "0.12 kg m^2", "0.12 kg m^2"]
carried_by = "B"
spin = {{ axis = "x", speed = "80 Hz" }}
""")
    curves = speed_curves(disc.system(), "disc", count=4, top_hz=80.0)
    forward = [row.speed_hz * TURN for row in curves.critical if row.whirl == "forward"]
    np.testing.assert_allclose(forward, [114.68665279], rtol=1e-9)
    flat = [row.frequency_hz * TURN for row in curves.critical if row.whirl == "flat"]
    torsion = np.sqrt(206e9 / 2.6 * 2 * moment / 0.5 / 0.24)  # about the axis: the spin does not touch it
    np.testing.assert_allclose(flat, [torsion], rtol=1e-9)


def test_onset_by_internal_damping():
    """z'' + 2 (zn + zr) w z' + (w^2 - 2 i zr w W) z = 0 grows above W = w (1 + zn / zr).

    Source: A. L. Kimball, Gen. Electr. Rev. 27 (1924); G. Genta, Dynamics of Rotating Systems (from memory).
    """
    angular, outer, inner, speed = 100.0, 0.02, 0.01, 400.0
    rate, across = 2 * (outer + inner) * angular, 2 * inner * angular * speed
    given = study(f"""
[units]
mass = "kg"
stiffness = "N/m"
damping = "N s/m"
[matrices]
mass = [[1, 0], [0, 1]]
stiffness = [[1e4, 0], [0, 1e4]]
damping = [[{rate}, 0], [0, {rate}]]
circulatory = [[0, {across}], [{-across}, 0]]
speed = "{speed / TURN!r} Hz"
""").system()
    modes = given.modes()
    assert not modes.stable
    assert modes.eigenvalues[0] == pytest.approx(0.998602967091 + 100.034938025j, rel=1e-10)
    onset = speed_curves(given, "shaft", count=2, top_hz=80.0).onset
    assert onset is not None
    assert onset.speed_hz * TURN == pytest.approx(300.0, rel=1e-9)
    assert onset.frequency_hz * TURN == pytest.approx(100.0, rel=1e-9)
    assert at_speed(given, "shaft", 299.9 / TURN).modes().stable
    assert not at_speed(given, "shaft", 300.1 / TURN).modes().stable


def test_circulatory_must_be_skew():
    with pytest.raises(MatrixError, match=r"matrices\.circulatory"):
        study("""
[units]
mass = "kg"
stiffness = "N/m"
[matrices]
mass = [[1, 0], [0, 1]]
stiffness = [[2, 0], [0, 2]]
circulatory = [[0, 1], [1, 0]]
""").system()


def test_curves_of_unequal_springs():
    """Different springs about x and y: two planes at rest, and curves that part with the speed."""
    curves = speed_curves(tilting(0.02, stiffness=(2000.0, 2300.0)).system(), "rotor", count=2, top_hz=60.0)
    low, high = curves.frequencies_hz[:, 0], curves.frequencies_hz[:, 1]
    assert (np.diff(low) < 0).all()
    assert (np.diff(high) > 0).all()
    np.testing.assert_allclose(low * high * TURN**2, np.sqrt(2000 * 2300) / 0.05, rtol=1e-9)


def test_a_shaft_follows_its_excitation():
    system = tilting(0.02, spin='axis = "z", shaft = "drive", ratio = -2').system()
    (turning,) = system.rotations
    assert (turning.shaft, turning.slowest_hz * 60, turning.speed_hz * 60) == pytest.approx(
        ("drive", 100, 1000)
    )
    assert turning.bodies[0].axis == (0, 0, -1)
    same = at_speed(system, "drive", 2.0).gyroscopic
    once = at_speed(tilting(0.02).system(), "rotor", 4.0).gyroscopic
    assert same is not None
    assert once is not None
    np.testing.assert_allclose(same.toarray(), -once.toarray(), rtol=1e-14)
    with pytest.raises(ModelError, match="fan: no shaft of that name"):
        at_speed(system, "fan", 1.0)


@pytest.mark.parametrize(
    ("spin", "said"),
    [
        ('axis = "z"', "needs either speed, or shaft"),
        ('axis = "z", shaft = "drvie"', 'no excitation is named "drvie".*drive'),
        ('axis = "z", speed = "3 rpm", ratio = 2', "ratio goes with shaft"),
        ('speed = "3 rpm"', "axis.*is missing"),
    ],
)
def test_faults_of_a_spin(spin, said):
    with pytest.raises(StudyError, match=said):
        tilting(0.02, spin=spin)


@pytest.mark.parametrize("damping", [0.003, 0.01])
def test_growth_between_two_speeds_of_the_curve_is_not_missed(damping):
    """A mode of one plane feeds a forward whirl only where both have nearly the same frequency.

    The border by halving, on eigenvalues of numpy's own at many speeds.
    """
    turn = np.zeros((3, 3))
    turn[1, 2], turn[2, 1] = 0.4, -0.4  # per rad/s of the shaft
    stiffness = np.diag([100.0, 64.0, 64.0])
    stiffness[0, 1], stiffness[1, 0] = 1.5, -1.5

    def top(speed_hz: float) -> float:
        state = np.zeros((6, 6))
        state[:3, 3:] = np.eye(3)
        state[3:, :3], state[3:, 3:] = -stiffness, -damping * np.eye(3) - TURN * speed_hz * turn
        return float(np.linalg.eigvals(state).real.max())

    speeds = np.linspace(0.0, 20.0, 8001)
    first = speeds[int(np.argmax([top(speed) > 1e-7 for speed in speeds]))]
    assert top(0.0) < 1e-7
    assert top(20.0) < 1e-7
    given = System(
        mass=np.eye(3),
        damping=damping * np.eye(3),
        stiffness=stiffness,
        gyroscopic=TURN * 20.0 * turn,
        unsymmetric=True,
        rotations=(Rotation("shaft", 20.0, 0.0, turn, None),),
    )
    assert given.modes().stable
    onset = speed_curves(given, "shaft", count=3, top_hz=20.0).onset
    assert onset is not None
    assert onset.speed_hz == pytest.approx(first, abs=4e-3)


def test_what_turning_alone_holds_up_grows_from_rest():
    turn = np.array([[0.0, 1.0], [-1.0, 0.0]])
    given = System(
        mass=np.eye(2),
        stiffness=-np.eye(2),
        gyroscopic=TURN * 5.0 * turn,
        rotations=(Rotation("shaft", 5.0, 0.0, turn, None),),
    )
    assert given.modes().stable
    onset = speed_curves(given, "shaft", count=2, top_hz=5.0).onset
    assert onset is not None
    assert onset.speed_hz < 0.01
