"""Growing motions beyond the modes asked for, and damping that only takes energy out."""

from __future__ import annotations

import numpy as np
import pytest
import scipy.sparse as sparse
from hypothesis import example, given, settings
from hypothesis import strategies as st

from vib.solve.dense import dense_undamped
from vib.solve.stability import is_passive
from vib.system import System

SIZE = 130


def chain():
    stiffness = 2 * np.eye(SIZE) - np.eye(SIZE, k=1) - np.eye(SIZE, k=-1)
    return np.diag(1 + 0.3 * np.sin(np.arange(SIZE))), stiffness


@pytest.mark.parametrize("form", [np.array, sparse.csr_array])
@pytest.mark.parametrize("fault", ["circulatory", "dashpot", "spring", "spring and dashpot"])
def test_what_grows_beyond_the_modes_asked_for_is_told(form, fault):
    """The system is unstable as all its eigenvalues say, though the five slowest modes are not."""
    mass, stiffness = chain()
    damping = np.zeros((SIZE, SIZE))
    if fault == "circulatory":
        stiffness[50, 52], stiffness[52, 50] = 0.3, -0.3
    if fault == "dashpot":
        damping[50, 50], damping[3, 3] = -0.02, 1e-4
    if fault.startswith("spring"):
        stiffness[70, 70] -= 5.0
    if fault.endswith("and dashpot"):
        damping[3, 3] = 2.0
    turned = fault == "circulatory"
    whole = System(mass=mass, stiffness=stiffness, damping=damping, unsymmetric=turned).modes()
    parts = {"mass": form(mass), "stiffness": form(stiffness), "damping": form(damping)}
    found = System(**parts, unsymmetric=turned).modes(count=5)
    assert not whole.stable
    assert not found.stable
    assert found.stability_known


def test_too_large_to_be_sure():
    """Circulatory forces in a system too large for all eigenvalues: stability is not claimed."""
    size = 900
    stiffness = sparse.diags_array(
        [2.0 * np.ones(size), -np.ones(size - 1), -np.ones(size - 1)], offsets=[0, 1, -1]
    )
    across = sparse.coo_array(([1e-9, -1e-9], ([50, 52], [52, 50])), shape=(size, size))
    found = System(
        mass=sparse.eye_array(size), stiffness=sparse.csr_array(stiffness + across), unsymmetric=True
    ).modes(count=4)
    assert not found.stability_known
    assert any("not proved" in remark for remark in found.remarks)


@settings(max_examples=40, deadline=None)
@example(seed=7, rank=1, spoiled=0)  # a dashpot much smaller than the gyroscopic entries beside it
@given(seed=st.integers(0, 10**6), rank=st.integers(1, 12), spoiled=st.integers(0, 4))
def test_passive_damping(seed, rank, spoiled):
    """Sums of dashpots in any direction are passive, no row need be dominant; a minus sign spoils it."""
    rng = np.random.default_rng(seed)
    directions = rng.standard_normal((20, rank))
    mass, stiffness = np.eye(20), np.eye(20)
    undamped = dense_undamped(mass, stiffness)
    skew = rng.standard_normal((20, 20))
    damping = directions @ directions.T + skew - skew.T
    assert is_passive(damping, undamped)
    assert is_passive(sparse.csr_array(damping), undamped)
    if spoiled:
        away = rng.standard_normal(20)
        away -= directions @ np.linalg.lstsq(directions, away, rcond=None)[0]
        assert not is_passive(damping - 1e-3 * spoiled * np.outer(away, away), undamped)
