"""What `check` reads back: mass, centre, supports, local axes, and how far the structure sags."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from vib.structure.assembly import Assembly, assemble
from vib.structure.axes import unit_axis
from vib.structure.build import build_system
from vib.structure.division import first_counts
from vib.structure.layout import Layout, read_layout
from vib.structure.remarks import assumptions
from vib.structure.sag import STANDARD_GRAVITY, Factorise, Reaction, Sag, find_sag
from vib.structure.springs import GROUND
from vib.structure.stacks import add_up
from vib.study import Study
from vib.study.quantities import COMPONENTS
from vib.system import Array

if TYPE_CHECKING:
    from vib.structure.mesh.assign import RegionFound
    from vib.structure.mesh.weaving import Woven

__all__ = ["STANDARD_GRAVITY", "PartMass", "Reaction", "RunAxes", "Sag", "Supported", "Survey", "survey"]

Triple = tuple[float, float, float]


@dataclass(frozen=True)
class PartMass:
    """One member group, spring set or body: ``mass_kg``, and ``length_m`` of all members of a group."""

    name: str
    kind: str  # "members", "springs", "body" or "cells"
    mass_kg: float
    length_m: float | None = None


@dataclass(frozen=True)
class Supported:
    """A point or a set of ``nodes`` nodes that supports hold, and in which components."""

    point: str
    components: tuple[str, ...]
    nodes: int = 1


@dataclass(frozen=True)
class RunAxes:
    """The local axes of one straight bit of a run, for the drawing.

    ``entry`` is where it stands in the file, such as ``members[0].runs[1]``; ``origin_m`` its middle; ``x``
    (start to end), ``y`` and ``z`` unit vectors of the drawn section, ``turn`` included.
    """

    group: str
    entry: str
    start: str
    end: str
    length_m: float
    origin_m: Triple
    x: Triple
    y: Triple
    z: Triple


@dataclass(frozen=True, eq=False)
class Survey:
    """A structure read back, SI units.

    ``mass_kg``, ``centre_m`` (3,) and ``inertia_kg_m2`` (3, 3; about the centre of mass, along the global
    axes) of everything, held parts included; the centre and inertia are None where there is no mass, and
    all three for a study of matrices. ``sag`` is the static displacement under gravity against ``up``,
    None where the structure is free or a mechanism (a remark says so). ``freedoms`` counts those of the
    first, moderate division into pieces. ``grounded`` names each spring to the ground. ``regions`` are those
    of the mesh file, assigned or not.
    """

    mass_kg: float | None
    centre_m: Array | None
    inertia_kg_m2: Array | None
    parts: tuple[PartMass, ...]
    supports: tuple[Supported, ...]
    grounded: tuple[str, ...]
    runs: tuple[RunAxes, ...]
    freedoms: int
    up: Triple
    sag: Sag | None
    remarks: tuple[str, ...]
    regions: tuple[RegionFound, ...] = ()


def survey(study: Study, factorise: Factorise | None = None) -> Survey:
    """Read a study back: mass, centre of mass, supports, local axes, sag under its own weight.

    Parameters
    ----------
    study
        A structure; of a study of matrices only the number of freedoms is told, and of a mesh whose regions
        are not all assigned only which there are.
    factorise
        What factorises the stiffness for the sag; SuperLU if not given.

    Returns
    -------
    Survey
        In SI units.

    Raises
    ------
    ModelError
        The structure cannot be built as described.
    MatrixError
        The matrices of [matrices] do not describe a vibrating system.
    """
    up = unit_axis(study.up)
    if study.matrices is not None:
        remark = "the study holds matrices: mass, supports and sag cannot be told from them"
        size = build_system(study).size
        return Survey(None, None, None, (), (), (), (), size, _triple(up), None, (remark,))
    regions = _regions(study)
    if any(not region.use for region in regions):
        remark = (
            "regions of the mesh are not yet assigned (the table says which), so that there is nothing to "
            "compute: give each a [mesh.regions.NAME] with its material (shells also a thickness, lines a "
            'section), or use = "ignore"'
        )
        return Survey(None, None, None, (), (), (), (), 0, _triple(up), None, (remark,), regions)
    layout = read_layout(study)
    assembly = assemble(layout, first_counts(layout))
    rigid = assembly.rigid_motion()
    whole = rigid.T @ (add_up(assembly.mass) @ rigid)
    if assembly.woven is not None:
        whole = whole + assembly.woven.rigid_motion().T @ assembly.woven.pushed
    mass, centre, inertia = _about_centre(whole)
    sag, sag_remarks = find_sag(assembly, up, factorise)
    return Survey(
        mass_kg=mass,
        centre_m=centre,
        inertia_kg_m2=inertia,
        parts=_part_masses(assembly, rigid),
        supports=tuple(_supports(layout)),
        grounded=tuple(
            label
            for label, (_, end) in zip(layout.springs.labels, layout.springs.ends, strict=True)
            if end == GROUND
        ),
        runs=_run_axes(assembly),
        freedoms=assembly.size,
        up=_triple(up),
        sag=sag,
        remarks=(*assumptions(layout), *sag_remarks),
        regions=regions,
    )


def _regions(study: Study) -> tuple[RegionFound, ...]:
    if study.mesh is None:
        return ()
    from vib.structure.mesh.model import found_regions

    return found_regions(study)


def _supports(layout: Layout) -> Iterator[Supported]:
    mesh = layout.mesh
    by_mesh = {name: (nodes, components) for name, nodes, components in mesh.held} if mesh else {}
    for name, row in zip(layout.point_names, layout.held, strict=True):
        if row.any() and name not in by_mesh and (mesh is None or name in mesh.asked):
            yield Supported(name, tuple(c for c, holds in zip(COMPONENTS, row, strict=True) if holds))
    for name, (nodes, components) in by_mesh.items():
        yield Supported(name, components, len(nodes))


def _about_centre(whole: Array) -> tuple[float, Array | None, Array | None]:
    """Mass, centre and inertia about it from R' M R (6, 6) about the origin (parallel-axis theorem)."""
    mass = float(whole[0, 0])
    if mass <= 0.0:
        return 0.0, None, None
    # R' M R couples a turn about one axis with the two others: [m z, -m y] and so on
    centre = np.array([whole[1, 5], whole[2, 3], whole[0, 4]]) / mass
    shift = mass * (centre @ centre * np.eye(3) - np.outer(centre, centre))
    return mass, centre, whole[3:, 3:] - shift


