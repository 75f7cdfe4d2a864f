"""Damping that takes energy out of every motion is known as such, and no other is."""

import numpy as np
import pytest
import scipy.sparse as sparse

from vib import System
from vib.solve.dense import dense_undamped
from vib.solve.stability import is_passive
from vib.solve.undamped import Undamped

SIZE = 120


def chain():
    stiffness = 2 * np.eye(SIZE) - np.eye(SIZE, k=1) - np.eye(SIZE, k=-1)
    return np.diag(1 + 0.3 * np.sin(np.arange(SIZE))), stiffness


def oblique(constants):
    """Dashpots along directions that mix several freedoms: semi-definite, not diagonally dominant."""
    directions = np.random.default_rng(5).normal(size=(SIZE, len(constants)))
    directions[30:] = 0
    return (directions * constants) @ directions.T


def undamped() -> Undamped:
    mass, stiffness = chain()
    return dense_undamped(mass, stiffness)


@pytest.mark.parametrize("form", [np.asarray, sparse.csr_array])
def test_dashpots_aslant_and_rayleigh_damping_are_passive(form):
    mass, stiffness = chain()
    assert is_passive(form(oblique([3.0, 0.2, 7.0])), undamped())
    assert is_passive(form(0.1 * mass + 0.02 * stiffness @ stiffness), undamped())


@pytest.mark.parametrize("form", [np.asarray, sparse.csr_array])
def test_one_negative_dashpot_among_others_is_not(form):
    assert not is_passive(form(oblique([3.0, -0.2, 7.0])), undamped())
    beside_nothing = np.zeros((SIZE, SIZE))
    beside_nothing[3, 4] = beside_nothing[4, 3] = 0.5
    assert not is_passive(form(beside_nothing), undamped())


def test_no_remark_on_energy_fed_in_where_none_is():
    mass, stiffness = chain()
    modes = System(mass=mass, damping=oblique([3.0, 0.2, 7.0]), stiffness=stiffness).modes(count=5)
    assert modes.stable
    assert not any("feed energy in" in remark or "grows" in remark for remark in modes.remarks)


@pytest.mark.parametrize("asked", [{"count": 5}, {"up_to": 0.02}])
def test_a_motion_that_grows_beyond_the_modes_asked_for_makes_the_system_unstable(asked):
    mass, stiffness = chain()
    system = System(mass=mass, damping=oblique([3.0, -1e-3, 7.0]), stiffness=stiffness)
    every, few = system.modes(), system.modes(**asked)
    fastest = every.eigenvalues[every.eigenvalues.real.argmax()]
    assert fastest.real > 1e-3
    assert few.eigenvalues.real.max() < 0
    assert not few.stable
    (remark,) = (remark for remark in few.remarks if "grows" in remark)
    assert f"{abs(fastest) / (2 * np.pi):.4g} Hz" in remark
