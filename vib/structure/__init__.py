"""From a study to matrices: elements, ties, assembly, and what `check` prints.

Rooms: ``beam`` (the element), ``rigid`` and ``axes`` (geometry), ``members``, ``springs``, ``bodies``
(tables to arrays), ``ties`` (what moves with what), ``layout`` (all of it, uncut), ``division`` (how
finely it is cut), ``freedoms`` and ``assembly`` (cut, numbered, summed), ``picture`` and ``remarks``
(what people look at), ``build`` (the way through), ``survey`` and ``sag``
(mass, supports, sag).
"""

from vib.structure.build import build_system
from vib.structure.survey import Survey, survey

__all__ = ["Survey", "build_system", "survey"]
