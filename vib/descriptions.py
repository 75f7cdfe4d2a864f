"""Modes in plain words: how the whole moves, and what bends or turns most."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np
from numpy.typing import NDArray

from vib.solve.damping import ModalDamping
from vib.system import Anatomy, MeshView, System

Array = NDArray[np.float64]
AXES = "xyz"
MOSTLY = 0.6  # a rigid motion of the whole is named where it explains this part of the squared displacements
_LOOKED_AT = 40  # nodes of each region of a mesh, to tell how it moves as one
ALONG = 0.75  # and an axis where it holds this part of the squared direction


def describe(system: System, shapes: NDArray[Any], strain: Mapping[str, Array] | None) -> tuple[str, ...]:
    """One phrase for each elastic mode, such as "sway along y, 71 % of the strain energy in the legs"."""
    anatomy = system.anatomy
    if anatomy is None:
        return tuple(_largest_freedom(system, shape) for shape in shapes.T)
    return tuple(
        _motion(anatomy, shape.real) + _where(strain or {}, mode) for mode, shape in enumerate(shapes.T)
    )


def _largest_freedom(system: System, shape: NDArray[Any]) -> str:
    freedom = system.freedoms[int(np.argmax(np.abs(shape)))]
    return f"largest at {freedom.point}" + (f" {_along(freedom.component)}" if freedom.component else "")


def _along(component: str) -> str:
    return f"about {component[1]}" if component.startswith("r") else f"along {component}"


def _where(strain: Mapping[str, Array], mode: int) -> str:
    if not strain:
        return ""
    name = max(strain, key=lambda part: float(strain[part][mode]))
    share = float(strain[name][mode])
    return f", {100 * share:.0f} % of the strain energy in {_the(name)}" if share > 0 else ""


def _the(name: str) -> str:
    return name if name.startswith("the ") else f"the {name}"


def _motion(anatomy: Anatomy, shape: Array) -> str:
    nodes = anatomy.wireframe.nodes_m
    moved = np.asarray(anatomy.wireframe.motion @ shape).reshape(-1, 3)
    total = float(np.sum(moved**2))
    if len(nodes) == 0 or total == 0:
        return _largest_place(anatomy, shape)
    mean = moved.mean(axis=0)
    if len(nodes) * float(mean @ mean) >= MOSTLY * total:
        return _translation(mean)
    arms = nodes - nodes.mean(axis=0)
    about = np.array([np.cross(axis, arms).ravel() for axis in np.eye(3)]).T
    turn = np.linalg.lstsq(about, (moved - mean).ravel(), rcond=1e-9)[0]
    turned = (about @ turn).reshape(-1, 3)
    if float(np.sum((mean + turned) ** 2)) >= MOSTLY * total:
        axis = _axis(turn * np.sqrt(np.sum(about**2, axis=0)))
        if axis:
            return "twist about z" if axis == "z" else f"rocking about {axis}"
        return "rocking about a slanting axis"
    return _largest_place(anatomy, shape)


def _translation(mean: Array) -> str:
    axis = _axis(mean)
    if axis == "z":
        return "up-and-down motion along z"
    if axis:
        return f"sway along {axis}"
    flat = float(mean[2] ** 2) <= (1 - ALONG) * float(mean @ mean)
    return "sway between x and y" if flat else "motion of the whole along a slanting line"


def _axis(direction: Array) -> str:
    size = float(direction @ direction)
    largest = int(np.argmax(np.abs(direction)))
    return AXES[largest] if size and direction[largest] ** 2 >= ALONG * size else ""


def _largest_place(anatomy: Anatomy, shape: Array) -> str:
    best, name, direction = 0.0, "", np.zeros(3)
    for place in anatomy.places.values():
        moved = np.asarray(place.motion @ shape)[:3]
        size = float(np.linalg.norm(moved))
        if size > best:
            best, name, direction = size, place.name, moved
    wire = np.asarray(anatomy.wireframe.motion @ shape).reshape(-1, 3)
    between = np.linalg.norm(wire, axis=1)
    if between.size and between.max() > 2 * best:  # between the named points: name the part that bows
        node = int(np.argmax(between))
        part = next((part for part, line in anatomy.wireframe.lines if node in line), "")
        axis = _axis(wire[node])
        return (
            f"bowing of {_the(part)}" + (f" along {axis}" if axis else "")
            if part
            else "bowing between points"
        )
    if not name:
        return "rotation only"
    axis = _axis(direction)
    return f"local motion, largest at {name}" + (f" along {axis}" if axis else "")


def damping_note(system: System, damping: ModalDamping, *, proportional: bool) -> str:
    """The damping that the modes were computed with, in words."""
    law, parts = system.damping_law, []
    if law.ratio:
        parts.append(f"ratio {law.ratio:.4g} in every mode")
    parts += [f"ratio {ratio:.4g} from {low:.4g} Hz to {high:.4g} Hz" for low, high, ratio in law.bands]
    if law.material:
        parts.append("ratios of the materials weighted by strain energy")
    if system.damping is not None and abs(system.damping).max() > 0:
        if damping.rayleigh is not None:
            a, b = damping.rayleigh
            parts.append(f"a damping matrix of {a:.4g} 1/s times the mass and {b:.4g} s times the stiffness")
        else:
            parts.append("a damping matrix (dashpots)")
    if not parts:
        return "none" if proportional else "none (gyroscopic or circulatory terms only)"
    ending = "" if proportional else "; it changes the shapes of the modes, which are complex"
    return " and ".join(parts) + ending


def name_rigid(system: System, shapes: Array) -> tuple[tuple[str, ...], Array]:
    """What moves freely, one sentence for each rigid-body mode, and coefficients (z, z) of those motions.

    Motions of the whole along and about the axes are named first where they are free; the rest is split
    so that each sentence has as few places in it as can be.
    """
    count = shapes.shape[1]
    if not count:
        return (), np.zeros((0, 0))
    anatomy = system.anatomy
    if anatomy is not None and anatomy.mesh is not None:
        return _named(*_seen_of_mesh(anatomy, anatomy.mesh, shapes))
    places = list(anatomy.places.values()) if anatomy else []
    felt = np.vstack([np.asarray(place.motion @ shapes) for place in places] or [np.zeros((1, count))])
    if np.linalg.matrix_rank(felt) < count:  # bare matrices, or a motion that no named place takes part in
        labels = [str(freedom) for freedom in system.freedoms]
        basis = _sparse_basis(shapes)
        names = tuple(f"{_list(_moving(labels, shapes @ column))} can move freely" for column in basis.T)
        return names, basis
    arms = np.array([place.position_m for place in places])
    return _named([place.name for place in places], arms, felt, np.ones(len(places), dtype=bool))


def _seen_of_mesh(
    anatomy: Anatomy, mesh: MeshView, shapes: Array
) -> tuple[list[str], Array, Array, NDArray[np.bool_]]:
    """Bodies, and nodes here and there in every region: names, positions, six components, which can turn."""
    names: list[str] = []
    arms: list[tuple[float, float, float]] = []
    felt: list[NDArray[Any]] = []
    nodes_seen: list[int] = []
    for body in anatomy.parts:
        if body.name in anatomy.places and body.kind == "body":
            place = anatomy.places[body.name]
            names.append(body.name)
            arms.append(place.position_m)
            felt.append(np.asarray(place.motion @ shapes))
    for part in dict.fromkeys(part for _, part, _ in mesh.cells):
        nodes = np.unique(np.concatenate([cells.ravel() for _, name, cells in mesh.cells if name == part]))
        for node in nodes[np.linspace(0, len(nodes) - 1, min(len(nodes), _LOOKED_AT)).astype(int)].tolist():
            nodes_seen.append(len(names))
            names.append(part)
            x, y, z = mesh.nodes_m[node].tolist()
            arms.append((x, y, z))
            moved = np.asarray(mesh.motion[3 * node : 3 * node + 3] @ shapes)
            felt.append(np.vstack([moved, np.zeros_like(moved)]))
    for name, place in anatomy.places.items():  # ends of members that are no nodes of the mesh
        if name not in names and place.motion[3:].nnz:
            names.append(name)
            arms.append(place.position_m)
            felt.append(np.asarray(place.motion @ shapes))
    turning = np.ones(len(names), dtype=bool)
    turning[nodes_seen] = False
    return names, np.array(arms), np.vstack(felt), turning


def _named(
    names: list[str], arms: Array, felt: Array, turning: NDArray[np.bool_]
) -> tuple[tuple[str, ...], Array]:
    """See `name_rigid`; from six components of each place (6 p, z), those that turn by ``turning`` (p,)."""
    count = felt.shape[1]
    length = float(np.ptp(arms, axis=0).max()) or 1.0
    turns = np.repeat(turning, 6)
    felt[np.arange(len(felt)) % 6 >= 3] *= length  # rotations in the same unit as translations
    sentences: list[str] = []
    columns: list[NDArray[Any]] = []
    for sentence, motion in _whole_motions(arms, length):
        motion[~turns & (np.arange(len(motion)) % 6 >= 3)] = 0.0  # places without rotations
        if len(columns) == count:
            break
        coefficients = np.linalg.lstsq(felt, motion, rcond=None)[0]
        if np.linalg.norm(felt @ coefficients - motion) <= 1e-6 * np.linalg.norm(motion):
            sentences.append(sentence)
            columns.append(coefficients)
    local = _sparse_basis(felt)
    number = [len(_moving([""] * len(felt), felt @ column)) for column in local.T]
    for index in np.argsort(number, kind="stable"):
        enlarged = np.array([*columns, local[:, index]])
        if np.linalg.matrix_rank(enlarged / np.linalg.norm(enlarged, axis=1)[:, None], tol=1e-6) > len(
            columns
        ):
            columns.append(local[:, index])
            sentences.append(_sentence(names, felt @ local[:, index]))
    return tuple(sentences), np.array(columns).T


def _whole_motions(arms: Array, length: float) -> list[tuple[str, Array]]:
    """The six rigid motions of all places, about their middle, as columns of six components per place."""
    motions = []
    middle = arms - arms.mean(axis=0)
    for axis in range(3):
        motion = np.zeros((len(arms), 6))
        motion[:, axis] = 1.0
        motions.append((f"the whole structure can move freely along {AXES[axis]}", motion.ravel()))
    for axis in range(3):
        motion = np.zeros((len(arms), 6))
        motion[:, :3] = np.cross(np.eye(3)[axis], middle)
        motion[:, 3 + axis] = length
        motions.append((f"the whole structure can turn freely about {AXES[axis]}", motion.ravel()))
    return motions


def _sparse_basis(motions: Array) -> Array:
    """Coefficients (z, z) that make the columns of ``motions`` unit vectors in z well-chosen rows."""
    rest, rows = motions.copy(), []
    for _ in range(motions.shape[1]):
        row = int(np.argmax(np.linalg.norm(rest, axis=1)))
        direction = rest[row] / np.linalg.norm(rest[row])
        rows.append(row)
        rest = rest - np.outer(rest @ direction, direction)
    return np.asarray(np.linalg.inv(motions[rows]))


def _moving(names: Sequence[str], motion: Array) -> list[str]:
    return [
        name for name, size in zip(names, np.abs(motion), strict=True) if size > 1e-6 * np.abs(motion).max()
    ]


def _sentence(names: Sequence[str], motion: Array) -> str:
    components = motion.reshape(-1, 6)
    moving = list(dict.fromkeys(_moving(names, np.abs(components).max(axis=1))))
    turning = np.abs(components[:, 3:]).max(axis=1)
    if turning.max() > 1e-3 * np.abs(components).max():
        axis = _axis(components[int(np.argmax(turning)), 3:])
        return f"{_list(moving)} can turn freely about {axis or 'a slanting axis'}"
    largest = int(np.argmax(np.abs(components[:, :3]).max(axis=1)))
    return f"{_list(moving)} can move freely along {_axis(components[largest, :3]) or 'a slanting line'}"


def _list(names: Sequence[str]) -> str:
    if len(names) > 6:
        return f"{', '.join(names[:5])} and {len(names) - 5} others"
    return " and ".join([", ".join(names[:-1]), names[-1]]) if len(names) > 1 else names[0]
