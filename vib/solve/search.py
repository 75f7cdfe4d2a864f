"""Which solver a system goes to, and the modes it asked for out of what that solver found."""

from __future__ import annotations

from dataclasses import dataclass, field, replace
from functools import cached_property
from typing import NamedTuple

import numpy as np
import scipy.sparse as sparse

from vib.errors import AccuracyError, MatrixError, in_own_words
from vib.massless import condense, dense, split_mass
from vib.solve.backends.choice import extra_would_save
from vib.solve.backward import refined
from vib.solve.damped import Damped, proportional_modes
from vib.solve.damping import ModalDamping, feeding_reach, modal_damping
from vib.solve.dense import condensed_modes
from vib.solve.factor import negative_count
from vib.solve.lanczos import lowest_modes
from vib.solve.localised import Localised, localise
from vib.solve.shift_invert import count_below, sparse_undamped
from vib.solve.stability import is_passive, watched
from vib.solve.undamped import CANCELLATION, EPS, Array, Matrix, Undamped
from vib.system import System

# What only damped systems need is imported where it is used: a plain frame shall not wait for it.

DENSE_SIZE = 100  # up to here all modes cost less than the set-up of the sparse solvers
ARRAY_SIZE = 400  # dense arrays are treated as such up to here whatever is asked for
THIN = 0.25  # and beyond as sparse where no more than this part of their entries is not zero
LAW_MODES = 8  # undamped modes beyond those asked for that a damping law acts on beside dashpots
FIRST_GUESS = 24  # modes looked for first where those below a frequency could not be counted
MOST_SEARCHES = 6
GRADED = 1e10  # ratio of squared frequencies of single freedoms
UNSUITED_DENSE = 800  # up to here all modes are computed where the fast search for few is not suited
LOST = 0.1  # hidden part of the lowest frequency from which on large systems are refused
MOST_COUNTS = 3  # times that a count may find modes missing before the search is given up
LARGE = 2000  # sparse systems from here on are searched by blocks, with the fastest factorisation at hand
LARGEST_DENSE = 5000  # (n, n) arrays beyond this fill the memory of an ordinary machine


@dataclass(frozen=True, eq=False)
class Solution:
    """Modes of the matrices as they are, and what to tell about them."""

    damped: Damped
    damping: ModalDamping
    counted: bool  # an inertia count or the argument principle agreed with what was found
    remarks: tuple[str, ...] = ()
    watch: bool = False  # energy can be fed in, and not every mode could be looked at
    backward: Array = field(default_factory=lambda: np.zeros(0))  # backward error of each pair (m,)


@in_own_words
def solve_system(system: System, count: int | None, limit: float | None, *, certify: bool = True) -> Solution:
    """The lowest ``count`` modes, those up to ``limit`` (rad/s), or all finite ones.

    Raises
    ------
    AccuracyError
        A solver did not finish, modes are missing, or all modes of too large a system were asked for.
    MatrixError
        A motion has neither mass, damping nor stiffness.
    """
    problem = _Problem(system)
    found = _solve(problem, _Ask(count, limit, certify))
    if not certify:
        return found
    linear, stiffness = problem.linear, problem.stiffness
    some = count is not None or limit is not None
    feeding = feeding_reach(system.damping_law)
    if some and (feeding or problem.twisted or not is_passive(linear, found.damping.undamped)):
        names = tuple(str(freedom) for freedom in system.freedoms)
        damped, known = watched(problem.mass, linear, stiffness, found.damping, found.damped, names)
        known = known and (damped.growing is not None or _beyond(damped, feeding))
        found = replace(found, damped=damped, watch=not known)
    damped, backward = refined(problem.mass, linear, stiffness, found.damping, found.damped)
    damped = _with_hidden(problem, damped, found.damping.undamped)
    return replace(found, damped=damped, backward=backward)


