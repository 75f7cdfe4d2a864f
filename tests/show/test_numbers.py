from __future__ import annotations

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from vib.show.numbers import aligned, error_bar, joined, percent, significant, whole_percent

finite = st.floats(allow_nan=False, allow_infinity=False, min_value=-1e200, max_value=1e200)


@given(finite, st.integers(1, 9))
def test_significant_digits_are_kept(value, digits):
    """Rounding to d digits is off by at most half a unit of the d-th digit."""
    shown = float(significant(value, digits))
    assert abs(shown - value) <= 0.5000001 * 10.0 ** (1 - digits) * abs(value)


@given(st.floats(min_value=1e-200, max_value=1e200))
def test_an_error_bar_is_never_rounded_down(value):
    shown = float(error_bar(value))
    assert shown >= value * (1 - 1e-9)
    assert shown <= value * 1.11


@pytest.mark.parametrize(
    ("value", "digits", "shown"),
    [
        (12.3456, 4, "12.35"),
        (9.99996, 4, "10.00"),
        (100000.0, 4, "100000"),
        (0.0, 4, "0"),
        (-0.00012, 2, "-0.00012"),
        (3.2e-7, 2, "3.2e-7"),
        (1.5e9, 3, "1.50e9"),
        (math.nan, 3, "-"),
        (None, 3, "-"),
        (math.inf, 3, "infinite"),
    ],
)
def test_significant(value, digits, shown):
    assert significant(value, digits) == shown


def test_aligned_figures_have_the_same_decimals_and_no_round_off():
    assert aligned([12.345, -0.5, 1e-13, 0.0], 12.345) == ["12.35", "-0.50", "0", "0"]
    assert aligned([0.0, 0.0], 0.0) == ["0", "0"]
    assert aligned([3e-9, 1e-20], 3e-9, 2) == ["3.0e-9", "0"]


def test_shares():
    assert percent(0.0123) == "1.23"
    assert percent(None) == "-"
    assert [whole_percent(share) for share in (0.0, 1e-30, 0.004, 0.706, math.nan)] == [
        "0",
        "0",
        "<1",
        "71",
        "-",
    ]


def test_joined():
    assert joined([]) == ""
    assert joined(["a"]) == "a"
    assert joined(["a", "b", "c"]) == "a, b and c"
