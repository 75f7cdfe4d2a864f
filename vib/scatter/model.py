"""The family on its reduced basis: eigenvalues, shapes and errors of many samples by small matrices."""

from __future__ import annotations

from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from vib.scatter.damped import Complex, eigenpairs
from vib.scatter.interpolation import Interpolation
from vib.scatter.reduced import Projected, Solved, clustered, solve
from vib.system import Array

STEADY = 1e-9  # part of the highest magnitude below which growth is round-off


class Candidates(NamedTuple):
    """The lowest k eigenvalues of N samples, those of rigid bodies first.

    ``values`` (N, k) complex, 1/s; ``errors`` (N, k) of their magnitudes; ``shapes`` (N, r, k) in the basis;
    ``growth`` (N,) greatest real part of any; ``sound`` (N,) False where a sample has to be solved in full.
    """

    values: Complex
    errors: Array
    shapes: NDArray[np.complex128] | Array
    growth: Array
    sound: NDArray[np.bool_]


@dataclass(frozen=True, eq=False)
class Law:
    """The damping law on the basis: its figures (t, l) in each term, and the stiffness of parts it weighs.

    The figures are the ratio, three of each of ``bands`` bands, and one of each part.
    """

    terms: Array
    bands: int
    parts: tuple[Projected, ...]

    def ratios(self, coefficients: Array, solved: Solved, stiffness: Array, count: int) -> Array:
        """Ratios (N, count) of the lowest modes, 0 of rigid ones; as `vib.system.DampingLaw`."""
        figures = coefficients @ self.terms
        squares = solved.squares[:, :count]
        frequency = np.sqrt(np.maximum(squares, 0.0)) / (2 * np.pi)
        found = np.broadcast_to(figures[:, :1], frequency.shape).copy()
        for band in range(self.bands):
            low, high, ratio = (figures[:, 1 + 3 * band + k, None] for k in range(3))
            found += np.where((frequency >= low) & (frequency <= high), ratio, 0.0)
        shapes = solved.shapes[:, :, :count]
        if self.parts:
            rank = shapes.shape[1]
            whole = np.einsum("nrk,nrk->nk", shapes, stiffness[:, :rank] @ shapes)
            whole = np.where(whole > 0, whole, np.inf)
            for part, ratio in zip(self.parts, figures[:, 1 + 3 * self.bands :].T, strict=True):
                held = np.einsum("nrk,nrk->nk", shapes, part.at(coefficients) @ shapes)
                found += ratio[:, None] * held / whole
        return np.where(squares > 0, found, 0.0)


