"""The undamped solvers: relative accuracy, laws, rigid-body modes, and the count of modes."""

from __future__ import annotations

import mpmath
import numpy as np
import pytest
import scipy.linalg
import scipy.sparse as sparse
from hypothesis import given, settings
from hypothesis import strategies as st

from vib.errors import MatrixError
from vib.solve.dense import dense_undamped
from vib.solve.factor import SingularFactorError, factorise, negative_count
from vib.solve.shift_invert import count_below, sparse_undamped
from vib.solve.undamped import EPS
from vib.system import System


def positive(rng, size):
    """A random positive definite matrix with unit diagonal and a condition number of about ten."""
    root = rng.standard_normal((size, 3 * size))
    matrix = root @ root.T
    scale = 1 / np.sqrt(np.diag(matrix))
    matrix = scale[:, None] * matrix * scale
    return (matrix + matrix.T) / 2


def grid(rows, columns, free=False):
    """Membrane of unit masses and springs, an edge held or all free: sparse, with many equal frequencies."""

    def line(count, held):
        matrix = 2 * np.eye(count) - np.eye(count, k=1) - np.eye(count, k=-1)
        if not held:
            matrix[0, 0] = matrix[-1, -1] = 1
        return sparse.csr_array(matrix)

    across, along = line(rows, not free), line(columns, not free)
    whole = sparse.kron(across, sparse.eye_array(columns)) + sparse.kron(sparse.eye_array(rows), along)
    return sparse.csr_array(sparse.eye_array(rows * columns)), sparse.csr_array(whole)


def grid_values(rows, columns, free=False):
    def line(count):
        angles = np.arange(count) * np.pi / count if free else np.arange(1, count + 1) * np.pi / (count + 1)
        return 4 * np.sin(angles / 2) ** 2

    return np.sort(np.add.outer(line(rows), line(columns)).ravel())


@pytest.mark.parametrize("decades", [0, 9, 18])
def test_relative_accuracy_of_graded_systems(decades):
    """Frequencies over 18 decades in one system, each to full relative accuracy, against 90 digits.

    K = D A D with A well conditioned determines every frequency to a small multiple of round-off
    (J. Demmel, K. Veselic, SIAM J. Matrix Anal. Appl. 13 (1992) 1204-1245), so 100 round-off units must do.
    """
    rng = np.random.default_rng(decades)
    size = 8
    grade = 10.0 ** rng.permutation(np.linspace(-decades / 2, decades / 2, size))
    mass, stiffness = positive(rng, size), grade[:, None] * positive(rng, size) * grade
    found = dense_undamped(mass, stiffness)
    with mpmath.workdps(90):
        inverse = mpmath.cholesky(mpmath.matrix(mass.tolist())) ** -1
        whole = inverse * mpmath.matrix(stiffness.tolist()) * inverse.T
        values = mpmath.eigsy((whole + whole.T) / 2, eigvals_only=True)
        exact = np.sort([float(mpmath.sqrt(value)) for value in values])
    np.testing.assert_allclose(found.angular, exact, rtol=100 * EPS)
    assert (np.abs(found.angular - exact) <= found.errors + EPS * exact).all()
    assert (found.errors <= 1e-13 * exact).all()


@settings(max_examples=30, deadline=None)
@given(st.integers(2, 8), st.integers(0, 10**6), st.integers(0, 3), st.integers(-8, 8))
def test_laws_of_the_undamped_problem(size, seed, released, decade):
    """Scaling, reordering, orthogonality, residuals and the number of rigid-body modes."""
    rng = np.random.default_rng(seed)
    springs = rng.standard_normal((size, max(size - released, 1)))  # rank size - released
    mass, stiffness = positive(rng, size), springs @ springs.T
    stiffness = (stiffness + stiffness.T) / 2
    found = dense_undamped(mass, stiffness)
    assert found.rigid == min(released, size - 1)
    np.testing.assert_allclose(found.shapes.T @ mass @ found.shapes, np.eye(size), atol=200 * EPS * size)
    residual = stiffness @ found.shapes - mass @ found.shapes * found.values
    assert np.abs(residual).max() <= 1e3 * EPS * np.abs(stiffness).max()
    slack = 2 * found.errors + 1e-13 * found.angular.max()

    together = dense_undamped(mass * 10.0**decade, stiffness * 10.0**decade)
    assert (np.abs(together.angular - found.angular) <= slack).all()
    assert together.rigid == found.rigid

    order = rng.permutation(size)
    moved = dense_undamped(mass[np.ix_(order, order)], stiffness[np.ix_(order, order)])
    assert (np.abs(moved.angular - found.angular) <= slack).all()

    units = 10.0 ** rng.integers(-6, 7, size)  # every freedom in a unit of its own
    other = dense_undamped(units[:, None] * mass * units, units[:, None] * stiffness * units)
    assert (np.abs(other.angular - found.angular) <= slack).all()
    assert other.rigid == found.rigid