def _with_hidden(problem: _Problem, damped: Damped, undamped: Undamped) -> Damped:
    """Damped eigenvalues with what round-off may hide in the stiffness of motions set aside as rigid.

    A hidden stiffness h^2 turns s (s + c) = 0 into s^2 + c s + h^2 = 0: a root of size c moves by h^2 / c as
    long as that is small, else by no more than its own size or h.

    Raises
    ------
    AccuracyError
        It hides as much as the slowest motions of a large system: those found need not be the slowest then.
    """
    hidden = float(undamped.errors[: undamped.rigid].max(initial=0.0))
    if damped.proportional or not hidden:
        return damped
    elastic = undamped.angular[undamped.rigid :]
    if (
        sparse.issparse(problem.mass)
        and problem.system.size > UNSUITED_DENSE
        and hidden > LOST * elastic.min(initial=np.inf)
    ):
        raise AccuracyError(
            "Soft and stiff parts lie so many decades apart that round-off in the entries of the stiffness "
            f"hides motions of up to {hidden / (2 * np.pi):.3g} Hz; make the stiffest parts rigid or softer."
        )
    size = np.abs(damped.values)
    with np.errstate(divide="ignore"):
        moved = np.where(size > 2 * hidden, hidden**2 / size, np.maximum(size, hidden))
    return replace(damped, errors=damped.errors + moved)


def _solve(problem: _Problem, ask: _Ask) -> Solution:
    system, count, limit = problem.system, ask.number, ask.limit
    size = system.size
    everything = count is None and limit is None
    if everything and size > LARGEST_DENSE:
        raise AccuracyError(
            f"All modes of {size} freedoms are too many to compute at once; "
            "ask for a count or a highest frequency."
        )
    small = size <= LARGEST_DENSE
    if everything or size <= (DENSE_SIZE if sparse.issparse(system.stiffness) else ARRAY_SIZE):
        return _dense(problem, ask)
    if size <= UNSUITED_DENSE and (_graded(problem) or feeding_reach(system.damping_law)):
        return _dense(problem, ask)
    if _goes_by_blocks(problem) and (count is None or 4 * count < size):
        found = _blocks(problem, ask)
        if found is not None:
            return found
    below = None if limit is None else count_below(problem.mass, problem.straight, limit)
    most = FIRST_GUESS if below is None else below
    wanted = count if limit is None and count is not None else most if count is None else min(count, most)
    return _dense(problem, ask) if small and 4 * wanted > size else _sparse(problem, ask, wanted, below)


class _Ask(NamedTuple):
    """Which modes: the lowest ``number``, up to ``limit`` rad/s, and whether to count them."""

    number: int | None
    limit: float | None
    certify: bool


class _Problem:
    """The matrices of a system in the form that the solvers take."""

    def __init__(self, system: System) -> None:
        self.system = system
        self.mass: Matrix = system.mass
        self.stiffness: Matrix = system.stiffness
        if system.size > ARRAY_SIZE and _thin(system):
            self.mass, self.stiffness = sparse.csr_array(system.mass), sparse.csr_array(system.stiffness)
        self.twisted = bool(system.unsymmetric and abs(self.stiffness - self.stiffness.T).max() > 0)
        self.straight: Matrix = (self.stiffness + self.stiffness.T) / 2 if self.twisted else self.stiffness
        self.spinning = system.gyroscopic is not None and abs(system.gyroscopic).max() > 0
        damping, gyroscopic = system.damping, system.gyroscopic
        terms = [matrix for matrix in (damping, gyroscopic) if matrix is not None]
        self.linear: Matrix = sum(terms[1:], terms[0]) if terms else sparse.csr_array(self.mass.shape)
        if sparse.issparse(self.mass):
            self.linear = sparse.csr_array(self.linear)
        self.velocity = bool(self.twisted or abs(self.linear).max() > 0)
        lopsided = bool(system.unsymmetric and damping is not None and abs(damping - damping.T).max() > 0)
        self.real_shapes = not (self.twisted or self.spinning or lopsided)

    @cached_property
    def term(self) -> Localised | None:
        """The velocity and circulatory terms where they touch few freedoms; None where not, or for none."""
        if not (self.velocity and sparse.issparse(self.stiffness)):
            return None
        found = localise(self.mass, self.linear, self.stiffness)
        return found if found is not None and found.rank else None


