"""A system checks its matrices and names what is wrong; directions by place, freedom and component."""

from __future__ import annotations

import numpy as np
import pytest
import scipy.sparse as sparse
from hypothesis import given, settings
from hypothesis import strategies as st

from vib.errors import MatrixError, ModelError, ShapeError, VibError
from vib.system import Freedom, System

EYE = np.eye(2)
SOFT = [[2.0, -1.0], [-1.0, 1.0]]


@pytest.mark.parametrize("form", [np.array, sparse.csr_array, sparse.csc_matrix, sparse.coo_array])
def test_accepts_any_matrix_and_leaves_it_alone(form):
    mass, stiffness = form(np.diag([2.0, 3.0])), form(np.array(SOFT))
    before = stiffness.copy()
    system = System(mass=mass, stiffness=stiffness)
    assert system.size == 2
    assert system.freedoms == (Freedom("1", ""), Freedom("2", ""))
    assert abs(stiffness - before).max() == 0
    if isinstance(stiffness, np.ndarray):
        stiffness[0, 0] = 99.0
        assert system.stiffness[0, 0] == 2.0  # a copy


@pytest.mark.parametrize("sparse_too", [False, True])
@pytest.mark.parametrize(
    ("matrices", "message"),
    [
        ({"stiffness": [[2, -1], [-1.1, 1]]}, r"stiffness: -1\.0 at row 1, column 2 but -1\.1 mirrored"),
        ({"mass": [[1, 0.1], [0.2, 1]]}, r"mass: 0\.1 at row 1, column 2 but 0\.2 mirrored"),
        ({"damping": [[1, 0.1], [0, 1]]}, "damping: 0.1 at row 1, column 2"),
        ({"gyroscopic": [[0, 1], [1, 0]]}, "gyroscopic: .* skew-symmetric"),
        ({"gyroscopic": [[1, 1], [-1, 0]]}, "gyroscopic: 1.0 at row 1, column 1"),
        ({"mass": [[1, 2], [2, 1]]}, "mass: 2.0 at row 1, column 2 .* indefinite"),
        ({"mass": [[1, 0], [0, -1]]}, "mass: -1.0 at row 2, column 2; a mass can't be negative"),
        ({"mass": [[0, 0.1], [0.1, 1]]}, "mass: 0.1 at row 1, column 2"),
        ({"mass": [[1, 0], [0, np.nan]]}, "mass: nan at row 2, column 2"),
        ({"stiffness": [[1, 0], [0, np.inf]]}, "stiffness: inf at row 2, column 2"),
        (
            {"mass": [[1, 0], [0, 0]], "stiffness": [[1, 0], [0, 0]]},
            "row 2, column 2 .* neither mass nor stiffness",
        ),
        ({"mass": EYE * 1j}, "mass: real numbers"),
    ],
)
def test_names_row_and_column(matrices, message, sparse_too):
    given_ = {"mass": EYE, "stiffness": SOFT, **matrices}
    if sparse_too:
        given_ = {name: sparse.csr_array(np.array(matrix)) for name, matrix in given_.items()}
    with pytest.raises(MatrixError, match=message):
        System(**given_)


def test_names_the_freedoms_of_row_and_column():
    freedoms = (Freedom("motor", "x"), Freedom("motor", "ry"))
    with pytest.raises(MatrixError, match=r"row 1 \(motor x\), column 2 \(motor ry\)"):
        System(mass=EYE, stiffness=[[1, 2], [3, 4]], freedoms=freedoms)


@pytest.mark.parametrize("size", [3, 700])
def test_indefinite_beyond_two_by_two(size):
    """No two rows contradict each other, three do: eigenvalue 1 - 2 * 0.9 of the leading block."""
    mass = np.eye(size)
    mass[:3, :3] = [[1, 0.9, -0.9], [0.9, 1, 0.9], [-0.9, 0.9, 1]]
    with pytest.raises(MatrixError, match=r"mass: indefinite; a motion mostly of row [123], column [123]"):
        System(mass=sparse.csr_array(mass), stiffness=sparse.eye_array(size))


@pytest.mark.parametrize(
    "shapes",
    [
        {"stiffness": np.eye(3)},
        {"stiffness": [1.0, 2.0]},
        {"mass": np.zeros((0, 0))},
        {"mass": np.ones((2, 3))},
        {"damping": np.eye(1)},
        {"freedoms": (Freedom("a", "x"),)},
    ],
)
def test_wrong_shapes(shapes):
    with pytest.raises(ShapeError, match="expected shape"):
        System(**{"mass": EYE, "stiffness": SOFT, **shapes})


@pytest.mark.parametrize("rubbish", ["abc", [[1, 2], [3]], None, [["a", "b"], ["c", "d"]]])
def test_rubbish_is_one_of_our_errors(rubbish):
    with pytest.raises(VibError):
        System(mass=rubbish, stiffness=SOFT)


