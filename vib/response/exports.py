"""A state-space model for control work: poles, residues, a file, SciPy's own class, fewer states."""

from __future__ import annotations

import os
from collections.abc import Sequence
from pathlib import Path
from typing import Any

import numpy as np

from vib.errors import AccuracyError, ModelError
from vib.response.exponential import Array
from vib.response.first_order import full_model
from vib.response.groups import Complex, take_apart
from vib.response.reduced import LowestModes, corrections, reduced_model
from vib.response.zeros import transmission_zeros
from vib.statespace import Place, Quantity, StateSpace
from vib.system import System

_UNITS = "SI: kg, m, s, N, rad; outputs m, m/s or m/s^2 (rad, rad/s or rad/s^2) per N (N m)"


def poles(space: StateSpace) -> Complex:
    """The eigenvalues of A, (s,) complex, 1/s, by size; both of each conjugate pair."""
    found = []
    for part in take_apart(space.A).parts:
        found += list(part.eigenvalues)
        if part.factor == 2:
            found += list(part.eigenvalues.conj())
    values = np.array(found, np.complex128)
    return np.asarray(values[np.lexsort((values.imag, np.abs(values)))])


def zeros(space: StateSpace) -> Complex:
    """The transmission zeros, (k,) complex, 1/s, by size; see `vib.response.zeros.transmission_zeros`."""
    return transmission_zeros(space.A, space.B, space.C, space.D)


def residues(space: StateSpace) -> tuple[Complex, Complex]:
    """Poles (s,), 1/s, and residues R (s, o, i): the transfer matrix is the sum of R / (s - pole), plus D.

    Raises
    ------
    AccuracyError
        Poles that can't be told apart (critical damping, rigid-body motion) have no residues of their own.
    """
    values: list[complex] = []
    found: list[Complex] = []
    for part in take_apart(space.A).parts:
        if not part.single:
            raise AccuracyError(
                f"residues: {part.eigenvalues.size} poles near {complex(part.eigenvalues.mean()):.4g} per s "
                "can't be told apart and have no residues of their own; use the frequency response itself"
            )
        residue: Complex = ((space.C @ part.right) @ (part.left @ space.B)).astype(np.complex128)
        values.append(complex(part.eigenvalues[0]))
        found.append(residue)
        if part.factor == 2:
            values.append(complex(part.eigenvalues[0]).conjugate())
            found.append(residue.conj())
    order = np.lexsort((np.imag(values), np.abs(values)))
    return np.array(values, np.complex128)[order], np.array(found)[order]


def to_scipy(space: StateSpace) -> Any:
    """As ``scipy.signal.StateSpace`` (continuous)."""
    from scipy.signal import StateSpace as Theirs  # 0.7 s to import, and seldom needed

    return Theirs(space.A, space.B, space.C, space.D)


def save(space: StateSpace, path: str | os.PathLike[str]) -> Path:
    """A, B, C, D and the names of states, inputs and outputs as a .npz file without pickles.

    Raises
    ------
    ModelError
        The name does not end in .npz.
    """
    target = Path(path)
    if target.suffix != ".npz":
        raise ModelError(f"{target.name}: the file must end in .npz")
    np.savez(
        target,
        A=space.A,
        B=space.B,
        C=space.C,
        D=space.D,
        states=np.array(space.states, dtype=str),
        inputs=np.array(space.inputs, dtype=str),
        outputs=np.array(space.outputs, dtype=str),
        units=np.array(_UNITS),
    )
    return target


def reduced_state_space(
    system: System,
    count: int,
    inputs: Sequence[Place],
    outputs: Sequence[Place],
    quantity: Quantity = "displacement",
) -> StateSpace:
    """A first-order model of the ``count`` lowest modes and static corrections for inputs and outputs.

    What is left out: at 0 Hz nothing (the static answers are exact); how much at other frequencies is
    bounded by `vib.response.frequency.frequency_response` of the complete system.

    Parameters
    ----------
    system
        Symmetric matrices of any size.
    count
        How many undamped modes, slowest first, rigid-body modes included.
    inputs, outputs, quantity
        As in `vib.statespace.state_space`.

    Raises
    ------
    ModelError
        Unsymmetric matrices, unknown places, a count that is not positive.
    """
    if system.unsymmetric:
        raise ModelError("a reduced model needs symmetric stiffness; use the complete state space")
    if count < 1:
        raise ModelError(f"count: at least one mode is needed, got {count}")
    force, watched = (_directions(system, places) for places in (inputs, outputs))
    if count >= system.size:
        model = full_model(system)
    else:
        modes = LowestModes(system)(count)
        model = reduced_model(system, modes, corrections(system, modes, np.hstack([force, watched])))
    rows, load = watched.T @ model.shape, model.load @ force
    through = np.zeros((len(rows), load.shape[1]))
    if model.direct is not None:
        through = watched.T @ model.direct @ force
    for _ in range(("displacement", "velocity", "acceleration").index(quantity)):
        if np.abs(through).max(initial=0.0) > 0:
            raise ModelError(f"an output without mass has no {quantity} that forces alone determine")
        rows, through = rows @ model.matrix, rows @ load
    half = len(model.matrix) // 2
    return StateSpace(
        model.matrix,
        load,
        rows,
        through,
        states=tuple(
            f"coordinate {number + 1}{kind}" for kind in ("", " velocity") for number in range(half)
        ),
        inputs=_names(inputs),
        outputs=_names(outputs),
    )


def _directions(system: System, places: Sequence[Place]) -> Array:
    pairs = [(place, None) if isinstance(place, str) else place for place in places]
    return np.array([system.direction(at, along) for at, along in pairs]).reshape(-1, system.size).T


def _names(places: Sequence[Place]) -> tuple[str, ...]:
    pairs = [(place, None) if isinstance(place, str) else place for place in places]
    return tuple(
        at if along is None else f"{at} {along if isinstance(along, str) else list(along)}"
        for at, along in pairs
    )
