"""Scatter against closed forms and brute force."""

import numpy as np
import pytest

from tests.scatter.conftest import FRAME
from tests.scatter.conftest import SWAP as SWAP_TEXT
from tests.scatter.direct import Direct
from vib.errors import ModelError
from vib.scatter.family import Family
from vib.scatter.sampling import Factors
from vib.scatter.scatter import check_values, scatter


def frequency(stiffness_n_m, mass_kg=100.0):
    return np.sqrt(stiffness_n_m / mass_kg) / (2 * np.pi)


def in_band(low, high, nominal_n_mm):
    """Probability that sqrt(k / m) / (2 pi) lies from low to high (Hz), the stiffness evenly within 30 %."""
    least, most = 0.7 * nominal_n_mm * 1e3, 1.3 * nominal_n_mm * 1e3
    edges = np.clip([(2 * np.pi * f) ** 2 * 100.0 for f in (low, high)], least, most)
    return float(edges[1] - edges[0]) / (most - least)


@pytest.fixture(scope="module")
def found(studies):
    return scatter(studies(), samples=1024, seed=3)


def test_frequencies_of_every_sample_are_those_of_the_closed_form(found):
    """One mass on one spring each: f = sqrt(k / m) / (2 pi). Columns stay with their mass when they swap."""
    exact = frequency(found.values)
    np.testing.assert_allclose(found.batch.frequencies_hz, exact, rtol=1e-6)
    np.testing.assert_array_equal(found.batch.swapped, exact[:, 0] > exact[:, 1])
    assert 0.2 < found.batch.swapped.mean() < 0.5
    np.testing.assert_allclose(found.batch.damping_ratios, 0.01, rtol=1e-6)


def test_percentiles_are_those_of_the_closed_form(found):
    for mode, nominal in enumerate((400e3, 440e3)):
        for percent, estimate in found.frequencies_hz[mode].percentiles.items():
            exact = frequency(nominal * (0.7 + 0.6 * percent / 100))
            assert estimate.low <= exact <= estimate.high
            assert estimate.value == pytest.approx(exact, rel=1e-3)


@pytest.mark.parametrize("method", ["sobol", "latin hypercube"])
def test_probabilities_hold_the_exact_ones_where_modes_swap(studies, method):
    """Two independent modes that trade places: each probability has a closed form."""
    low, high = 10.5 * 0.96, 10.5 * 1.04
    one, other = in_band(low, high, 400), in_band(low, high, 440)
    either = 1 - (1 - one) * (1 - other)
    held = []
    for seed in range(20):
        met = scatter(studies(), samples=512, seed=seed, method=method, ranking=False).chances
        assert met is not None
        first, second = (row.probability for row in met.by_mode)
        for estimate, exact in ((first, one), (second, other), (met.any_line, either)):
            held.append(estimate.low <= exact <= estimate.high)
            assert estimate.high - estimate.low < 0.09
    # 95 % of 60 are expected; fewer than 51 has a probability below 0.2 % even for independent draws
    assert sum(held) >= 51


def test_brute_force_agrees_within_the_stated_error(studies):
    """A frame whose two swaying modes swap, against full solutions of as many other samples."""
    study = studies(FRAME)
    found = scatter(study, samples=1024, seed=1, ranking=False, count=3)
    factors = Factors.of(tuple(study.tolerances.values()))
    values = factors.values(np.random.default_rng(99).random((400, len(factors.names))))
    bounds = {path: (row.low, row.high) for path, row in study.tolerances.items()}
    brute = Direct(Family.from_study(study, bounds, count=3)).evaluate(values)
    assert found.batch.swapped.any()
    assert brute.swapped.any()
    assert found.chances is not None
    lines = found.chances.by_line[0].line
    for row in found.chances.by_mode:
        column = brute.frequencies_hz[:, (row.mode or 0) - 1]
        share = np.mean((column >= lines.band_from_hz) & (column <= lines.band_to_hz))
        # both are estimates: their errors add by squares, and 3 in place of 2 standard errors are allowed
        error = 3 * np.sqrt(
            share * (1 - share) / 400 + ((row.probability.high - row.probability.low) / 4) ** 2
        )
        assert abs(share - row.probability.value) <= error + 1 / 400
    assert len(found.chances.by_mode) == 2


