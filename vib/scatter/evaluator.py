"""Samples to frequencies, damping and errors: on the reduced basis, in full where that is not good enough."""

from __future__ import annotations

from dataclasses import dataclass, replace
from importlib.metadata import version

import numpy as np
from numpy.typing import NDArray

from vib.errors import AccuracyError
from vib.scatter.batch import Batch
from vib.scatter.family import LARGEST_DENSE, Builder
from vib.scatter.model import STEADY, Model
from vib.scatter.tracking import first_left_out, follow
from vib.solve.damped import Damped
from vib.solve.search import cut, solve_system
from vib.system import Array, Matrix, System

BLOCK = 100  # samples whose small matrices are held at once: they stay in the processor's cache
CHUNK = 200  # samples that are handed out at a time
FULL_CHUNK = 4  # of those that are all solved in full
# weight of the ratio of frequencies beside the likeness of shapes: little, but for eigenvalues that do not
# swing, of which a pair may have one shape
CLOSENESS, CLOSENESS_REAL = 0.02, 0.5


@dataclass(frozen=True, eq=False)
class Evaluator:
    """All that a worker needs to evaluate samples.

    Attributes
    ----------
    model, bounds
        The reduced family, None where every sample is solved in full, and (d, 2) where it holds.
    nominal
        (m,) complex eigenvalues whose shapes are followed, the first ``rigid`` zero in every sample.
    shapes
        (r, m) their shapes in the basis.
    mass, pushed
        (n, n) the nominal mass, in whose norm shapes are compared, and (n, m) its product with them.
    candidates, everything
        How many eigenvalues of each sample are looked at, and whether these are all there are.
    family_error, tolerance
        Relative to a frequency: error of the interpolated matrices, and what the basis may add.
    """

    builder: Builder
    model: Model | None
    bounds: Array
    nominal: NDArray[np.complex128]
    rigid: int
    shapes: NDArray[np.complex128]
    mass: Matrix
    pushed: NDArray[np.complex128]
    candidates: int
    everything: bool
    family_error: float
    tolerance: float

    @property
    def chunk(self) -> int:
        """How many samples are handed out at a time, when many are run."""
        return CHUNK if self.model is not None else FULL_CHUNK

    @property
    def fingerprint(self) -> str:
        """Equal for evaluators that give the same results."""
        # the nominal modes stand for what the study reads from other files: a mesh, matrices
        nominal = [f"{value:.6e}" for value in self.nominal.tolist()]
        study = self.builder.study.model_dump_json()
        figures = (self.builder.paths, self.candidates, self.tolerance, self.bounds.tolist(), nominal)
        return f"{version('vib')} {study} {figures}"

    def __call__(self, samples: Array) -> Batch:
        """Frequencies, damping ratios and errors of samples (N, d), SI.

        Raises
        ------
        ModelError
            A sample can't be built, where it has to be solved in full.
        AccuracyError
            A full solution can't be trusted.
        """
        blocks = [samples[first : first + BLOCK] for first in range(0, len(samples), BLOCK)]
        return Batch.joined([self._block(block) for block in blocks or [samples]])

    def _block(self, samples: Array) -> Batch:
        if self.model is None or self.model.rank < len(self.nominal):  # of overdamped motions there are two
            return self.in_full(samples)
        slack = 1e-9 * np.ptp(self.bounds, axis=1)
        inside = (samples >= self.bounds[:, 0] - slack) & (samples <= self.bounds[:, 1] + slack)
        found, sound = self.reduced(samples)
        wrong = np.flatnonzero(~(sound & inside.all(axis=1)))
        if not len(wrong):
            return found
        rows = found.arrays()
        for name, value in self.in_full(samples[wrong]).arrays().items():
            rows[name][wrong] = value
        return Batch(**rows)

    def reduced(self, samples: Array) -> tuple[Batch, NDArray[np.bool_]]:
        """What the reduced basis says about samples (N, d), and for which of them (N,) it is good enough."""
        if self.model is None:
            raise AccuracyError("There is no reduced basis for these samples.")
        found = self.model.candidates(samples, self.candidates)
        likeness = _likeness(found.shapes, np.linalg.norm(found.shapes, axis=1), self.shapes)
        size = np.abs(found.values)
        errors = found.errors + self.family_error * size
        grows = found.growth > STEADY * size.max(axis=1)
        batch = self._columns(found.values, errors, likeness, ~grows)
        accurate = batch.errors_hz <= (self.tolerance + self.family_error) * batch.frequencies_hz
        sound = found.sound & accurate.all(axis=1)
        return batch, np.asarray(sound & np.isfinite(batch.frequencies_hz).all(axis=1))

    def in_full(self, samples: Array) -> Batch:
        """Full solutions of the rebuilt samples (N, d)."""
        return Batch.joined([self._one_in_full(sample) for sample in samples])

    def _one_in_full(self, sample: Array) -> Batch:
        system = self.builder.system(sample)
        damped = solved_in_full(system, self.candidates)
        weight = np.sqrt(np.einsum("ij,ij->j", damped.shapes.conj(), self.mass @ damped.shapes).real)
        likeness = _likeness(damped.shapes[None], weight[None], self.pushed)
        stable = np.array([damped.growing is None and not (damped.values.real > damped.movement).any()])
        # an overdamped motion has two eigenvalues where one that swings has one pair: some may be lacking
        lacking = max(len(self.nominal) - len(damped.values), 0)
        values, errors = np.pad(damped.values, (0, lacking)), np.pad(damped.errors, (0, lacking))
        errors[len(damped.values) :] = np.inf
        likeness = np.pad(likeness, ((0, 0), (0, lacking), (0, 0)))
        batch = self._columns(values[None], errors[None], likeness, stable, full=True)
        if not lacking:
            return batch
        there = np.isfinite(batch.errors_hz)
        rows = {name: batch.arrays()[name] for name in ("frequencies_hz", "damping_ratios", "errors_hz")}
        return replace(batch, **{name: np.where(there, row, np.nan) for name, row in rows.items()})

    def _columns(
        self,
        values: NDArray[np.complex128],
        errors: Array,
        likeness: Array,
        stable: NDArray[np.bool_],
        *,
        full: bool = False,
    ) -> Batch:
        """Eigenvalues (N, k) put in the columns of the nominal modes, which they are like (N, k, m)."""
        rigid = self.rigid
        likeness[:, :rigid], likeness[:, :, :rigid] = 0.0, 0.0
        likeness[:, np.arange(rigid), np.arange(rigid)] = 1.0
        size = np.abs(values)
        tiny = np.finfo(float).tiny
        apart = np.abs(
            np.log(np.maximum(size, tiny))[:, :, None] - np.log(np.maximum(np.abs(self.nominal), tiny))
        )
        swinging = (values.imag > 0)[:, :, None] & (self.nominal.imag > 0)
        weight = np.where(swinging, CLOSENESS, CLOSENESS_REAL)
        chosen = follow(likeness - weight * np.minimum(apart, 1.0))
        left = first_left_out(chosen, values.shape[1])
        beyond = np.concatenate([size - errors, size[:, -1:] - errors[:, -1:]], axis=1)
        complete = np.take_along_axis(beyond, left[:, None], axis=1)[:, 0]
        if self.everything:
            complete = np.where(left == values.shape[1], np.inf, complete)
        values, errors, size = (np.take_along_axis(rows, chosen, axis=1) for rows in (values, errors, size))
        likeness = np.take_along_axis(likeness, chosen[:, None], axis=1)[:, 0]
        step = np.diff(size, axis=1) + errors[:, 1:] + errors[:, :-1]
        ratios = -values.real / np.where(size > 0, size, np.nan) + 0.0
        return Batch(
            frequencies_hz=size / (2 * np.pi),
            damping_ratios=ratios,
            errors_hz=errors / (2 * np.pi),
            likeness=likeness,
            swapped=np.asarray((step < 0).any(axis=1)),
            full=np.full(len(values), full),
            stable=stable,
            complete_hz=np.maximum(complete, 0.0) / (2 * np.pi),
        )


def solved_in_full(system: System, count: int) -> Damped:
    """The lowest modes of a system, counted.

    Raises
    ------
    AccuracyError
        A solver did not finish, and there are too many modes to compute them all.
    """
    try:
        return solve_system(system, count, None).damped
    except AccuracyError:  # as of a buckled structure
        if system.size > LARGEST_DENSE:
            raise
        return cut(solve_system(system, None, None).damped, count, None)


def _likeness(shapes: NDArray[np.complex128] | Array, size: Array, nominal: NDArray[np.complex128]) -> Array:
    """Modal assurance (N, k, m) in the norm of the nominal mass; ``size`` (N, k) the norm of each shape."""
    product = np.swapaxes(shapes, 1, 2).conj() @ nominal
    safe = np.where(size > 0, size, 1.0)
    return np.asarray(np.abs(product) ** 2 / safe[:, :, None] ** 2)
