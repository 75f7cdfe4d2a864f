"""A study resolved into arrays that do not depend on how finely its members are cut."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from vib.errors import ModelError
from vib.structure.beam import local_mass, local_stiffness, to_global
from vib.structure.bodies import Bodies, read_bodies
from vib.structure.members import Stretches, pieces_of, read_stretches
from vib.structure.springs import Springs, read_springs
from vib.structure.ties import Ties, tie
from vib.study import Study
from vib.study.quantities import COMPONENTS
from vib.system import Array

_FARTHEST = 1e9  # m; beyond it, squares and cubes of lengths leave the range of numbers


@dataclass(frozen=True, eq=False)
class Layout:
    """The structure before it is cut: points, stretches of members, springs, bodies and what ties them.

    ``coordinates_m`` (p, 3); ``held`` (p, 6) by supports.
    """

    study: Study
    point_names: tuple[str, ...]
    coordinates_m: Array
    held: NDArray[np.bool_]
    stretches: Stretches
    springs: Springs
    bodies: Bodies
    ties: Ties

    @cached_property
    def extent_m(self) -> float:
        """The largest side of the box around everything; 1 m for a single place."""
        places = np.concatenate(
            [self.coordinates_m, self.bodies.centres_m, self.stretches.tips_m.reshape(-1, 3)]
        )
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
            own = np.diagonal(stiffness, axis1=1, axis2=2).min(axis=1)
            fine = np.isfinite(stiffness + mass).all(axis=(1, 2)) & (own > np.finfo(float).tiny)
        if not fine.all():
            entry = self.stretches.entries[int(np.argmin(fine))]
            raise ModelError(
                f"{entry}: its length, section and material give a stiffness or mass beyond all numbers; "
                "check their units"
            )
        return to_global(stiffness, turn), to_global(mass, turn)


def read_layout(study: Study) -> Layout:
    """Resolve a study.

    Raises
    ------
    ModelError
        The structure cannot be built as described; every fault that was found, each naming its entry.
    """
    points = {name: i for i, name in enumerate(study.points)}
    faults = [
        f"points.{name}: lies {max(map(abs, place)):.3g} m away; check its unit"
        for name, place in study.points.items()
        if max(map(abs, place)) > _FARTHEST
    ]
    if faults:
        raise ModelError("\n".join(faults))
    stretches = read_stretches(study, points, faults)
    springs = read_springs(study, points, faults)
    bodies = read_bodies(study, points)
    coordinates = np.array(list(study.points.values()), dtype=float).reshape(-1, 3)
    held = np.zeros((len(points), 6), dtype=bool)
    for support in study.supports:
        for name in support.at:
            held[points[name], [COMPONENTS.index(component) for component in support.hold]] = True
    ties = tie(tuple(points), coordinates, held, stretches, springs, bodies, faults)
    if faults:
        raise ModelError("\n".join(faults))
    return Layout(study, tuple(points), coordinates, held, stretches, springs, bodies, ties)
