"""The damped solvers: dense against sparse, residuals, laws."""

from __future__ import annotations

import mpmath
import numpy as np
import pytest
import scipy.sparse as sparse
from hypothesis import given, settings
from hypothesis import strategies as st

from vib.solve.arnoldi import sparse_quadratic
from vib.solve.damping import rayleigh_parts
from vib.solve.dense import dense_undamped
from vib.solve.quadratic import quadratic_modes
from vib.solve.shift_invert import sparse_undamped
from vib.system import DampingLaw, System

SIZE = 70  # enough for the sparse solver, which is called directly
LARGE = 160  # enough for a system to be handed to the sparse solvers


def long_chain(free=False, size=SIZE):
    stiffness = 2 * np.eye(size) - np.eye(size, k=1) - np.eye(size, k=-1)
    if free:
        stiffness[0, 0] = stiffness[-1, -1] = 1
    return sparse.csr_array(np.diag(1 + 0.3 * np.sin(np.arange(size)))), sparse.csr_array(stiffness)


def dashpots(size=SIZE, **places):
    damping = np.zeros((size, size))
    for place, value in places.items():
        index = int(place[1:])
        damping[index, index] += value
    return damping


@pytest.mark.parametrize("free", [False, True])
@pytest.mark.parametrize("case", ["dashpots", "strong", "law", "spin", "drag between"])
def test_sparse_agrees_with_dense(case, free):
    """The lowest eigenvalues by Arnoldi and all by the dense solver, within their bounds."""
    mass, stiffness = long_chain(free)
    linear = dashpots(_3=0.4, _40=0.1, _60=0.02)
    if case == "strong":
        linear = dashpots(_10=30.0, _50=4.0)
    if case == "drag between":
        linear[20:22, 20:22] += [[3, -3], [-3, 3]]
        linear[3, 3] = linear[40, 40] = linear[60, 60] = 0.0
    if case == "spin":
        for i in range(40, 60, 2):
            linear[i, i + 1] += 0.5
            linear[i + 1, i] -= 0.5
    count = 12
    near = sparse_undamped(mass, stiffness, 20)
    every = dense_undamped(mass.toarray(), stiffness.toarray())
    law, whole_law = np.zeros((2, SIZE))
    if case == "law":  # on the same modes in both
        law[near.rigid : 20] = whole_law[near.rigid : 20] = 0.03
    names = tuple(str(i) for i in range(SIZE))
    exact = quadratic_modes(mass, linear, stiffness, every, whole_law, names)
    found = sparse_quadratic(mass, sparse.csr_array(linear), stiffness, near, law[:20], count)
    assert found.rigid == exact.rigid == int(free)
    assert len(found.values) >= count
    distance = np.abs(found.values[:count] - exact.values[:count])
    assert (distance <= 1e-9 * np.abs(exact.values[:count])).all()
    assert (distance <= found.movement[:count] + exact.movement[:count] + 1e-15).all()
    elastic = slice(found.rigid, count)
    np.testing.assert_allclose(found.condition[elastic], exact.condition[elastic], rtol=1e-5)
    for index in range(found.rigid, count):
        s, shape = found.values[index], found.shapes[:, index]
        full = linear + (law[:20] * 2 * near.angular * (mass @ near.shapes)) @ (mass @ near.shapes).T
        terms = (s**2 * (mass @ shape), s * (full @ shape), stiffness @ shape)
        size = max(np.abs(term).max() for term in terms)
        assert np.abs(sum(terms)).max() <= 1e-9 * size


@settings(max_examples=30, deadline=None)
@given(st.integers(1, 6), st.integers(0, 10**6), st.floats(1e-3, 30.0), st.booleans())
def test_laws_of_the_damped_problem(size, seed, strength, spinning):
    """Residuals, the sum of all eigenvalues (minus the trace of inv(M) C), passivity, and scaling."""
    rng = np.random.default_rng(seed)
    mass, damping, stiffness = (root @ root.T for root in rng.standard_normal((3, size, size + 1)))
    mass = mass + 0.1 * np.trace(mass) / size * np.eye(size)
    damping = strength * damping
    skew = rng.standard_normal((size, size)) if spinning else np.zeros((size, size))
    skew = skew - skew.T
    modes = System(mass=mass, damping=damping, gyroscopic=skew, stiffness=stiffness).modes()
    whole = np.concatenate([modes.eigenvalues, modes.eigenvalues[modes.eigenvalues.imag > 0].conj()])
    assert len(whole) == 2 * size
    trace = np.trace(np.linalg.solve(mass, damping))
    assert abs(whole.sum() + trace) <= 1e-10 * np.abs(whole).sum()
    assert (modes.eigenvalues.real <= 0).all()
    assert modes.stable
    for s, shape in zip(modes.eigenvalues, modes.shapes.T, strict=True):
        terms = (s**2 * (mass @ shape), s * ((damping + skew) @ shape), stiffness @ shape)
        assert np.abs(sum(terms)).max() <= 1e-9 * max(np.abs(term).max() for term in terms)
    scaled = System(mass=3 * mass, damping=3 * damping, gyroscopic=3 * skew, stiffness=3 * stiffness).modes()
    slack = 2 * np.pi * (modes.errors_hz + scaled.errors_hz) + 1e-13 * np.abs(modes.eigenvalues)
    assert (np.abs(np.abs(scaled.eigenvalues) - np.abs(modes.eigenvalues)) <= slack).all()