def _graded(problem: _Problem) -> bool:
    """Whether soft and stiff lie so far apart that factorisations lose the soft motions."""
    heavy, stiff = (np.abs(np.asarray(part.diagonal())) for part in (problem.mass, problem.straight))
    both = (heavy > 0) & (stiff > 0)
    squares = stiff[both] / heavy[both]
    return bool(len(squares) and squares.max() > GRADED * squares.min())


def _goes_by_blocks(problem: _Problem) -> bool:
    """Whether undamped shapes of a large sparse system are those of the damped one, as far as is known."""
    large = sparse.issparse(problem.stiffness) and problem.system.size >= LARGE
    return large and problem.real_shapes and problem.term is None


def _blocks(problem: _Problem, ask: _Ask) -> Solution | None:
    """The lowest modes of a large system by block Lanczos; None where damping turns the shapes."""
    spare = LAW_MODES if problem.system.damping is not None and _law(problem.system) else 0
    number = None if ask.number is None else ask.number + spare
    undamped = lowest_modes(problem.mass, problem.straight, count=number, below=ask.limit)
    damping = modal_damping(problem.system, undamped)
    if not damping.proportional:
        return None
    found = proportional_modes(damping, np.zeros((problem.system.size, 0)))
    kept = cut(found, ask.number, ask.limit)
    remarks = (*_law_remark(damping), *_extra_remark(problem.system.size, undamped.seconds))
    return Solution(kept, damping, undamped.certified is not None, remarks)


def _extra_remark(size: int, seconds: float) -> tuple[str, ...]:
    """What the optional solver would have saved, where that is worth a word."""
    saved = extra_would_save(size, seconds)
    if saved is None:
        return ()
    return (
        f"Factorisations and solves took {seconds:.0f} s; the extra `fast` (pip install 'vib[fast]') would "
        f"save about {saved:.0f} s of them.",
    )


def _thin(system: System) -> bool:
    """Whether dense arrays hold few enough entries to be worth the sparse solvers."""
    if sparse.issparse(system.stiffness):
        return False
    filled = max(np.count_nonzero(dense(matrix)) for matrix in (system.mass, system.stiffness))
    return bool(filled <= THIN * system.size**2)


def _dense(problem: _Problem, ask: _Ask) -> Solution:
    system, mass, straight = problem.system, dense(problem.mass), dense(problem.straight)
    reduced = condense(mass, straight)
    if not problem.twisted:
        _check_idle(problem, reduced.idle)
    undamped = condensed_modes(reduced)
    damping = modal_damping(system, undamped)
    if problem.real_shapes and damping.proportional:
        lags = np.zeros((system.size, 0))
        if undamped.shapes.shape[1] < system.size and damping.rayleigh is not None:
            lags = split_mass(mass).massless
        found = proportional_modes(damping, lags)
    else:
        from vib.solve.quadratic import quadratic_modes

        names = tuple(str(freedom) for freedom in system.freedoms)
        linear, stiffness = dense(problem.linear), dense(problem.stiffness)
        found = quadratic_modes(mass, linear, stiffness, damping.undamped, damping.law, names)
    kept = cut(found, ask.number, ask.limit)
    counted = (
        ask.certify and problem.real_shapes and _count_agrees(mass, straight, undamped, len(kept.values))
    )
    return Solution(kept, damping, counted)


