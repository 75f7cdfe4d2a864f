"""What the study gave: sections and materials, with where their figures come from."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

from vib.show.blocks import Column, Table, text_column
from vib.show.numbers import MISSING, percent, significant
from vib.units import UnitSystem, shown, shown_unit

if TYPE_CHECKING:
    from vib.study import Study


def section_table(study: Study, units: UnitSystem) -> Table | None:
    """The sections in use and their figures about the principal axes."""
    used = dict.fromkeys(members.section for members in study.members)
    rows = []
    for name in used:
        profile = study.sections[name].profile
        moments = (profile.second_moment_y, profile.second_moment_z, profile.torsion_constant)
        rows.append(
            (
                name,
                profile.name,
                significant(shown(profile.area, "area", units)),
                *(significant(shown(moment, "second_moment", units)) for moment in moments),
                _shear(profile.shear_area_y, units),
                _shear(profile.shear_area_z, units),
            )
        )
    area, moment = shown_unit("area", units), shown_unit("second_moment", units)
    columns = (
        text_column("section"),
        text_column("profile"),
        Column("area", area),
        Column("second moment y", moment),
        Column("second moment z", moment),
        Column("torsion constant", moment),
        Column("shear area y", area),
        Column("shear area z", area),
    )
    return Table("Sections", columns, tuple(rows)) if rows else None


def _shear(area: float, units: UnitSystem) -> str:
    return "rigid" if math.isinf(area) else significant(shown(area, "area", units))


def material_table(study: Study, units: UnitSystem) -> Table | None:
    """The materials in use, and where their figures come from."""
    from vib.study.materials import find_material

    rows = []
    for name in dict.fromkeys(members.material for members in study.members):
        own = study.materials.get(name)
        data = own.data if own is not None else find_material(name)
        shear = own.shear if own is not None else data.shear_modulus
        ratio = own.damping_ratio if own is not None else None
        rows.append(
            (
                name,
                significant(shown(data.youngs_modulus, "stress", units)),
                significant(shown(shear, "stress", units)),
                significant(shown(data.density, "density", units)),
                MISSING if ratio is None else percent(ratio),
                data.source,
            )
        )
    columns = (
        text_column("material"),
        Column("Young's modulus", shown_unit("stress", units)),
        Column("shear modulus", shown_unit("stress", units)),
        Column("density", shown_unit("density", units)),
        Column("own damping", "%"),
        text_column("source"),
    )
    return Table("Materials", columns, tuple(rows)) if rows else None
