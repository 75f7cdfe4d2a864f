"""From matrices of pieces, springs and bodies to sparse matrices of every part."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
import scipy.sparse as sparse
from numpy.typing import NDArray

from vib.structure.beam import twist_between
from vib.structure.freedoms import Nodes, number_nodes
from vib.structure.layout import Layout
from vib.structure.members import material_of, pieces_of
from vib.structure.preload import twisting
from vib.structure.rigid import arms
from vib.structure.springs import GROUND
from vib.structure.stacks import components_of, reduce_stack, scatter, unstack
from vib.system import Array, Freedom, Matrix, Part

if TYPE_CHECKING:
    from vib.structure.mesh.weaving import Woven

Indices = NDArray[np.intp]


@dataclass(frozen=True, eq=False)
class Assembly:
    """A layout cut into pieces: its nodes, and its parts on the rows of `Nodes.transform`.

    The matrices are stacks (see `stacks`), one of ``stiffness`` for each member group and then each spring
    table, one of ``mass`` for each member group and then each body, one of ``dashpot`` for each spring
    table. ``names`` of all parts: member groups, spring tables, bodies, regions of a mesh. ``woven`` is the
    mesh, assembled and joined to the rest; None without one. The stacks do not hold it.
    """

    layout: Layout
    counts: Indices
    nodes: Nodes
    names: tuple[str, ...]
    stiffness: Matrix
    mass: Matrix
    dashpot: Matrix
    woven: Woven | None = None

    @property
    def size(self) -> int:
        """How many freedoms."""
        return len(self.nodes.freedoms) if self.woven is None else self.woven.size

    @property
    def freedoms(self) -> Sequence[Freedom]:
        """The names of the freedoms."""
        if self.woven is None:
            return self.nodes.freedoms
        from vib.structure.mesh.weaving import MeshFreedoms

        return MeshFreedoms(self.nodes.freedoms, self.woven)

    def group_name(self, i: int) -> str:
        """The name of a member group."""
        return self.names[i]

    def spring_name(self, i: int) -> str:
        """The name of a spring table."""
        return self.names[len(self.layout.study.members) + i]

    def body_name(self, i: int) -> str:
        """The name of a body."""
        return self.names[len(self.layout.study.members) + len(self.layout.study.springs) + i]

    def reduced(self, stack: Matrix) -> Matrix:
        """A stack on the freedoms of the frame, each matrix symmetric to the last bit."""
        return reduce_stack(stack, self.nodes.transform)

    def parts(self, stiffness: Matrix, mass: Matrix) -> tuple[Part, ...]:
        """Every part but those of a mesh, from stacks of the shape of ``stiffness`` and ``mass``.

        None for what a part lacks.
        """
        study = self.layout.study
        groups, springs, bodies = (len(table) for table in (study.members, study.springs, study.bodies))
        stiff = [matrix if matrix.nnz else None for matrix in unstack(stiffness, groups + springs)] + [
            None
        ] * bodies
        heavy: list[Matrix | None] = [
            matrix if matrix.nnz else None for matrix in unstack(mass, groups + bodies)
        ]
        heavy[groups:groups] = [None] * springs
        kinds = ["members"] * groups + ["springs"] * springs + ["body"] * bodies
        ratios = [material_of(study, i)[2] for i in range(groups)] + [None] * (springs + bodies)
        names = self.names[: len(kinds)]
        return tuple(Part(*row) for row in zip(names, kinds, stiff, heavy, ratios, strict=True))

    def rigid_motion(self) -> Array:
        """Components of every node when everything moves as one body, about the origin; no twists."""
        found = np.zeros((self.nodes.transform.shape[0], 6))
        found[: 6 * len(self.nodes.places_m)] = arms(self.nodes.places_m).reshape(-1, 6)
        return found


def assemble(layout: Layout, counts: Indices) -> Assembly:
    """Assemble a layout whose stretches are cut into ``counts`` (s,) pieces.

    Raises
    ------
    ModelError
        There would be too many freedoms, or a member of impossible dimensions.
    """
    nodes = number_nodes(layout, counts)
    size = nodes.transform.shape[0]
    stiffness, mass = _members(layout, counts, nodes)
    springs, dashpots = _springs(layout, size)
    bodies = layout.bodies.mass
    numbers = np.arange(len(bodies))
    rows = components_of(len(layout.point_names) + numbers[:, None])
    heavy = scatter(bodies, rows, size, numbers, len(bodies))
    return Assembly(
        layout,
        counts,
        nodes,
        _part_names(layout),
        sparse.vstack([stiffness, springs], format="csr"),
        sparse.vstack([mass, heavy], format="csr"),
        dashpots,
        _woven(layout, nodes),
    )


def _woven(layout: Layout, nodes: Nodes) -> Woven | None:
    if layout.mesh is None or not layout.mesh.groups:
        return None
    from vib.structure.mesh.weaving import weave

    points = {name: i for i, name in enumerate(layout.point_names)}
    return weave(layout.mesh, points, nodes.transform)


def _part_names(layout: Layout) -> tuple[str, ...]:
    """The names of the tables; where two kinds share a name, the kind is added."""
    study = layout.study
    tables = (("members", study.members), ("springs", study.springs), ("body", study.bodies))
    named = [(row.name, word) for word, table in tables for row in table]
    named += [(region, "cells") for region in (layout.mesh.regions if layout.mesh else ())]
    times = Counter(name for name, _ in named)
    return tuple(f"{name} ({word})" if times[name] > 1 else name for name, word in named)


def _members(layout: Layout, counts: Indices, nodes: Nodes) -> tuple[Matrix, Matrix]:
    """Stacks of stiffness and mass, one of each member group."""
    size, groups = nodes.transform.shape[0], len(layout.study.members)
    group = layout.stretches.group[nodes.stretch]
    rows = components_of(nodes.chain)
    stiffness, mass = (
        scatter(blocks[nodes.stretch], rows, size, group, groups) for blocks in layout.piece_matrices(counts)
    )
    soft = nodes.twists >= 0
    if not soft.any():
        return stiffness, mass
    rows = np.concatenate([nodes.twists[soft, None], rows[soft, 3:6], rows[soft, 9:12]], axis=1)
    more = (
        scatter(blocks, rows, size, group[soft], groups)
        for blocks in _twists(layout, counts, nodes.stretch[soft])
    )
    return stiffness + next(more), mass + next(more)


def _twists(layout: Layout, counts: Indices, stretch: Indices) -> tuple[Array, Array]:
    """Stiffness and mass (pieces, 7, 7) of the twist between nodes with the turns of both nodes."""
    bars = pieces_of(layout.stretches.bars, counts)
    stiff, own, shared = (values[stretch] for values in twist_between(bars))
    stiff = stiff + (16 / 3 * twisting(bars, layout.stretches.pull) / bars.length)[stretch]
    stiffness, mass = np.zeros((2, len(stretch), 7, 7))
    stiffness[:, 0, 0], mass[:, 0, 0] = stiff, own
    link = np.tile(shared[:, None] * layout.stretches.axes[stretch, 0], 2)
    mass[:, 0, 1:] = mass[:, 1:, 0] = link
    return stiffness, mass


def _springs(layout: Layout, size: int) -> tuple[Matrix, Matrix]:
    """Stacks of stiffness and dashpots, one of each spring table."""
    springs = layout.springs
    grounded = springs.ends[:, 1] == GROUND
    # a grounded spring has no second node: its blocks there are zero and fall away
    rows = components_of(np.where(grounded[:, None], springs.ends[:, :1], springs.ends))
    blocks = (springs.matrices(springs.stiffness) + springs.pulled, springs.matrices(springs.dashpot))
    stiffness, dashpots = (
        scatter(block, rows, size, springs.owner, len(layout.study.springs)) for block in blocks
    )
    return stiffness, dashpots
