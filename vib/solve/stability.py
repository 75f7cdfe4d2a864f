"""Whether anything grows beyond the modes that were asked for.

Where the damping only takes energy out and the stiffness is positive nothing can (Kelvin, Tait and Chetaev;
P. Lancaster, Lambda-matrices and Vibrating Systems, 1966, chapter 7). Otherwise all eigenvalues are computed
where that is affordable; beyond, `vib.solve.growth` proves what it can, and stability is not claimed without.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import scipy.linalg
import scipy.sparse as sparse

from vib.massless import Matrix, dense, first_order, root_scale
from vib.solve.damped import Complex, Damped
from vib.solve.damping import ModalDamping
from vib.solve.factor import negative_count
from vib.solve.undamped import EPS, Array, Undamped

MOST_FREEDOMS = 800  # all eigenvalues of a first-order matrix of twice that size take some seconds
# Real parts that round-off of an eigenvalue computation leaves: of the eigenvalue, and of the largest one.
SLACK = 1e-12  # of a damping matrix of unit diagonal: an eigenvalue above minus this much is none below zero
DENSE_ROWS = 300  # rows of damping up to which its eigenvalues are computed
OWN, LARGEST = 1e-8, 1e-12
POWER_STEPS = 60  # towards the highest mode


def is_passive(linear: Matrix, undamped: Undamped) -> bool:
    """Whether the damping takes energy out of any motion, or none, and the stiffness stores it in any.

    ``linear`` is without the damping that is stated mode by mode.
    """
    return undamped.values.min(initial=0.0) >= 0 and takes_energy(linear)


def takes_energy(linear: Matrix) -> bool:
    """Whether the symmetric part of a velocity term (n, n) is positive or zero, within round-off."""
    half = (linear + linear.T) / 2
    diagonal = np.asarray(half.diagonal())
    rest = np.asarray(abs(half).sum(axis=1)).ravel() - np.abs(diagonal)
    if (diagonal >= rest * (1 - SLACK)).all():  # diagonally dominant: enough, not necessary
        return True
    touched = np.flatnonzero(rest + np.abs(diagonal))
    if (diagonal[touched] <= 0).any():
        return False
    scale: Array = root_scale(diagonal[touched])
    # gyroscopic entries that cancel in the half sum leave their round-off beside the dashpots
    sizes = (abs(linear) + abs(linear).T) / 2
    sizes = sizes[touched][:, touched] if sparse.issparse(sizes) else sizes[np.ix_(touched, touched)]
    slack = SLACK * len(touched) + 4 * EPS * float((scale * (sizes @ scale)).max(initial=0.0))
    if len(touched) <= DENSE_ROWS:
        inner = half[touched][:, touched] if sparse.issparse(half) else half[np.ix_(touched, touched)]
        scaled = scale[:, None] * dense(inner) * scale
        return bool(scipy.linalg.eigvalsh(scaled)[0] >= -slack)
    lifted = sparse.csr_array(half)[touched][:, touched] + sparse.diags_array(slack * diagonal[touched])
    return negative_count(sparse.csr_array(lifted)) == 0


def watched(
    mass: Matrix,
    linear: Matrix,
    stiffness: Matrix,
    damping: ModalDamping,
    found: Damped,
    names: tuple[str, ...],
) -> tuple[Damped, bool]:
    """The modes with a growing eigenvalue beyond them noted, and whether stability is now known.

    For systems that can feed energy in; ``found`` are the modes asked for.
    """
    if found.growing is not None or bool((found.values.real > found.movement).any()):
        return found, True
    if found.proportional and damping.undamped.values.min(initial=0.0) < 0:
        fastest = float(np.sqrt(-damping.undamped.values.min()))
        return replace(found, growing=complex(fastest)), True
    if found.complete and found.certified is None:
        return found, True
    rates = 2 * damping.law * damping.undamped.angular
    acted = rates != 0
    held = mass @ damping.undamped.shapes[:, acted]
    if mass.shape[0] > MOST_FREEDOMS:
        from vib.solve.growth import Terms, Verdict, grows

        if found.proportional and damping.rayleigh is not None and not acted.any():
            verdict = Verdict(*_at_the_ends(mass, stiffness, damping.rayleigh))
        else:
            verdict = grows(Terms(mass, linear, stiffness, held, rates[acted]))
        return replace(found, growing=verdict.growing), verdict.proved
    whole = dense(linear) + (held * rates[acted]) @ held.T
    values: Complex = scipy.linalg.eigvals(first_order(mass, whole, stiffness, names).rate)
    size = np.abs(values)
    growing = values[values.real > OWN * size + LARGEST * size.max(initial=0.0)]
    if not len(growing):
        return found, True
    fastest_one = growing[int(np.argmax(growing.real))]
    return replace(found, growing=complex(fastest_one.real, abs(fastest_one.imag))), True


def _at_the_ends(mass: Matrix, stiffness: Matrix, parts: tuple[float, float]) -> tuple[complex | None, bool]:
    """The eigenvalue of the highest modes under the damping a M + b K, if it grows; and whether it is known.

    The rate a + b w^2 goes one way with w, so that one of the ends is the first to grow; the lowest modes
    were looked at. The highest lies between any quotient x K x / x M x and the largest sum of a row of |K|
    over its mass (S. A. Gershgorin, Izv. Akad. Nauk SSSR 7 (1931) 749-754, for a mass of point masses).
    """
    mass_part, stiffness_part = parts
    if stiffness_part >= 0:
        return (complex(-mass_part / 2), True) if mass_part < 0 else (None, True)
    diagonal = np.asarray(mass.diagonal())
    if not (diagonal > 0).all():
        return complex(-1 / stiffness_part), True
    vector = np.random.default_rng(11).standard_normal(mass.shape[0])
    for _ in range(POWER_STEPS):
        vector = (stiffness @ vector) / diagonal
        vector = vector / np.abs(vector).max()
    least = float(vector @ (stiffness @ vector)) / float(vector @ (mass @ vector))
    rate = mass_part + stiffness_part * least
    if rate < 0:
        return complex(-rate / 2, np.sqrt(least)), True
    if abs(mass).sum() > diagonal.sum() * (1 + 1e-12):
        return None, False
    most = float((np.asarray(abs(stiffness).sum(axis=1)).ravel() / diagonal).max())
    return None, mass_part + stiffness_part * most >= 0
