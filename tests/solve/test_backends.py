"""Factorisations: every backend on every law, and what happens when one of them goes wrong."""

from __future__ import annotations

import numpy as np
import pytest
import scipy.sparse as sparse
from hypothesis import given, settings
from hypothesis import strategies as st

from tests.solve.lattices import box, lattice
from vib.solve.backends import choice, interface, pardiso
from vib.solve.backends.choice import BACKENDS, factor, upper_triangle
from vib.solve.backends.dissection import dissect
from vib.solve.backends.fronts import Fronts
from vib.solve.backends.interface import FactorError, TooLargeError
from vib.solve.backends.superlu import SuperLU

HERE = [
    pytest.param(
        name, marks=[] if name != "PARDISO" or pardiso.installed() else pytest.mark.skip("extra fast")
    )
    for name in BACKENDS
]
backends = pytest.mark.parametrize("backend", HERE)


def shifted(shift=0.0):
    """A held box whose eigenvalues are known, as K - shift M."""
    problem = box((9, 8, 12), (0.9, 0.8, 1.2))
    return sparse.csr_array(problem.stiffness - shift * problem.mass), problem


@backends
@pytest.mark.parametrize("below", [0, 1, 25, 300])
def test_solutions_and_inertia_of_a_shifted_box(backend, below):
    """The inertia of K - shift M is the number of eigenvalues below the shift (Sylvester's law)."""
    _, problem = shifted()
    edges = np.concatenate([[0.0], problem.values])
    place = below + int(np.argmax(np.diff(edges[below:]) > 1e-6 * edges[-1]))
    matrix, _ = shifted((edges[place] + edges[place + 1]) / 2)
    right = np.random.default_rng(3).standard_normal((matrix.shape[0], 5))
    with factor(matrix, symmetric=True, backend=backend) as made:
        assert made.backend == backend
        assert made.negative == place
        assert made.nonzeros > matrix.nnz / 2
        assert made.memory_bytes > 0
        solution = made.solve(right)
        one = made.solve(right[:, 0])
    size = abs(matrix).sum(axis=0).max() * np.abs(solution).max() + np.abs(right).max()
    assert np.abs(matrix @ solution - right).max() <= 1e-13 * size
    np.testing.assert_allclose(one, solution[:, 0], rtol=0, atol=1e-10 * np.abs(one).max())


@backends
def test_definite_matrices_may_say_so(backend):
    matrix, _ = shifted()
    with factor(matrix, symmetric=True, definite=True, backend=backend) as made:
        assert made.negative == 0


@backends
def test_new_numbers_in_the_same_pattern(backend):
    matrix, problem = shifted()
    middle = (problem.values[9] + problem.values[10]) / 2
    other, _ = shifted(middle)
    right = np.ones(matrix.shape[0])
    with factor(matrix, symmetric=True, backend=backend) as made:
        made.replace(upper_triangle(other))
        assert made.negative == int((problem.values < middle).sum())
        np.testing.assert_allclose(other @ made.solve(right), right, atol=1e-9)
        with pytest.raises(FactorError, match="pattern"):
            made.replace(upper_triangle(sparse.eye_array(matrix.shape[0])))


@backends
def test_a_released_factor_says_so(backend):
    with factor(shifted()[0], symmetric=True, backend=backend) as made:
        pass
    with pytest.raises(FactorError, match="released"):
        made.solve(np.ones(made.size))


@backends
def test_scaling_of_freedoms_changes_nothing(backend):
    """Units from metres to nanometres freedom by freedom: the inertia stays, the solution scales along."""
    matrix, _ = shifted(80.0)
    turn = sparse.diags_array(10.0 ** np.random.default_rng(0).integers(-9, 9, matrix.shape[0]))
    right = np.random.default_rng(1).standard_normal(matrix.shape[0])
    with (
        factor(matrix, symmetric=True, backend=backend) as plain,
        factor(sparse.csr_array(turn @ matrix @ turn), symmetric=True, backend=backend) as scaled,
    ):
        assert scaled.negative == plain.negative
        found = turn @ scaled.solve(turn @ right)
        np.testing.assert_allclose(found, plain.solve(right), rtol=1e-7, atol=1e-9 * np.abs(found).max())


