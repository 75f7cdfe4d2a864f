"""Modes of many samples of a study by a reduced basis, each with its error; in full where that is too large.

The basis is made from the nominal modes and the modes of some samples, and widened until samples that it was
not made from are within the tolerance by the estimate of their residuals. That estimate is then compared with
full solutions of rebuilt samples, which also show whether a mode is missing.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from scipy.stats import qmc

from vib.errors import AccuracyError, ModelError
from vib.modes import Modes
from vib.scatter.basis import RANDOM_VECTORS, Metric, principal
from vib.scatter.batch import Batch
from vib.scatter.evaluator import Evaluator, solved_in_full
from vib.scatter.family import Family, lowest_undamped
from vib.scatter.model import Law, Model
from vib.scatter.pattern import MATRICES
from vib.scatter.reduced import Projected
from vib.solve.search import solve_system
from vib.system import Array

TOLERANCE = 2e-4  # relative error of a frequency by the basis beyond which a sample is solved in full
MARGIN = (
    2.0  # by which samples that are tried are to be better, since a full solution costs a hundred times more
)
SNAPSHOTS = 32  # samples whose modes the basis is made from
TRIED = 250  # samples at which it is tried
ROUNDS, ADDED = 8, 6  # how often it is widened, every other time by the modes of how many samples
GOOD = 0.01  # part of the samples tried that may be worse
EQUAL = 1e-6  # relative difference of nominal frequencies that are the same
COUPLED = 1e-6  # damping beside the diagonal, against the diagonal, that leaves shapes as they are
CHECKS = 4  # samples that are rebuilt and solved in full to compare
SAFETY = 2.0  # times the largest ratio of true and estimated errors seen
USUAL = 1.5  # that ratio as far as is known before
MOST_WRONG = 50.0  # that ratio beyond which the estimate is not believed
ROUND_OFF = 1e-9  # of a frequency


@dataclass(frozen=True, eq=False)
class Reanalysis:
    """Modes of samples of a family.

    Attributes
    ----------
    modes
        The nominal modes; column j of a `Batch` follows mode j by its shape.
    evaluator
        Takes samples (N, d), returns a `Batch`; all that another process needs.
    basis_size
        How many vectors the basis has; 0 where every sample is solved in full.
    remarks
        What the reader should know, in words.
    """

    modes: Modes
    evaluator: Evaluator
    basis_size: int
    remarks: tuple[str, ...]

    @classmethod
    def build(
        cls, family: Family, *, training: Array | None = None, tolerance: float = TOLERANCE
    ) -> Reanalysis:
        """Make a basis for the samples of a family.

        Parameters
        ----------
        family
            Its modes are the ones that are followed.
        training
            Some of the samples (N, d) in random order, which tell where samples lie; default: evenly within
            the bounds of the family.
        tolerance
            Relative error of a frequency by the basis beyond which a sample is solved in full.

        Raises
        ------
        ModelError
            There are no modes to follow.
        """
        if not family.modes.count:
            raise ModelError("no mode is left to follow: ask for more modes, or for a higher frequency")
        return _Making(family, training, tolerance).reanalysis()

    def evaluate(self, samples: Array) -> Batch:
        """Frequencies, damping ratios and errors of samples (N, d), SI; see `Evaluator`."""
        return self.evaluator(np.asarray(samples, dtype=float))


class _Making:
    """The steps that lead to a basis."""

    def __init__(self, family: Family, training: Array | None, tolerance: float) -> None:
        self.family, self.tolerance = family, tolerance
        self.system = family.modes.system
        creeping = bool(((family.modes.eigenvalues.imag == 0) & (family.modes.frequencies_hz > 0)).any())
        self.most = (1 + creeping) * self.system.size  # an overdamped motion has two eigenvalues
        self.count = min(family.modes.count + max(3, family.modes.count // 4), self.most)
        if training is None or len(training) < SNAPSHOTS:
            drawn = qmc.Sobol(len(family.nominal), seed=7).random(512)
            training = qmc.scale(drawn, family.bounds[:, 0], family.bounds[:, 1])
        self.training = np.asarray(training, dtype=float)

    def reanalysis(self) -> Reanalysis:
        if self.family.interpolation is None or self.system.unsymmetric:
            return self._without_basis("")
        try:
            return self._with_basis()
        except AccuracyError as fault:
            return self._without_basis(f"There is no reduced basis, every sample is solved in full: {fault}")

    def _without_basis(self, remark: str) -> Reanalysis:
        modes = self.family.modes
        everything = self.count >= self.most
        evaluator = self._evaluator(None, np.zeros((self.system.size, 0)), everything)
        remarks = self.family.remarks + ((remark,) if remark else ())
        return Reanalysis(modes, evaluator, 0, remarks)

    def _evaluator(self, model: Model | None, basis: Array, everything: bool) -> Evaluator:
        modes, family = self.family.modes, self.family
        weighted = modes.shapes / np.sqrt(
            np.einsum("ij,ij->j", modes.shapes.conj(), self.system.mass @ modes.shapes).real
        )
        pushed = self.system.mass @ weighted
        return Evaluator(
            builder=family.builder,
            model=model,
            bounds=family.bounds,
            nominal=modes.eigenvalues,
            rigid=modes.rigid_body_count if self._rigid() else 0,
            shapes=(basis.T @ pushed).astype(np.complex128),
            mass=self.system.mass,
            pushed=pushed,
            candidates=self.count,
            everything=everything,
            family_error=family.error,
            tolerance=self.tolerance,
        )

    def _rigid(self) -> bool:
        """Whether every sample has as many rigid-body modes as the nominal structure."""
        return all(check.undamped.rigid == self.family.modes.rigid_body_count for check in self.family.checks)

    def _with_basis(self) -> Reanalysis:
        family, mass = self.family, self.system.mass
        nominal = lowest_undamped(self.system, self.count, certify=True)
        metric = Metric.of(self.system.stiffness, mass, nominal)
        seen = metric.random_vectors(RANDOM_VECTORS)
        spinning = any(term is not None for term in family.terms("gyroscopic"))
        shapes = [self._undamped(metric, sample) for sample in self.training[:SNAPSHOTS]]
        proportional = not spinning
        tried = self.training[SNAPSHOTS : SNAPSHOTS + TRIED]

        def reduced(energy: float) -> Evaluator:
            basis = principal(metric, mass, nominal.shapes, np.hstack(shapes), energy)
            model = self._model(basis, seen, proportional=proportional, spinning=spinning)
            everything = nominal.complete and self.count >= len(nominal.values)
            return self._evaluator(model, basis, everything)

        energy = self.tolerance / MARGIN
        evaluator = reduced(energy)
        if proportional and evaluator.model and evaluator.model.coupling(tried[:8]) > COUPLED:
            proportional = False
        if not proportional:
            shapes.append(self._complex(metric, self.family.nominal))
            shapes += [self._dragged(metric, sample) for sample in self.training[:SNAPSHOTS]]
            evaluator = reduced(energy)
        for number in range(ROUNDS):
            found, sound = replace(evaluator, tolerance=self.tolerance / MARGIN).reduced(tried)
            if sound.mean() >= 1 - GOOD:
                break
            relative = found.errors_hz / np.where(found.frequencies_hz > 0, found.frequencies_hz, np.inf)
            energy /= 3  # what is missing may be there already, less than was thought to matter
            if number % 2:
                worst = np.argsort(np.where(sound, 0.0, relative.max(axis=1)))[::-1][:ADDED]
                find = self._undamped if proportional else self._complex
                shapes += [find(metric, sample) for sample in tried[worst]]
            evaluator = reduced(energy)
        evaluator = self._calibrated(self._settled(evaluator))
        size = evaluator.model.rank if evaluator.model else 0
        return Reanalysis(family.modes, evaluator, size, family.remarks)

    def _undamped(self, metric: Metric, sample: Array) -> Array:
        """Undamped shapes (n, k) of a sample, with unit energy in the metric."""
        found = lowest_undamped(self.family.interpolated(sample), self.count)
        return metric.scaled(found.shapes)

    def _dragged(self, metric: Metric, sample: Array) -> Array:
        """Where dampers and spinning bodies push undamped shapes (n, k), to the first order."""
        system = self.family.interpolated(sample)
        found = lowest_undamped(system, self.count)
        linear = sum(term for term in (system.damping, system.gyroscopic) if term is not None)
        energy = np.einsum("ij,ij->j", found.shapes, metric.matrix @ found.shapes)
        pushed = found.angular * (linear @ found.shapes)
        return np.asarray(metric.factor.solve_once(pushed) / np.sqrt(energy))

    def _complex(self, metric: Metric, sample: Array) -> Array:
        """Real and imaginary parts (n, 2 k) of the damped shapes of a sample."""
        found = solve_system(self.family.interpolated(sample), self.count, None, certify=False).damped
        shapes = metric.scaled(found.shapes)
        return np.hstack([shapes.real, shapes.imag]) if np.iscomplexobj(shapes) else shapes

    def _model(self, basis: Array, seen: Array, *, proportional: bool, spinning: bool) -> Model:
        family = self.family
        left = np.hstack([basis, seen])
        stiffness, mass, damping, gyroscopic = (family.terms(kind) for kind in MATRICES)
        linear = tuple(
            one if other is None else other if one is None else one + other
            for one, other in zip(damping, gyroscopic, strict=True)
        )
        projected = [Projected.of(terms, basis, left) for terms in (stiffness, mass)]
        if projected[0] is None or projected[1] is None or family.interpolation is None:
            raise AccuracyError("nothing holds the structure, or nothing has a mass")
        kinds = () if family.pattern is None else family.pattern.kinds[len(MATRICES) :]
        found = (Projected.of(family.terms(kind), basis, basis) for kind in kinds)
        parts = tuple(part for part in found if part is not None)
        return Model(
            interpolation=family.interpolation,
            stiffness=projected[0],
            mass=projected[1],
            linear=Projected.of(linear, basis, left),
            law=Law(family.law_terms(), len(self.system.damping_law.bands), parts),
            rigid=self.family.modes.rigid_body_count if self._rigid() else 0,
            proportional=proportional,
            spinning=spinning,
            safety=SAFETY * USUAL,
        )

    def _settled(self, evaluator: Evaluator) -> Evaluator:
        """Shapes of equal nominal frequency, which may be mixed in any way, turned as a sample has them."""
        if evaluator.model is None:
            return evaluator
        found = evaluator.model.candidates(self.training[:1], self.count).shapes[0]
        found = found / np.linalg.norm(found, axis=0)
        shapes, pushed = evaluator.shapes.copy(), evaluator.pushed.astype(np.complex128)
        values = self.family.modes.eigenvalues
        same = np.abs(np.diff(values)) <= EQUAL * np.abs(values[1:])
        for group in np.split(np.arange(len(values)), np.flatnonzero(~same) + 1):
            if len(group) < 2 or group[0] < evaluator.rigid:
                continue
            inner = shapes[:, group].conj().T @ found
            alike = np.sort(np.argsort(np.abs(inner**2).sum(axis=0))[-len(group) :])
            left, _, right = np.linalg.svd(inner[:, alike])
            shapes[:, group] = shapes[:, group] @ (left @ right)
            pushed[:, group] = pushed[:, group] @ (left @ right)
        return replace(evaluator, shapes=shapes, pushed=pushed)

    def _calibrated(self, evaluator: Evaluator) -> Evaluator:
        """The evaluator with errors that cover those at rebuilt samples."""
        model, family = evaluator.model, self.family
        if model is None:
            return evaluator
        worst, number = 0.0, family.modes.count
        bare = replace(model, safety=1.0)
        for sample in self.training[-CHECKS:]:
            full = solved_in_full(family.builder.system(sample), self.count)
            found = bare.candidates(sample[None], self.count)
            if not found.sound[0]:
                continue
            # by number rather than by shape, so that a mode that is missing shows
            order = np.argsort(np.abs(found.values[0]), kind="stable")[:number]
            theirs = np.abs(full.values[:number])
            beyond = np.abs(np.abs(found.values[0])[order] - theirs)
            beyond -= full.errors[:number] + (family.error + ROUND_OFF) * theirs
            size = np.maximum(found.errors[0][order], np.finfo(float).tiny)
            worst = max(worst, float((beyond / size).max(initial=0.0)))
        if worst > MOST_WRONG:
            raise AccuracyError("errors of the basis are not what their residuals say; a mode may be missing")
        return replace(evaluator, model=replace(model, safety=max(SAFETY * worst, model.safety)))
