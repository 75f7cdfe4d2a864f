"""First-order triangle: three nodes, membrane with rotations about the normal, thin and thick plate bending.

Membrane: optimal triangle of Felippa (2003), see `membrane`. Bending: discrete Kirchhoff-Mindlin triangle of
I. Katili, IJNME 36 (1993) 1859-1883, see `bending`. A facet follows a curved surface by its nodes only: where
a thin shell is doubly curved and bends without stretching, facets are too stiff until their size squared is
about twice the radius times the thickness (deflection 7 % short there, 1 % at half that size; see the tests).
"""

from __future__ import annotations

from functools import cached_property
from typing import ClassVar

import numpy as np
from numpy.typing import NDArray

from vib.structure.cells.bending import Edges, curvatures, edges_of, rotations_and_deflection
from vib.structure.cells.facet import flattened, in_six, links, out_of_six, plate_elasticity
from vib.structure.cells.family import Array, Family, Numbers, Properties, Stresses, upper_blocks
from vib.structure.cells.membrane import edge_swell, optimal_triangle, relative_rotations, triangle_area
from vib.structure.cells.quadrature import Rule, triangle

_EDGES = np.array([[0, 1], [1, 2], [2, 0]])
_SLOPES = np.array([[-1.0, 1.0, 0.0], [-1.0, 0.0, 1.0]])
# a triangle with less than this part of its size squared in area is flat
_FLAT = 1e-10


class Triangle(Family):
    """Facet shell of three nodes."""

    kind: ClassVar[str] = "triangle"
    nodes: ClassVar[int] = 3
    corners: ClassVar[int] = 3
    freedoms: ClassVar[int] = 6
    dimension: ClassVar[int] = 2

    @cached_property
    def mirrored(self) -> Numbers:
        """See `Family.mirrored`; it turns the normal round."""
        return np.array([0, 2, 1])

    @cached_property
    def stiffness_rule(self) -> Rule:
        """Three points, exact."""
        return triangle(2)

    @cached_property
    def mass_rule(self) -> Rule:
        """Twelve points: exact for the square of the cubic deflection."""
        return triangle(6)

    def stiffness(self, coordinates: Array, properties: Properties) -> Array:
        """See `Family.stiffness`."""
        frames, flat = flattened(coordinates)
        edges = edges_of(flat, _EDGES, properties)
        strains = _strains(flat, edges, self.stiffness_rule.points)
        elastic = plate_elasticity(properties, len(flat))[:, None, 3:, 3:]
        weights = 2 * triangle_area(flat)[:, None] * self.stiffness_rule.weights
        forces = weights[:, :, None, None] * (elastic @ strains)
        bending = strains.reshape(len(flat), -1, 9).swapaxes(1, 2) @ forces.reshape(len(flat), -1, 9)
        follow = links(frames, 3, properties)
        found: Array = follow.swapaxes(1, 2) @ in_six(optimal_triangle(flat, properties), bending) @ follow
        return found

    def mass(self, coordinates: Array, properties: Properties) -> Array:
        """See `Family.mass`; the thickness's rotary inertia is in it.

        The rotation about the normal has inertia only where it differs from that of the plane: none in rigid
        motion, so that the total inertia is exact, yet no motion is without mass.
        """
        frames, flat = flattened(coordinates)
        thickness = properties.spread("thickness", len(flat))
        surface = properties.spread("density", len(flat)) * thickness
        rotary = surface * thickness**2 / 12
        along, across = self._motions(flat, properties)
        weights = 2 * triangle_area(flat)[:, None] * self.mass_rule.weights
        parts = []
        for motion, inertia in ((along, (surface, surface, rotary)), (across, (surface, rotary, rotary))):
            share = weights[:, :, None] * np.stack(inertia, axis=1)[:, None]
            rows = (np.sqrt(share)[..., None] * motion).reshape(len(flat), -1, 9)
            parts.append(rows.swapaxes(1, 2) @ rows)
        follow = links(frames, 3, properties)
        found: Array = follow.swapaxes(1, 2) @ in_six(*parts) @ follow
        return found

    def stiffness_blocks(self, coordinates: Array, properties: Properties) -> Array:
        """See `Family.stiffness_blocks`."""
        return upper_blocks(self.stiffness(coordinates, properties), self.pairs)

    def mass_blocks(self, coordinates: Array, properties: Properties) -> Array:
        """See `Family.mass_blocks`."""
        return upper_blocks(self.mass(coordinates, properties), self.pairs)

    def stresses(self, coordinates: Array, properties: Properties, displacements: Array) -> Stresses:
        """See `Family.stresses`; at the centre."""
        frames, flat = flattened(coordinates)
        membrane, bending = out_of_six(links(frames, 3, properties) @ displacements)
        strains = _strains(flat, edges_of(flat, _EDGES, properties), np.full((1, 2), 1 / 3))[:, 0]
        stretched = np.concatenate([_plane_strains(flat) @ membrane, strains @ bending], axis=1)
        elastic = plate_elasticity(properties, len(flat))
        normal = frames[:, None, 2] * np.reshape(properties.spread("offset", len(flat)), (-1, 1, 1))
        return Stresses(
            points_m=coordinates.mean(axis=1, keepdims=True) + normal,
            weights=triangle_area(flat)[:, None],
            values=(elastic @ stretched)[:, None],
            compliance=np.asarray(np.linalg.inv(elastic), dtype=np.float64),
            frames=frames[:, None],
        )

    def faults(self, coordinates: Array) -> tuple[NDArray[np.bool_], NDArray[np.bool_]]:
        """See `Family.faults`; a surface can't be inside out."""
        flat = ~(np.linalg.norm(area_vectors(coordinates), axis=1) > _FLAT * _size(coordinates) ** 2)
        return flat, np.zeros(len(flat), dtype=bool)

    def _motions(self, flat: Array, properties: Properties) -> tuple[Array, Array]:
        """What the mass follows, (e, p, 3, 9) each.

        u, v and the relative rotation per u, v, rz; w, beta_x, beta_y per the same.
        """
        shape = _shape(self.mass_rule.points)
        even, odd = _edge_functions(shape)
        apart = np.zeros((len(flat), len(shape), 3, 3, 3))
        apart[:, :, 0, :, 0] = apart[:, :, 1, :, 1] = shape
        along: Array = apart.reshape(len(flat), len(shape), 3, 9)
        along[:, :, :2] += np.einsum("ps,escx->epcx", even, edge_swell(flat, _EDGES), optimize=True)
        along[:, :, 2] = shape @ relative_rotations(flat)
        return along, rotations_and_deflection(edges_of(flat, _EDGES, properties), shape, even, odd)


