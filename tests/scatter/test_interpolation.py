import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from vib.scatter.interpolation import Search, UnsuitedError, leja, newton

NUMBERS = st.floats(-3, 3).map(lambda value: round(value, 3))


def search(function, nominal, bounds):
    return Search(
        evaluate=function,
        matters=lambda change: bool((np.abs(change) > 1e-9).any()),
        nominal=np.array(nominal, dtype=float),
        bounds=np.array(bounds, dtype=float),
        names=tuple(f"q{i}" for i in range(len(nominal))),
    )


def value_of(found, changes, base, samples):
    result = np.repeat(base[None], len(samples), axis=0)
    for factor, (where, change) in zip(found.coefficients(samples).T[1:], changes, strict=True):
        result[:, where] += factor[:, None] * change
    return result


@given(st.lists(st.tuples(NUMBERS, NUMBERS), min_size=1, max_size=5), st.integers(0, 1000))
def test_what_is_affine_is_exact_and_costs_two_evaluations_of_each_quantity(slopes, seed):
    weights = np.array([[a, b, 0.5] for a, b in slopes])
    d = len(slopes)
    made = search(lambda p: np.array([1.0, 2.0, 3.0]) + p @ weights, [1.0] * d, [[0.5, 2.0]] * d)
    found, changes = made.run()
    samples = np.random.default_rng(seed).uniform(0.5, 2.0, (20, d))
    exact = np.array([1.0, 2.0, 3.0]) + samples @ weights
    assert np.allclose(value_of(found, changes, made.base, samples), exact, rtol=0, atol=1e-10)
    assert found.degrees == (1,) * d
    # each once to find it and once to see that there is no more; pairs by two for all quantities but the last
    assert made.evaluations <= 1 + 2 * d + 2 * (d - 1)


def test_products_of_powers_are_found_as_they_are():
    def cubic(p):
        x, y, z = p
        return np.array([x * y**2, 4.0 + z, x - 2 * x * y, 7.0])

    made = search(cubic, [1.0, 2.0, 3.0], [[0.5, 1.5], [1.0, 3.0], [2.0, 4.0]])
    found, changes = made.run()
    samples = np.random.default_rng(1).uniform([0.5, 1, 2], [1.5, 3, 4], (30, 3))
    exact = np.array([cubic(row) for row in samples])
    assert np.allclose(value_of(found, changes, made.base, samples), exact, rtol=0, atol=1e-12)
    assert found.degrees == (1, 2, 1)
    assert set(found.terms) == {
        (),
        ((0, 1),),
        ((1, 1),),
        ((1, 2),),
        ((2, 1),),
        ((0, 1), (1, 1)),
        ((0, 1), (1, 2)),
    }


def test_three_quantities_that_only_act_together_beyond_pairs():
    made = search(lambda p: np.array([p.prod()]), [1.0, 1.0, 1.0], [[0.5, 2.0]] * 3)
    found, changes = made.run()
    samples = np.random.default_rng(2).uniform(0.5, 2, (10, 3))
    assert np.allclose(value_of(found, changes, made.base, samples)[:, 0], samples.prod(axis=1), atol=1e-12)


def test_a_quantity_that_does_nothing_costs_one_evaluation():
    made = search(lambda p: np.array([p[0]]), [1.0, 5.0], [[0.0, 2.0], [4.0, 6.0]])
    found, _ = made.run()
    assert found.degrees == (1, 0)
    assert made.evaluations == 1 + 2 + 1


def test_a_kink_is_no_polynomial_and_is_named():
    made = search(lambda p: np.array([p[0], abs(p[1] - 1.03)]), [1.0, 1.0], [[0.5, 2.0], [0.5, 2.0]])
    with pytest.raises(UnsuitedError, match="q1 changes the matrices in no simple way"):
        made.run()


def test_a_quantity_without_range_stays_at_its_nominal_value():
    made = search(lambda p: np.array([p[0] ** 2]), [2.0], [[2.0, 2.0]])
    found, changes = made.run()
    assert found.degrees == (0,)
    assert changes == ()


@given(st.integers(1, 8), st.floats(0.05, 0.95))
def test_newton_polynomials_are_one_at_their_own_point_and_zero_before(count, place):
    points = leja(place, 0.0, 1.0, count)
    assert len(set(points.tolist())) == count + 1
    found = newton(points, points)
    assert np.allclose(np.diag(found), 1.0)
    assert np.allclose(found[np.triu_indices(count + 1, 1)], 0.0, atol=1e-12)