def test_round_off_is_not_an_asymmetry():
    stiffness = np.array([[1e9, -1e3], [-1e3 * (1 + 4e-16), 1e9]])
    assert System(mass=EYE, stiffness=stiffness).stiffness[1, 0] == stiffness[1, 0]  # kept as it came


def test_declared_circulatory_stiffness():
    assert System(mass=EYE, stiffness=[[1, 5], [-5, 1]], unsymmetric=True).size == 2


def test_same_name_twice():
    with pytest.raises(ModelError, match="more than once"):
        System(mass=EYE, stiffness=SOFT, freedoms=(Freedom("a", "x"), Freedom("a", "x")))


def test_directions_of_bare_freedoms():
    freedoms = (Freedom("A", "x"), Freedom("A", "z"), Freedom("knob", ""))
    system = System(mass=np.eye(3), stiffness=np.eye(3), freedoms=freedoms)
    np.testing.assert_array_equal(system.direction("A", "-x"), [-1, 0, 0])
    np.testing.assert_array_equal(system.direction("knob"), [0, 0, 1])
    np.testing.assert_array_equal(system.direction("2"), [0, 1, 0])
    np.testing.assert_allclose(system.direction("A", (3.0, 0.0, 4.0)), [0.6, 0.8, 0.0], rtol=1e-15)
    np.testing.assert_allclose(system.direction("A", (3e300, 0.0, 4e300)), [0.6, 0.8, 0.0], rtol=1e-15)


@pytest.mark.parametrize(
    ("at", "along", "message"),
    [
        ("A", "q", "the component is one of"),
        ("A", (0, 0, 0), "not all zero"),
        ("A", (1, np.nan, 0), "finite"),
        ("A", (1, 2), "three"),
        ("A", "y", "no such place"),
        ("knbo", None, "did you mean 'knob'"),
    ],
)
def test_directions_that_are_none(at, along, message):
    system = System(mass=np.eye(2), stiffness=np.eye(2), freedoms=(Freedom("A", "x"), Freedom("knob", "")))
    with pytest.raises(ModelError, match=message):
        system.direction(at, along)


@settings(max_examples=40, deadline=None)
@given(st.integers(2, 6), st.integers(0, 10**6), st.integers(-12, 12))
def test_the_verdict_does_not_depend_on_units(size, seed, decade):
    """An asymmetry of one part in 1e9 of the diagonal is seen at any scale, round-off at none."""
    rng = np.random.default_rng(seed)
    root = rng.standard_normal((size, 2 * size))
    stiffness = root @ root.T * 10.0**decade
    stiffness = (stiffness + stiffness.T) / 2
    System(mass=np.eye(size), stiffness=stiffness)
    stiffness[0, 1] += 1e-9 * np.sqrt(stiffness[0, 0] * stiffness[1, 1])
    with pytest.raises(MatrixError, match="row 1, column 2"):
        System(mass=np.eye(size), stiffness=stiffness)


def consistent_rod(pieces):
    """Consistent mass of a rod of linear pieces, each with its own mass."""
    weights = np.random.default_rng(3).uniform(0.5, 2.0, pieces)
    main = np.zeros(pieces + 1)
    main[:-1] += weights / 3
    main[1:] += weights / 3
    return sparse.csr_array(sparse.diags_array([weights / 6, main, weights / 6], offsets=[-1, 0, 1]))


def test_a_well_conditioned_mass_is_accepted_without_a_factorisation(monkeypatch):
    def refuse(*_, **__):
        raise AssertionError("factorised")

    monkeypatch.setattr("scipy.sparse.linalg.splu", refuse)
    mass = consistent_rod(3000)
    System(mass=mass, stiffness=sparse.eye_array(3001, format="csr"))


@pytest.mark.parametrize("depth", [0.4, 1e-5])
def test_a_hidden_indefinite_block_of_a_large_mass_is_found(depth):
    """Three masses whose couplings are each possible and together are not: lowest eigenvalue -depth."""
    share = -(1 + depth) / 2
    mass = consistent_rod(3000).tolil()
    mass[1500:1503, :] = 0.0
    mass[:, 1500:1503] = 0.0
    mass[1500:1503, 1500:1503] = np.full((3, 3), share) + (1 - share) * np.eye(3)
    with pytest.raises(MatrixError, match=r"mass: indefinite; .* row 150[123], column 150[123]"):
        System(mass=mass.tocsr(), stiffness=sparse.eye_array(3001, format="csr"))


def test_a_large_mass_with_massless_freedoms_is_accepted():
    mass = consistent_rod(3000).tolil()
    mass[700:710, :] = 0.0
    mass[:, 700:710] = 0.0
    System(mass=mass.tocsr(), stiffness=sparse.eye_array(3001, format="csr"))
