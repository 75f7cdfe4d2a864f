"""Tolerances: distributions, probabilities and derivatives in closed form."""

from __future__ import annotations

from collections.abc import Iterator
from functools import cache

import vib
from tests.references.common import Check, Entry, covers, study

_SAMPLES = 4096


@cache
def _two_masses(
    stiffnesses: tuple[float, float], mass: float, percent: float, band: str, hertz: float
) -> vib.Scatter:
    """Two masses side by side, one free along x, one along y, each on its spring."""
    one, other = stiffnesses
    text = f"""
[points]
A = ["0 m", "0 m", "0 m"]
B = ["1 m", "0 m", "0 m"]
[[bodies]]
name = "one"
mass = "{mass} kg"
carried_by = "A"
[[bodies]]
name = "other"
mass = "{mass} kg"
carried_by = "B"
[[supports]]
at = "A"
hold = ["y", "z", "rx", "ry", "rz"]
[[supports]]
at = "B"
hold = ["x", "z", "rx", "ry", "rz"]
[[springs]]
between = ["A", "ground"]
stiffness = {{ x = "{one} N/m +- {percent} %" }}
[[springs]]
between = ["B", "ground"]
stiffness = {{ y = "{other} N/m +- {percent} %" }}
[[excitations]]
frequencies = ["{hertz} Hz"]
band = "{band}"
"""
    return vib.scatter(study(text), samples=_SAMPLES, seed=1)


def _found(entry: Entry) -> vib.Scatter:
    given = entry["inputs"]
    return _two_masses(tuple(given["k"]), given["m"], given["percent"], given["band"], given["f"])


@covers("SC-UNIFORM")
def percentiles(entry: Entry) -> Iterator[Check]:
    """Percentiles of the frequency of one mass on a spring whose stiffness lies evenly."""
    for percent, value in entry["expected"]["percentiles"]:
        own = _found(entry).frequencies_hz[0].percentiles[percent]
        bar = max(own.high - own.value, own.value - own.low)
        yield Check(f"{percent:g} % of the frequencies below, Hz", own.value, value, 1e-3, error_bar=bar)


@covers("SC-SWAP")
def probabilities(entry: Entry) -> Iterator[Check]:
    """Two modes that trade places: each alone, and either of them, in a band."""
    met = _found(entry).chances
    assert met is not None
    estimates = [row.probability for row in met.by_mode] + [met.any_line]
    for name, estimate in zip(("first", "second", "either"), estimates, strict=True):
        bar = max(estimate.high - estimate.value, estimate.value - estimate.low)
        value = entry["expected"][name]
        yield Check(f"{name} in the band, probability", estimate.value, value, 1e-2, True, error_bar=bar)


@covers("SC-SLOPE")
def slopes(entry: Entry) -> Iterator[Check]:
    """Derivative of a frequency by its stiffness, and the effects of both stiffnesses on it."""
    found = _found(entry)
    yield Check("df/dk, Hz per N/m", found.slopes[0, 0], entry["expected"]["df_dk"], 1e-6)
    assert found.ranking is not None
    own = found.ranking.frequencies
    for factor, words in enumerate(("its own", "the other")):
        total, bar = float(own.total[factor, 0]), float(own.total_error[factor, 0])
        value = entry["expected"]["total"][factor]
        yield Check(f"total effect of {words} stiffness", total, value, 2e-2, True, error_bar=bar + 1e-9)
