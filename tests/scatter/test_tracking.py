from itertools import permutations

import numpy as np
from hypothesis import given
from hypothesis import strategies as st
from scipy.stats import ortho_group

from vib.scatter.tracking import first_left_out, follow


@given(st.integers(0, 10_000), st.integers(2, 5), st.integers(0, 2))
def test_the_assignment_is_the_best_of_all(seed, wanted, spare):
    # likeness of orthonormal shapes: squares of the entries of an orthogonal matrix
    turned = ortho_group.rvs(wanted + spare, random_state=seed)
    likeness = turned[:, :wanted] ** 2
    found = follow(likeness[None])[0]
    assert len(set(found.tolist())) == wanted
    best = max(
        sum(likeness[row, column] for column, row in enumerate(rows))
        for rows in permutations(range(wanted + spare), wanted)
    )
    assert np.isclose(likeness[found, np.arange(wanted)].sum(), best, rtol=0, atol=1e-12)


def test_modes_that_changed_places_are_found_again():
    likeness = np.array([[0.02, 0.97, 0.0], [0.95, 0.01, 0.1], [0.0, 0.0, 0.9], [0.0, 0.02, 0.0]])
    found = follow(likeness[None])
    assert found.tolist() == [[1, 0, 2]]
    assert first_left_out(found, 4).tolist() == [3]


def test_the_first_mode_that_is_not_followed():
    assert first_left_out(np.array([[0, 2], [0, 1], [1, 2]]), 3).tolist() == [1, 2, 0]
