"""A study read back as blocks and as a JSON document: mass, supports, sag, axes, assumptions."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

from vib.show.blocks import Block, Bullets, Column, Facts, Heading, Table, text_column, unit_label
from vib.show.numbers import MISSING, aligned, joined, significant
from vib.show.words import CAUTION, caution
from vib.units import UnitSystem, shown, shown_unit, text

if TYPE_CHECKING:
    from vib.structure.survey import Survey
    from vib.study import Study

_MOST_ROWS = 30
_KINDS = {"members": "members", "springs": "springs", "body": "rigid body", "cells": "cells of the mesh"}


def check_blocks(study: Study, survey: Survey, units: UnitSystem) -> list[Block]:
    """All that the ``check`` command shows."""
    blocks: list[Block] = [Heading(study.title), facts(study, survey, units)]
    for table in (
        region_table(survey),
        part_table(survey, units),
        support_table(survey),
        sag_table(survey, units),
        reaction_table(survey, units),
        axes_table(survey, units),
    ):
        if table is not None:
            blocks.append(table)
    return [*blocks, *assumption_blocks(survey.remarks), caution()]


def facts(study: Study, survey: Survey, units: UnitSystem) -> Facts:
    """Mass, centre, size and greatest sag in a few lines."""
    rows = []
    if survey.mass_kg is not None:
        rows.append(("mass", text(survey.mass_kg, "mass", units, digits=5)))
    if survey.centre_m is not None:
        rows.append(
            ("centre of mass", f"{_triple(survey.centre_m, 'length', units)} {shown_unit('length', units)}")
        )
    if survey.inertia_kg_m2 is not None:
        diagonal = [survey.inertia_kg_m2[i, i] for i in range(3)]
        unit = unit_label(shown_unit("inertia", units))
        rows.append(("inertia about it", f"{_triple(diagonal, 'inertia', units)} {unit} (about x, y, z)"))
    rows.append(("gravity", f"along -{study.up}" if study.matrices is None else MISSING))
    if survey.sag is not None:
        greatest = text(survey.sag.greatest_m, "length", units, digits=3)
        rows.append(("greatest sag", f"{greatest} at {survey.sag.greatest_at}"))
    rows.append(("freedoms", _freedoms(study, survey)))
    if study.matrices is not None:
        given = [
            name for name in ("mass", "stiffness", "damping", "gyroscopic") if getattr(study.matrices, name)
        ]
        rows = [("matrices", joined(given)), ("freedoms", str(survey.freedoms))]
    rows.append(("accuracy asked", f"{100 * study.accuracy:.3g} % of each frequency"))
    return Facts(tuple(rows))


def _freedoms(study: Study, survey: Survey) -> str:
    if study.mesh is not None:
        return str(survey.freedoms)
    return f"{survey.freedoms} (members are cut finer where accuracy asks for it)"


def region_table(survey: Survey) -> Table | None:
    """The regions of the mesh file, and what the study makes of each."""
    if not survey.regions:
        return None
    rows = [
        (region.name, kind, str(count), region.use or "not yet assigned")
        for region in survey.regions
        for kind, count in region.cells.items()
    ]
    columns = (text_column("region"), text_column("kind of cell"), Column("cells"), text_column("use"))
    return Table("Regions of the mesh", columns, _first(rows, 4))


def part_table(survey: Survey, units: UnitSystem) -> Table | None:
    """What the structure is made of."""
    if not survey.parts:
        return None
    rows = [
        (
            part.name,
            _KINDS[part.kind],
            MISSING if part.length_m is None else significant(shown(part.length_m, "length", units), 5),
            significant(shown(part.mass_kg, "mass", units)),
        )
        for part in survey.parts
    ]
    rows.append(("all", "", "", significant(shown(survey.mass_kg or 0.0, "mass", units))))
    columns = (
        text_column("part"),
        text_column("kind"),
        Column("length", shown_unit("length", units)),
        Column("mass", shown_unit("mass", units)),
    )
    return Table("Parts", columns, tuple(rows), sums=1)


def support_table(survey: Survey) -> Table | None:
    """Where the structure is held, and by what it stands on the ground."""
    rows = [
        (
            supported.point if supported.nodes == 1 else f"{supported.point} ({supported.nodes} nodes)",
            "support",
            _held(supported.components),
        )
        for supported in survey.supports
    ]
    rows += [(label, "spring or dashpot to ground", "") for label in survey.grounded]
    if not rows:
        return None
    return Table("Supports", (text_column("at"), text_column("by"), text_column("held")), _first(rows, 3))


def sag_table(survey: Survey, units: UnitSystem) -> Table | None:
    """The displacement under its own weight, largest first."""
    if survey.sag is None:
        return None
    ranked = sorted(
        survey.sag.displacement_m.items(), key=lambda entry: -sum(part * part for part in entry[1])
    )
    largest = max(abs(part) for _, moved in ranked for part in moved)
    rows = [(name, *_in_units(moved, largest, "length", units)) for name, moved in ranked]
    unit = shown_unit("length", units)
    columns = (text_column("place"), *(Column(axis, unit) for axis in "xyz"))
    return Table("Sag under its own weight", columns, _first(rows, 4))


def reaction_table(survey: Survey, units: UnitSystem) -> Table | None:
    """The forces that carry the weight."""
    if survey.sag is None or not survey.sag.reactions:
        return None
    reactions = survey.sag.reactions
    whole = [sum(reaction.force_n[axis] for reaction in reactions) for axis in range(3)]
    largest = max(abs(part) for reaction in reactions for part in reaction.force_n)
    rows = [(reaction.name, *_in_units(reaction.force_n, largest, "force", units)) for reaction in reactions]
    shown_rows = _first(rows, 4)
    sums = ("all", *_in_units(whole, largest, "force", units))
    unit = shown_unit("force", units)
    columns = (text_column("carried by"), *(Column(axis, unit) for axis in "xyz"))
    return Table("Forces that carry the weight", columns, (*shown_rows, sums), sums=1)


def axes_table(survey: Survey, units: UnitSystem) -> Table | None:
    """How the sections stand: the direction of each member's own y (width) and z (height)."""
    if not survey.runs:
        return None
    rows = [
        (
            run.group,
            f"{run.start} to {run.end}",
            significant(shown(run.length_m, "length", units), 5),
            _direction(run.y),
            _direction(run.z),
        )
        for run in survey.runs
    ]
    columns = (
        text_column("members"),
        text_column("own x from"),
        Column("length", shown_unit("length", units)),
        text_column("own y (width)"),
        text_column("own z (height)"),
    )
    return Table("Members and their own axes", columns, _first(rows, 5))


