"""Modes of matrices against closed forms and published examples.

Sources are named beside each case; the numbers were recomputed for the project's reference collection (closed
forms in 40 to 80 digits), whose entry is given in brackets.
"""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest

import vib
from vib.errors import AccuracyError, MatrixError, ModelError, ShapeError, UnitError
from vib.modes import assurance
from vib.system import DampingLaw, Freedom, System

TAU = 2 * np.pi


def chain(springs, masses):
    """Ground - spring - mass - spring - ... ; a spring beyond the last mass goes to ground."""
    springs = np.asarray(springs, dtype=float)
    size = len(masses)
    last = springs[size] if len(springs) > size else 0.0
    stiffness = np.diag(springs[:size] + np.append(springs[1:size], last))
    stiffness -= np.diag(springs[1:size], 1) + np.diag(springs[1:size], -1)
    return {"mass": np.diag(np.asarray(masses, dtype=float)), "stiffness": stiffness}


TWO = chain([18000.0, 7000.0, 2500.0], [12.0, 5.0])  # [MDOF-2]

ANGULAR: dict[str, tuple[dict[str, Any], Any, float]] = {
    # Rayleigh, Theory of Sound (loaded string): 2 sin((2 j - 1) pi / (2 (2 N + 1))) [MDOF-CHAIN-FREE]
    "free end, 3": (chain([1, 1, 1], [1, 1, 1]), [0.44504186791263, 1.2469796037175, 1.8019377358048], 1e-12),
    "free end, 5": (
        chain([1] * 5, [1] * 5),
        [0.28462967654657, 0.83083002600377, 1.3097214678906, 1.6825070656624, 1.918985947229],
        1e-12,
    ),
    # Rayleigh, Theory of Sound: 2 sin(j pi / (2 (N + 1))) [MDOF-CHAIN-FIX]
    "both ends held, 5": (
        chain([1] * 6, [1] * 5),
        [0.51763809020504, 1.0, 1.4142135623731, 1.7320508075689, 1.9318516525781],
        1e-12,
    ),
    # closed form of the two-mass chain [MDOF-2]
    "two masses": (TWO, [32.9140294302, 53.8516480713], 1e-11),
    # closed form of the free three-mass chain [MDOF-FF3]
    "free, 3": (chain([0, 500, 800], [3, 2, 4]), [0.0, 13.38236011501, 28.9409589409], 1e-11),
    # Rayleigh, Theory of Sound: 2 sin(j pi / (2 N)) [MDOF-FFN]
    "free, 6": (
        chain([0, 1, 1, 1, 1, 1], [1] * 6),
        [0.0, 0.51763809020504, 1.0, 1.4142135623731, 1.7320508075689, 1.9318516525781],
        1e-12,
    ),
    # A. K. Chopra, Dynamics of Structures, worked example of the two-storey frame (from memory) [TEXT-1]
    "two storeys": (chain([2, 1], [2, 1]), [0.707106781187, 1.41421356237], 1e-11),
    # R. W. Clough, J. Penzien, Dynamics of Structures, worked example, three-storey frame (from memory);
    # kip, inch: top to bottom 1.0, 1.5, 2.0 kip s^2/in on 600, 1200, 1800 kip/in [TEXT-2]
    "three storeys": (
        chain([1800, 1200, 600], [2.0, 1.5, 1.0]),
        [14.52166783, 31.04769646, 46.09947622],
        1e-9,
    ),
    # J. Mikota, ZAMM 81 (2001) S201-S202: exactly 1, 2, ..., 6 [MDOF-INT]
    "whole numbers": (chain([6, 5, 4, 3, 2, 1], 1 / np.arange(1.0, 7)), [1, 2, 3, 4, 5, 6], 1e-12),
}


@pytest.mark.parametrize("name", ANGULAR)
def test_undamped_closed_forms(name):
    matrices, expected, rtol = ANGULAR[name]
    modes = System(**matrices).modes()
    found = modes.frequencies_hz * TAU
    np.testing.assert_allclose(found, expected, rtol=rtol, atol=0)  # rtol: digits of the reference
    assert modes.rigid_body_count == int(expected[0] == 0)
    assert (np.abs(found - expected) <= modes.errors_hz * TAU + rtol * np.asarray(expected)).all()
    assert modes.proportional
    assert modes.stable
    assert np.isrealobj(modes.shapes)
    assert modes.complete_below_hz is not None
    assert modes.complete_below_hz >= modes.frequencies_hz[-1]
    np.testing.assert_array_equal(np.isnan(modes.damping_ratios), np.asarray(expected) == 0)
    # Unit modal mass and no coupling, to a few round-off units per freedom.
    modal = modes.shapes.T @ modes.system.mass @ modes.shapes
    np.testing.assert_allclose(modal, np.eye(len(expected)), atol=1e-13)


