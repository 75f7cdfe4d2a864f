"""The free response after an impact, a pulse, a release or from an initial state: the noun `Ring`.

All of it comes from the eigenvalues of the first-order model; nothing is stepped through time.
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import ArrayLike

from vib.errors import AccuracyError, ModelError, in_own_words
from vib.response.assemble import QUANTITIES, assemble
from vib.response.contributions import Contributions, Flags, contributions_of
from vib.response.decay import FALLS, Fall, Peak, envelope_fall, peak_of, record_fall
from vib.response.exponential import EPS, Array
from vib.response.motion import Motion
from vib.response.outputs import choose_outputs
from vib.response.sampling import Sampling, sample, significant
from vib.response.shares import RingMode, ring_modes
from vib.response.stability import judged
from vib.response.starts import Along, Quantity, Request, quantity, read_start
from vib.system import System

if TYPE_CHECKING:
    from vib.modes import Modes

_WORTH_SAYING = 1e-8
_NOTHING_LEFT = 1e-3


@dataclass(frozen=True, kw_only=True, eq=False)
class Ring:
    """A free response of p outputs at k times; SI units, rotations in rad.

    Attributes
    ----------
    system
        The system that rang (for a structure perhaps a finer division than the one given).
    start
        What set it ringing, in words.
    time_s
        (k,) times from the start, s, as asked for or chosen.
    displacement_m, velocity_m_s, acceleration_m_s2
        (k, p), one column per output; rad, rad/s, rad/s^2 where ``rotational``.
    freedoms
        (p,) names of the outputs, such as ``"motor x"``.
    rotational
        (p,) True where the output is an angle.
    contributions
        The motion as a sum over eigenvalues, see `Contributions`.
    motion
        The outputs at any other time: ``motion(times, order)``.
    method, condition
        ``"eigenvalues"``, or where the matrix exponential had to help; condition number of the bases used.
    model
        The first-order model used, in words.
    truncation
        Relative error of the displacements by modes left out; 0.0 for a complete model.
    truncations
        The same for displacement, velocity and acceleration.
    stable
        False if any part grows.
    duration_note
        How the length of the record was chosen.
    remarks
        What the reader should know, in words.
    """

    system: System
    start: str
    time_s: Array
    displacement_m: Array
    velocity_m_s: Array
    acceleration_m_s2: Array
    freedoms: tuple[str, ...]
    rotational: tuple[bool, ...]
    contributions: Contributions
    motion: Motion
    method: str
    condition: float
    model: str
    truncation: float
    truncations: Mapping[str, float]
    stable: bool
    duration_note: str
    remarks: tuple[str, ...]
    sampling: Sampling

    @cached_property
    def envelope_m(self) -> Array:
        """(k, p) sum of abs(weight) exp(Re(lambda) t): abs(displacement - what stays) never exceeds it.

        NaN before the motion is free (during a pulse).
        """
        found = self.contributions.envelope(np.maximum(self.time_s, self.contributions.origin_s))
        found[self.time_s < self.contributions.origin_s] = np.nan
        return found

    @cached_property
    def peaks(self) -> tuple[Peak, ...]:
        """Peak displacement, velocity and acceleration of each output, also between the samples."""
        times = self.sampling.times
        found = []
        for order, name in enumerate(QUANTITIES):
            records = self.motion(times, order)
            for output, label in enumerate(self.freedoms):
                value, when = peak_of(self.motion.select(output), times, records[:, output], order)
                found.append(Peak(label, name, value, when))
        return tuple(found)

    @cached_property
    def falls(self) -> tuple[Fall, ...]:
        """When each output has fallen to 10 % and 1 % of its displacement peak; see `Fall`."""
        times, constants = self.sampling.times, self.contributions.constant
        records = self.motion(times)
        sizes = np.abs(records - constants).max(axis=0)
        moves = significant(sizes, np.array(self.rotational))
        found = []
        for output, label in enumerate(self.freedoms):
            one, constant = self.motion.select(output), float(constants[output])
            peak, _ = peak_of(one, times, records[:, output], 0)
            size = max(abs(peak - constant), float(sizes[output]))
            values: list[float | None] = [None] * (2 * len(FALLS))
            if moves[output]:
                values = [envelope_fall(self.contributions, output, share * size) for share in FALLS]
                # the record tells only if it lasts until the motion surely stays below
                values += [
                    record_fall(one, constant, times, records[:, output], share * size)
                    if safe is not None and safe <= times[-1]
                    else None
                    for share, safe in zip(FALLS, tuple(values), strict=True)
                ]
            found.append(Fall(label, *values))
        return tuple(found)

    @cached_property
    def modes(self) -> tuple[RingMode, ...]:
        """What each eigenvalue that matters adds to each output's displacement peak, slowest first."""
        times = [peak.time_s for peak in self.peaks if peak.quantity == "displacement"]
        return ring_modes(self.contributions, np.array(times), np.array(self.rotational))

    def to_dict(self) -> dict[str, Any]:
        """Numbers, texts and lists only (None for what does not exist), names carrying their units."""
        from vib.response.as_dict import ring_as_dict

        return ring_as_dict(self)


