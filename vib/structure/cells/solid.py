"""Solids: displacement elements of an isotropic elastic body, three freedoms per node.

With g_a the gradient of shape function a, the stiffness between nodes a and b of an isotropic body is
lambda T + mu T' + mu tr(T) I, where T = integral of g_a g_b' (see O. C. Zienkiewicz, R. L. Taylor, The Finite
Element Method, vol. 1, on isoparametric solids). On cells that are affine images of the reference cell, T is
a fixed tensor mapped by the inverse Jacobian: one small matrix product per cell, no quadrature.
"""

from __future__ import annotations

from abc import abstractmethod
from functools import cached_property
from typing import ClassVar

import numpy as np
from numpy.typing import NDArray

from vib.structure.cells.family import Array, Family, Numbers, Properties, Stresses
from vib.structure.cells.polynomial import mirrored_order
from vib.structure.cells.quadrature import Rule

# how far, relative to the cell's size, its nodes may lie off an affine image to be treated as one
_AFFINE = 1e-10
# a cell thinner than this part of its size is flat: its Jacobian is round-off of the coordinates
_FLAT = 1e-10


class Solid(Family):
    """An isoparametric solid; its file gives nodes, shape functions and quadrature."""

    freedoms: ClassVar[int] = 3
    dimension: ClassVar[int] = 3
    scalar_mass: ClassVar[bool] = True
    mirror: ClassVar[tuple[int, int] | None] = (0, 1)

    @property
    @abstractmethod
    def reference(self) -> Array:
        """Nodes of the reference cell, (k, 3)."""

    @abstractmethod
    def shape(self, points: Array) -> Array:
        """Shape functions (p, k) at reference points (p, 3)."""

    @abstractmethod
    def gradients(self, points: Array) -> Array:
        """Derivatives of the shape functions (p, k, 3)."""

    @property
    @abstractmethod
    def stiffness_rule(self) -> Rule:
        """Quadrature of the stiffness, exact for affine cells."""

    @property
    @abstractmethod
    def mass_rule(self) -> Rule:
        """Quadrature of the mass, exact for affine cells."""

    @property
    @abstractmethod
    def stress_rule(self) -> Rule:
        """Points where stresses are most accurate."""

    def extra_gradients(self, points: Array) -> Array:
        """Derivatives of internal (incompatible) shape functions, (p, extra, 3); none by default."""
        return np.empty((len(points), 0, 3))

    @cached_property
    def mirrored(self) -> Numbers:
        """See `Family.mirrored`."""
        return mirrored_order(self.reference, self.mirror)

    # -- reference integrals, once per family ------------------------------------------------------------

    @cached_property
    def _stiffness_gradients(self) -> tuple[Array, Array]:
        points = self.stiffness_rule.points
        return self.gradients(points), self.extra_gradients(points)

    @cached_property
    def _all_pairs(self) -> tuple[Numbers, Numbers]:
        first, second = np.triu_indices(self.nodes + self._stiffness_gradients[1].shape[1])
        return first, second

    @cached_property
    def _reference_tensor(self) -> Array:
        """Integral of d_p N_a d_q N_b over the reference cell, (pairs, 9)."""
        gradients = np.concatenate(self._stiffness_gradients, axis=1)
        first, second = self._all_pairs
        tensor: Array = np.einsum(
            "g,gap,gaq->apq", self.stiffness_rule.weights, gradients[:, first], gradients[:, second]
        )
        return tensor.reshape(len(first), 9)

    @cached_property
    def _mass_products(self) -> tuple[Array, Array]:
        """Gradients (p, k, 3) at the mass points, and weighted products N_a N_b (p, pairs)."""
        rule = self.mass_rule
        shape = self.shape(rule.points)
        first, second = self.pairs
        return self.gradients(rule.points), rule.weights[:, None] * shape[:, first] * shape[:, second]

    @cached_property
    def _affine_fit(self) -> tuple[Array, Array]:
        """Jacobian of the best affine image, (3, k), and the deviation from it, (k, k)."""
        columns = np.column_stack([np.ones(self.nodes), self.reference])
        inverse = np.linalg.pinv(columns)
        return inverse[1:], np.eye(self.nodes) - columns @ inverse

    # -- many cells at once ------------------------------------------------------------------------------

    def stiffness_blocks(self, coordinates: Array, properties: Properties) -> Array:
        """See `Family.stiffness_blocks`."""
        return self._condensed(self._full_blocks(coordinates, properties))

    def _full_blocks(self, coordinates: Array, properties: Properties) -> Array:
        """Blocks of all pairs, internal shape functions included."""
        blocks = np.empty((len(coordinates), len(self._all_pairs[0]), 3, 3))
        affine = self._is_affine(coordinates)
        for chosen, compute in ((affine, self._affine_blocks), (~affine, self._quadrature_blocks)):
            if chosen.all():
                blocks = compute(coordinates, properties)
            elif chosen.any():
                cells = np.flatnonzero(chosen)
                blocks[cells] = compute(coordinates[cells], properties.of(cells))
        return blocks

    def _condensed(self, blocks: Array) -> Array:
        """The blocks with internal freedoms eliminated; most families have none."""
        return blocks

    def mass_blocks(self, coordinates: Array, properties: Properties) -> Array:
        """See `Family.mass_blocks`; (e, pairs)."""
        gradients, products = self._mass_products
        count = len(coordinates)
        density = properties.spread("density", count)
        affine = self._is_affine(coordinates)
        if affine.all():
            determinant = determinant_of(self._affine_jacobian(coordinates))
            return np.outer(density * determinant, products.sum(axis=0))
        determinant = determinant_of(jacobians(gradients, coordinates))
        found: Array = (density[:, None] * determinant) @ products
        return found

    def stresses(self, coordinates: Array, properties: Properties, displacements: Array) -> Stresses:
        """See `Family.stresses`."""
        rule, count = self.stress_rule, len(coordinates)
        lame, shear = properties.lame(count)
        nodal, extra = self.gradients(rule.points), self.extra_gradients(rule.points)
        determinant, gradients = self.mapped(nodal, extra, coordinates)
        fields = displacements.reshape(count, self.nodes, 3, -1)
        fields = np.concatenate([fields, self.internal(coordinates, properties, displacements)], axis=1)
        # slope[i, j] = d u_i / d x_j
        slope = np.einsum("epaj,eaim->epijm", gradients, fields, optimize=True)
        strain = slope + slope.swapaxes(2, 3)
        values = shear[:, None, None, None, None] * strain
        pressure = lame[:, None, None] * np.einsum("epiim->epm", slope)
        for axis in range(3):
            values[:, :, axis, axis] += pressure
        rows, columns = np.array([0, 1, 2, 1, 2, 0]), np.array([0, 1, 2, 2, 0, 1])
        return Stresses(
            points_m=np.einsum("pa,eai->epi", self.shape(rule.points), coordinates),
            weights=determinant * rule.weights,
            values=values[:, :, rows, columns],
            compliance=_compliance(properties, count),
        )

    def internal(self, coordinates: Array, properties: Properties, displacements: Array) -> Array:
        """Displacements of the internal shape functions, (e, extra, 3, m); most families have none."""
        return np.empty((len(coordinates), 0, 3, displacements.shape[-1]))

    def mapped(self, nodal: Array, extra: Array, coordinates: Array) -> tuple[Array, Array]:
        """Jacobian determinants (e, p) and gradients (e, p, k + extra, 3) in space."""
        determinant, inverse = determinant_and_inverse(jacobians(nodal, coordinates))
        gradients = nodal @ inverse
        if extra.shape[1]:
            # R. L. Taylor, P. J. Beresford, E. L. Wilson, IJNME 10 (1976) 1211-1219: internal modes mapped by
            # the Jacobian of the centre, so that a constant stress does no work on them
            middle = jacobians(self.gradients(np.zeros((1, 3))), coordinates)
            centre, inverse = determinant_and_inverse(middle)
            ratio = (centre / determinant)[:, :, None, None]
            gradients = np.concatenate([gradients, ratio * (extra @ inverse)], axis=2)
        return determinant, gradients

    def faults(self, coordinates: Array) -> tuple[NDArray[np.bool_], NDArray[np.bool_]]:
        """See `Family.faults`; judged at all quadrature points."""
        size = np.ptp(coordinates, axis=1).max(axis=1)
        least = determinant_of(self._affine_jacobian(coordinates))
        most = np.abs(least)
        curved = ~self._is_affine(coordinates)
        if curved.any():
            points = np.vstack([self.stiffness_rule.points, self.mass_rule.points])
            determinant = determinant_of(jacobians(self.gradients(points), coordinates[curved]))
            least[curved], most[curved] = determinant.min(axis=1), np.abs(determinant).max(axis=1)
        flat = most <= _FLAT * size**3
        return flat, (least <= 0) & ~flat

    def _is_affine(self, coordinates: Array) -> NDArray[np.bool_]:
        deviation = np.tensordot(coordinates, self._affine_fit[1], axes=(1, 1))
        size = np.ptp(coordinates, axis=1).max(axis=1)
        found: NDArray[np.bool_] = np.abs(deviation).max(axis=(1, 2)) <= _AFFINE * size
        return found

    def _affine_jacobian(self, coordinates: Array) -> Array:
        found: Array = np.tensordot(coordinates, self._affine_fit[0], axes=(1, 1)).swapaxes(1, 2)
        return found

    def _affine_blocks(self, coordinates: Array, properties: Properties) -> Array:
        count = len(coordinates)
        lame, shear = properties.lame(count)
        determinant, inverse = determinant_and_inverse(self._affine_jacobian(coordinates))
        lame, shear = lame * determinant, shear * determinant
        outer = np.einsum("epi,eqj->epqij", inverse, inverse)
        mapped = lame[:, None, None, None, None] * outer
        mapped += shear[:, None, None, None, None] * outer.swapaxes(3, 4)
        metric = shear[:, None, None] * (inverse @ inverse.swapaxes(1, 2))
        for axis in range(3):
            mapped[:, :, :, axis, axis] += metric
        blocks: Array = self._reference_tensor @ mapped.reshape(count, 9, 9)
        return blocks.reshape(count, -1, 3, 3)

    def _quadrature_blocks(self, coordinates: Array, properties: Properties) -> Array:
        count = len(coordinates)
        lame, shear = (value[:, None, None, None] for value in properties.lame(count))
        determinant, gradients = self.mapped(*self._stiffness_gradients, coordinates)
        gradients *= np.sqrt(determinant * self.stiffness_rule.weights)[:, :, None, None]
        flat = gradients.reshape(count, len(self.stiffness_rule.weights), -1)
        tensor = flat.swapaxes(1, 2) @ flat
        nodes = flat.shape[2] // 3
        first, second = self._all_pairs
        pairs = tensor.reshape(count, nodes, 3, nodes, 3)[:, first, :, second, :].swapaxes(0, 1)
        blocks = lame * pairs + shear * pairs.swapaxes(2, 3)
        trace = shear[..., 0, 0] * np.trace(pairs, axis1=2, axis2=3)
        for axis in range(3):
            blocks[:, :, axis, axis] += trace
        return blocks