@pytest.mark.parametrize("n", [1, 6, 50, 149])
def test_chain_with_integer_frequencies(n):
    """Masses 1, 1/2, ..., 1/n on springs n, ..., 1 vibrate at exactly 1, 2, ..., n rad/s.

    Source: J. Mikota, ZAMM 81 (2001) S201-S202; see also PAMM 6 (2006) 319-320, doi:10.1002/pamm.200610141.
    """
    modes = System(**chain(np.arange(n, 0, -1.0), 1 / np.arange(1.0, n + 1))).modes()
    rtol = 8 * n**2 * np.finfo(float).eps  # largest over smallest eigenvalue is n**2; margin 8
    exact = np.arange(1, n + 1) / TAU
    np.testing.assert_allclose(modes.frequencies_hz, exact, rtol=rtol)
    assert (np.abs(modes.frequencies_hz - exact) <= modes.errors_hz).all()
    assert (modes.errors_hz <= 1e-9 * exact).all()


@pytest.mark.parametrize(
    ("n", "squares"), [(3, [0, 3, 3]), (4, [0, 2, 2, 4]), (6, [0, 1, 1, 3, 3, 4])], ids=["3", "4", "6"]
)
def test_ring_of_masses_has_repeated_pairs(n, squares):
    """w_j^2 = 4 sin^2(pi j / N), a circulant matrix [MDOF-RING]."""
    stiffness = 2 * np.eye(n) - np.roll(np.eye(n), 1, axis=0) - np.roll(np.eye(n), -1, axis=0)
    modes = System(mass=np.eye(n), stiffness=stiffness).modes()
    np.testing.assert_allclose((modes.frequencies_hz * TAU) ** 2, squares, rtol=1e-13)
    np.testing.assert_allclose(modes.shapes @ modes.shapes.T, np.eye(n), atol=1e-13)


def test_text_shapes():
    """Chopra, two-storey frame: [1/2, 1] and [-1, 1] [TEXT-1]; Clough & Penzien, first shape [TEXT-2]."""
    shapes = System(**chain([2, 1], [2, 1])).modes().shapes
    np.testing.assert_allclose(shapes[0] / shapes[1], [0.5, -1.0], rtol=1e-13)
    first = System(**chain([1800, 1200, 600], [2.0, 1.5, 1.0])).modes().shapes[:, 0]
    np.testing.assert_allclose(first[::-1] / first[2], [1.0, 0.648535, 0.30185], atol=5e-7)  # printed digits


def test_block_on_corner_springs():
    """Harris & Crede (eds.), Shock and Vibration Handbook: resiliently supported rigid body [MDOF-BLOCK]."""
    inertia = np.diag([600.0, 600.0, 600.0, 50.0, 90.0, 104.0])
    stiffness = np.zeros((6, 6))
    for x in (-0.5, 0.5):
        for y in (-0.3, 0.3):
            arm = np.array([[0, -0.3, -y], [0.3, 0, x], [y, -x, 0]])  # displacement by a rotation r: r x arm
            follow = np.hstack([np.eye(3), arm])
            stiffness += follow.T @ np.diag([1.2e5, 1.2e5, 2e5]) @ follow
    expected = sorted(
        [5.81151683133, 6.3046871244, 3.94993098685, 8.55046024683, 3.3040347709, 8.22852312017]
    )
    np.testing.assert_allclose(
        System(mass=inertia, stiffness=stiffness).modes().frequencies_hz, expected, rtol=1e-10
    )


def test_rayleigh_damping():
    """Rayleigh, Theory of Sound: ratio a / (2 w) + b w / 2 [MDOF-RAYL]."""
    modes = System(**TWO, damping=0.8 * TWO["mass"] + 0.0004 * TWO["stiffness"]).modes()
    poles = [-0.61666666666667 + 32.908252089036j, -0.98 + 53.84273024281j]
    np.testing.assert_allclose(modes.damping_ratios, [0.018735678291048, 0.018198143141351], rtol=1e-11)
    np.testing.assert_allclose(modes.eigenvalues, poles, rtol=1e-11)
    np.testing.assert_allclose(
        modes.damped_frequencies_hz * TAU, [32.908252089036, 53.84273024281], rtol=1e-11
    )
    assert modes.proportional
    assert "0.8 1/s times the mass and 0.0004 s times the stiffness" in modes.damping_note


