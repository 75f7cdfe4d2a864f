"""Every error that the package raises on purpose; one tree, drawn here.

VibError (also a ValueError)
├── UnitError          a text or number that is not the quantity asked for
├── StudyError         a study file with one or more faults
├── ShapeError         an array of the wrong shape
├── MatrixError        matrices that do not describe a vibrating system
├── ModelError         a structure that cannot be built as described
└── AccuracyError      a result that cannot be trusted, or a solver that did not finish
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import wraps
from typing import ParamSpec, TypeVar

P = ParamSpec("P")
R = TypeVar("R")


class VibError(ValueError):
    """Base of every error that vib raises; also a ValueError. ``file`` is the study it is about, if known."""

    file: str | None = None


class UnitError(VibError):
    """A text or number that is not the quantity asked for."""


@dataclass(frozen=True)
class Fault:
    """One thing that is wrong in a study file.

    ``entry`` is its path in the file, such as ``members[2].section`` (lists count from 0);
    ``line`` counts from 1 and is None where it could not be found.
    """

    entry: str
    message: str
    line: int | None = None

    def __str__(self) -> str:
        place = self.entry or "the file"
        return f"{place} (line {self.line}): {self.message}" if self.line else f"{place}: {self.message}"


class StudyError(VibError):
    """A study file with one or more faults, all of them listed."""

    def __init__(self, file: str, faults: list[Fault] | tuple[Fault, ...]) -> None:
        self.file: str | None = file
        self.faults = tuple(faults)
        super().__init__("\n".join(f"{file}: {fault}" for fault in self.faults))


class ShapeError(VibError):
    """An array of the wrong shape."""

    def __init__(self, name: str, *, expected: tuple[int, ...], got: tuple[int, ...], hint: str = "") -> None:
        self.name, self.expected, self.got = name, expected, got
        super().__init__(f"{name}: expected shape {expected}, got {got}. {hint}".rstrip())


class MatrixError(VibError):
    """Matrices that do not describe a vibrating system; the message names row and column."""


class ModelError(VibError):
    """A structure that cannot be built as described; the message names the entry."""


class AccuracyError(VibError):
    """A result that cannot be trusted, or a solver that did not finish; ``partial`` holds what did."""

    def __init__(self, message: str, partial: object = None) -> None:
        self.partial = partial
        super().__init__(message)


def in_own_words(function: Callable[P, R]) -> Callable[P, R]:
    """Let no failure of a linear algebra library out of ``function`` but as `AccuracyError`."""

    @wraps(function)
    def guarded(*arguments: P.args, **named: P.kwargs) -> R:
        try:
            return function(*arguments, **named)
        except VibError:
            raise
        except MemoryError as fault:
            raise AccuracyError(
                "There is not enough memory for this; ask for fewer modes or a lower highest frequency."
            ) from fault
        except Exception as fault:
            if not _of_linear_algebra(fault):
                raise
            raise AccuracyError(
                "The equations of this system could not be solved: a matrix among them is singular, or stiff "
                "and soft or heavy and light parts lie too far apart for double precision."
            ) from fault

    return guarded


def _of_linear_algebra(fault: Exception) -> bool:
    """Whether numpy or scipy gave up on a matrix, told without importing them."""
    names = {kind.__name__ for kind in type(fault).__mro__}
    return bool(names & {"LinAlgError", "ArpackError"}) or (
        isinstance(fault, RuntimeError) and "singular" in str(fault)
    )
