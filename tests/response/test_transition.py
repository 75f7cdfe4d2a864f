"""The state transition matrix against published-style closed forms, 50-digit arithmetic, and its laws."""

from __future__ import annotations

from typing import Any

import mpmath
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from vib.errors import AccuracyError, MatrixError, ShapeError
from vib.response.exponential import EPS
from vib.response.transition import Propagator, constant_input, transition

# Source of all cases below: the project's reference collection, entries STM-2R, STM-2C, STM-3M, STM-3R,
# STM-D2, STM-D3, STM-PROP, STM-RB: partial fractions of companion matrices, checked there with mpmath.
REFERENCES: dict[str, Any] = {
    "2R": ([[0, 1], [-2.17, -3.8]], 0.2, "eigenvalues",
           [[0.966020593091677, 0.138089082418388], [-0.299653308847902, 0.441282079901803]]),
    "2R 1 s": ([[0, 1], [-2.17, -3.8]], 1.0, "eigenvalues",
               [[0.628283333365783, 0.188140042249105], [-0.408263891680558, -0.0866488271808156]]),
    "2R 3 s": ([[0, 1], [-2.17, -3.8]], 3.0, "eigenvalues",
               [[0.158146221092587, 0.0509854183422932], [-0.110638357802776, -0.0355983686081271]]),
    "PROP 1.2 s": ([[0, 1], [-2.17, -3.8]], 1.2, "eigenvalues",
                   [[0.550557852140901, 0.169781898159745], [-0.368426719006647, -0.0946133608661305]]),
    "PROP -1 s": ([[0, 1], [-2.17, -3.8]], -1.0, "eigenvalues",
                  [[-3.87330520993778, -8.41008273915465], [18.2498795439656, 28.0850091988499]]),
    "2C": ([[0, 1], [-5.45, -0.8]], 1.0, "eigenvalues",
           [[-0.359685798968853, 0.217330935719702], [-1.18445359967238, -0.533550547544615]]),
    "2C 3 s": ([[0, 1], [-5.45, -0.8]], 3.0, "eigenvalues",
               [[0.275991280229882, 0.0757490039015581], [-0.412832071263492, 0.215392077108636]]),
    "3M": ([[0, 1, 0], [0, 0, 1], [-2.71125, -3.6425, -1.6]], 4.0, "eigenvalues",
           [[0.100155478843961, 0.039301177115482, -0.0462477740651045],
            [0.125389277434015, 0.268612995876104, 0.113297615619649],
            [-0.307178160348774, -0.287297287460558, 0.0873368108846654]]),
    "3R": ([[0, 1, 0], [0, 0, 1], [-2.73, -8.21, -6.0]], 1.0, "eigenvalues",
           [[0.873023314767266, 0.577403281940414, 0.0888359436622987],
            [-0.242522126198076, 0.143680217299793, 0.0443876199666213],
            [-0.121178202508876, -0.606944486124036, -0.122645502499935]]),
    "D2": ([[0, 1], [-1.96, -2.8]], 2.0, "matrix exponential",
           [[0.231078237975828, 0.121620125250436], [-0.238375445490854, -0.109458112725392]]),
    "D3": ([[0, 1, 0], [0, 0, 1], [-0.216, -1.08, -1.8]], 2.0, "matrix exponential",
           [[0.87948709878363, 1.32525453241369, 0.602388423824404],
            [-0.130115899546071, 0.228907601053274, 0.240955369529762],
            [-0.0520463598184285, -0.390347698638214, -0.204812064100297]]),
    "RB": ([[0, 1], [0, 0]], 3.0, "matrix exponential", [[1, 3], [0, 1]]),
    "RB damped": ([[0, 1], [0, -0.5]], 3.0, "eigenvalues", [[1, 1.55373967970314], [0, 0.22313016014843]]),
}  # fmt: skip


