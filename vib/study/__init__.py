"""The study file: its schema, how it is read, sections, materials, starters.

Rooms: ``quantities`` (types with units), ``geometry`` and ``machine`` (the tables), ``schema`` (the study),
``reading`` (file to study), ``names`` (cross-references), ``lines`` (where an entry stands in the file),
``matrices`` (files of numbers), ``profiles``, ``catalogue``, ``materials``, ``starters``.
"""

from vib.study.reading import read
from vib.study.schema import Study

__all__ = ["Study", "read"]
