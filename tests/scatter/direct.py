"""Brute force: every sample is rebuilt and solved by itself, modes paired with the nominal ones by shape."""

from dataclasses import replace

import numpy as np
from scipy.optimize import linear_sum_assignment

from vib.modes import assurance
from vib.scatter.batch import Batch


class Direct:
    def __init__(self, family, spare=4):
        self.family = family
        self.spare = spare

    def evaluate(self, samples):
        return Batch.joined([self._one(sample) for sample in samples])

    def _one(self, sample):
        nominal = self.family.modes
        system = self.family.builder.system(sample)
        anatomy = system.anatomy and replace(system.anatomy, division=None)
        count = min(nominal.count + self.spare, system.size)
        found = replace(system, anatomy=anatomy).modes(count=count)
        likeness = assurance(nominal.shapes, found.shapes)
        rows, columns = linear_sum_assignment(-likeness)
        return Batch(
            frequencies_hz=found.frequencies_hz[columns][None],
            damping_ratios=found.damping_ratios[columns][None],
            errors_hz=found.errors_hz[columns][None],
            likeness=likeness[rows, columns][None],
            swapped=np.array([bool((np.diff(columns) < 0).any())]),
            full=np.array([True]),
            stable=np.array([found.stable]),
            complete_hz=np.array([found.frequencies_hz[-1]]),
        )
