"""Rigid bodies: their mass matrices, and which points and bodies move as one."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from vib.structure.members import coordinates_of
from vib.study import Study
from vib.system import Array


@dataclass(frozen=True, eq=False)
class Bodies:
    """The bodies of a study, b of them.

    ``centres_m`` (b, 3); ``mass`` (b, 6, 6) about the centre of mass along global axes; ``carriers``
    the numbers of the points that carry each; ``lead`` (b,) the first of the bodies that a body is rigidly
    tied to by shared points, itself if there is none before it; ``lead_of_point`` (p,) likewise for
    points, -1 for a point that carries nothing.
    """

    names: tuple[str, ...]
    centres_m: Array
    mass: Array
    carriers: tuple[tuple[int, ...], ...]
    lead: NDArray[np.intp]
    lead_of_point: NDArray[np.intp]

    def shared_points(self) -> dict[int, list[int]]:
        """Points that carry two bodies or more, and the numbers of those bodies."""
        found: dict[int, list[int]] = {}
        for body, points in enumerate(self.carriers):
            for point in points:
                found.setdefault(point, []).append(body)
        return {point: bodies for point, bodies in found.items() if len(bodies) > 1}


def read_bodies(study: Study, points: dict[str, int]) -> Bodies:
    """Arrays of the study's bodies."""
    carriers = tuple(tuple(points[name] for name in body.carried_by) for body in study.bodies)
    coordinates = coordinates_of(study)
    centres = [
        body.centre if body.centre is not None else coordinates[points[body.carried_by[0]]]
        for body in study.bodies
    ]
    mass = np.zeros((len(study.bodies), 6, 6))
    for i, body in enumerate(study.bodies):
        xy, yz, zx = body.products
        mass[i, range(6), range(6)] = [*[body.mass] * 3, *body.inertia]
        # the tensor holds minus the products, which are integrals of + x y dm
        mass[i, 3, 4] = mass[i, 4, 3] = -xy
        mass[i, 4, 5] = mass[i, 5, 4] = -yz
        mass[i, 3, 5] = mass[i, 5, 3] = -zx
    lead = _tied_together(carriers)
    lead_of_point = np.full(len(points), -1, dtype=np.intp)
    for i, carried_by in enumerate(carriers):
        lead_of_point[list(carried_by)] = lead[i]
    return Bodies(
        tuple(body.name for body in study.bodies),
        np.array(centres, dtype=float).reshape(-1, 3),
        mass,
        carriers,
        lead,
        lead_of_point,
    )


def _tied_together(carriers: tuple[tuple[int, ...], ...]) -> NDArray[np.intp]:
    """(b,) the smallest number among the bodies that are linked through shared points."""
    lead = list(range(len(carriers)))

    def root(body: int) -> int:
        while lead[body] != body:
            body = lead[body]
        return body

    first: dict[int, int] = {}
    for body, points in enumerate(carriers):
        for point in points:
            other, own = root(first.setdefault(point, body)), root(body)
            lead[max(other, own)] = min(other, own)
    return np.array([root(body) for body in range(len(carriers))], dtype=np.intp)