def pairs(*values):
    return np.array([complex(*value) for value in values])


DAMPED: dict[str, tuple[dict[str, Any], Any, float]] = {
    # Quartic det(s^2 M + s C + K) = 0, own data, 80 digits [MDOF-NP1], [MDOF-NP2], [MDOF-NP3]
    "dashpot to ground": (
        {"mass": [[2, 0], [0, 1]], "damping": [[0, 0], [0, 0.9]], "stiffness": [[35, -15], [-15, 15]]},
        pairs((-0.253843168412029, 2.3575656944206), (-0.196156831587971, 5.1613755776168)),
        1e-12,
    ),
    "two dashpots": (
        {
            "mass": [[1.5, 0], [0, 0.8]],
            "damping": [[2.1, -1.7], [-1.7, 1.7]],
            "stiffness": [[60, -20], [-20, 20]],
        },
        pairs((-0.22802253245903, 3.60377640870823), (-1.53447746754097, 6.98378587418061)),
        1e-12,
    ),
    "one pair, two real": (
        {"mass": np.eye(2), "damping": [[9, -9], [-9, 9.3]], "stiffness": [[50, -20], [-20, 30]]},
        pairs((-4.0237548833921, 0), (-0.200145966270845, 4.43411755277461), (-13.8759531840662, 0)),
        1e-12,
    ),
    # Quadratic formula [MDOF-OD1]
    "overdamped": (
        {"mass": [[2]], "damping": [[30]], "stiffness": [[40]]},
        pairs((-1.4792027106039, 0), (-13.520797289396, 0)),
        1e-12,
    ),
    # Own data; test of F. Tisseur, K. Meerbergen, SIAM Review 43 (2001) 235, for all real [MDOF-OD2]
    "overdamped, 2": (
        {"mass": [[1, 0], [0, 2]], "damping": [[25, -5], [-5, 30]], "stiffness": [[30, -10], [-10, 40]]},
        pairs((-1.16448397204768, 0), (-1.52103646032114, 0), (-12.5275892039034, 0), (-24.7868903637278, 0)),
        1e-12,
    ),
    # Frequencies 0.22 and 1e5 rad/s in one system, own data, 80 digits [QEP-SCALE]
    "badly scaled": (
        {
            "mass": [[1e-3, 0], [0, 1e3]],
            "damping": [[0.5, -0.1], [-0.1, 20.1]],
            "stiffness": [[10000010, -10], [-10, 50]],
        },
        pairs((-0.01004999990001, 0.22338081274378), (-250.0000000001, 99999.737499605)),
        1e-12,
    ),
}


@pytest.mark.parametrize("name", DAMPED)
def test_damped_closed_forms(name):
    matrices, expected, rtol = DAMPED[name]
    modes = System(**matrices).modes()
    np.testing.assert_allclose(modes.eigenvalues.real, expected.real, rtol=rtol * 10)
    np.testing.assert_allclose(modes.eigenvalues.imag, expected.imag, rtol=rtol * 10)
    np.testing.assert_allclose(modes.damping_ratios, -expected.real / np.abs(expected), rtol=rtol * 10)
    # The error bars are honest: they cover the difference (but for the last digit of the reference).
    gap = np.abs(modes.frequencies_hz * TAU - np.abs(expected))
    assert (gap <= modes.errors_hz * TAU + rtol * np.abs(expected)).all()
    assert (modes.errors_hz <= 1e-10 * modes.frequencies_hz).all()
    assert modes.stable


def test_complex_shape():
    """x2 / x1 of the modes of [MDOF-NP1]."""
    modes = System(**DAMPED["dashpot to ground"][0]).modes()
    expected = pairs((1.6008427134187, -0.15958718549633), (-1.2135093800854, -0.26998375465089))
    np.testing.assert_allclose(modes.shapes[1] / modes.shapes[0], expected, rtol=1e-12)
    largest = modes.shapes[np.argmax(np.abs(modes.shapes), axis=0), [0, 1]]
    assert (largest.imag == 0).all()
    assert (largest.real > 0).all()
    assert not modes.proportional


