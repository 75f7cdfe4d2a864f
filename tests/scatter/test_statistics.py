"""Intervals hold what they promise, and effects are those of functions whose effects are known."""

import numpy as np
import pytest
from scipy import stats

from vib.scatter.ranking import effects
from vib.scatter.sampling import Design, unit_points
from vib.scatter.statistics import distribution, enough_for_percentiles, probability


@pytest.mark.parametrize("hits", [0, 1, 17, 99, 100])
def test_wilson_interval_is_that_of_scipy(hits):
    found = probability(np.arange(100) < hits)
    reference = stats.binomtest(hits, 100).proportion_ci(0.95, method="wilson")
    assert (found.value, found.low, found.high) == pytest.approx((hits / 100, *reference), abs=1e-12)


@pytest.mark.parametrize("method", ["independent", "sobol", "latin hypercube"])
def test_intervals_hold_the_truth_as_often_as_they_say(method):
    """A sum of three uniform figures: its cdf is t^3 / 6 up to 1 (P. Hall, Biometrika 19 (1927) 240-244).

    95 % of 400 trials are expected to hold it; 4 standard errors of that share below are allowed.
    """
    trials, size, held = 400, 200, np.zeros(4)
    truth = {5.0: (0.05 * 6) ** (1 / 3), 95.0: 3 - (0.05 * 6) ** (1 / 3)}
    for trial in range(trials):
        if method == "independent":
            points = np.random.default_rng(trial).random((size, 3))
        else:
            points = unit_points(size, 3, seed=trial, method=method)
        figures = points.sum(axis=1)
        found = distribution(figures, 1.5)
        below = probability(figures < 1.0)
        estimates = [(found.percentiles[percent], true) for percent, true in truth.items()]
        estimates += [(below, 1 / 6), (found.mean, 1.5)]
        held += [estimate.low <= true <= estimate.high for estimate, true in estimates]
    assert (held / trials).min() > 0.95 - 4 * (0.95 * 0.05 / trials) ** 0.5


def test_few_samples_say_little_about_the_tails():
    assert not enough_for_percentiles(100)
    assert enough_for_percentiles(1024)


def test_samples_without_a_figure_are_left_out():
    found = distribution(np.array([1.0, np.nan, 3.0]), 2.0)
    assert (found.least, found.most, found.mean.value) == (1.0, 3.0, 2.0)
    assert np.isnan(distribution(np.full(3, np.nan), 2.0).mean.value)


def ishigami(points):
    x = np.pi * (2 * points - 1)
    return np.sin(x[:, 0]) + 7 * np.sin(x[:, 1]) ** 2 + 0.1 * x[:, 2] ** 4 * np.sin(x[:, 0])


def ishigami_effects():
    """T. Ishigami, T. Homma, Proc. 1st Int. Symp. Uncertainty Modeling and Analysis (1990) 398-403."""
    a, b = 7.0, 0.1
    variance = a**2 / 8 + b * np.pi**4 / 5 + b**2 * np.pi**8 / 18 + 0.5
    one = 0.5 * (1 + b * np.pi**4 / 5) ** 2 / variance
    two = a**2 / 8 / variance
    shared = 8 * b**2 * np.pi**8 / 225 / variance
    return np.array([one, two, 0.0]), np.array([one + shared, two, shared])


def test_effects_of_a_function_whose_effects_are_known():
    design = Design.of(1024, 3, seed=3)
    figures = np.column_stack(
        [ishigami(design.points), np.full(5 * 1024, 7.0), 3 * ishigami(design.points) + 40]
    )
    found = effects(design, figures, seed=3)
    first, total = ishigami_effects()
    assert (np.abs(found.first[:, 0] - first) <= 1.5 * found.first_error[:, 0] + 1e-9).all()
    assert (np.abs(found.total[:, 0] - total) <= 1.5 * found.total_error[:, 0] + 1e-9).all()
    assert found.first_error[:, 0].max() < 0.1
    assert np.isnan(found.first[:, 1]).all()
    np.testing.assert_allclose(found.total[:, 2], found.total[:, 0], rtol=1e-9)


def test_effects_of_a_sum_are_its_shares_of_variance():
    design = Design.of(512, 2, seed=0)
    found = effects(design, (design.points @ [1.0, 2.0])[:, None], seed=0)
    np.testing.assert_allclose(found.first[:, 0], [0.2, 0.8], atol=0.01)
    np.testing.assert_allclose(found.total[:, 0], [0.2, 0.8], atol=0.01)
