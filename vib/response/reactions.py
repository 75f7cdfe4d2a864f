"""Forces of supports: what must act on the components that they hold, so that these stay still.

They are the rows of K, C and M of these components, before they were taken away, times the motion,
less the forces that act there.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING

import numpy as np
import scipy.sparse as sparse
from numpy.typing import NDArray

from vib.drive import Drive
from vib.response.exponential import Array
from vib.structure.assembly import Assembly, assemble
from vib.structure.build import PieceDivision
from vib.structure.spin import cross_matrix
from vib.structure.stacks import add_up
from vib.study import Study
from vib.study.machine import rayleigh_constants
from vib.study.quantities import COMPONENTS
from vib.system import Matrix, System

if TYPE_CHECKING:
    from vib.structure.mesh.weaving import Woven

_SAME = (
    1e-9  # components of a support that can't be told apart: singular values below this part of the largest
)


@dataclass(frozen=True, eq=False)
class Foot:
    """Six components (or those that a support holds) of one foot, rows as in `Feet`."""

    owner: str
    kind: str
    components: tuple[str, ...]
    stiffness: Matrix
    damping: Matrix
    mass: Matrix | None = None
    direct: Array | None = None
    ground: Array | None = None
    turning: Array | None = None


def reactions(system: System, study: Study, drive: Drive, remarks: list[str]) -> Iterator[Foot]:
    """The forces on the ground of every support; what is not sure about them is added to the remarks."""
    rows = _Rows(_assembly(system), study, drive)
    yield from _of_points(rows, drive, remarks)
    if rows.assembly.woven is not None:
        yield from _of_cells(rows, rows.assembly.woven, drive)


def _assembly(system: System) -> Assembly:
    """The pieces that a structure was cut into, put together once more."""
    assert system.anatomy is not None
    division = system.anatomy.division
    if isinstance(division, PieceDivision):
        return assemble(division.layout, division.counts)
    from vib.structure.mesh.accuracy import CellErrors

    cells = system.anatomy.discretisation
    assert isinstance(cells, CellErrors)
    return assemble(cells.layout, cells.counts)


class _Rows:
    """Rows of the matrices before supports took any away: of the nodes of the frame, then of the mesh."""

    def __init__(self, assembly: Assembly, study: Study, drive: Drive) -> None:
        self.assembly = assembly
        woven = assembly.woven
        stiffness, mass, dashpot = (
            add_up(stack) for stack in (assembly.stiffness, assembly.mass, assembly.dashpot)
        )
        kept, turning = _spins(assembly, drive)
        transform, rigid = assembly.nodes.transform.copy(), assembly.rigid_motion()
        self.frame = transform.shape[0]
        if woven is not None:
            from vib.structure.sparsity import assemble as put_together

            cells = put_together(woven.model.nodes_m, woven.model.groups)
            none = sparse.csr_array((woven.pattern.size,) * 2)
            stiffness, mass, dashpot, kept, turning = (
                sparse.block_diag(pair, format="csr")
                for pair in (
                    (stiffness, cells.stiffness),
                    (mass, cells.mass),
                    (dashpot, none),
                    (kept, none),
                    (turning, none),
                )
            )
            transform.resize((self.frame, woven.size))
            transform = sparse.vstack([transform, woven.transform], format="csr")
            rigid = np.vstack([rigid, woven.rigid_motion()])
        damping = dashpot + kept
        if study.damping.rayleigh is not None:
            alpha, beta = rayleigh_constants(study.damping.rayleigh)
            damping = damping + alpha * mass + beta * stiffness
        self._matrices = (stiffness, damping, mass, turning)
        self._transform, self._rigid = transform, rigid

    def foot(
        self, owner: str, components: tuple[str, ...], rows: NDArray[np.intp], weights: Matrix, pushed: Array
    ) -> Foot:
        """What ``weights`` (c, r) times the balance of rows (r,) asks of a support; ``pushed`` (c, i)."""
        parts = [sparse.csr_array(weights @ matrix[rows]) for matrix in self._matrices]
        moved = [-(part @ self._transform).toarray() for part in parts]
        return Foot(
            owner,
            "support",
            components,
            stiffness=moved[0],
            damping=moved[1],
            mass=moved[2],
            direct=pushed,
            ground=-(parts[2] @ self._rigid),
            turning=moved[3] if moved[3].any() else None,
        )

    @cached_property
    def joined(self) -> dict[int, int]:
        """Points that are nodes of the mesh, by number, and which node each is."""
        woven = self.assembly.woven
        if woven is None:
            return {}
        number = {name: i for i, name in enumerate(self.assembly.layout.point_names)}
        return {number[name]: node for name, node in woven.model.node_of_point.items()}

    def hub(self, hub: int) -> tuple[NDArray[np.intp], NDArray[np.intp], Matrix]:
        """Places (r,) and their rows, all that follow a hub, and (6, rows) what forces there come to at it.

        Ends of members that offsets or releases keep apart are among them, and nodes of a mesh.
        """
        layout = self.assembly.layout
        ties, stretches = layout.ties, layout.stretches
        own = np.flatnonzero(ties.hub == hub)
        apart = stretches.separate
        ends = stretches.ends[apart]
        mine = np.flatnonzero(ties.hub[ends] == hub)
        levers = [*ties.rigid[own], *(stretches.attachment()[apart] @ ties.rigid[ends])[mine]]
        at = np.concatenate([own, len(ties.hub) + mine])
        rows = list((6 * at[:, None] + np.arange(6)).ravel())
        for point in own.tolist():
            if point in self.joined and self.assembly.woven is not None:
                more = self.assembly.woven.rows_of(self.joined[point])
                rows += (self.frame + more).tolist()
                levers.append(ties.rigid[point][: len(more)])
        return own, np.array(rows, dtype=np.intp), sparse.csr_array(np.concatenate(levers).T)


def _of_points(rows: _Rows, drive: Drive, remarks: list[str]) -> Iterator[Foot]:
    """Supports of points.

    The balance of a hub (a point, or bodies rigidly tied together and all points that carry them) is that of
    its rows, moved to the hub by their rigid arms; the forces of its supports, moved alike, make up for it.
    Where there are more of these than the balance can tell apart, the smallest are taken.
    """
    layout = rows.assembly.layout
    ties, held = layout.ties, layout.held
    names = (*layout.point_names, *layout.bodies.names)
    unsure = []
    for hub in np.unique(ties.hub[: len(held)][held.any(axis=1)]).tolist():
        own, at, gather = rows.hub(hub)
        here = [p for p in own.tolist() if p < len(held) and held[p].any()]
        share, sure = _shares(np.concatenate([ties.rigid[p][held[p]] for p in here]))
        if not sure:
            unsure += [layout.point_names[p] for p in here]
        pushed = sum(
            (ties.rigid[p].T @ _pushed(names[p], drive) for p in own.tolist()),
            np.zeros((6, len(drive.inputs))),
        )
        first = 0
        for p in here:
            components = tuple(name for name, fixed in zip(COMPONENTS, held[p], strict=True) if fixed)
            part = share[first : first + len(components)]
            first += len(components)
            yield rows.foot(layout.point_names[p], components, at, part @ gather, part @ pushed)
    if unsure:
        remarks.append(
            f"The supports {', '.join(unsure)} hold a rigid body more than once: how they share its force is "
            "not known, and the smallest forces are given."
        )


def _of_cells(rows: _Rows, woven: Woven, drive: Drive) -> Iterator[Foot]:
    """Supports of nodes of a mesh, the forces on a set added up; nodes that are points stand apart."""
    joined = set(rows.joined.values())
    for name, nodes, components in woven.model.held:
        alone = [node for node in nodes.tolist() if node not in joined]
        used, picked = [], []
        for component in components:
            number = COMPONENTS.index(component)
            own = [woven.rows_of(node) for node in alone]
            there = [int(row[number]) for row in own if number < len(row)]
            # nodal moments alone are not the moment of a set
            if there and (number < 3 or len(nodes) == 1):
                used.append(number)
                picked.append(rows.frame + np.array(there, dtype=np.intp))
        if not used:
            continue
        counts = [len(one) for one in picked]
        weights = sparse.csr_array(
            (np.ones(sum(counts)), (np.repeat(np.arange(len(used)), counts), np.arange(sum(counts)))),
            shape=(len(used), sum(counts)),
        )
        pushed = _pushed(name, drive)[used]
        yield rows.foot(name, tuple(COMPONENTS[c] for c in used), np.concatenate(picked), weights, pushed)


def _spins(assembly: Assembly, drive: Drive) -> tuple[Matrix, Matrix]:
    """Gyroscopic terms of bodies that keep their speed, and per rev/s of the reference shaft."""
    layout, train = assembly.layout, drive.train
    size = assembly.nodes.transform.shape[0]
    kept, turning = sparse.lil_array((size, size)), sparse.lil_array((size, size))
    for number, body in enumerate(layout.study.bodies):
        if body.spin is None:
            continue
        first = 6 * (len(layout.point_names) + number) + 3
        unit = slice(first, first + 3)
        axis = np.array(body.spin.axis)
        polar = body.spin.inertia or float(axis @ layout.bodies.mass[number][3:, 3:] @ axis)
        block = -2 * np.pi * polar * body.spin.ratio * cross_matrix(axis)
        shaft = body.spin.shaft or ""
        if shaft in train.ratios:
            turning[unit, unit] = train.ratios[shaft] * block
        else:
            kept[unit, unit] = train.held.get(shaft, body.spin.speed or 0.0) * block
    return sparse.csr_array(kept), sparse.csr_array(turning)


def _shares(lever: Array) -> tuple[Array, bool]:
    """(h, 6): the forces of the components (h, 6 levers) that balance a hub, and whether there is one way."""
    scale = np.abs(lever).max(axis=0)
    scale = np.where(scale > 0, scale, 1.0)
    sizes = np.linalg.svd(lever / scale, compute_uv=False)
    rank = int((sizes > _SAME * sizes.max(initial=0.0)).sum())
    return np.asarray(np.linalg.pinv(lever.T, rcond=_SAME)), rank == len(lever)


def _pushed(name: str, drive: Drive) -> Array:
    """(6, i): the inputs of a drive that act at a place, by component."""
    found = np.zeros((6, len(drive.inputs)))
    for column, aim in enumerate(drive.inputs):
        if aim.place == name:
            found[:, column] = np.real(aim.weights)
    return found
