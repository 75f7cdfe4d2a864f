"""What was assumed of a mesh, and what looks odd, in words."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from vib.structure.layout import Layout
from vib.structure.mesh.model import MeshModel

_MOST_NAMES = 8


def mesh_remarks(layout: Layout, mesh: MeshModel) -> Iterator[str]:
    """Everything that was mended, found or taken for granted."""
    yield from mesh.remarks
    if not mesh.groups:
        return
    kinds = {group.family.kind: group.family for group in mesh.groups}
    yield "cells of the mesh are linear, elastic and isotropic"
    for kind, family in kinds.items():
        if family.remark:
            yield f"{kind} cells: {family.remark}"
    if any(group.family.dimension == 2 for group in mesh.groups):
        yield "shells have the thickness given, the same all over their region; stresses through it are plane"
    yield from _hinges(layout, mesh)


def _hinges(layout: Layout, mesh: MeshModel) -> Iterator[str]:
    """Solids have no rotations: what meets them at single nodes, or along a line, is hinged there."""
    solid, shell = np.zeros((2, len(mesh.nodes_m)), dtype=bool)
    for group in mesh.groups:
        (solid if group.family.freedoms == 3 else shell)[group.connectivity] = True
    shared = int((solid & shell).sum())
    if shared:
        yield (
            f"shells and solids share {shared} nodes; solids take no moments, so that a shell that meets "
            "them along a single line turns freely about it (let some of its cells lie on the solid to clamp "
            "it)"
        )
    only_solid = solid & ~shell
    on_solid = {
        i
        for i, name in enumerate(layout.point_names)
        if name in mesh.node_of_point and only_solid[mesh.node_of_point[name]]
    }
    stretches, bodies = layout.stretches, layout.bodies
    hinged = [
        f"{stretches.labels[s]} at {layout.point_names[point]}"
        for s, ends in enumerate(stretches.ends.tolist())
        for end, point in enumerate(ends)
        if point in on_solid
        and bodies.lead_of_point[point] < 0
        and not stretches.released[s, end, 3:].all()
        and not (layout.held[point, 3:].all())
    ]
    if hinged:
        more = f" and {len(hinged) - _MOST_NAMES} more" if len(hinged) > _MOST_NAMES else ""
        yield (
            "members end at single nodes of solids, which have no rotations to hold them: they are hinged "
            f"there, save for what else holds the point: {', '.join(hinged[:_MOST_NAMES])}{more}. To clamp "
            "an end, let a body be carried by the point and by a box of nodes around it"
        )
    for i, carriers in enumerate(bodies.carriers):
        places = layout.coordinates_m[list(carriers)]
        if carriers and set(carriers) <= on_solid and _in_line(places):
            yield (
                f"body {bodies.names[i]} is carried by nodes of solids that lie on one line or at one place, "
                "about which nothing resists its turning; carry it by nodes that span a surface"
            )


def _in_line(places: np.ndarray[tuple[int, ...], np.dtype[np.float64]]) -> bool:
    """Whether places (k, 3) span no surface."""
    sizes = np.linalg.svd(places - places.mean(axis=0), compute_uv=False)
    return len(places) < 3 or bool(sizes[1] <= 1e-6 * max(sizes[0], np.finfo(float).tiny))
