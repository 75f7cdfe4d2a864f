"""Membrane triangle with rotations about the normal, and the motion of Allman's edges for its mass.

Stiffness: the optimal triangle of C. A. Felippa, A study of optimal membrane triangles with drilling
freedoms, Comput. Methods Appl. Mech. Engrg. 192 (2003) 2125-2168: basic stiffness of constant stress
(P. G. Bergan, C. A. Felippa, CMAME 50 (1985) 25-69, lumping factor 3/2) plus a higher-order stiffness with
the published parameters, exact for in-plane bending of rectangles of any aspect ratio.
"""

from __future__ import annotations

import numpy as np

from vib.structure.cells.facet import plane_stress
from vib.structure.cells.family import Array, Properties

_ALPHA = 1.5
# beta_1 to beta_9 of the optimal triangle
_BETA = (1.0, 2.0, 1.0, 0.0, 1.0, -1.0, -1.0, -1.0, -2.0)
# rows are edges 21, 32, 13; columns the corners: places of beta in the natural strains at corners 1, 2, 3
_CORNER_BETA = (
    ((1, 2, 3), (4, 5, 6), (7, 8, 9)),
    ((9, 7, 8), (3, 1, 2), (6, 4, 5)),
    ((5, 6, 4), (8, 9, 7), (2, 3, 1)),
)


def optimal_triangle(flat: Array, properties: Properties) -> Array:
    """Stiffness of u, v, rz at three corners, (e, 9, 9), from their positions in the plane (e, 3, 2)."""
    count = len(flat)
    ratio, thickness = properties.spread("poissons_ratio", count), properties.spread("thickness", count)
    plane = plane_stress(properties.spread("youngs_modulus", count), ratio)
    area = triangle_area(flat)
    lumped = _lumping(flat)
    basic = (thickness / area)[:, None, None] * (lumped @ plane @ lumped.swapaxes(1, 2))
    natural = _natural_strains(flat)
    stiff = natural.swapaxes(1, 2) @ plane @ natural
    squares = np.sum((flat - np.roll(flat, -1, axis=1)) ** 2, axis=2)  # edges 21, 32, 13
    corners: list[Array] = []
    for places in _CORNER_BETA:
        numbers = np.array([[_BETA[place - 1] for place in row] for row in places])
        corners.append((2 * area / 3)[:, None, None] * numbers / squares[:, :, None])
    higher = np.zeros((count, 3, 3))
    for first, second in ((0, 1), (1, 2), (2, 0)):
        midway = (corners[first] + corners[second]) / 2
        higher += midway.swapaxes(1, 2) @ stiff @ midway
    relative = relative_rotations(flat)
    scale = 0.75 * np.maximum((1 - 4 * ratio**2) / 2, 0.01) * thickness * area
    return basic + scale[:, None, None] * (relative.swapaxes(1, 2) @ higher @ relative)


def triangle_area(flat: Array) -> Array:
    """Areas (e,), positive where the corners run anticlockwise."""
    a, b = flat[:, 1] - flat[:, 0], flat[:, 2] - flat[:, 0]
    found: Array = (a[:, 0] * b[:, 1] - a[:, 1] * b[:, 0]) / 2
    return found


def relative_rotations(flat: Array) -> Array:
    """Rotation of each corner less the mean rotation of the plane, per u, v, rz: (e, 3, 9)."""
    found = np.zeros((len(flat), 3, 9))
    area = triangle_area(flat)[:, None]
    for corner in range(3):
        before, after = (corner + 2) % 3, (corner + 1) % 3
        edge = (flat[:, before] - flat[:, after]) / (4 * area)
        found[:, :, 3 * corner] = edge[:, None, 0]
        found[:, :, 3 * corner + 1] = edge[:, None, 1]
        found[:, corner, 3 * corner + 2] = 1
    return found


def edge_swell(flat: Array, edges: Array) -> Array:
    """Mid-edge displacement beyond the straight edge, per u, v, rz: (e, edges, 2, 3 k).

    D. J. Allman, Comput. Struct. 19 (1984) 1-8: length / 8 times the difference of the end rotations, along
    the outward normal.
    """
    count, nodes = flat.shape[:2]
    found = np.zeros((count, len(edges), 2, nodes, 3))
    for number, (i, j) in enumerate(edges):
        along = flat[:, j] - flat[:, i]
        outward = np.stack([along[:, 1], -along[:, 0]], axis=1)
        found[:, number, :, j, 2] += outward / 8
        found[:, number, :, i, 2] -= outward / 8
    return found.reshape(count, len(edges), 2, 3 * nodes)


def _lumping(flat: Array) -> Array:
    """Forces and moments on the corners per constant stress, without the thickness: (e, 9, 3)."""
    found = np.zeros((len(flat), 3, 3, 3))
    for i, j, k in ((0, 1, 2), (1, 2, 0), (2, 0, 1)):
        x_kj, y_jk = flat[:, k, 0] - flat[:, j, 0], flat[:, j, 1] - flat[:, k, 1]
        x_ij, y_ji = flat[:, i, 0] - flat[:, j, 0], flat[:, j, 1] - flat[:, i, 1]
        x_ki, y_ik = flat[:, k, 0] - flat[:, i, 0], flat[:, i, 1] - flat[:, k, 1]
        found[:, i, 0, 0] = found[:, i, 1, 2] = y_jk
        found[:, i, 0, 2] = found[:, i, 1, 1] = x_kj
        found[:, i, 2, 0] = _ALPHA / 6 * y_jk * (y_ik - y_ji)
        found[:, i, 2, 1] = _ALPHA / 6 * x_kj * (x_ki - x_ij)
        found[:, i, 2, 2] = _ALPHA / 3 * (x_ki * y_ik - x_ij * y_ji)
    return found.reshape(len(flat), 9, 3) / 2


def _natural_strains(flat: Array) -> Array:
    """Strains xx, yy, xy per strains along the edges 21, 32, 13, (e, 3, 3)."""
    along = np.roll(flat, -1, axis=1) - flat
    x, y = along[:, :, 0], along[:, :, 1]
    direct = np.stack([x**2, y**2, x * y], axis=2) / (x**2 + y**2)[:, :, None]
    return np.asarray(np.linalg.inv(direct), dtype=np.float64)
