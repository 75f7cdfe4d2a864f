"""Spinning bodies: gyroscopic matrices per unit of shaft speed.

A body that spins at W about a unit axis a with polar moment Ip carries the momentum Ip W a. Turning at the
rate v changes it by Ip W (v x a), which the body's supports must provide: I v' - Ip W [a]x v = torque
(G. Genta, Dynamics of Rotating Systems, 2005, chapter 4, in axes that do not turn).
"""

from __future__ import annotations

import numpy as np
import scipy.sparse as sparse

from vib.structure.assembly import Assembly
from vib.study import Study
from vib.study.machine import Body
from vib.system import Array, Rotation, Spinning


def rotations(assembly: Assembly, size: int) -> tuple[Rotation, ...]:
    """One for each shaft that bodies spin with or body that spins by itself, on ``size`` freedoms."""
    study = assembly.layout.study
    groups: dict[str, list[int]] = {}
    for number, body in enumerate(study.bodies):
        if body.spin is not None:
            groups.setdefault(body.spin.shaft or body.name, []).append(number)
    return tuple(_rotation(assembly, size, shaft, numbers) for shaft, numbers in groups.items())


def shaft_speed(study: Study, body: Body) -> tuple[float, float]:
    """Speed range (from, to) of the shaft that a body spins with, rev/s."""
    spin = body.spin
    if spin is None:
        return 0.0, 0.0
    if spin.shaft is None:
        return spin.speed or 0.0, spin.speed or 0.0
    ranges = next(row for row in study.excitations if row.name == spin.shaft).speed_ranges
    return min(low for low, _ in ranges), max(high for _, high in ranges)


def _rotation(assembly: Assembly, size: int, shaft: str, numbers: list[int]) -> Rotation:
    study, transform = assembly.layout.study, assembly.nodes.transform
    first = len(assembly.layout.point_names)
    whole = sparse.csr_array((len(assembly.nodes.freedoms),) * 2)
    spinning = []
    for number in numbers:
        body = study.bodies[number]
        if body.spin is None:
            continue
        axis = np.array(body.spin.axis)
        inertia = assembly.layout.bodies.mass[number][3:, 3:]
        polar = body.spin.inertia if body.spin.inertia is not None else float(axis @ inertia @ axis)
        turning = transform[6 * (first + number) + 3 : 6 * (first + number) + 6]
        part = turning.T @ sparse.csr_array(-polar * body.spin.ratio * cross_matrix(axis)) @ turning
        whole = whole + (part - part.T) / 2
        direction = axis * np.sign(body.spin.ratio)
        spinning.append(Spinning(body.name, tuple(direction.tolist()), polar, body.mass))
    whole.resize((size, size))  # the freedoms of a mesh come after those of points
    low, high = shaft_speed(study, study.bodies[numbers[0]])
    return Rotation(shaft, high, low, whole, None, tuple(spinning))


def cross_matrix(axis: Array) -> Array:
    """[a]x with [a]x v = a x v."""
    x, y, z = axis
    return np.array([[0.0, -z, y], [z, 0.0, -x], [-y, x, 0.0]])