def _part_masses(assembly: Assembly, rigid: Array) -> tuple[PartMass, ...]:
    stretches = assembly.layout.stretches
    along = rigid[:, 0]
    found = []
    for i, part in enumerate(assembly.parts(assembly.stiffness, assembly.mass)):
        mass = 0.0 if part.mass is None else float(along @ (part.mass @ along))
        members = part.kind == "members"
        length = float(stretches.bars.length[stretches.group == i].sum()) if members else None
        found.append(PartMass(part.name, part.kind, mass, length))
    if assembly.woven is not None:
        found += _region_masses(assembly, assembly.woven, len(found))
    return tuple(found)


def _region_masses(assembly: Assembly, woven: Woven, before: int) -> Iterator[PartMass]:
    from vib.structure.mesh.operators import CellOperator

    along = woven.rigid_motion()[:, :1]
    for name, region in zip(assembly.names[before:], woven.model.regions, strict=True):
        pushed = CellOperator(woven, woven.model.groups_of(region), "mass").on_rows(along)
        yield PartMass(name, "cells", float(np.vdot(along, pushed)))


def _run_axes(assembly: Assembly) -> tuple[RunAxes, ...]:
    layout = assembly.layout
    stretches = layout.stretches
    found = []
    for s, entry in enumerate(stretches.entries):
        start, end = (layout.point_names[point] for point in stretches.ends[s])
        x, y, z = (_triple(axis) for axis in stretches.axes[s])
        name = assembly.group_name(stretches.group[s])
        middle = _triple(stretches.tips_m[s].mean(axis=0))
        length = float(stretches.bars.length[s])
        found.append(RunAxes(name, entry.split(" ")[0], start, end, length, middle, x, y, z))
    return tuple(found)


def _triple(vector: Array) -> Triple:
    x, y, z = vector.tolist()
    return x, y, z
