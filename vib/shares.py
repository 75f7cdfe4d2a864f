"""Participation in rigid motions of the ground, effective modal mass, and energy shares of the parts."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np
from numpy.typing import NDArray

from vib.system import Part, System

Array = NDArray[np.float64]


def participation(shapes: NDArray[Any], carried: Array) -> Array:
    """Participation factors (m, k), |x* (T' M R)| for shapes of unit modal mass, signed for real shapes.

    ``carried`` (n, k) is the inertia force per unit rigid acceleration of the ground. The squares are the
    effective modal masses, which over all undamped modes add up to ``carried' inv(M) carried``
    (R. W. Clough, J. Penzien, Dynamics of Structures, chapter on earthquake response: modal mass).
    """
    factors = shapes.conj().T @ carried
    return np.asarray(np.abs(factors) if np.iscomplexobj(factors) else factors)


def strain_shares(system: System, shapes: NDArray[Any]) -> Mapping[str, Array] | None:
    """Part of the elastic energy of each mode (m,) that each part holds; 0 where a mode holds none."""
    if system.anatomy is None:
        return None
    return _shares(system.anatomy.parts, "stiffness", system.stiffness, shapes)


def kinetic_shares(system: System, shapes: NDArray[Any]) -> Mapping[str, Array] | None:
    """Part of the kinetic energy of each mode (m,) that each part holds."""
    if system.anatomy is None:
        return None
    return _shares(system.anatomy.parts, "mass", system.mass, shapes)


def _shares(parts: tuple[Part, ...], kind: str, whole: Any, shapes: NDArray[Any]) -> Mapping[str, Array]:
    total = _energy(whole, shapes)
    terms = np.einsum("ij,ij->j", np.abs(shapes), abs(whole) @ np.abs(shapes))
    held = np.abs(total) > 256 * np.finfo(float).eps * terms  # else the mode has no such energy
    shares = {}
    for part in parts:
        matrix = getattr(part, kind)
        energy = np.zeros(shapes.shape[1]) if matrix is None else _energy(matrix, shapes)
        shares[part.name] = np.where(held, energy / np.where(held, total, 1.0), 0.0)
    return shares


def _energy(matrix: Any, shapes: NDArray[Any]) -> Array:
    return np.asarray(np.einsum("ij,ij->j", shapes.conj(), matrix @ shapes).real)
