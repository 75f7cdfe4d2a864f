"""The quadratic eigenproblem (l^2 M + l (C + G) + K) x = 0 of small systems, every finite eigenvalue.

In the coordinates of the undamped modes, with states w q and q', the first-order matrix is
[[0, W], [-W, -D]]: balanced, and normal where there is no damping (choice of scaling: F. Tisseur,
K. Meerbergen, SIAM Review 43 (2001) 235-286, section 3.5). The one factor for all states by H.-Y. Fan,
W.-W. Lin and P. Van Dooren (SIAM J. Matrix Anal. Appl. 26 (2004) 252-256), root(|K| / |M|), is here one for
each mode, its own frequency: no unit is left, and soft modes keep their digits beside stiff ones. Motions
without mass but with damping, and unsymmetric stiffness beside motions without mass, go through the
first-order form of `vib.massless`.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import scipy.linalg

from vib.errors import AccuracyError
from vib.massless import Matrix, acts_on, dense, first_order, root_scale, split_mass
from vib.solve.damped import Damped
from vib.solve.pairs import Pairs, Quadratic, damped_from_pairs, improve
from vib.solve.undamped import CANCELLATION, EPS, Array, Undamped


def quadratic_modes(
    mass: Matrix, damping: Matrix, stiffness: Matrix, undamped: Undamped, law: Array, names: tuple[str, ...]
) -> Damped:
    """All finite eigenvalues, densely.

    Parameters
    ----------
    mass, damping, stiffness
        (n, n); ``damping`` with gyroscopic terms, ``stiffness`` perhaps unsymmetric.
    undamped
        All modes of the mass and the symmetric part of the stiffness.
    law
        (m,) damping ratios to be added in the undamped modes.

    Raises
    ------
    MatrixError
        See `vib.massless.first_order`.
    AccuracyError
        Eigenvalues at zero can't be told from others.
    """
    skew = (stiffness - stiffness.T) / 2
    twisted = bool(abs(skew).max() > 0)
    light = split_mass(mass).massless
    lagging = (twisted and light.shape[1] > 0) or acts_on(damping, light) or acts_on(damping.T, light)
    rates = 2 * law * undamped.angular
    shapes = undamped.shapes
    if lagging or (twisted and (undamped.rigid or _null(dense(stiffness))[0].shape[1])):
        held = mass @ shapes
        whole = Quadratic(
            mass=dense(mass),
            linear=dense(damping) + (held * rates) @ held.T,
            constant=dense(stiffness),
            slack=np.zeros(mass.shape[0]),
        )
        pairs, still = _through_first_order(whole, names)
        return _judged(whole, pairs, still, np.eye(mass.shape[0]), dense(mass), undamped)
    modal = Quadratic(
        mass=np.eye(len(rates)),
        linear=shapes.T @ (damping @ shapes) + np.diag(rates),
        constant=np.diag(undamped.values) + (shapes.T @ (skew @ shapes) if twisted else 0.0),
        slack=2 * undamped.angular * undamped.errors,
    )
    rigid = 0 if twisted else undamped.rigid
    still = np.abs(shapes[:, :rigid])
    terms = max(float((abs(matrix) @ still).max(initial=0.0)) for matrix in (damping, damping.T))
    pairs = modal_pairs(modal, rigid, terms * float(np.abs(shapes).max(initial=0.0)))
    return _judged(modal, pairs, np.eye(len(rates))[:, :rigid], shapes, dense(mass), undamped)


def _judged(
    quadratic: Quadratic, pairs: Pairs, still: Array, lift: Array, mass: Matrix, undamped: Undamped
) -> Damped:
    """Polish the pairs, then add the rigid-body motions ``still`` and come back to all freedoms."""
    symmetric = (quadratic.linear + quadratic.linear.T) / 2
    floor = -CANCELLATION * EPS * float(np.abs(symmetric).max(initial=0.0))
    passive = (
        np.array_equal(quadratic.constant, quadratic.constant.T)
        and float(undamped.values.min(initial=0.0)) >= 0
        and float(scipy.linalg.eigvalsh(symmetric)[0]) >= floor
    )
    improved = improve(quadratic, pairs, passive=passive)
    lifted = replace(improved, shapes=lift @ improved.shapes, duals=lift @ improved.duals)
    return damped_from_pairs(lifted, lift @ still, mass, complete=True)


def modal_pairs(modal: Quadratic, rigid: int, terms: float) -> Pairs:
    """Modal coordinates: displacements of rigid bodies are known eigenvectors at zero and left out.

    ``modal`` has unit mass and the squares of the angular frequencies, ``rigid`` zeros first, on the diagonal
    of ``constant``; ``terms`` is the size of what cancels where no velocity term touches a motion.
    """
    size = len(modal.linear)
    turn, free = _undamped_first(modal.linear, rigid, terms)
    linear = turn.T @ modal.linear @ turn
    square = np.abs(np.diag(modal.constant))
    elastic = np.arange(rigid, size)
    moving = np.arange(free, size)  # a rigid-body motion that nothing damps stays out altogether
    weight = np.sqrt(np.where(square > 0, square, square.max(initial=0.0) or 1.0))[elastic]
    state = np.zeros((len(elastic) + len(moving),) * 2)
    state[np.arange(len(elastic)), len(elastic) + np.searchsorted(moving, elastic)] = weight
    state[len(elastic) :, : len(elastic)] = -modal.constant[np.ix_(moving, elastic)] / weight
    state[len(elastic) :, len(elastic) :] = -linear[np.ix_(moving, moving)]
    if not len(state):
        return Pairs.none(size)
    values, left, right = scipy.linalg.eig(state, left=True, right=True)
    upright = values.imag >= 0
    # a steady speed that gyroscopic forces answer with a steady offset: once more the eigenvalue at zero
    drag = scipy.linalg.svdvals(linear[free:rigid, free:rigid])
    steady = int((drag <= CANCELLATION * EPS * max(terms, np.finfo(float).tiny)).sum())
    upright[np.argsort(np.abs(values), kind="stable")[:steady]] = False
    shapes = np.zeros((size, int(upright.sum())), dtype=np.complex128)
    duals = shapes.copy()
    shapes[moving], duals[moving] = right[len(elastic) :, upright], left[len(elastic) :, upright]
    return Pairs.found(values[upright], turn @ shapes, turn @ duals)


def _undamped_first(linear: Array, rigid: int, terms: float) -> tuple[Array, int]:
    """A rotation of the rigid-body coordinates that puts those no velocity term touches first; how many.

    ``terms`` is the size of what cancels where nothing touches a motion.
    """
    turn = np.eye(len(linear))
    if not rigid:
        return turn, 0
    touched = np.vstack([linear[:, :rigid], linear[:rigid].T])
    _, sizes, turned = scipy.linalg.svd(touched, full_matrices=False)
    free = sizes <= CANCELLATION * EPS * max(terms, np.finfo(float).tiny)
    order = np.argsort(~free, kind="stable")
    turn[:rigid, :rigid] = turned[order].T
    return turn, int(free.sum())


def _through_first_order(whole: Quadratic, names: tuple[str, ...]) -> tuple[Pairs, Array]:
    """Any regular system: eigenvalues of its first-order form, those at zero taken out by their number."""
    form = first_order(whole.mass, whole.linear, whole.constant, names)
    values, left, right = scipy.linalg.eig(form.rate, left=True, right=True)
    still, zeros = _null_motions(whole)
    order = np.argsort(np.abs(values), kind="stable")
    dropped, kept = order[:zeros], order[zeros:]
    if zeros and len(kept) and abs(values[dropped[-1]]) > 1e-3 * abs(values[kept[0]]):
        raise AccuracyError(
            f"Eigenvalues at zero ({zeros} by the rank of the matrices) can't be told from the slowest "
            f"others; the nearest is {abs(values[kept[0]]):.3g} 1/s."
        )
    kept = kept[values[kept].imag >= 0]
    shapes, duals = form.shape @ right[:, kept], form.input.T @ left[:, kept]
    return Pairs.found(values[kept], shapes, duals), still


def _null_motions(whole: Quadratic) -> tuple[Array, int]:
    """Motions (n, z) that the stiffness does not resist, and how many eigenvalues at zero they make.

    A motion that velocities do not resist either makes two, at one position and at one steady speed.
    """
    still, push = _null(whole.constant)
    if not still.shape[1]:
        return still, 0
    resisted = push.T @ whole.linear @ still
    terms = np.abs(push).T @ np.abs(whole.linear) @ np.abs(still)
    coast = scipy.linalg.svdvals(resisted) <= CANCELLATION * EPS * max(
        float(terms.max()), np.finfo(float).tiny
    )
    return still, int(still.shape[1] + coast.sum())


def _null(stiffness: Array) -> tuple[Array, Array]:
    """Motions that a perhaps unsymmetric stiffness does not resist, and those it can't push, (n, z) each."""
    scale = root_scale(np.abs(stiffness).max(axis=1))
    left, sizes, right = scipy.linalg.svd(scale[:, None] * stiffness * scale)
    null = sizes <= CANCELLATION * EPS * sizes[0]
    return scale[:, None] * right[null].T, scale[:, None] * left[:, null]
