"""Scatter and sweeps: what the tolerances of a study do to its frequencies, damping and levels.

Rooms: ``sampling`` (points and distributions), ``family``, ``interpolation``, ``pattern`` (matrices as
functions of the quantities), ``reanalysis``, ``evaluator`` and what they use (modes of many samples),
``engine`` (which modes, and where the work is done), ``levels`` (predicted vibration), ``statistics``,
``chances``, ``ranking``, ``sensitivity`` (what the samples say), ``scatter`` and ``sweep`` (the two nouns).

The package can be called: ``vib.scatter(study)`` is `vib.scatter.scatter.scatter`.
"""

from __future__ import annotations

import sys
from types import ModuleType
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from vib.scatter.scatter import Scatter


class _Room(ModuleType):
    """This package, which Python binds to the name ``vib.scatter`` that the function goes by as well."""

    def __call__(self, *arguments: Any, **more: Any) -> Scatter:
        """See `vib.scatter.scatter.scatter`."""
        from vib.scatter.scatter import scatter

        return scatter(*arguments, **more)


sys.modules[__name__].__class__ = _Room
