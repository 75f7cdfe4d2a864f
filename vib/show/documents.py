"""The nouns as JSON documents; every field name carries its unit, every figure is SI."""

from __future__ import annotations

import json
import math
from collections.abc import Iterable, Mapping, Sequence
from typing import TYPE_CHECKING, Any

from vib.show.words import CAUTION

if TYPE_CHECKING:
    from vib.modes import Modes
    from vib.speeds import SpeedCurves

_DIRECTIONS = ("x", "y", "z", "rx", "ry", "rz")
_MASS_UNITS = ("kg", "kg", "kg", "kg_m2", "kg_m2", "kg_m2")


def to_json(document: Mapping[str, Any]) -> str:
    """One JSON document as text; NaN and infinity, which JSON has not, become null."""
    return json.dumps(clean(document), indent=2, allow_nan=False, ensure_ascii=True)


def clean(value: Any) -> Any:
    """Arrays to lists, numpy figures to Python's, NaN and infinity to None, tuples to lists."""
    if value is None or isinstance(value, bool | int | str):
        return value
    if isinstance(value, float):
        return float(value) if math.isfinite(value) else None
    if isinstance(value, Mapping):
        return {str(key): clean(entry) for key, entry in value.items()}
    if hasattr(value, "tolist"):
        return clean(value.tolist())
    if isinstance(value, complex):
        return {"real": clean(value.real), "imag": clean(value.imag)}
    if isinstance(value, Iterable):
        return [clean(entry) for entry in value]
    return str(value)


def modes_document(modes: Modes, title: str, curves: Sequence[SpeedCurves] = ()) -> dict[str, Any]:
    """What ``vib modes --json`` prints; ``curves`` are the modes against the speed of each shaft."""
    against = {"against_speed": [shaft.to_dict() for shaft in curves]} if curves else {}
    return {
        "title": title,
        "modes": [_mode(modes, index) for index in range(modes.count)],
        "rigid_body_modes": modes.rigid_body_count,
        "rigid_body_motions": list(modes.rigid_descriptions),
        "stable": modes.stable,
        "stability_known": modes.stability_known,
        "complete_below_hz": modes.complete_below_hz,
        "proportional_damping": modes.proportional,
        "damping_note": modes.damping_note,
        **against,
        "remarks": list(modes.remarks),
        "caution": CAUTION,
    }


def _mode(modes: Modes, index: int) -> dict[str, Any]:
    eigenvalue = modes.eigenvalues[index]
    found: dict[str, Any] = {
        "number": index + 1,
        "frequency_hz": modes.frequencies_hz[index],
        "damped_frequency_hz": modes.damped_frequencies_hz[index],
        "undamped_frequency_hz": modes.undamped_frequencies_hz[index],
        "damping_ratio": modes.damping_ratios[index],
        "error_hz": modes.errors_hz[index],
        "eigenvalue": {"real_per_s": eigenvalue.real, "imag_rad_per_s": eigenvalue.imag},
        "condition": modes.condition[index],
        "backward_error": modes.backward_errors[index],
        "description": modes.descriptions[index],
    }
    if modes.effective_mass is not None:
        found["effective_mass"] = {
            f"{direction}_{unit}": modes.effective_mass[index, column]
            for column, (direction, unit) in enumerate(zip(_DIRECTIONS, _MASS_UNITS, strict=True))
        }
    for name, shares in (
        ("strain_energy_share", modes.strain_energy),
        ("kinetic_energy_share", modes.kinetic_energy),
    ):
        if shares is not None:
            found[name] = {part: values[index] for part, values in shares.items()}
    return found
