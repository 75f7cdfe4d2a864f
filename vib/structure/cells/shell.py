"""Shells: flat facets with membrane, bending and shear stiffness, six freedoms per node.

A cell lies in its mean plane; each node follows it over a rigid link along the normal, which carries both the
warp of a quad (R. L. Taylor, Finite element analysis of linear shell problems, in The Mathematics of Finite
Elements and Applications VI (1987) 191-203) and the offset of a stiffened plate. Plane stress; the local
freedoms are u, v, w, rx, ry, rz, and the fibre rotations beta_x = ry, beta_y = -rx, so that u(z) = z beta_x.
"""

from __future__ import annotations

from abc import abstractmethod
from functools import cached_property
from typing import ClassVar

import numpy as np
from numpy.typing import NDArray

from vib.structure.cells.family import Array, Family, Numbers, Properties, Stresses, upper_blocks

# a cell with less than this part of its size squared in area is flat
_FLAT = 1e-10
# columns of a node's six freedoms, and their signs, for bending (w, beta_x, beta_y) and membrane (u, v, rz)
_BENDING, _SIGNS = np.array([2, 4, 3]), np.array([1.0, 1.0, -1.0])
_MEMBRANE = np.array([0, 1, 5])


class Shell(Family):
    """A facet; its file gives the stiffness in its own plane, and the motions that its mass follows."""

    freedoms: ClassVar[int] = 6
    dimension: ClassVar[int] = 2

    @cached_property
    def mirrored(self) -> Numbers:
        """See `Family.mirrored`; it turns the normal round."""
        return np.roll(np.arange(self.nodes)[::-1], 1)

    @abstractmethod
    def membrane_stiffness(self, flat: Array, properties: Properties) -> Array:
        """Of u, v, rz node by node, (e, 3 k, 3 k), from node positions in the plane (e, k, 2)."""

    @abstractmethod
    def bending_strains(self, flat: Array, properties: Properties) -> tuple[Array, Array]:
        """Curvatures xx, yy, xy and shears xz, yz per w, beta_x, beta_y: (e, p, 5, 3 k); weights (e, p)."""

    @abstractmethod
    def motions(self, flat: Array, properties: Properties) -> tuple[Array, Array, Array]:
        """What the mass follows at points: u, v and rz less the mean rotation per u, v, rz, (e, p, 3, 3 k);
        w, beta_x, beta_y per the same (e, p, 3, 3 k); weights (e, p).
        """

    @abstractmethod
    def centre_strains(self, flat: Array, properties: Properties) -> tuple[Array, Array, Array]:
        """Membrane strains (e, 3, 3 k), bending strains (e, 5, 3 k) at the centre, and the area (e,)."""

    @abstractmethod
    def corner_areas(self, flat: Array) -> Array:
        """Twice the area of the triangle at each corner, (e, corners)."""

    def stiffness_blocks(self, coordinates: Array, properties: Properties) -> Array:
        """See `Family.stiffness_blocks`."""
        frames, flat, rise = flattened(coordinates)
        strains, weights = self.bending_strains(flat, properties)
        elastic = plate_elasticity(properties, len(flat))[:, 3:, 3:]
        weighted = weights[:, :, None, None] * (elastic[:, None] @ strains)
        columns = strains.shape[-1]
        bending = strains.reshape(len(flat), -1, columns).swapaxes(1, 2) @ weighted.reshape(
            len(flat), -1, columns
        )
        local = _in_six(self.membrane_stiffness(flat, properties), bending)
        return self._turned(local, frames, rise, properties)

    def mass_blocks(self, coordinates: Array, properties: Properties) -> Array:
        """See `Family.mass_blocks`; the thickness's rotary inertia is in it.

        The rotation about the normal has inertia only where it differs from that of the plane: none in rigid
        motion, so that the total inertia is exact, yet no motion is without mass.
        """
        frames, flat, rise = flattened(coordinates)
        along, across, weights = self.motions(flat, properties)
        thickness = properties.spread("thickness", len(flat))
        density = properties.spread("density", len(flat))
        surface, rotary = density * thickness, density * thickness**3 / 12
        parts = []
        for operator, share in (
            (along, np.stack([surface, surface, rotary], axis=1)),
            (across, np.stack([surface, rotary, rotary], axis=1)),
        ):
            root = np.sqrt(weights[:, :, None] * share[:, None, :])[..., None] * operator
            columns = root.reshape(len(flat), -1, root.shape[-1])
            parts.append(columns.swapaxes(1, 2) @ columns)
        return self._turned(_in_six(*parts), frames, rise, properties)

    def stresses(self, coordinates: Array, properties: Properties, displacements: Array) -> Stresses:
        """See `Family.stresses`; at the centre of the cell."""
        count = len(coordinates)
        frames, flat, rise = flattened(coordinates)
        membrane, bending, area = self.centre_strains(flat, properties)
        local = _links(frames, rise, properties) @ displacements
        apart = local.reshape(count, self.nodes, 6, -1)
        along = apart[:, :, _MEMBRANE].reshape(count, 3 * self.nodes, -1)
        across = (apart[:, :, _BENDING] * _SIGNS[:, None]).reshape(count, 3 * self.nodes, -1)
        strains = np.concatenate([membrane @ along, bending @ across], axis=1)
        elastic = plate_elasticity(properties, count)
        return Stresses(
            points_m=coordinates.mean(axis=1, keepdims=True),
            weights=area[:, None],
            values=(elastic @ strains)[:, None],
            compliance=np.linalg.inv(elastic),
            frames=frames,
        )

    def faults(self, coordinates: Array) -> tuple[NDArray[np.bool_], NDArray[np.bool_]]:
        """See `Family.faults`; a surface can't be inside out, but a quad can be folded."""
        size = np.ptp(coordinates, axis=1).max(axis=1)
        with np.errstate(invalid="ignore", divide="ignore"):
            areas = self.corner_areas(flattened(coordinates)[1])
        flat = ~(np.abs(areas).max(axis=1) > _FLAT * size**2)
        return flat, (areas.min(axis=1) <= 0) & ~flat

    def _turned(self, local: Array, frames: Array, rise: Array, properties: Properties) -> Array:
        links = _links(frames, rise, properties)
        return upper_blocks(links.swapaxes(1, 2) @ local @ links, self.pairs)