def jacobians(gradients: Array, coordinates: Array) -> Array:
    """d x_i / d xi_p as [e, g, p, i], from reference gradients (g, k, 3) and coordinates (e, k, 3)."""
    points, nodes, _ = gradients.shape
    flat = gradients.transpose(0, 2, 1).reshape(points * 3, nodes)
    return (flat @ coordinates).reshape(len(coordinates), points, 3, 3)


def determinant_of(matrix: Array) -> Array:
    """Determinants of 3 x 3 matrices (..., 3, 3), by cofactors: far faster than LU on many small ones."""
    a, b, c = matrix[..., 0, :], matrix[..., 1, :], matrix[..., 2, :]
    found: Array = np.einsum("...i,...i->...", a, _cross(b, c))
    return found


def determinant_and_inverse(jacobian: Array) -> tuple[Array, Array]:
    """Determinants and [p, i] = d xi_p / d x_i of Jacobians [p, i] = d x_i / d xi_p."""
    a, b, c = jacobian[..., 0, :], jacobian[..., 1, :], jacobian[..., 2, :]
    inverse = np.empty_like(jacobian)
    inverse[..., 0, :] = _cross(b, c)
    inverse[..., 1, :] = _cross(c, a)
    inverse[..., 2, :] = _cross(a, b)
    determinant = np.einsum("...i,...i->...", a, inverse[..., 0, :])
    inverse /= determinant[..., None, None]
    return determinant, inverse


def _cross(a: Array, b: Array) -> Array:
    found = np.empty_like(a)
    for i, j, k in ((0, 1, 2), (1, 2, 0), (2, 0, 1)):
        found[..., i] = a[..., j] * b[..., k] - a[..., k] * b[..., j]
    return found


def _compliance(properties: Properties, count: int) -> Array:
    modulus, ratio = properties.spread("youngs_modulus", count), properties.spread("poissons_ratio", count)
    matrix = np.zeros((count, 6, 6))
    matrix[:, :3, :3] = -ratio[:, None, None]
    for axis in range(3):
        matrix[:, axis, axis] = 1.0
        matrix[:, axis + 3, axis + 3] = 2 * (1 + ratio)
    return matrix / modulus[:, None, None]
