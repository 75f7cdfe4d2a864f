"""The static displacement of a structure under its own weight, and the forces that hold it up."""

from __future__ import annotations

import warnings
from collections.abc import Callable, Iterator, Mapping
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np
import scipy.sparse as sparse
from numpy.typing import NDArray

from vib.structure.assembly import Assembly
from vib.structure.springs import GROUND
from vib.structure.stacks import add_up
from vib.study.quantities import COMPONENTS
from vib.system import Array, Matrix

if TYPE_CHECKING:
    from vib.structure.mesh.weaving import Woven

STANDARD_GRAVITY = (
    9.80665  # m/s^2, exact by definition (3rd General Conference on Weights and Measures, 1901)
)
# smallest eigenvalue of the stiffness scaled to a diagonal of ones; real structures lie far above
_SINGULAR = 1e-13
_RESIDUAL = 1e-6

Triple = tuple[float, float, float]
Solve = Callable[[Array], Array]
Factorise = Callable[[Matrix], Solve | None]


@dataclass(frozen=True)
class Reaction:
    """Force (N) and moment (N m) at the point that a support or a grounded spring puts on the structure."""

    name: str
    point: str
    force_n: Triple
    moment_nm: Triple


@dataclass(frozen=True, eq=False)
class Sag:
    """Static displacement under gravity.

    ``displacement_m`` of every point and body by name; ``greatest_m`` the greatest anywhere along the
    structure, ``greatest_at`` where that is, in words, ``greatest_place_m`` and as coordinates;
    ``motion_m`` (k, 3) of the nodes of the frame; ``reactions`` together carry the weight.
    """

    displacement_m: Mapping[str, Triple]
    greatest_m: float
    greatest_at: str
    greatest_place_m: Triple
    motion_m: Array
    reactions: tuple[Reaction, ...]


def find_sag(
    assembly: Assembly, up: Array, factorise: Factorise | None = None
) -> tuple[Sag | None, tuple[str, ...]]:
    """The sag and remarks; None where the structure is free or a mechanism.

    Parameters
    ----------
    assembly
        The structure, cut into pieces.
    up
        (3,) unit vector; gravity pulls the other way.
    factorise
        What factorises the stiffness; SuperLU if not given, which is slow for a large mesh.
    """
    raw_stiffness = add_up(assembly.stiffness)
    load = add_up(assembly.mass) @ (assembly.rigid_motion()[:, :3] @ (-STANDARD_GRAVITY * up))
    transform, woven = assembly.nodes.transform, assembly.woven
    stiffness = assembly.reduced(raw_stiffness)
    pull = transform.T @ load
    if woven is not None:
        from vib.structure.mesh.whole import carried, summed

        pulled = woven.pushed[:, :3] @ (-STANDARD_GRAVITY * up)
        stiffness, pull = summed(woven.stiffness, stiffness), carried(woven, pull, pulled)
    moved = _solve(stiffness, pull, factorise or _factor)
    if moved is None:
        return None, (
            "no sag: the structure is free to move somewhere, as a whole or as a mechanism, so that gravity "
            "has no static answer; vib modes names the free movements",
        )
    motion = transform @ moved[: transform.shape[1]]
    residual = raw_stiffness @ motion - load
    if woven is None:
        return _describe(assembly, motion, _reactions(assembly, motion, residual)), ()
    on_mesh = woven.transform @ moved
    at_edge = woven.edge_stiffness @ on_mesh - pulled[woven.edge]
    residual = residual + _from_mesh(assembly, woven, at_edge)
    reactions = (*_reactions(assembly, motion, residual), *_held_by_mesh(woven, at_edge))
    return _with_mesh(assembly, woven, _describe(assembly, motion, reactions), moved), ()


def _from_mesh(assembly: Assembly, woven: Woven, at_edge: Array) -> Array:
    """(6 k + t,) forces that the mesh leaves unbalanced at nodes that are points."""
    found = np.zeros(assembly.nodes.transform.shape[0])
    number = {name: i for i, name in enumerate(assembly.layout.point_names)}
    for name, node in woven.model.node_of_point.items():
        rows = woven.rows_of(node)
        found[6 * number[name] + np.arange(len(rows))] += at_edge[np.searchsorted(woven.edge, rows)]
    return found


