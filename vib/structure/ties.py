"""What moves with what: supports, rigid bodies, and freedoms that nothing touches, eliminated exactly.

A *hub* is a set of six components that others follow: a point that carries nothing, or the first of the
bodies that are rigidly tied together. Supports and untouched rotations take freedoms from a hub.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from vib.structure.bodies import Bodies
from vib.structure.members import Stretches
from vib.structure.rigid import arms, eliminate, turned
from vib.structure.springs import GROUND, Springs
from vib.study.quantities import COMPONENTS
from vib.system import Array

Flags = NDArray[np.bool_]
_NOTHING = 1e-10  # an eigenvalue of matrices with entries of about one: below it, nothing is touched


@dataclass(frozen=True, eq=False)
class Ties:
    """How points and bodies follow the freedoms of their hubs; h = points + bodies, in that order.

    ``hub`` (h,) the hub of each; ``rigid`` (h, 6, 6) from the hub's components, before any is taken away;
    ``follow`` (h, 6, 6) from those that remain; ``kept`` (h, 6) which components of each hub remain;
    ``left_out`` the rotations that nothing touches, by hub; ``unused`` (points,) that nothing uses.
    """

    hub: NDArray[np.intp]
    rigid: Array
    follow: Array
    kept: Flags
    left_out: dict[int, tuple[str, ...]]
    unused: Flags


def tie(
    names: tuple[str, ...],
    coordinates: Array,
    held: Flags,
    stretches: Stretches,
    springs: Springs,
    bodies: Bodies,
    faults: list[str],
    in_cells: NDArray[np.intp] | None = None,
) -> Ties:
    """Work out the ties; a translation with neither mass nor stiffness is appended to the faults.

    ``in_cells`` (points,): how many components the cells of a mesh resist at each point: 0, 3 or 6.
    """
    count = len(names)
    places = np.concatenate([coordinates, bodies.centres_m])
    leads = np.concatenate([bodies.lead_of_point, bodies.lead])
    hub = np.where(leads >= 0, count + leads, np.arange(len(places)))
    rigid = arms(places - places[hub])
    everywhere = np.concatenate([places, stretches.tips_m.reshape(-1, 3)])
    size = float(np.ptp(everywhere, axis=0).max()) or 1.0 if len(everywhere) else 1.0
    in_cells = np.zeros(count, dtype=np.intp) if in_cells is None else in_cells
    kept = np.zeros((len(places), 6), dtype=bool)
    kept[np.unique(hub)] = True
    expansion = np.broadcast_to(np.eye(6), (len(places), 6, 6)).copy()
    _hold(hub, rigid, held, size, kept, expansion)
    touch = _touch(hub, rigid, size, stretches, springs, bodies, in_cells)
    surely = np.zeros(len(places), dtype=bool)
    surely[hub[stretches.ends[~stretches.released.any(axis=2)]]] = True
    surely[hub[:count][in_cells == 6]] = True
    left_out = {}
    unused = np.ones(count, dtype=bool)
    unused[stretches.ends.reshape(-1)] = unused[springs.ends[springs.ends != GROUND]] = False
    unused &= (bodies.lead_of_point < 0) & (in_cells == 0)
    kept[:count] &= ~unused[:, None]
    for place in np.flatnonzero(kept.any(axis=1) & ~surely):
        name = names[place] if place < count else bodies.names[place - count]
        taken = _leave_out(touch[place], kept, expansion, int(place), size, name, faults)
        if taken:
            left_out[int(place)] = taken
    expansion *= kept[:, None, :]
    return Ties(hub, rigid, rigid @ expansion[hub], kept, left_out, unused)


def _hold(
    hub: NDArray[np.intp], rigid: Array, held: Flags, size: float, kept: Flags, expansion: Array
) -> None:
    """Take away what supports hold: single components of points, combinations where a body carries over."""
    alone = hub[: len(held)] == np.arange(len(held))
    kept[: len(held)] &= ~(held & alone[:, None])
    carrying = np.flatnonzero(held.any(axis=1) & ~alone)
    scale = np.array([1.0, 1.0, 1.0, *[1.0 / size] * 3])
    for place in np.unique(hub[carrying]):
        rows = [rigid[point][held[point]] for point in carrying if hub[point] == place]
        kept[place], expansion[place] = eliminate(np.concatenate(rows), scale)


def _touch(
    hub: NDArray[np.intp],
    rigid: Array,
    size: float,
    stretches: Stretches,
    springs: Springs,
    bodies: Bodies,
    in_cells: NDArray[np.intp],
) -> Array:
    """(h, 6, 6) positive semidefinite, of entries about one: zero for a motion of a hub that nothing notices.

    Only geometry counts, not how stiff or heavy things are, so that soft and stiff are not confused.
    """
    down = np.array([1.0, 1.0, 1.0, *[1.0 / size] * 3])
    found = np.zeros((len(hub), 6, 6))

    def add(places: NDArray[np.intp], rows: Array) -> None:
        scaled = rows / down[:, None] @ rigid[places] * down
        np.add.at(found, hub[places], np.swapaxes(scaled, 1, 2) @ scaled)

    rows = ~stretches.released[..., None] * (turned(stretches.axes)[:, None] @ arms(stretches.reach_m))
    add(stretches.ends.reshape(-1), rows.reshape(-1, 6, 6))
    active = ((springs.stiffness != 0) | (springs.dashpot != 0))[:, :, None]
    add(springs.ends[:, 0], active * springs.follow[:, :, :6])
    between = springs.ends[:, 1] != GROUND
    add(springs.ends[between, 1], (active * springs.follow[:, :, 6:])[between])
    rows = np.zeros((len(bodies.names), 6, 6))
    for i, mass in enumerate(bodies.mass):
        values, vectors = np.linalg.eigh(mass[3:, 3:])
        rows[i, :3, :3] = np.eye(3)
        rows[i, 3:, 3:] = (values > 1e-12 * max(values[2], 0.0))[:, None] * vectors.T
    add(np.arange(len(hub) - len(bodies.names), len(hub)), rows)
    celled = np.flatnonzero(in_cells)
    add(celled, np.eye(6) * (np.arange(6) < in_cells[celled, None])[:, :, None])
    return found


def _leave_out(
    touch: Array, kept: Flags, expansion: Array, place: int, size: float, name: str, faults: list[str]
) -> tuple[str, ...]:
    """Take the rotations that nothing touches away from a hub, and name them."""
    down = np.array([1.0, 1.0, 1.0, *[1.0 / size] * 3])
    free = np.flatnonzero(kept[place])
    basis = expansion[place][:, free] / down[:, None] * down[free]
    values, vectors = np.linalg.eigh(basis.T @ touch @ basis)
    nothing = vectors[:, values <= _NOTHING * max(1.0, values[-1])]
    if not nothing.size:
        return ()
    turning = free >= 3
    left, sizes, _ = np.linalg.svd(nothing[turning].T)
    turns = int((sizes > 1e-6).sum())
    sliding = nothing @ left[:, turns:]
    if sliding.size:
        moves = [
            COMPONENTS[c]
            for c, row in zip(free, np.abs(sliding).max(axis=1), strict=True)
            if c < 3 and row > 1e-6
        ]
        faults.append(_loose(name, moves))
        return ()
    still, within = eliminate(np.where(turning, nothing.T, 0.0), np.ones(len(free)))
    reduced = expansion[place][:, free] @ (down[free][:, None] * within / down[free])
    expansion[place] = 0.0
    expansion[place][:, free] = reduced
    kept[place] = False
    kept[place, free[still]] = True
    return tuple(COMPONENTS[c] for c in free[~still])


def _loose(name: str, moves: list[str]) -> str:
    listed = " and ".join(moves)
    hold = ", ".join(f'"{move}"' for move in moves)
    return (
        f"points.{name}: nothing resists a movement along {listed} and there is no mass; hold it "
        f'([[supports]] at = "{name}", hold = [{hold}]), or give it a mass '
        "([[bodies]]), a spring or a member that resists"
    )
