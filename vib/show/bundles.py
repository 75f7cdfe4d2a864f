"""The files of ``--out``: which tables, arrays and pictures each answer is written as."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from typing import TYPE_CHECKING, Any

from vib.show.documents import modes_document, to_json
from vib.show.files import csv_bytes, npz_bytes

if TYPE_CHECKING:
    from vib.modes import Modes
    from vib.response.ring import Ring
    from vib.screening import Screening
    from vib.show.figures.canvas import Picture
    from vib.speeds import SpeedCurves
    from vib.structure.survey import Survey
    from vib.study import Study
    from vib.units import UnitSystem


def check_files(study: Study, survey: Survey, document: dict[str, Any], pictures: str) -> dict[str, bytes]:
    """check.json, the tables of members and parts, and a drawing of a structure."""
    import numpy as np

    from vib.show.figures.structure import structure_picture

    found = {"check.json": to_json(document).encode()}
    if study.matrices is not None or any(not region.use for region in survey.regions):
        return found
    for name in ("parts", "members"):
        if document[name]:
            found[f"{name}.csv"] = csv_bytes(document[name])
    frames = [(np.array(run.origin_m), np.array([run.x, run.y, run.z])) for run in survey.runs]
    return found | _drawn([structure_picture(study, study.system(), frames)], pictures)


def modes_files(
    modes: Modes, title: str, pictures: str, up: str, curves: Sequence[SpeedCurves] = ()
) -> dict[str, bytes]:
    """modes.json, modes.csv, shapes.npz, of a structure shapes.vtu, and one picture per mode and shaft."""
    from vib.show.figures.curves import curve_picture
    from vib.show.figures.shapes import shape_picture

    document = modes_document(modes, title, curves)
    found = {
        "modes.json": to_json(document).encode(),
        "modes.csv": csv_bytes(document["modes"]),
        "shapes.npz": npz_bytes(_shape_arrays(modes)),
    }
    if modes.system.anatomy is not None:
        from vib.show.viewer import vtu_bytes

        found["shapes.vtu"] = vtu_bytes(modes)
    shapes = [shape_picture(modes, index, up) for index in range(modes.count)]
    against = [
        curve_picture(shaft, f"against_speed_{number:02d}") for number, shaft in enumerate(curves, start=1)
    ]
    return found | _drawn(shapes + against, pictures)


def _shape_arrays(modes: Modes) -> dict[str, Any]:
    """Shapes by freedom; of a mesh by node, as its freedoms are too many to be named one by one."""
    import numpy as np

    found = {
        "frequencies_hz": modes.frequencies_hz,
        "damping_ratios": modes.damping_ratios,
        "eigenvalues_per_s": modes.eigenvalues,
        "shapes": modes.shapes,
    }
    mesh = modes.system.anatomy.mesh if modes.system.anatomy is not None else None
    if mesh is None:
        return found | {"freedoms": [str(freedom) for freedom in modes.system.freedoms]}
    moved = np.asarray(mesh.motion @ modes.shapes).reshape(len(mesh.nodes_m), 3, -1)
    return found | {"nodes_m": mesh.nodes_m, "displacements": moved}


def ring_files(ring: Ring, document: dict[str, Any], units: UnitSystem, pictures: str) -> dict[str, bytes]:
    """ring.json, the history as CSV and npz, and pictures of history and contributions."""
    from vib.show.figures.ringing import ring_pictures
    from vib.show.tables.ring import history_columns

    columns = history_columns(ring)
    rows = [dict(zip(columns, row, strict=True)) for row in zip(*columns.values(), strict=True)]
    found = {
        "ring.json": to_json(document).encode(),
        "ring.csv": csv_bytes(rows),
        "ring.npz": npz_bytes(
            {
                "time_s": ring.time_s,
                "displacement_m": ring.displacement_m,
                "velocity_m_s": ring.velocity_m_s,
                "acceleration_m_s2": ring.acceleration_m_s2,
                "outputs": list(ring.freedoms),
                "rotational": list(ring.rotational),
            }
        ),
    }
    return found | _drawn(ring_pictures(ring, units), pictures)


def screening_files(
    screening: Screening,
    modes: Modes,
    document: dict[str, Any],
    pictures: str,
    curves: Sequence[SpeedCurves] = (),
) -> dict[str, bytes]:
    """screening.json, screening.csv and one speed-frequency diagram per excitation."""
    from vib.show.figures.speeds import speed_pictures

    found = {
        "screening.json": to_json(document).encode(),
        "screening.csv": csv_bytes(document["rows"]),
    }
    return found | _drawn(speed_pictures(screening, modes, curves), pictures)


def _drawn(pictures: Iterable[Picture], kind: str) -> dict[str, bytes]:
    return dict(picture.content(kind) for picture in pictures)
