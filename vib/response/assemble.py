"""From a system and a start to the motion of the outputs: which model, and what its cutting short costs."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field

import numpy as np

from vib.response.every_mode import every_mode
from vib.response.first_order import RingModel, full_model
from vib.response.groups import take_apart
from vib.response.motion import HalfSine, Motion
from vib.response.outputs import Output
from vib.response.reduced import LowestModes, corrections, first_motion, reduced_model
from vib.response.starts import Start
from vib.solve.damping import modal_damping
from vib.system import System

FULL_SIZE = 100  # freedoms up to which the whole first-order model is used, whatever the damping
UNCOUPLED_SIZE = 600  # and up to which it is used where the damping leaves the modes uncoupled
COUNTS = (30, 60, 120, 240)  # modes of a reduced model; more where the truncation is still too large
MOST_CORRECTED_OUTPUTS = 40  # beyond these the outputs get no static corrections of their own
TRUNCATION = 1e-3  # of the displacement peak; where more modes are not tried any further
QUANTITIES = ("displacement", "velocity", "acceleration")
_SAMPLES = 1500


@dataclass(frozen=True, eq=False)
class Assembled:
    """The motion, and how it was got; ``truncation`` is relative to the peak, per quantity, 0 if complete.

    ``complete``: every motion of the system is in the model.
    """

    motion: Motion
    model_words: str
    remarks: tuple[str, ...]
    truncation: Mapping[str, float] = field(default_factory=lambda: dict.fromkeys(QUANTITIES, 0.0))
    complete: bool = True


def assemble(system: System, start: Start, outputs: Sequence[Output]) -> Assembled:
    """The motion of the outputs after the start.

    Raises
    ------
    VibError
        An impossible start, or matrices that don't determine the motion.
    """
    if system.unsymmetric or system.size <= FULL_SIZE or is_uncoupled(system):
        model = full_model(system)
        motion, remarks = _motion(model, start, outputs)
        return Assembled(motion, f"complete first-order model, {len(model.matrix)} states", remarks)
    return _reduced(system, start, outputs)


def is_uncoupled(system: System) -> bool:
    """Whether damping leaves the modes of a system of moderate size uncoupled."""
    if system.size > UNCOUPLED_SIZE or system.gyroscopic is not None:
        return False
    return modal_damping(system, every_mode(system)).proportional


def _motion(model: RingModel, start: Start, outputs: Sequence[Output]) -> tuple[Motion, tuple[str, ...]]:
    directions = np.stack([output.direction for output in outputs])
    state, remarks = start.state(model)
    pulse = None
    if start.kind == "pulse" and start.direction is not None:
        force = start.value * start.direction
        direct = np.zeros(len(directions)) if model.direct is None else directions @ model.direct @ force
        pulse = HalfSine(start.duration_s, model.load @ force, direct)
    return Motion(take_apart(model.matrix), directions @ model.shape, state, pulse), remarks


def _reduced(system: System, start: Start, outputs: Sequence[Output]) -> Assembled:
    few = len(outputs) <= MOST_CORRECTED_OUTPUTS
    forces = [output.direction for output in outputs] if few else []
    given = [vector for vector in (start.displacement, start.velocity) if vector is not None]
    if start.direction is not None:
        forces.append(start.direction)
        if start.kind == "velocity":
            given.append(start.direction)
    lowest = LowestModes(system)
    fixed = corrections(system, lowest(COUNTS[0]), np.array(forces).reshape(-1, system.size).T)
    if start.kind in ("impulse", "pulse") and start.direction is not None:
        fixed = np.hstack([fixed, first_motion(system, start.direction)])
    extra = np.hstack([fixed, np.array(given).reshape(-1, system.size).T])
    earlier: Motion | None = None
    for count in [count for count in COUNTS if count <= 0.6 * system.size]:
        model = reduced_model(system, lowest(count), extra)
        motion, remarks = _motion(model, start, outputs)
        if earlier is None:
            earlier = motion
            continue
        truncation = _difference(motion, earlier, model, outputs)
        earlier = motion
        if truncation["displacement"] <= TRUNCATION:
            break
    words = f"reduced first-order model, {len(model.matrix)} states: {count} modes and static corrections"
    return Assembled(motion, words, (*remarks, *_truncation_remarks(truncation)), truncation, complete=False)


def _difference(
    motion: Motion, earlier: Motion, model: RingModel, outputs: Sequence[Output]
) -> dict[str, float]:
    """Largest difference of two motions relative to the largest peak of their kind, per quantity."""
    elastic = np.sqrt(np.abs(model.squares[model.rigid :]))
    slowest = 2 * np.pi / float(elastic.min()) if elastic.size else 1.0
    times = np.linspace(0.0, motion.origin_s + 2 * slowest, _SAMPLES)
    turning = np.array([output.rotational for output in outputs])
    found = {}
    for order, quantity in enumerate(QUANTITIES):
        now, before = motion(times, order), earlier(times, order)
        worst = 0.0
        for kind in (turning, ~turning):
            peak = float(np.abs(now[:, kind]).max(initial=0.0))
            if peak > 0:
                worst = max(worst, float(np.abs(now - before)[:, kind].max()) / peak)
        found[quantity] = worst
    return found


def _truncation_remarks(truncation: Mapping[str, float]) -> tuple[str, ...]:
    large = [f"{name} {value:.2g}" for name, value in truncation.items() if value > 0.01]
    remarks = [
        "The model is cut to its lower modes; the peaks change by at most "
        + ", ".join(f"{value:.1e} ({name})" for name, value in truncation.items())
        + " of the largest when half as many modes are used."
    ]
    if large:
        remarks.append(
            f"Not settled: {', '.join(large)} of the peak still depends on the modes left out; the sharper "
            "the start, the more modes it excites."
        )
    return tuple(remarks)
