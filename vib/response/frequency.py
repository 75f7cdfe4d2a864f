"""Frequency response in receptance, mobility and accelerance (ISO 7626-1): the noun `FrequencyResponse`."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Literal

import numpy as np
from numpy.typing import ArrayLike, NDArray

from vib.errors import AccuracyError, ModelError, in_own_words
from vib.response.exponential import EPS, Array
from vib.response.receptance import Receptance, receptance
from vib.response.residue_sum import Complex
from vib.system import COMPONENTS, System

if TYPE_CHECKING:
    from vib.modes import Modes

Along = str | Sequence[float] | None
Channel = str | tuple[str, Along]
Kind = Literal["receptance", "mobility", "accelerance"]
_FAINT = 1e-10  # of the largest response; sums of residues are rounded at 1e-16 of their largest term
KINDS: tuple[Kind, ...] = ("receptance", "mobility", "accelerance")


@dataclass(frozen=True, kw_only=True, eq=False)
class FrequencyResponse:
    """What harmonic forces (or a harmonic motion of the ground) do at o outputs, i inputs, k lines.

    Attributes
    ----------
    system
        The system that was used (for a structure perhaps a finer division than the one given).
    lines_hz
        (k,) frequencies, Hz.
    receptance
        (k, o, i) complex: displacement (m, rad) per force (N, N m). The phase is that of the motion against
        the force, for a time factor exp(+i w t). For a motion of the ground: motion per motion of the ground
        (transmissibility), the same for displacement, velocity and acceleration.
    error
        (k, o, i) bound of the error by modes left out, in the unit of ``receptance``; 0 for a complete sum.
    inputs, outputs
        Names of the channels.
    rotational_inputs, rotational_outputs
        True where a channel is a moment or an angle.
    ground
        True where the inputs are motions of the ground.
    method
        How it was computed, in words.
    stable
        False if an eigenvalue grows: then no steady vibration exists, and the figures are formal.
    remarks
        What the reader should know, in words.
    """

    system: System
    lines_hz: Array
    receptance: Complex
    error: Array
    inputs: tuple[str, ...]
    outputs: tuple[str, ...]
    rotational_inputs: tuple[bool, ...]
    rotational_outputs: tuple[bool, ...]
    ground: bool
    method: str
    stable: bool
    remarks: tuple[str, ...]

    @property
    def omega(self) -> Array:
        """Angular frequencies (k,), rad/s."""
        return 2 * np.pi * self.lines_hz

    @property
    def mobility(self) -> Complex:
        """(k, o, i) velocity per force, i w times the receptance."""
        return self.of("mobility")

    @property
    def accelerance(self) -> Complex:
        """(k, o, i) acceleration per force, -w^2 times the receptance."""
        return self.of("accelerance")

    def of(self, kind: Kind) -> Complex:
        """Receptance, mobility or accelerance (k, o, i); motion of the ground has one kind only."""
        order = 0 if self.ground else KINDS.index(kind)
        return np.asarray((1j * self.omega[:, None, None]) ** order * self.receptance)

    def error_of(self, kind: Kind) -> Array:
        """The bound (k, o, i) of the error of that kind."""
        order = 0 if self.ground else KINDS.index(kind)
        return np.asarray(self.omega[:, None, None] ** order * self.error)

    @property
    def relative_error(self) -> float:
        """The largest error bound of any channel pair, relative to the largest response of that pair."""
        top = np.abs(self.receptance).max(axis=0, initial=0.0)
        worst = self.error.max(axis=0, initial=0.0)
        return float((worst / np.where(top > 0, top, np.inf)).max(initial=0.0))


@in_own_words
def frequency_response(
    system: System,
    *,
    lines_hz: ArrayLike,
    inputs: Sequence[Channel] | None = None,
    outputs: Sequence[Channel] | None = None,
    ground: Sequence[str] | None = None,
    modes: Modes | None = None,
) -> FrequencyResponse:
    """The steady answer to harmonic forces, or to a harmonic motion of the ground.

    Parameters
    ----------
    system
        Any system: damped as it may be, gyroscopic, unsymmetric, with or without massless freedoms.
    lines_hz
        (k,) frequencies, Hz, in any order.
    inputs, outputs
        Places as ``(at, along)`` of `System.direction`, or a name; None for every freedom.
    ground
        Instead of inputs: axes ``"x"``, ``"y"``, ``"z"`` (or turns about the origin) along which the ground
        moves. Outputs are then absolute motions per motion of the ground. Needs a structure.
    modes
        Modes up to the highest line found before for this system: their division of the structure is used.

    Returns
    -------
    FrequencyResponse
        ``receptance`` (k, o, i), ...

    Raises
    ------
    ModelError
        Unknown places, no lines, negative ones, or a line at 0 Hz of a system that is not held.
    AccuracyError
        A line is exactly at the natural frequency of an undamped mode.

    References
    ----------
    ISO 7626-1:2011, mobility and its kin. D. J. Ewins, Modal Testing, chapter on the receptance of damped
    systems (sum of residues), from memory. Dashpots and remainder: `vib.response.residue_sum`.

    Examples
    --------
    >>> import vib
    >>> system = vib.System(mass=[[2.0]], damping=[[0.8]], stiffness=[[8.0]])
    >>> abs(frequency_response(system, lines_hz=[0.0]).receptance[0, 0, 0]).round(12).item()
    0.125
    """
    lines = _lines(lines_hz)
    if ground is not None and inputs is not None:
        raise ModelError("frequency response: inputs and ground contradict each other; give one of them")
    used, notes = _divided(system, float(lines.max()), modes)
    watched = channels(used, outputs)
    if ground is None:
        forced = channels(used, inputs)
        answer = receptance(used, 2 * np.pi * lines, watched.directions, forced.directions)
        found, error = answer.values, answer.error
        in_names, turning = forced.names, forced.rotational
    else:
        axes = [ground_axis(axis) for axis in ground]
        carried, rigid = ground_motion(used, watched, axes)
        answer = receptance(used, 2 * np.pi * lines, watched.directions, carried)
        square = (2 * np.pi * lines[:, None, None]) ** 2
        found, error = rigid + square * answer.values, square * answer.error
        in_names = tuple(f"ground {axis}" for axis in ground)
        turning = tuple(axis.lstrip("+-").startswith("r") for axis in ground)
    _check(used, lines, found)
    result = FrequencyResponse(
        system=used,
        lines_hz=lines,
        receptance=found,
        error=error,
        inputs=in_names,
        outputs=watched.names,
        rotational_inputs=turning,
        rotational_outputs=watched.rotational,
        ground=ground is not None,
        method=answer.method,
        stable=answer.stable,
        remarks=(*_remarks(answer), *_faint(found), *notes),
    )
    if answer.complete:
        return result
    bound = (
        f"Modes left out: the error of the response is at most {result.relative_error:.1e} of the largest "
        "response of each pair of channels (a bound)."
    )
    return FrequencyResponse(**{**result.__dict__, "remarks": (*result.remarks, bound)})


@dataclass(frozen=True, eq=False)
class Channels:
    """Directions (n, c) of forces or motions, their names, and whether each is a rotation."""

    directions: Array
    names: tuple[str, ...]
    rotational: tuple[bool, ...]
    places: tuple[tuple[str, Along], ...]


def channels(system: System, given: Sequence[Channel] | None) -> Channels:
    """Channels by place and component; None for every freedom.

    Raises
    ------
    ModelError
        A place that is unknown or held, or named twice.
    """
    if given is None:
        if system.size > 2000:
            raise ModelError("frequency response: name the inputs and outputs; there are too many freedoms")
        pairs: list[tuple[str, Along]] = [(named.point, named.component or None) for named in system.freedoms]
        turning = tuple(named.component.startswith("r") for named in system.freedoms)
        return Channels(
            np.eye(system.size), tuple(str(one) for one in system.freedoms), turning, tuple(pairs)
        )
    pairs = [(one, None) if isinstance(one, str) else (one[0], one[1]) for one in given]
    if not pairs:
        raise ModelError("frequency response: at least one input and one output are needed")
    names = tuple(
        at if along is None else f"{at} {along.strip() if isinstance(along, str) else _numbers(along)}"
        for at, along in pairs
    )
    for name in names:
        if names.count(name) > 1:
            raise ModelError(f"frequency response: {name} is there more than once")
    directions = np.array([system.direction(at, along) for at, along in pairs]).T
    rotational = tuple(
        isinstance(along, str) and along.strip().lstrip("+-").startswith("r") for _, along in pairs
    )
    return Channels(directions, names, rotational, tuple(pairs))


def _numbers(along: Sequence[float]) -> str:
    return f"along ({', '.join(f'{part:g}' for part in along)})"


def ground_axis(axis: str) -> Array:
    """Six components of a unit motion of the ground.

    Raises
    ------
    ModelError
        Not a component.
    """
    sign = -1.0 if axis.startswith("-") else 1.0
    name = axis.lstrip("+-")
    if name not in COMPONENTS:
        raise ModelError(f"ground: one of {', '.join(COMPONENTS)} is needed, got {axis!r}")
    return np.asarray(sign * (np.array(COMPONENTS) == name))


def ground_motion(system: System, watched: Channels, axes: Sequence[Array]) -> tuple[Array, Array]:
    """What a unit motion of the ground carries, and how the outputs ride along.

    Returns
    -------
    tuple
        (n, a) the inertia force per unit acceleration of the ground, without its sign, and (o, a) the motion
        of the outputs as if all were rigid.

    Raises
    ------
    ModelError
        The system is bare matrices, which don't say how they follow the ground.
    """
    if system.anatomy is None:
        raise ModelError(
            "ground: a motion of the ground needs a structure (points, members, bodies, supports); bare "
            "matrices don't say what they stand on"
        )
    unit = np.stack(axes, axis=1)
    rigid = np.zeros((len(watched.names), len(axes)))
    for row, (at, along) in enumerate(watched.places):
        place = system.anatomy.places.get(at)
        if place is None:
            raise ModelError(f"ground: {at} is no named place, so its ride on the ground isn't known")
        moved = _rigid_motion(np.array(place.position_m)) @ unit
        rigid[row] = _weights(along) @ moved
    return system.anatomy.carried @ unit, rigid


def _rigid_motion(position: Array) -> Array:
    """(6, 6): the motion of a place per motion of the ground along and about axes through the origin."""
    x, y, z = position
    found = np.eye(6)
    found[:3, 3:] = [[0.0, z, -y], [-z, 0.0, x], [y, -x, 0.0]]
    return found


def _weights(along: Along) -> Array:
    if along is None:
        raise ModelError("ground: each output needs its component, such as (place, 'x')")
    if isinstance(along, str):
        return ground_axis(along.strip())
    vector = np.zeros(6)
    vector[:3] = np.asarray(along, dtype=np.float64) / np.linalg.norm(along)
    return vector


def _lines(lines_hz: ArrayLike) -> Array:
    try:
        lines = np.atleast_1d(np.array(lines_hz, dtype=np.float64))
    except (TypeError, ValueError):
        lines = np.zeros((0, 0))
    if lines.ndim != 1 or not lines.size:
        raise ModelError("lines: give one row of frequencies, in Hz")
    if not np.isfinite(lines).all() or lines.min() < 0:
        raise ModelError("lines: every frequency must be finite and not negative")
    return lines


def _divided(system: System, highest_hz: float, modes: Modes | None) -> tuple[System, tuple[str, ...]]:
    """A structure in the division whose modes up to the highest line are accurate."""
    if system.anatomy is None or system.anatomy.division is None or highest_hz <= 0:
        return system, ()
    modes = modes if modes is not None else system.modes(up_to=highest_hz)
    elastic = modes.frequencies_hz > 0
    if not elastic.any():
        return modes.system, ()
    worst = float((modes.errors_hz[elastic] / modes.frequencies_hz[elastic]).max())
    return modes.system, (
        f"Numerical error of the natural frequencies up to {highest_hz:.4g} Hz: at most {worst:.1e}, "
        "relative; next to a resonance the response is off by that over the damping ratio.",
    )


def _check(system: System, lines: Array, found: NDArray[np.complex128]) -> None:
    bad = ~np.isfinite(found).all(axis=(1, 2))
    if not bad.any():
        return
    line = float(lines[bad][0])
    if line == 0:
        raise ModelError(
            "lines: at 0 Hz nothing holds the system, so a steady force moves it away; begin above 0 Hz"
        )
    raise AccuracyError(
        f"lines: {line:.6g} Hz is exactly a natural frequency of an undamped mode, where the response is "
        "infinite; state some damping, or move the line"
    )


def _faint(found: Complex) -> tuple[str, ...]:
    """Where a sum of large terms leaves next to nothing, what is left is rounding."""
    size = np.abs(found)
    top = size.max(axis=0)
    lines = int(((size < _FAINT * top) & (top > 0)).any(axis=(1, 2)).sum())
    if not lines:
        return ()
    return (
        f"At {lines} lines a response is below {_FAINT:.0e} of the largest of its channels; such a figure "
        "is rounding as much as response.",
    )


def _remarks(answer: Receptance) -> tuple[str, ...]:
    remarks = list(answer.remarks)
    if not answer.stable:
        remarks.insert(
            0, "The system is UNSTABLE: no steady vibration exists, so these figures are formal only."
        )
    if answer.rounding > 1e4 * EPS:
        remarks.append(f"Rounding may reach {answer.rounding:.0e} of the largest response.")
    return tuple(remarks)