def test_the_same_samples_solved_in_full_have_the_same_modes(studies):
    study = studies(FRAME)
    found = scatter(study, samples=32, seed=5, ranking=False, count=3)
    bounds = {path: (row.low, row.high) for path, row in study.tolerances.items()}
    brute = Direct(Family.from_study(study, bounds, count=3)).evaluate(found.values)
    np.testing.assert_allclose(found.batch.frequencies_hz, brute.frequencies_hz, rtol=2e-4)


def test_the_same_seed_gives_the_same_numbers(studies):
    one, other = (scatter(studies(), samples=100, seed=7) for _ in range(2))
    np.testing.assert_array_equal(one.values, other.values)
    np.testing.assert_array_equal(one.batch.frequencies_hz, other.batch.frequencies_hz)
    assert one.ranking is not None
    assert other.ranking is not None
    np.testing.assert_array_equal(one.ranking.frequencies.total, other.ranking.frequencies.total)
    assert any("100 points of a Sobol sequence" in remark for remark in one.remarks)


def test_bands_follow_a_speed_that_scatters(studies):
    study = studies(FRAME, ('speed = "288 rpm"', 'speed = "420 rpm +- 5 %"'))
    found = scatter(study, samples=64, seed=0, ranking=False, count=3)
    column = found.factors.paths.index("excitations[0].speed")
    assert found.chances is not None
    np.testing.assert_allclose(found.chances.needed_hz, 1.05 * found.values[:, column])


def test_the_ranking_is_that_of_the_closed_form(found):
    """Each frequency depends on its own spring alone: total effects 1 and 0."""
    np.testing.assert_allclose(found.ranking.frequencies.total, np.eye(2), atol=0.02)
    np.testing.assert_allclose(found.ranking.frequencies.first, np.eye(2), atol=0.03)
    assert np.isnan(found.ranking.damping_ratios.total).all()


def test_slopes_are_those_of_the_closed_form(found):
    """df/dk = f / (2 k), from f = sqrt(k / m) / (2 pi)."""
    exact = np.diag([frequency(k) / (2 * k) for k in (400e3, 440e3)])
    np.testing.assert_allclose(found.slopes, exact, rtol=1e-6, atol=1e-15)
    np.testing.assert_allclose(
        np.diag(found.shifts_hz), 0.15 * frequency(np.array([400e3, 440e3])), rtol=1e-6
    )


FOOT = 'ry = "260 kN m/rad +- 40 %" }'
DASHPOT = (
    (FOOT, FOOT + '\ndashpot = { rx = "9 kN m s/rad +- 20 %" }'),
    ("[damping]\nratio = 0.01", ""),  # which the derivative would hold fixed
)


@pytest.mark.parametrize("changes", [(), DASHPOT])
def test_slopes_of_a_frame_are_its_difference_quotients(studies, changes):
    study = studies(FRAME, *changes)
    found = scatter(study, samples=16, seed=0, ranking=False, count=2)
    for column, (path, row) in enumerate(study.tolerances.items()):
        step = 1e-3 * row.nominal
        varied = (study.varied({path: row.nominal + sign * step}) for sign in (1, -1))
        above, below = (one.system().modes(count=2).frequencies_hz for one in varied)
        quotient = (above - below) / (2 * step)
        # of frequencies whose error bars are some 1e-6 of them
        np.testing.assert_allclose(found.slopes[:, column], quotient, rtol=2e-3, atol=1e-3 / row.nominal)


def test_draws_that_cannot_be_are_named(studies):
    stiff = '{ value = "400 N/mm", tolerance = "90 %", distribution = "normal" }'
    study = studies(SWAP_TEXT, ('"400 N/mm +- 30 %"', stiff))
    with pytest.raises(ModelError, match=r"sample \d+ of 1024 can't be: .*springs\[0\].*must be at least 0"):
        scatter(study, samples=1024, ranking=False)


