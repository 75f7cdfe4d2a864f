"""The block Arnoldi process against numpy on the same operator, written as one matrix."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from vib.errors import AccuracyError
from vib.solve.two_level import largest

NONE = np.zeros((30, 0))


def operator(size, seed, rank=None):
    """inv(K) on second-order states, as a step and as a matrix: g = -inv(K) (C q + M v), then v = q."""
    rng = np.random.default_rng(seed)
    damping, mass = rng.standard_normal((2, size, size))
    if rank is not None:
        mass[:, rank:] = damping[:, rank:] = 0.0
    whole = np.block([[-damping, -mass], [np.eye(size), np.zeros((size, size))]])
    return (lambda q, v: (-(damping @ q + mass @ v), q.copy())), whole


@settings(max_examples=15, deadline=None)
@given(st.integers(0, 10**6), st.sampled_from([6, 30, 60]), st.sampled_from([2, 7]))
def test_the_largest_eigenvalues(seed, size, wanted):
    step, whole = operator(size, seed)
    start = np.random.default_rng(seed).standard_normal((size, 3))
    found = largest(step, start, np.zeros((size, 0)), wanted)
    every = np.linalg.eigvals(whole)
    every = every[np.argsort(-np.abs(every))]
    top = np.abs(every[0])
    for value, motion in zip(found.values, found.motions.T, strict=True):
        assert np.abs(every - value).min() <= 1e-10 * top
        state = np.concatenate([motion, motion / value])
        assert np.linalg.norm(whole @ state - value * state) <= 1e-9 * top * np.linalg.norm(state)
    np.testing.assert_allclose(np.abs(found.values[:wanted]), np.abs(every[:wanted]), rtol=1e-9)


def test_eigenvalues_that_are_there_several_times():
    size = 30
    squares = np.repeat(np.arange(1.0, 11.0), 3)
    found = largest(
        lambda q, v: (-v / squares[:, None], q.copy()),
        np.ones((size, 1)) * np.eye(size)[:, :4] + 0.1,
        NONE,
        4,
    )
    np.testing.assert_allclose(np.abs(found.values), 1.0, rtol=1e-10)
    start = np.random.default_rng(1).standard_normal((size, 4))
    start = np.random.default_rng(1).standard_normal((size, 4))
    found = largest(lambda q, v: (-v / squares[:, None], q.copy()), start, NONE, 12)
    np.testing.assert_allclose(np.abs(found.values)[:12], np.repeat([1, np.sqrt(0.5)], 6), rtol=1e-10)


def test_a_space_that_closes_gives_all_that_there_is():
    step, whole = operator(30, 4, rank=1)
    found = largest(step, np.random.default_rng(0).standard_normal((30, 4)), NONE, 20)
    every = np.linalg.eigvals(whole)
    large = every[np.abs(every) > 1e-6]
    assert 0 < len(large) < 20
    for value in large:
        assert np.abs(found.values - value).min() <= 1e-9


def test_a_search_that_does_not_converge_says_so():
    """A shift round a ring of states leads nowhere before it has come round."""
    size = 4000

    def step(q, v):
        return np.roll(v, 1, axis=0), q.copy()

    start = np.zeros((size, 1))
    start[0] = 1.0
    with pytest.raises(AccuracyError, match="did not converge in"):
        largest(step, start, np.zeros((size, 0)), 3)
