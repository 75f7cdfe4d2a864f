"""Large undamped systems: closed forms, scipy.linalg.eigh, and searches that are made to miss something."""

from __future__ import annotations

import numpy as np
import pytest
import scipy.linalg
import scipy.sparse as sparse
from hypothesis import given, settings
from hypothesis import strategies as st

from tests.solve.lattices import box, lattice
from vib.errors import AccuracyError
from vib.progress import listening
from vib.solve import krylov
from vib.solve.backends import pardiso
from vib.solve.backends.choice import BACKENDS
from vib.solve.backends.interface import Factor
from vib.solve.bounds import Found, theta_bounds
from vib.solve.krylov import Ritz
from vib.solve.lanczos import lowest_modes
from vib.solve.undamped import Undamped
from vib.system import System

HERE = [name for name in BACKENDS if name != "PARDISO" or pardiso.installed()]


def dense_values(problem):
    return scipy.linalg.eigh(problem.stiffness.toarray(), problem.mass.toarray(), eigvals_only=True)


def check_shapes(problem, found):
    """Unit modal mass, orthogonal, and each shape satisfies its equation."""
    shapes = found.shapes
    np.testing.assert_allclose(shapes.T @ (problem.mass @ shapes), np.eye(len(found.values)), atol=1e-9)
    rest = problem.stiffness @ shapes - problem.mass @ shapes * found.values
    assert np.abs(rest).max() <= 1e-7 * np.abs(abs(problem.stiffness) @ np.abs(shapes)).max()


@pytest.mark.parametrize("backend", HERE)
def test_cube_with_pairs_and_triplets(backend):
    """Closed form in `lattices.bar`: 1, 3, 3, 1, 3, 6, ... equal values, all of them found and counted."""
    problem = box((12, 12, 12))
    found = lowest_modes(problem.mass, problem.stiffness, count=20, backend=backend)
    np.testing.assert_allclose(found.values, problem.values[:20], rtol=1e-9)
    exact = np.sqrt(problem.values[:20])
    assert (np.abs(found.angular - exact) <= found.errors + 1e-14 * exact).all()
    assert found.rigid == 0
    assert not found.complete
    assert found.certified is not None
    # the count was made between the last mode and the next different one
    counted = int((problem.values < found.certified**2).sum())
    assert 20 <= counted <= 24
    assert problem.values[counted] > problem.values[counted - 1] * (1 + 1e-6)
    check_shapes(problem, found)


@pytest.mark.parametrize("backend", HERE)
def test_all_modes_below_a_limit(backend):
    problem = box((11, 9, 12), (1.1, 0.9, 1.2), held=False)
    limit = float(np.sqrt(problem.values[30] * 0.999 + problem.values[29] * 0.001))
    found = lowest_modes(problem.mass, problem.stiffness, below=limit, backend=backend)
    assert len(found.values) == int((problem.values < limit**2).sum())
    assert found.rigid == 1
    assert found.values[0] == 0.0
    assert found.certified == limit
    np.testing.assert_allclose(found.values[1:], problem.values[1 : len(found.values)], rtol=1e-9)


def test_a_limit_with_nothing_below():
    problem = box((6, 6, 6))
    found = lowest_modes(problem.mass, problem.stiffness, below=1.0)
    assert len(found.values) == 0
    assert found.certified == 1.0


def test_a_large_system_with_no_mode_below_a_limit():
    """Through the public path, which used to look for what lies above no modes at all, without end."""
    problem = box((12, 11, 11))
    system = System(mass=problem.mass, stiffness=problem.stiffness)
    lowest = system.modes(count=1).frequencies_hz[0]
    found = system.modes(up_to=0.5 * lowest)
    assert found.count == 0
    assert found.complete_below_hz is not None
    assert found.complete_below_hz >= 0.5 * lowest


def test_a_limit_with_more_below_than_wanted():
    problem = box((8, 8, 8))
    found = lowest_modes(problem.mass, problem.stiffness, below=1e3, count=5)
    np.testing.assert_allclose(found.values, problem.values[:5], rtol=1e-9)


def test_a_limit_at_an_eigenvalue():
    problem = box((8, 7, 9), (1.0, 1.1, 1.3))
    found = lowest_modes(problem.mass, problem.stiffness, below=float(np.sqrt(problem.values[6])))
    assert len(found.values) in (6, 7)


