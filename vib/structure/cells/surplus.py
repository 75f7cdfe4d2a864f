"""Shape functions of the next degree that a solid lacks: what a richer cell could do besides.

Each belongs to an edge or a face, is zero at all nodes of the corners and on all faces that do not hold that
edge or face, and has the same trace seen from every kind of cell, so that cells of one order join without a
gap. First-order cells lack the quadratic functions of their edges. Second-order ones lack a cubic on each
edge, a bubble on each triangle, and on each quadrangle the bubble (nodes in the middle of faces have it) and
its products with the two directions (hierarchical functions: O. C. Zienkiewicz, J. P. de S. R. Gago,
D. W. Kelly, Computers & Structures 16 (1983) 53-65).
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

import numpy as np

from vib.structure.cells.edges import EDGES, FACES
from vib.structure.cells.family import Array
from vib.structure.cells.hexahedron import Hexahedron
from vib.structure.cells.hexahedron20 import Hexahedron20
from vib.structure.cells.pyramid import Pyramid
from vib.structure.cells.pyramid13 import Pyramid13
from vib.structure.cells.quadrature import Rule, cube, pyramid, tetrahedron, wedge
from vib.structure.cells.solid import Solid
from vib.structure.cells.tetra import Tetra
from vib.structure.cells.tetra10 import Tetra10
from vib.structure.cells.wedge import Wedge
from vib.structure.cells.wedge15 import Wedge15

Kind = Literal["edge", "odd edge", "triangle", "quadrangle", "first", "second"]

_FIRST: dict[int, Solid] = {4: Tetra(), 5: Pyramid(), 6: Wedge(), 8: Hexahedron()}
_SECOND: dict[int, Solid] = {4: Tetra10(), 5: Pyramid13(), 6: Wedge15(), 8: Hexahedron20()}
# exact for the stiffness of these functions on affine cells; first-order cells, then second-order ones
_RULES: dict[int, tuple[Rule, Rule]] = {
    4: (tetrahedron(2), tetrahedron(5)),
    5: (pyramid(3, 4), pyramid(4, 5)),
    6: (wedge(4, 3), wedge(6, 4)),
    8: (cube(3), cube(4)),
}


@dataclass(frozen=True, eq=False)
class _Field:
    """A function at points, (p,), and its slope, (p, 3)."""

    value: Array
    slope: Array

    def __mul__(self, other: _Field) -> _Field:
        return _Field(
            self.value * other.value,
            self.slope * other.value[:, None] + self.value[:, None] * other.slope,
        )

    def __sub__(self, other: _Field) -> _Field:
        return _Field(self.value - other.value, self.slope - other.slope)

    def plus(self, constant: float) -> _Field:
        return _Field(self.value + constant, self.slope)

    def times(self, factor: float) -> _Field:
        return _Field(factor * self.value, factor * self.slope)


@dataclass(frozen=True, eq=False)
class Surplus:
    """The functions that a family lacks, at the points of a rule.

    ``kinds`` (s,) and ``corners`` (s,): the corners of the edge or face of each. ``values`` (p, s) and
    ``gradients`` (p, s, 3) in reference coordinates. An odd edge changes its sign with the order of its
    corners; the ``first`` function of a quadrangle is odd from corner 0 to 1, the ``second`` from 0 to 3.
    """

    rule: Rule
    kinds: tuple[Kind, ...]
    corners: tuple[tuple[int, ...], ...]
    values: Array
    gradients: Array


def surplus_of(family: Solid) -> Surplus:
    """See the module."""
    count = family.corners
    first_order = family.nodes == count
    rule = _RULES[count][0 if first_order else 1]
    cell = _Reference(count, rule.points)
    found: list[tuple[Kind, tuple[int, ...], _Field]] = []
    for k, edge in enumerate(EDGES[count]):
        bubble = cell.on_edges[k]
        if first_order:
            found.append(("edge", edge, bubble))
        else:
            found.append(("odd edge", edge, bubble * cell.along(edge)))
    if not first_order:
        for face in FACES[count]:
            if len(face) == 3:
                found.append(("triangle", face, cell.triangle(face)))
                continue
            bubble = cell.quadrangle(face)
            if count + len(EDGES[count]) == family.nodes:
                found.append(("quadrangle", face, bubble))
            found.append(("first", face, bubble * cell.along((face[0], face[1]))))
            found.append(("second", face, bubble * cell.along((face[0], face[3]))))
    return Surplus(
        rule=rule,
        kinds=tuple(kind for kind, _, _ in found),
        corners=tuple(corners for _, corners, _ in found),
        values=np.stack([field.value for _, _, field in found], axis=1),
        gradients=np.stack([field.slope for _, _, field in found], axis=1),
    )


class _Reference:
    """Functions on a reference cell that the ones above are products of."""

    def __init__(self, count: int, points: Array) -> None:
        self.count, self.points, self.places = count, points, _FIRST[count].reference
        self.at_corners = _fields(_FIRST[count], points)
        self.on_edges = _fields(_SECOND[count], points)[count:]
        if count == 6:  # the three corners of the triangle, the same all along the axis
            third = self.coordinate(0).plus(-1).times(-1) - self.coordinate(1)
            self.shares = [third, self.coordinate(0), self.coordinate(1)]

    def coordinate(self, axis: int, sign: float = 1.0) -> _Field:
        slope = np.zeros((len(self.points), 3))
        slope[:, axis] = sign
        return _Field(sign * self.points[:, axis], slope)

    def along(self, edge: tuple[int, int]) -> _Field:
        """Runs from -1 to 1 along an edge, the same from all cells that have it."""
        start, end = edge
        step = self.places[end] - self.places[start]
        axis = int(np.argmax(np.abs(step)))
        if self.count == 6 and axis != 2:
            return self.shares[end % 3] - self.shares[start % 3]
        if self.count == 4 or (self.count == 5 and end == 4):
            return self.at_corners[end] - self.at_corners[start]
        return self.coordinate(axis, float(np.sign(step[axis])))

    def triangle(self, face: tuple[int, ...]) -> _Field:
        if self.count == 6:
            a, b, c = self.shares
            return (a * b * c).times(27.0) * self._towards(face, 2)
        a, b, c = (self.at_corners[corner] for corner in face)
        return (a * b * c).times(27.0)

    def quadrangle(self, face: tuple[int, ...]) -> _Field:
        if self.count == 5:
            return (self.at_corners[0] * self.at_corners[2]).times(16.0)
        if self.count == 6:
            across = self.shares[face[0]] * self.shares[face[1]]
            return (across * self._arch(2)).times(4.0)
        axis = int(np.argmax(np.abs(self.places[list(face)].sum(axis=0))))
        first, second = (other for other in range(3) if other != axis)
        return self._arch(first) * self._arch(second) * self._towards(face, axis)

    def _arch(self, axis: int) -> _Field:
        along = self.coordinate(axis)
        return (along * along).plus(-1).times(-1)

    def _towards(self, face: tuple[int, ...], axis: int) -> _Field:
        """From 0 on the opposite face to 1 on this one."""
        return self.coordinate(axis, float(np.sign(self.places[face[0], axis]))).plus(1).times(0.5)


def _fields(family: Solid, points: Array) -> list[_Field]:
    values, slopes = family.shape(points), family.gradients(points)
    return [_Field(values[:, k], slopes[:, k]) for k in range(family.nodes)]
