"""Counts by the argument principle, and the reduced search with its proof, against dense solutions."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
import scipy.linalg
import scipy.sparse as sparse
from hypothesis import given, settings
from hypothesis import strategies as st

from vib.solve.localised import localise
from vib.solve.winding import Determinant, missing_within, widest_gap
from vib.system import DampingLaw, System

SIZE = 150


def chain(size=SIZE, *, free=False):
    stiffness = 2 * np.eye(size) - np.eye(size, k=1) - np.eye(size, k=-1)
    if free:
        stiffness[0, 0] = stiffness[-1, -1] = 1
    return np.diag(1 + 0.3 * np.sin(np.arange(size))), stiffness


def every(mass, linear, stiffness):
    """All eigenvalues by the first-order matrix (QR algorithm of LAPACK)."""
    size = len(mass)
    lower = [-np.linalg.solve(mass, part) for part in (stiffness, linear)]
    return scipy.linalg.eigvals(np.block([[np.zeros((size, size)), np.eye(size)], lower]))


@settings(max_examples=25, deadline=None)
@given(st.integers(0, 10**6), st.integers(5, 40), st.integers(0, 3), st.booleans())
def test_count_of_missing_zeros(seed, size, dropped, spinning):
    """Whatever is taken out of the list of zeros is missed: pairs, and one that was never there is told."""
    rng = np.random.default_rng(seed)
    mass, damping, stiffness = (root @ root.T + np.eye(size) for root in rng.standard_normal((3, size, size)))
    linear = 0.2 * damping + (lambda skew: skew - skew.T)(rng.standard_normal((size, size))) * spinning
    zeros = every(mass, linear, stiffness)
    zeros = zeros[np.lexsort((zeros.real, np.abs(zeros).round(9)))]
    sizes = np.abs(zeros)
    radius = widest_gap(sizes, size // 2, 0.0)
    assert radius is not None
    inside = np.flatnonzero((sizes < radius) & (zeros.imag > 0))
    gone = zeros[inside[:dropped]]
    known = zeros[[not np.isclose(np.concatenate([gone, gone.conj()]), zero).any() for zero in zeros]]
    heavy, moving, stiff = (sparse.csr_array(matrix) for matrix in (mass, linear, stiffness))
    determinant = Determinant(heavy, moving, stiff, np.zeros((size, 0)), np.zeros(0))
    assert missing_within(determinant.logarithm, known, radius) == 2 * len(gone)
    invented = np.concatenate([zeros, [-radius / 3]])
    assert missing_within(determinant.logarithm, invented, radius) == -1


def test_determinant_with_a_damping_law():
    """log det by sparse factors and the determinant lemma against the dense determinant."""
    mass, stiffness = chain(40)
    rng = np.random.default_rng(1)
    held, rates = rng.standard_normal((40, 3)), np.array([0.1, 2.0, 0.5])
    linear = np.diag(rng.uniform(0, 1, 40))
    heavy, moving, stiff = (sparse.csr_array(matrix) for matrix in (mass, linear, stiffness))
    found = Determinant(heavy, moving, stiff, held, rates)
    values = []
    for place in (0.3 + 0.7j, -0.2 + 0.1j, 1.5j):
        whole = place**2 * mass + place * (linear + (held * rates) @ held.T) + stiffness
        sign, size = np.linalg.slogdet(whole)
        values.append(np.exp(found.logarithm(place) - size) / sign)
    np.testing.assert_allclose(values, values[0].real, rtol=1e-10)  # one real constant for all places
    assert values[0].real > 0


CASES: dict[str, dict[str, Any]] = {
    "three dashpots": {"c": {3: 0.4, 70: 5.0, 120: 0.1}},
    "strong": {"c": {3: 0.4, 70: 500.0, 120: 50.0}},
    "beside Rayleigh damping": {"c": {3: 0.4, 70: 5.0}, "rayleigh": (0.01, 0.02)},
    "gyroscopic": {"g": {(50, 51): 3.0, (100, 101): 8.0}},
    "gyroscopic, damped, free": {"g": {(50, 51): 3.0}, "c": {20: 0.2}, "free": True},
    "free, gyroscopic": {"g": {(50, 51): 3.0}, "free": True},
    "circulatory": {"n": {(50, 51): 0.001}, "c": {50: 0.2}},
    "flutter": {"n": {(5, 7): 0.3}, "c": {50: 0.02}},
    "no mass behind dashpots": {"c": {3: 0.4, 70: 5.0}, "massless": (70, 100, 101)},
    "dashpots everywhere": {"c": {i: 0.01 * (1 + i % 3) for i in range(SIZE)}},
    "free": {"c": {3: 0.4, 70: 5.0}, "free": True},
}


@pytest.mark.parametrize("case", CASES)
def test_large_solvers_agree_with_all_modes(case):
    """The lowest modes of sparse matrices, proved complete, are the lowest of all modes computed densely."""
    given = CASES[case]
    mass, stiffness = chain(free=given.get("free", False))
    linear, skew, across = np.zeros((3, SIZE, SIZE))
    for i, value in given.get("c", {}).items():
        linear[i, i] = value
    for table, matrix in (("g", skew), ("n", across)):
        for (i, j), value in given.get(table, {}).items():
            matrix[i, j], matrix[j, i] = value, -value
    for i in given.get("massless", ()):
        mass[i, i] = 0.0
    alpha, beta = given.get("rayleigh", (0.0, 0.0))
    linear = linear + alpha * mass + beta * stiffness
    matrices = {"mass": mass, "damping": linear, "gyroscopic": skew, "stiffness": stiffness + across}
    twisted = bool(across.any())
    whole = System(**matrices, unsymmetric=twisted).modes()
    listed = {name: sparse.csr_array(part) for name, part in matrices.items()}
    found = System(**listed, unsymmetric=twisted).modes(count=14)
    assert found.rigid_body_count == whole.rigid_body_count
    assert found.complete_below_hz is not None
    assert found.complete_below_hz > found.frequencies_hz[-1]
    apart = np.abs(found.eigenvalues - whole.eigenvalues[: found.count])
    bars = 2 * np.pi * (found.errors_hz + whole.errors_hz[: found.count])
    slack = np.where(found.condition < 1e6, bars + 1e-12 * np.abs(found.eigenvalues), 1e-5)
    assert (apart <= slack).all()
    assert (apart <= 1e-8 * np.abs(found.eigenvalues)).all()
    assert (found.backward_errors <= 1e-10).all()
    assert (whole.backward_errors <= 1e-12).all()
    assert found.stable == whole.stable


def test_a_damping_law_beside_dashpots_is_proved_too():
    mass, stiffness = chain()
    damping = np.zeros((SIZE, SIZE))
    damping[3, 3], damping[70, 70] = 0.4, 5.0
    parts = {"mass": mass, "damping": damping, "stiffness": stiffness}
    found = System(
        **{name: sparse.csr_array(part) for name, part in parts.items()}, damping_law=DampingLaw(ratio=0.02)
    ).modes(count=10)
    assert found.complete_below_hz is not None
    assert any("argument principle" in remark for remark in found.remarks)


def test_localised_terms_are_put_together_again():
    """a M + b K + B L B' and the skew part of K, entry by entry."""
    mass, stiffness = (sparse.csr_array(part) for part in chain())
    rest = np.zeros((SIZE, SIZE))
    rest[3, 3], rest[10, 11], rest[11, 10] = 0.4, 2.0, -2.0
    across = np.zeros((SIZE, SIZE))
    across[30, 40], across[40, 30] = 0.1, -0.1
    linear = sparse.csr_array(0.01 * mass + 0.02 * stiffness + rest)
    term = localise(mass, linear, sparse.csr_array(stiffness + across))
    assert term is not None
    assert not term.symmetric
    basis = term.basis.toarray()
    shared = (term.mass_part * mass + term.stiffness_part * stiffness).toarray()
    np.testing.assert_allclose(shared, linear.toarray() - rest, atol=1e-13)
    np.testing.assert_allclose(basis @ term.linear @ basis.T, rest, atol=1e-12)
    np.testing.assert_allclose(basis @ term.constant @ basis.T, across, atol=1e-12)