def test_condensation_is_exact():
    """Freedoms without mass between springs in series, half of a chain: against the chain of the others."""
    size = 12
    stiffness = 2 * np.eye(size) - np.eye(size, k=1) - np.eye(size, k=-1)
    mass = np.diag(np.tile([0.0, 1.0], size // 2))
    # Two springs in series are one of half the stiffness; the last mass has one whole spring to ground.
    half = size // 2
    series = np.eye(half) - 0.5 * (np.eye(half, k=1) + np.eye(half, k=-1))
    series[-1, -1] = 1.5
    exact = np.sqrt(scipy.linalg.eigvalsh(series))
    found = dense_undamped(mass, stiffness)
    np.testing.assert_allclose(found.angular, exact, rtol=50 * EPS)
    assert found.shapes.shape == (size, half)


def test_indefinite_stiffness():
    found = dense_undamped(np.eye(3), np.diag([4.0, -1.0, 0.0]))
    np.testing.assert_array_equal(found.values, [0.0, -1.0, 4.0])
    assert found.rigid == 1


def test_massless_motion_without_equilibrium():
    with pytest.raises(MatrixError, match="pulled by the others"):
        dense_undamped(np.diag([1.0, 0.0]), np.array([[1.0, 1.0], [1.0, 0.0]]))


@pytest.mark.parametrize("free", [False, True])
def test_sparse_finds_repeated_frequencies(free):
    """A square membrane has nearly all its frequencies twice; the inertia count proves none is missing."""
    mass, stiffness = grid(24, 24, free)
    found = sparse_undamped(mass, stiffness, 15)
    exact = grid_values(24, 24, free)
    np.testing.assert_allclose(found.values, exact[:15], rtol=1e-11, atol=1e-15)
    assert found.rigid == int(free)
    assert found.certified is not None
    assert found.certified**2 < exact[15] + 1e-12
    errors = np.abs(found.angular - np.sqrt(exact[:15]))
    assert (errors <= found.errors + 1e-15).all()
    np.testing.assert_allclose(found.shapes.T @ found.shapes, np.eye(15), atol=1e-10)


def test_sparse_free_motion_without_any_stiffness():
    """A freedom that no spring touches, beside a held grid: rigid though its energy is only round-off."""
    stiffness = grid(20, 20)[1]
    stiffness = sparse.csr_array(sparse.block_diag([stiffness * 1e6, sparse.csr_array((1, 1))]))
    found = sparse_undamped(sparse.csr_array(sparse.eye_array(401)), stiffness, 4)
    assert found.rigid == 1
    np.testing.assert_allclose(found.values[1:], 1e6 * grid_values(20, 20)[:3], rtol=1e-11)


def test_sparse_with_a_cluster_at_the_cut():
    """Six equal chains side by side, cut within six equal frequencies: complete below them only."""
    one = 2 * np.eye(40) - np.eye(40, k=1) - np.eye(40, k=-1)
    stiffness = sparse.csr_array(sparse.block_diag([one] * 6))
    mass = sparse.csr_array(sparse.eye_array(240))
    exact = 2 * np.sin(np.arange(1, 41) * np.pi / 82)
    found = sparse_undamped(mass, stiffness, 8)
    np.testing.assert_allclose(found.angular, np.repeat(exact[:2], 6)[:8], rtol=1e-12)
    assert exact[0] < found.certified <= exact[1]


def test_sparse_with_massless_freedoms():
    mass, stiffness = grid(20, 20)
    light = mass.toarray()
    light[::3, ::3] = 0
    found = sparse_undamped(sparse.csr_array(light), stiffness, 6)
    dense = dense_undamped(light, stiffness.toarray())
    np.testing.assert_allclose(found.angular, dense.angular[:6], rtol=1e-11)


def test_sparse_indefinite():
    """A spring of the wrong sign: the negative value is among those nearest zero, and is counted."""
    mass, stiffness = grid(20, 20)
    stiffness = sparse.csr_array(stiffness - 0.05 * mass)
    found = sparse_undamped(mass, stiffness, 5)
    np.testing.assert_allclose(np.sort(found.values), grid_values(20, 20)[:5] - 0.05, rtol=1e-10)
    assert found.values[0] < 0


@settings(max_examples=30, deadline=None)
@given(st.integers(1, 12), st.integers(0, 10**6), st.booleans())
def test_inertia_is_that_of_the_eigenvalues(size, seed, as_sparse):
    """Sylvester's law: signs of the pivots count the signs of the eigenvalues."""
    rng = np.random.default_rng(seed)
    matrix = rng.standard_normal((size, size)) * 10.0 ** rng.integers(-4, 5, size)
    matrix = matrix + matrix.T
    values = np.linalg.eigvalsh(matrix)
    given_ = sparse.csr_array(matrix) if as_sparse else matrix
    if np.abs(values).min() > 1e-10 * np.abs(values).max():
        assert negative_count(given_) == (values < 0).sum()


def test_count_below():
    mass, stiffness = grid(15, 15)
    values = grid_values(15, 15)
    for number in (0, 1, 3, 11, 225):  # in gaps between (pairs of) equal values
        edge = np.sqrt((np.append(values, 9.0)[number] + np.append(0.0, values)[number]) / 2)
        assert count_below(mass, stiffness, edge) == number


@pytest.mark.parametrize("form", [np.asarray, sparse.csr_array])
def test_factor_solves_both_ways(form):
    rng = np.random.default_rng(5)
    matrix = positive(rng, 30) + np.triu(rng.standard_normal((30, 30)), 1)
    scale = 10.0 ** rng.integers(-5, 6, 30)
    matrix = scale[:, None] * matrix * scale
    factor = factorise(form(matrix), symmetric=False)
    right = rng.standard_normal((30, 3)) * scale[:, None]
    for transposed, operator in ((False, matrix), (True, matrix.T)):
        found = factor.solve(right, transposed=transposed)
        np.testing.assert_allclose(operator @ found / scale[:, None], right / scale[:, None], atol=1e-9)


@pytest.mark.parametrize("form", [np.asarray, sparse.csr_array])
def test_singular_factor(form):
    with pytest.raises(SingularFactorError, match="singular"):
        factorise(form(np.array([[1.0, 1.0], [1.0, 1.0]])))


@pytest.mark.parametrize("seed", range(5))
def test_soft_modes_that_the_entries_no_longer_hold_are_within_their_bars(seed):
    """Springs over twelve decades in a chain: the exact frequencies come from its flexibility min(c_i, c_j).

    The stiffness matrix adds neighbouring springs, which rounds the soft ones away; what is then called a
    rigid-body mode must own up to it.
    """
    springs = 10 ** np.random.default_rng(seed).uniform(0, 12, 120)
    reach = np.cumsum(1 / springs)
    exact = 1 / np.sqrt(scipy.linalg.eigvalsh(np.minimum.outer(reach, reach))[::-1][:6]) / (2 * np.pi)
    stiffness = (
        np.diag(springs + np.append(springs[1:], 0)) - np.diag(springs[1:], 1) - np.diag(springs[1:], -1)
    )
    for form in (np.asarray, sparse.csr_array):
        modes = System(mass=form(np.eye(120)), stiffness=form(stiffness)).modes(count=6)
        assert (np.abs(modes.frequencies_hz - exact) <= modes.errors_hz + 1e-9 * exact).all()
