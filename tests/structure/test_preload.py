"""Axial preload and belt pull: frequencies, buckling, and the geometric stiffness itself."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tests.references.common import study
from vib.errors import ModelError
from vib.structure.beam import Bars
from vib.structure.preload import geometric_stiffness

LENGTH, MOMENT, AREA = 4.0, 1e-8, 1e-4  # m, m^4, m^2
EULER = np.pi**2 * 2.1e11 * MOMENT / LENGTH**2


def strut(share):
    """A pinned strut with a pull of ``share`` times the Euler load."""
    return study(f"""
accuracy = 1e-4
[materials.m]
youngs_modulus = "210 GPa"
poissons_ratio = 0.3
density = "7850 kg/m^3"
[sections.s]
area = "{AREA!r} m^2"
second_moment_y = "{MOMENT!r} m^4"
second_moment_z = "{40 * MOMENT!r} m^4"
torsion_constant = "{MOMENT!r} m^4"
[points]
A = ["0 m", "0 m", "0 m"]
B = ["{LENGTH!r} m", "0 m", "0 m"]
[[members]]
section = "s"
material = "m"
runs = [["A", "B"]]
tension = "{share * EULER!r} N"
[[supports]]
at = "A"
hold = ["x", "y", "z", "rx", "rz"]
[[supports]]
at = "B"
hold = ["y", "z", "rx", "rz"]
""")


@pytest.mark.parametrize("share", [-0.9, -0.5, 0.5, 1.0, 10.0])
def test_pull_along_a_pinned_beam(share):
    """w_n / w_n0 = sqrt(1 + p / n^2), p in Euler loads.

    Source: S. P. Timoshenko, Vibration Problems in Engineering, effect of axial forces (from memory);
    closed form, with Rayleigh's rotary inertia: w^2 over 1 + (n pi / L)^2 I / A. Slack: the accuracy asked.
    """
    modes = strut(share).system().modes(count=6)
    assert modes.stable
    flat = np.sqrt(2.1e11 * MOMENT / (7850 * AREA)) * np.pi**2 / LENGTH**2 / (2 * np.pi)
    for n in (1, 2, 3):
        turning = 1 + (n * np.pi / LENGTH) ** 2 * MOMENT / AREA
        expected = n**2 * flat * np.sqrt((1 + share / n**2) / turning)
        nearest = int(np.argmin(np.abs(modes.frequencies_hz - expected)))
        off = abs(modes.frequencies_hz[nearest] - expected)
        assert off <= min(modes.errors_hz[nearest], 1e-4 * expected)


def test_euler_load():
    """The frequency falls to zero at p = -1 (L. Euler, 1744); beyond, the strut is buckled and said so."""
    near = strut(-0.9999).system().modes(count=1)
    assert near.frequencies_hz[0] < 0.012 * strut(0).system().modes(count=1).frequencies_hz[0]
    buckled = strut(-1.001).system().modes(count=3)
    assert not buckled.stable
    assert buckled.damping_ratios[:2].tolist() == pytest.approx([1, -1]) or (buckled.damping_ratios < 0).any()
    assert any("buckled" in remark for remark in buckled.remarks)


@settings(max_examples=30, deadline=None)
@given(st.floats(0.1, 10), st.sampled_from([0.0, 1e-6, 0.03, 1.0, 20.0]), st.floats(-1e4, 1e4))
def test_work_of_the_pull(length, shear, pull):
    """x' K x = P times the integral of the squared slope of the shape functions, by quadrature."""
    bar = bars(length, shear)
    block = geometric_stiffness(bar, np.array([pull]))[0][np.ix_([1, 5, 7, 11], [1, 5, 7, 11])]
    points, weights = np.polynomial.legendre.leggauss(6)
    s, w = (points + 1) / 2, weights / 2
    p = bar.shear_ratio_z()[0]
    slopes = (
        np.array(
            [
                -6 * s + 6 * s**2 - p,
                length * (1 - 4 * s + 3 * s**2 + p * (0.5 - s)),
                6 * s - 6 * s**2 + p,
                length * (-2 * s + 3 * s**2 + p * (s - 0.5)),
            ]
        )
        / (1 + p)
        / length
    )
    expected = pull * length * (slopes * w) @ slopes.T
    np.testing.assert_allclose(block, expected, atol=1e-12 * np.abs(expected).max() + 1e-300)


def bars(length, shear):
    one = np.ones(1)
    area = np.inf if shear == 0 else 12 / (shear * length**2)
    return Bars(length * one, one, one, one, one, area * one, area * one, one, one, one)


def belt(tension, other="B", more=""):
    return study(f"""
[points]
A = ["0 m", "0 m", "0 m"]
B = ["2 m", "0 m", "0 m"]
[[bodies]]
mass = "3 kg"
carried_by = "A"
[[supports]]
at = "B"
hold = "all"
[[springs]]
name = "belt"
between = ["A", "{other}"]
stiffness = {{ x = "1 kN/m"{more} }}
tension = "{tension}"
""")


def test_belt_pull_holds_across():
    """A mass on a pulled string of length L: w = sqrt(T / (m L)) across, sqrt(k / m) along (closed form)."""
    # touched across, or the study is refused; A turns freely, so that these two move along and resist nothing
    soft = ', y = "1e-3 N/m", z = "1e-3 N/m"'
    found = belt("500 N", more=soft).system().modes(count=3)
    expected = np.sqrt([500 / (3 * 2), 500 / (3 * 2), 1000 / 3]) / (2 * np.pi)
    np.testing.assert_allclose(found.frequencies_hz, expected, rtol=1e-9)


def test_pull_needs_a_length():
    with pytest.raises(ModelError, match=r"springs\[0\].tension .*two points that lie apart"):
        belt("500 N", other="ground").system()