def assumption_blocks(remarks: Sequence[str]) -> list[Block]:
    """What was taken as rigid, massless, undamped or left out."""
    if not remarks:
        return []
    return [Heading("Assumptions and remarks"), Bullets(tuple(remarks))]


def check_document(study: Study, survey: Survey) -> dict[str, Any]:
    """What ``vib check --json`` prints."""
    sag = survey.sag
    return {
        "title": study.title,
        "kind": "matrices" if study.matrices is not None else "structure",
        "mass_kg": survey.mass_kg,
        "centre_of_mass_m": survey.centre_m,
        "inertia_about_centre_kg_m2": survey.inertia_kg_m2,
        "freedoms": survey.freedoms,
        "up": study.up,
        "accuracy": study.accuracy,
        "parts": [
            {"name": part.name, "kind": part.kind, "length_m": part.length_m, "mass_kg": part.mass_kg}
            for part in survey.parts
        ],
        "supports": [
            {"point": supported.point, "held": list(supported.components), "nodes": supported.nodes}
            for supported in survey.supports
        ],
        "regions": [
            {"name": region.name, "cells": dict(region.cells), "use": region.use or None}
            for region in survey.regions
        ],
        "springs_to_ground": list(survey.grounded),
        "sag": None
        if sag is None
        else {
            "greatest_m": sag.greatest_m,
            "greatest_at": sag.greatest_at,
            "displacement_m": sag.displacement_m,
            "reactions": [
                {
                    "name": reaction.name,
                    "point": reaction.point,
                    "force_n": reaction.force_n,
                    "moment_n_m": reaction.moment_nm,
                }
                for reaction in sag.reactions
            ],
        },
        "members": [
            {
                "group": run.group,
                "entry": run.entry,
                "start": run.start,
                "end": run.end,
                "length_m": run.length_m,
                "x_axis": run.x,
                "y_axis": run.y,
                "z_axis": run.z,
            }
            for run in survey.runs
        ],
        "remarks": list(survey.remarks),
        "caution": CAUTION,
    }


def _first(rows: Sequence[tuple[str, ...]], width: int) -> tuple[tuple[str, ...], ...]:
    """The first rows, and a row that says how many are left out."""
    if len(rows) <= _MOST_ROWS:
        return tuple(rows)
    more = f"... {len(rows) - _MOST_ROWS} more, all in --json"
    return (*rows[:_MOST_ROWS], (more, *[""] * (width - 1)))


def _held(components: tuple[str, ...]) -> str:
    if len(components) == 6:
        return "all"
    return " ".join(components)


def _triple(values: Sequence[float] | Any, kind: str, units: UnitSystem) -> str:
    numbers = [float(shown(float(value), kind, units)) for value in values]
    largest = max(abs(number) for number in numbers)
    return ", ".join("0" if abs(number) < 1e-9 * largest else significant(number) for number in numbers)


def _in_units(values: Sequence[float], largest: float, kind: str, units: UnitSystem) -> list[str]:
    return aligned([shown(value, kind, units) for value in values], shown(largest, kind, units))


def _direction(axis: Sequence[float]) -> str:
    """A unit vector as "+z", "-x" or three numbers."""
    for position, name in enumerate("xyz"):
        if abs(abs(axis[position]) - 1.0) < 1e-9:
            return f"{'+' if axis[position] > 0 else '-'}{name}"
    return ", ".join("0" if abs(part) < 5e-7 else f"{part:.3g}" for part in axis)