@pytest.mark.parametrize("count", [3, 6, 15])
@pytest.mark.parametrize("free", [False, True])
def test_free_structure(count, free):
    problem = lattice()
    found = lowest_modes(problem.mass, problem.stiffness, count=count, free=free)
    assert found.rigid == min(count, 6)
    assert (found.values[: found.rigid] == 0).all()
    np.testing.assert_allclose(found.values[6:], dense_values(problem)[6:count], rtol=1e-9)
    check_shapes(problem, found)


def test_soft_mounts_are_not_rigid_motions():
    """Mounts 1e-12 as stiff as the structure: six modes of mounts, none at zero."""
    problem = lattice()
    mounted = problem.stiffness + sparse.diags_array(np.full(problem.mass.shape[0], 1e-6))
    found = lowest_modes(problem.mass, mounted, count=9)
    assert found.rigid == 0
    rigid_part = 300 * 1e-6 / problem.mass.diagonal().sum()  # translations: sum of springs over sum of masses
    np.testing.assert_allclose(np.sort(np.abs(found.values[:6] / rigid_part - 1))[0], 0, atol=1e-3)


def test_unequal_units():
    """A slow and a fast oscillator 18 orders apart in one system: both keep their digits."""
    problem = box((6, 6, 6))
    apart = sparse.csr_array(sparse.block_diag([problem.stiffness, [[3.9e-5]], [[3.9e13]]]))
    mass = sparse.csr_array(sparse.block_diag([problem.mass, [[1.0]], [[1.0]]]))
    found = lowest_modes(mass, apart, count=4)
    np.testing.assert_allclose(found.values[0], 3.9e-5, rtol=1e-10)
    np.testing.assert_allclose(found.values[1:], problem.values[:3], rtol=1e-9)


def test_freedoms_without_mass():
    problem = lattice(held=True)
    weights = problem.mass.diagonal().copy()
    weights[::4] = 0.0
    heavy = np.flatnonzero(weights)
    light = np.flatnonzero(weights == 0)
    whole = problem.stiffness.toarray()
    condensed = whole[np.ix_(heavy, heavy)] - whole[np.ix_(heavy, light)] @ np.linalg.solve(
        whole[np.ix_(light, light)], whole[np.ix_(light, heavy)]
    )
    exact = scipy.linalg.eigh(condensed, np.diag(weights[heavy]))
    mass = sparse.csr_array(sparse.diags_array(weights))
    found = lowest_modes(mass, problem.stiffness, count=12)
    np.testing.assert_allclose(found.values, exact[0][:12], rtol=1e-9)
    # no motion without mass is mixed into the shapes: the light freedoms are in static equilibrium
    force = (problem.stiffness @ found.shapes)[light]
    assert np.abs(force).max() <= 1e-8 * np.abs(abs(problem.stiffness) @ np.abs(found.shapes)).max()


def test_indefinite_stiffness():
    """Values below zero (a buckled structure) come first, none is missed."""
    problem = box((8, 8, 8))
    stiffness = sparse.csr_array(problem.stiffness - 150.0 * problem.mass)
    found = lowest_modes(problem.mass, stiffness, count=12)
    np.testing.assert_allclose(found.values, problem.values[:12] - 150.0, rtol=1e-9)


@settings(max_examples=30, deadline=None)
@given(
    size=st.integers(25, 90),
    seed=st.integers(0, 2**31),
    count=st.integers(1, 12),
    rank_lost=st.integers(0, 4),
    block=st.integers(1, 9),
)
def test_random_systems_against_dense(size, seed, count, rank_lost, block):
    """scipy.linalg.eigh on the same matrices, with up to four motions that store no energy."""
    random = np.random.default_rng(seed)
    links = sparse.random_array((size + 10, size), density=0.15, rng=random)
    turn = np.linalg.qr(random.standard_normal((size, size)))[0]
    weights = np.concatenate([np.zeros(rank_lost), random.uniform(1.0, 100.0, size - rank_lost)])
    stiffness = turn * weights @ turn.T
    mass = (links.T @ links).toarray() * 0.05 + np.diag(random.uniform(0.5, 2.0, size))
    exact = scipy.linalg.eigh(stiffness, mass, eigvals_only=True)
    found = lowest_modes(
        sparse.csr_array(mass), sparse.csr_array((stiffness + stiffness.T) / 2), count=count, block=block
    )
    assert found.rigid == min(rank_lost, count)
    np.testing.assert_allclose(found.values, np.maximum(exact[:count], 0), rtol=1e-9, atol=1e-10)


