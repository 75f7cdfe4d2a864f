"""What the discrete Kirchhoff-Mindlin plates share: mid-edge rotations, and the deflection between nodes.

Source: I. Katili, A new discrete Kirchhoff-Mindlin element based on Mindlin-Reissner plate theory and
assumed shear strain fields, IJNME 36 (1993) 1859-1883 (triangle) and 1885-1908 (quadrilateral). The rotation
along each edge is quadratic; its mid-edge part follows from shear and moment balance along the edge, so that
an edge behaves as a Timoshenko beam and neither thin nor thick plates lock. The deflection that the mass
follows is the cubic of that same beam.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from vib.structure.cells.family import Array, Numbers, Properties


@dataclass(frozen=True, eq=False)
class Edges:
    """Edges of plates: ``direction`` (e, s, 2), ``length`` (e, s), ``slenderness`` (e, s), Katili's phi.

    ``swing`` (e, s, 3 k): mid-edge rotation beyond the linear one, along the edge, per w, beta_x, beta_y.
    """

    ends: Numbers
    direction: Array
    length: Array
    slenderness: Array
    swing: Array

    @property
    def shear(self) -> Array:
        """Shear strain along each edge, (e, s, 3 k)."""
        return -2 / 3 * self.slenderness[:, :, None] * self.swing

    def deflection(self) -> tuple[Array, Array]:
        """Deflection beyond the straight edge: factors of 1 - s^2 and s (1 - s^2), |s| <= 1; (e, s, 3 k)."""
        count, sides, columns = self.swing.shape
        even = np.zeros((count, sides, columns // 3, 3))
        for side, (i, j) in enumerate(self.ends):
            arm = (self.length[:, side] / 8)[:, None] * self.direction[:, side]
            even[:, side, j, 1:] += arm
            even[:, side, i, 1:] -= arm
        odd = -self.length[:, :, None] / 6 * self.swing
        return even.reshape(count, sides, columns), odd


def edges_of(flat: Array, ends: Numbers, properties: Properties) -> Edges:
    """Edges of cells with nodes in the plane (e, k, 2); ``ends`` (s, 2): node numbers within the cell."""
    count, nodes = flat.shape[:2]
    along = flat[:, ends[:, 1]] - flat[:, ends[:, 0]]
    length = np.linalg.norm(along, axis=2)
    direction = along / length[:, :, None]
    thickness, ratio = properties.spread("thickness", count), properties.spread("poissons_ratio", count)
    factor = 2 * thickness**2 / (properties.shear_factor * (1 - ratio))
    slenderness = factor[:, None] / length**2
    share = -1.5 / (length * (1 + slenderness))
    swing = np.zeros((count, len(ends), nodes, 3))
    for side, (i, j) in enumerate(ends):
        arm = (share[:, side] * length[:, side] / 2)[:, None] * direction[:, side]
        swing[:, side, j, 0] = share[:, side]
        swing[:, side, i, 0] = -share[:, side]
        swing[:, side, i, 1:] = swing[:, side, j, 1:] = arm
    return Edges(ends, direction, length, slenderness, swing.reshape(count, len(ends), 3 * nodes))


def curvatures(edges: Edges, nodal: Array, midway: Array) -> Array:
    """Curvatures xx, yy, xy, (e, p, 3, 3 k).

    From gradients of the node (e, p, k, 2) and the edge functions (e, p, s, 2).
    """
    count, points, nodes, _ = nodal.shape
    slopes = np.einsum("epsd,esc,esx->epcdx", midway, edges.direction, edges.swing, optimize=True)
    apart = slopes.reshape(count, points, 2, 2, nodes, 3)
    for component in range(2):
        apart[:, :, component, :, :, component + 1] += nodal.swapaxes(2, 3)
    return np.stack([slopes[:, :, 0, 0], slopes[:, :, 1, 1], slopes[:, :, 0, 1] + slopes[:, :, 1, 0]], axis=2)


def rotations_and_deflection(edges: Edges, nodal: Array, even: Array, odd: Array) -> Array:
    """w, beta_x, beta_y at points, (e, p, 3, 3 k), from node (p, k) and edge functions (p, s)."""
    count, (points, nodes) = len(edges.length), nodal.shape
    found = np.zeros((count, points, 3, nodes, 3))
    for component in range(3):
        found[:, :, component, :, component] = nodal
    flat = found.reshape(count, points, 3, 3 * nodes)
    first, second = edges.deflection()
    flat[:, :, 0] += even @ first + odd @ second
    flat[:, :, 1:] += np.einsum("ps,esc,esx->epcx", even, edges.direction, edges.swing, optimize=True)
    return flat
