"""Forces on the ground, as rows on the freedoms: of springs to the ground, and of supports.

A spring presses on the ground with its stiffness and dashpot times the motion of its end. A support does what
keeps its components still: the rows of K, C and M that belong to them, before they were taken away, times the
motion, less the forces that act there.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
import scipy.sparse as sparse
from numpy.typing import NDArray

from vib.drive import Drive
from vib.response.exponential import Array
from vib.response.residue_sum import Complex
from vib.structure.assembly import Assembly, assemble
from vib.structure.build import PieceDivision
from vib.structure.rigid import turned
from vib.structure.spin import cross_matrix
from vib.structure.springs import spring_axes
from vib.structure.stacks import add_up
from vib.study import Study
from vib.study.machine import rayleigh_constants
from vib.study.quantities import COMPONENTS
from vib.system import Matrix, System

_SAME = (
    1e-9  # components of a support that can't be told apart: singular values below this part of the largest
)


@dataclass(frozen=True, eq=False)
class Feet:
    """q forces: (stiffness + i w (damping + n turning) - w^2 mass) u + direct f - w^2 ground u_g.

    ``stiffness``, ``damping``, ``mass`` (q, n); ``turning`` (q, n) per rev/s of the reference shaft, None
    where nothing that spins is held; ``direct`` (q, i) from the inputs of a drive; ``ground`` (q, 6).
    """

    names: tuple[str, ...]
    owners: tuple[str, ...]
    components: tuple[str, ...]
    kinds: tuple[str, ...]
    stiffness: Array
    damping: Array
    mass: Array
    direct: Array
    ground: Array
    turning: Array | None
    remarks: tuple[str, ...] = ()

    def outputs(self) -> Array:
        """(n, 3 q) or (n, 4 q) directions whose displacements are needed."""
        rows = [self.stiffness, self.damping, self.mass]
        return np.vstack(rows if self.turning is None else [*rows, self.turning]).T

    def forces(
        self, speed_hz: Array, omega: Array, moved: Complex, pushed: Complex, shaken: Complex
    ) -> Complex:
        """(k, q) from displacements (k, ...) along `outputs`, inputs (k, i) and the ground (k, 6)."""
        q, w = len(self.names), omega[:, None]
        stiff, damped, heavy = (moved[:, number * q : (number + 1) * q] for number in range(3))
        if self.turning is not None:
            damped = damped + speed_hz[:, None] * moved[:, 3 * q :]
        found = stiff + 1j * w * damped - w**2 * heavy
        return np.asarray(found + pushed @ self.direct.T - w**2 * (shaken @ self.ground.T))


def feet(system: System, study: Study, drive: Drive) -> Feet:
    """Every spring to the ground and every support of a structure."""
    beta = 0.0 if study.damping.rayleigh is None else rayleigh_constants(study.damping.rayleigh)[1]
    found = list(_springs(system, study, beta))
    remarks: list[str] = []
    division = system.anatomy.division if system.anatomy else None
    if isinstance(division, PieceDivision):
        found += _supports(assemble(division.layout, division.counts), study, drive, remarks)
    elif study.supports:
        remarks.append("Forces on supports of a mesh are not computed, only those of springs to the ground.")
    law = (
        study.damping.ratio or study.damping.ranges or any(m.damping_ratio for m in study.materials.values())
    )
    if law and found:
        remarks.append(
            "Damping stated by ratios slows the motion, but presses on no support or spring by itself."
        )
    return _stacked(found, system.size, len(drive.inputs), tuple(remarks))


@dataclass(frozen=True, eq=False)
class _Foot:
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


def _springs(system: System, study: Study, beta: float) -> Iterator[_Foot]:
    """Turned into global axes: T' k T u at the end of the spring."""
    assert system.anatomy is not None
    for number, spring in enumerate(study.springs):
        axes = spring_axes(spring, number, [])
        turn = turned(axes[None])[0]
        stiff, dash = (
            turn.T @ np.diag([getattr(table, name) for name in COMPONENTS]) @ turn
            for table in (spring.stiffness, spring.dashpot)
        )
        damped = dash + beta * stiff
        for pair in spring.between:
            if "ground" not in pair:
                continue
            end = pair[0] if pair[1] == "ground" else pair[1]
            motion = system.anatomy.places[end].motion
            used = [c for c in range(6) if stiff[c].any() or damped[c].any()]
            yield _Foot(
                f"{spring.name} {end}",
                "spring",
                tuple(COMPONENTS[c] for c in used),
                sparse.csr_array(stiff[used]) @ motion,
                sparse.csr_array(damped[used]) @ motion,
            )