@pytest.mark.parametrize("backend", [HERE[0], HERE[2]])
def test_unsymmetric_matrices(backend):
    matrix = shifted()[0].tolil()
    matrix[3, 40] += 0.5
    matrix = sparse.csr_array(matrix)
    right = np.random.default_rng(3).standard_normal((matrix.shape[0], 3))
    with factor(matrix, symmetric=False, backend=backend) as made:
        assert made.negative is None
        np.testing.assert_allclose(matrix @ made.solve(right), right, atol=1e-10)


@backends
def test_zeros_on_the_diagonal(backend):
    """Two masses tied by a multiplier: the last pivot only appears on the way."""
    matrix = sparse.csr_array([[2.0, 0.0, 1.0], [0.0, 3.0, -1.0], [1.0, -1.0, 0.0]])
    with factor(matrix, symmetric=True, backend=backend) as made:
        np.testing.assert_allclose(matrix @ made.solve(np.arange(3.0)), np.arange(3.0), atol=1e-13)


@backends
def test_a_row_of_zeros_is_refused(backend):
    with pytest.raises(FactorError, match="row of zeros"):
        factor(sparse.csr_array(np.diag([1.0, 0.0, 2.0])), symmetric=True, backend=backend)


def test_an_unknown_backend_is_named():
    with pytest.raises(ValueError, match="abacus"):
        factor(shifted()[0], symmetric=True, backend="abacus")


@pytest.mark.parametrize("broken", [Fronts, SuperLU])
def test_wrong_solutions_are_refined_or_refused(monkeypatch, broken):
    """Solutions off by 1e-6 are mended by refinement; off by 3 % they refuse the factorisation."""
    matrix = upper_triangle(shifted()[0])
    honest = broken._solve
    for error, refused in ((1e-6, False), (0.03, True)):
        monkeypatch.setattr(broken, "_solve", lambda self, b, error=error: honest(self, b) * (1 + error))
        if refused:
            with pytest.raises(FactorError, match="do not satisfy"):
                broken(matrix, **({} if broken is Fronts else {"symmetric": True}))
        else:
            made = broken(matrix, **({} if broken is Fronts else {"symmetric": True}))
            assert made.refinements > 0
            assert made.backward_error <= interface.ENOUGH


def test_the_next_library_takes_over(monkeypatch):
    monkeypatch.setattr("vib.solve.backends.choice.WORTH_DISSECTING", 10)
    monkeypatch.setattr(pardiso, "installed", lambda: False)
    assert factor(shifted()[0], symmetric=True).backend == Fronts.backend
    monkeypatch.setattr(Fronts, "_solve", lambda self, right: right)
    assert factor(shifted()[0], symmetric=True).backend == SuperLU.backend
    monkeypatch.setattr(SuperLU, "_solve", lambda self, right: right)
    with pytest.raises(FactorError, match=r"nested dissection: .* SuperLU: .* SuperLU: "):
        factor(shifted()[0], symmetric=True)


def test_what_does_not_fit_is_not_begun(monkeypatch):
    monkeypatch.setattr("vib.solve.backends.choice.WORTH_DISSECTING", 10)
    monkeypatch.setattr(pardiso, "installed", lambda: False)

    def too_much(backend, needed):
        raise TooLargeError(f"{backend}: {needed} bytes")

    monkeypatch.setattr("vib.solve.backends.fronts.check_memory", too_much)
    with pytest.raises(TooLargeError, match="nested dissection"):
        factor(shifted()[0], symmetric=True)


def test_memory_is_compared_with_what_is_free():
    interface.check_memory("any", 1.0)
    with pytest.raises(TooLargeError, match="coarser mesh"):
        interface.check_memory("any", 1e18)


