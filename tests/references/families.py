"""The families of reference cases, with the heading each has in docs/validation.md."""

from __future__ import annotations

from types import ModuleType

from tests.references import bands, beams, driven, forced, frames, lumped, scattered, severities, times
from tests.references.common import BUILDERS

FAMILIES: dict[ModuleType, str] = {
    beams: "Beams and rods",
    frames: "Frames",
    lumped: "Lumped systems, damped systems, rotors",
    times: "Transition matrices, decay, pulses",
    forced: "Forced vibration, frequency response, isolation",
    driven: "Excitations",
    bands: "Screening",
    severities: "Severity",
    scattered: "Tolerances",
}


def family_of(name: str) -> ModuleType:
    """The module that runs an entry of the data file."""
    return next(family for family in FAMILIES if family.__name__ == BUILDERS[name].__module__)
