"""From matrices of pieces, springs and bodies to sparse matrices on the freedoms."""

from __future__ import annotations

from collections import Counter
from dataclasses import dataclass

import numpy as np
import scipy.sparse as sparse
from numpy.typing import NDArray

from vib.structure.beam import twist_between
from vib.structure.freedoms import Nodes, number_nodes
from vib.structure.layout import Layout
from vib.structure.members import material_of, pieces_of
from vib.structure.rigid import arms
from vib.structure.springs import GROUND
from vib.system import Array, Matrix, Part

Indices = NDArray[np.intp]


@dataclass(frozen=True, eq=False)
class Raw:
    """One part on the rows of `Nodes.transform`, before anything is eliminated; None: has none."""

    name: str
    kind: str
    stiffness: Matrix | None
    mass: Matrix | None
    dashpot: Matrix | None = None
    damping_ratio: float | None = None


@dataclass(frozen=True, eq=False)
class Assembly:
    """A layout cut into pieces: its nodes, and its parts on the components of the nodes."""

    layout: Layout
    counts: Indices
    nodes: Nodes
    raw: tuple[Raw, ...]

    @property
    def size(self) -> int:
        """How many freedoms."""
        return len(self.nodes.freedoms)

    def reduce(self, raw: Matrix | None) -> Matrix | None:
        """T' X T on the freedoms, symmetric to the last bit."""
        if raw is None:
            return None
        transform = self.nodes.transform
        found = transform.T @ (raw @ transform)
        found = 0.5 * (found + found.T)
        found.eliminate_zeros()
        return sparse.csr_array(found)

    def parts(self) -> tuple[Part, ...]:
        """Every part on the freedoms."""
        return tuple(
            Part(
                part.name, part.kind, self.reduce(part.stiffness), self.reduce(part.mass), part.damping_ratio
            )
            for part in self.raw
        )

    def raw_sum(self, what: str) -> Matrix:
        """Stiffness, mass or dashpot of everything on the rows of `Nodes.transform`."""
        size = self.nodes.transform.shape[0]
        found = [getattr(part, what) for part in self.raw if getattr(part, what) is not None]
        return sum(found[1:], found[0]) if found else sparse.csr_array((size, size))

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
        There would be too many freedoms.
    """
    nodes = number_nodes(layout, counts)
    names = _part_names(layout)
    size = nodes.transform.shape[0]
    raw = [*_member_parts(layout, counts, nodes, names), *_spring_parts(layout, size, names)]
    for i, mass in enumerate(layout.bodies.mass):
        rows = components_of(np.array([[len(layout.point_names) + i]]))
        raw.append(Raw(names["bodies", i], "body", None, scatter(mass[None], rows, size)))
    return Assembly(layout, counts, nodes, tuple(raw))


def components_of(nodes: Indices) -> Indices:
    """(e, 6 m) rows of the six components of nodes (e, m)."""
    return (6 * nodes[:, :, None] + np.arange(6)).reshape(len(nodes), 6 * nodes.shape[1])


def scatter(blocks: Array, index: Indices, size: int) -> Matrix:
    """Sum (e, m, m) blocks of elements with rows (e, m) into a sparse (size, size) array."""
    rows = np.broadcast_to(index[:, :, None], blocks.shape).reshape(-1)
    columns = np.broadcast_to(index[:, None, :], blocks.shape).reshape(-1)
    values = blocks.reshape(-1)
    some = values != 0
    return sparse.coo_array((values[some], (rows[some], columns[some])), shape=(size, size)).tocsr()


def _part_names(layout: Layout) -> dict[tuple[str, int], str]:
    """The names of the tables; where two kinds share a name, the kind is added."""
    study = layout.study
    words = {"members": "members", "springs": "springs", "bodies": "body"}
    named = {(kind, i): row.name for kind in words for i, row in enumerate(getattr(study, kind))}
    times = Counter(named.values())
    return {key: f"{name} ({words[key[0]]})" if times[name] > 1 else name for key, name in named.items()}


def _member_parts(
    layout: Layout, counts: Indices, nodes: Nodes, names: dict[tuple[str, int], str]
) -> list[Raw]:
    stiffness, mass = layout.piece_matrices(counts)
    size = nodes.transform.shape[0]
    group = layout.stretches.group[nodes.stretch]
    found = []
    for i in range(len(layout.study.members)):
        mine = group == i
        which, chain = nodes.stretch[mine], nodes.chain[mine]
        _, _, ratio = material_of(layout.study, i)
        rows = components_of(chain)
        own = [scatter(blocks[which], rows, size) for blocks in (stiffness, mass)]
        twisting = nodes.twists[mine] >= 0
        if twisting.any():
            rows = np.concatenate(
                [nodes.twists[mine][twisting, None], rows[twisting, 3:6], rows[twisting, 9:12]], axis=1
            )
            own = [
                known + scatter(blocks, rows, size)
                for known, blocks in zip(own, _twists(layout, counts, which[twisting]), strict=True)
            ]
        found.append(Raw(names["members", i], "members", own[0], own[1], damping_ratio=ratio))
    return found


def _twists(layout: Layout, counts: Indices, stretch: Indices) -> tuple[Array, Array]:
    """Stiffness and mass (pieces, 7, 7) of the twist between nodes with the turns of both nodes."""
    bars = pieces_of(layout.stretches.bars, counts)
    stiff, own, shared = (values[stretch] for values in twist_between(bars))
    stiffness, mass = np.zeros((2, len(stretch), 7, 7))
    stiffness[:, 0, 0], mass[:, 0, 0] = stiff, own
    link = np.tile(shared[:, None] * layout.stretches.axes[stretch, 0], 2)
    mass[:, 0, 1:] = mass[:, 1:, 0] = link
    return stiffness, mass


def _spring_parts(layout: Layout, size: int, names: dict[tuple[str, int], str]) -> list[Raw]:
    springs = layout.springs
    grounded = springs.ends[:, 1] == GROUND
    # a grounded spring has no second node: its blocks there are zero and fall away
    rows = components_of(np.where(grounded[:, None], springs.ends[:, :1], springs.ends))
    found = []
    for i in range(len(layout.study.springs)):
        mine = springs.owner == i
        both = [
            scatter(springs.matrices(constants)[mine], rows[mine], size) if constants[mine].any() else None
            for constants in (springs.stiffness, springs.dashpot)
        ]
        found.append(Raw(names["springs", i], "springs", both[0], None, both[1]))
    return found