@pytest.mark.parametrize(("n", "tau", "pairs_"), [(5, 3.0, 2), (50, 3.0, 19), (50, 10.0, 0)])
def test_chain_of_dashpots(n, tau, pairs_):
    """F. Tisseur, K. Meerbergen, SIAM Review 43 (2001) 235-286: connected damped mass-spring system.

    Closed form s = (-tau t +- sqrt(tau^2 t^2 - 20 t)) / 2, t = 3 - 2 cos(j pi / (n + 1)) [QEP-CHAIN-*].
    """
    band = 3 * np.eye(n) - np.eye(n, k=1) - np.eye(n, k=-1)
    modes = System(mass=np.eye(n), damping=tau * band, stiffness=5 * band).modes()
    t = 3 - 2 * np.cos(np.arange(1, n + 1) * np.pi / (n + 1))
    root = np.sqrt((tau * t) ** 2 - 20 * t + 0j)
    exact = np.concatenate([(-tau * t + root) / 2, (-tau * t - root) / 2])
    exact = exact[exact.imag >= 0]
    assert (modes.eigenvalues.imag > 0).sum() == pairs_
    assert len(modes.eigenvalues) == 2 * n - pairs_ == len(exact)
    distance = np.abs(modes.eigenvalues[:, None] - exact)
    # The nearest pair to critical damping has condition number about 35, times n round-off units, margin 10.
    assert distance.min(axis=1).max() <= 350 * n * np.finfo(float).eps * np.abs(exact).max()
    assert distance.min(axis=0).max() <= 350 * n * np.finfo(float).eps * np.abs(exact).max()


def beam_matrices(count, stiffness, line_mass, length):
    """Pinned beam of cubic elements; freedoms: rotation, then (deflection, rotation) ..., rotation."""
    step = length / count
    k = stiffness / step**3 * np.array(
        [[12, 6 * step, -12, 6 * step], [6 * step, 4 * step**2, -6 * step, 2 * step**2],
         [-12, -6 * step, 12, -6 * step], [6 * step, 2 * step**2, -6 * step, 4 * step**2]]
    )  # fmt: skip
    m = line_mass * step / 420 * np.array(
        [[156, 22 * step, 54, -13 * step], [22 * step, 4 * step**2, 13 * step, -3 * step**2],
         [54, 13 * step, 156, -22 * step], [-13 * step, -3 * step**2, -22 * step, 4 * step**2]]
    )  # fmt: skip
    whole_k, whole_m = np.zeros((2, 2 * count + 2, 2 * count + 2))
    for e in range(count):
        whole_k[2 * e : 2 * e + 4, 2 * e : 2 * e + 4] += k
        whole_m[2 * e : 2 * e + 4, 2 * e : 2 * e + 4] += m
    keep = [i for i in range(2 * count + 2) if i not in (0, 2 * count)]
    return whole_m[np.ix_(keep, keep)], whole_k[np.ix_(keep, keep)]


def test_beam_with_dashpot_at_midspan():
    """N. J. Higham et al., Int. J. Numer. Meth. Engng 73 (2008) 344-360 (damped beam; data from memory).

    Eight cubic elements: the antisymmetric modes do not feel the dashpot. Values in 40 digits [QEP-BEAM].
    """
    mass, stiffness = beam_matrices(8, 36.4583333333, 0.674, 1.0)
    damping = np.zeros((16, 16))
    damping[7, 7] = 5.0  # the deflection of the middle node
    modes = System(mass=mass, damping=damping, stiffness=stiffness).modes()
    first = pairs((-7.423458726917, 72.23175505457), (0, 290.4296485799), (-7.455122388429, 653.9584198289),
                  (0, 1166.001011415), (-7.703860958145, 1831.419365736), (0, 2660.937836881))  # fmt: skip
    last = pairs((-0.9683726215672, 22379.25698118), (0, 23629.18278172))
    # Round-off relative to the size of each eigenvalue, times the condition of the matrices, about 1e3.
    np.testing.assert_allclose(modes.eigenvalues[:6], first, rtol=1e-11)
    np.testing.assert_allclose(modes.eigenvalues[-2:], last, rtol=1e-11)
    assert modes.stable  # a zero real part is not an unstable one


def test_one_mhz_and_one_mhz():
    """A mode at 1 mHz beside one at 1 MHz, weakly coupled: both are modes, both to full accuracy.

    Exact: roots of the characteristic quadratic, the small one from the product of the two.
    """
    soft, stiff = (TAU * 1e-3) ** 2, (TAU * 1e6) ** 2
    coupling = 1e-3 * np.sqrt(soft * stiff)
    modes = System(mass=np.eye(2), stiffness=[[stiff, coupling], [coupling, soft]]).modes()
    assert modes.rigid_body_count == 0
    exact = np.sqrt([soft * (1 - 1e-6), stiff]) / TAU  # corrections are soft / stiff = 1e-18
    np.testing.assert_allclose(modes.frequencies_hz, exact, rtol=1e-14)
    assert (modes.errors_hz <= 1e-13 * exact).all()


