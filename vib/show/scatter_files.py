"""The files of ``--out`` of scatter and sweeps."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from vib.show.documents import to_json
from vib.show.figures.scatter import scatter_pictures
from vib.show.figures.sweep import sweep_pictures
from vib.show.files import csv_bytes, npz_bytes
from vib.show.tables.sweep import sweep_rows
from vib.units import UnitSystem

if TYPE_CHECKING:
    from vib.scatter.scatter import Scatter
    from vib.scatter.sweep import Sweep


def scatter_files(
    found: Scatter, document: dict[str, Any], units: UnitSystem, pictures: str
) -> dict[str, bytes]:
    """scatter.json, the probabilities as CSV, every sample in scatter.npz, and pictures."""
    contents = {"scatter.json": to_json(document).encode()}
    if document["bands"]:
        contents["bands.csv"] = csv_bytes(document["bands"])
    contents["scatter.npz"] = npz_bytes(
        {"entries": list(found.factors.paths), "values_si": found.values, **found.batch.arrays()}
    )
    return contents | dict(picture.content(pictures) for picture in scatter_pictures(found, units))


def sweep_files(found: Sweep, document: dict[str, Any], units: UnitSystem, pictures: str) -> dict[str, bytes]:
    """sweep.json, sweep.csv value by value, and a picture."""
    contents = {
        "sweep.json": to_json(document).encode(),
        "sweep.csv": csv_bytes(sweep_rows(found)),
    }
    return contents | dict(picture.content(pictures) for picture in sweep_pictures(found, units))
