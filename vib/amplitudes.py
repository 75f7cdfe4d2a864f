"""How far places move in the shapes of modes: what a mode is measured by at a place."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

if TYPE_CHECKING:
    from vib.system import System

Array = NDArray[np.float64]


def amplitude(components: NDArray[Any]) -> Array:
    """Greatest displacement during a cycle, (..., m), from complex components (..., 3 or fewer, m).

    The real part of v exp(i t) runs along an ellipse whose half axis squared is (|v|^2 + |v . v|) / 2.
    """
    squared = (np.abs(components) ** 2).sum(axis=-2)
    plain = np.abs((components**2).sum(axis=-2))
    found: Array = np.sqrt((squared + plain) / 2.0)
    return found


def greatest_translation(system: System, shapes: NDArray[Any]) -> Array:
    """(m,) greatest translation of any drawn node or named place of a structure in each shape (n, m).

    It is taken as no less than sqrt(modal mass / mass of the whole), which it can't be unless part of the
    modal mass turns: so a shape of pure twisting, which moves nowhere, counts as one that hardly moves.
    """
    anatomy = system.anatomy
    assert anatomy is not None
    nodes = np.asarray(anatomy.wireframe.motion @ shapes)
    drawn = amplitude(nodes.reshape(len(nodes) // 3, 3, shapes.shape[1]))
    places = anatomy.places.values()
    named = [amplitude(np.asarray(place.motion @ shapes)[:3])[np.newaxis] for place in places]
    greatest: Array = np.concatenate([drawn, *named]).max(axis=0)
    modal_mass = (shapes.conj() * (system.mass @ shapes)).sum(axis=0).real
    whole = float(anatomy.rigid_mass[0, 0])
    return np.maximum(greatest, np.sqrt(modal_mass / whole)) if whole > 0 else greatest