def _check_idle(problem: _Problem, idle: Array) -> None:
    """Raise MatrixError for a motion without mass and stiffness that nothing damps either."""
    if not idle.shape[1]:
        return
    linear = dense(problem.linear)
    touched, terms = np.abs(linear @ idle).max(axis=0), (np.abs(linear) @ np.abs(idle)).max(axis=0)
    loose = np.flatnonzero(touched <= CANCELLATION * EPS * terms)
    if len(loose):
        motion = np.abs(idle[:, loose[0]])
        rows = np.flatnonzero(motion > 0.1 * motion.max())[:4]
        named = ", ".join(f"row {row + 1} ({problem.system.freedoms[row]})" for row in rows)
        raise MatrixError(
            f"mass and stiffness: {named} can move together with neither mass nor stiffness; "
            "give that motion either, or leave it out."
        )


def _count_agrees(mass: Matrix, stiffness: Matrix, undamped: Undamped, kept: int) -> bool:
    """Whether the inertia of K - s M, with s in the gap above the modes kept, counts what was computed."""
    if undamped.values.min(initial=0.0) < 0:
        return False
    angular, errors = undamped.angular, undamped.errors
    for inside in range(min(kept, len(angular)), len(angular) + 1):
        low = angular[inside - 1] + 2 * errors[inside - 1] if inside else 0.0
        high = angular[inside] - 2 * errors[inside] if inside < len(angular) else 2 * low
        if high > low * (1 + 1e-9) and high > 0:
            return negative_count(stiffness - ((low + high) / 2) ** 2 * mass) == inside
    return False


def _sparse(problem: _Problem, ask: _Ask, wanted: int, below: int | None) -> Solution:
    """Look for ``wanted`` modes, and for more until those asked for are among them."""
    if problem.term is not None:
        from vib.solve.reduced import UnsuitedError

        try:
            found = _localised(problem, ask, wanted, problem.term)
        except UnsuitedError:
            if problem.system.size <= UNSUITED_DENSE:
                return _dense(problem, ask)
            found = None
        if found is not None:
            return found
    return _general(problem, ask, wanted, below)


def _localised(problem: _Problem, ask: _Ask, wanted: int, term: Localised) -> Solution | None:
    """Through the Krylov space of few dashpots or spinning bodies; None where the shapes stay as they are."""
    from vib.solve.arnoldi import LowRank
    from vib.solve.pairs import Quadratic
    from vib.solve.reduced import Reduction, reduced_quadratic
    from vib.solve.winding import MissingError

    system, mass, straight = problem.system, problem.mass, problem.straight
    count = wanted if ask.number is None or ask.limit is not None else ask.number
    with Reduction(mass, straight, term) as reduction:
        for _ in range(MOST_COUNTS):
            undamped = reduction.undamped(count + (LAW_MODES if _law(system) else 0))
            damping = modal_damping(system, undamped)
            if problem.real_shapes and damping.proportional:
                return _blocks(problem, ask) if system.size >= LARGE else None
            whole = Quadratic(
                mass=mass,
                linear=LowRank.of(problem.linear, mass, damping.undamped, damping.law),
                constant=problem.stiffness,
                slack=np.zeros(mass.shape[0]),
            )
            try:
                found = reduced_quadratic(
                    reduction,
                    damping.undamped,
                    damping.law,
                    count,
                    limit=ask.limit,
                    whole=whole,
                    passive=not problem.twisted and is_passive(problem.linear, undamped),
                    certify=ask.certify,
                )
            except MissingError:
                reduction.widen()
                continue
            kept = cut(found, ask.number, ask.limit)
            return Solution(kept, damping, found.certified is not None, _law_remark(damping))
    raise AccuracyError("Modes are missing, also after the search was repeated with fresh directions.")


