"""Modes of many samples of a frame whose mounts, masses, materials and sections scatter.

Ours starts from the study: it finds out how the matrices depend on the quantities, makes the reduced basis
and evaluates every sample with its error. The alternatives are given the matrices and only solve, sample by
sample; so that these fit into memory, they go through the same few pairs again and again. The floor is the
small eigenproblems alone. All of them use one core.
"""

from __future__ import annotations

import tempfile
from dataclasses import dataclass
from pathlib import Path

import numpy as np
import scipy.linalg
from threadpoolctl import threadpool_limits

import vib
from tests.bench.case import Case
from vib.scatter.family import Family
from vib.scatter.reanalysis import Reanalysis
from vib.scatter.running import run
from vib.scatter.sampling import Factors, unit_points
from vib.study import Study

MODES = 12
PAIRS = 50  # matrices that the alternative goes through
FLOOR = 40  # vectors of the basis, about
SAMPLES = {"s": 1_000, "m": 10_000}
DAMPED = {"s": 40}


def frame_text(mounts: str = "", levels: int = 3) -> str:
    """A frame of two by two posts on mounts, with two machines; ten quantities scatter."""
    corners = [(i, j) for i in range(2) for j in range(2)]
    names = {(i, j, k): f"P{i}{j}{k}" for i, j in corners for k in range(levels)}
    points = "\n".join(f"{name} = [{1.2 * i}, {1.2 * j}, {1.1 * k}]" for (i, j, k), name in names.items())
    posts = [[names[i, j, k] for k in range(levels)] for i, j in corners]
    beams = [[names[0, j, k], names[1, j, k]] for j in range(2) for k in range(1, levels)]
    beams += [[names[i, 0, k], names[i, 1, k]] for i in range(2) for k in range(1, levels)]
    feet = [[names[i, j, 0], "ground"] for i, j in corners]
    text = f"""
        [units]
        length = "m"
        [materials.steel]
        youngs_modulus = "210 GPa +- 5 %"
        poissons_ratio = 0.3
        density = "7850 kg/m^3 +- 2 %"
        [sections.post]
        shape = "square hollow"
        width = "100 mm"
        thickness = "6 mm +- 10 %"
        [sections.beam]
        shape = "rectangular hollow"
        width = "80 mm"
        height = "140 mm"
        thickness = "6 mm +- 10 %"
        [points]
        {points}
        [[members]]
        name = "posts"
        section = "post"
        material = "steel"
        runs = {posts}
        [[members]]
        name = "beams"
        section = "beam"
        material = "steel"
        runs = {beams}
        [[bodies]]
        name = "motor"
        mass = "250 kg +- 5 %"
        centre = [0.1, 0.6, 1.4]
        inertia = ["6 kg m^2", "9 kg m^2", "8 kg m^2"]
        carried_by = ["P001", "P011"]
        [[bodies]]
        name = "fan"
        mass = "320 kg +- 5 %"
        centre = [1.1, 0.6, 2.5]
        inertia = ["12 kg m^2", "15 kg m^2", "11 kg m^2"]
        carried_by = ["P102", "P112"]
        [damping]
        ratio = "0.01 +- 0.005"
        [[springs]]
        name = "mounts"
        between = {feet}
        stiffness = {{ x = "2 kN/mm +- 20 %", y = "2 kN/mm +- 20 %", z = "5 kN/mm +- 20 %" }}
        {mounts}
        """
    return text.replace("'", '"')


@dataclass(frozen=True, eq=False)
class Given:
    """A study, samples of its quantities, and the first few pairs of matrices for the alternative."""

    study: Study
    paths: tuple[str, ...]
    values: np.ndarray
    matrices: list[tuple[np.ndarray, ...]]


