"""Modes and excitations that the tests of screening make by hand."""

import math

import numpy as np
import pytest

from vib.modes import Modes
from vib.study.excitations import Excitation
from vib.system import System


def _modes_at(frequencies, *, ratios=None, errors=None, rigid=0, reach=math.inf, shapes=None):
    """Modes of a bare system with these natural frequencies (Hz), ascending."""
    frequencies = np.asarray(frequencies, dtype=float)
    size = len(frequencies)
    ratios = np.zeros(size) if ratios is None else np.asarray(ratios, dtype=float)
    omega = 2 * np.pi * frequencies
    inner = np.clip(1 - ratios**2, 0, None)
    eigenvalues = -ratios * omega + 1j * omega * np.sqrt(inner)
    eigenvalues[:rigid] = 0
    return Modes(
        system=System(mass=np.eye(size), stiffness=np.diag(omega**2)),
        eigenvalues=eigenvalues,
        frequencies_hz=frequencies,
        damped_frequencies_hz=eigenvalues.imag / (2 * np.pi),
        undamped_frequencies_hz=frequencies,
        damping_ratios=ratios,
        shapes=np.eye(size) if shapes is None else np.asarray(shapes),
        errors_hz=np.zeros(size) if errors is None else np.asarray(errors, dtype=float),
        condition=np.ones(size),
        backward_errors=np.zeros(size),
        stability_known=True,
        stable=bool((ratios >= 0).all()),
        rigid_body_count=rigid,
        complete_below_hz=reach,
        proportional=True,
        participation=None,
        effective_mass=None,
        strain_energy=None,
        kinetic_energy=None,
        descriptions=("",) * size,
        rigid_descriptions=("",) * rigid,
        damping_note="",
        remarks=(),
    )


def _excitation(**entries):
    """An excitation as it stands in a study file."""
    return Excitation.model_validate({"name": "fan", **entries})


@pytest.fixture(scope="session")
def modes_at():
    return _modes_at


@pytest.fixture(scope="session")
def excitation():
    return _excitation