def test_more_modes_than_there_are():
    problem = lattice((2, 2, 2), held=True)
    found = lowest_modes(problem.mass, problem.stiffness, count=50)
    np.testing.assert_allclose(found.values, dense_values(problem), rtol=1e-9)
    assert found.complete


def test_restarts_change_nothing():
    problem = box((12, 11, 10))
    plain = lowest_modes(problem.mass, problem.stiffness, count=20)
    restarts = []
    kept = krylov.Krylov.restart

    def noted(self, ritz, chosen):
        restarts.append(len(chosen))
        kept(self, ritz, chosen)

    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(krylov.Krylov, "restart", noted)
        tight = lowest_modes(
            problem.mass, problem.stiffness, count=20, basis_bytes=8 * problem.mass.shape[0] * 72
        )
    assert len(restarts) >= 2
    np.testing.assert_allclose(tight.values, plain.values, rtol=1e-11)
    assert tight.certified == pytest.approx(plain.certified, rel=1e-2)


def test_a_basis_that_does_not_fit():
    problem = box((8, 8, 8))
    with pytest.raises(AccuracyError, match="ask for fewer modes"):
        lowest_modes(problem.mass, problem.stiffness, count=100, basis_bytes=1e4)


# -- searches that are made to miss something --------------------------------------------------------------


def two_boxes():
    """Two unconnected boxes; the second one's modes lie between those of the first."""
    first, second = box((7, 7, 7)), box((7, 7, 7), (1.05, 1.0, 1.02))
    mass = sparse.csr_array(sparse.block_diag([first.mass, second.mass]))
    stiffness = sparse.csr_array(sparse.block_diag([first.stiffness, second.stiffness]))
    values = np.sort(np.concatenate([first.values, second.values]))
    return mass, stiffness, values, first.mass.shape[0]


RANDOM = np.random.default_rng(5)


class HalfBlind:
    """Random numbers that leave out the second box on their first ``blind`` calls."""

    def __init__(self, cut, blind):
        self._random, self._cut, self._left = RANDOM, cut, blind

    def standard_normal(self, shape):
        found = self._random.standard_normal(shape)
        if self._left > 0:
            found[self._cut :] = 0.0
        self._left -= 1
        return found


def test_modes_that_the_start_does_not_see_are_found(monkeypatch):
    mass, stiffness, values, cut = two_boxes()
    monkeypatch.setattr(np.random, "default_rng", lambda _: HalfBlind(cut, 1))
    found = lowest_modes(mass, stiffness, count=10)
    np.testing.assert_allclose(found.values, values[:10], rtol=1e-9)
    assert found.certified is not None


@pytest.mark.parametrize("limits", [{"count": 10}, {"below": 12.0}])
def test_modes_that_stay_unseen_are_reported(monkeypatch, limits):
    mass, stiffness, _, cut = two_boxes()
    monkeypatch.setattr(np.random, "default_rng", lambda _: HalfBlind(cut, 10**6))
    with pytest.raises(AccuracyError, match=r"could not be found|did not converge") as caught:
        lowest_modes(mass, stiffness, **limits)
    assert caught.value.partial is not None


def test_a_mode_taken_away_is_missed_by_the_count(monkeypatch):
    """The certificate fails when the search hides one of the modes that it found."""
    problem = box((8, 8, 8), (1.0, 1.1, 1.3))
    honest = Found.of

    def without_third(cls, ritz, about):
        found = honest(ritz, about)
        keep = np.arange(len(found.order)) != 2
        return Found(
            found.ritz,
            found.order[keep],
            found.values[keep],
            found.bounds[keep],
            found.good[keep],
            found.everything,
        )

    monkeypatch.setattr(Found, "of", classmethod(without_third))
    with pytest.raises(AccuracyError, match="could not be found"):
        lowest_modes(problem.mass, problem.stiffness, count=6)


def test_a_mode_counted_too_few_is_a_contradiction(monkeypatch):
    problem = box((8, 8, 8), (1.0, 1.1, 1.3))
    honest = Factor._check

    def one_less(self):
        honest(self)
        if self.negative:
            self.negative -= 1

    monkeypatch.setattr(Factor, "_check", one_less)
    with pytest.raises(AccuracyError, match="neither can be trusted"):
        lowest_modes(problem.mass, problem.stiffness, count=6)


