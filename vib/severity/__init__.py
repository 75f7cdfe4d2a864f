"""How bad predicted vibration is: zones of the standards, limits of the user's own, separation margins.

Rooms: ``standards`` (zone boundaries and bands), ``support`` (rigid or flexible along each axis), ``levels``
(r.m.s. values from the lines of a run-up), ``own`` (the user's own limits), ``margins`` (critical speeds
against running speeds), ``severity`` (the noun, and how it is made).
"""

from vib.severity.severity import Judged, Severity, judge

__all__ = ["Judged", "Severity", "judge"]