def test_rayleigh_parts():
    mass, stiffness = long_chain()
    found = rayleigh_parts(mass, 0.3 * mass + 2e-4 * stiffness, stiffness)
    assert found is not None
    np.testing.assert_allclose(np.array(found), np.array([0.3, 2e-4]), rtol=1e-12)
    assert rayleigh_parts(mass, sparse.csr_array(dashpots(_3=1.0)), stiffness) is None
    near = 0.3 * mass + 2e-4 * stiffness + sparse.csr_array(dashpots(_7=1e-8))
    assert rayleigh_parts(mass, near, stiffness) is None  # a dashpot of 1e-8 is still a dashpot


@pytest.mark.parametrize("law", [DampingLaw(), DampingLaw(ratio=0.02)])
def test_sparse_proportional_damping(law):
    mass, stiffness = long_chain(size=LARGE)
    system = System(mass=mass, damping=0.01 * mass + 0.02 * stiffness, stiffness=stiffness, damping_law=law)
    modes = system.modes(count=10)
    assert modes.proportional
    angular = modes.undamped_frequencies_hz * 2 * np.pi
    np.testing.assert_allclose(modes.damping_ratios, 0.005 / angular + 0.01 * angular + law.ratio, rtol=1e-10)
    assert modes.complete_below_hz > modes.frequencies_hz[-1]


def test_overdamped_modes_beyond_the_search_limit_what_is_complete():
    """C = b K with 1 / b below the modes found: slow eigenvalues gather at 1 / b and can't all be there."""
    mass, stiffness = long_chain(size=LARGE)
    modes = System(mass=mass, damping=50.0 * stiffness, stiffness=stiffness).modes(count=10)
    assert modes.complete_below_hz is not None
    assert modes.complete_below_hz * 2 * np.pi <= 1 / 50.0
    every = System(mass=mass, damping=50.0 * stiffness, stiffness=stiffness).modes()
    inside = every.frequencies_hz < modes.complete_below_hz
    np.testing.assert_allclose(modes.frequencies_hz[: inside.sum()], every.frequencies_hz[inside], rtol=1e-8)


def test_limit_in_a_large_damped_system():
    mass, stiffness = long_chain(size=LARGE)
    system = System(
        mass=mass, damping=sparse.csr_array(dashpots(LARGE, _3=0.4, _90=6.0)), stiffness=stiffness
    )
    every, found = system.modes(), system.modes(up_to=0.03)
    expected = every.eigenvalues[every.frequencies_hz <= 0.03]
    np.testing.assert_allclose(found.eigenvalues, expected, rtol=1e-9)
    assert found.complete_below_hz is not None
    assert found.complete_below_hz >= 0.03
    assert any("argument principle" in remark for remark in found.remarks)


def test_a_rate_of_growth_equal_to_a_frequency_is_another_mode():
    """Buckled, damped: eigenvalues of the first-order matrix by numpy, an independent route."""
    stiffness = 2 * np.eye(6) - np.eye(6, k=1) - np.eye(6, k=-1)
    stiffness[3, 3] -= 4.0
    for damping in (np.diag([0.3, 0, 0, 0, 0, 0]), 9 * np.eye(6)):
        modes = System(mass=np.eye(6), damping=damping, stiffness=stiffness).modes()
        state = np.block([[np.zeros((6, 6)), np.eye(6)], [-stiffness, -damping]])
        expected = np.linalg.eigvals(state)
        distance = np.abs(modes.eigenvalues[:, None] - expected).min(axis=1)
        assert (distance <= 1e-12 * np.abs(modes.eigenvalues)).all()
        assert not modes.stable


def test_a_dashpot_between_two_places_of_a_free_structure():
    """It resists no rigid-body motion, though its own terms cancel there: two eigenvalues at zero."""
    size = 1200
    mass, stiffness = long_chain(free=True, size=size)
    damping = np.zeros((size, size))
    damping[500:502, 500:502] = [[3, -3], [-3, 3]]
    modes = System(mass=mass, damping=sparse.csr_array(damping), stiffness=stiffness).modes(count=6)
    assert modes.rigid_body_count == 1
    assert modes.complete_below_hz is not None
    assert (modes.backward_errors <= 1e-10).all()