@pytest.mark.parametrize("name", REFERENCES)
def test_reference(name):
    matrix, t, method, expected = REFERENCES[name]
    propagator = Propagator(matrix)
    assert propagator.method == method
    found = propagator(t)
    np.testing.assert_allclose(found, expected, rtol=0, atol=1e-12)  # as asked: 1e-12, printed to 15 digits
    columns = [propagator.apply(start, [t])[0] for start in np.eye(len(expected))]
    np.testing.assert_allclose(np.transpose(columns), expected, rtol=0, atol=1e-12)


@pytest.mark.parametrize("t", [1e-4, 1.0, 100.0])
def test_stiff_reference(t):
    """STM-STIFF: roots -0.01, -1, -10000, here against 50-digit arithmetic on the same doubles."""
    matrix = np.array([[0, 1, 0], [0, 0, 1], [-100.0, -10100.01, -10001.01]])
    expected = exact(matrix, t)
    found = transition(matrix, t)
    assert norm(found - expected) <= 1e-12 * norm(expected)


def norm(matrix):
    return float(np.linalg.norm(matrix))


def exact(matrix, t):
    """exp(A t) with 50 digits (mpmath's Taylor method) of the double precision entries."""
    with mpmath.workdps(50):
        powered = mpmath.expm(mpmath.matrix(np.asarray(matrix, float).tolist()) * mpmath.mpf(float(t)))
        return np.array(powered.tolist(), dtype=float)


def defective(seed, size, spread=1.0):
    """A matrix similar to Jordan blocks by an integer matrix of determinant 1, so exact in doubles."""
    random = np.random.default_rng(seed)
    jordan = np.zeros((size, size))
    row = 0
    while row < size:
        length = min(int(random.integers(1, 4)), size - row)
        value = -float(random.integers(0, 8)) / 4 * spread
        for i in range(row, row + length):
            jordan[i, i] = value
            if i + 1 < row + length:
                jordan[i, i + 1] = 1.0
        row += length
    lower = np.tril(random.integers(-1, 2, (size, size)).astype(float), -1) + np.eye(size)
    inverse = np.round(np.linalg.inv(lower))
    return lower @ jordan @ inverse


@pytest.mark.parametrize("seed", range(12))
def test_random_defective_matrices_with_50_digits(seed):
    matrix = defective(seed, 5)
    for t in (0.3, 2.0, -0.7):
        expected = exact(matrix, t)
        scale = norm(expected)
        assert norm(transition(matrix, t) - expected) <= 1e-12 * scale
        start = np.arange(1.0, 6.0)
        moved = Propagator(matrix).apply(start, [t])[0]
        assert norm(moved - expected @ start) <= 1e-12 * scale * norm(start)


@pytest.mark.parametrize("gap", [1e-3, 1e-6, 1e-9, 1e-12])
def test_nearly_defective_matrices_keep_their_digits(gap):
    """Two eigenvalues ``gap`` apart: through eigenvectors the error would be eps / gap."""
    matrix = np.array([[0.0, 1.0], [-(1.4 * (1.4 + gap)), -(2.8 + gap)]])
    found = Propagator(matrix)
    assert found.method == "matrix exponential"
    assert found.condition > min(1 / (10 * gap), 1e7)  # rounding keeps computed eigenvalues 1e-8 apart
    np.testing.assert_allclose(found(2.0), exact(matrix, 2.0), rtol=0, atol=1e-14)


def test_repeated_but_not_defective_goes_through_the_eigenvalues():
    found = Propagator(np.diag([-2.0, -2.0, -1.0]))
    assert found.method == "eigenvalues"
    assert found.condition == 1
    np.testing.assert_allclose(found(0.5), np.diag(np.exp([-1, -1, -0.5])), rtol=4 * EPS)


