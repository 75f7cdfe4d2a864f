"""Flat facets of shells: local axes, links from the nodes to the mid-surface, and plate elasticity.

The local freedoms are u, v, w, rx, ry, rz. Fibres turn by beta_x = ry and beta_y = -rx, so that u at height z
is z beta_x; the shear strain is the slope of w plus beta. Plane stress across the thickness.
"""

from __future__ import annotations

import numpy as np

from vib.structure.cells.family import Array, Properties

# columns of a node's six freedoms, and their signs, for bending (w, beta_x, beta_y) and membrane (u, v, rz)
_BENDING, _SIGNS = np.array([2, 4, 3]), np.array([1.0, 1.0, -1.0])
_MEMBRANE = np.array([0, 1, 5])


def flattened(coordinates: Array) -> tuple[Array, Array]:
    """Frames (e, 3, 3), rows local x, y, z, of triangles; and their corners in the plane (e, 3, 2)."""
    first, second = coordinates[:, 1] - coordinates[:, 0], coordinates[:, 2] - coordinates[:, 0]
    normal, along = _unit(np.cross(first, second)), _unit(first)
    frames = np.stack([along, np.cross(normal, along), normal], axis=1)
    local = (coordinates - coordinates.mean(axis=1, keepdims=True)) @ frames.swapaxes(1, 2)
    return frames, local[:, :, :2]


def links(frames: Array, nodes: int, properties: Properties) -> Array:
    """Local freedoms on the mid-surface per freedoms of the nodes, (e, 6 k, 6 k).

    The mid-surface follows the nodes over rigid links of the length ``properties.offset`` along the normal.
    """
    count = len(frames)
    reach = properties.spread("offset", count)[:, None]
    found = np.zeros((count, nodes, 6, nodes, 6))
    for node in range(nodes):
        found[:, node, :3, node, :3] = frames
        found[:, node, 3:, node, 3:] = frames
        found[:, node, 0, node, 3:] = reach * frames[:, 1]
        found[:, node, 1, node, 3:] = -reach * frames[:, 0]
    return found.reshape(count, 6 * nodes, 6 * nodes)


def in_six(membrane: Array, bending: Array) -> Array:
    """A matrix of six freedoms per node from those of u, v, rz and of w, beta_x, beta_y."""
    count, nodes = len(membrane), membrane.shape[1] // 3
    matrix = np.zeros((count, nodes, 6, nodes, 6))
    for part, places, signs in ((membrane, _MEMBRANE, np.ones(3)), (bending, _BENDING, _SIGNS)):
        apart = part.reshape(count, nodes, 3, nodes, 3)
        for row in range(3):
            for column in range(3):
                sign = signs[row] * signs[column]
                matrix[:, :, places[row], :, places[column]] = sign * apart[:, :, row, :, column]
    return matrix.reshape(count, 6 * nodes, 6 * nodes)


def out_of_six(local: Array) -> tuple[Array, Array]:
    """Local displacements (e, 6 k, m) as those of the membrane and of bending, (e, 3 k, m) each."""
    count, rows, fields = local.shape
    apart = local.reshape(count, rows // 6, 6, fields)
    membrane = apart[:, :, _MEMBRANE].reshape(count, rows // 2, fields)
    bending = (apart[:, :, _BENDING] * _SIGNS[:, None]).reshape(count, rows // 2, fields)
    return membrane, bending


def plate_elasticity(properties: Properties, count: int) -> Array:
    """Membrane forces, moments and shear forces per membrane strain, curvature and shear, (e, 8, 8)."""
    modulus, ratio = properties.spread("youngs_modulus", count), properties.spread("poissons_ratio", count)
    thickness = properties.spread("thickness", count)
    plane = plane_stress(modulus, ratio)
    matrix = np.zeros((count, 8, 8))
    matrix[:, :3, :3] = thickness[:, None, None] * plane
    matrix[:, 3:6, 3:6] = (thickness**3 / 12)[:, None, None] * plane
    matrix[:, 6, 6] = matrix[:, 7, 7] = properties.shear_factor * thickness * modulus / (2 * (1 + ratio))
    return matrix


def plane_stress(modulus: Array, ratio: Array) -> Array:
    """Stresses xx, yy, xy per strain, (e, 3, 3), Pa."""
    matrix = np.zeros((len(modulus), 3, 3))
    matrix[:, 0, 0] = matrix[:, 1, 1] = modulus / (1 - ratio**2)
    matrix[:, 0, 1] = matrix[:, 1, 0] = ratio * modulus / (1 - ratio**2)
    matrix[:, 2, 2] = modulus / (2 * (1 + ratio))
    return matrix


def _unit(vectors: Array) -> Array:
    found: Array = vectors / np.linalg.norm(vectors, axis=1, keepdims=True)
    return found