def test_soft_spring_to_ground_is_no_rigid_body_mode():
    """Two masses on a stiff spring, held by a spring 1e-11 as stiff: a mode with an honest error bar."""
    stiff, soft = 1e9, 1e-2
    modes = System(mass=np.eye(2), stiffness=[[stiff + soft, -stiff], [-stiff, stiff]]).modes()
    assert modes.rigid_body_count == 0
    exact = np.sqrt(soft / 2) / TAU
    assert abs(modes.frequencies_hz[0] - exact) <= modes.errors_hz[0]
    assert (
        1e-7 * exact < modes.errors_hz[0] < 1e-3 * exact
    )  # the entry 1e9 + 0.01 itself holds 5 digits of it


@pytest.mark.parametrize("scale", [1e-12, 1.0, 1e15])
def test_rigid_bodies_at_any_scale(scale):
    matrices = chain([0, 1, 1, 1], [1, 1, 1, 1])
    modes = System(mass=matrices["mass"], stiffness=scale * matrices["stiffness"]).modes()
    assert modes.rigid_body_count == 1
    assert modes.eigenvalues[0] == 0
    assert modes.rigid_descriptions == ("1, 2, 3 and 4 can move freely",)


def test_two_mechanisms_are_told_apart():
    stiffness = np.zeros((4, 4))
    stiffness[:2, :2] = stiffness[2:, 2:] = [[1, -1], [-1, 1]]
    modes = System(mass=np.diag([1.0, 2, 3, 4]), stiffness=stiffness).modes()
    assert modes.rigid_body_count == 2
    assert set(modes.rigid_descriptions) == {"1 and 2 can move freely", "3 and 4 can move freely"}
    np.testing.assert_allclose(modes.shapes.T @ modes.system.mass @ modes.shapes, np.eye(4), atol=1e-14)


def test_free_mass_with_dashpot_to_ground():
    """0 (it can stand anywhere) and -c / m (it comes to rest)."""
    modes = System(mass=[[4.0]], damping=[[6.0]], stiffness=[[0.0]]).modes()
    np.testing.assert_array_equal(modes.eigenvalues, [0, -1.5])
    assert modes.rigid_body_count == 1
    assert np.isnan(modes.damping_ratios[0])
    assert modes.damping_ratios[1] == 1


def test_free_pair_with_one_dashpot_to_ground():
    """x1'' + 2 x1' + x1 - x2 = 0, x2'' + x2 - x1 = 0: s (s^3 + 2 s^2 + 2 s + 2) = 0."""
    modes = System(mass=np.eye(2), damping=[[2.0, 0], [0, 0]], stiffness=[[1.0, -1], [-1, 1]]).modes()
    exact = np.roots([1, 2, 2, 2])
    exact = np.concatenate([[0], sorted(exact[exact.imag >= 0], key=abs)])
    np.testing.assert_allclose(modes.eigenvalues, exact, rtol=1e-14, atol=1e-15)
    assert modes.rigid_body_count == 1
    assert not modes.proportional


@pytest.mark.parametrize("mass", [1.0, 0.37])
def test_critical_damping(mass):
    """A double real eigenvalue: both are there, the error bar is the square root of round-off."""
    modes = System(mass=[[mass]], damping=[[2 * mass * 3.0]], stiffness=[[9.0 * mass]]).modes()
    np.testing.assert_allclose(modes.eigenvalues, [-3.0, -3.0], rtol=1e-15)
    np.testing.assert_array_equal(modes.damping_ratios, [1.0, 1.0])
    assert np.isinf(modes.condition).all()
    assert (modes.errors_hz > 1e-9).all()


def test_nearly_critical_damping():
    """(s + 1)^2 in one coordinate and an undamped oscillator in another, coupled gyroscopically by 1e-3."""
    cos, sin = np.cos(0.4), np.sin(0.4)
    turn = np.array([[cos, -sin], [sin, cos]])
    damping, stiffness = (turn @ np.diag(d) @ turn.T for d in ([2.0, 0.0], [1.0, 9.0]))
    mass = np.eye(2)
    skew = np.array([[0, 1e-3], [-1e-3, 0]])  # so that the general solver is used
    modes = System(mass=mass, damping=damping, gyroscopic=skew, stiffness=stiffness).modes()
    assert len(modes.eigenvalues) in (2, 3)
    assert modes.condition.max() > 100
    # (s + 1)^2 = -(1e-3 s)^2 / (s^2 + 9), at s = -1: it splits by 3.2e-4, and next terms are 1e-3 of that.
    near = modes.eigenvalues[np.abs(modes.eigenvalues + 1) < 0.01]
    np.testing.assert_allclose(np.abs(near + 1), np.sqrt(1e-6 / 10), rtol=2e-3)


