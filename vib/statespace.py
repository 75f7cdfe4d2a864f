"""The first-order model x' = A x + B u, y = C x + D u of a second-order system.

Made from a `System` by `state_space`, or built directly from arrays.
"""

from __future__ import annotations

import os
from collections.abc import Sequence
from dataclasses import dataclass, field
from pathlib import Path
from typing import TYPE_CHECKING, Any, Literal

import numpy as np
from numpy.typing import ArrayLike, NDArray

from vib.errors import MatrixError, ModelError, ShapeError, in_own_words
from vib.massless import EPS, FirstOrder, Matrix, dense, first_order

if TYPE_CHECKING:
    from vib.system import System

Array = NDArray[np.float64]
Quantity = Literal["displacement", "velocity", "acceleration"]
Place = str | tuple[str, str | Sequence[float] | None]
KINDS = ("displacement", "velocity", "lag")


def _absent() -> Array:
    """Stands for an array that was left out."""
    return np.zeros((0, 0))


@dataclass(frozen=True, eq=False)
class StateSpace:
    """x' = A x + B u, y = C x + D u, with named states, inputs and outputs; SI units.

    ``A`` (s, s), ``B`` (s, i), ``C`` (o, s), ``D`` (o, i). Left out, ``B`` has no columns, ``C`` is the
    identity (the states are the outputs) and ``D`` is zero; names left out are numbered from 1. The arrays
    are copied and can't be written to.

    Raises
    ------
    ShapeError
        The arrays do not fit together.
    MatrixError
        An entry is not a finite real number.

    Examples
    --------
    >>> StateSpace(np.array([[0.0, 1.0], [-4.0, 0.0]])).states
    ('1', '2')
    """

    A: Array
    B: Array = field(default_factory=_absent)
    C: Array = field(default_factory=_absent)
    D: Array = field(default_factory=_absent)
    states: tuple[str, ...] = ()
    inputs: tuple[str, ...] = ()
    outputs: tuple[str, ...] = ()

    def __post_init__(self) -> None:
        rate = _array("A", self.A)
        size = rate.shape[0]
        if rate.shape != (size, size) or size == 0:
            raise ShapeError(
                "A", expected=(max(size, 1), max(size, 1)), got=rate.shape, hint="It must be square."
            )
        given_b, given_c, given_d = (_array(name, getattr(self, name)) for name in "BCD")
        force = given_b if given_b.size else np.zeros((size, given_b.shape[1]))
        output = given_c if given_c.size else np.eye(size)
        through = given_d if given_d.size else np.zeros((output.shape[0], force.shape[1]))
        fits = {"B": (force, (size, force.shape[1])), "C": (output, (output.shape[0], size))}
        fits["D"] = (through, (output.shape[0], force.shape[1]))
        for name, (array, expected) in fits.items():
            if array.shape != expected:
                raise ShapeError(name, expected=expected, got=array.shape, hint="It must fit the others.")
        for name, array in (("A", rate), ("B", force), ("C", output), ("D", through)):
            array.setflags(write=False)
            object.__setattr__(self, name, array)
        counts = {"states": size, "inputs": force.shape[1], "outputs": output.shape[0]}
        for name, count in counts.items():
            names = tuple(getattr(self, name)) or tuple(str(number) for number in range(1, count + 1))
            if len(names) != count:
                raise ShapeError(name, expected=(count,), got=(len(names),), hint="One name each.")
            object.__setattr__(self, name, names)

    @in_own_words
    def transition(self, time_s: float) -> Array:
        """The state transition matrix Phi(t) = exp(A t), (s, s); see `vib.response.transition`."""
        from vib.response.transition import transition

        return transition(self.A, time_s)

    @in_own_words
    def poles(self) -> NDArray[np.complex128]:
        """The eigenvalues of A, (s,), 1/s, by size."""
        from vib.response.exports import poles

        return poles(self)

    @in_own_words
    def zeros(self) -> NDArray[np.complex128]:
        """The transmission zeros, (k,), 1/s, by size; see `vib.response.exports.zeros`."""
        from vib.response.exports import zeros

        return zeros(self)

    @in_own_words
    def residues(self) -> tuple[NDArray[np.complex128], NDArray[np.complex128]]:
        """Poles (s,) and residues (s, o, i); see `vib.response.exports.residues`."""
        from vib.response.exports import residues

        return residues(self)

    def to_scipy(self) -> Any:
        """As ``scipy.signal.StateSpace``."""
        from vib.response.exports import to_scipy

        return to_scipy(self)

    def save(self, path: str | os.PathLike[str]) -> Path:
        """A, B, C, D and the names as a .npz file; see `vib.response.exports.save`."""
        from vib.response.exports import save

        return save(self, path)

    @in_own_words
    def simulate(self, inputs: Sequence[Any] = (), **arguments: Any) -> Array:
        """The outputs over time under given inputs; see `vib.response.simulate.simulate`."""
        from vib.response.simulate import simulate

        return simulate(self, inputs, **arguments)


