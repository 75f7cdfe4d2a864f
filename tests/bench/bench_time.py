"""Time records and frequency response: ours, scipy.signal.lsim, and a solve per line, on the same systems.

The chain of equal masses and springs has closed forms, so instants of the free record are checked with 50
digits before its time is taken.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

import vib
from tests.bench.case import Case
from vib.response.simulate import simulate

FREEDOMS, STEP_S = 60, 1e-3
OUTPUTS = (1, 5, 20, 31, 44, 60)
STEPS = {"s": 20_001, "m": 100_001, "l": 1_000_001}
STIFFNESS, ALPHA, BETA = 1e4, 0.02, 2e-6  # N/m, 1/s, s
SIZES = {"s": 150, "m": 400, "l": 1000}
LINES = {"s": 500, "m": 2000, "l": 5000}
CHECKED = 3  # lines that both sides are compared at


@dataclass(frozen=True, eq=False)
class Record:
    """A model, its samples (steps,) or None, and its start (120,)."""

    space: vib.StateSpace
    samples: Any
    start: Any
    steps: int


def chain() -> vib.System:
    """Sixty masses of 1 kg between 61 springs, Rayleigh damping."""
    stiffness = STIFFNESS * (2 * np.eye(FREEDOMS) - np.eye(FREEDOMS, k=1) - np.eye(FREEDOMS, k=-1))
    mass = np.eye(FREEDOMS)
    return vib.System(mass=mass, stiffness=stiffness, damping=ALPHA * mass + BETA * stiffness)


def record(size: str, *, sampled: bool) -> Record:
    """The chain, pushed by a million random samples or let go from a random start."""
    random = np.random.default_rng(7)
    steps = STEPS[size]
    places = [(str(number), None) for number in OUTPUTS]
    space = chain().state_space(inputs=[("7", None)], outputs=places)
    samples = random.normal(size=steps) if sampled else None
    start = np.zeros(2 * FREEDOMS) if sampled else random.normal(size=2 * FREEDOMS)
    return Record(space, samples, start, steps)


def exact(given: Record, instants: Sequence[int]) -> Any:
    """The free motion of the outputs at some steps, to 50 digits: the modes of the chain in closed form.

    Modes sin(i j pi / 61), squares 4 k sin^2(j pi / 122) / m: any text on lattices, from memory.
    """
    import mpmath

    with mpmath.workdps(50):
        pi, n = mpmath.pi, FREEDOMS + 1
        found = []
        start = [mpmath.mpf(float(value)) for value in given.start]
        for instant in instants:
            time = mpmath.mpf(STEP_S) * instant
            moved = [mpmath.mpf(0) for _ in OUTPUTS]
            for j in range(1, FREEDOMS + 1):
                shape = [mpmath.sqrt(mpmath.mpf(2) / n) * mpmath.sin(i * j * pi / n) for i in range(1, n)]
                square = 4 * mpmath.mpf(STIFFNESS) * mpmath.sin(j * pi / (2 * n)) ** 2
                decay = (mpmath.mpf(ALPHA) + mpmath.mpf(BETA) * square) / 2
                swing = mpmath.sqrt(square - decay**2)
                q = mpmath.fdot(shape, start[:FREEDOMS])
                v = mpmath.fdot(shape, start[FREEDOMS:])
                now = mpmath.exp(-decay * time) * (
                    q * mpmath.cos(swing * time) + (v + decay * q) / swing * mpmath.sin(swing * time)
                )
                for place, output in enumerate(OUTPUTS):
                    moved[place] += shape[output - 1] * now
            found.append([float(value) for value in moved])
    return np.array(found)


def _summary(values: Any) -> list[float]:
    return [float(value) for value in values[:: max(1, len(values) // 7)].ravel()]


def ours_record(given: Record) -> list[float]:
    """Every step by the semigroup law and exact integrals within steps."""
    inputs = () if given.samples is None else [given.samples]
    return _summary(simulate(given.space, inputs, step_s=STEP_S, count=given.steps, start=given.start))


def lsim_record(given: Record) -> list[float]:
    """SciPy's, which steps."""
    from scipy.signal import lsim

    time = STEP_S * np.arange(given.steps)
    push = np.zeros(given.steps) if given.samples is None else given.samples
    model = (given.space.A, given.space.B, given.space.C, given.space.D)
    return _summary(lsim(model, push, time, X0=given.start)[1])


@dataclass(frozen=True, eq=False)
class Response:
    """A system, its lines, Hz, and its inputs and outputs as rows counted from 1."""

    system: vib.System
    lines_hz: Any
    inputs: tuple[int, ...]
    outputs: tuple[int, ...]


def response(size: str) -> Response:
    """An uneven chain with Rayleigh damping and four strong dashpots; ten inputs and ten outputs."""
    random = np.random.default_rng(3)
    n = SIZES[size]
    springs, masses = 1e6 * random.uniform(0.5, 2, n), random.uniform(0.5, 2, n)
    stiffness = np.diag(springs + np.append(springs[1:], 0))
    stiffness -= np.diag(springs[1:], 1) + np.diag(springs[1:], -1)
    damping = 0.5 * np.diag(masses) + 1e-5 * stiffness
    for place in (3, n // 10, n // 2, 4 * n // 5):
        damping[place, place] += 500.0
    system = vib.System(mass=np.diag(masses), stiffness=stiffness, damping=damping)
    places = tuple(range(1, n, n // 10))[:10]
    return Response(system, np.linspace(0.1, 60.0, LINES[size]), places, tuple(p + 1 for p in places))


def _lines(given: Response) -> Any:
    return np.linspace(0, len(given.lines_hz) - 1, CHECKED).astype(int)


def ours_response(given: Response) -> list[float]:
    """All lines by residues, the dashpots put back."""
    found = given.system.frequency_response(
        lines_hz=given.lines_hz,
        inputs=[str(place) for place in given.inputs],
        outputs=[str(place) for place in given.outputs],
    )
    return [float(value) for value in found.receptance[_lines(given)].view(float).ravel()]


def solved_response(given: Response) -> list[float]:
    """A dense solve per line."""
    system = given.system
    push = np.eye(system.size)[:, [place - 1 for place in given.inputs]]
    rows = [place - 1 for place in given.outputs]
    found = np.empty((len(given.lines_hz), len(rows), push.shape[1]), complex)
    for line, omega in enumerate(2 * np.pi * given.lines_hz):
        dynamic = system.stiffness - omega**2 * system.mass + 1j * omega * system.damping
        found[line] = np.linalg.solve(dynamic, push)[rows]
    return [float(value) for value in found[_lines(given)].view(float).ravel()]


CASES = (
    Case(
        "record-sampled",
        "60 freedoms, 6 outputs, sampled force",
        "scipy.signal.lsim",
        lambda size: record(size, sampled=True),
        ours_record,
        lsim_record,
        rtol=1e-9,
    ),
    Case(
        "record-free",
        "60 freedoms, 6 outputs, free motion",
        "scipy.signal.lsim",
        lambda size: record(size, sampled=False),
        ours_record,
        lsim_record,
        rtol=1e-9,
    ),
    Case(
        "frequency-response",
        "10 x 10 channels, dashpots",
        "numpy.linalg.solve per line",
        response,
        ours_response,
        solved_response,
        rtol=1e-6,
        theirs_sizes=("s", "m"),
    ),
)