def _supports(assembly: Assembly, study: Study, drive: Drive, remarks: list[str]) -> Iterator[_Foot]:
    """What each support must do so that its components stay still.

    The balance of a hub (a point, or bodies rigidly tied together and all points that carry them) is that of
    its rows of K, C and M, moved to the hub by their rigid arms; the forces of its supports, moved alike,
    make up for it. Where there are more of these than the balance can tell apart, the smallest are taken.
    """
    layout, nodes = assembly.layout, assembly.nodes
    ties, held = layout.ties, layout.held
    stiffness, mass, dashpot = (add_up(x) for x in (assembly.stiffness, assembly.mass, assembly.dashpot))
    damping = dashpot
    if study.damping.rayleigh is not None:
        alpha, beta = rayleigh_constants(study.damping.rayleigh)
        damping = dashpot + alpha * mass + beta * stiffness
    kept, turning = _spins(assembly, drive)
    damping = damping + kept
    rigid = assembly.rigid_motion()
    unsure = []
    for hub in np.unique(ties.hub[: len(held)][held.any(axis=1)]):
        at, gather = _members(assembly, int(hub))
        here = [p for p in np.flatnonzero(ties.hub[: len(held)] == hub).tolist() if held[p].any()]
        share, sure = _shares(np.concatenate([ties.rigid[p][held[p]] for p in here]))
        if not sure:
            unsure += [layout.point_names[p] for p in here]
        rows = (6 * at[:, None] + np.arange(6)).ravel()
        balance = [sparse.csr_array(gather @ matrix[rows]) for matrix in (stiffness, damping, mass, turning)]
        moved = [share @ (one @ nodes.transform).toarray() for one in balance]
        carried = share @ (balance[2] @ rigid)
        pushed = share @ (gather @ _pushes((*layout.point_names, *layout.bodies.names), at, drive))
        first = 0
        for p in here:
            names = tuple(name for name, fixed in zip(COMPONENTS, held[p], strict=True) if fixed)
            piece = slice(first, first + len(names))
            first += len(names)
            yield _Foot(
                layout.point_names[p],
                "support",
                names,
                stiffness=-moved[0][piece],
                damping=-moved[1][piece],
                mass=-moved[2][piece],
                direct=pushed[piece],
                ground=-carried[piece],
                turning=-moved[3][piece] if moved[3].any() else None,
            )
    if unsure:
        remarks.append(
            f"The supports {', '.join(unsure)} hold a rigid body more than once: how they share its force is "
            "not known, and the smallest forces are given."
        )


def _members(assembly: Assembly, hub: int) -> tuple[NDArray[np.intp], Matrix]:
    """Nodes (r,) that follow a hub, ends of members that offsets or releases keep apart among them, and
    (6, 6 r) what forces on their components come to at the hub."""
    ties, stretches = assembly.layout.ties, assembly.layout.stretches
    own = np.flatnonzero(ties.hub == hub)
    apart = stretches.separate
    ends = stretches.ends[apart]
    mine = np.flatnonzero(ties.hub[ends] == hub)
    follow = np.concatenate([ties.rigid[own], (stretches.attachment()[apart] @ ties.rigid[ends])[mine]])
    at = np.concatenate([own, len(ties.hub) + mine])
    return at, sparse.csr_array(np.swapaxes(follow, 1, 2).transpose(1, 0, 2).reshape(6, -1))


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


def _pushes(names: tuple[str, ...], at: NDArray[np.intp], drive: Drive) -> Array:
    """(6 r, i): the inputs of a drive that act at these nodes, by component."""
    found = np.zeros((6 * len(at), len(drive.inputs)))
    for place, number in enumerate(at.tolist()):
        for column, aim in enumerate(drive.inputs):
            if number < len(names) and aim.place == names[number]:
                found[6 * place : 6 * place + 6, column] = np.real(aim.weights)
    return found


def _stacked(found: list[_Foot], size: int, inputs: int, remarks: tuple[str, ...]) -> Feet:
    names = [(foot, component) for foot in found for component in foot.components]

    def rows(key: str, width: int) -> Array:
        parts = [np.zeros((0, width))]
        for foot in found:
            matrix = getattr(foot, key)
            if matrix is None:
                matrix = np.zeros((len(foot.components), width))
            parts.append(matrix.toarray() if sparse.issparse(matrix) else np.asarray(matrix))
        return np.vstack(parts)

    return Feet(
        tuple(f"{foot.owner} {component}" for foot, component in names),
        tuple(foot.owner for foot, _ in names),
        tuple(component for _, component in names),
        tuple(foot.kind for foot, _ in names),
        rows("stiffness", size),
        rows("damping", size),
        rows("mass", size),
        rows("direct", inputs),
        rows("ground", 6),
        rows("turning", size) if any(foot.turning is not None for foot in found) else None,
        remarks,
    )
