"""Natural frequencies at any speed of a shaft, from a small basis: where to look for peaks.

The basis holds the undamped modes somewhat beyond the highest frequency, and the static answers to forces
along the directions that dashpots, spinning bodies and circulatory forces act in; these stand for the modes
above, so that frequencies are off by no more than those modes' own share of the coupling.
"""

from __future__ import annotations

import numpy as np
import scipy.linalg

from vib.massless import dense
from vib.modes import find_modes
from vib.response.at_speeds import AtSpeeds, as_sparse
from vib.response.every_mode import every_mode
from vib.response.exponential import Array
from vib.response.receptance import ALL_MODES
from vib.response.reduced import solved
from vib.solve.localised import localise
from vib.solve.undamped import Undamped
from vib.system import Matrix, System

_BEYOND = 1.6
_DEPENDENT = 1e-9
_STILL = 1e-7  # of the largest eigenvalue that counts: zero but for rounding


class Tracked:
    """Modes of a family of systems up to a frequency, in the order of their frequencies."""

    def __init__(self, family: AtSpeeds, top_speed_hz: float, top_hz: float) -> None:
        system = family.system
        undamped = _lowest(family.straight, _BEYOND * top_hz)
        basis, squares = _basis(family, undamped, top_speed_hz)
        self._top = 2 * np.pi * top_hz
        self._count = basis.shape[1]

        def small(matrix: Matrix | None) -> Array:
            if matrix is None:
                return np.zeros((self._count,) * 2)
            return np.asarray(basis.T @ (matrix @ basis))

        self._stiffness = np.diag(squares) + small(_skew(family.stiffness))
        self._linear = small(system.damping) + small(family.gyroscopic)
        ratios = system.damping_law.ratios(system, np.sqrt(np.maximum(squares, 0.0)) / (2 * np.pi), basis)
        self._linear += np.diag(2 * ratios * np.sqrt(np.maximum(squares, 0.0)))
        self._turning, self._following = small(family.turning), small(family.following)

    def at(self, speed_hz: float) -> tuple[Array, Array]:
        """Frequencies, Hz, ascending, and damping ratios of the modes at a speed; pairs once."""
        r = self._count
        linear = self._linear + speed_hz * self._turning
        stiffness = self._stiffness + speed_hz * self._following
        values = scipy.linalg.eigvals(np.block([[np.zeros((r, r)), np.eye(r)], [-stiffness, -linear]]))
        size = np.abs(values)
        still = size < _STILL * self._top
        kept = ~still & (values.imag >= 0) & (size <= self._top)
        order = np.argsort(size[kept], kind="stable")
        chosen = values[kept][order]
        rigid = int(still.sum()) // 2
        frequencies = np.concatenate([np.zeros(rigid), np.abs(chosen) / (2 * np.pi)])
        return frequencies, np.concatenate([np.ones(rigid), -chosen.real / np.abs(chosen)])


def _lowest(straight: System, top_hz: float) -> Undamped:
    if straight.size <= ALL_MODES:
        whole = every_mode(straight)
        return whole.first(int((whole.angular <= 2 * np.pi * top_hz).sum()))
    modes = find_modes(System(mass=straight.mass, stiffness=straight.stiffness), up_to=top_hz)
    squares = (2 * np.pi * modes.frequencies_hz) ** 2
    return Undamped(
        values=np.where(modes.eigenvalues.real > 0, -squares, squares),
        shapes=np.asarray(modes.shapes.real),
        errors=2 * np.pi * modes.errors_hz,
        rigid=modes.rigid_body_count,
        complete=False,
    )


def _basis(family: AtSpeeds, undamped: Undamped, top_speed_hz: float) -> tuple[Array, Array]:
    """Columns (n, r) of unit mass, orthogonal in mass and stiffness, and their squared frequencies (r,)."""
    straight, size, shapes = family.straight, family.system.size, undamped.shapes
    split = localise(
        as_sparse(straight.mass, size),
        as_sparse(family.linear_at(top_speed_hz), size),
        as_sparse(family.stiffness_at(top_speed_hz), size),
    )
    if split is None or not split.rank:
        return shapes, undamped.values
    stiffness = straight.stiffness
    if undamped.rigid or (undamped.values <= 0).any():
        stiffness = stiffness + (2 * np.pi) ** 2 * straight.mass
    rest = solved(stiffness, dense(split.basis))
    sizes = np.sqrt(np.einsum("ij,ij->j", rest, straight.mass @ rest))
    rest = rest / np.where(sizes > 0, sizes, 1.0)
    for _ in range(2):  # twice is enough to make it orthogonal to rounding
        rest = rest - shapes @ (shapes.T @ (straight.mass @ rest))
    gram = rest.T @ (straight.mass @ rest)
    values, vectors = scipy.linalg.eigh((gram + gram.T) / 2)
    kept = values > _DEPENDENT
    rest = rest @ (vectors[:, kept] / np.sqrt(values[kept]))
    inner = rest.T @ (straight.stiffness @ rest)
    squares, turn = scipy.linalg.eigh((inner + inner.T) / 2)
    return np.hstack([shapes, rest @ turn]), np.concatenate([undamped.values, squares])


def _skew(matrix: Matrix) -> Matrix:
    return (matrix - matrix.T) / 2
