"""Growth in systems too large for all eigenvalues: found where it is, never denied where it might be."""

from __future__ import annotations

import numpy as np
import pytest
import scipy.sparse as sparse

from vib.solve.growth import Terms, _falls, grows
from vib.system import DampingLaw, System

SIDE = 30
SIZE = SIDE * SIDE
SMALL = 60


def plate():
    """Unit masses on a square net of unit springs, held at its edge: (n, n) sparse."""
    line = sparse.diags_array(
        [4.0 * np.ones(SIDE), -np.ones(SIDE - 1), -np.ones(SIDE - 1)], offsets=[0, 1, -1]
    )
    beside = sparse.diags_array([-np.ones(SIDE - 1), -np.ones(SIDE - 1)], offsets=[1, -1])
    one = sparse.eye_array(SIDE)
    return sparse.eye_array(SIZE).tocsr(), sparse.csr_array(sparse.kron(one, line) + sparse.kron(beside, one))


def at(place, value, across=False):
    if across:
        return sparse.csr_array(
            ([value, -value], ([place, place + 1], [place + 1, place])), shape=(SIZE, SIZE)
        )
    return sparse.csr_array(([value], ([place], [place])), shape=(SIZE, SIZE))


def true_top(mass, damping, stiffness):
    """Largest real part of all eigenvalues, by numpy."""
    size = mass.shape[0]
    inverse = np.linalg.inv(mass.toarray())
    state = np.block(
        [
            [np.zeros((size, size)), np.eye(size)],
            [-inverse @ stiffness.toarray(), -inverse @ damping.toarray()],
        ]
    )
    return float(np.linalg.eigvals(state).real.max())


CASES = {
    "a spring of the wrong sign": lambda m, k: {"stiffness": k + at(435, -8.0)},
    "the same with a dashpot": lambda m, k: {"stiffness": k + at(435, -8.0), "damping": at(3, 0.5)},
    "the same turning, an odd number": lambda m, k: {
        "stiffness": k + at(435, -8.0),
        "gyroscopic": at(435, 5.0, across=True),
    },
    "two held up by turning, damped everywhere": lambda m, k: {
        "stiffness": k + at(435, -8.0) + at(436, -8.0),
        "gyroscopic": at(435, 9.0, across=True),
        "damping": 1e-4 * m,
    },
    "a negative dashpot": lambda m, k: {"damping": at(435, -1e-3) + at(3, 1e-4)},
    "damping that turns negative with frequency": lambda m, k: {"damping": 1e-2 * m - 4e-3 * k},
    "a negative law beside a dashpot": lambda m, k: {
        "damping": at(3, 0.3),
        "damping_law": DampingLaw(ratio=-0.01),
    },
    "circulatory": lambda m, k: {"stiffness": k + at(435, 0.8, across=True), "unsymmetric": True},
}


@pytest.mark.parametrize("case", CASES)
def test_growth_is_met(case):
    mass, stiffness = plate()
    found = System(**{"mass": mass, "stiffness": stiffness, **CASES[case](mass, stiffness)}).modes(count=4)
    assert not found.stable
    assert any("grow" in remark for remark in found.remarks)


def test_a_light_part_that_feeds_energy_in_far_above_the_modes_asked_for():
    """All else is well damped, the trace of the damping says nothing; the eigenvalue is that of numpy."""
    mass, stiffness = plate()
    weights = np.ones(SIZE)
    weights[435] = 1e-3
    mass = sparse.csr_array(sparse.diags_array(weights))
    damping = sparse.csr_array(0.05 * mass + at(435, -1e-3))
    verdict = grows(Terms(mass, damping, stiffness, np.zeros((SIZE, 0)), np.zeros(0)))
    assert verdict.proved
    assert verdict.growing is not None
    near = [405, 434, 435, 436, 465]  # the light one sees its neighbours as nearly fixed
    local = true_top(*(sparse.csr_array(part[near][:, near]) for part in (mass, damping, stiffness)))
    assert verdict.growing.real == pytest.approx(local, rel=1e-2)
    assert not System(mass=mass, stiffness=stiffness, damping=damping).modes(count=4).stable


@pytest.mark.parametrize(
    ("damping", "across", "falls"),
    [(5.0, 0.8, True), (0.5, 1e-2, True), (1e-3, 0.8, False), (-1.0, 0.0, False)],
)
def test_damping_everywhere_outweighs_circulatory_forces(damping, across, falls):
    """The function V proves rest only where numpy finds it too."""
    line = sparse.diags_array(
        [2.0 * np.ones(SMALL), -np.ones(SMALL - 1), -np.ones(SMALL - 1)], offsets=[0, 1, -1]
    )
    skew = sparse.csr_array(([across, -across], ([20, 22], [22, 20])), shape=(SMALL, SMALL))
    mass, stiffness = sparse.eye_array(SMALL).tocsr(), sparse.csr_array(sparse.csr_array(line) + skew)
    drag = sparse.csr_array(damping * mass)
    assert _falls(Terms(mass, drag, stiffness, np.zeros((SMALL, 0)), np.zeros(0))) == falls
    if falls:
        assert true_top(mass, drag, stiffness) < 0


def test_stability_is_claimed_where_it_is_proved():
    mass, stiffness = plate()
    turned = stiffness + at(435, 0.5, across=True)
    found = System(mass=mass, stiffness=turned, damping=2.0 * mass, unsymmetric=True).modes(count=4)
    assert found.stable
    assert found.stability_known
    bands = DampingLaw(ratio=0.01, bands=((0.3, 0.4, -0.05),))
    law = System(mass=mass, stiffness=stiffness, damping_law=bands).modes(count=4)
    assert not (law.stable and law.stability_known)  # modes that it drives were not asked for
