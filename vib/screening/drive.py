"""How strongly a mode can be driven from the place and in the direction of an excitation."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from vib.amplitudes import amplitude, greatest_translation
from vib.errors import ModelError
from vib.system import COMPONENTS

if TYPE_CHECKING:
    from vib.modes import Modes
    from vib.study.excitations import Excitation
    from vib.system import Place

Array = NDArray[np.float64]

HARDLY_DRIVEN = 0.05  # a convention of this package: below this share a mode counts as hardly driven


def drive(modes: Modes, excitation: Excitation) -> Array | None:
    """Motion of each mode at the place of an excitation, as a share of its greatest motion anywhere.

    A force at a place drives a mode in proportion to the mode's displacement there along the force (the
    modal force is the shape times the force; Ewins, Modal Testing, 2000, section 2.4), so a mode that
    hardly moves there can hardly be driven from there.

    * Force: translation at the place along the direction, over the greatest translation of any drawn node
      or named place. Without a direction: the greatest translation at the place in any direction. The
      greatest translation is taken as no less than sqrt(modal mass / mass of the whole), which it can't be
      unless part of the modal mass turns: so a mode of pure twisting, which moves nowhere, is hardly driven.
    * Moment (``along`` = rx, ry, rz): rotation at the place about that axis, over the greatest rotation of
      any named place, or over the greatest translation divided by the greatest extent of the structure
      where that is more (a mode that only translates is not driven by a moment).
    * Bare matrices: the freedom's own share of the greatest freedom of the shape; freedoms of different
      units (displacements beside rotations) are compared as they are.

    Parameters
    ----------
    modes
        m modes.
    excitation
        Its ``at`` and ``along`` are used.

    Returns
    -------
    numpy.ndarray or None
        (m,) from 0 to 1. None where the excitation has no place, or where the stiffness is declared
        unsymmetric: there the shape at the place does not tell how strongly a mode is driven.

    Raises
    ------
    ModelError
        No such place or component, or it is held there.
    """
    if excitation.at is None or modes.system.unsymmetric:
        return None
    shapes = np.asarray(modes.shapes)
    anatomy = modes.system.anatomy
    place = anatomy.places.get(excitation.at) if anatomy else None
    if place is None:
        return _bare_drive(modes, excitation, shapes)
    if excitation.along is None:
        at_place = amplitude(_motion(place, shapes)[:3])
        if not place.motion[:3].count_nonzero():
            raise ModelError(f"{place.name}: it is held in every direction and can't be driven there.")
        return _share(at_place, greatest_translation(modes.system, shapes))
    along = excitation.along
    at_place = np.abs(modes.system.direction(excitation.at, along) @ shapes)
    if isinstance(along, str) and along.lstrip("-") in COMPONENTS[3:]:
        return _share(at_place, _greatest_rotation(modes, shapes))
    return _share(at_place, greatest_translation(modes.system, shapes))


def _bare_drive(modes: Modes, excitation: Excitation, shapes: NDArray[Any]) -> Array:
    system = modes.system
    assert excitation.at is not None
    greatest = np.abs(shapes).max(axis=0)
    rows = [
        row
        for row, freedom in enumerate(system.freedoms)
        if freedom.point == excitation.at and freedom.component in COMPONENTS[:3]
    ]
    if excitation.along is None and rows:
        return _share(amplitude(shapes[rows]), greatest)
    return _share(np.abs(system.direction(excitation.at, excitation.along) @ shapes), greatest)


def _motion(place: Place, shapes: NDArray[Any]) -> NDArray[Any]:
    """The six components of a place in each mode, (6, m)."""
    moved: NDArray[Any] = np.asarray(place.motion @ shapes)
    return moved


def _greatest_rotation(modes: Modes, shapes: NDArray[Any]) -> Array:
    """(m,) greatest rotation of any named place, and no less than greatest translation over extent."""
    anatomy = modes.system.anatomy
    assert anatomy is not None
    places = anatomy.places.values()
    rotation: Array = np.max([amplitude(_motion(place, shapes)[3:]) for place in places], axis=0)
    positions = np.vstack([anatomy.wireframe.nodes_m, *(place.position_m for place in places)])
    extent = float(np.linalg.norm(np.ptp(positions, axis=0)))
    if not extent:
        return rotation
    return np.maximum(rotation, greatest_translation(modes.system, shapes) / extent)


def _share(part: Array, whole: Array) -> Array:
    """part / whole, 0 where the whole is 0."""
    share: Array = np.divide(part, whole, out=np.zeros_like(part), where=whole > 0)
    return np.minimum(share, 1.0)  # above 1 by round-off only
