"""A study with a mesh, resolved: cells in groups, lines as members, points as nodes."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from vib.errors import ModelError
from vib.structure.mesh import assign, cleaning
from vib.structure.mesh.assign import Patch, RegionFound
from vib.structure.mesh.finding import Found, find_points
from vib.structure.mesh.hanging import check_fit
from vib.structure.mesh.reading import RawMesh, listed, read_mesh
from vib.structure.sparsity import Group
from vib.study import Study
from vib.study.geometry import Members
from vib.study.mesh import Mesh
from vib.study.quantities import COMPONENTS
from vib.system import Array

Numbers = NDArray[np.intp]
Flags = NDArray[np.bool_]


@dataclass(frozen=True, eq=False)
class MeshModel:
    """The cells of a mesh and how they hang together with the rest of the study.

    ``nodes_m`` (k, 3), numbered as in the file; ``groups`` of shells and solids, ``part`` the region of each,
    ``numbers`` what their cells are called; ``ratios`` the damping ratio of each region's material;
    ``asked`` the names that the study gives to points; ``node_of_point`` the node of each point of the plain
    study that is one; ``named`` the node of each point of the study that is one; ``sets`` the nodes of each
    set; ``held`` components by node and by the name that holds them; ``shares`` the part of a spring table's
    constants that each of its pairs has.
    """

    nodes_m: Array
    groups: tuple[Group, ...]
    part: tuple[str, ...]
    numbers: tuple[Numbers, ...]
    ratios: Mapping[str, float | None]
    asked: tuple[str, ...]
    node_of_point: Mapping[str, int]
    named: Mapping[str, int]
    sets: Mapping[str, Numbers]
    held: tuple[tuple[str, Numbers, tuple[str, ...]], ...]
    shares: tuple[float, ...]
    remarks: tuple[str, ...]

    @property
    def regions(self) -> tuple[str, ...]:
        """The regions that have shells or solids."""
        return tuple(self.ratios)

    def groups_of(self, region: str) -> tuple[Group, ...]:
        """The cells of a region."""
        return tuple(group for group, name in zip(self.groups, self.part, strict=True) if name == region)


def found_regions(study: Study) -> tuple[RegionFound, ...]:
    """The regions of the mesh file of a study, assigned or not.

    Raises
    ------
    ModelError
        The file can't be read.
    """
    return assign.list_regions(study, assign.patches_of(_raw(study)))


def read_mesh_study(study: Study) -> tuple[Study, MeshModel]:
    """The study with plain points and with its lines as members, and the cells of its mesh.

    Raises
    ------
    ModelError
        The mesh can't be read or is broken, a region is not assigned, a point is not found.
    """
    mesh, raw = _mesh_of(study), _raw(study)
    patches = assign.patches_of(raw)
    assign.check_assigned(study, assign.list_regions(study, patches), raw)
    used = assign.used_patches(study, patches)
    nodes_m = raw.nodes * mesh.metres
    remarks: list[str] = []
    file_nodes = np.unique(np.concatenate([block.connectivity.ravel() for block in raw.blocks]))
    if mesh.join_within is not None:
        became, told = cleaning.joined_nodes(nodes_m, mesh.join_within)
        raw, used = (
            _renamed(raw, became),
            tuple(replace(p, connectivity=became[p.connectivity]) for p in used),
        )
        remarks += told
        _check_collapsed(used)
    offsets = {name: region.offset for name, region in mesh.regions.items()}
    used, told = cleaning.clean_cells(nodes_m, used, offsets)
    remarks += told
    remarks += cleaning.check_nodes(nodes_m, used, file_nodes)
    remarks += check_fit(nodes_m, used)
    found = find_points(study, raw, nodes_m, used)
    plain, model = _Resolving(study, nodes_m, used, found).resolved()
    return plain, replace(model, remarks=(*remarks, *found.remarks, *model.remarks))


def _mesh_of(study: Study) -> Mesh:
    if study.mesh is None:
        raise ModelError("[mesh]: the study has none")
    return study.mesh


def _raw(study: Study) -> RawMesh:
    mesh = _mesh_of(study)
    folder = study.file.parent if study.file is not None else Path()
    return read_mesh(folder / mesh.file, mesh.tag, frozenset(mesh.regions))


def _renamed(raw: RawMesh, became: Numbers) -> RawMesh:
    blocks = tuple(replace(block, connectivity=became[block.connectivity]) for block in raw.blocks)
    sets = {name: np.unique(became[nodes]) for name, nodes in raw.point_sets.items()}
    return replace(raw, blocks=blocks, point_sets=sets)


def _check_collapsed(patches: tuple[Patch, ...]) -> None:
    for patch in patches:
        ordered = np.sort(patch.connectivity, axis=1)
        wrong = (ordered[:, 1:] == ordered[:, :-1]).any(axis=1)
        if wrong.any():
            raise ModelError(
                "mesh.join_within: it would join nodes of the same cell "
                f"({listed('cell', patch.numbers[wrong])}); give a smaller distance"
            )


class _Resolving:
    """The way from names to nodes.

    Points that members, bodies or springs use become points of the plain study, tied to their node; others
    are only looked at or held, which the mesh does by itself.
    """

    def __init__(self, study: Study, nodes_m: Array, patches: tuple[Patch, ...], found: Found) -> None:
        self.study, self.nodes_m, self.found = study, nodes_m, found
        self.lines = tuple(patch for patch in patches if cleaning.is_line(patch))
        self.cells = tuple(patch for patch in patches if not cleaning.is_line(patch))
        self.points: dict[str, tuple[float, float, float]] = {}
        self.point_of_node: dict[int, str] = {}
        self.shares: list[float] = []
        self.remarks: list[str] = []

    def resolved(self) -> tuple[Study, MeshModel]:
        study, found = self.study, self.found
        for name, place in study.points.items():
            if isinstance(place, tuple) and name not in found.single:
                self.points[name] = place
        members = [self._renamed_members(table) for table in study.members]
        bodies = [
            body.model_copy(
                update={
                    "carried_by": tuple(dict.fromkeys(self._points(body.carried_by))),
                    "centre": body.centre or self._place(body.carried_by[0]),
                }
            )
            for body in study.bodies
        ]
        springs = [self._spring(spring) for spring in study.springs]
        members += list(self._line_members())
        supports, held = self._supports()
        plain = study.model_copy(
            update={
                "points": dict(self.points),
                "members": tuple(members),
                "bodies": tuple(bodies),
                "springs": tuple(springs),
                "supports": tuple(supports),
            }
        )
        groups, ratios = self._groups()
        node_of_point = {name: node for node, name in self.point_of_node.items()}
        model = MeshModel(
            nodes_m=self.nodes_m,
            groups=groups,
            part=tuple(patch.region for patch in self.cells),
            numbers=tuple(patch.numbers for patch in self.cells),
            ratios=ratios,
            asked=tuple(study.points),
            node_of_point=node_of_point,
            named=dict(found.single),
            sets=found.sets,
            held=held,
            shares=tuple(self.shares),
            remarks=tuple(self.remarks),
        )
        return plain, model

    def _place(self, name: str) -> tuple[float, float, float]:
        if name in self.found.single:
            x, y, z = self.nodes_m[self.found.single[name]].tolist()
            return x, y, z
        return self.points[name]

    def _point(self, node: int, name: str = "") -> str:
        """The name of the point at a node, which becomes a point of the plain study if it was none."""
        if node not in self.point_of_node:
            called = name or next(
                (given for given, at in self.found.single.items() if at == node), f"node {node + 1}"
            )
            while not name and called in self.study.points and called not in self.found.single:
                called = f"mesh {called}"
            x, y, z = self.nodes_m[node].tolist()
            self.points[called] = (x, y, z)
            self.point_of_node[node] = called
        return self.point_of_node[node]

    def _points(self, names: tuple[str, ...]) -> Iterator[str]:
        """Points of the plain study for names that may stand for nodes and sets."""
        for name in names:
            if name in self.found.sets:
                yield from (self._point(node) for node in self.found.sets[name].tolist())
            elif name in self.found.single:
                yield self._point(self.found.single[name], name)
            else:
                yield name

    def _renamed_members(self, table: Members) -> Members:
        return table.model_copy(update={"runs": tuple(tuple(self._points(run)) for run in table.runs)})

    def _spring(self, spring: Any) -> Any:
        pairs = []
        for a, b in spring.between:
            first, second = ([b], [a]) if a == "ground" else ([a], [b])
            ends = list(self._points(tuple(first)))
            far = second if second == ["ground"] else list(self._points(tuple(second)))
            pairs += [(end, far[0]) for end in ends]
            self.shares += [1 / len(ends)] * len(ends)
            if len(ends) > 1:
                self.remarks.append(f"spring {spring.name} is shared evenly among the nodes of {first[0]}")
        return spring.model_copy(update={"between": tuple(pairs)})

    def _line_members(self) -> Iterator[Members]:
        mesh = _mesh_of(self.study)
        for region in dict.fromkeys(patch.region for patch in self.lines):
            table = mesh.regions[region]
            runs = [
                tuple(self._point(node) for node in ([cell[0], cell[2], cell[1]] if len(cell) == 3 else cell))
                for patch in self.lines
                if patch.region == region
                for cell in patch.connectivity.tolist()
            ]
            yield Members.model_construct(
                name=region,
                section=table.section or "",
                material=table.material or "",
                runs=tuple(runs),
                up=table.up,
                turn=table.turn,
            )

    def _supports(self) -> tuple[list[Any], tuple[tuple[str, Numbers, tuple[str, ...]], ...]]:
        """Supports of points of the plain study, and what supports hold of nodes that are none."""
        supports, held = [], []
        for support in self.study.supports:
            plain = []
            for name in support.at:
                if name in self.found.sets:
                    nodes = self.found.sets[name]
                elif name in self.found.single:
                    nodes = np.array([self.found.single[name]])
                else:
                    plain.append(name)
                    continue
                points = [self.point_of_node[node] for node in nodes.tolist() if node in self.point_of_node]
                plain += points
                held.append((name, nodes, support.hold))
            if plain:
                supports.append(support.model_copy(update={"at": tuple(dict.fromkeys(plain))}))
        return supports, tuple(held)

    def _groups(self) -> tuple[tuple[Group, ...], dict[str, float | None]]:
        groups, ratios = [], {}
        for patch in self.cells:
            properties, ratios[patch.region] = assign.properties_of(self.study, patch.region)
            groups.append(Group(patch.family, patch.connectivity, properties))
        return tuple(groups), ratios


def held_flags(model: MeshModel) -> Flags:
    """(k, 6) components of nodes that supports hold."""
    flags = np.zeros((len(model.nodes_m), 6), dtype=bool)
    for _, nodes, components in model.held:
        columns = np.array([COMPONENTS.index(component) for component in components])
        flags[np.ix_(nodes, columns)] = True
    return flags
