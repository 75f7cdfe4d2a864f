"""Modes at any speed of a shaft from a basis of modes at a few speeds; in full where that does not suffice.

Shapes change smoothly with the speed, so that those of a few speeds, real and imaginary parts apart, soon
hold those in between (a reduced basis by snapshots: A. K. Noor, J. M. Peters, AIAA J. 18 (1980) 455-462; from
memory). The small system keeps the symmetries of the large one; what a pair of it leaves in the equations of
the large one is looked at every time, and where that is too much the speed is solved in full and joins the
basis.
"""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np
import scipy.linalg

from vib.massless import dense
from vib.solve.damped import Damped
from vib.solve.search import Solution, solve_system
from vib.system import Array, System

LEAST_SIZE = 150  # freedoms up to which every speed is solved in full
SMALL = 0.6  # of the freedoms: a basis that holds more saves nothing
DEPENDENT = 1e-8
# Residual in the norm of the inverse diagonal stiffness over the size of the inertia forces. Eigenvalues are
# off by less than this part, frequencies of light damping by about its square.
LEFT = 1e-6


class SpeedBasis:
    """Solves a family of systems that share all but the terms that grow with the speed of a shaft."""

    def __init__(self, count: int) -> None:
        """``count`` modes are wanted at each speed, rigid-body modes included."""
        self._count = count
        self._basis: Array | None = None
        self._law: tuple[Array, Array] | None = None
        self.full = 0

    def solve(self, system: System) -> Damped:
        """The slowest modes of the system at one speed."""
        if self._basis is not None:
            found = self._from_basis(system)
            if found is not None:
                return found
        whole = solve_system(system, self._count, None, certify=False)
        self.full += 1
        if self._suits(system):
            self._take(system, whole)
        return whole.damped

    def _suits(self, system: System) -> bool:
        return system.size > LEAST_SIZE and not system.damping_law.material and not system.unsymmetric

    def _take(self, system: System, whole: Solution) -> None:
        """Add the shapes of a full solution to the basis, orthonormal in the mass."""
        shapes = whole.damped.shapes
        columns = [shapes.real, shapes.imag] if np.iscomplexobj(shapes) else [shapes]
        if self._basis is None:
            undamped = whole.damping.undamped
            columns.insert(0, undamped.shapes[:, : 2 * self._count])
            self._law = (system.mass @ undamped.shapes, 2 * whole.damping.law * undamped.angular)
        else:
            columns.insert(0, self._basis)
        gathered = np.hstack(columns)
        sizes = np.sqrt(np.einsum("ij,ij->j", gathered, system.mass @ gathered))
        gathered = gathered[:, sizes > 0] / sizes[sizes > 0]
        for _ in range(2):
            gram = gathered.T @ (system.mass @ gathered)
            values, vectors = scipy.linalg.eigh((gram + gram.T) / 2)
            kept = values > DEPENDENT**2 * values[-1]
            gathered = gathered @ (vectors[:, kept] / np.sqrt(values[kept]))
        self._basis = gathered

    def _from_basis(self, system: System) -> Damped | None:
        basis = self._basis
        assert basis is not None
        if basis.shape[1] > SMALL * system.size:
            return None

        def small(matrix: Any) -> Array | None:
            if matrix is None:
                return None
            return dense(basis.T @ (matrix @ basis))

        mass, stiffness = (dense(basis.T @ (part @ basis)) for part in (system.mass, system.stiffness))
        turning = small(system.gyroscopic)
        damping = small(system.damping)
        if self._law is not None and self._law[1].any():
            held, rates = basis.T @ self._law[0], self._law[1]
            stated = (held * rates) @ held.T
            damping = stated if damping is None else damping + stated
        reduced = System(
            mass=(mass + mass.T) / 2,
            stiffness=(stiffness + stiffness.T) / 2,
            damping=None if damping is None else (damping + damping.T) / 2,
            gyroscopic=None if turning is None else (turning - turning.T) / 2,
        )
        found = solve_system(reduced, self._count, None, certify=False).damped
        lifted = replace(found, shapes=np.asarray(basis @ found.shapes))
        return lifted if self._left(system, lifted) <= LEFT else None

    def _left(self, system: System, found: Damped) -> float:
        """The largest residual of the pairs that oscillate or die away, see `LEFT`."""
        elastic = slice(found.rigid, None)
        values, shapes = found.values[elastic], found.shapes[:, elastic]
        if not len(values):
            return 0.0
        heavy = system.mass @ shapes
        rest = values**2 * heavy + system.stiffness @ shapes
        for part in (system.damping, system.gyroscopic):
            if part is not None:
                rest = rest + values * (part @ shapes)
        if self._law is not None:
            held, rates = self._law
            rest = rest + values * (held @ (rates[:, None] * (held.T @ shapes)))
        diagonal = np.abs(np.asarray(system.stiffness.diagonal()))
        safe = np.where(diagonal > 0, diagonal, np.inf)
        weight = np.sum(np.abs(rest) ** 2 / safe[:, None], axis=0)
        energy = np.abs(values) ** 2 * np.abs(np.einsum("ij,ij->j", shapes.conj(), heavy))
        return float(np.sqrt((weight / np.where(energy > 0, energy, np.inf)).max()))
