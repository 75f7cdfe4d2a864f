"""The motion as a sum over eigenvalues: x(t) = constant + sum of Re(w exp(lambda t))."""

from __future__ import annotations

import mpmath
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from vib.errors import ShapeError
from vib.response.contributions import contributions
from vib.response.groups import take_apart
from vib.response.transition import constant_input, transition
from vib.system import System

TIMES = np.array([0.0, 0.3, 1.0, 4.0])

numbers = st.integers(1, 4).flatmap(
    lambda n: st.lists(st.floats(-2, 2, allow_subnormal=False), min_size=n * (n + 2), max_size=n * (n + 2))
)


@settings(max_examples=60, deadline=None)
@given(numbers)
def test_sum_reproduces_the_response_to_a_constant_input(values):
    n = int(np.sqrt(len(values) + 1)) - 1
    whole = np.reshape(values, (n, n + 2))
    matrix, push, start = whole[:, :n], whole[:, n], whole[:, n + 1]
    found = contributions(matrix, np.eye(n), start, constant_input=push)
    exact = constant_input(matrix, push[:, None], TIMES)
    expected = exact.transition @ start + exact.input_effect[..., 0]
    # the sum is allowed a condition worth 1e-10 / eps
    assert np.abs(found.total(TIMES) - expected).max() <= 1e-9 * max(1.0, np.abs(expected).max())
    plain = ~found.clustered
    if plain.all():  # the law itself, written out
        terms = found.weights[:, None, :] * np.exp(np.multiply.outer(TIMES, found.eigenvalues))
        np.testing.assert_allclose(
            (found.constant[:, None] + terms.sum(axis=2).real).T, found.total(TIMES), atol=1e-9
        )


def test_constant_part_is_the_static_one():
    """A held system comes to rest at -A^-1 B u."""
    matrix = np.array([[0, 1.0], [-5.45, -0.8]])
    found = contributions(matrix, [[1.0, 0.0]], [0.0, 0.0], constant_input=[0.0, 1.0])
    assert found.constant[0] == pytest.approx(1 / 5.45, rel=1e-14)
    assert not found.drifts.any()


@pytest.mark.parametrize(
    ("matrix", "drifts"),
    [([[0, 1.0], [0, 0]], True), ([[0, 1.0], [0, -0.5]], True), ([[0, 1.0], [-1, 0]], False)],
)
def test_drift_under_a_constant_push(matrix, drifts):
    found = contributions(matrix, [[1.0, 0.0]], [0.0, 0.0], constant_input=[0.0, 1.0])
    assert found.drifts[0] == drifts


@pytest.mark.parametrize("seed", range(6))
def test_parts_of_matrices_with_defective_blocks(seed):
    """Against mpmath's exponential with 50 digits; the clusters are the Jordan blocks put in."""
    random = np.random.default_rng(seed)
    jordan = np.zeros((6, 6))
    jordan[:2, :2] = [[-1.0, 1.0], [0.0, -1.0]]
    jordan[2:, 2:] = np.array([[-0.25, 3, 1, 0], [-3, -0.25, 0, 1], [0, 0, -0.25, 3], [0, 0, -3, -0.25]])
    lower = np.tril(random.integers(-1, 2, (6, 6)).astype(float), -1) + np.eye(6)
    matrix = lower @ jordan @ np.round(np.linalg.inv(lower))
    parts = take_apart(matrix)
    assert sorted(len(part.eigenvalues) for part in parts.parts) == [2, 2]
    assert parts.condition < 1e4
    start = np.arange(1.0, 7.0)
    found = sum(
        part.factor * (part.free(part.left @ start, TIMES) @ part.right.T).real for part in parts.parts
    )
    with mpmath.workdps(50):
        exact = [
            np.array(
                (mpmath.expm(mpmath.matrix(matrix.tolist()) * t) * mpmath.matrix(start.tolist())).tolist(),
                float,
            )
            for t in map(float, TIMES)
        ]
    expected = np.array(exact)[:, :, 0]
    np.testing.assert_allclose(found, expected, rtol=0, atol=1e-11 * np.abs(expected).max())


def test_uncoupled_states_are_split_exactly():
    """A critically damped oscillator beside an ordinary one: only the first needs the exponential."""
    matrix = np.zeros((4, 4))
    matrix[:2, :2] = [[0, 1], [-4, -4]]
    matrix[2:, 2:] = [[0.0, 1.0], [-9.0, -0.1]]
    parts = take_apart(matrix)
    assert [part.single for part in parts.parts] == [False, True]
    rebuilt = sum(part.factor * (part.right @ part.block @ part.left).real for part in parts.parts)
    np.testing.assert_allclose(rebuilt, matrix, atol=1e-13)


@settings(max_examples=40, deadline=None)
@given(st.lists(st.floats(-2, 2, allow_subnormal=False), min_size=16, max_size=16), st.floats(0, 3))
def test_parts_sum_to_the_transition_matrix(values, t):
    matrix = np.reshape(values, (4, 4))
    parts = take_apart(matrix)
    identity = np.eye(4)
    found = np.zeros((4, 4))
    for part in parts.parts:
        for column in range(4):
            moved = part.right @ part.free(part.left @ identity[:, column], np.array([t]))[0]
            found[:, column] += part.factor * moved.real
    expected = transition(matrix, t)
    assert np.linalg.norm(found - expected) <= 1e-9 * np.linalg.norm(expected)


CHAIN = System(
    mass=np.diag([12.0, 5.0]),
    stiffness=[[25000.0, -7000.0], [-7000.0, 9500.0]],
    damping=[[30.0, -4.0], [-4.0, 6.0]],
)


@pytest.mark.parametrize("start", [{"impulse": 1.0}, {"pull": 100.0}, {"pulse": (100.0, 0.03)}])
def test_shares_of_the_peak_add_up_to_one(start):
    found = CHAIN.ring(at="1", **start)
    shares = sum(row.share_of_peak for row in found.modes)
    np.testing.assert_allclose(shares, 1.0, atol=1e-9)
    assert [row.number for row in found.modes] == [1, 2]
    assert found.modes[0].frequency_hz < found.modes[1].frequency_hz


def test_history_of_each_eigenvalue_sums_to_the_record():
    found = CHAIN.ring(pulse=(100.0, 0.03), at="1")
    free = found.time_s >= found.contributions.origin_s
    histories = found.contributions.history(found.time_s[free])
    assert histories.shape == (free.sum(), 2, 2)
    np.testing.assert_allclose(histories.sum(axis=2), found.displacement_m[free], atol=1e-15)


def test_bad_shapes_are_named():
    with pytest.raises(ShapeError, match=r"start: expected shape \(2,\), got \(3,\)"):
        contributions(np.eye(2), np.eye(2), np.zeros(3))
    with pytest.raises(ShapeError, match="outputs"):
        contributions(np.eye(2), np.eye(3), np.zeros(2))
    with pytest.raises(ShapeError, match="constant input"):
        contributions(np.eye(2), np.eye(2), np.zeros(2), constant_input=np.zeros(1))
