"""The files of ``vib respond --out``: tables and arrays whose names carry their units, and pictures."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import numpy as np

from vib.show.documents import to_json
from vib.show.files import csv_bytes, npz_bytes
from vib.show.tables.respond import Responses, response_unit
from vib.units import UnitSystem

if TYPE_CHECKING:
    from vib.response.frequency import FrequencyResponse
    from vib.response.respond import Response

_UNITS = {False: ("m", "m_s", "m_s2"), True: ("rad", "rad_s", "rad_s2")}


def respond_files(
    found: Responses, document: dict[str, Any], units: UnitSystem, pictures: str
) -> dict[str, bytes]:
    """respond.json, the record and the frequency response as CSV and npz, and pictures of both."""
    from vib.show.figures.responding import respond_pictures

    files = {"respond.json": to_json(document).encode()}
    if found.record is not None:
        columns = record_columns(found.record)
        files["record.csv"] = csv_bytes(_rows(columns))
        files["record.npz"] = npz_bytes(
            {
                "time_s": found.record.time_s,
                "displacement_m": found.record.displacement_m,
                "velocity_m_s": found.record.velocity_m_s,
                "acceleration_m_s2": found.record.acceleration_m_s2,
                "outputs": list(found.record.freedoms),
                "rotational": list(found.record.rotational),
                **({} if found.record.relative_m is None else {"relative_m": found.record.relative_m}),
            }
        )
    if found.lines is not None:
        files["frequency_response.csv"] = csv_bytes(_rows(line_columns(found.lines)))
        files["frequency_response.npz"] = npz_bytes(
            {
                "frequency_hz": found.lines.lines_hz,
                "transmissibility" if found.lines.ground else "receptance": found.lines.receptance,
                "error": found.lines.error,
                "inputs": list(found.lines.inputs),
                "outputs": list(found.lines.outputs),
                "units": [
                    [response_unit(found.lines, o, i, "receptance") for i in range(len(found.lines.inputs))]
                    for o in range(len(found.lines.outputs))
                ],
            }
        )
    return files | dict(picture.content(pictures) for picture in respond_pictures(found, units))


def record_columns(record: Response) -> dict[str, Any]:
    """Time, then displacement, velocity, acceleration of each output; the unit is in each name."""
    columns: dict[str, Any] = {"time_s": record.time_s}
    arrays = [record.displacement_m, record.velocity_m_s, record.acceleration_m_s2]
    for order, (quantity, array) in enumerate(
        zip(("displacement", "velocity", "acceleration"), arrays, strict=True)
    ):
        for place, name in enumerate(record.freedoms):
            unit = _UNITS[record.rotational[place]][order]
            columns[f"{quantity}_{unit} {name}"] = array[:, place]
    if record.relative_m is not None:
        for place, name in enumerate(record.freedoms):
            columns[f"relative_{_UNITS[record.rotational[place]][0]} {name}"] = record.relative_m[:, place]
    return columns


def line_columns(lines: FrequencyResponse) -> dict[str, Any]:
    """Frequency, then real and imaginary part of each pair of channels; the unit is in each name."""
    columns: dict[str, Any] = {"frequency_hz": lines.lines_hz}
    word = "transmissibility" if lines.ground else "receptance"
    for given, source in enumerate(lines.inputs):
        for output, name in enumerate(lines.outputs):
            unit = response_unit(lines, output, given, "receptance")
            label = f"{name} by {source}{f' [{unit}]' if unit else ''}"
            columns[f"{word} real {label}"] = lines.receptance[:, output, given].real
            columns[f"{word} imag {label}"] = lines.receptance[:, output, given].imag
    return columns


def _rows(columns: dict[str, Any]) -> list[dict[str, Any]]:
    lists = [np.asarray(column).tolist() for column in columns.values()]
    return [dict(zip(columns, row, strict=True)) for row in zip(*lists, strict=True)]