def test_the_extra_is_recommended_where_it_pays(monkeypatch):
    monkeypatch.setattr(pardiso, "installed", lambda: False)
    monkeypatch.setattr("platform.machine", lambda: "x86_64")
    assert choice.extra_would_save(65_000, 40.0) == pytest.approx(40.0 * choice.EXTRA_SHARE)
    assert choice.extra_would_save(65_000, 1.0) is None
    assert choice.extra_would_save(500, 40.0) is None
    monkeypatch.setattr("platform.machine", lambda: "arm64")
    assert choice.extra_would_save(65_000, 40.0) is None
    monkeypatch.setattr("platform.machine", lambda: "AMD64")
    monkeypatch.setattr(pardiso, "installed", lambda: True)
    assert choice.extra_would_save(65_000, 40.0) is None


@pytest.mark.skipif(not pardiso.installed(), reason="extra fast")
def test_pardiso_gives_its_memory_back():
    """Twenty factorisations of 9 MB each, released: what the process holds does not grow by half of them."""
    import resource

    matrix = box((15, 15, 15)).stiffness
    held = []
    for _ in range(20):
        with factor(matrix, symmetric=True, backend="PARDISO") as made:
            size = made.memory_bytes
        held.append(resource.getrusage(resource.RUSAGE_SELF).ru_maxrss * 1024)
    assert held[-1] - held[2] < 9 * size


def test_a_free_structure_shows_a_pivot_near_round_off():
    matrix = lattice().stiffness
    for backend in (Fronts.backend, SuperLU.backend):
        with factor(matrix, symmetric=True, backend=backend) as made:
            assert made.smallest_pivot is not None
            assert made.smallest_pivot < 1e-12


# -- the order of elimination ----------------------------------------------------------------------------


def is_a_tree(found, size):
    assert sorted(found.order.tolist()) == list(range(size))
    assert found.starts[0] == 0
    assert found.starts[-1] == size
    numbers = np.arange(len(found.parents))
    return bool(((found.parents > numbers) | (found.parents == -1)).all())


@settings(max_examples=40, deadline=None)
@given(st.integers(1, 90), st.integers(0, 300), st.integers(0, 2**31), st.integers(2, 30))
def test_dissection_of_any_pattern(size, edges, seed, leaf):
    """Every block's equations touch later ones only in blocks above it in the tree."""
    random = np.random.default_rng(seed)
    rows, columns = random.integers(0, size, (2, edges))
    pattern = sparse.csr_array((np.ones(edges), (rows, columns)), shape=(size, size))
    whole = sparse.csr_array(pattern + pattern.T + sparse.eye_array(size))
    found = dissect(upper_triangle(whole), leaf)
    assert is_a_tree(found, size)
    block = np.repeat(np.arange(len(found.parents)), np.diff(found.starts))
    ahead: dict[int, set[int]] = {-1: set()}
    for b in range(len(found.parents) - 1, -1, -1):
        ahead[b] = {b} | ahead[int(found.parents[b])]
    moved = sparse.coo_array(whole[found.order][:, found.order])
    for i, j in zip(*moved.coords, strict=True):
        assert i > j or block[j] in ahead[block[i]]


def test_dissection_comes_near_minimum_degree():
    """On a box of 4,096 nodes: dense blocks, zeros inside them counted, against single entries of SuperLU.

    From about 10,000 nodes on the blocks hold less. Half the halving, or separators of twice the width, fail.
    """
    problem = box((17, 17, 17))
    upper = upper_triangle(problem.stiffness)
    assert Fronts(upper).nonzeros < 1.4 * SuperLU(upper, symmetric=True).nonzeros


def test_a_point_tied_to_everything_goes_last():
    """A body carried by every point of a box must not spoil the order of the rest."""
    matrix, _ = shifted()
    size = matrix.shape[0]
    tie = sparse.csr_array(np.ones((1, size)))
    whole = sparse.block_array([[matrix, tie.T], [tie, np.array([[1e3 * size]])]], format="csr")
    found = dissect(upper_triangle(whole))
    assert found.order[-1] == size
    with (
        factor(whole, symmetric=True, backend=Fronts.backend) as made,
        factor(matrix, symmetric=True, backend=Fronts.backend) as without,
    ):
        assert made.nonzeros < without.nonzeros + 3 * size
