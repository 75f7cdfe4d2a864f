"""Which eigenvalue does how much: x(t) = constant + sum of Re(weight_i exp(lambda_i t)), and its envelope."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import ArrayLike, NDArray

from vib.errors import ShapeError
from vib.response.exponential import Array, Numbers
from vib.response.groups import CONDITION_LIMIT, Complex, Part, take_apart
from vib.response.motion import Motion

Flags = NDArray[np.bool_]


@dataclass(frozen=True, eq=False)
class Contributions:
    """The free motion of p outputs as a sum over g eigenvalues, from ``origin_s`` on.

        x(t) = constant + sum over i of Re(weights[:, i] exp(eigenvalues[i] (t - origin_s)))

    Attributes
    ----------
    eigenvalues
        (g,) complex, 1/s, slowest first; one of each conjugate pair (imaginary part >= 0). Eigenvalues at
        zero that stand alone are in ``constant``.
    weights
        (p, g) complex, in the unit of the output. NaN where ``clustered``.
    clustered
        (g,) True where several eigenvalues can't be told apart (critical damping, rigid-body motion), so
        that their part is no such exponential; the mean eigenvalue stands for them and `history` has
        their motion.
    decay_per_s
        (g,) how fast each part dies, -Re(lambda); exactly 0 where rounding leaves no more than that.
    constant
        (p,) what stays.
    origin_s
        When the motion became free: 0, or the end of a pulse.
    motion
        The motion that was taken apart.
    """

    eigenvalues: Complex
    weights: Complex
    clustered: Flags
    decay_per_s: Array
    constant: Array
    origin_s: float
    motion: Motion
    parts: tuple[Part, ...]

    def history(self, times: ArrayLike) -> Array:
        """Each eigenvalue's own motion (k, p, g) at times (k,) from the origin on; with the constant, x."""
        return self._moving(np.atleast_1d(np.asarray(times, dtype=np.float64))).real

    def total(self, times: ArrayLike) -> Array:
        """x(t), (k, p): the constant and the sum over all eigenvalues."""
        found: Array = self.constant + self.history(times).sum(axis=2)
        return found

    def envelope(self, times: ArrayLike) -> Array:
        """Sum of abs(weight_i) exp(Re(lambda_i) t), (k, p): abs(x - constant) never exceeds it."""
        return np.stack([self.envelope_of(output, times) for output in range(len(self.constant))], axis=1)

    def envelope_of(self, output: int, times: ArrayLike) -> Array:
        """The envelope of one output, (k,)."""
        at = np.atleast_1d(np.asarray(times, dtype=np.float64)) - self.origin_s
        plain = ~self.clustered
        with np.errstate(under="ignore", over="ignore"):
            found: Array = np.exp(-np.outer(at, self.decay_per_s[plain])) @ np.abs(
                self.weights[output, plain]
            )
            for index in np.flatnonzero(~plain):
                found = found + np.abs(self._cluster(int(index), at)[:, output])
        return found

    @cached_property
    def drifts(self) -> Flags:
        """(p,) True where a part neither decays nor stays: rigid-body drift or a growing motion."""
        grows = (self.decay_per_s < 0) | (self.clustered & (self.decay_per_s <= 0))
        late = self.origin_s + 1.0 / max(1e-300, float(np.abs(self.eigenvalues).max(initial=1.0)))
        moved = np.abs(self._moving(np.array([self.origin_s, late]))).max(axis=0)
        floor = 1e-9 * moved.max(initial=0.0)
        found: Flags = (moved[:, grows] > floor).any(axis=1)
        return found

    def _moving(self, times: Array) -> Complex:
        at = times - self.origin_s
        found = np.zeros((at.size, len(self.constant), len(self.eigenvalues)), np.complex128)
        with np.errstate(under="ignore"):
            for index, value in enumerate(self.eigenvalues):
                if self.clustered[index]:
                    found[:, :, index] = self._cluster(index, at)
                else:
                    found[:, :, index] = np.outer(np.exp(value * at), self.weights[:, index])
        return found

    def _cluster(self, index: int, at: Array) -> Numbers:
        part = self.parts[index]
        start = dict(zip(map(id, self.motion.clusters), self.motion.released[1], strict=True))[id(part)]
        found: Numbers = part.factor * (part.free(start, at) @ (self.motion.rows @ part.right).T)
        return found


def contributions_of(motion: Motion) -> Contributions:
    """The contributions to a motion after its origin."""
    values, weights, clustered, decays, kept = [], [], [], [], []
    constant = np.zeros(len(motion.rows))
    starts, cluster_index = motion.released[0], 0
    single_index = 0
    for part in motion.parts.parts:
        decay = -float(part.eigenvalues.real.max())
        if part.single:
            weight = part.factor * (motion.rows @ part.right[:, 0]) * starts[single_index]
            single_index += 1
            if part.factor == 1 and abs(part.eigenvalues[0]) <= part.rounding:
                constant = constant + weight.real
                continue
            weights.append(weight.astype(np.complex128))
        else:
            cluster_index += 1
            decay = -float(part.eigenvalues.real.mean())
            weights.append(np.full(len(motion.rows), np.nan, np.complex128))
        values.append(complex(part.eigenvalues.mean()))
        clustered.append(not part.single)
        decays.append(0.0 if abs(decay) <= part.rounding else decay)
        kept.append(part)
    return Contributions(
        eigenvalues=np.array(values, np.complex128),
        weights=np.array(weights, np.complex128).reshape(len(values), len(constant)).T,
        clustered=np.array(clustered, bool),
        decay_per_s=np.array(decays, np.float64),
        constant=constant,
        origin_s=motion.origin_s,
        motion=motion,
        parts=tuple(kept),
    )


def contributions(
    matrix: ArrayLike,
    outputs: ArrayLike,
    start: ArrayLike,
    *,
    constant_input: ArrayLike | None = None,
) -> Contributions:
    """The motion y = outputs x of x' = A x + constant_input, taken apart by the eigenvalues of A.

    Parameters
    ----------
    matrix
        A, (n, n), 1/s.
    outputs
        (p, n).
    start
        x(0), (n,).
    constant_input
        (n,), what a constant force does to x' (B u); None for no force. If A is singular it makes the
        system drift, which then is a part of its own.

    Raises
    ------
    ShapeError
        The arrays do not fit together.
    """
    a, rows = np.asarray(matrix, np.float64), np.atleast_2d(np.asarray(outputs, np.float64))
    state = np.asarray(start, np.float64)
    push = None if constant_input is None else np.asarray(constant_input, np.float64)
    n = a.shape[0]
    for name, array, expected in (
        ("A", a, (n, n)),
        ("outputs", rows, (len(rows), n)),
        ("start", state, (n,)),
        ("constant input", push, (n,)),
    ):
        if array is not None and array.shape != expected:
            raise ShapeError(name, expected=expected, got=array.shape, hint="A has one row per state.")
    if push is not None:  # the constant is one more state, which never changes
        a = np.block([[a, push[:, None]], [np.zeros((1, n + 1))]])
        rows = np.hstack([rows, np.zeros((len(rows), 1))])
        state = np.append(state, 1.0)
    return contributions_of(Motion(take_apart(a, CONDITION_LIMIT), rows, state))
