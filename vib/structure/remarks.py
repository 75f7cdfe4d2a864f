"""What was assumed, and what looks odd, in words."""

from __future__ import annotations

from collections.abc import Iterable, Iterator

import numpy as np

from vib.structure.axes import STANDING, standing, unit_axis
from vib.structure.layout import Layout
from vib.structure.members import loose
from vib.structure.oddities import oddities
from vib.structure.springs import GROUND

_MOST_NAMES = 8


def assumptions(layout: Layout) -> tuple[str, ...]:
    """Everything that was taken as rigid, massless, undamped or not modelled, and what looks odd."""
    return (
        *oddities(layout),
        *_of_mesh(layout),
        *_of_members(layout),
        *_of_bodies(layout),
        *_of_springs(layout),
        *_of_freedoms(layout),
        *_of_damping(layout),
        *_of_preload(layout),
    )


def _of_mesh(layout: Layout) -> Iterator[str]:
    if layout.mesh is not None:
        from vib.structure.mesh.remarks import mesh_remarks

        yield from mesh_remarks(layout, layout.mesh)


def _of_preload(layout: Layout) -> Iterator[str]:
    study = layout.study
    pulled = [row.name for row in study.members if row.tension]
    pulled += [row.name for row in study.springs if row.tension]
    if pulled:
        yield (
            f"the pull or push stated for {listing(pulled)} changes the stiffness across it and stays the "
            "same while things move; no equilibrium of the pulls is checked"
        )
    spinning = [body.name for body in study.bodies if body.spin is not None]
    if spinning:
        yield (
            f"{listing(spinning)}: spinning with gyroscopic forces; round about the axis, without unbalance "
            "or internal friction"
        )
    others = "" if pulled else " and preload"
    yield f"small movements about the unloaded shape: weight{others} and running speed change no stiffness"


def listing(names: Iterable[str]) -> str:
    """Names in a row, cut off where there are many."""
    names = list(names)
    more = f" and {len(names) - _MOST_NAMES} more" if len(names) > _MOST_NAMES else ""
    return ", ".join(names[:_MOST_NAMES]) + more


def _of_members(layout: Layout) -> Iterator[str]:
    study, stretches = layout.study, layout.stretches
    if not study.members:
        return
    used = {members.section: study.sections[members.section].profile for members in study.members}
    for name, profile in used.items():
        yield from (f"section {name}: {remark}" for remark in profile.remarks)
    yield (
        "members are straight, uniform and linear, their cross sections stay plane and keep their shape; "
        "warping of open sections under torsion is not modelled"
    )
    yield "joints of members are rigid points, save for the releases given"
    if (stretches.reach_m != 0).any():
        yield "offsets of members are rigid arms without mass"
    massless = [members.name for i, members in enumerate(study.members) if not _density(layout, i)]
    if massless:
        yield f"members without mass (density 0): {listing(massless)}"
    free = np.flatnonzero(loose(stretches.released))
    if len(free):
        yield f"members that their releases let move freely: {listing(stretches.labels[s] for s in free)}"
    along = stretches.axes[:, 0]
    default = np.array([members.up is None for members in study.members])[stretches.group]
    exactly = np.linalg.norm(np.cross(along, unit_axis(study.up)), axis=1) < 1e-9
    leaning = np.flatnonzero(default & standing(along, study.up) & ~exactly)
    if len(leaning):
        yield (
            f"members within {STANDING:g} rad of {study.up} count as standing along it for their default up: "
            f"{listing(stretches.labels[s] for s in leaning)}"
        )


def _density(layout: Layout, i: int) -> bool:
    mine = layout.stretches.group == i
    return bool((layout.stretches.bars.density[mine] > 0).all())


def _of_bodies(layout: Layout) -> Iterator[str]:
    study, bodies = layout.study, layout.bodies
    if not study.bodies:
        return
    yield f"bodies are rigid, and so are their ties to the points that carry them: {listing(bodies.names)}"
    points = [body.name for body in study.bodies if not any(body.inertia)]
    if points:
        yield f"bodies without moments of inertia of their own (point masses): {listing(points)}"
    for point, carried in bodies.shared_points().items():
        names = " and ".join(bodies.names[body] for body in carried)
        yield f"point {layout.point_names[point]} carries {names}: they are rigidly tied to one another"


def _of_springs(layout: Layout) -> Iterator[str]:
    springs = layout.springs
    if not len(springs.owner):
        return
    yield f"springs and dashpots are linear and without mass: {listing(s.name for s in layout.study.springs)}"
    if springs.arms_m.any():
        apart = dict.fromkeys(
            layout.study.springs[springs.owner[q]].name for q in np.flatnonzero(springs.arms_m)
        )
        yield f"springs between points that lie apart sit midway, on massless rigid arms: {listing(apart)}"


def _of_freedoms(layout: Layout) -> Iterator[str]:
    held_mesh = layout.mesh is not None and layout.mesh.held
    if not (layout.held.any() or held_mesh or (layout.springs.ends[:, 1] == GROUND).any()):
        yield "nothing holds the structure: it is free in space"
    names = (*layout.point_names, *layout.bodies.names)
    by_rotations: dict[tuple[str, ...], list[str]] = {}
    for hub, rotations in layout.ties.left_out.items():
        if layout.mesh is None or names[hub] not in layout.mesh.node_of_point:  # nodes of solids have none
            by_rotations.setdefault(rotations, []).append(names[hub])
    for rotations, places in by_rotations.items():
        yield (
            f"rotations that nothing resists and that move no mass are left out: "
            f"{' '.join(rotations)} of {listing(places)}"
        )


def _of_damping(layout: Layout) -> Iterator[str]:
    damping = layout.study.damping
    stated = damping.ratio or any(ratio for *_, ratio in damping.ranges) or damping.rayleigh is not None
    used = {members.material for members in layout.study.members}
    if layout.study.mesh is not None:
        used |= {region.material or "" for region in layout.study.mesh.regions.values()}
    own = any(layout.study.materials[name].damping_ratio for name in used & set(layout.study.materials))
    if not (stated or own or layout.springs.dashpot.any()):
        yield "no damping is given: everything is undamped"