def _held_by_mesh(woven: Woven, at_edge: Array) -> Iterator[Reaction]:
    """Forces of the supports that hold nodes of the mesh, with their moment about the middle of the nodes."""
    taken = set(woven.model.node_of_point.values())
    for name, members, components in woven.model.held:
        nodes = np.array([node for node in members.tolist() if node not in taken], dtype=np.intp)
        if not len(nodes):
            continue
        taken |= set(nodes.tolist())
        first, count = woven.pattern.first[nodes], 3 * np.diff(woven.pattern.first)[nodes]
        at_nodes = np.zeros((len(nodes), 6))
        for component in (COMPONENTS.index(name) for name in components):
            has = np.flatnonzero(component < count)
            rows = np.searchsorted(woven.edge, 3 * first[has] + component)
            at_nodes[has, component] = at_edge[rows]
        places = woven.model.nodes_m[nodes]
        forces, moments = at_nodes[:, :3], at_nodes[:, 3:]
        moment = np.cross(places - places.mean(axis=0), forces).sum(axis=0) + moments.sum(axis=0)
        yield Reaction(f"support of {name}", name, _triple(forces.sum(axis=0)), _triple(moment))


def _with_mesh(assembly: Assembly, woven: Woven, frame: Sag, moved: Array) -> Sag:
    """The named places of a mesh too, and the greatest sag anywhere."""
    from vib.structure.picture import find_places

    places = {
        name: _triple(np.asarray(place.motion @ moved)[:3]) for name, place in find_places(assembly).items()
    }
    shifts = np.asarray(woven.translations @ moved).reshape(-1, 3)
    size = np.linalg.norm(shifts, axis=1)
    node = int(np.argmax(size))
    if size[node] <= frame.greatest_m:
        return replace(frame, displacement_m=places)
    named = next(
        (name for name, at in woven.model.named.items() if at == node), f"node {node + 1} of the mesh"
    )
    return replace(
        frame,
        displacement_m=places,
        greatest_m=float(size[node]),
        greatest_at=named,
        greatest_place_m=_triple(woven.model.nodes_m[node]),
    )


def _solve(stiffness: Matrix, pull: Array, factorise: Factorise) -> Array | None:
    """The displacements, or None where the stiffness is singular to round-off."""
    diagonal = stiffness.diagonal()
    if (diagonal <= 0).any():
        return None
    if not len(diagonal):
        return pull
    scale = 1 / np.sqrt(diagonal)
    scaled = sparse.csc_array(sparse.diags_array(scale) @ stiffness @ sparse.diags_array(scale))
    solve = factorise(scaled)
    if solve is None or _smallest_eigenvalue(solve, len(diagonal)) < _SINGULAR:
        return None
    right = scale * pull
    found = solve(right)
    found += solve(right - scaled @ found)
    size = np.linalg.norm(right)
    if not np.isfinite(found).all() or np.linalg.norm(right - scaled @ found) > _RESIDUAL * size:
        return None
    moved: Array = scale * found
    return moved


def _factor(matrix: Matrix) -> Solve | None:
    from scipy.sparse.linalg import splu

    try:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")
            solve: Solve = splu(matrix, permc_spec="MMD_AT_PLUS_A", options={"SymmetricMode": True}).solve
    except RuntimeError:  # exactly singular
        return None
    return solve


def _smallest_eigenvalue(solve: Solve, size: int) -> float:
    """By inverse iteration from a vector that is no accident of symmetry; never below the true one."""
    vector = np.random.default_rng(7).standard_normal(size)
    smallest = np.inf
    for _ in range(4):
        vector /= np.linalg.norm(vector)
        vector = solve(vector)
        length = float(np.linalg.norm(vector))
        if not np.isfinite(length):
            return 0.0
        smallest = min(smallest, 1 / length)
    return smallest


