"""The free response after an impact, a pulse, a release or from an initial state."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from vib.system import System

Array = NDArray[np.float64]
Along = str | Sequence[float] | None


@dataclass(frozen=True, eq=False)
class Ring:
    """A free response of p outputs at k times; SI units, rotations in rad."""

    system: System
    start: str
    time_s: Array  # (k,)
    displacement_m: Array  # (k, p)
    velocity_m_s: Array
    acceleration_m_s2: Array
    freedoms: tuple[str, ...]  # p names, such as "motor x"
    rotational: tuple[bool, ...]  # p flags: this output is an angle, rad
    envelope_m: Array  # (k, p) sum |w_i| exp(Re lambda_i t)
    method: str
    condition: float
    truncation: float  # relative; 0.0 where the model is complete
    remarks: tuple[str, ...]

    def to_dict(self) -> dict[str, Any]:
        """Everything as lists and numbers, field names carrying their units."""
        raise NotImplementedError


def ring(
    system: System,
    *,
    impulse: str | float | None = None,
    pulse: tuple[str | float, str | float] | None = None,
    pull: str | float | None = None,
    displacement: str | float | ArrayLike | None = None,
    velocity: str | float | ArrayLike | None = None,
    at: str | None = None,
    along: Along = None,
    duration: str | float | None = None,
    times: ArrayLike | None = None,
    watch: Sequence[tuple[str, Along]] | None = None,
    modes: object | None = None,
) -> Ring:
    """The free response of ``system``."""
    raise NotImplementedError
