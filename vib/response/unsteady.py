"""At which speeds something grows by itself, so that there is no steady vibration."""

from __future__ import annotations

import numpy as np
import scipy.linalg
import scipy.sparse as sparse

from vib.massless import dense
from vib.modes import Modes, find_modes
from vib.response.at_speeds import AtSpeeds
from vib.solve.factor import factorise

_SAMPLES = 25
_ALL = 150  # freedoms up to which all eigenvalues are computed
_SLOWEST = 24  # eigenvalues that are looked at beyond
_STILL = (2 * np.pi * 1e-3) ** 2  # 1 mHz: a stiffness that is negative by less is that of a free body
_HALVINGS = 24
_TOUCHED = 2500
_ROUND = 1e-10


def unsteady(
    family: AtSpeeds, low: float, high: float
) -> tuple[tuple[tuple[float, float], ...], tuple[str, ...]]:
    """Ranges of speed (from, to), rev/s, where a motion grows, and what is not sure about them, in words.

    A system whose stiffness and damping take energy only is stable at every speed, whatever its gyroscopic
    terms (W. Thomson and P. G. Tait; the energy is a Lyapunov function). Otherwise eigenvalues are looked at
    over the range, and the ends of the ranges where one grows are found by halving.
    """
    if _passive(family):
        return (), ()
    speeds = np.linspace(low, high, _SAMPLES) if family.varies and low < high else np.array([high])
    sure = True
    grows = []
    for speed in speeds.tolist():
        found = _modes(family, speed)
        sure &= found.stability_known
        grows.append(not found.stable)
    ranges: list[tuple[float, float]] = []
    for number in np.flatnonzero(grows).tolist():
        start = stop = float(speeds[number])
        if number and not grows[number - 1]:
            start = _border(family, float(speeds[number - 1]), start)
        elif number:
            start = float(speeds[number - 1])
        if number + 1 < len(speeds) and not grows[number + 1]:
            stop = _border(family, float(speeds[number + 1]), stop)
        if ranges and ranges[-1][1] >= start:
            start = ranges.pop()[0]
        ranges.append((start, stop))
    if len(speeds) == 1 and ranges:  # the same at every speed
        ranges = [(low, high)]
    doubt = (
        f"Forces can feed energy in: stability was judged by the {_SLOWEST} slowest motions at "
        f"{len(speeds)} speeds only."
    )
    return tuple(ranges), () if sure else (doubt,)


def _modes(family: AtSpeeds, speed_hz: float) -> Modes:
    system = family.system_at(speed_hz)
    return find_modes(system) if system.size <= _ALL else find_modes(system, count=_SLOWEST)


def _border(family: AtSpeeds, steady: float, growing: float) -> float:
    """The last speed found to grow, towards the steady one."""
    for _ in range(_HALVINGS):
        middle = (steady + growing) / 2
        if _modes(family, middle).stable:
            steady = middle
        else:
            growing = middle
    return growing


def _passive(family: AtSpeeds) -> bool:
    system = family.system
    if system.unsymmetric or family.following is not None or system.damping_law.ratio < 0:
        return False
    shifted = system.stiffness + _STILL * system.mass
    if factorise(shifted).negatives != 0:
        return False
    if system.damping is None:
        return True
    matrix = sparse.csr_array(system.damping)
    touched = np.flatnonzero(np.diff(matrix.indptr))
    if touched.size > _TOUCHED:
        return system.anatomy is not None  # a study has no dashpots but such that take energy
    inner = dense(matrix[touched][:, touched])
    values = scipy.linalg.eigvalsh((inner + inner.T) / 2)
    return bool(values.min(initial=0.0) >= -_ROUND * np.abs(values).max(initial=0.0))
