"""How bad predicted vibration is: zones of the standards, limits of the user's own, separation margins.

Rooms: ``standards`` (zone boundaries and bands), ``support`` (rigid or flexible along each axis), ``levels``
(r.m.s. values from the lines of a run-up), ``own`` (the user's own limits), ``margins`` (critical speeds
against running speeds), ``severity`` (the noun), ``judging`` (how it is made), ``consequence`` (what it comes
to where one line meets one mode).
"""

from vib.severity.judging import judge
from vib.severity.severity import Judged, Severity

__all__ = ["Judged", "Severity", "judge"]
