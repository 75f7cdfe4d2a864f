"""What the benchmarks time is right: records against 50 digits and SciPy, lines against NumPy."""

from __future__ import annotations

import numpy as np
import pytest

from tests.bench import bench_time
from vib.response.simulate import simulate


def test_a_free_record_agrees_with_fifty_digits():
    given = bench_time.record("m", sampled=False)
    found = simulate(given.space, step_s=bench_time.STEP_S, count=given.steps, start=given.start)
    instants = [0, 1, 255, 256, 4097, 40_000, 100_000]
    wanted = bench_time.exact(given, instants)
    # relative to the largest motion at that instant; it has fallen to a third at the last one
    worst = np.abs(found[instants] - wanted).max(axis=1) / np.abs(wanted).max(axis=1)
    assert worst.max() < 1e-9


@pytest.mark.parametrize("case", bench_time.CASES, ids=lambda case: case.name)
def test_both_sides_of_a_benchmark_agree(case):
    given = case.prepare("s")
    ours, theirs = np.array(case.ours(given)), np.array(case.theirs(given))
    assert np.abs(ours - theirs).max() <= case.rtol * np.abs(theirs).max()
    assert np.abs(theirs).max() > 0