# Den Hartog, Mechanical Vibrations; G. Genta, Dynamics of Rotating Systems (theory). Closed forms [ROT-TILT].
TILT = [(1.8, 100.0, 309.317121995, 129.317121995), (1.8, 300.0, 606.005952328, 66.0059523282),
        (1.8, 600.0, 1115.84720196, 35.8472019555), (0.4, 300.0, 268.806130178, 148.806130178),
        (0.4, 0.0, 200.0, 200.0)]  # fmt: skip


@pytest.mark.parametrize(("gamma", "speed", "forward", "backward"), TILT)
def test_tilting_rotor(gamma, speed, forward, backward):
    spin = gamma * 0.05 * speed
    modes = System(
        mass=0.05 * np.eye(2), gyroscopic=[[0, spin], [-spin, 0]], stiffness=2000 * np.eye(2)
    ).modes()
    np.testing.assert_allclose(modes.frequencies_hz * TAU, [backward, forward], rtol=1e-10)
    np.testing.assert_allclose(modes.damping_ratios, [0, 0], atol=1e-15)
    assert modes.stable


def test_rigid_rotor_on_two_bearings():
    """Quartic of G. Genta, Dynamics of Rotating Systems (theory), own data [ROT-RIGID]."""
    m, a, b, k1, k2, diametral, polar, speed = 40, 0.25, 0.35, 2e6, 1.5e6, 1.1, 0.5, 400
    k11, k12, k22 = k1 + k2, k2 * b - k1 * a, k1 * a**2 + k2 * b**2
    stiffness = np.zeros((4, 4))  # y, angle in its plane, z, angle in its plane
    stiffness[:2, :2] = stiffness[2:, 2:] = [[k11, k12], [k12, k22]]
    gyroscopic = np.zeros((4, 4))
    gyroscopic[1, 3], gyroscopic[3, 1] = polar * speed, -polar * speed
    inertia = np.diag([m, diametral, m, diametral])
    modes = System(mass=inertia, gyroscopic=gyroscopic, stiffness=stiffness).modes()
    expected = sorted([446.746016478, 295.631863852, 295.706768091, 628.489294057])
    np.testing.assert_allclose(modes.frequencies_hz * TAU, expected, rtol=1e-9)


# A. L. Kimball, Gen. Electr. Rev. 27 (1924): internal damping; unstable above 300 rad/s [ROT-INT].
INTERNAL = [(0.0, -3.0, 99.9549898704, -3.0), (200.0, -0.999500012592, 99.9750068777, -5.00049998741),
            (300.0, 0.0, 100.0, -6.0), (400.0, 0.998602967091, 100.034938025, -6.99860296709)]  # fmt: skip


@pytest.mark.parametrize(("speed", "slow", "imaginary", "fast"), INTERNAL)
def test_rotor_with_internal_damping(speed, slow, imaginary, fast):
    cross = 2 * 0.01 * 100 * speed
    modes = System(
        mass=np.eye(2), damping=6 * np.eye(2), stiffness=[[1e4, cross], [-cross, 1e4]], unsymmetric=True
    ).modes()
    order = np.argsort(-modes.eigenvalues.real)
    np.testing.assert_allclose(modes.eigenvalues.real[order], [slow, fast], rtol=1e-10, atol=1e-9)
    np.testing.assert_allclose(modes.eigenvalues.imag, imaginary, rtol=1e-10)
    assert modes.stable == (speed <= 300)
    assert (modes.damping_ratios < -1e-6).any() == (speed > 300)


@pytest.mark.parametrize("drag", [0.0, 0.1])
def test_free_motion_of_an_unsymmetric_stiffness(drag):
    """K (1, 1) = 0, K not symmetric: s^2 (s^2 + 2.5); with drag s (s + d) (s^2 + d s + 2.5)."""
    modes = System(
        mass=np.eye(2), damping=drag * np.eye(2), stiffness=[[1.0, -1], [-1.5, 1.5]], unsymmetric=True
    ).modes()
    exact = [0, *([-drag] if drag else []), -drag / 2 + 1j * np.sqrt(2.5 - drag**2 / 4)]
    np.testing.assert_allclose(modes.eigenvalues, exact, rtol=1e-14, atol=1e-14)
    assert modes.rigid_body_count == 1
    assert modes.eigenvalues[0] == 0
    assert modes.stable


