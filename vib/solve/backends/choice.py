"""Which library factorises a matrix, and what happens when its answer fails the residual check."""

from __future__ import annotations

import platform
from collections.abc import Callable, Iterator
from contextlib import contextmanager

import numpy as np
import scipy.sparse as sparse

from vib.solve.backends import pardiso
from vib.solve.backends.fronts import Fronts
from vib.solve.backends.interface import Factor, FactorError, Matrix, TooLargeError
from vib.solve.backends.superlu import SuperLU

# Below this many equations the time that loading PARDISO takes, 0.2 s to 0.4 s, is more than it saves
# (measured with solids: 0.3 s saved of 0.9 s at 6,600 equations, as much at 10,900).
WORTH_LOADING = 10_000

# Below this many SuperLU is as quick as our own blocks, which have to be laid out first (measured: solids
# of 3,900 equations 3 times as fast by blocks, slender frames of 5,400 a third slower).
WORTH_DISSECTING = 3000

# Share of the time of factorisations and solves that PARDISO saves against our own blocks, on one core
# (measured with a solid of 65,520 freedoms: 11.9 s of 16.1 s remain); and the least saving, s, to tell about.
EXTRA_SHARE = 0.25
WORTH_A_WORD = 2.0

BACKENDS = (pardiso.Pardiso.backend, Fronts.backend, SuperLU.backend)


def factor(
    matrix: Matrix,
    *,
    symmetric: bool,
    definite: bool = False,
    upper_only: bool = False,
    backend: str | None = None,
) -> Factor:
    """Factorise a real sparse matrix by the best library at hand, checked, with others to fall back on.

    Parameters
    ----------
    matrix
        (n, n), sparse.
    symmetric
        The matrix equals its transpose; only its upper triangle is then read.
    definite
        All eigenvalues of a symmetric matrix are positive; a little faster, fails otherwise.
    upper_only
        ``matrix`` holds the upper triangle of a symmetric matrix, every diagonal entry stored.
    backend
        One of `BACKENDS` and no other; None for automatic choice.

    Returns
    -------
    Factor
        Use it in a ``with`` block, or call its ``release``.

    Raises
    ------
    FactorError
        No method gave solutions that satisfy the equations (the message lists what each said), or the memory
        does not suffice.
    """
    if backend not in (None, *BACKENDS):
        raise ValueError(f"backend: expected one of {', '.join(BACKENDS)}, got {backend!r}.")
    given = sparse.csr_array(matrix)
    if symmetric and not upper_only:
        given = upper_triangle(given)
    given.sort_indices()
    said = []
    for attempt in _attempts(given, symmetric=symmetric, definite=definite, backend=backend):
        try:
            return attempt()
        except TooLargeError:
            raise
        except FactorError as error:
            said.append(str(error))
    raise FactorError(" ".join(["The matrix could not be factorised.", *said]))


@contextmanager
def one_pool(size: int, backend: str | None = None) -> Iterator[None]:
    """Keep OpenBLAS to one thread where PARDISO works: two pools that wait busily take each other's cores."""
    if not _goes_to_pardiso(size, backend):
        yield
        return
    from threadpoolctl import ThreadpoolController

    with ThreadpoolController().select(internal_api="openblas").limit(limits=1):
        yield


def _goes_to_pardiso(size: int, backend: str | None) -> bool:
    if backend is None:
        return size >= WORTH_LOADING and pardiso.installed()
    return backend == pardiso.Pardiso.backend


def upper_triangle(matrix: Matrix) -> sparse.csr_array:
    """The upper triangle, zeros on the diagonal stored as well."""
    upper = sparse.csr_array(sparse.triu(matrix, format="csr"))
    upper.sum_duplicates()
    first = upper.indptr[:-1]
    ends = np.diff(upper.indptr) == 0
    leads = np.where(ends, -1, upper.indices[np.minimum(first, max(upper.nnz - 1, 0))] if upper.nnz else -1)
    missing = np.flatnonzero(leads != np.arange(len(leads)))
    if missing.size:
        listed = upper.tocoo()
        rows = np.concatenate([listed.coords[0], missing])
        columns = np.concatenate([listed.coords[1], missing])
        values = np.concatenate([listed.data, np.zeros(missing.size)])
        upper = sparse.csr_array((values, (rows, columns)), shape=upper.shape)
    return upper


def _attempts(
    matrix: sparse.csr_array, *, symmetric: bool, definite: bool, backend: str | None
) -> Iterator[Callable[[], Factor]]:
    """Ways to factorise, best first."""
    size = matrix.shape[0]
    if _goes_to_pardiso(size, backend):
        yield lambda: pardiso.Pardiso(matrix, symmetric=symmetric, definite=definite)
        if symmetric and not definite:
            yield lambda: pardiso.Pardiso(matrix, symmetric=True, matching=True)
    ours = [lambda: Fronts(matrix)] if symmetric and backend in (None, Fronts.backend) else []
    if size >= WORTH_DISSECTING:
        yield from ours
    if backend in (None, SuperLU.backend):
        yield lambda: SuperLU(matrix, symmetric=symmetric)
    if size < WORTH_DISSECTING:  # it may leave the diagonal inside a block, so it is also the safer one
        yield from ours
    if symmetric and backend in (None, SuperLU.backend):
        yield lambda: SuperLU(matrix, symmetric=True, pivoting=True)


def extra_would_save(size: int, seconds: float) -> float | None:
    """Seconds that the extra ``fast`` would save of ``seconds`` spent in factorisations and solves.

    None where it is installed already, is not made for this machine, or would save less than is worth a word.
    """
    if pardiso.installed() or platform.machine().lower() not in ("x86_64", "amd64") or size < WORTH_LOADING:
        return None
    saved = seconds * EXTRA_SHARE
    return saved if saved >= WORTH_A_WORD else None