def test_corners_that_cannot_be_do_not_forbid_samples_that_can(studies):
    """Wall and width of a section vary; the corner with the thickest wall is not drawn."""
    tube = 'shape = "square hollow"\nwidth = "60 mm +- 10 %"\nthickness = "20 mm +- 40 %"'
    study = studies(FRAME, ('shape = "rectangle"\nwidth = 60\nheight = 64', tube))
    paths = ("sections.mast.width", "sections.mast.thickness")
    check_values(study, paths, np.array([[0.056, 0.026], [0.066, 0.030], [0.054, 0.013]]))
    with pytest.raises(ModelError, match="sample 2 of 2"):
        check_values(study, paths, np.array([[0.066, 0.027], [0.055, 0.0279]]))


def test_a_study_without_tolerances_does_not_scatter(studies):
    study = studies(SWAP_TEXT, ('"400 N/mm +- 30 %"', '"400 N/mm"'), ('"440 N/mm +- 30 %"', '"440 N/mm"'))
    with pytest.raises(ModelError, match="the study states none"):
        scatter(study)


OVERDAMPED = """
title = "A block in oil"
[points]
A = ["0 m", "0 m", "0 m"]
[[bodies]]
name = "block"
mass = "10 kg"
carried_by = "A"
[[supports]]
at = "A"
hold = ["y", "z", "rx", "ry", "rz"]
[[springs]]
between = ["A", "ground"]
stiffness = { x = "1000 N/m" }
dashpot = { x = "250 N s/m +- 60 %" }
"""


def test_motions_that_cease_to_swing_lack_a_mode(studies):
    """s = (-c -+ sqrt(c^2 - 4 k m)) / (2 m): two real values above c = 200 N s/m, one pair below."""
    found = scatter(studies(OVERDAMPED), samples=64, seed=0, ranking=False)
    dashpot = found.values[:, 0]
    swings = dashpot < 200
    assert 0.2 < swings.mean() < 0.5
    assert (np.isnan(found.batch.frequencies_hz).any(axis=1) == swings).all()
    roots = np.sqrt(np.maximum(dashpot**2 - 4 * 1000 * 10, 0)) / 20
    slow = np.where(swings, 10.0, dashpot / 20 - roots) / (2 * np.pi)
    np.testing.assert_allclose(np.nanmin(found.batch.frequencies_hz, axis=1), slow, rtol=1e-6)
    assert any("a mode is lacking" in remark for remark in found.remarks)


def test_the_name_of_the_package_is_the_function(studies):
    """Whether or not a part of the package was imported before, which binds its name in ``vib``."""
    import sys

    import vib

    for _ in range(2):
        found = vib.scatter(studies(), samples=8, ranking=False)
        assert isinstance(found, vib.Scatter)
    assert "vib.scatter.sampling" in sys.modules


def test_growing_samples_are_counted(studies):
    """A dashpot that feeds energy in takes 2.5 % of critical away: c / (2 sqrt(k m)) = -0.5 / 20."""
    text = """
title = "Fed from outside"
[units]
mass = "kg"
stiffness = "N/m"
damping = "N s/m"
[matrices]
mass = [[1]]
stiffness = [[100]]
damping = [[-0.5]]
[damping]
ratio = "0.025 +- 0.01"
"""
    found = scatter(studies(text), samples=64, ranking=False)
    np.testing.assert_allclose(found.batch.damping_ratios[:, 0], found.values[:, 0] - 0.025, atol=1e-9)
    np.testing.assert_array_equal(found.batch.stable, found.values[:, 0] > 0.025)
    assert not found.stable
    assert any("a motion grows by itself" in remark for remark in found.remarks)


def test_edges_that_are_not_linear_are_found_sample_by_sample(studies):
    """Speed and band both scatter: an edge is speed (1 + band), which is no sum of both."""
    changes = (('speed = "288 rpm"', 'speed = "288 rpm +- 5 %"'), ('band = "5 %"', 'band = "0.05 +- 0.02"'))
    found = scatter(studies(FRAME, *changes), samples=32, seed=0, ranking=False, count=3)
    speed, band = (
        found.values[:, found.factors.paths.index(f"excitations[0].{key}")] for key in ("speed", "band")
    )
    assert found.chances is not None
    np.testing.assert_allclose(found.chances.needed_hz, speed * (1 + band), rtol=1e-12)