@pytest.mark.parametrize("scale", [1e-9, 1.0, 1e9])
def test_badly_scaled_states(scale):
    """States in units 1e9 apart: the same answer, each entry to its own digits."""
    matrix = np.array([[0.0, 1.0], [-5.45, -0.8]])
    stretch = np.diag([1.0, scale])
    expected = stretch @ exact(matrix, 1.0) @ np.linalg.inv(stretch)
    found = transition(stretch @ matrix @ np.linalg.inv(stretch), 1.0)
    np.testing.assert_allclose(found, expected, rtol=1e-13)


def test_short_times_are_not_lost_in_cancellation():
    """A nearly nilpotent matrix: eigenvectors exist but their sum cancels completely at t = 1 s."""
    matrix = np.array([[5e-17, 0.0], [0.988, 0.0]])
    np.testing.assert_allclose(transition(matrix, [0.3, 4.0])[:, 1, 0], [0.2964, 3.952], rtol=1e-14)
    np.testing.assert_allclose(Propagator(matrix).apply([1.0, 0.0], [4.0])[0, 1], 3.952, rtol=1e-14)


matrices = st.integers(1, 5).flatmap(
    lambda n: st.lists(
        st.lists(st.floats(-2, 2, allow_subnormal=False), min_size=n, max_size=n), min_size=n, max_size=n
    ).map(np.array)
)
spans = st.floats(-1.5, 1.5, allow_subnormal=False)


@settings(max_examples=40, deadline=None)
@given(matrices, spans)
def test_random_matrices_with_50_digits(matrix, t):
    expected = exact(matrix, t)
    allowed = 1e-12 * max(1.0, norm(expected))
    assert norm(transition(matrix, t) - expected) <= allowed


@settings(max_examples=60, deadline=None)
@given(matrices, spans, spans)
def test_laws(matrix, one, two):
    """Semigroup, inverse, derivative, determinant."""
    propagator = Propagator(matrix)
    first, second = propagator(one), propagator(two)
    size = norm(first) * norm(second)
    np.testing.assert_allclose(propagator(one + two), first @ second, rtol=0, atol=1e-11 * size)
    back = propagator(-one)
    np.testing.assert_allclose(
        first @ back, np.eye(len(matrix)), rtol=0, atol=1e-11 * norm(first) * norm(back)
    )
    # central difference: error h^2/6 |A|^3 |Phi| and rounding eps/h |Phi|
    h = 1e-5
    slope = (propagator(one + h) - propagator(one - h)) / (2 * h)
    largest = max(1.0, norm(matrix))
    np.testing.assert_allclose(slope, matrix @ first, rtol=0, atol=1e-7 * largest**3 * norm(first))
    n = len(matrix)
    assert np.linalg.det(first) == pytest.approx(
        np.exp(np.trace(matrix) * one), abs=1e-11 * max(1.0, norm(first) ** n)
    )


@pytest.mark.parametrize("matrix", [[[0, 1], [-5.45, -0.8]], [[0, 1], [-1.96, -2.8]], [[0, 1], [0, 0]]])
@pytest.mark.parametrize(
    "times",
    [np.linspace(0, 7, 90), np.linspace(-7, 0, 50), np.linspace(2, -3, 41), np.array([3.0, 0.1, 3.0, 0, 5])],
    ids=["uniform", "backwards", "through zero", "any order"],
)
def test_many_times_are_each_as_one_time(matrix, times):
    propagator = Propagator(matrix)
    together = propagator(times)
    assert together.shape == (len(times), 2, 2)
    alone = np.array([propagator(t) for t in times])
    size = np.linalg.norm(alone, axis=(1, 2), keepdims=True)
    np.testing.assert_allclose(together / size, alone / size, rtol=0, atol=1e-13)
    start = np.array([0.3, -0.8])
    np.testing.assert_allclose(
        propagator.apply(start, times) / size[:, 0], alone @ start / size[:, 0], rtol=0, atol=1e-13
    )


