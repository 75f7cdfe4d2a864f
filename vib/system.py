"""The second-order system: mass, damping, gyroscopic and stiffness matrices with named freedoms.

    mass q'' + (damping + gyroscopic) q' + stiffness q = f(t)

Everything is in SI units. What a structure knows beyond its matrices (where its points are, how they
follow the freedoms, which part owns which stiffness) travels along as `Anatomy`; bare matrices have none.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from difflib import get_close_matches
from typing import TYPE_CHECKING, Any, NamedTuple, Protocol

import numpy as np
from numpy.typing import NDArray

from vib.checks import as_matrix, check_carried, check_finite, check_mass, check_symmetric
from vib.errors import ModelError, ShapeError

if TYPE_CHECKING:
    from vib.modes import Modes
    from vib.response.frequency import FrequencyResponse
    from vib.response.respond import Response
    from vib.response.ring import Ring
    from vib.statespace import StateSpace

Array = NDArray[np.float64]
Matrix = Any  # a dense float64 array or a scipy.sparse csr_array; scipy has no type for "either"
COMPONENTS = ("x", "y", "z", "rx", "ry", "rz")


class Freedom(NamedTuple):
    """One freedom: the point that moves and the component it moves along (``""`` for a bare matrix row)."""

    point: str
    component: str

    def __str__(self) -> str:
        return f"{self.point} {self.component}".rstrip()


@dataclass(frozen=True, eq=False)
class Place:
    """A named point or body: where it is and how its six components follow the freedoms.

    ``motion`` is a sparse (6, n) array: x, y, z (m) and rx, ry, rz (rad) of the place per unit freedom.
    A component that is held has an empty row.
    """

    name: str
    position_m: tuple[float, float, float]
    motion: Matrix


@dataclass(frozen=True, eq=False)
class Part:
    """A group of members, a spring set or a body: its share of the matrices, for energy shares.

    ``stiffness`` and ``mass`` are sparse (n, n), or can at least multiply shapes (n, m), or None where the
    part has none; ``damping_ratio`` is the material's own (None: not given).
    """

    name: str
    kind: str  # "members", "springs", "body" or "cells"
    stiffness: Matrix | None
    mass: Matrix | None
    damping_ratio: float | None = None


@dataclass(frozen=True, eq=False)
class Wireframe:
    """What there is to draw: nodes, their translations per unit freedom, and lines of each part.

    ``nodes_m`` (k, 3); ``motion`` sparse (3 k, n), rows x, y, z of node 0, then of node 1, ...;
    ``lines`` pairs a part's name with the node numbers along one member or one body's arm.
    """

    nodes_m: Array
    motion: Matrix
    lines: tuple[tuple[str, tuple[int, ...]], ...]


@dataclass(frozen=True, eq=False)
class MeshView:
    """The cells of a mesh, to draw and to write to files.

    ``nodes_m`` (k, 3) all nodes of the file; ``motion`` sparse (3 k, n) as in `Wireframe`; ``cells`` kind,
    part and node numbers (e, c) of each group of cells; ``faces`` part and corners (f, 3 or 4) of the faces
    that are seen from outside, solids' turned outwards; ``used`` the nodes that have cells.
    """

    nodes_m: Array
    motion: Matrix
    cells: tuple[tuple[str, str, NDArray[np.intp]], ...]
    faces: tuple[tuple[str, NDArray[np.intp]], ...]
    used: NDArray[np.intp]


class Comparison(NamedTuple):
    """A structure of better cells; ``factor`` times the difference of a frequency is its error."""

    system: System
    factor: float
    words: str


class Discretisation(Protocol):
    """How far frequencies are off because a structure consists of cells that can't be divided again."""

    @property
    def accuracy(self) -> float:
        """What is asked of every frequency."""
        ...

    def finer(self) -> Comparison | None:
        """The same structure of better cells, where comparing with it tells the error best."""
        ...

    def errors(self, shapes: NDArray[Any], angular: Array) -> tuple[Array, str, tuple[str, ...]]:
        """Error of each angular frequency (m,), rad/s, by the shapes (n, m), how it was told, and remarks."""
        ...

    def member_errors(self, shapes: NDArray[Any], angular: Array) -> Array:
        """What the pieces of members beside the cells add to the error (m,), rad/s."""
        ...


class Spinning(NamedTuple):
    """A body that spins with a shaft; ``axis`` is the unit axis in the sense of its turning."""

    name: str
    axis: tuple[float, float, float]
    polar_kg_m2: float
    mass_kg: float


@dataclass(frozen=True, eq=False)
class Rotation:
    """What grows with the speed of one shaft; the matrices of a system hold it at ``speed_hz``.

    ``speed_hz`` and ``slowest_hz`` rev/s: the fastest and the slowest that the shaft runs; ``gyroscopic``
    and ``circulatory`` (n, n) or None, per rad/s of the shaft.
    """

    shaft: str
    speed_hz: float
    slowest_hz: float
    gyroscopic: Matrix | None
    circulatory: Matrix | None
    bodies: tuple[Spinning, ...] = ()


