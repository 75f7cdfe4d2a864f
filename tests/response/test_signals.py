"""Inputs over time: what they say of short pieces is what they are, and faults are named."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from vib.errors import ModelError
from vib.response.instep import Power, Wave
from vib.response.pieces import Cutter
from vib.response.signals import (
    SWEEP_ERROR,
    Constant,
    Harmonic,
    Impulse,
    Points,
    Samples,
    Signal,
    Steps,
    Sweep,
    ends_of,
    half_sine,
)

TIMES = np.array([0.1, 0.25, 0.7, 0.9])
SIGNALS: dict[str, Signal] = {
    "constant": Constant(3.0, 0.2, 0.8),
    "points": Points(TIMES, np.array([1.0, -2.0, 0.5, 4.0])),
    "samples": Samples([0.0, 1.0, -1.0, 2.0], 0.25, 0.05),
    "steps": Steps(TIMES, np.array([1.0, -2.0, 0.5])),
    "half sine": half_sine(2.0, 0.3, 0.1),
    "harmonic": Harmonic(2.0, 7.0, 0.4, 0.1),
    "linear sweep": Sweep(1.5, 2.0, 12.0, 0.9, False, 0.05),
    "downward sweep": Sweep(1.5, 12.0, 2.0, 0.9, False, 0.05),
    "exponential sweep": Sweep(1.5, 2.0, 16.0, 0.9, True, 0.05),
}


def rebuilt(signal, begin, length, inside):
    """The value ``inside`` (0 to 1) a piece, from its shapes."""
    total = 0.0
    for shape, amplitude in signal.expand(np.array([begin]), np.array([length])):
        if isinstance(shape, Power):
            total += amplitude[0] * inside**shape.degree
        else:
            assert isinstance(shape, Wave)
            angle = shape.omega * inside * length
            total += amplitude[0] * (np.sin(angle) if shape.sine else np.cos(angle))
    return total


@pytest.mark.parametrize("name", SIGNALS)
@settings(max_examples=60, deadline=None)
@given(begin=st.floats(0, 1), length=st.floats(1e-4, 0.01), inside=st.floats(0, 0.999))
def test_shapes_rebuild_the_signal(name, begin, length, inside):
    signal = SIGNALS[name]
    corners = signal.corners
    if ((corners > begin - 1e-9) & (corners < begin + length + 1e-9)).any():
        return  # a piece has no corner inside
    value = signal.value(np.array([begin + inside * length]))[0]
    assert rebuilt(signal, begin, length, inside) == pytest.approx(value, abs=2e-12)


@pytest.mark.parametrize("name", SIGNALS)
def test_derivatives_are_those_of_the_value(name):
    signal, step = SIGNALS[name], 1e-6
    at = np.array([0.1501, 0.4502, 0.6503])
    slope = (signal.value(at + step) - signal.value(at - step)) / (2 * step)
    np.testing.assert_allclose(signal.value(at, 1), slope, atol=1e-6 * max(1.0, np.abs(slope).max()))
    bend = (signal.value(at + step, 1) - signal.value(at - step, 1)) / (2 * step)
    np.testing.assert_allclose(signal.value(at, 2), bend, atol=1e-5 * max(1.0, np.abs(bend).max()))


@pytest.mark.parametrize("exponential", [False, True])
def test_a_sweep_stays_within_its_bound(exponential):
    """On pieces as long as are allowed; rounding of the phase (60 rad) adds 1e-14."""
    sweep = Sweep(1.0, 5.0, 40.0, 0.4, exponential)
    step = 0.01
    length = step / sweep.refinement(step)
    worst = 0.0
    for begin in np.arange(0, 0.39, length):
        for inside in (0.3, 0.99):
            value = sweep.value(np.array([begin + inside * length]))[0]
            worst = max(worst, abs(rebuilt(sweep, begin, length, inside) - value))
    assert worst <= SWEEP_ERROR + 2e-14
    assert sweep.degree(length) < 24


def test_a_sweep_begins_and_ends_at_its_frequencies():
    for exponential in (False, True):
        sweep = Sweep(1.0, 3.0, 24.0, 2.0, exponential, 0.5)
        np.testing.assert_allclose(sweep.frequency(np.array([0.5, 2.5])), [3.0, 24.0], rtol=1e-12)
        slope = (sweep.phase(np.array([1.3 + 1e-6])) - sweep.phase(np.array([1.3 - 1e-6]))) / 2e-6
        np.testing.assert_allclose(slope / (2 * np.pi), sweep.frequency(np.array([1.3])), rtol=1e-7)


@pytest.mark.parametrize(
    ("make", "message"),
    [
        (lambda: Points(np.array([0.0, 1.0]), np.array([1.0])), "as many times as values"),
        (lambda: Points(np.array([0.0, 1.0, 1.0]), np.zeros(3)), r"1 s follows 1 s \(row 3\)"),
        (lambda: Points(np.array([0.0, 1.0]), np.array([1.0, np.nan])), "row 2 is not finite"),
        (lambda: Samples([1.0, 2.0], 0.0), "positive time"),
        (lambda: Sweep(1.0, 0.0, 5.0, 1.0), "greater than 0"),
        (lambda: Sweep(1.0, 1.0, 5.0, 1.0).degree(1e3), "too long"),
    ],
)
def test_faults_are_named(make, message):
    with pytest.raises(ModelError, match=message):
        make()


def test_corners_on_the_grid_leave_no_bits():
    """A thousand corners at multiples of a tenth are steps of 0.1 for all their rounding."""
    samples = Samples(np.arange(1000.0), 0.1)
    table, bits = Cutter([(0, samples)], 0.1).cut(0, 999)
    assert not bits
    np.testing.assert_allclose(table[:, 0], np.arange(999.0), rtol=1e-12)


def test_the_bits_of_a_step_fill_it():
    cutter = Cutter([(0, Points(np.array([0.05, 0.13, 0.17, 0.3]), np.ones(4)))], 0.1)
    table, bits = cutter.cut(0, 4)
    level = [bit for bit in bits if bit.shape == Power(0)]
    spans = sorted(
        (float(step), float(begin), float(end))
        for bit in level
        for step, begin, end in zip(bit.step, bit.begin, bit.end, strict=True)
    )
    np.testing.assert_allclose(spans, [(0, 0.05, 0.1), (1, 0, 0.03), (1, 0.03, 0.07), (1, 0.07, 0.1)])
    np.testing.assert_allclose(table[:, 0], [0, 0, 1, 0], atol=1e-12)


def test_blows_on_a_step_belong_to_its_end():
    blows = Cutter([(0, Impulse(2.0, 0.0)), (0, Impulse(1.0, 0.3)), (0, Impulse(1.0, 0.34))], 0.1).blows()
    assert [blow.step for blow in blows] == [-1, 2, 3]
    assert blows[2].offset == pytest.approx(0.04)


def test_when_the_last_of_them_ends():
    assert ends_of([Constant(1.0), Impulse(1.0, 3.0), half_sine(1.0, 0.5, 1.0)]) == 3.0
    assert ends_of([]) == 0.0
