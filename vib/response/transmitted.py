"""Forces on the ground, as rows on the freedoms: of springs to the ground, and of supports.

A spring presses on the ground with its stiffness and dashpot times the motion of its end; for supports see
`vib.response.reactions`.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
import scipy.sparse as sparse

from vib.drive import Drive
from vib.response.exponential import Array
from vib.response.reactions import Foot, reactions
from vib.response.residue_sum import Complex
from vib.structure.rigid import turned
from vib.structure.springs import spring_axes
from vib.study import Study
from vib.study.machine import rayleigh_constants
from vib.study.quantities import COMPONENTS
from vib.system import System

_SAME = (
    1e-9  # components of a support that can't be told apart: singular values below this part of the largest
)


@dataclass(frozen=True, eq=False)
class Feet:
    """q forces: (stiffness + i w (damping + n turning) - w^2 mass) u + direct f - w^2 ground u_g.

    ``stiffness``, ``damping``, ``mass`` (q, n); ``turning`` (q, n) per rev/s of the reference shaft, None
    where nothing that spins is held; ``direct`` (q, i) from the inputs of a drive; ``ground`` (q, 6).
    """

    names: tuple[str, ...]
    owners: tuple[str, ...]
    components: tuple[str, ...]
    kinds: tuple[str, ...]
    stiffness: Array
    damping: Array
    mass: Array
    direct: Array
    ground: Array
    turning: Array | None
    remarks: tuple[str, ...] = ()

    def outputs(self) -> Array:
        """(n, 3 q) or (n, 4 q) directions whose displacements are needed."""
        rows = [self.stiffness, self.damping, self.mass]
        return np.vstack(rows if self.turning is None else [*rows, self.turning]).T

    def forces(
        self, speed_hz: Array, omega: Array, moved: Complex, pushed: Complex, shaken: Complex
    ) -> Complex:
        """(k, q) from displacements (k, ...) along `outputs`, inputs (k, i) and the ground (k, 6)."""
        q, w = len(self.names), omega[:, None]
        stiff, damped, heavy = (moved[:, number * q : (number + 1) * q] for number in range(3))
        if self.turning is not None:
            damped = damped + speed_hz[:, None] * moved[:, 3 * q :]
        found = stiff + 1j * w * damped - w**2 * heavy
        return np.asarray(found + pushed @ self.direct.T - w**2 * (shaken @ self.ground.T))


def feet(system: System, study: Study, drive: Drive) -> Feet:
    """Every spring to the ground and every support of a structure."""
    beta = 0.0 if study.damping.rayleigh is None else rayleigh_constants(study.damping.rayleigh)[1]
    found = list(_springs(system, study, beta))
    remarks: list[str] = []
    if study.supports:
        found += reactions(system, study, drive, remarks)
    law = (
        study.damping.ratio or study.damping.ranges or any(m.damping_ratio for m in study.materials.values())
    )
    if law and found:
        remarks.append(
            "Damping stated by ratios slows the motion, but presses on no support or spring by itself."
        )
    return _stacked(found, system.size, len(drive.inputs), tuple(remarks))


def _springs(system: System, study: Study, beta: float) -> Iterator[Foot]:
    """Turned into global axes: T' k T u at the end of the spring."""
    assert system.anatomy is not None
    for number, spring in enumerate(study.springs):
        axes = spring_axes(spring, number, [])
        turn = turned(axes[None])[0]
        stiff, dash = (
            turn.T @ np.diag([getattr(table, name) for name in COMPONENTS]) @ turn
            for table in (spring.stiffness, spring.dashpot)
        )
        damped = dash + beta * stiff
        for pair in spring.between:
            if "ground" not in pair:
                continue
            end = pair[0] if pair[1] == "ground" else pair[1]
            motion = system.anatomy.places[end].motion
            used = [c for c in range(6) if stiff[c].any() or damped[c].any()]
            yield Foot(
                f"{spring.name} {end}",
                "spring",
                tuple(COMPONENTS[c] for c in used),
                sparse.csr_array(stiff[used]) @ motion,
                sparse.csr_array(damped[used]) @ motion,
            )


def _stacked(found: list[Foot], size: int, inputs: int, remarks: tuple[str, ...]) -> Feet:
    names = [(foot, component) for foot in found for component in foot.components]

    def rows(key: str, width: int) -> Array:
        parts = [np.zeros((0, width))]
        for foot in found:
            matrix = getattr(foot, key)
            if matrix is None:
                matrix = np.zeros((len(foot.components), width))
            parts.append(matrix.toarray() if sparse.issparse(matrix) else np.asarray(matrix))
        return np.vstack(parts)

    return Feet(
        tuple(f"{foot.owner} {component}" for foot, component in names),
        tuple(foot.owner for foot, _ in names),
        tuple(component for _, component in names),
        tuple(foot.kind for foot, _ in names),
        rows("stiffness", size),
        rows("damping", size),
        rows("mass", size),
        rows("direct", inputs),
        rows("ground", 6),
        rows("turning", size) if any(foot.turning is not None for foot in found) else None,
        remarks,
    )