def _reactions(assembly: Assembly, motion: Array, residual: Array) -> tuple[Reaction, ...]:
    """Forces of supports from what is left unbalanced at their points, and of springs to the ground."""
    layout = assembly.layout
    ties, held, count = layout.ties, layout.held, len(layout.point_names)
    at_places = _gather(assembly, residual)
    forces = np.where(held, at_places[:count], 0.0)
    carried = (layout.bodies.lead_of_point >= 0) & held.any(axis=1)
    for place in np.unique(ties.hub[:count][carried]).tolist():
        # the points of one body share its unbalanced force; where they are too many, the least forces
        points = np.flatnonzero(carried & (ties.hub[:count] == place))
        rows = [(point, component) for point in points for component in np.flatnonzero(held[point])]
        arms = np.array([ties.rigid[point, component] for point, component in rows])
        everything = np.flatnonzero(ties.hub == place)
        unbalanced = np.einsum("hij,hi->j", ties.rigid[everything], at_places[everything])
        shares = np.linalg.lstsq(arms.T, unbalanced, rcond=None)[0]
        forces[tuple(np.array(rows).T)] = shares
    found = [
        Reaction(f"support of {name}", name, *_force_and_moment(forces[i]))
        for i, name in enumerate(layout.point_names)
        if held[i].any() and not ties.unused[i]
    ]
    springs = layout.springs
    grounded = np.flatnonzero(springs.ends[:, 1] == GROUND)
    pulls = springs.matrices(springs.stiffness)[:, :6, :6]
    for q in grounded.tolist():
        point = int(springs.ends[q, 0])
        push = -pulls[q] @ motion[6 * point : 6 * point + 6]
        found.append(Reaction(springs.labels[q], layout.point_names[point], *_force_and_moment(push)))
    return tuple(found)


def _gather(assembly: Assembly, forces: Array) -> NDArray[np.float64]:
    """(h, 6) forces on nodes, those on separate ends of members moved to their points."""
    stretches = assembly.layout.stretches
    at_nodes = forces[: 6 * len(assembly.nodes.places_m)].reshape(-1, 6)
    found = at_nodes[: len(assembly.layout.ties.hub)].copy()
    separate = stretches.separate
    moved = np.einsum("xij,xi->xj", stretches.attachment()[separate], at_nodes[assembly.nodes.ends[separate]])
    np.add.at(found, stretches.ends[separate], moved)
    return found


def _describe(assembly: Assembly, motion: Array, reactions: tuple[Reaction, ...]) -> Sag:
    layout = assembly.layout
    shifts = motion[: 6 * len(assembly.nodes.places_m)].reshape(-1, 6)[:, :3]
    names = (*layout.point_names, *layout.bodies.names)
    size = np.linalg.norm(shifts, axis=1)
    # a place with a name wins over an end of a member that moves as much
    greatest = int(np.argmax(size > size.max(initial=0.0) * (1 - 1e-9))) if size.any() else 0
    if not len(size):
        return Sag({}, 0.0, "", (0.0, 0.0, 0.0), shifts, reactions)
    words = list(names)
    separate = np.nonzero(layout.stretches.separate)
    words += [
        f"{layout.stretches.labels[s]} at its {('start', 'end')[e]}" for s, e in zip(*separate, strict=True)
    ]
    words += [
        f"{label} at {k}/{count} of its length"
        for label, count in zip(layout.stretches.labels, assembly.counts.tolist(), strict=True)
        for k in range(1, count)
    ]
    return Sag(
        displacement_m={
            name: _triple(shift) for name, shift in zip(names, shifts[: len(names)], strict=True)
        },
        greatest_m=float(size[greatest]),
        greatest_at=words[greatest],
        greatest_place_m=_triple(assembly.nodes.places_m[greatest]),
        motion_m=shifts,
        reactions=reactions,
    )


def _force_and_moment(six: Array) -> tuple[Triple, Triple]:
    return _triple(six[:3]), _triple(six[3:])


def _triple(vector: Array) -> Triple:
    x, y, z = vector.tolist()
    return x, y, z
