"""Where a force acts and along what: along a component, a direction, or turning with a shaft."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from vib.errors import ModelError
from vib.study.quantities import Along
from vib.system import COMPONENTS, System

Array = NDArray[np.float64]
Weights = tuple[complex, ...]


@dataclass(frozen=True)
class Aim:
    """A unit force at a place: ``weights`` (6,) complex along x, y, z and about them.

    On bare matrices there are no weights; ``along`` then says which freedom, as in `System.direction`.
    """

    place: str
    weights: Weights = ()
    along: Along | None = None

    def parts(self, system: System) -> Iterator[tuple[complex, Aim, Array]]:
        """Real forces that make it up: a factor, the aim of the force, and its vector (n,) on the freedoms.

        The vector is zero where the place is held along it.
        """
        if not self.weights:
            yield 1.0, self, system.direction(self.place, self.along)
            return
        assert system.anatomy is not None
        motion = system.anatomy.places[self.place].motion
        turned = np.array(self.weights)
        for factor, part in ((1.0 + 0j, turned.real), (1j, turned.imag)):
            if part.any():
                aim = Aim(self.place, tuple(part.astype(complex).tolist()))
                yield factor, aim, np.asarray(part @ motion, dtype=np.float64).ravel()


def aim_along(system: System, place: str, along: Along | None) -> Aim:
    """A force along a component or a direction.

    Raises
    ------
    ModelError
        No such place or freedom, or no direction where one is needed.
    """
    if system.anatomy is None or place not in system.anatomy.places:
        system.direction(place, along)  # raises where there is no such freedom
        return Aim(place, along=along)
    if along is None:
        raise ModelError(f"{place}: say along which component the force acts, one of {', '.join(COMPONENTS)}")
    found = np.zeros(6)
    if isinstance(along, str):
        found[COMPONENTS.index(along.lstrip("+-"))] = -1.0 if along.startswith("-") else 1.0
    else:
        found[:3] = np.asarray(along) / np.linalg.norm(along)
    return Aim(place, tuple(found.astype(complex).tolist()))


def aim_turning(system: System, place: str, axis: Sequence[float]) -> Aim:
    """A force that turns with a shaft about ``axis``, at angle zero at t = 0.

    e1 cos(w t) + e2 sin(w t) = Re((e1 - i e2) exp(i w t)), see `across`.

    Raises
    ------
    ModelError
        No such place in a structure.
    """
    if system.anatomy is None or place not in system.anatomy.places:
        raise ModelError(
            f"{place}: a turning force needs a place of a structure; state forces along freedoms"
        )
    first, second = across(axis)
    turned = first - 1j * second
    return Aim(place, (*turned.tolist(), 0j, 0j, 0j))


def across(axis: Sequence[float]) -> tuple[Array, Array]:
    """Two unit vectors across an axis: the one where angles begin, and the one a quarter turn on.

    Angles begin at the next global axis after the one nearest to the shaft (y for a shaft along x, z for y,
    x for z), made square to the shaft, and grow the way the fingers of the right hand curl round ``axis``.
    """
    along = np.asarray(axis, dtype=np.float64) / np.linalg.norm(axis)
    near = np.eye(3)[(int(np.argmax(np.abs(along))) + 1) % 3]
    first = near - (near @ along) * along
    first = first / np.linalg.norm(first)
    return first, np.cross(along, first)
