"""All undamped modes of a system of moderate size, computed once however often they are asked for."""

from __future__ import annotations

from weakref import WeakKeyDictionary

from vib.solve.dense import dense_undamped
from vib.solve.undamped import Undamped
from vib.system import System

_KNOWN: WeakKeyDictionary[System, Undamped] = WeakKeyDictionary()


def every_mode(system: System) -> Undamped:
    """All finite undamped modes; systems can't change, so they are kept as long as the system is.

    Raises
    ------
    MatrixError, AccuracyError
        As `vib.solve.dense.dense_undamped`.
    """
    found = _KNOWN.get(system)
    if found is None:
        found = _KNOWN[system] = dense_undamped(system.mass, system.stiffness)
    return found