def test_long_uniform_records_take_few_exponentials(monkeypatch):
    import scipy.linalg

    calls = []
    original = scipy.linalg.expm

    def counted(matrix):
        calls.append(1)
        return original(matrix)

    monkeypatch.setattr(scipy.linalg, "expm", counted)
    transition([[0.0, 1.0], [-1.96, -2.8]], np.linspace(0, 5, 10_000))
    assert len(calls) <= 201  # twice the root of 10 000, and one


def test_constant_input_reference():
    """STM-STEP of the reference collection: unit step on STM-2C from rest, 1 s."""
    found = constant_input([[0.0, 1.0], [-5.45, -0.8]], [[0.0], [1.0]], 1.0)
    np.testing.assert_allclose(found.input_effect[:, 0], [0.24948363283832, 0.2173309357197], atol=1e-12)


def test_constant_input_on_a_free_mass():
    """Singular A: a mass pushed by a constant force moves as t^2 / 2."""
    found = constant_input([[0.0, 1.0], [0.0, 0.0]], [[0.0], [1.0]], [0.5, 2.0])
    np.testing.assert_allclose(found.input_effect[:, :, 0], [[0.125, 0.5], [2.0, 2.0]], rtol=1e-14)
    assert found.method == "matrix exponential"


@pytest.mark.parametrize("seed", range(4))
def test_constant_input_with_50_digits(seed):
    """Van Loan's augmented matrix, exponentiated with 50 digits."""
    random = np.random.default_rng(seed)
    matrix, push = defective(seed, 4), random.normal(size=(4, 2))
    augmented = np.block([[matrix, push], [np.zeros((2, 6))]])
    expected = exact(augmented, 1.3)
    found = constant_input(matrix, push, 1.3)
    scale = norm(expected)
    np.testing.assert_allclose(found.transition, expected[:4, :4], rtol=0, atol=1e-12 * scale)
    np.testing.assert_allclose(found.input_effect, expected[:4, 4:], rtol=0, atol=1e-12 * scale)


@pytest.mark.parametrize("matrix", [[[3.0]], [[3.0, 1.0], [0.0, 3.0]]])
def test_growth_past_the_largest_number_is_an_error(matrix):
    with pytest.raises(AccuracyError, match=r"leaves the range of numbers at t = 400 s .*grow"):
        transition(matrix, [1.0, 400.0])
    with pytest.raises(AccuracyError, match="leaves the range"):
        Propagator(matrix).apply(np.ones(len(matrix)), [400.0])


def test_decay_to_nothing_is_no_error():
    assert np.all(transition([[0.0, 1.0], [-1.96, -2.8]], 1e5) == 0)
    assert np.all(transition([[-3.0]], 1e5) == 0)


def test_times_past_the_digits_of_the_matrix_are_an_error():
    with pytest.raises(AccuracyError, match="last digits of A"):
        transition([[0.0, 1e6], [-1e6, 0.0]], 1e9)


def test_complex_matrices_stay_complex_and_real_ones_real():
    assert transition([[0.0, 1.0], [-5.45, -0.8]], 1.0).dtype == np.float64
    np.testing.assert_allclose(transition([[1j]], np.pi), [[-1]], atol=1e-15)


def test_bad_input_is_named():
    with pytest.raises(ShapeError, match=r"A: expected shape \(2, 2\), got \(2, 3\)"):
        transition(np.zeros((2, 3)), 1.0)
    with pytest.raises(MatrixError, match="row 2, column 1 is nan"):
        transition([[0.0, 1.0], [np.nan, 0.0]], 1.0)
    with pytest.raises(AccuracyError, match="finite number of seconds"):
        transition([[0.0]], np.inf)
    with pytest.raises(ShapeError, match="start"):
        Propagator([[0.0]]).apply([1.0, 2.0], [1.0])
    with pytest.raises(ShapeError, match="input matrix"):
        constant_input([[0.0]], [[1.0], [2.0]], 1.0)
    with pytest.raises(ShapeError, match="t: expected"):
        transition([[0.0]], np.zeros((2, 2)))