class Division(Protocol):
    """How finely the members of a structure are cut into pieces, and how to cut them otherwise."""

    accuracy: float

    def coarser(self) -> System | None:
        """The same structure with half the pieces (a subspace of this one), or None if it can't be halved."""
        ...

    def finer(self) -> System:
        """The same structure with every piece halved."""
        ...

    def for_frequency(self, frequency_hz: float) -> System:
        """The same structure cut so that modes up to this frequency should meet ``accuracy``."""
        ...


@dataclass(frozen=True, eq=False)
class Anatomy:
    """What a structure knows beyond its matrices.

    ``carried`` (n, 6): T' M R, the inertia force on the freedoms per unit rigid acceleration of the
    ground along x, y, z and about the axes through the origin; ``rigid_mass`` (6, 6): R' M R of the
    whole structure, held parts included. ``remarks`` are the assumptions made, in words. A structure with a
    ``mesh`` has a ``discretisation`` in the place of a ``division``.
    """

    places: Mapping[str, Place]
    parts: tuple[Part, ...]
    wireframe: Wireframe
    carried: Array
    rigid_mass: Array
    remarks: tuple[str, ...] = ()
    division: Division | None = None
    mesh: MeshView | None = None
    discretisation: Discretisation | None = None


@dataclass(frozen=True)
class DampingLaw:
    """Damping that is stated mode by mode rather than as a matrix.

    ``ratio`` holds for every mode; ``bands`` are (from Hz, to Hz, ratio) and are added where the mode's
    undamped natural frequency lies in them; ``material`` adds the ratios of the parts weighted by the
    strain energy each holds (Johnson & Kienholz, AIAA J. 20 (1982) 1284-1290).
    """

    ratio: float = 0.0
    bands: tuple[tuple[float, float, float], ...] = ()
    material: bool = False

    def ratios(self, system: System, frequencies_hz: Array, shapes: Array) -> Array:
        """Ratio (m,) of undamped modes at ``frequencies_hz`` (m,) with ``shapes`` (n, m); 0 for rigid."""
        ratios = np.full(len(frequencies_hz), float(self.ratio))
        for low, high, ratio in self.bands:
            ratios += np.where((frequencies_hz >= low) & (frequencies_hz <= high), ratio, 0.0)
        if self.material and system.anatomy is not None:
            whole = np.einsum("ij,ij->j", shapes, system.stiffness @ shapes)
            for part in system.anatomy.parts:
                if part.damping_ratio and part.stiffness is not None:
                    held = np.einsum("ij,ij->j", shapes, part.stiffness @ shapes)
                    ratios += part.damping_ratio * held / np.where(whole > 0, whole, np.inf)
        return np.where(frequencies_hz > 0, ratios, 0.0)


