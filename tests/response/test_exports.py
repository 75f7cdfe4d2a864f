"""Poles, zeros, residues and files of a state space, against closed forms and SciPy."""

from __future__ import annotations

import numpy as np
import pytest
import scipy.signal
from hypothesis import given, settings
from hypothesis import strategies as st

import vib
from vib.errors import AccuracyError, ModelError
from vib.response.exports import reduced_state_space
from vib.response.signals import Constant


def chain(size, damping=0.3):
    stiffness = 1e4 * (2 * np.eye(size) - np.eye(size, k=1) - np.eye(size, k=-1))
    return vib.System(
        mass=np.diag(np.linspace(1, 2, size)), stiffness=stiffness, damping=np.diag(damping * np.ones(size))
    )


@settings(max_examples=20, deadline=None)
@given(size=st.integers(2, 12), place=st.integers(0, 11))
def test_zeros_at_a_driving_point_are_the_poles_with_that_point_held(size, place):
    """J. P. Den Hartog's reading of an antiresonance: the rest swings as if the driven mass were held."""
    place %= size
    system = chain(size)
    name = str(place + 1)
    found = system.state_space(inputs=[name], outputs=[name]).zeros()
    kept = np.delete(np.arange(size), place)
    parts = {key: getattr(system, key)[np.ix_(kept, kept)] for key in ("mass", "stiffness", "damping")}
    held = vib.System(**parts).state_space().poles()
    np.testing.assert_allclose(np.sort(np.abs(found)), np.sort(np.abs(held)), rtol=1e-8)


def test_zeros_follow_from_what_is_watched():
    """Velocity adds one zero at 0, acceleration two; a plain spring between two masses has none."""
    system = vib.System(mass=np.diag([1.0, 2.0]), stiffness=np.array([[300.0, -100], [-100, 150]]))
    counts = []
    for quantity in ("displacement", "velocity", "acceleration"):
        found = system.state_space(inputs=["1"], outputs=["1"], quantity=quantity).zeros()
        counts.append((np.abs(found) < 1e-4).sum())
        np.testing.assert_allclose(np.abs(found).max(), np.sqrt(150 / 2), rtol=1e-10)
    assert counts == [0, 1, 2]
    assert system.state_space(inputs=["1"], outputs=["2"]).zeros().size == 0


def test_zeros_that_rounding_decides_are_refused():
    """k + c s in each of 29 links: a zero of multiplicity 29, far beyond the poles."""
    size = 30
    stiffness = 1e6 * (2 * np.eye(size) - np.eye(size, k=1) - np.eye(size, k=-1))
    system = vib.System(mass=np.eye(size), stiffness=stiffness, damping=1e-5 * stiffness)
    with pytest.raises(AccuracyError, match="so sensitive"):
        system.state_space(inputs=["1"], outputs=["30"]).zeros()


def test_zeros_need_as_many_outputs_as_inputs():
    with pytest.raises(ModelError, match="as many inputs as outputs"):
        chain(3).state_space(inputs=["1"]).zeros()
    with pytest.raises(AccuracyError, match="every s is a zero"):
        vib.StateSpace(-np.eye(2), np.array([[1.0], [0]]), np.array([[0.0, 1]])).zeros()


def test_poles_are_eigenvalues_by_size():
    space = chain(5).state_space()
    found = space.poles()
    np.testing.assert_allclose(np.sort_complex(found), np.sort_complex(np.linalg.eigvals(space.A)), rtol=1e-9)
    assert (np.diff(np.abs(found)) >= -1e-9).all()


@settings(max_examples=15, deadline=None)
@given(size=st.integers(1, 6), omega=st.floats(1, 300))
def test_residues_sum_up_to_the_transfer_matrix(size, omega):
    space = chain(size).state_space(quantity="acceleration")
    poles, residues = space.residues()
    found = (residues / (1j * omega - poles)[:, None, None]).sum(axis=0) + space.D
    wanted = space.C @ np.linalg.solve(1j * omega * np.eye(2 * size) - space.A, space.B) + space.D
    np.testing.assert_allclose(found, wanted, atol=1e-9 * np.abs(wanted).max())


def test_poles_that_can_not_be_told_apart_have_no_residues():
    with pytest.raises(AccuracyError, match="no residues of their own"):
        vib.System(mass=[[1.0]], damping=[[4.0]], stiffness=[[4.0]]).state_space().residues()


def test_scipy_gets_the_same_model():
    space = chain(4).state_space(inputs=["1"], outputs=["3"])
    times, answer = scipy.signal.step(space.to_scipy(), T=np.linspace(0, 2, 201))
    ours = space.simulate([Constant(1.0)], step_s=times[1], count=201)[:, 0]
    np.testing.assert_allclose(answer, ours, atol=1e-9 * np.abs(ours).max())


def test_a_saved_model_reads_back(tmp_path):
    space = chain(3).state_space(inputs=["2"])
    path = space.save(tmp_path / "model.npz")
    with np.load(path, allow_pickle=False) as read:
        for name in "ABCD":
            np.testing.assert_array_equal(read[name], getattr(space, name))
        assert read["outputs"].tolist() == ["1", "2", "3"]
        assert str(read["units"]).startswith("SI")
    with pytest.raises(ModelError, match=r"end in \.npz"):
        space.save(tmp_path / "model.mat")


@pytest.mark.parametrize("quantity", ["displacement", "velocity", "acceleration"])
def test_a_reduced_model_answers_as_the_complete_one_at_low_frequency(quantity):
    """At 0 Hz exactly; near the third mode the rest is off by its flexibility times (f3 / f9)^4, 1 %."""
    system = chain(40, np.eye(40)[0])  # one dashpot
    whole = system.state_space(inputs=["7"], outputs=["30"], quantity=quantity)
    small = reduced_state_space(system, 8, ["7"], ["30"], quantity)
    assert len(small.A) < 24
    low = 0.95 * 2 * np.pi * float(system.modes().frequencies_hz[2])
    for omega, rtol in ((0.0, 1e-9), (low, 2e-4)):
        answers = [
            model.C @ np.linalg.solve(1j * omega * np.eye(len(model.A)) - model.A, model.B) + model.D
            for model in (small, whole)
        ]
        atol = 1e-9 * np.abs(whole.C).max()
        np.testing.assert_allclose(answers[0], answers[1], rtol=rtol, atol=atol if omega == 0 else 0)
    assert small.inputs == ("7",)