def test_overhung_disc():
    """Den Hartog, Mechanical Vibrations (overhung disc) [ROT-OVH], rows of 200 and 500 rad/s."""
    bending, length, inertia, polar = 206e9 * np.pi * 0.03**4 / 64, 0.5, 0.12, 0.24
    plane = bending * np.array([[12 / length**3, -6 / length**2], [-6 / length**2, 4 / length]])
    rows = {
        200.0: [605.82963936, 94.103277828, 120.09810119, 979.83481599],
        500.0: [459.36579215, 76.069092338, 137.32025821, 1398.1146263],
    }
    for speed, expected in rows.items():
        gyroscopic = np.zeros((4, 4))
        gyroscopic[1, 3], gyroscopic[3, 1] = polar * speed, -polar * speed
        modes = System(
            mass=np.diag([16, inertia, 16, inertia]),
            gyroscopic=gyroscopic,
            stiffness=np.kron(np.eye(2), plane),
        ).modes()
        np.testing.assert_allclose(modes.frequencies_hz * TAU, sorted(expected), rtol=1e-9)


def test_buckled_stiffness_is_unstable():
    modes = System(mass=np.eye(2), stiffness=np.diag([4.0, -9.0])).modes()
    np.testing.assert_array_equal(np.sort(modes.eigenvalues.real), [-3, 0, 3])
    assert not modes.stable
    assert -1 in modes.damping_ratios


def test_negative_damping_is_unstable():
    modes = System(mass=[[1.0]], damping=[[-0.2]], stiffness=[[1.0]]).modes()
    np.testing.assert_allclose(modes.damping_ratios, [-0.1], rtol=1e-15)
    assert not modes.stable


def test_singular_mass():
    """One mass felt by both freedoms: w^2 = det K / (k11 + k22 - 2 k12); nothing spurious at infinity."""
    modes = System(mass=[[1.0, 1], [1, 1]], stiffness=[[3.0, 1], [1, 2]]).modes()
    np.testing.assert_allclose(modes.frequencies_hz, [np.sqrt(5 / 3) / TAU], rtol=1e-14)


def test_massless_dashpot_gives_a_real_eigenvalue():
    """Maxwell element: (s^2 + 4 + 1)(3 s + 1) - 1 = 0."""
    modes = System(mass=[[1.0, 0], [0, 0]], damping=[[0, 0], [0, 3]], stiffness=[[5.0, -1], [-1, 1]]).modes()
    exact = np.roots([3.0, 1.0, 15.0, 4.0])
    exact = np.array(sorted(exact[exact.imag >= 0], key=abs))
    np.testing.assert_allclose(modes.eigenvalues, exact, rtol=1e-13, atol=1e-14)


def test_massless_with_stiffness_proportional_damping():
    """C = b K: every undamped mode with ratio b w / 2, and the massless motion at -1 / b."""
    stiffness = np.array([[2.0, -1], [-1, 1]])
    modes = System(mass=[[0.0, 0], [0, 1]], damping=0.1 * stiffness, stiffness=stiffness).modes()
    np.testing.assert_allclose(modes.frequencies_hz * TAU, [np.sqrt(0.5), 10.0], rtol=1e-14)
    np.testing.assert_allclose(modes.damping_ratios, [0.05 * np.sqrt(0.5), 1.0], rtol=1e-13)


def test_nothing_holds_a_massless_motion():
    with pytest.raises(MatrixError, match=r"row 2 \(b x\), row 3 \(c x\) can move together"):
        System(
            mass=np.diag([1.0, 0, 0]), stiffness=[[1.0, 0, 0], [0, 1, -1], [0, -1, 1]],
            freedoms=(Freedom("a", "x"), Freedom("b", "x"), Freedom("c", "x")),
        ).modes()  # fmt: skip


def test_effective_mass():
    """Sum rule of Clough & Penzien and Chopra, Dynamics of Structures [EFFM-1]."""
    modes = System(**TWO).modes()
    effective = modes.effective_mass_along([1.0, 1.0])
    np.testing.assert_allclose(effective, [15.8532110092, 1.14678899083], rtol=1e-11)
    assert effective.sum() == pytest.approx(17.0, rel=1e-14)
    with pytest.raises(ShapeError, match="vector"):
        modes.effective_mass_along([1.0])


