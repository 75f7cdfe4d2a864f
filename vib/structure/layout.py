"""A study resolved into arrays that do not depend on how finely its members are cut."""

from __future__ import annotations

from dataclasses import dataclass, replace
from functools import cached_property
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from vib.errors import ModelError
from vib.structure.beam import local_mass, local_stiffness, to_global
from vib.structure.bodies import Bodies, read_bodies
from vib.structure.members import Stretches, coordinates_of, pieces_of, read_stretches
from vib.structure.preload import geometric_stiffness
from vib.structure.springs import Springs, read_springs
from vib.structure.ties import Ties, tie
from vib.study import Study
from vib.study.quantities import COMPONENTS
from vib.system import Array

if TYPE_CHECKING:
    from vib.structure.mesh import MeshModel

_FARTHEST = 1e9  # m; beyond it, squares and cubes of lengths leave the range of numbers


@dataclass(frozen=True, eq=False)
class Layout:
    """The structure before it is cut: points, stretches of members, springs, bodies and what ties them.

    ``study`` has plain points only: those found in a mesh are resolved. ``coordinates_m`` (p, 3); ``held``
    (p, 6) by supports; ``mesh`` the cells of a mesh, None without one.
    """

    study: Study
    point_names: tuple[str, ...]
    coordinates_m: Array
    held: NDArray[np.bool_]
    stretches: Stretches
    springs: Springs
    bodies: Bodies
    ties: Ties
    mesh: MeshModel | None = None

    @cached_property
    def extent_m(self) -> float:
        """The largest side of the box around everything; 1 m for a single place."""
        parts = [self.coordinates_m, self.bodies.centres_m, self.stretches.tips_m.reshape(-1, 3)]
        places = np.concatenate(parts if self.mesh is None else [*parts, self.mesh.nodes_m])
        return float(np.ptp(places, axis=0).max()) or 1.0

    def piece_matrices(self, counts: NDArray[np.intp]) -> tuple[Array, Array]:
        """Stiffness and mass (s, 12, 12) of one piece of each stretch, in global components.

        Raises
        ------
        ModelError
            Dimensions so large or small that the stiffness cannot be written as a number.
        """
        bars = pieces_of(self.stretches.bars, counts)
        turn = self.stretches.principal_axes
        with np.errstate(all="ignore"):
            stiffness, mass = local_stiffness(bars), local_mass(bars)
            pulled = geometric_stiffness(bars, self.stretches.pull)
            own = np.diagonal(stiffness, axis1=1, axis2=2).min(axis=1)
            fine = np.isfinite(stiffness + mass).all(axis=(1, 2)) & (own > np.finfo(float).tiny)
        if not fine.all():
            entry = self.stretches.entries[int(np.argmin(fine))]
            raise ModelError(
                f"{entry}: its length, section and material give a stiffness or mass beyond all numbers; "
                "check their units"
            )
        return to_global(stiffness + pulled, turn), to_global(mass, turn)


def read_layout(study: Study) -> Layout:
    """Resolve a study.

    Raises
    ------
    ModelError
        The structure cannot be built as described; every fault that was found, each naming its entry.
    """
    mesh = None
    if study.mesh is not None:
        # loaded where there is one: a frame shall not wait for what it does not need
        from vib.structure.mesh import read_mesh_study
        from vib.structure.mesh.parts import check_parts, components_in_cells

        study, mesh = read_mesh_study(study)
    points = {name: i for i, name in enumerate(study.points)}
    coordinates = coordinates_of(study)
    faults = [
        f"points.{name}: lies {np.abs(place).max():.3g} m away; check its unit"
        for name, place in zip(points, coordinates, strict=True)
        if np.abs(place).max() > _FARTHEST
    ]
    if mesh is not None and np.abs(mesh.nodes_m).max() > _FARTHEST:
        faults.append(f"mesh: it reaches {np.abs(mesh.nodes_m).max():.3g} m away; check its length unit")
    if faults:
        raise ModelError("\n".join(faults))
    stretches = read_stretches(study, points, faults)
    springs = read_springs(study, points, faults)
    if mesh is not None and len(mesh.shares) == len(springs.owner):
        share = np.array(mesh.shares).reshape(-1, 1)
        springs = replace(springs, stiffness=share * springs.stiffness, dashpot=share * springs.dashpot)
    bodies = read_bodies(study, points)
    held = np.zeros((len(points), 6), dtype=bool)
    for support in study.supports:
        for name in support.at:
            held[points[name], [COMPONENTS.index(component) for component in support.hold]] = True
    in_cells = None if mesh is None else components_in_cells(mesh, points)
    ties = tie(tuple(points), coordinates, held, stretches, springs, bodies, faults, in_cells)
    if faults:
        raise ModelError("\n".join(faults))
    layout = Layout(study, tuple(points), coordinates, held, stretches, springs, bodies, ties, mesh)
    if mesh is not None:
        check_parts(mesh, points, held, stretches, springs, bodies)
    return layout