# -- progress and interruption -----------------------------------------------------------------------------


def test_progress_goes_up_and_time_left_is_told():
    problem = box((9, 9, 9))
    told = []
    with listening(lambda *said: told.append(said)):
        lowest_modes(problem.mass, problem.stiffness, count=12)
    assert told[0][0] == f"factorising {problem.mass.shape[0]} equations"
    told = [(share, left) for work, share, left in told if work == "searching modes"]
    shares = [share for share, _ in told]
    assert len(told) >= 3
    assert shares == sorted(shares)
    assert 0 <= shares[0] < shares[-1] <= 1
    assert all(left > 0 for _, left in told)


@pytest.mark.parametrize("backend", HERE)
def test_interruption_keeps_what_converged_and_frees_the_factor(monkeypatch, backend):
    problem = box((12, 12, 12))
    made, steps = [], []
    begin = Factor.__init__

    def noted(self, *arguments, **options):
        made.append(self)
        begin(self, *arguments, **options)

    monkeypatch.setattr(Factor, "__init__", noted)

    def stop(work, share, left):
        steps.append(share)
        if len(steps) == 9:  # in the midst of the search
            raise KeyboardInterrupt

    with listening(stop), pytest.raises(AccuracyError, match="Interrupted after") as caught:
        lowest_modes(problem.mass, problem.stiffness, count=20, backend=backend)
    partial = caught.value.partial
    assert isinstance(partial, Undamped)
    assert 0 < len(partial.values) < 20
    assert partial.certified is None
    np.testing.assert_allclose(partial.values, problem.values[: len(partial.values)], rtol=1e-9)
    assert len(made) == 1
    with pytest.raises(AccuracyError, match="released"):
        made[0].solve(np.ones(made[0].size))


def test_the_same_answer_every_time():
    problem = box((9, 9, 9))
    first, second = (
        lowest_modes(problem.mass, problem.stiffness, count=10, backend="SuperLU") for _ in range(2)
    )
    np.testing.assert_array_equal(first.values, second.values)
    np.testing.assert_array_equal(first.shapes, second.shapes)


def test_neither_count_nor_limit():
    problem = box((4, 4, 4))
    with pytest.raises(ValueError, match="count, below or both"):
        lowest_modes(problem.mass, problem.stiffness)


# -- bounds --------------------------------------------------------------------------------------------------


@settings(max_examples=60, deadline=None)
@given(st.integers(4, 30), st.integers(0, 2**31), st.integers(2, 12), st.floats(-8, -5))
def test_bounds_cover_the_errors_of_projections(size, seed, part, blur):
    """A matrix projected on slightly turned eigenvectors of its largest eigenvalues, none too close."""
    random = np.random.default_rng(seed)
    part = min(part, size - 2)
    values = np.cumsum(random.uniform(0.05, 1.0, size))
    vectors = np.linalg.qr(random.standard_normal((size, size)))[0]
    matrix = vectors * values @ vectors.T
    basis = np.linalg.qr(vectors[:, -part:] + 10**blur * random.standard_normal((size, part)))[0]
    theta, weights = scipy.linalg.eigh(basis.T @ matrix @ basis)
    residuals = np.linalg.norm(matrix @ basis @ weights - basis @ weights * theta, axis=0)
    bounds = theta_bounds(Ritz(theta, weights, residuals))
    errors = np.abs(theta - values[-part:])
    assert (errors <= bounds + 1e-13).all()
    assert bounds[-1] < residuals[-1] / 10  # the square counts where the gap is known


def test_a_fast_growing_motion_far_from_the_slowest_is_named():
    """A chain with one spring of the wrong sign: one eigenvalue near -1.6 among slow ones of 1e-6."""
    size = 3000
    stiffness = sparse.diags_array(
        [-np.ones(size - 1), 2.0 * np.ones(size), -np.ones(size - 1)], offsets=[-1, 0, 1]
    ).tolil()
    stiffness[500, 500] -= 3.0
    with pytest.raises(
        AccuracyError, match=r"negative in 1 directions, so the system is UNSTABLE.* wrong sign"
    ):
        lowest_modes(sparse.eye_array(size, format="csr"), sparse.csr_array(stiffness), count=5)
