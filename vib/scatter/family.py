"""The matrices of a study as functions of its uncertain quantities.

The structure stays cut into the pieces that the nominal one needed, so that all samples have the same
freedoms. How the matrices depend on the quantities is found out by rebuilding the study at chosen points
(see `vib.scatter.interpolation`): spring constants, masses, moduli and densities are affine, dimensions of
sections and places of points low polynomials. The result is compared with rebuilt matrices at random points,
and what is left is an error that every frequency carries.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray
from scipy.stats import qmc

from vib.errors import AccuracyError, ModelError, VibError
from vib.massless import dense
from vib.modes import Modes
from vib.scatter.interpolation import Interpolation, Search, UnsuitedError
from vib.scatter.pattern import MATRICES, Change, Pattern, stated_law
from vib.solve.dense import dense_undamped
from vib.solve.shift_invert import sparse_undamped
from vib.solve.undamped import Undamped
from vib.study import Study
from vib.study.geometry import Material
from vib.system import Array, Matrix, System

EXACT = 1e-8  # change of an entry, against the largest of its row and column, that counts as none
CHECKS = 6  # random points at which rebuilt matrices are compared
TRUSTED = 1e-5  # error of an entry, or of a frequency, beyond which the interpolation is not used
DENSE = 100  # freedoms up to which all modes are computed at once
LARGEST_DENSE = 2500  # and up to which they are where the search for some fails


@dataclass(frozen=True, eq=False)
class Builder:
    """Rebuilds a study for values of some of its quantities, cut into the same pieces.

    ``counts`` pieces of each stretch, None where there are none to hold (a mesh, matrices); ``freedoms`` the
    names that every sample must have.
    """

    study: Study
    paths: tuple[str, ...]
    counts: NDArray[np.intp] | None
    freedoms: tuple[str, ...]

    def system(self, values: Array) -> System:
        """The system for values (d,), SI.

        Raises
        ------
        ModelError
            No such structure can be built, or it has other freedoms; the message names the quantities.
        """
        # imported where a study is rebuilt: a worker that only evaluates a basis starts without it
        from vib.structure.assembly import assemble
        from vib.structure.build import build_system, to_system
        from vib.structure.layout import read_layout

        given = ", ".join(f"{path} = {value:.6g}" for path, value in zip(self.paths, values, strict=True))
        try:
            study = self.study.varied(dict(zip(self.paths, values.tolist(), strict=True)))
            if self.counts is None:
                system = build_system(study)
            else:
                system = to_system(assemble(read_layout(study), self.counts))
        except VibError as error:
            raise ModelError(f"a sample can't be built ({given}, in SI units): {error}") from None
        if names_of(system) != self.freedoms:
            raise ModelError(
                f"a sample ({given}, in SI units) has other freedoms than the nominal structure; "
                "vary places less, or study the two structures one by one"
            )
        return system


def names_of(system: System) -> tuple[str, ...]:
    """The names of the freedoms; of a mesh, whose cells stay as they are, their number."""
    if system.anatomy is not None and system.anatomy.mesh is not None:
        return (str(system.size),)
    return tuple(map(str, system.freedoms))


@dataclass(frozen=True, eq=False)
class Check:
    """A rebuilt sample: its values (d,), its system, and its undamped modes."""

    values: Array
    system: System
    undamped: Undamped


@dataclass(frozen=True, eq=False)
class Family:
    """The matrices of a study as functions of d quantities.

    Attributes
    ----------
    builder
        Rebuilds the study exactly.
    modes
        The nominal modes; their system has the freedoms of every sample.
    nominal, bounds
        (d,) and (d, 2) values of the quantities, SI.
    interpolation
        Coefficients of the terms; None where the matrices have to be rebuilt for every sample.
    error
        Relative error of any frequency by the interpolation, from rebuilt matrices at random points.
    checks
        The rebuilt samples that this was found from.
    remarks
        What the reader should know, in words.
    """

    builder: Builder
    modes: Modes
    nominal: Array
    bounds: Array
    interpolation: Interpolation | None
    error: float
    checks: tuple[Check, ...]
    remarks: tuple[str, ...]
    pattern: Pattern | None
    base: Array
    changes: tuple[Change, ...]

    @property
    def paths(self) -> tuple[str, ...]:
        """Entries of the quantities in the study, such as ``springs[0].stiffness.x``."""
        return self.builder.paths

    @property
    def degrees(self) -> tuple[int, ...]:
        """(d,) degree in each quantity, 0 where it does not touch the matrices; () if they are rebuilt."""
        return () if self.interpolation is None else self.interpolation.degrees

    @classmethod
    def from_study(
        cls,
        study: Study,
        bounds: Mapping[str, tuple[float, float]],
        *,
        count: int | None = None,
        up_to: str | float | None = None,
    ) -> Family:
        """Find out how the matrices depend on the quantities.

        Parameters
        ----------
        study
            A structure, perhaps with a mesh, or matrices.
        bounds
            Least and greatest value of each quantity among the samples, SI, by its entry.
        count, up_to
            Which modes matter; as for `vib.modes.find_modes`.

        Raises
        ------
        ModelError
            A quantity that can't be varied, or that changes which freedoms there are.
        """
        paths = tuple(bounds)
        nominal = np.array([nominal_value(study, path) for path in paths])
        limits = np.array(list(bounds.values()), dtype=float).reshape(-1, 2)
        if not np.isfinite(limits).all() or (limits[:, 0] > limits[:, 1]).any():
            raise ModelError("bounds: each quantity needs a finite least and greatest value, in this order")
        limits = np.stack([np.minimum(limits[:, 0], nominal), np.maximum(limits[:, 1], nominal)], axis=1)
        modes = study.system().modes(count=count, up_to=up_to)
        builder = Builder(study, paths, _counts(modes.system), names_of(modes.system))
        return _interpolated(builder, modes, nominal, limits)

    def coefficients(self, samples: Array) -> Array:
        """Coefficient of every term (N, t) for samples (N, d); the first is 1.

        Raises
        ------
        AccuracyError
            These matrices are not interpolated.
        """
        if self.interpolation is None:
            raise AccuracyError("These matrices are not interpolated.")
        return self.interpolation.coefficients(samples)

    def covers(self, samples: Array) -> NDArray[np.bool_]:
        """Which samples (N,) lie where the interpolation was verified."""
        slack = 1e-9 * np.ptp(self.bounds, axis=1)
        inside = (samples >= self.bounds[:, 0] - slack) & (samples <= self.bounds[:, 1] + slack)
        return np.asarray(inside.all(axis=1) & (self.interpolation is not None))

    def terms(self, kind: str) -> tuple[Matrix | None, ...]:
        """One matrix of each term (n, n), None where a term does not touch it; see `pattern.MATRICES`."""
        if self.pattern is None:
            return ()
        pattern, everywhere = self.pattern, np.arange(len(self.base))
        return tuple(pattern.matrix(kind, *row) for row in ((everywhere, self.base), *self.changes))

    def law_terms(self) -> Array:
        """(t, l) figures of the damping law of each term; see `pattern.law_figures`."""
        if self.pattern is None:
            return np.zeros((0, 0))
        pattern, everywhere = self.pattern, np.arange(len(self.base))
        return np.array([pattern.law(*row) for row in ((everywhere, self.base), *self.changes)])

    def vector(self, values: Array) -> Array:
        """The entries of all matrices of one sample (d,) by interpolation."""
        vector = self.base.copy()
        for factor, (where, change) in zip(self.coefficients(values[None])[0, 1:], self.changes, strict=True):
            vector[where] += factor * change
        return vector

    def interpolated(self, values: Array) -> System:
        """The system of one sample (d,) by interpolation; its anatomy is otherwise the nominal one."""
        vector = self.vector(values)
        if self.pattern is None:
            raise AccuracyError("These matrices are not interpolated.")
        everywhere = np.arange(len(vector))
        law, anatomy = stated_law(self.modes.system, self.pattern, vector)
        stiffness, mass, damping, gyroscopic = (
            self.pattern.matrix(kind, everywhere, vector) for kind in MATRICES
        )
        return replace(
            self.modes.system,
            stiffness=stiffness,
            mass=mass,
            damping=damping,
            gyroscopic=gyroscopic,
            damping_law=law,
            anatomy=anatomy,
            rotations=(),
        )


def nominal_value(study: Study, path: str) -> float:
    """The value of an entry of a study, SI.

    Raises
    ------
    ModelError
        There is no such entry, or it holds no single number.
    """
    tolerances = study.tolerances
    if path in tolerances:
        return tolerances[path].nominal
    found: object = study
    for step in path.replace("[", ".").replace("]", "").split("."):
        try:
            if isinstance(found, Mapping):
                found = found[step]
            else:
                found = found[int(step)] if isinstance(found, tuple) else _figure(found, step)
        except (AttributeError, LookupError, ValueError):
            raise ModelError(f"{path}: the study has no such entry ({step} is not there)") from None
    if isinstance(found, tuple) and len(found) == 2 and found[0] == found[1]:
        found = found[0]  # one speed is a range of no width
    if isinstance(found, bool) or not isinstance(found, int | float):
        raise ModelError(f"{path}: this entry holds no single number that could be varied")
    return float(found)


def _figure(table: object, name: str) -> object:
    """An entry of a table; of a material also what it takes over from the one it is like."""
    given = getattr(table, name)
    return getattr(table.data, name, None) if given is None and isinstance(table, Material) else given


def lowest_undamped(system: System, count: int, *, certify: bool = False) -> Undamped:
    """The lowest undamped modes of a system."""
    if system.size > DENSE and 4 * count <= system.size:
        try:
            return sparse_undamped(system.mass, system.stiffness, count, certify=certify)
        except AccuracyError:  # as of a buckled structure
            if system.size > LARGEST_DENSE:
                raise
    return dense_undamped(dense(system.mass), dense(system.stiffness)).first(count)


def _counts(system: System) -> NDArray[np.intp] | None:
    from vib.structure.build import PieceDivision

    division = system.anatomy.division if system.anatomy is not None else None
    return division.counts if isinstance(division, PieceDivision) else None


def _interpolated(builder: Builder, modes: Modes, nominal: Array, bounds: Array) -> Family:
    first = builder.system(nominal)
    points = qmc.scale(qmc.Sobol(len(nominal), seed=5).random(8)[:CHECKS], bounds[:, 0], bounds[:, 1])
    rebuilt = [builder.system(point) for point in points]
    rebuilt_family = Family(builder, modes, nominal, bounds, None, 0.0, (), (), None, np.zeros(0), ())
    try:
        pattern = Pattern.of([first, *rebuilt])
        base = pattern.vector(first)
        vectors = [pattern.vector(system) for system in rebuilt]
        scale = pattern.scale(np.abs([base, *vectors]).max(axis=0))
        search = Search(
            evaluate=lambda values: pattern.vector(builder.system(values)),
            matters=lambda change: bool((np.abs(change) > EXACT * scale).any()),
            nominal=nominal,
            bounds=bounds,
            names=builder.paths,
        )
        interpolation, changes = search.run()
    except (UnsuitedError, AccuracyError) as fault:
        return replace(rebuilt_family, remarks=(_rebuilding(str(fault).rstrip(".")),))
    family = replace(rebuilt_family, interpolation=interpolation, pattern=pattern, base=base, changes=changes)
    count = modes.count + 1
    checks = tuple(
        Check(point, system, lowest_undamped(system, count))
        for point, system in zip(points, rebuilt, strict=True)
    )
    error, worst = 0.0, 0.0
    for check, vector in zip(checks, vectors, strict=True):
        difference = np.abs(family.vector(check.values) - vector)
        worst = max(worst, float(_relative(difference, scale).max(initial=0.0)))
        error = max(error, _frequency_error(family.interpolated(check.values), check))
    if max(worst, error) > TRUSTED:
        reason = f"at random points the interpolated matrices are {max(worst, error):.1g} off"
        return replace(rebuilt_family, checks=checks, remarks=(_rebuilding(reason),))
    # the largest of a few random errors, doubled; below it, entries may differ by what counted as none
    return replace(family, checks=checks, error=2 * error, remarks=(_description(family, 2 * error),))


def _relative(difference: Array, scale: Array) -> Array:
    return np.where(difference > 0, difference / np.where(scale > 0, scale, np.finfo(float).tiny), 0.0)


def _frequency_error(found: System, check: Check) -> float:
    """Relative first-order change of the frequencies of a rebuilt sample by the error of its matrices."""
    elastic = check.undamped.values > 0
    shapes, squares = check.undamped.shapes[:, elastic], check.undamped.values[elastic]
    if not len(squares):
        return 0.0
    stiffness = (found.stiffness - check.system.stiffness) @ shapes
    mass = (found.mass - check.system.mass) @ shapes
    change = np.einsum("ij,ij->j", shapes, stiffness - mass * squares)
    return float(np.abs(change / (2 * squares)).max())


def _rebuilding(reason: str) -> str:
    return f"The matrices are rebuilt for every sample, which takes long: {reason}."


def _description(family: Family, error: float) -> str:
    degrees = family.degrees
    affine = sum(degree == 1 for degree in degrees)
    higher = [degree for degree in degrees if degree > 1]
    words = [f"affine in {affine} of {len(degrees)} quantities"] if affine else []
    if higher:
        words.append(f"polynomials of degree up to {max(higher)} in {len(higher)}")
    if 0 in degrees:
        words.append(f"independent of {degrees.count(0)}")
    return (
        f"The matrices are {', '.join(words)}; compared with rebuilt ones at {CHECKS} random points, "
        f"frequencies are within {max(error, 1e-12):.1g} of their value."
    )