def area_vectors(coordinates: Array) -> Array:
    """Normals of triangles with their areas as lengths, (e, 3)."""
    first, second = coordinates[:, 1] - coordinates[:, 0], coordinates[:, 2] - coordinates[:, 0]
    found: Array = np.cross(first, second) / 2
    return found


def _size(coordinates: Array) -> Array:
    found: Array = np.ptp(coordinates, axis=1).max(axis=1)
    return found


def _shape(points: Array) -> Array:
    return np.column_stack([1 - points.sum(axis=1), points])


def _edge_functions(shape: Array) -> tuple[Array, Array]:
    """1 - s^2 and s (1 - s^2) on each edge, continued into the triangle: (p, 3) each."""
    i, j = shape[:, _EDGES[:, 0]], shape[:, _EDGES[:, 1]]
    return 4 * i * j, 4 * i * j * (j - i)


def _gradients(flat: Array) -> Array:
    """Of the corner functions, (e, 3, 2)."""
    jacobian = np.stack([flat[:, 1] - flat[:, 0], flat[:, 2] - flat[:, 0]], axis=1)
    found: Array = np.linalg.solve(jacobian, np.broadcast_to(_SLOPES, (len(flat), 2, 3))).swapaxes(1, 2)
    return found


def _plane_strains(flat: Array) -> Array:
    """Strains xx, yy, xy of linear displacements per u, v, rz, (e, 3, 9)."""
    gradients = _gradients(flat)
    found = np.zeros((len(flat), 3, 3, 3))
    found[:, 0, :, 0] = found[:, 2, :, 1] = gradients[:, :, 0]
    found[:, 1, :, 1] = found[:, 2, :, 0] = gradients[:, :, 1]
    return found.reshape(len(flat), 3, 9)


def _strains(flat: Array, edges: Edges, points: Array) -> Array:
    """Curvatures and shears per w, beta_x, beta_y, (e, p, 5, 9)."""
    shape, gradients = _shape(points), _gradients(flat)
    i, j = _EDGES.T
    at_i, at_j = shape[None, :, i, None], shape[None, :, j, None]
    midway = 4 * (at_i * gradients[:, None, j] + at_j * gradients[:, None, i])
    nodal = np.broadcast_to(gradients[:, None], (len(flat), len(points), 3, 2))
    # the shear at a corner has the components of its two edges; linear between corners
    corners = []
    for corner in range(3):
        two = [corner, (corner + 2) % 3]
        corners.append(np.linalg.solve(edges.direction[:, two], edges.shear[:, two]))
    shears = np.einsum("pk,kecx->epcx", shape, np.stack(corners), optimize=True)
    return np.concatenate([curvatures(edges, nodal, midway), shears], axis=2)