def flattened(coordinates: Array) -> tuple[Array, Array, Array]:
    """Frames (e, 3, 3) with rows along local x, y, z; node positions in the mean plane (e, k, 2); rises (e, k).

    The axes of a quad follow its diagonals, so that no node is preferred; the mean plane halves the warp.
    """
    if coordinates.shape[1] == 3:
        first, second = coordinates[:, 1] - coordinates[:, 0], coordinates[:, 2] - coordinates[:, 0]
        along = first
    else:
        first, second = coordinates[:, 2] - coordinates[:, 0], coordinates[:, 3] - coordinates[:, 1]
        along = _unit(first) - _unit(second)
    normal = _unit(np.cross(first, second))
    along = _unit(along)
    frames = np.stack([along, np.cross(normal, along), normal], axis=1)
    local = (coordinates - coordinates.mean(axis=1, keepdims=True)) @ frames.swapaxes(1, 2)
    return frames, local[:, :, :2], local[:, :, 2]


def plate_elasticity(properties: Properties, count: int) -> Array:
    """Membrane forces, moments and shear forces per membrane strain, curvature and shear, (e, 8, 8)."""
    modulus, ratio = properties.spread("youngs_modulus", count), properties.spread("poissons_ratio", count)
    thickness = properties.spread("thickness", count)
    plane = plane_stress(modulus, ratio)
    matrix = np.zeros((count, 8, 8))
    matrix[:, :3, :3] = thickness[:, None, None] * plane
    matrix[:, 3:6, 3:6] = (thickness**3 / 12)[:, None, None] * plane
    shear = properties.shear_factor * thickness * modulus / (2 * (1 + ratio))
    matrix[:, 6, 6] = matrix[:, 7, 7] = shear
    return matrix


def plane_stress(modulus: Array, ratio: Array) -> Array:
    """Stresses xx, yy, xy per strain, (e, 3, 3), Pa."""
    matrix = np.zeros((len(modulus), 3, 3))
    stiff = modulus / (1 - ratio**2)
    matrix[:, 0, 0] = matrix[:, 1, 1] = stiff
    matrix[:, 0, 1] = matrix[:, 1, 0] = stiff * ratio
    matrix[:, 2, 2] = modulus / (2 * (1 + ratio))
    return matrix


def _links(frames: Array, rise: Array, properties: Properties) -> Array:
    """Local freedoms on the mid-surface per freedoms of the nodes, (e, 6 k, 6 k)."""
    count, nodes = rise.shape
    reach = properties.spread("offset", count)[:, None] - rise
    links = np.zeros((count, nodes, 6, nodes, 6))
    for node in range(nodes):
        links[:, node, :3, node, :3] = frames
        links[:, node, 3:, node, 3:] = frames
        links[:, node, 0, node, 3:] = reach[:, node, None] * frames[:, 1]
        links[:, node, 1, node, 3:] = -reach[:, node, None] * frames[:, 0]
    return links.reshape(count, 6 * nodes, 6 * nodes)


def _in_six(membrane: Array, bending: Array) -> Array:
    """A matrix of six freedoms per node from those of u, v, rz and of w, beta_x, beta_y."""
    count, nodes = len(membrane), membrane.shape[1] // 3
    matrix = np.zeros((count, nodes, 6, nodes, 6))
    for part, places, signs in ((membrane, _MEMBRANE, np.ones(3)), (bending, _BENDING, _SIGNS)):
        apart = part.reshape(count, nodes, 3, nodes, 3)
        for row in range(3):
            for column in range(3):
                matrix[:, :, places[row], :, places[column]] = (
                    signs[row] * signs[column] * apart[:, :, row, :, column]
                )
    return matrix.reshape(count, 6 * nodes, 6 * nodes)


def _unit(vectors: Array) -> Array:
    found: Array = vectors / np.linalg.norm(vectors, axis=1, keepdims=True)
    return found