def test_modal_assurance():
    """R. J. Allemang, D. L. Brown, Proc. 1st Int. Modal Analysis Conf. (1982) 110-116 [MAC-1], [MAC-2]."""
    assert assurance([1, 2, 3], [1, 2, 2.5])[0, 0] == pytest.approx(0.992063492063, rel=1e-10)
    c, d = pairs((1, 0), (0.5, 0.2), (-1, 0.1)), pairs((0, 1), (-0.2, 0.5), (-0.3, -0.8))
    assert assurance(c, d)[0, 0] == pytest.approx(0.977787343952, rel=1e-10)
    assert assurance([1, 2, 3], [-7, -14, -21])[0, 0] == pytest.approx(1, rel=1e-14)
    modes = System(**TWO).modes()
    np.testing.assert_allclose(modes.assurance(modes), [[1, 0.168113709564], [0.168113709564, 1]], rtol=1e-10)
    with pytest.raises(ShapeError, match="shapes"):
        modes.assurance(np.ones((3, 1)))


def test_ratio_for_all_modes_and_in_bands():
    law = DampingLaw(ratio=0.01, bands=((0.0, 6.0, 0.02), (6.0, 9.0, 0.005)))
    modes = System(**TWO, damping_law=law).modes()  # 5.24 Hz and 8.57 Hz
    np.testing.assert_allclose(modes.damping_ratios, [0.03, 0.015], rtol=1e-13)
    np.testing.assert_allclose(modes.frequencies_hz, System(**TWO).modes().frequencies_hz, rtol=1e-14)
    assert "ratio 0.01 in every mode and ratio 0.02 from 0 Hz to 6 Hz" in modes.damping_note


def test_ratio_and_rayleigh_add_up():
    damping = 0.8 * TWO["mass"]
    modes = System(**TWO, damping=damping, damping_law=DampingLaw(ratio=0.01)).modes()
    alone = System(**TWO, damping=damping).modes()
    np.testing.assert_allclose(modes.damping_ratios, alone.damping_ratios + 0.01, rtol=1e-12)


def test_proportional_in_spite_of_its_looks():
    """K inv(M) K is proportional (T. K. Caughey 1960); the ratio of a mode is w^3 / 2 times its factor."""
    damping = 1e-9 * TWO["stiffness"] @ np.linalg.solve(TWO["mass"], TWO["stiffness"])
    modes = System(**TWO, damping=(damping + damping.T) / 2).modes()
    assert modes.proportional
    np.testing.assert_allclose(modes.damping_ratios, 0.5e-9 * (modes.frequencies_hz * TAU) ** 3, rtol=1e-12)


def test_repeated_frequencies_are_turned_to_the_damping():
    """Equal oscillators with a dashpot across: one pair of shapes, (1, 1) undamped and (1, -1) damped."""
    modes = System(mass=np.eye(2), damping=[[0.1, -0.1], [-0.1, 0.1]], stiffness=4 * np.eye(2)).modes()
    assert modes.proportional
    np.testing.assert_allclose(np.sort(modes.damping_ratios), [0, 0.05], atol=1e-15)


def test_limits():
    system = System(**chain([1] * 6, [1] * 5))  # 0.0824, 0.159, 0.225, 0.276, 0.307 Hz
    assert system.modes(count=2).count == 2
    assert system.modes(up_to=0.2).count == 2
    assert system.modes(up_to="0.2 Hz").count == 2
    assert system.modes(up_to="12 rpm").count == 2
    assert system.modes(count=1, up_to=0.2).count == 1
    assert system.modes(up_to=0.01).count == 0
    assert system.modes(count=99).count == 5
    two = system.modes(count=2)
    assert two.frequencies_hz[1] < two.complete_below_hz < system.modes().frequencies_hz[2]


@pytest.mark.parametrize(
    ("limits", "error"),
    [
        ({"count": 0}, ModelError),
        ({"count": 2.5}, ModelError),
        ({"count": True}, ModelError),
        ({"up_to": -1.0}, ModelError),
        ({"up_to": float("nan")}, ModelError),
        ({"up_to": "5 kg"}, UnitError),
    ],
)
def test_limits_that_are_none(limits, error):
    with pytest.raises(error):
        System(**TWO).modes(**limits)


def test_all_modes_of_too_large_a_system():
    import scipy.sparse as sparse

    with pytest.raises(AccuracyError, match="ask for a count"):
        System(mass=sparse.eye_array(6000), stiffness=sparse.eye_array(6000)).modes()


def test_public_name():
    assert vib.Modes is type(System(**TWO).modes())
