"""Figures as text: significant digits, percentages, error bars."""

from __future__ import annotations

import math
from collections.abc import Sequence

MISSING = "-"


def significant(value: float | None, digits: int = 4) -> str:
    """A number to so many significant digits, zeros at the end kept, so that a column reads evenly."""
    if value is None or math.isnan(value):
        return MISSING
    if math.isinf(value):
        return "infinite" if value > 0 else "-infinite"
    if value == 0:
        return "0"
    size = abs(value)
    if 1e-4 <= size < 10 ** max(digits, 6):
        return _fixed(value, digits)
    mantissa, exponent = f"{value:.{digits - 1}e}".split("e")
    return f"{mantissa}e{int(exponent)}"


def _fixed(value: float, digits: int) -> str:
    # the exponent after rounding: 9.9996 to four digits is 10.00
    exponent = int(f"{value:.{digits - 1}e}".split("e")[1])
    return f"{value:.{max(digits - 1 - exponent, 0)}f}"


def aligned(values: Sequence[float], largest: float, digits: int = 4) -> list[str]:
    """Figures of one kind with the same decimals, so many digits for the largest; round-off shows as 0."""
    if not largest or not math.isfinite(largest):
        return ["0" if value == 0 else significant(value, digits) for value in values]
    exponent = int(f"{largest:.{digits - 1}e}".split("e")[1])
    if not -4 <= exponent < 6:
        return [significant(value, digits) if abs(value) > 1e-9 * largest else "0" for value in values]
    decimals = max(digits - 1 - exponent, 0)
    found = [f"{value:.{decimals}f}" for value in values]
    return ["0" if not figure.strip("-0.") else figure for figure in found]


def error_bar(value: float) -> str:
    """A numerical error to two digits; it is a bound, so it is rounded up."""
    if math.isnan(value) or math.isinf(value):
        return significant(value)
    if value == 0:
        return "0"
    step = 10.0 ** (math.floor(math.log10(abs(value))) - 1)
    return significant(math.ceil(value / step * (1 - 1e-12)) * step, 2)


def percent(share: float | None, digits: int = 3) -> str:
    """A share as a percentage without the sign: 0.0123 is "1.23"."""
    return MISSING if share is None else significant(100 * share, digits)


def whole_percent(share: float) -> str:
    """A share in whole per cent, "<1" for what is there but small."""
    if math.isnan(share):
        return MISSING
    if abs(share) < 1e-6:
        return "0"
    if 0 < share < 0.005:
        return "<1"
    return f"{100 * share:.0f}"


def joined(names: list[str] | tuple[str, ...], last: str = "and") -> str:
    """A list in words: "A, B and C"."""
    if len(names) < 2:
        return "".join(names)
    return f"{', '.join(names[:-1])} {last} {names[-1]}"
