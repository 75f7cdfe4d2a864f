"""Frequency response: against a solve per line, laws, bounds of what is left out, and what is refused."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
import scipy.sparse as sparse
from hypothesis import given, settings
from hypothesis import strategies as st

import vib.response.receptance as receiving
from vib.errors import AccuracyError, ModelError
from vib.response.frequency import frequency_response
from vib.system import DampingLaw, System


def solved(system, lines, law=None):
    """Receptance by a solve per line; the damping law, if any, through all undamped modes."""
    found = []
    damping = np.zeros((system.size, system.size))
    for matrix in (system.damping, system.gyroscopic):
        if matrix is not None:
            damping = damping + (matrix.toarray() if sparse.issparse(matrix) else matrix)
    mass, stiffness = (
        m.toarray() if sparse.issparse(m) else np.asarray(m) for m in (system.mass, system.stiffness)
    )
    if law:
        squares, shapes = np.linalg.eigh(stiffness)  # unit masses only
        damping = damping + shapes @ np.diag(2 * law * np.sqrt(np.maximum(squares, 0))) @ shapes.T
    for omega in 2 * np.pi * np.asarray(lines):
        found.append(np.linalg.inv(stiffness - omega**2 * mass + 1j * omega * damping))
    return np.array(found)


def chain(size, held=True, damping=None, law=0.0, masses=None):
    stiffness = 1e4 * (2 * np.eye(size) - np.eye(size, k=1) - np.eye(size, k=-1))
    stiffness[-1, -1] = 1e4
    if not held:
        stiffness[0, 0] = 1e4
    return System(
        mass=sparse.csr_array(np.diag(np.ones(size) if masses is None else masses)),
        stiffness=sparse.csr_array(stiffness),
        damping=None if damping is None else sparse.csr_array(damping),
        damping_law=DampingLaw(ratio=law),
    )


def dashpots(size, places=(1, 4), strength=80.0):
    found = np.zeros((size, size))
    for place in places:
        found[place, place] = strength
    return found


LINES = np.linspace(0.3, 35.0, 40)
CASES = {
    "undamped": lambda: chain(9),
    "ratio": lambda: chain(9, law=0.02),
    "rayleigh": lambda: chain(9, damping=0.4 * np.eye(9) + 1e-4 * chain(9).stiffness.toarray()),
    "dashpots": lambda: chain(9, damping=dashpots(9)),
    "dashpots and a ratio": lambda: chain(9, damping=dashpots(9), law=0.01),
    "free": lambda: chain(9, held=False, damping=dashpots(9)),
    "free, undamped": lambda: chain(9, held=False),
    "massless": lambda: chain(9, masses=[1, 0, 1, 1, 0, 1, 1, 1, 1.0]),
    "massless with a dashpot": lambda: chain(9, masses=[1, 0, 1, 1, 1, 1, 1, 1, 1.0], damping=dashpots(9)),
    "gyroscopic": lambda: System(
        mass=np.eye(4),
        stiffness=1e4 * np.diag([1.0, 1.2, 2.0, 2.5]),
        damping=np.diag([3.0, 2.0, 1.0, 0.5]),
        gyroscopic=40 * np.kron(np.eye(2), [[0, 1.0], [-1, 0]]),
    ),
    "circulatory": lambda: System(
        mass=np.eye(2),
        stiffness=np.array([[2e4, 3e3], [-3e3, 3e4]]),
        damping=np.diag([20.0, 30.0]),
        unsymmetric=True,
    ),
    "full damping": lambda: System(
        mass=np.eye(5),
        stiffness=1e4 * np.diag(np.arange(1.0, 6)),
        damping=np.eye(5) + 3 * np.ones((5, 5)) + np.diag(np.arange(5.0)),
    ),
}
LAWS = {"ratio": 0.02, "dashpots and a ratio": 0.01}


@pytest.mark.parametrize("name", CASES)
def test_residues_agree_with_a_solve_per_line(name):
    system = CASES[name]()
    found = frequency_response(system, lines_hz=LINES)
    wanted = solved(system, LINES, LAWS.get(name))
    top = np.abs(wanted).max(axis=(1, 2), keepdims=True)
    assert (np.abs(found.receptance - wanted) / top).max() < 1e-10
    assert not found.error.any()
    assert found.stable


@settings(max_examples=25, deadline=None)
@given(seed=st.integers(0, 10**6), size=st.integers(2, 12), strong=st.floats(0.1, 1e4))
def test_reciprocity_and_solves_for_random_dashpots(seed, size, strong):
    """The receptance of a symmetric system is symmetric (Maxwell, Betti); dashpots of any strength."""
    random = np.random.default_rng(seed)
    damping = np.zeros((size, size))
    direction = random.normal(size=size)
    damping += strong * np.outer(direction, direction)
    system = chain(size, damping=damping)
    lines = random.uniform(0.1, 40, 6)
    found = frequency_response(system, lines_hz=lines).receptance
    wanted = solved(system, lines)
    top = np.abs(wanted).max(axis=(1, 2), keepdims=True)
    assert (np.abs(found - np.swapaxes(found, 1, 2)) / top).max() < 1e-9
    assert (np.abs(found - wanted) / top).max() < 1e-8


def test_a_line_at_an_undamped_frequency_of_a_system_with_dashpots():
    """The sum over undamped modes is infinite there, the response is not."""
    system = chain(9, damping=dashpots(9))
    bare = System(mass=system.mass, stiffness=system.stiffness).modes()
    lines = np.concatenate([bare.frequencies_hz, bare.frequencies_hz * (1 + 1e-7)])
    found, wanted = frequency_response(system, lines_hz=lines).receptance, solved(system, lines)
    top = np.abs(wanted).max(axis=(1, 2), keepdims=True)
    assert (np.abs(found - wanted) / top).max() < 1e-9


def test_mobility_and_accelerance_follow_from_receptance():
    """ISO 7626-1: velocity and acceleration per force."""
    found = frequency_response(chain(4, law=0.01), lines_hz=LINES)
    turn = 2j * np.pi * LINES[:, None, None]
    np.testing.assert_allclose(found.mobility, turn * found.receptance)
    np.testing.assert_allclose(found.accelerance, turn**2 * found.receptance)


@pytest.mark.parametrize("law", [0.0, 0.01])
@pytest.mark.parametrize("kind", ["plain", "rayleigh", "dashpots"])
@pytest.mark.parametrize("held", [True, False])
def test_what_is_left_out_is_within_its_bound(monkeypatch, held, kind, law):
    """A tenth of the modes and a power series, against all modes; 1e-10 for rounding."""
    size = 150
    damping = None
    if kind == "rayleigh":
        damping = 0.5 * np.eye(size) + 1e-5 * chain(size, held).stiffness.toarray()
    if kind == "dashpots":
        damping = dashpots(size, (2, 70, 71))
    system = chain(size, held, damping, law)
    arguments: dict[str, Any] = {
        "lines_hz": np.linspace(0.5, 3.0, 60),
        "inputs": ["1", "60"],
        "outputs": ["1", "60", "149"],
    }
    whole = frequency_response(system, **arguments)
    monkeypatch.setattr(receiving, "ALL_MODES", 50)
    cut = frequency_response(system, **arguments)
    assert "flexibility of the others" in cut.method
    top = np.abs(whole.receptance).max()
    gap = np.abs(cut.receptance - whole.receptance)
    assert (gap <= cut.error + 1e-10 * top).all()
    assert cut.error.max() < (0.1 if law else 1e-6) * top
    assert any("(a bound)" in remark for remark in cut.remarks)
    if law:  # a bound that is never come near would be worth little
        assert (gap / cut.error).max() > 0.05


def test_modes_that_do_not_reach_far_enough_are_refused(monkeypatch):
    monkeypatch.setattr(receiving, "ALL_MODES", 50)
    monkeypatch.setattr(receiving, "BEYOND", 0.9)
    with pytest.raises(ModelError, match="do not reach beyond"):
        frequency_response(chain(150), lines_hz=[3.0], inputs=["1"], outputs=["1"])


def test_the_estimate_where_no_bound_is_known(monkeypatch):
    monkeypatch.setattr(receiving, "ALL_MODES", 50)
    monkeypatch.setattr(receiving, "_MOST_STATES_BY_POLES", 100)
    size = 120
    damping = np.diag(np.random.default_rng(1).uniform(1, 5, size))
    monkeypatch.setattr(receiving, "localise", lambda *_: None)
    arguments: dict[str, Any] = {"lines_hz": np.linspace(0.5, 2.0, 20), "inputs": ["1"], "outputs": ["60"]}
    found = frequency_response(chain(size, damping=damping), **arguments)
    wanted = solved(chain(size, damping=damping), arguments["lines_hz"])[:, 59, 0]
    gap = np.abs(found.receptance[:, 0, 0] - wanted)
    assert gap.max() < 1e-2 * np.abs(wanted).max()
    assert (gap <= found.error[:, 0, 0]).all()
    assert any("estimate" in remark for remark in found.remarks)


@pytest.mark.parametrize(
    ("system", "lines", "kind", "message"),
    [
        (lambda: chain(3, held=False), [0.0], ModelError, "at 0 Hz nothing holds"),
        (lambda: System(mass=[[1.0]], stiffness=[[(2 * np.pi) ** 2]]), [1.0], AccuracyError, "exactly a nat"),
        (lambda: chain(3), [-1.0], ModelError, "not negative"),
        (lambda: chain(3), [], ModelError, "one row of frequencies"),
        (lambda: chain(3), [np.nan], ModelError, "finite"),
    ],
)
def test_lines_that_have_no_answer(system, lines, kind, message):
    with pytest.raises(kind, match=message):
        frequency_response(system(), lines_hz=lines)


@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        ({"inputs": []}, "at least one"),
        ({"inputs": ["1", "1"]}, "more than once"),
        ({"inputs": ["1"], "ground": ["x"]}, "contradict"),
        ({"ground": ["x"], "outputs": ["1"]}, "needs a structure"),
        ({"ground": ["up"], "outputs": ["1"]}, "ground: one of x"),
        ({"inputs": ["nothing"]}, "nothing"),
    ],
)
def test_channels_that_do_not_exist(arguments, message):
    with pytest.raises(ModelError, match=message):
        frequency_response(chain(3), lines_hz=[1.0], **arguments)


UNSTABLE = {
    "negative damping": System(mass=[[1.0]], stiffness=[[100.0]], damping=[[-0.5]]),
    "negative dashpot": chain(5, damping=dashpots(5, (2,), -3.0)),
    "negative stiffness": System(mass=np.eye(2), stiffness=np.diag([100.0, -5.0]), damping=np.eye(2)),
    "flutter": System(mass=np.eye(2), stiffness=np.array([[100.0, 50], [-50, 100]]), unsymmetric=True),
}


@pytest.mark.parametrize("name", UNSTABLE)
def test_an_unstable_system_is_never_fine(name):
    found = frequency_response(UNSTABLE[name], lines_hz=[0.7])
    assert not found.stable
    assert "UNSTABLE" in found.remarks[0]


def test_responses_that_are_rounding_are_said_to_be():
    """Far above all its frequencies a chain hardly passes anything on."""
    found = frequency_response(chain(40), lines_hz=[1.0, 200.0], inputs=["1"], outputs=["40"])
    assert any("rounding as much as response" in remark for remark in found.remarks)
    near = frequency_response(chain(40), lines_hz=[1.0, 2.0], inputs=["1"], outputs=["1"])
    assert not any("rounding" in remark for remark in near.remarks)


def test_growth_beyond_the_modes_of_a_response_is_told():
    """Rayleigh damping that turns negative above the lines asked for; and the ring of few modes."""
    side = 42
    line = sparse.diags_array(
        [4.0 * np.ones(side), -np.ones(side - 1), -np.ones(side - 1)], offsets=[0, 1, -1]
    )
    beside = sparse.diags_array([-np.ones(side - 1), -np.ones(side - 1)], offsets=[1, -1])
    one = sparse.eye_array(side)
    stiffness = sparse.csr_array(sparse.kron(one, line) + sparse.kron(beside, one))
    mass = sparse.eye_array(side * side).tocsr()
    for part, stable in ((-4e-3, False), (4e-3, True)):
        system = System(mass=mass, stiffness=stiffness, damping=1e-2 * mass + part * stiffness)
        found = system.frequency_response(lines_hz=[0.01, 0.02], inputs=[("3", None)], outputs=[("3", None)])
        assert found.stable is stable
        ring = system.ring(impulse=1.0, at="3", times=np.linspace(0, 5, 20), watch=[("3", None)])
        assert ring.stable is stable
        assert any("unstable" in remark for remark in ring.remarks) is not stable