@dataclass(frozen=True, eq=False)
class Model:
    """Matrices of the family on a basis of r vectors.

    ``linear`` is the damping with the gyroscopic matrix, None where there is neither; ``proportional`` says
    whether it leaves the undamped shapes as they are, ``spinning`` whether there are gyroscopic terms,
    ``rigid`` how many rigid-body modes every sample has; ``safety`` multiplies estimated errors.
    """

    interpolation: Interpolation
    stiffness: Projected
    mass: Projected
    linear: Projected | None
    law: Law
    rigid: int
    proportional: bool
    spinning: bool
    safety: float

    @property
    def rank(self) -> int:
        """How many vectors the basis has."""
        return int(self.mass.stack.shape[2])

    def candidates(self, samples: Array, count: int) -> Candidates:
        """The lowest ``count`` eigenvalues of samples (N, d)."""
        coefficients = self.interpolation.coefficients(samples)
        stiffness, mass = self.stiffness.at(coefficients), self.mass.at(coefficients)
        solved = solve(stiffness, mass, count, self.rigid)
        linear = None if self.linear is None else self.linear.at(coefficients)
        if self.proportional:
            law = self.law.ratios(coefficients, solved, stiffness, count)
            return self._proportional(solved, linear, law, count)
        law = self.law.ratios(coefficients, solved, stiffness, self.rank)
        return self._coupled(solved, stiffness, mass, linear, law, count)

    def coupling(self, samples: Array) -> float:
        """The largest entry beside the diagonal of modal damping, against the diagonal."""
        if self.linear is None:
            return 0.0
        coefficients = self.interpolation.coefficients(samples)
        solved = solve(self.stiffness.at(coefficients), self.mass.at(coefficients), 1, self.rigid)
        modal = _modal(solved, self.linear.at(coefficients))
        diagonal = np.sqrt(np.abs(np.einsum("nii->ni", modal)))
        diagonal = np.maximum(diagonal, 1e-9 * diagonal.max(axis=1, keepdims=True))
        scale = diagonal[:, :, None] * diagonal[:, None, :]
        beside = np.abs(modal) * (1 - np.eye(modal.shape[1]))
        return float((beside / np.where(scale > 0, scale, 1.0)).max())

    def _proportional(self, solved: Solved, linear: Array | None, law: Array, count: int) -> Candidates:
        squares, shapes = solved.squares[:, :count], solved.shapes[:, :, :count]
        angular = np.sqrt(np.abs(squares))
        rates = 2 * law * angular
        if linear is not None:
            rates = rates + np.einsum("nrk,nrk->nk", shapes, linear[:, : self.rank] @ shapes)
        swing = squares - rates**2 / 4
        # an overdamped motion is two eigenvalues, as is one that a damper alone holds
        split = (swing <= 0) & (squares >= 0) & ((squares > 0) | (rates != 0))
        values = -rates / 2 + 1j * np.sqrt(np.maximum(swing, 0.0))
        values = np.where(squares < 0, np.sqrt(np.maximum(-swing, 0.0)) - rates / 2, values)
        excess = clustered(squares, self.safety * solved.excess)
        errors = excess / (2 * np.where(angular > 0, angular, np.inf))
        return Candidates(
            values, errors, shapes, values.real.max(axis=1), solved.regular & ~split.any(axis=1)
        )

    def _coupled(
        self, solved: Solved, stiffness: Array, mass: Array, linear: Array | None, law: Array, count: int
    ) -> Candidates:
        rank, held = self.rank, solved.squares[:, self.rigid :].min(axis=1, initial=np.inf) > 0
        squares = np.where(held[:, None], solved.squares, np.abs(solved.squares))
        modal = np.zeros_like(stiffness[:, :rank]) if linear is None else _modal(solved, linear)
        extra = 2 * law * np.sqrt(squares)
        modal[:, np.arange(rank), np.arange(rank)] += extra
        pairs = eigenpairs(squares, modal, self.rigid, count)
        values, shapes = pairs.values[:, None], solved.shapes @ pairs.shapes
        seen = (stiffness[:, rank:] + 0j) @ shapes + (mass[:, rank:] @ shapes) * values**2
        if linear is not None:
            seen += (linear[:, rank:] @ shapes) * values
        seen += (mass[:, rank:] @ (solved.shapes @ (extra[:, :, None] * pairs.shapes))) * values
        residual = np.einsum("nsk,nsk->nk", seen, seen.conj()).real
        other = pairs.shapes.conj() if self.spinning else pairs.shapes
        slope = np.einsum("nrk,nrk->nk", other, 2 * values * pairs.shapes + modal @ pairs.shapes)
        slope = np.abs(slope)
        moving = np.abs(pairs.values) > 0
        errors = self.safety * residual / np.where(moving & (slope > 0), slope, np.inf)
        errors = clustered(np.abs(pairs.values), errors)
        # where fewer than count are there, partners of pairs stand in their places
        whole = ~(pairs.values.imag < 0).any(axis=1)
        # growth of the reduced system is no proof of that of the whole, as a negative square is
        steady = pairs.growth <= STEADY * np.abs(pairs.values).max(axis=1)
        sound = np.asarray(solved.regular & held & steady & whole)
        return Candidates(pairs.values, errors, shapes, pairs.growth, sound)


def _modal(solved: Solved, linear: Array) -> Array:
    rank = solved.shapes.shape[1]
    return np.asarray(np.swapaxes(solved.shapes, 1, 2) @ linear[:, :rank] @ solved.shapes)
