"""Sweeps against closed forms, and levels of sweeps and samples against single run-ups."""

from typing import Any

import numpy as np
import pytest

import vib
from tests.scatter.conftest import DRIVEN, SWAP
from vib.errors import ModelError, StudyError, UnitError
from vib.scatter.scatter import scatter
from vib.scatter.sweep import sweep


def frequency(stiffness_n_m, mass_kg=100.0):
    return np.sqrt(stiffness_n_m / mass_kg) / (2 * np.pi)


def test_a_sweep_is_the_closed_form_and_modes_keep_their_columns(studies):
    found = sweep(studies(), {"springs[0].stiffness.x": ("100 N/mm", "800 N/mm")}, steps=15)
    (one,) = found.swept
    np.testing.assert_allclose(one.values, np.linspace(1e5, 8e5, 15))
    np.testing.assert_allclose(found.frequencies_hz[:, 0], frequency(one.values), rtol=1e-6)
    np.testing.assert_allclose(found.frequencies_hz[:, 1], frequency(440e3), rtol=1e-6)
    assert found.batch.swapped.any()
    assert found.outputs == ()


def test_a_sweep_of_two_is_a_grid_with_the_first_outermost(studies):
    vary: Any = {"springs[0].stiffness.x": (1e5, 8e5), "bodies[0].mass": ("50 kg", "200 kg")}
    found = sweep(studies(), vary, steps=5, spacing="logarithmic")
    stiffness, mass = (one.values for one in found.swept)
    np.testing.assert_allclose(stiffness, np.geomspace(1e5, 8e5, 5))
    assert found.frequencies_hz.shape == (5, 5, 2)
    np.testing.assert_allclose(
        found.frequencies_hz[..., 0], frequency(stiffness[:, None], mass[None, :]), rtol=1e-5
    )


def test_bare_ends_are_in_the_declared_unit(studies):
    study = studies(SWAP, ('length = "mm"', 'length = "mm"\nstiffness = "N/mm"'))
    found = sweep(study, {"springs[0].stiffness.x": ("100", "200")}, steps=2)
    np.testing.assert_allclose(found.swept[0].values, [1e5, 2e5])


@pytest.mark.parametrize(
    ("vary", "more", "error", "message"),
    [
        ({}, {}, ModelError, "one quantity or two"),
        ({"springs[0].stiffness.x": (1e5, 1e5)}, {}, ModelError, "two different values"),
        ({"springs[0].stiffness.x": (-1e5, 1e5)}, {}, StudyError, "must be at least 0"),
        ({"springs[0].stiffness.x": ("1 mm", "2 mm")}, {}, UnitError, "not a unit of stiffness"),
        ({"springs[0].stiffness.x": (0.0, 1e5)}, {"spacing": "logarithmic"}, ModelError, "above zero"),
        ({"springs[9].stiffness.x": (1.0, 1e5)}, {}, ModelError, "no such entry"),
        ({"title": (1.0, 1e5)}, {}, ModelError, "no single number"),
        ({"springs[0].stiffness.x": (1.0, 1e5)}, {"steps": 1}, ModelError, "steps"),
    ],
)
def test_what_cannot_be_swept_is_said(studies, vary, more, error, message):
    with pytest.raises(error, match=message):
        sweep(studies(), vary, **more)


def judged(study):
    """Level and zone of each output as the command for one study gives them."""
    severity = vib.judge(vib.run_up(study), study.severity)
    return {row.output: (row.velocity_rms_m_s, row.zone) for row in severity.rows}


def test_levels_of_a_sweep_are_those_of_single_studies(studies):
    study = studies(DRIVEN)
    found = sweep(study, {"springs[0].stiffness.rx": ("200 kN m/rad", "400 kN m/rad")}, steps=3)
    assert found.outputs
    for row, value in enumerate(found.swept[0].values):
        single = judged(study.varied({"springs[0].stiffness.rx": float(value)}))
        for column, name in enumerate(found.outputs):
            assert found.velocity_rms_m_s[row, column] == pytest.approx(single[name][0], rel=2e-3, abs=1e-9)


def test_probability_of_a_zone_is_that_of_brute_force(studies):
    """The zones of the same samples, each judged as a study of its own: the share must be the same."""
    study = studies(DRIVEN)
    found = scatter(study, samples=64, seed=2, level_samples=64, ranking=False)
    assert found.levels is not None
    assert found.levels.zone_c is not None
    zones = []
    for sample in found.values:
        own = judged(study.varied(dict(zip(found.factors.paths, sample.tolist(), strict=True))))
        zones.append(max(zone for _, zone in own.values()))
    assert found.levels.zone_c.value == np.mean([zone >= "C" for zone in zones])
    assert 0.1 < found.levels.zone_c.value < 0.9
    assert found.levels.zone_c.low < found.levels.zone_c.value < found.levels.zone_c.high


def test_levels_over_a_range_of_speeds_find_the_resonance(studies):
    study = studies(DRIVEN, ('speed = "330 rpm"', 'speed = ["240 rpm", "330 rpm"]'))
    found = scatter(study, samples=4, seed=2, level_samples=4, ranking=False)
    assert found.levels is not None
    sample = dict(zip(found.factors.paths, found.values[1].tolist(), strict=True))
    single = judged(study.varied(sample))
    level = next(one for one in found.levels.outputs if one.output == "head y")
    # the peak of the level lies beside the natural frequency, within the damping ratio squared of it
    assert level.velocity_m_s.most >= (1 - 1e-3) * single["head y"][0]


def test_one_quantity_at_its_ends(studies):
    """2.5 % of the values of an even quantity lie below low + 0.025 (high - low)."""
    study = studies(DRIVEN)
    found = scatter(study, samples=4, level_samples=2, ranking=False).levels
    assert found is not None
    assert found.samples == 2
    middle = {path: (row.low + row.high) / 2 for path, row in study.tolerances.items()}
    for factor, path in enumerate(found.factors):
        row = study.tolerances[path]
        for end, share in enumerate((0.025, 0.975)):
            single = judged(study.varied({**middle, path: row.low + share * (row.high - row.low)}))
            for column, level in enumerate(found.outputs):
                ours = found.ends_m_s[factor, end, column]
                assert ours == pytest.approx(single[level.output][0], rel=2e-3, abs=1e-9)


def test_own_limits_have_a_probability(studies):
    study = studies(DRIVEN)
    found = scatter(study, samples=32, seed=2, level_samples=32, ranking=False)
    assert found.levels is not None
    (limit,) = next(level for level in found.levels.outputs if level.output == "head y").own
    assert (limit.limit, limit.source) == (0.003, "house rule")
    assert 0 < limit.probability.value < 1
