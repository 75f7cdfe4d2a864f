"""From a study to a system: the way through the other rooms."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from vib.checks import as_matrix, check_finite, check_symmetric
from vib.errors import MatrixError, ModelError
from vib.structure.assembly import Assembly, assemble
from vib.structure.division import counts_for, first_counts
from vib.structure.layout import Layout, read_layout
from vib.structure.picture import draw, find_places
from vib.structure.remarks import assumptions
from vib.structure.spin import rotations
from vib.structure.stacks import add_up
from vib.study import Study
from vib.study.machine import rayleigh_constants
from vib.system import Anatomy, DampingLaw, Freedom, Matrix, Part, Rotation, System


def build_system(study: Study, frequency_hz: float | None = None) -> System:
    """The second-order system of a study.

    Parameters
    ----------
    study
        A structure, or matrices.
    frequency_hz
        Cut the members finely enough for modes up to here; None cuts them moderately.

    Returns
    -------
    System
        With `Anatomy` for a structure, without for matrices.

    Raises
    ------
    ModelError
        The structure cannot be built as described, or is too large.
    MatrixError
        The matrices of [matrices] do not describe a vibrating system.
    """
    if frequency_hz is not None and not (math.isfinite(frequency_hz) and frequency_hz > 0):
        raise ModelError(f"frequency limit: wanted a frequency above zero, got {frequency_hz:g} Hz")
    if study.matrices is not None:
        return _from_matrices(study)
    layout = read_layout(study)
    counts = first_counts(layout) if frequency_hz is None else counts_for(layout, frequency_hz)
    return to_system(assemble(layout, counts), assumptions(layout))


@dataclass(eq=False)
class PieceDivision:
    """The pieces that a structure was cut into, and the same structure cut otherwise (see `Division`)."""

    layout: Layout
    counts: NDArray[np.intp]
    accuracy: float
    remarks: tuple[str, ...]

    def coarser(self) -> System | None:
        """Half the pieces; None where a stretch cannot be halved, or there is none."""
        if not len(self.counts) or (self.counts % 2).any():
            return None
        return self._cut(self.counts // 2)

    def finer(self) -> System:
        """Twice the pieces."""
        return self._cut(self.counts * 2)

    def for_frequency(self, frequency_hz: float) -> System:
        """Pieces short enough for modes up to this frequency."""
        return self._cut(counts_for(self.layout, frequency_hz))

    def _cut(self, counts: NDArray[np.intp]) -> System:
        return to_system(assemble(self.layout, counts), self.remarks)


def to_system(assembly: Assembly, remarks: tuple[str, ...] = ()) -> System:
    """The system of an assembled structure, with what there is to remark on it.

    Raises
    ------
    ModelError
        Supports hold every freedom, or nothing that can move has a mass.
    """
    study, layout = assembly.layout.study, assembly.layout
    if not assembly.size:
        raise ModelError("supports: they hold everything, so that nothing can vibrate; hold fewer components")
    stiffnesses, masses = assembly.reduced(assembly.stiffness), assembly.reduced(assembly.mass)
    stiffness, mass = add_up(stiffnesses), add_up(masses)
    dashpots = add_up(assembly.reduced(assembly.dashpot))
    parts = assembly.parts(stiffnesses, masses)
    rigid = assembly.rigid_motion()
    pushed = add_up(assembly.mass) @ rigid
    carried, rigid_mass = assembly.nodes.transform.T @ pushed, rigid.T @ pushed
    mesh, discretisation = None, None
    if assembly.woven is not None:
        from vib.structure.mesh import whole

        woven = assembly.woven
        parts = whole.parts(assembly, woven, parts)
        stiffness, mass = whole.summed(woven.stiffness, stiffness), whole.summed(woven.mass, mass)
        dashpots = whole.enlarged(dashpots, woven.size)
        carried = whole.carried(woven, carried, woven.pushed)
        rigid_mass = rigid_mass + woven.rigid_motion().T @ woven.pushed
        mesh, discretisation = whole.view(woven), whole.discretisation(assembly, woven, parts)
    if not mass.nnz:
        raise ModelError("nothing that can move has a mass: give a material a density, or add [[bodies]]")
    anatomy = Anatomy(
        places=find_places(assembly),
        parts=parts,
        wireframe=draw(assembly, mesh),
        carried=carried,
        rigid_mass=rigid_mass,
        remarks=remarks,
        division=None if mesh else PieceDivision(layout, assembly.counts, study.accuracy, remarks),
        mesh=mesh,
        discretisation=discretisation,
    )
    turning = rotations(assembly, mass.shape[0])
    return System(
        mass=mass,
        stiffness=stiffness,
        damping=_damping(study, mass, stiffness, [dashpots] if dashpots.nnz else []),
        gyroscopic=_gyroscopic(turning),
        freedoms=assembly.freedoms,
        damping_law=_law(study, parts),
        anatomy=anatomy,
        rotations=turning,
    )


def _damping(study: Study, mass: Matrix, stiffness: Matrix, dashpots: list[Matrix]) -> Matrix | None:
    terms = list(dashpots)
    if study.damping.rayleigh is not None:
        alpha, beta = rayleigh_constants(study.damping.rayleigh)
        terms += [alpha * mass, beta * stiffness]
    return sum(terms[1:], terms[0]) if terms else None


def _gyroscopic(turning: tuple[Rotation, ...]) -> Matrix | None:
    terms = [2 * math.pi * row.speed_hz * row.gyroscopic for row in turning if row.gyroscopic is not None]
    return sum(terms[1:], terms[0]) if terms else None


def _law(study: Study, parts: tuple[Part, ...]) -> DampingLaw:
    return DampingLaw(
        ratio=study.damping.ratio,
        bands=study.damping.ranges,
        material=any(part.damping_ratio is not None for part in parts),
    )


def _from_matrices(study: Study) -> System:
    table, loaded = study.matrices, study.loaded
    if table is None or loaded is None:
        raise ModelError(
            "[matrices]: read the study from its file with vib.read, so that the matrices are loaded"
        )
    terms = [] if loaded.damping is None else [loaded.damping]
    circulatory = _circulatory(loaded.circulatory, table.freedoms)
    try:
        return System(
            mass=loaded.mass,
            stiffness=loaded.stiffness if loaded.circulatory is None else loaded.stiffness + circulatory,
            damping=_damping(study, loaded.mass, loaded.stiffness, terms),
            gyroscopic=loaded.gyroscopic,
            freedoms=tuple(Freedom(name, "") for name in table.freedoms),
            unsymmetric=table.unsymmetric or loaded.circulatory is not None,
            damping_law=_law(study, ()),
            rotations=_matrix_rotation(table.speed, loaded.gyroscopic, circulatory),
        )
    except MatrixError as error:
        raise MatrixError(f"matrices.{error}") from None


def _circulatory(given: Matrix | None, freedoms: tuple[str, ...]) -> Matrix | None:
    """The circulatory matrix, checked to be skew-symmetric."""
    if given is None:
        return None
    names = freedoms or tuple(str(number) for number in range(1, given.shape[0] + 1))
    try:
        matrix = as_matrix("circulatory", given, None)
        check_finite("circulatory", matrix, names)
        check_symmetric("circulatory", matrix, names, skew=True)
    except MatrixError as error:
        raise MatrixError(f"matrices.{error}") from None
    return matrix


def _matrix_rotation(
    speed_hz: float | None, gyroscopic: Matrix | None, circulatory: Matrix | None
) -> tuple[Rotation, ...]:
    if speed_hz is None:
        return ()
    unit = 2 * math.pi * speed_hz
    turning, following = (None if part is None else part / unit for part in (gyroscopic, circulatory))
    return (Rotation("shaft", speed_hz, speed_hz, turning, following),)