@in_own_words
def ring(
    system: System,
    *,
    impulse: Quantity | None = None,
    pulse: tuple[Quantity, Quantity] | None = None,
    pull: Quantity | None = None,
    displacement: Quantity | ArrayLike | None = None,
    velocity: Quantity | ArrayLike | None = None,
    at: str | None = None,
    along: Along = None,
    duration: Quantity | None = None,
    times: ArrayLike | None = None,
    watch: Sequence[tuple[str, Along]] | None = None,
    modes: Modes | None = None,
) -> Ring:
    """The free response of a system.

    Texts carry a unit; bare numbers are SI. Exactly one start is given, with its place ``at`` and component
    ``along`` (see `System.direction`):

    Parameters
    ----------
    impulse
        N s (about an axis N m s): a blow so short that only the velocities change.
    pulse
        (peak, duration): a half-sine force, N (or N m) and s.
    pull
        N (or N m): pulled statically, let go at time 0.
    displacement
        m (or rad): pulled statically until the place has this displacement, let go at time 0; or an array
        (n,): the displacement of every freedom at time 0, without ``at``.
    velocity
        m/s (or rad/s): this freedom starts with this velocity, the rest at rest; or an array (n,), which
        goes together with a displacement array.
    duration
        How long, s; evenly spaced times are chosen, at least 20 per shortest period that matters. Without
        it, until every output has fallen to 1 % of its peak, within limits that are stated.
    times
        (k,) exactly these times, s, not negative, in any order and spacing; instead of ``duration``.
    watch
        Outputs as (place, component) pairs. By default every freedom of bare matrices; for a structure the
        struck place, bodies and points.
    modes
        Modes found before for this system: their division of the structure is used.

    Returns
    -------
    Ring
        ``displacement_m`` (k, p), ...

    Raises
    ------
    ModelError
        Contradicting or missing arguments, unknown places, impossible starts (an impulse where there is no
        mass, a pull that nothing holds).
    UnitError
        A text that is not the quantity wanted.
    ShapeError
        Arrays of the wrong size.
    AccuracyError
        A growing motion leaves the range of numbers.

    Examples
    --------
    >>> import vib
    >>> system = vib.System(mass=[[2.0]], stiffness=[[8.0]])
    >>> ring(system, velocity=[1.0], displacement=[0.0], times=[0.0]).velocity_m_s
    array([[1.]])
    """
    request = Request(impulse, pulse, pull, displacement, velocity, at, along)
    asked, length = _asked_times(times, duration)
    divided, used, notes = _divided(system, request, modes)
    begun = read_start(divided, request)
    outputs, choice = choose_outputs(divided, begun, watch, used)
    rotational = np.array([output.rotational for output in outputs])
    assembled = assemble(divided, begun, outputs)
    motion = assembled.motion
    found = contributions_of(motion)
    sampling = sample(found, motion, rotational, length)
    record = sampling.times if asked is None else asked
    grows = bool((found.decay_per_s < 0).any())
    doubt: tuple[str, ...] = ()
    if not grows and not assembled.complete:
        stable, doubt = judged(divided)
        grows = not stable
    state = (*_state_remarks(found, grows), *doubt, *_rounding_remarks(found, sampling, rotational))
    return Ring(
        system=divided,
        start=begun.words,
        time_s=record,
        displacement_m=motion(record),
        velocity_m_s=motion(record, 1),
        acceleration_m_s2=motion(record, 2),
        freedoms=tuple(output.name for output in outputs),
        rotational=tuple(bool(one) for one in rotational),
        contributions=found,
        motion=motion,
        method=motion.parts.method,
        condition=motion.parts.condition,
        model=assembled.model_words,
        truncation=assembled.truncation["displacement"],
        truncations=assembled.truncation,
        stable=not grows,
        duration_note=sampling.words if asked is None else "the times asked for",
        remarks=(*state, *assembled.remarks, *choice, *sampling.remarks, *notes),
        sampling=sampling,
    )