@dataclass(frozen=True, kw_only=True, eq=False)
class System:
    """Mass, stiffness, damping and gyroscopic matrices with named freedoms, SI units.

    Parameters
    ----------
    mass, stiffness
        (n, n) arrays or scipy.sparse; kg and N/m for translations. The mass may be singular.
    damping, gyroscopic
        (n, n), N s/m; optional. ``gyroscopic`` must be skew-symmetric.
    freedoms
        One name per row; numbered from 1 if not given.
    unsymmetric
        Declares that the stiffness (and damping) may be unsymmetric (circulatory forces).
    damping_law, anatomy
        Damping stated per mode, and what a structure knows beyond matrices; see the classes.
    rotations
        What of the gyroscopic matrix and of the stiffness grows with the speed of which shaft.

    Raises
    ------
    ShapeError
        A matrix is not square or not of the size of ``mass``.
    MatrixError
        Entries that are not finite, not symmetric where they must be, or a freedom with neither mass
        nor stiffness; the message names row and column.

    Examples
    --------
    >>> import vib
    >>> vib.System(mass=[[2.0]], stiffness=[[8.0]]).size
    1
    """

    mass: Matrix
    stiffness: Matrix
    damping: Matrix | None = None
    gyroscopic: Matrix | None = None
    freedoms: Sequence[Freedom] = ()
    unsymmetric: bool = False
    damping_law: DampingLaw = field(default_factory=DampingLaw)
    anatomy: Anatomy | None = None
    rotations: tuple[Rotation, ...] = ()

    def __post_init__(self) -> None:
        if self.anatomy is not None and self.anatomy.mesh is not None:
            return  # assembled cell by cell: symmetric and regular by construction, and large
        mass = as_matrix("mass", self.mass, None)
        size = mass.shape[0]
        given = {"mass": mass, "stiffness": as_matrix("stiffness", self.stiffness, size)}
        for name in ("damping", "gyroscopic"):
            value = getattr(self, name)
            if value is not None:
                given[name] = as_matrix(name, value, size)
        freedoms = tuple(Freedom(*named) for named in self.freedoms)
        if not freedoms:
            freedoms = tuple(Freedom(str(number), "") for number in range(1, size + 1))
        if len(freedoms) != size:
            raise ShapeError("freedoms", expected=(size,), got=(len(freedoms),), hint="One name per freedom.")
        names = [str(named) for named in freedoms]
        if len(set(names)) != size:
            twice = next(name for name in names if names.count(name) > 1)
            raise ModelError(f"freedoms: {twice!r} is there more than once; give each freedom its own name.")
        for name, matrix in given.items():
            check_finite(name, matrix, names)
        for name, matrix in given.items():
            if name in ("mass", "gyroscopic") or not self.unsymmetric:
                check_symmetric(name, matrix, names, skew=name == "gyroscopic")
        check_carried(tuple(given.values()), names)
        check_mass(mass, names)
        for name, matrix in given.items():
            object.__setattr__(self, name, matrix)
        object.__setattr__(self, "freedoms", freedoms)

    @property
    def size(self) -> int:
        """How many freedoms."""
        return int(self.mass.shape[0])

    def direction(self, at: str, along: str | Sequence[float] | None = None) -> Array:
        """The vector b (n,) with displacement b @ q of a place along a component; also a unit force there.

        Parameters
        ----------
        at
            A point, a body, or a freedom of a bare system (its name or its number from 1).
        along
            ``"x"``, ``"-x"``, ... ``"rz"``, or three numbers, a direction that is normalised;
            None only where the freedom has no component (bare matrices).

        Raises
        ------
        ModelError
            No such place or component, or it is held and can't move.
        """
        weights = _component_weights(at, along)
        place = self.anatomy.places.get(at) if self.anatomy else None
        if place is not None:
            if weights is None:
                raise ModelError(f"{at}: say along which component, one of {', '.join(COMPONENTS)}.")
            moved = np.asarray(weights @ place.motion, dtype=np.float64).ravel()
            if not moved.any():
                solid = " (nodes of solids have no rotations)" if self.anatomy and self.anatomy.mesh else ""
                raise ModelError(f"{at}: it is held along {_in_words(along)} and can't move there{solid}.")
            return moved
        vector = self._freedom_direction(at, along, weights)
        if vector is None:
            known = list(self.anatomy.places) if self.anatomy else [str(named) for named in self.freedoms]
            near = get_close_matches(at, known, 1)
            hint = f"did you mean {near[0]!r}?" if near else f"known are {', '.join(known[:12])}."
            asked = at if along is None else f"{at} along {_in_words(along)}"
            raise ModelError(f"{asked}: there is no such place or freedom; {hint}")
        return vector

    def _freedom_direction(
        self, at: str, along: str | Sequence[float] | None, weights: Array | None
    ) -> Array | None:
        vector = np.zeros(self.size)
        if weights is None:
            names = [str(named) for named in self.freedoms]
            if at in names:
                vector[names.index(at)] = 1.0
            elif at.isdigit() and 1 <= int(at) <= self.size and not self.anatomy:
                vector[int(at) - 1] = 1.0
        else:
            for component, weight in zip(COMPONENTS, weights, strict=True):
                if weight:
                    try:
                        vector[self.freedoms.index(Freedom(at, component))] = weight
                    except ValueError:
                        return None
        return vector if vector.any() else None

    def modes(self, *, count: int | None = None, up_to: str | float | None = None) -> Modes:
        """See `vib.modes.find_modes`."""
        from vib.modes import find_modes

        return find_modes(self, count=count, up_to=up_to)

    def ring(self, **arguments: Any) -> Ring:
        """The free response; see `vib.response.ring.ring` for the arguments."""
        from vib.response.ring import ring

        return ring(self, **arguments)

    def respond(self, **arguments: Any) -> Response:
        """The response to loads over time; see `vib.response.respond.respond` for the arguments."""
        from vib.response.respond import respond

        return respond(self, **arguments)

    def frequency_response(self, **arguments: Any) -> FrequencyResponse:
        """Receptance, mobility, accelerance; see `vib.response.frequency.frequency_response`."""
        from vib.response.frequency import frequency_response

        return frequency_response(self, **arguments)

    def state_space(self, **arguments: Any) -> StateSpace:
        """The first-order model A, B, C, D; see `vib.statespace.state_space` for the arguments."""
        from vib.statespace import state_space

        return state_space(self, **arguments)


def _component_weights(at: str, along: str | Sequence[float] | None) -> Array | None:
    """Six weights of a direction, or None where no component was given."""
    if along is None:
        return None
    weights = np.zeros(6)
    if isinstance(along, str):
        name = along.strip().removeprefix("+")
        sign, name = (-1.0, name[1:]) if name.startswith("-") else (1.0, name)
        if name not in COMPONENTS:
            raise ModelError(
                f"{at} along {along!r}: the component is one of {', '.join(COMPONENTS)} "
                "(or minus one of them), or three numbers."
            )
        weights[COMPONENTS.index(name)] = sign
        return weights
    try:
        vector = np.array(along, dtype=np.float64)
    except (TypeError, ValueError):
        vector = np.zeros(0)
    if vector.shape != (3,) or not np.isfinite(vector).all() or not vector.any():
        raise ModelError(f"{at}: a direction is three finite numbers, not all zero, got {along!r}.")
    vector = vector / np.abs(vector).max()  # first by the largest, so that no square overflows
    weights[:3] = vector / np.linalg.norm(vector)
    return weights


def _in_words(along: str | Sequence[float] | None) -> str:
    return along if isinstance(along, str) else str(along)