@pytest.mark.parametrize("mass_unit", [1e-12, 1.0, 1e9])
@pytest.mark.parametrize("time_unit", [1e-6, 1.0, 1e3])
def test_the_scaling_of_states_leaves_no_unit(mass_unit, time_unit):
    """Against one factor for all states (Fan, Lin & Van Dooren 2004), which loses digits of soft modes here.

    A chain of springs of 1 N/m and of 1e12 N/m; the exact eigenvalues from 50 digits (mpmath).
    """
    size = 6
    springs = np.array([1.0, 2.0, 1.0, 1e12, 3e12, 1e12, 2e12])
    stiffness = np.diag(springs[:-1] + springs[1:]) - np.diag(springs[1:-1], 1) - np.diag(springs[1:-1], -1)
    mass, damping = np.eye(size), np.diag([0.2] + [0.0] * (size - 1))
    mixed = np.ix_([3, 0, 5, 1, 4, 2], [3, 0, 5, 1, 4, 2])  # numbered as they come, not from soft to stiff
    stiffness, damping = stiffness[mixed], damping[mixed]
    modes = System(
        mass=mass_unit * mass,
        damping=mass_unit / time_unit * damping,
        stiffness=mass_unit / time_unit**2 * stiffness,
    ).modes()
    exact = _in_fifty_digits(damping, stiffness)
    distance = np.abs(modes.eigenvalues[:, None] * time_unit - exact).min(axis=1)
    assert (distance <= 1e-13 * np.abs(modes.eigenvalues) * time_unit).all()
    assert (modes.backward_errors <= 1e-12).all()
    gamma = np.sqrt(np.linalg.norm(stiffness, 2))
    delta = 2 / (np.linalg.norm(stiffness, 2) + np.linalg.norm(damping, 2) * gamma)
    scaled = [gamma**2 * delta * mass, gamma * delta * damping, delta * stiffness]
    zero, one = np.zeros((size, size)), np.eye(size)
    first = np.block([[one, zero], [zero, scaled[0]]])
    second = np.block([[zero, one], [-scaled[2], -scaled[1]]])
    plain = gamma * np.linalg.eigvals(np.linalg.solve(first, second))
    assert max(np.abs(plain - value).min() / abs(value) for value in exact) > 1e-11


def _in_fifty_digits(damping, stiffness):
    mpmath.mp.dps = 50
    size = len(stiffness)
    state = mpmath.zeros(2 * size)
    for row in range(size):
        state[row, size + row] = 1
        for column in range(size):
            state[size + row, column] = -float(stiffness[row, column])  # of unit masses
            state[size + row, size + column] = -float(damping[row, column])
    values = mpmath.eig(state, left=False, right=False)
    return np.array([complex(value) for value in values])


def test_shapes_of_soft_and_stiff_parts_have_digits_of_their_own():
    """Stiffness spread 1e12, dense: backward error on freedoms of unit stiffness, so that soft rows count."""
    size = 8
    springs = np.where(np.arange(size + 1) < 4, 1.0, 1e12)
    stiffness = np.diag(springs[:-1] + springs[1:]) - np.diag(springs[1:-1], 1) - np.diag(springs[1:-1], -1)
    for damping in (np.zeros((size, size)), np.diag([0.3] + [0.0] * (size - 1))):
        modes = System(mass=np.eye(size), damping=damping, stiffness=stiffness).modes()
        assert (modes.backward_errors <= 1e-12).all()
        scale = 1 / np.sqrt(np.diag(stiffness))
        soft = np.abs(modes.eigenvalues) < 10
        for value, shape in zip(modes.eigenvalues[soft], modes.shapes[:, soft].T, strict=True):
            residual = value**2 * shape + value * (damping @ shape) + stiffness @ shape
            size_of = 2 * np.linalg.norm(shape / scale)
            assert np.linalg.norm(scale * residual) <= 1e-12 * size_of


def test_a_pair_that_is_just_defective():
    """Circulatory forces at the border of flutter: one shape for both eigenvalues, to full accuracy."""
    modes = System(mass=np.eye(2), stiffness=[[2.0, 0.1], [-0.1, 2.2]], unsymmetric=True).modes()
    assert (modes.backward_errors <= 1e-12).all()
    distance = np.abs(np.abs(modes.eigenvalues) - np.sqrt(2.1)) / (2 * np.pi)
    assert (distance <= modes.errors_hz).all()


def test_damped_modes_own_up_to_what_round_off_hides():
    """Random springs over twelve decades and one dashpot: the entries no longer hold the softest motion.

    The undamped frequency of reference comes from the flexibility, a sum of positive terms without
    cancellation: K^-1 = A' A with A the inverse of a bidiagonal factor (elementary).
    """
    size = 300
    springs = 1e3 * 1e12 ** np.random.default_rng(7).random(size)
    diagonal = springs + np.append(springs[1:], 0.0)
    stiffness = np.diag(diagonal) - np.diag(springs[1:], 1) - np.diag(springs[1:], -1)
    factor = np.sqrt(springs)[:, None] * (np.eye(size) - np.eye(size, k=-1)) / np.sqrt(2.0)
    inverse = np.linalg.inv(factor)
    exact = 1 / np.sqrt(np.linalg.eigvalsh(inverse @ inverse.T)[-1])
    damping = np.zeros((size, size))
    damping[100, 100] = 1e-3  # so weak that it moves no frequency
    system = System(mass=2.0 * np.eye(size), damping=damping, stiffness=stiffness)
    found = system.modes(count=8)
    slow = 2 * np.pi * (found.frequencies_hz - found.errors_hz)
    assert slow.min() <= exact
    lost = found.frequencies_hz == 0
    assert (2 * np.pi * found.errors_hz[lost] > exact).all()
