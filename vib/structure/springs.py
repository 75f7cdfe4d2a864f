"""Springs and dashpots: six components along axes of their own, reached by rigid arms from midway."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from vib.structure.members import coordinates_of
from vib.structure.preload import belt_stiffness
from vib.structure.rigid import arms, turned
from vib.study import Study
from vib.study.machine import Spring
from vib.study.quantities import COMPONENTS
from vib.system import Array

GROUND = -1


@dataclass(frozen=True, eq=False)
class Springs:
    """Every spring of every pair, q of them.

    ``ends`` (q, 2) point numbers, `GROUND` second; ``follow`` (q, 6, 12): stretch along the spring's axes
    from the twelve components of its ends; ``stiffness`` and ``dashpot`` (q, 6); ``owner`` (q,) number of
    the spring table; ``labels`` name each;
    ``arms_m`` (q,) length of the rigid arms, zero where both ends are at one place; ``pulled`` (q, 12, 12)
    geometric stiffness of a steady pull.
    """

    ends: NDArray[np.intp]
    follow: Array
    stiffness: Array
    dashpot: Array
    owner: NDArray[np.intp]
    labels: tuple[str, ...]
    arms_m: Array
    pulled: Array

    def matrices(self, constants: Array) -> Array:
        """(q, 12, 12) for constants (q, 6) along the springs' axes: follow' diag(constants) follow."""
        found = np.swapaxes(self.follow, 1, 2) @ (constants[:, :, None] * self.follow)
        symmetric: Array = 0.5 * (found + np.swapaxes(found, 1, 2))
        return symmetric


def read_springs(study: Study, points: dict[str, int], faults: list[str]) -> Springs:
    """Arrays of the study's springs; faults are appended in words, each naming its entry."""
    coordinates = coordinates_of(study)
    pairs, owner, labels, turns, stiffness, dashpot = [], [], [], [], [], []
    pulls: list[float] = []
    for i, spring in enumerate(study.springs):
        axes = spring_axes(spring, i, faults)
        for a, b in spring.between:
            if "ground" in (a, b):
                a, b = (b, a) if a == "ground" else (a, b)
            if a == b:
                faults.append(f'springs[{i}].between ("{spring.name}"): both ends are "{a}"')
                continue
            pairs.append((points[a], GROUND if b == "ground" else points[b]))
            labels.append(f"{spring.name} {a}-{b}")
            owner.append(i)
            pulls.append(spring.tension)
            if spring.tension and (b == "ground" or study.points[a] == study.points[b]):
                faults.append(
                    f'springs[{i}].tension ("{spring.name}"): a pull needs two points that lie apart, and '
                    f'"{a}" and "{b}" do not; pull towards a point that is held by a support'
                )
            turns.append(axes)
            stiffness.append([getattr(spring.stiffness, name) for name in COMPONENTS])
            dashpot.append([getattr(spring.dashpot, name) for name in COMPONENTS])
    count = len(owner)
    ends = np.array(pairs, dtype=np.intp).reshape(-1, 2)
    turn = turned(np.array(turns, dtype=float).reshape(-1, 3, 3))
    follow = np.zeros((count, 6, 12))
    half = np.zeros((count, 3))
    if count:
        first = coordinates[ends[:, 0]]
        grounded = ends[:, 1] == GROUND
        second = np.where(grounded[:, None], first, coordinates[ends[:, 1]])
        half = 0.5 * (second - first)
        follow[:, :, :6] = -turn @ arms(half)
        follow[:, :, 6:] = turn @ arms(-half)
        follow[grounded, :, 6:] = 0.0
    return Springs(
        ends,
        follow,
        np.array(stiffness, dtype=float).reshape(-1, 6),
        np.array(dashpot, dtype=float).reshape(-1, 6),
        np.array(owner, dtype=np.intp),
        tuple(labels),
        np.linalg.norm(half, axis=1),
        belt_stiffness(2 * half, np.array(pulls, dtype=float)),
    )


def spring_axes(spring: Spring, i: int, faults: list[str]) -> Array:
    """The spring's axes as rows; an x axis along a global axis brings the next two in their order."""
    if spring.x_axis is None:
        return np.eye(3)
    x = np.array(spring.x_axis)
    if spring.y_axis is not None:
        near = np.array(spring.y_axis)
    else:
        main = int(np.argmax(np.abs(x)))
        near = np.eye(3)[(main + 1) % 3]
        aligned = np.abs(np.delete(x, main)).max() == 0.0
        if not aligned and any(
            table.y != table.z or table.ry != table.rz for table in (spring.stiffness, spring.dashpot)
        ):
            faults.append(
                f'springs[{i}].y_axis ("{spring.name}") is missing: the constants along y and z differ, and '
                "the x axis alone does not say where y and z lie"
            )
    z = np.cross(x, near)
    z /= np.linalg.norm(z)
    return np.stack([x, np.cross(z, x), z])
