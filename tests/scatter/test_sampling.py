"""Points, distributions and designs."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as some
from scipy import stats

from vib.errors import ModelError
from vib.scatter.sampling import Design, Factors, quantile, unit_points
from vib.study.tolerances import Tolerance


def tolerance(distribution="uniform", low=1.0, nominal=2.0, high=4.0, path="a", **more):
    return Tolerance(path, "mass", nominal, low, high, distribution, **more)


# the distributions of scipy, a reference that knows nothing of ours
REFERENCES = {
    "uniform": (tolerance(), stats.uniform(1.0, 3.0)),
    "triangular": (tolerance("triangular"), stats.triang(1 / 3, 1.0, 3.0)),
    "normal": (tolerance("normal", 1.0, 2.0, 3.0), stats.norm(2.0, 1 / stats.norm.ppf(0.975))),
    "lognormal": (
        tolerance("lognormal", 1.0, 2.0, 4.0),
        stats.lognorm(np.log(2.0) / stats.norm.ppf(0.975), scale=2.0),
    ),
}


@pytest.mark.parametrize("name", REFERENCES)
def test_quantiles_are_those_of_the_named_distribution(name):
    ours, reference = REFERENCES[name]
    share = np.linspace(0.001, 0.999, 201)
    np.testing.assert_allclose(quantile(ours, share), reference.ppf(share), rtol=1e-12)


@pytest.mark.parametrize("name", ["normal", "lognormal"])
def test_the_limits_hold_95_per_cent(name):
    ours, _ = REFERENCES[name]
    np.testing.assert_allclose(quantile(ours, np.array([0.025, 0.5, 0.975])), [ours.low, 2.0, ours.high])


@given(
    samples=some.integers(2, 300),
    factors=some.integers(1, 6),
    seed=some.integers(0, 2**40),
    method=some.sampled_from(["sobol", "latin hypercube"]),
)
def test_the_same_seed_gives_the_same_points(samples, factors, seed, method):
    points = unit_points(samples, factors, seed=seed, method=method)
    assert points.shape == (samples, factors)
    assert points.min() >= 0
    assert points.max() < 1
    np.testing.assert_array_equal(points, unit_points(samples, factors, seed=seed, method=method))


@pytest.mark.parametrize("method", ["sobol", "latin hypercube"])
def test_every_factor_is_covered_evenly(method):
    """Both methods put one point in each of N equal slices of each factor, where N is a power of two."""
    points = unit_points(64, 3, seed=1, method=method)
    for column in points.T:
        assert sorted((column * 64).astype(int)) == list(range(64))


def test_a_group_is_one_draw():
    rows = [tolerance(path="a", group="g"), tolerance("normal", path="b", group="g"), tolerance(path="c")]
    factors = Factors.of(rows)
    assert factors.names == ("group g", "c")
    values = factors.values(unit_points(128, 2, seed=0))
    assert stats.spearmanr(values[:, 0], values[:, 1]).statistic == pytest.approx(1.0)


def test_a_group_in_part_has_the_correlation_asked_for():
    """Normal scores of two quantities with one shared factor correlate with its share of their variance."""
    more = {"group": "g", "correlation": 0.6}
    rows = [tolerance("normal", 1.0, 2.0, 3.0, "a", **more), tolerance("normal", 1.0, 2.0, 3.0, "b", **more)]
    factors = Factors.of(rows)
    assert factors.names == ("group g", "a", "b")
    values = factors.values(unit_points(2**14, 3, seed=0))
    # the standard error of a correlation from N independent samples is (1 - r^2) / sqrt(N)
    assert np.corrcoef(*values.T)[0, 1] == pytest.approx(0.6, abs=4 * (1 - 0.36) / 2**7)
    assert values.std(axis=0) == pytest.approx(1 / stats.norm.ppf(0.975), rel=0.01)


def test_the_mixed_points_differ_in_one_factor():
    design = Design.of(16, 3, seed=4)
    for factor in range(3):
        others = [column for column in range(3) if column != factor]
        np.testing.assert_array_equal(design.mixed[factor][:, others], design.first[:, others])
        np.testing.assert_array_equal(design.mixed[factor][:, factor], design.second[:, factor])
    assert design.points.shape == (16 * 5, 3)


@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        ({"samples": 1}, "samples: a whole number from 2"),
        ({"samples": 2.5}, "samples"),
        ({"seed": -1}, "seed: a whole number from 0"),
        ({"method": "dice"}, "method: one of sobol, latin hypercube"),
    ],
)
def test_what_cannot_be_drawn(arguments, message):
    with pytest.raises(ModelError, match=message):
        unit_points(**{"samples": 8, "factors": 1, "seed": 0, **arguments})


def test_without_tolerances_there_is_nothing_to_draw():
    with pytest.raises(ModelError, match="the study states none"):
        Factors.of([])