def _rounding_remarks(found: Contributions, sampling: Sampling, rotational: Flags) -> tuple[str, ...]:
    """What is lost where large parts cancel, as in the first instant of a very slow motion."""
    times = np.linspace(0.0, float(sampling.times[-1]), 200)
    peaks = np.abs(found.motion(times) - found.constant).max(axis=0)
    moving = significant(peaks, rotational) & (peaks > 0)
    parts = np.abs(np.where(found.clustered, 0.0, found.weights)).sum(axis=1)
    lost = EPS * found.motion.parts.condition * float((parts[moving] / peaks[moving]).max(initial=0.0))
    if lost > _NOTHING_LEFT:
        raise AccuracyError(
            f"ring: over {times[-1]:.3g} s the parts of the motion cancel so far that rounding is {lost:.1e} "
            "of the peak; ask for a longer time, or leave out the stiffness that is next to nothing"
        )
    if lost > _WORTH_SAYING:
        return (f"Parts of the motion nearly cancel; rounding may reach {lost:.0e} of the peaks.",)
    return ()


def _asked_times(times: ArrayLike | None, duration: Quantity | None) -> tuple[Array | None, float | None]:
    if times is not None and duration is not None:
        raise ModelError("ring: times and duration contradict each other; give one of them")
    if duration is not None:
        length = quantity(duration, "time", "duration")
        if length <= 0:
            raise ModelError(f"duration: it must be longer than 0, got {length:g} s")
        return None, length
    if times is None:
        return None, None
    try:
        asked = np.array(times, dtype=np.float64)
    except (TypeError, ValueError):
        asked = np.zeros((0, 0))
    if asked.ndim != 1 or not asked.size:
        raise ModelError("times: give one row of numbers, in seconds")
    if not np.all(np.isfinite(asked)) or asked.min() < 0:
        raise ModelError("times: every time must be finite and not negative; the start is at 0 s")
    return asked, float(asked.max()) or None


def _divided(
    system: System, request: Request, modes: Modes | None
) -> tuple[System, Modes | None, tuple[str, ...]]:
    """The system in the division whose lower modes are accurate, these, and what that leaves of error."""
    if system.anatomy is None or system.anatomy.division is None:
        return system, None, ()
    if any(value is not None and np.ndim(value) == 1 for value in (request.displacement, request.velocity)):
        note = "The division into pieces is the one given: the initial state names its freedoms."
        return system, None, (note,)
    if modes is None:
        modes = system.modes(count=min(12, system.size))
    elastic = modes.frequencies_hz > 0
    worst = float((modes.errors_hz[elastic] / modes.frequencies_hz[elastic]).max(initial=0.0))
    note = (
        f"Numerical error of the first {len(modes.frequencies_hz)} natural frequencies: at most {worst:.1e}, "
        "relative; higher modes are less accurate."
    )
    return modes.system, modes, (note,)


def _state_remarks(found: Contributions, grows: bool) -> tuple[str, ...]:
    if (found.decay_per_s < 0).any():
        rate = -float(found.decay_per_s.min())
        return (
            f"The system is unstable: the motion grows, {math.log(2) / rate:.3g} s to double at the most.",
        )
    if grows:
        return ("The system is unstable: a motion grows that the modes of this record do not hold.",)
    remarks = []
    stays = found.decay_per_s <= 0
    if stays.size and stays[~found.clustered].all() and not found.clustered.any():
        remarks.append("The system has no damping: nothing decays.")
    elif stays[~found.clustered].any():
        remarks.append("Some modes have no damping and never decay.")
    if found.drifts.any():
        remarks.append("The system is not held: it drifts away, and the drift does not decay.")
    elif found.constant.any():
        remarks.append("The system comes to rest away from where it started.")
    return tuple(remarks)
