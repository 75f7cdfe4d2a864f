"""Points of the study in the mesh: by coordinates, number, box or set."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from vib.errors import ModelError
from vib.structure.mesh.assign import Patch
from vib.structure.mesh.reading import RawMesh
from vib.study import Study
from vib.study.mesh import Finder
from vib.system import Array

Numbers = NDArray[np.intp]
# of the size of the cells around a node: a point given by coordinates is that node where it is this near,
# `nearest` says how far it had to go beyond it, and stops beyond the other
AT_NODE = 1e-3
TOO_FAR = 0.5


@dataclass(frozen=True, eq=False)
class Found:
    """Points of the study that are nodes of the mesh.

    ``single``: node number of each such point; ``sets``: node numbers of each set; ``remarks`` say how far
    `nearest` had to go and which coordinates are no node.
    """

    single: Mapping[str, int]
    sets: Mapping[str, Numbers]
    remarks: tuple[str, ...]


class _Nodes:
    """Nodes that cells have, and the size of the cells around them."""

    def __init__(self, nodes_m: Array, patches: tuple[Patch, ...]) -> None:
        self.nodes_m, self.patches = nodes_m, patches
        used = np.zeros(len(nodes_m), dtype=bool)
        for patch in patches:
            used[patch.connectivity] = True
        self.used, self.numbers = used, np.flatnonzero(used)
        self.places = nodes_m[self.numbers]

    def nearest(self, place: tuple[float, float, float]) -> tuple[int, float]:
        """Number and distance (m)."""
        away = np.einsum("ij,ij->i", self.places - place, self.places - place)
        best = int(np.argmin(away))
        return int(self.numbers[best]), float(np.sqrt(away[best]))

    def size_at(self, node: int) -> float:
        """Mean longest side of the cells that have a node, m."""
        sizes: list[float] = []
        for patch in self.patches:
            mine = patch.connectivity[(patch.connectivity == node).any(axis=1)]
            sizes += np.ptp(self.nodes_m[mine], axis=1).max(axis=1).tolist()
        return float(np.mean(sizes))


def find_points(study: Study, raw: RawMesh, nodes_m: Array, patches: tuple[Patch, ...]) -> Found:
    """Look up every point of the study.

    Raises
    ------
    ModelError
        A point that is not there, or too far away; all of them at once.
    """
    nodes = _Nodes(nodes_m, patches)
    single, sets, remarks, faults = {}, {}, [], []
    for name, point in study.points.items():
        try:
            if not isinstance(point, Finder):
                node, distance = nodes.nearest(point)
                if distance <= AT_NODE * nodes.size_at(node):
                    single[name] = node
                else:
                    remarks.append(
                        f"point {name} is at no node of the mesh (the nearest, node {node + 1}, is "
                        f"{1000 * distance:.4g} mm away): it is a point of its own"
                    )
            elif point.several:
                sets[name] = _set(point, raw, nodes)
                remarks.append(f"points {name}: {len(sets[name])} nodes of the mesh")
            else:
                single[name] = _one(name, point, nodes, remarks)
        except ModelError as error:
            faults.append(f"points.{name}: {error}")
    if faults:
        raise ModelError("\n".join(faults))
    return Found(single, sets, tuple(remarks))


def _one(name: str, point: Finder, nodes: _Nodes, remarks: list[str]) -> int:
    if point.node is not None:
        if point.node > len(nodes.nodes_m):
            raise ModelError(f"there is no node {point.node}; the mesh has {len(nodes.nodes_m)}")
        if not nodes.used[point.node - 1]:
            raise ModelError(f"node {point.node} belongs to no cell that is computed")
        return point.node - 1
    assert point.nearest is not None
    node, distance = nodes.nearest(point.nearest)
    size = nodes.size_at(node)
    if distance > TOO_FAR * size:
        place = ", ".join(f"{1000 * x:.6g}" for x in nodes.nodes_m[node])
        raise ModelError(
            f"the nearest node, {node + 1} at [{place}] mm, is {1000 * distance:.4g} mm away, more than half "
            f"of the {1000 * size:.4g} mm of the cells; check the coordinates and the mesh's length unit"
        )
    if distance > AT_NODE * size:
        remarks.append(
            f"point {name} is node {node + 1} of the mesh, {1000 * distance:.4g} mm from where it was asked"
        )
    return node


def _set(point: Finder, raw: RawMesh, nodes: _Nodes) -> Numbers:
    if point.set is not None:
        named = _named_set(point.set, raw)
        found: Numbers = named[nodes.used[named]]
        if not len(found):
            raise ModelError(f'no node of "{point.set}" belongs to a cell that is computed')
        return found
    assert point.box is not None
    corners = np.sort(np.array(point.box), axis=0)
    slack = 1e-9 * float(np.abs(nodes.places).max(initial=0.0))
    inside = ((nodes.places >= corners[0] - slack) & (nodes.places <= corners[1] + slack)).all(axis=1)
    if not inside.any():
        low, high = (
            ", ".join(f"{1000 * x:.6g}" for x in ends(nodes.places, axis=0)) for ends in (np.min, np.max)
        )
        raise ModelError(f"no node of the mesh is in the box; the mesh lies between [{low}] and [{high}] mm")
    chosen: Numbers = nodes.numbers[inside]
    return chosen


def _named_set(name: str, raw: RawMesh) -> Numbers:
    """Nodes of a point set, a cell set or a region."""
    if name in raw.point_sets:
        return raw.point_sets[name]
    if name not in raw.regions:
        known = ", ".join([*raw.point_sets, *raw.regions])
        raise ModelError(f'the mesh has no point set or region "{name}"; it has {known}')
    index = raw.regions.index(name)
    return np.unique(
        np.concatenate([block.connectivity[block.region == index].ravel() for block in raw.blocks])
    )
