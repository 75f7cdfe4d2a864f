"""The first-order model: its eigenvalues, its outputs, and freedoms without mass."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from vib.errors import MatrixError, ModelError, ShapeError
from vib.statespace import StateSpace, state_space
from vib.system import DampingLaw, System

M, C, K = np.diag([2.0, 1.0]), np.array([[0.5, 0.0], [0.0, 0.9]]), np.array([[35.0, -15.0], [-15.0, 15.0]])


def both(values):
    """All eigenvalues from one of each conjugate pair, in a fixed order."""
    whole = np.concatenate([values, values[values.imag > 0].conj()])
    return whole[np.lexsort((whole.imag, whole.real.round(9)))]


def receptance(system, s):
    gyroscopic = 0 if system.gyroscopic is None else system.gyroscopic
    return np.linalg.inv(s**2 * system.mass + s * (system.damping + gyroscopic) + system.stiffness)


def test_companion_form():
    space = System(mass=M, damping=C, stiffness=K).state_space()
    np.testing.assert_allclose(
        space.A[2:], np.hstack([-np.linalg.solve(M, K), -np.linalg.solve(M, C)]), rtol=1e-15
    )
    np.testing.assert_array_equal(space.A[:2], [[0, 0, 1, 0], [0, 0, 0, 1]])
    assert space.states == ("1 displacement", "2 displacement", "1 velocity", "2 velocity")
    assert space.inputs == space.outputs == ("1", "2")
    assert not space.D.any()


@pytest.mark.parametrize(("quantity", "power"), [("displacement", 0), ("velocity", 1), ("acceleration", 2)])
def test_transfer_function_is_the_receptance(quantity, power):
    """C (s - A)^-1 B + D = s^power (s^2 M + s C + K)^-1, at a complex s (ISO 7626-1 names the three)."""
    system = System(mass=M, damping=C, gyroscopic=[[0, 0.7], [-0.7, 0]], stiffness=K)
    space = system.state_space(quantity=quantity)
    s = 0.3 + 2.2j
    found = space.C @ np.linalg.solve(s * np.eye(4) - space.A, space.B) + space.D
    np.testing.assert_allclose(found, s**power * receptance(system, s), rtol=1e-12)  # condition about 1e2
    assert space.D.any() == (quantity == "acceleration")


def test_chosen_inputs_and_outputs():
    system = System(mass=M, damping=C, stiffness=K)
    space = state_space(system, inputs=["2"], outputs=["1", "2"], quantity="acceleration")
    assert space.B.shape == (4, 1)
    assert space.outputs == ("1", "2")
    np.testing.assert_allclose(space.D, [[0.0], [1.0]], atol=1e-15)  # 1 / mass at the driven freedom


def test_massless_without_damping_follows_at_once():
    """A spring k1 to a massless point and k2 on to a mass: one mass on k1 k2 / (k1 + k2), in series."""
    system = System(mass=[[2.0, 0], [0, 0]], stiffness=[[3.0, -3.0], [-3.0, 9.0]])
    space = system.state_space()
    assert space.states == ("1 displacement", "1 velocity")
    np.testing.assert_allclose(space.A[1, 0], -(3.0 * 6.0 / 9.0) / 2.0, rtol=1e-15)
    np.testing.assert_allclose(space.D, np.diag([0, 1 / 9.0]), rtol=1e-15)
    with pytest.raises(ModelError, match="how fast the force changes"):
        system.state_space(quantity="velocity")
    np.testing.assert_allclose(  # watched where there is mass it is well defined
        system.state_space(inputs=["2"], outputs=["1"], quantity="acceleration").D,
        [[3.0 / 9.0 / 2.0]],
        rtol=1e-15,
    )


def test_massless_with_dashpot_is_a_lag():
    """Mass, spring, massless point, dashpot to ground (Maxwell element): one real eigenvalue more."""
    system = System(mass=[[1.0, 0], [0, 0]], damping=[[0, 0], [0, 3.0]], stiffness=[[5.0, -1.0], [-1.0, 1.0]])
    space = system.state_space()
    assert space.states == ("1 displacement", "1 velocity", "2 lag")
    characteristic = [3.0, 1.0, 15.0, 4.0]  # (s^2 + 5)(3 s + 1) - 1
    np.testing.assert_allclose(
        np.sort_complex(np.linalg.eigvals(space.A)), np.sort_complex(np.roots(characteristic)), rtol=1e-13
    )


def test_singular_mass_without_a_zero_row():
    """Both freedoms carry one and the same mass: one mode, w^2 = det K / (k11 + k22 - 2 k12)."""
    system = System(mass=[[1.0, 1.0], [1.0, 1.0]], stiffness=[[3.0, 1.0], [1.0, 2.0]])
    space = system.state_space()
    assert space.A.shape == (2, 2)
    np.testing.assert_allclose(np.abs(np.linalg.eigvals(space.A)) ** 2, (3 * 2 - 1) / (3 + 2 - 2), rtol=1e-14)


def test_nothing_holds_a_massless_motion():
    with pytest.raises(MatrixError, match="freedoms 1, 2 can move without mass, damping or stiffness"):
        System(mass=np.zeros((2, 2)), stiffness=[[1.0, -1.0], [-1.0, 1.0]]).state_space()


def test_velocity_forces_on_a_massless_motion():
    gyroscopic = [[0, 2.0], [-2.0, 0]]
    system = System(mass=[[1.0, 0], [0, 0]], gyroscopic=gyroscopic, stiffness=np.eye(2))
    with pytest.raises(MatrixError, match="velocities act on a motion without mass"):
        system.state_space()


@pytest.mark.parametrize(
    "law", [DampingLaw(ratio=0.03), DampingLaw(bands=((0.0, 0.5, 0.02), (0.3, 9.0, 0.01)))]
)
def test_damping_stated_by_mode_is_in_the_matrix(law):
    system = System(mass=M, damping=C, stiffness=K, damping_law=law)
    np.testing.assert_allclose(
        both(np.linalg.eigvals(system.state_space().A)[np.linalg.eigvals(system.state_space().A).imag > 0]),
        both(system.modes().eigenvalues), rtol=1e-12,
    )  # fmt: skip


@settings(max_examples=40, deadline=None)
@given(st.integers(1, 5), st.integers(0, 10**6), st.integers(0, 2))
def test_eigenvalues_are_those_of_the_modes(size, seed, massless):
    """Any positive system, with some freedoms without mass: both ways to the eigenvalues agree."""
    rng = np.random.default_rng(seed)
    mass, damping, stiffness = (a @ a.T for a in rng.standard_normal((3, size, size + 2)))
    mass[:massless], mass[:, :massless] = 0, 0
    system = System(mass=mass, damping=damping, stiffness=stiffness)
    modes = system.modes()
    found, expected = both(modes.eigenvalues), np.linalg.eigvals(system.state_space().A)
    assert len(found) == len(expected) == 2 * size - min(massless, size)
    # Within the condition number times the error of either method, below 1e-12 of the largest for 10 states.
    slack = 1e-12 * np.abs(expected).max() * np.maximum(modes.condition.max(), 1.0)
    assert np.abs(found[:, None] - expected).min(axis=1).max() <= slack
    assert np.abs(found - expected[:, None]).min(axis=1).max() <= slack


def test_direct_arrays():
    rate = np.array([[0.0, 1.0], [-4.0, -0.1]])
    space = StateSpace(rate)
    rate[0, 0] = 7.0
    assert space.A[0, 0] == 0.0
    assert space.B.shape == (2, 0)
    assert space.D.shape == (2, 0)
    np.testing.assert_array_equal(space.C, np.eye(2))
    assert StateSpace(rate, B=np.ones((2, 1))).D.shape == (2, 1)


@pytest.mark.parametrize(
    ("arrays", "error", "message"),
    [
        ({"A": np.ones((2, 3))}, ShapeError, "A: expected shape"),
        ({"A": np.ones(3)}, ShapeError, "A: .* Two dimensions"),
        ({"A": np.eye(2), "B": np.ones((3, 1))}, ShapeError, "B: expected shape"),
        ({"A": np.eye(2), "C": np.ones((1, 3))}, ShapeError, "C: expected shape"),
        ({"A": np.eye(2), "D": np.ones((3, 3))}, ShapeError, "D: expected shape"),
        ({"A": np.eye(2), "states": ("x",)}, ShapeError, "states: expected shape"),
        ({"A": np.array([[np.nan]])}, MatrixError, "A: nan at row 1, column 1"),
        ({"A": [["a"]]}, MatrixError, "A: real numbers"),
    ],
)
def test_arrays_that_do_not_fit(arrays, error, message):
    with pytest.raises(error, match=message):
        StateSpace(**arrays)


def test_quantity_is_one_of_three():
    with pytest.raises(ModelError, match="displacement, velocity or acceleration"):
        state_space(System(mass=M, stiffness=K), quantity="jerk")  # type: ignore[arg-type]
