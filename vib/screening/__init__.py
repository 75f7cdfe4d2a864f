"""Resonance screening: which modes lie too near to what shakes the machine.

Rooms: ``lines`` (what an excitation means in Hz, and its band), ``drive`` (how strongly a mode can be driven
from a place), ``judgement`` (one mode against one line), ``screening`` (all modes against all lines).
"""

from vib.screening.judgement import Row, Verdict
from vib.screening.lines import DEFAULT_BAND, Line, excitation_lines, highest_needed_hz
from vib.screening.screening import KeepOut, Screening, SpeedDiagram, screen

__all__ = [
    "DEFAULT_BAND",
    "KeepOut",
    "Line",
    "Row",
    "Screening",
    "SpeedDiagram",
    "Verdict",
    "excitation_lines",
    "highest_needed_hz",
    "screen",
]
