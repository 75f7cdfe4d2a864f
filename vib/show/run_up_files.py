"""The files of ``vib respond --run-up --out``: levels over the speed, phasors, severity, and pictures."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import numpy as np

from vib.show.documents import to_json
from vib.show.files import csv_bytes, npz_bytes
from vib.show.tables.run_up import RunUps
from vib.units import UnitSystem

if TYPE_CHECKING:
    from vib.response.run_up import RunUp


def run_up_files(
    found: RunUps, document: dict[str, Any], units: UnitSystem, pictures: str
) -> dict[str, bytes]:
    """run_up.json, run_up.csv, run_up.npz, severity.csv where it was judged, and pictures."""
    from vib.show.figures.running import run_up_pictures

    files = {
        "run_up.json": to_json(document).encode(),
        "run_up.csv": csv_bytes(_rows(run_up_columns(found.run_up))),
        "run_up.npz": npz_bytes(run_up_arrays(found.run_up)),
    }
    if found.severity is not None:
        files["severity.csv"] = csv_bytes([_level(row.to_dict()) for row in found.severity.rows])
    drawn = run_up_pictures(found.run_up, found.severity, units)
    return files | dict(picture.content(pictures) for picture in drawn)


def run_up_columns(run_up: RunUp) -> dict[str, Any]:
    """The speed, then r.m.s. and bound of each output and the bound of each force; units are in the names."""
    columns: dict[str, Any] = {"speed_rpm": 60 * run_up.speed_hz}
    levels = (
        ("velocity_rms", ("m_s", "rad_s"), run_up.velocity_rms_m_s),
        ("displacement_rms", ("m", "rad"), run_up.displacement_rms_m),
        ("displacement_at_most", ("m", "rad"), run_up.displacement_peak_m),
    )
    for quantity, unit, values in levels:
        for column, name in enumerate(run_up.outputs):
            columns[f"{quantity}_{unit[run_up.rotational[column]]} {name}"] = values[:, column]
    if run_up.transmitted is not None:
        given, peak = run_up.transmitted, run_up.transmitted_peak_n
        for column, (name, component) in enumerate(zip(given.names, given.components, strict=True)):
            word = "moment_at_most_n_m" if component.startswith("r") else "force_at_most_n"
            columns[f"{word} {name}"] = peak[:, column]
    return columns


def run_up_arrays(run_up: RunUp) -> dict[str, Any]:
    """Complex phasors of every line, SI, and what they belong to."""
    found: dict[str, Any] = {
        "speed_hz": run_up.speed_hz,
        "frequency_hz": np.stack([line.frequency_hz for line in run_up.lines], axis=1),
        "displacement_m": run_up.displacement_m,
        "error_m": run_up.error_m,
        "velocity_rms_m_s": run_up.velocity_rms_m_s,
        "outputs": list(run_up.outputs),
        "rotational": list(run_up.rotational),
        "lines": [line.words for line in run_up.lines],
    }
    if run_up.transmitted is not None:
        found["force_n"] = run_up.transmitted.force_n
        found["force_names"] = list(run_up.transmitted.names)
    return found


def _level(row: dict[str, Any]) -> dict[str, Any]:
    """A row with its boundaries side by side, such as ``velocity_rms_a_b_m_s``."""
    limits = row.pop("limits")
    for limit in limits:
        numbers = {key: value for key, value in limit.items() if key not in ("quantity", "source")}
        row |= {f"{limit['quantity']}_{key}": value for key, value in numbers.items()}
    return row


def _rows(columns: dict[str, Any]) -> list[dict[str, Any]]:
    lists = [np.asarray(column).tolist() for column in columns.values()]
    return [dict(zip(columns, row, strict=True)) for row in zip(*lists, strict=True)]
