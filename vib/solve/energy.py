"""A block Krylov space of inv(S) M, orthonormal in the energy of S = K - shift M, from chosen directions.

In the inner product of the energy, motions without mass keep a size, so that dashpots on them do not get
lost, and S times the image of a block is M times the block: no product with K is needed to project.
Full reorthogonalisation; block sizes shrink where directions depend on each other.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import scipy.linalg

from vib.solve.backends.interface import Factor
from vib.solve.undamped import EPS, Array, Matrix

DEPENDENT = 1e-20  # of the energy of a direction; what is left below this after projection is dropped
FINE = 1e-12  # a second projection that takes less than this share off leaves S times the image as it was
APART = 1e-10  # least eigenvalue of the Gram matrix of unit directions that are turned at one go


@dataclass(frozen=True, eq=False)
class Coordinates:
    """Undamped approximations: S y = y / theta M y on the basis.

    ``theta`` (k,) descending, ``turn`` (k, k) from them to the basis, ``beyond`` (b, k): what inv(S) M makes
    of each beyond the basis, in orthonormal directions.
    """

    theta: Array
    turn: Array
    beyond: Array

    @property
    def residuals(self) -> Array:
        """Energy norm of inv(S) M y - theta y, (k,)."""
        return np.asarray(np.linalg.norm(self.beyond, axis=0))


class EnergySpace:
    """The basis V (n, k) with V' S V = 1, and V' M V."""

    def __init__(self, mass: Matrix, regular: Matrix, factor: Factor, first: Array) -> None:
        """Start from the span of ``first`` (n, b); ``regular`` is S and ``factor`` its factorisation."""
        self._mass, self._regular, self._factor = mass, regular, factor
        self._basis = np.empty((mass.shape[0], 4 * max(first.shape[1], 16)), order="F")
        self._projected = np.zeros((self._basis.shape[1],) * 2)
        self.used = self.done = 0
        self.add(first)

    @property
    def basis(self) -> Array:
        """The part (n, k) of the basis that inv(S) M was applied to; a view."""
        return self._basis[:, : self.done]

    @property
    def exhausted(self) -> bool:
        """Whether inv(S) M leads nowhere out of the basis."""
        return self.used == self.done

    def add(self, directions: Array) -> None:
        """Take more directions (n, b) into the block that waits."""
        force = self._regular @ directions
        self._append(directions, force)

    def step(self) -> None:
        """Apply inv(S) M to the block that waits; what is new waits next."""
        first, last = self.done, self.used
        force = self._mass @ self._basis[:, first:last]
        image = self._factor.solve(force)
        self.done = last
        shares, link = self._append(image, force)
        columns = slice(first, last)
        self._projected[:last, columns] = shares
        self._projected[columns, :last] = shares.T
        corner = self._projected[columns, columns]
        self._projected[columns, columns] = (corner + corner.T) / 2
        self._projected[last : self.used, columns] = link
        self._projected[columns, last : self.used] = link.T

    def coordinates(self) -> Coordinates:
        """Undamped approximations from the part of the basis that inv(S) M was applied to."""
        theta, turn = scipy.linalg.eigh(self._projected[: self.done, : self.done])
        theta, turn = theta[::-1], turn[:, ::-1]
        beyond = self._projected[self.done : self.used, : self.done] @ turn
        return Coordinates(np.maximum(theta, 0.0), turn, beyond)

    def _append(self, image: Array, force: Array) -> tuple[Array, Array]:
        """Orthonormalise ``image`` (n, b), with S image = force, and append it; its parts in old and new."""
        known = self.used
        basis = self._basis[:, :known]
        before = np.einsum("ij,ij->j", image, force)
        shares = basis.T @ force
        image = image - basis @ shares
        force = self._regular @ image
        again = basis.T @ force
        image = image - basis @ again
        left = np.sqrt(np.abs(np.einsum("ij,ij->j", image, force)))
        if again.size and (np.abs(again).max(axis=0) > FINE * left).any():
            force = self._regular @ image
        fresh, turned = _orthonormal(image, force, before)
        for _ in range(2):  # what is nearly dependent in the block itself gets digits of its own
            if fresh.shape[1] == image.shape[1]:
                break
            rest = image - fresh @ (turned.T @ image)
            rest = rest - basis @ (basis.T @ (self._regular @ rest))
            more, also = _orthonormal(rest, self._regular @ rest, before)
            if not more.shape[1]:
                break
            more = more - fresh @ (turned.T @ more)
            more, also = _orthonormal(more, self._regular @ more, np.ones(more.shape[1]))
            fresh, turned = np.hstack([fresh, more]), np.hstack([turned, also])
        last = known + fresh.shape[1]
        self._make_room(last)
        self._basis[:, known:last] = fresh
        self.used = last
        return shares + again, turned.T @ image

    def _make_room(self, columns: int) -> None:
        size, room = self._basis.shape
        if columns <= room:
            return
        wider = np.empty((size, max(columns, room + room // 2)), order="F")
        wider[:, : self.used] = self._basis[:, : self.used]
        projected = np.zeros((wider.shape[1],) * 2)
        projected[:room, :room] = self._projected
        self._basis, self._projected = wider, projected


def _orthonormal(image: Array, force: Array, before: Array) -> tuple[Array, Array]:
    """Columns orthonormal in S that span ``image`` (n, b), and S times them; force is S image."""
    for sweep in range(3):
        if not image.shape[1]:
            break
        gram = image.T @ force
        gram = (gram + gram.T) / 2
        kept = np.diag(gram) > DEPENDENT * before
        scale = 1 / np.sqrt(np.diag(gram)[kept])
        values, vectors = scipy.linalg.eigh(scale[:, None] * gram[np.ix_(kept, kept)] * scale)
        some = values > APART
        turn = scale[:, None] * vectors[:, some] / np.sqrt(values[some])
        image, force = image[:, kept] @ turn, force[:, kept] @ turn
        before = np.ones(image.shape[1])
        if sweep and (not some.any() or values[some].min() > 1 - 1e4 * EPS):
            break
    return image, force
