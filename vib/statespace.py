"""The first-order model x' = A x + B u, y = C x + D u of a second-order system.

Made from a `System` by `state_space`, or built directly from arrays.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Literal

import numpy as np
from numpy.typing import ArrayLike, NDArray

from vib.errors import MatrixError, ShapeError

if TYPE_CHECKING:
    from vib.system import System

Array = NDArray[np.float64]
Quantity = Literal["displacement", "velocity", "acceleration"]
Place = str | tuple[str, str | Sequence[float] | None]


@dataclass(frozen=True, eq=False)
class StateSpace:
    """x' = A x + B u, y = C x + D u, with named states, inputs and outputs; SI units.

    ``A`` (s, s), ``B`` (s, i), ``C`` (o, s), ``D`` (o, i). Left out, ``B`` has no columns, ``C`` is the
    identity (the states are the outputs) and ``D`` is zero; names left out are numbered from 1.

    Raises
    ------
    ShapeError
        The arrays do not fit together.
    MatrixError
        An entry is not finite.
    """

    A: Array
    B: Array | None = None
    C: Array | None = None
    D: Array | None = None
    states: tuple[str, ...] = ()
    inputs: tuple[str, ...] = ()
    outputs: tuple[str, ...] = ()

    def transition(self, time_s: float) -> Array:
        """The state transition matrix Phi(t) = exp(A t), (s, s); see `vib.response.transition`."""
        from vib.response.transition import transition

        return transition(self.A, time_s)


def state_space(
    system: System,
    inputs: Sequence[Place] | None = None,
    outputs: Sequence[Place] | None = None,
    quantity: Quantity = "displacement",
) -> StateSpace:
    """The first-order model of a system for chosen inputs and outputs."""
    raise NotImplementedError