def _given(text: str, count: int, pairs: int) -> Given:
    with tempfile.TemporaryDirectory() as folder:
        file = Path(folder) / "frame.toml"
        file.write_text(text, encoding="utf-8")
        study = vib.read(file)
    factors = Factors.of(tuple(study.tolerances.values()))
    values = factors.values(unit_points(count, len(factors.names), seed=1, method="latin hypercube"))
    matrices = []
    for row in values[:pairs]:
        system = study.varied(dict(zip(factors.paths, row.tolist(), strict=True))).system()
        parts = (system.stiffness, system.mass, system.damping)
        matrices.append(tuple(part.toarray() for part in parts if part is not None))
    return Given(study, factors.paths, values, matrices)


def prepare(size: str) -> Given:
    """348 freedoms; matrices of the first samples."""
    return _given(frame_text(), SAMPLES[size], PAIRS)


def ours(given: Given) -> list[float]:
    """All from the study; the mean of each frequency over samples that the alternative has matrices of."""
    limits = zip(given.values.min(axis=0).tolist(), given.values.max(axis=0).tolist(), strict=True)
    with threadpool_limits(1):
        family = Family.from_study(given.study, dict(zip(given.paths, limits, strict=True)), count=MODES)
        reanalysis = Reanalysis.build(family, training=given.values)
        batch = run(reanalysis.evaluator, given.values, workers=1)
    return [float(row) for row in np.sort(batch.frequencies_hz[: len(given.matrices)], axis=1).mean(axis=0)]


def theirs(given: Given) -> list[float]:
    """An eigenproblem of full size for each sample."""
    found = []
    threadpool_limits(1)
    for number in range(len(given.values)):
        stiffness, mass = given.matrices[number % len(given.matrices)]
        squares, _ = scipy.linalg.eigh(stiffness, mass)
        found.append(np.sqrt(squares[:MODES]) / (2 * np.pi))
    return [float(row) for row in np.mean(found[: len(given.matrices)], axis=0)]


def floor(given: Given) -> list[float]:
    """Eigenproblems of the size of the basis, one for each sample."""
    start = np.random.default_rng(0).standard_normal((100, FLOOR, FLOOR))
    symmetric = start + np.swapaxes(start, 1, 2)
    with threadpool_limits(1):
        return [float(np.linalg.eigh(symmetric)[0][0, 0]) for _ in range(0, len(given.values), 100)]


def prepare_damped(size: str) -> Given:
    """The same frame on mounts with strong dashpots."""
    dashpots = 'dashpot = { x = "5 kN s/m", y = "5 kN s/m", z = "12 kN s/m" }'
    text = frame_text(dashpots).replace('ratio = "0.01 +- 0.005"', "")
    return _given(text, DAMPED[size], DAMPED[size])


def theirs_damped(given: Given) -> list[float]:
    """All eigenvalues of the first-order form of each sample."""
    found = []
    threadpool_limits(1)
    for stiffness, mass, damping in given.matrices:
        none, one = np.zeros_like(mass), np.eye(len(mass))
        left = np.block([[none, one], [-stiffness, -damping]])
        right = np.block([[one, none], [none, mass]])
        values = scipy.linalg.eigvals(left, right)
        size = np.sort(np.abs(values[values.imag >= 0]))
        found.append(size[:MODES] / (2 * np.pi))
    return [float(row) for row in np.mean(found, axis=0)]


CASES = (
    Case(
        name="scatter",
        work="samples of a frame of 348, 10 quantities",
        alternative="SciPy eigh for each sample",
        prepare=prepare,
        ours=ours,
        theirs=theirs,
        floor=floor,
        rtol=2e-4,
        sizes=("s", "m"),
        theirs_sizes=("s", "m"),
    ),
    Case(
        name="scatter damped",
        work="samples of a frame on strong dashpots",
        alternative="SciPy eigvals of the first-order form",
        prepare=prepare_damped,
        ours=ours,
        theirs=theirs_damped,
        rtol=2e-4,
        sizes=("s",),
        theirs_sizes=("s",),
    ),
)
