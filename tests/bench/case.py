"""What a benchmark is: the same work done by us and by a named alternative, on the same input."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Any

SIZES = ("s", "m", "l")


@dataclass(frozen=True)
class Case:
    """One benchmark.

    ``prepare(size)`` makes the input, which is not timed. ``ours``, ``theirs`` and ``floor`` (the least that
    the work can cost, where that can be run) do it and return a few numbers that sum up the answer; the
    runner refuses a ratio where those of ours and theirs differ by more than ``rtol``. ``packages`` are what
    the alternative needs beyond our own dependencies; ``sizes`` those that are worth the wait.
    """

    name: str
    work: str
    alternative: str
    prepare: Callable[[str], Any]
    ours: Callable[[Any], Sequence[float]]
    theirs: Callable[[Any], Sequence[float]] | None
    floor: Callable[[Any], Sequence[float]] | None = None
    rtol: float = 1e-8
    packages: tuple[str, ...] = ()
    sizes: tuple[str, ...] = SIZES
    theirs_sizes: tuple[str, ...] = SIZES