def _general(problem: _Problem, ask: _Ask, wanted: int, below: int | None) -> Solution:
    system, mass, straight = problem.system, problem.mass, problem.straight
    spare = LAW_MODES if not problem.real_shapes or (system.damping is not None and _law(system)) else 0
    for _ in range(MOST_SEARCHES):
        undamped = sparse_undamped(mass, straight, wanted + spare, certify=ask.certify)
        inside = None if ask.limit is None else int((undamped.angular <= ask.limit).sum())
        if ask.limit is not None and undamped.certified is not None and inside == below:
            undamped = replace(undamped, certified=max(undamped.certified, ask.limit))
        damping = modal_damping(system, undamped)
        if problem.real_shapes and damping.proportional:
            found = proportional_modes(damping, np.zeros((system.size, 0)))
            enough = ask.limit is None or (inside is not None and inside == below)
        elif undamped.rigid == len(undamped.values):
            found, enough = None, False  # all rigid-body motions must be known before they can be set aside
        else:
            found, enough = _quadratic(problem, ask, damping, wanted)
        if found is not None:
            enough = enough or bool(np.abs(found.values[-1:]).max(initial=0.0) > (ask.limit or 0.0))
            if enough and (ask.number is None or ask.limit is not None or len(found.values) >= ask.number):
                kept = cut(found, ask.number, ask.limit)
                counted = (
                    undamped.certified is not None if found.proportional else found.certified is not None
                )
                return Solution(kept, damping, counted, _law_remark(damping))
        wanted = 2 * wanted + 4
        if 2 * wanted > system.size:
            return _dense(problem, ask)
    raise AccuracyError("The search for modes below the highest frequency did not come to an end.")


def _quadratic(
    problem: _Problem, ask: _Ask, damping: ModalDamping, wanted: int
) -> tuple[Damped | None, bool]:
    """Complex modes by the Arnoldi process; None where a count finds some missing, to search again."""
    from vib.solve.arnoldi import sparse_quadratic
    from vib.solve.winding import MissingError

    try:
        found = sparse_quadratic(
            problem.mass,
            problem.linear,
            problem.stiffness,
            damping.undamped,
            damping.law,
            wanted,
            circle=(ask.limit or 0.0) if ask.certify else None,
        )
    except MissingError as fault:
        if fault.number < 0:
            raise AccuracyError(
                "More eigenvalues were found than there can be: with these matrices they hang on round-off, "
                "and none of them can be trusted."
            ) from fault
        return None, False
    return found, ask.limit is None


def _beyond(damped: Damped, reach: float) -> bool:
    """Whether no mode that a damping law feeds energy into can be missing: none below ``reach``, rad/s."""
    return bool(damped.values.real.max(initial=-1.0) > 0 or (damped.certified or 0.0) >= reach)


def _law(system: System) -> bool:
    law = system.damping_law
    return bool(law.ratio or law.bands or law.material)


def _law_remark(damping: ModalDamping) -> tuple[str, ...]:
    if damping.proportional or not damping.law.any():
        return ()
    return (
        f"Stated damping ratios act on the lowest {len(damping.law)} undamped modes; dashpots act on all.",
    )


def cut(found: Damped, count: int | None, limit: float | None) -> Damped:
    """The modes asked for, and below what magnitude they are complete."""
    size = np.abs(found.values)
    number = len(size) if count is None else min(count, len(size))
    if limit is not None:
        number = min(number, int((size <= limit).sum()))
    certified = found.certified
    if found.complete:
        certified = float(size[-1]) if len(size) else 0.0
        certified = max(certified, limit) if limit is not None else certified
    if number < len(size) and certified is not None:
        certified = min(certified, float(size[number] - found.errors[number]))
    left = found.values[number:]
    grows = left[left.real > found.movement[number:]]
    growing = found.growing if not len(grows) else complex(grows[grows.real.argmax()])
    return replace(
        found,
        growing=growing,
        values=found.values[:number],
        shapes=found.shapes[:, :number],
        errors=found.errors[:number],
        movement=found.movement[:number],
        condition=found.condition[:number],
        undamped=found.undamped[:number],
        rigid=min(found.rigid, number),
        certified=certified,
    )