def _array(name: str, value: ArrayLike) -> Array:
    try:
        array = np.array(value, dtype=np.float64)
    except (TypeError, ValueError) as problem:
        raise MatrixError(f"{name}: real numbers in rows of equal length are needed.") from problem
    if array.ndim != 2:
        raise ShapeError(name, expected=(1, 1), got=array.shape, hint="Two dimensions are needed.")
    bad = np.argwhere(~np.isfinite(array))
    if len(bad):
        row, column = bad[0].tolist()
        raise MatrixError(
            f"{name}: {array[row, column]} at row {row + 1}, column {column + 1}; it must be finite."
        )
    return array


@in_own_words
def state_space(
    system: System,
    inputs: Sequence[Place] | None = None,
    outputs: Sequence[Place] | None = None,
    quantity: Quantity = "displacement",
) -> StateSpace:
    """The first-order model of a system for chosen forces in and motions out.

    States are the freedoms with mass and their velocities; a freedom without mass is eliminated where it
    is undamped and is a state of its own (a first-order lag) where a dashpot holds it. Damping stated mode
    by mode enters through all undamped modes, so the eigenvalues of A are those of `System.modes`.

    Parameters
    ----------
    system
        Any system; its matrices are used densely, (n, n).
    inputs, outputs
        Where a unit force acts and a motion is watched: ``(at, along)`` as in `System.direction`, or just a
        name for a freedom without component; None for every freedom.
    quantity
        What the outputs are, in m, m/s or m/s^2 (rad for rotations). ``D`` is not zero where a force
        shows in the output at once: acceleration, and displacement of a freedom without mass or dashpot.

    Raises
    ------
    ModelError
        No such place, or an output that would depend on how fast a force changes.
    MatrixError
        See `vib.massless.first_order`.

    References
    ----------
    L. Meirovitch, Computational Methods in Structural Dynamics (1980), chapter on state equations: the
    companion form; massless freedoms as in `vib.massless`.
    """
    if quantity not in ("displacement", "velocity", "acceleration"):
        raise ModelError(f"quantity: displacement, velocity or acceleration is needed, got {quantity!r}.")
    names = tuple(str(freedom) for freedom in system.freedoms)
    form = first_order(system.mass, _velocity_terms(system), system.stiffness, names)
    force, force_names = _directions(system, inputs)
    watched, output_names = _directions(system, outputs)
    output, through = _outputs(form, quantity, watched, force, output_names)
    return StateSpace(
        form.rate,
        form.input @ force,
        output,
        through,
        states=tuple(
            _state_name(names, label, kind) for label, kind in zip(form.labels, form.order, strict=True)
        ),
        inputs=force_names,
        outputs=output_names,
    )


def _velocity_terms(system: System) -> Matrix:
    """Damping, gyroscopic terms, and the damping stated mode by mode, (n, n)."""
    terms = np.zeros((system.size, system.size))
    for matrix in (system.damping, system.gyroscopic):
        if matrix is not None:
            terms = terms + dense(matrix)
    return terms + _law_terms(system)


def _law_terms(system: System) -> Array:
    """The damping law as a matrix (n, n), M X diag(2 ratio w) X' M over all undamped modes X.

    R. W. Clough, J. Penzien, Dynamics of Structures, chapter on the damping matrix (superposition of modal
    damping matrices).
    """
    law = system.damping_law
    if not (law.ratio or law.bands or law.material):
        return np.zeros((system.size, system.size))
    stiffness = (system.stiffness + system.stiffness.T) / 2 if system.unsymmetric else system.stiffness
    undamped = type(system)(mass=system.mass, stiffness=stiffness, freedoms=system.freedoms).modes()
    frequencies = np.where(undamped.eigenvalues.imag > 0, undamped.frequencies_hz, 0.0)
    rates = 4 * np.pi * frequencies * law.ratios(system, frequencies, undamped.shapes)
    held = system.mass @ undamped.shapes
    return np.asarray((held * rates) @ held.T)


def _directions(system: System, places: Sequence[Place] | None) -> tuple[Array, tuple[str, ...]]:
    """Directions (n, k) of forces or motions, and their names."""
    if places is None:
        return np.eye(system.size), tuple(str(freedom) for freedom in system.freedoms)
    columns, names = [], []
    for place in places:
        at, along = (place, None) if isinstance(place, str) else place
        columns.append(system.direction(at, along))
        names.append(at if along is None else f"{at} {along if isinstance(along, str) else list(along)}")
    return np.array(columns).reshape(len(columns), system.size).T, tuple(names)


def _outputs(
    form: FirstOrder, quantity: Quantity, watched: Array, force: Array, names: Sequence[str]
) -> tuple[Array, Array]:
    """C (o, s) and D (o, i) of displacement, velocity or acceleration, by differentiating x' = A x + B u."""
    output, through = watched.T @ form.shape, watched.T @ form.give @ force
    for _ in range(("displacement", "velocity", "acceleration").index(quantity)):
        sudden = np.abs(through) > 64 * EPS * np.abs(form.give).max(initial=0.0)
        if sudden.any():
            name = names[int(np.argwhere(sudden)[0, 0])]
            raise ModelError(
                f"{name}: it has no mass there, so its {quantity} depends on how fast the force changes; "
                "watch its displacement, or give it mass."
            )
        output, through = output @ form.rate, output @ form.input @ force
    return output, through


def _state_name(names: Sequence[str], label: int, kind: int) -> str:
    freedom = names[label] if label >= 0 else "combined freedoms"
    return f"{freedom} {KINDS[kind]}"
