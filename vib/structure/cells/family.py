"""What every family of cells offers: stiffness, mass and stresses of many cells at once.

Arrays in, arrays out, SI units. Element matrices are handled as the blocks of three by three of their upper
triangle, because assembly needs no more than those; `Family.stiffness` and `Family.mass` give whole matrices.
A triple is the three translations of a node or its three rotations; solids have one per node, shells two.
"""

from __future__ import annotations

from abc import ABC, abstractmethod
from dataclasses import dataclass
from functools import cached_property
from typing import ClassVar

import numpy as np
from numpy.typing import NDArray

from vib.errors import ModelError

Array = NDArray[np.float64]
Numbers = NDArray[np.intp]


@dataclass(frozen=True, eq=False)
class Properties:
    """Isotropic material of a group of cells and, for shells, the thickness; one number or one per cell.

    ``youngs_modulus`` Pa, ``poissons_ratio``, ``density`` kg/m^3; ``thickness`` m and ``offset`` m, how far
    the mid-surface lies from the nodes along the cell's normal. ``shear_factor`` is that of plates.

    Raises
    ------
    ModelError
        A value is out of its physical range; the message names it.
    """

    youngs_modulus: float | Array
    poissons_ratio: float | Array
    density: float | Array
    thickness: float | Array | None = None
    offset: float | Array = 0.0
    shear_factor: float = 5 / 6

    def __post_init__(self) -> None:
        for name in ("youngs_modulus", "thickness"):
            value = getattr(self, name)
            if value is not None and not (np.isfinite(value) & (np.asarray(value) > 0)).all():
                raise ModelError(f"{name}: it must be a finite number above zero, got {value}.")
        density, ratio = np.asarray(self.density), np.asarray(self.poissons_ratio)
        if not (np.isfinite(density) & (density >= 0)).all():
            raise ModelError(f"density: it must be a finite number, zero or more, got {self.density}.")
        if not ((ratio > -1) & (ratio < 0.5)).all():
            raise ModelError(f"poissons_ratio: it must lie between -1 and 0.5, got {self.poissons_ratio}.")
        if not np.isfinite(self.offset).all():
            raise ModelError(f"offset: it must be a finite number, got {self.offset}.")

    def of(self, cells: slice | Numbers) -> Properties:
        """The properties of some of the cells."""
        parts = {}
        for name in ("youngs_modulus", "poissons_ratio", "density", "thickness", "offset"):
            value = getattr(self, name)
            parts[name] = value if value is None or np.ndim(value) == 0 else value[cells]
        return Properties(**parts, shear_factor=self.shear_factor)

    def lame(self, count: int) -> tuple[Array, Array]:
        """Lame's two constants (Pa) of ``count`` cells, each (count,)."""
        modulus, ratio = self.spread("youngs_modulus", count), self.spread("poissons_ratio", count)
        return modulus * ratio / ((1 + ratio) * (1 - 2 * ratio)), modulus / (2 * (1 + ratio))

    def spread(self, name: str, count: int) -> Array:
        """One property as an array with one value per cell."""
        value = getattr(self, name)
        if value is None:
            raise ModelError(f"{name}: these cells need one; give each shell region its {name}.")
        return _spread(name, value, count)


@dataclass(frozen=True, eq=False)
class Stresses:
    """Stresses at points of each cell.

    ``points_m`` (e, p, 3); ``weights`` (e, p): volume (shells: area) that each point stands for;
    ``values`` (e, p, s, m), one last index per displacement field.
    Solids: s = 6, xx, yy, zz, yz, zx, xy in Pa.
    Shells: s = 8, membrane forces xx, yy, xy (N/m), moments xx, yy, xy (N), shear forces xz, yz (N/m) in the
    axes ``frames`` (e, p, 3, 3), rows local x, y, z. ``compliance`` (e, s, s): values' compliance values is
    twice the strain energy per volume (shells: per area).
    """

    points_m: Array
    weights: Array
    values: Array
    compliance: Array
    frames: Array | None = None


class Family(ABC):
    """One kind of cell; node numbering is that of meshio (and VTK), freedoms run node by node.

    ``corners`` counts the corner nodes; ``remark`` is what a user must know about the kind.
    """

    kind: ClassVar[str]
    nodes: ClassVar[int]
    freedoms: ClassVar[int]
    corners: ClassVar[int]
    dimension: ClassVar[int]
    remark: ClassVar[str] = ""
    scalar_mass: ClassVar[bool] = False

    @cached_property
    def pairs(self) -> tuple[Numbers, Numbers]:
        """The pairs of triples a <= b whose blocks are computed, row by row."""
        first, second = np.triu_indices(self.nodes * self.freedoms // 3)
        return first, second

    @cached_property
    @abstractmethod
    def mirrored(self) -> Numbers:
        """The order of the nodes that turns a cell of the other handedness round."""

    @abstractmethod
    def stiffness_blocks(self, coordinates: Array, properties: Properties) -> Array:
        """Stiffness of each pair of triples, (e, pairs, 3, 3), from node coordinates (e, k, 3) in m."""

    @abstractmethod
    def mass_blocks(self, coordinates: Array, properties: Properties) -> Array:
        """Mass of each pair of triples, (e, pairs, 3, 3).

        Where ``scalar_mass``, (e, pairs): each stands for itself times the unit matrix.
        """

    @abstractmethod
    def stresses(self, coordinates: Array, properties: Properties, displacements: Array) -> Stresses:
        """Stresses of displacement fields (e, n, m) at the points where they are most accurate."""

    @abstractmethod
    def faults(self, coordinates: Array) -> tuple[NDArray[np.bool_], NDArray[np.bool_]]:
        """Which cells are flat, and which are turned inside out or folded; both (e,)."""

    def stiffness(self, coordinates: Array, properties: Properties) -> Array:
        """Stiffness matrices (e, n, n), N/m for translations, n = nodes x freedoms per node."""
        return whole(self.stiffness_blocks(coordinates, properties), self.pairs)

    def mass(self, coordinates: Array, properties: Properties) -> Array:
        """Consistent mass matrices (e, n, n), kg for translations."""
        blocks = self.mass_blocks(coordinates, properties)
        if self.scalar_mass:
            blocks = blocks[:, :, None, None] * np.eye(3)
        return whole(blocks, self.pairs)


def whole(blocks: Array, pairs: tuple[Numbers, Numbers]) -> Array:
    """Symmetric matrices (e, n, n) from the blocks (e, pairs, 3, 3) of their upper triangle."""
    triples = int(pairs[1][-1]) + 1
    matrix = np.empty((len(blocks), triples, 3, triples, 3))
    moved = blocks.swapaxes(0, 1)
    matrix[:, pairs[1], :, pairs[0], :] = moved.swapaxes(2, 3)
    matrix[:, pairs[0], :, pairs[1], :] = moved
    return matrix.reshape(len(blocks), 3 * triples, 3 * triples)


def upper_blocks(matrix: Array, pairs: tuple[Numbers, Numbers]) -> Array:
    """The blocks (e, pairs, 3, 3) of the upper triangle of symmetric matrices (e, n, n)."""
    triples = matrix.shape[1] // 3
    apart = matrix.reshape(len(matrix), triples, 3, triples, 3)
    return apart[:, pairs[0], :, pairs[1], :].swapaxes(0, 1)


def _spread(name: str, value: float | Array, count: int) -> Array:
    found = np.asarray(value, dtype=np.float64)
    if found.ndim and found.shape != (count,):
        raise ModelError(f"{name}: one value or one for each of {count} cells, got shape {found.shape}.")
    return np.broadcast_to(found, (count,))
