"""Nodes of a cut structure and the sparse matrix that makes them follow the freedoms that remain."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import scipy.sparse as sparse
from numpy.typing import NDArray

from vib.errors import ModelError
from vib.structure.layout import Layout
from vib.study.quantities import COMPONENTS
from vib.system import Array, Freedom, Matrix

Indices = NDArray[np.intp]
MOST_FREEDOMS = 200_000


@dataclass(frozen=True, eq=False)
class Nodes:
    """Points, bodies, separate ends of stretches and cuts inside them, numbered in this order.

    ``places_m`` (k, 3); ``transform`` sparse (6 k + t, n): the components of every node from the freedoms,
    and below them the t twists between nodes (`beam.twist_between`); ``freedoms`` their names; ``chain``
    (pieces, 2) the nodes of every piece, stretch by stretch; ``stretch`` (pieces,) that it belongs to;
    ``twists`` (pieces,) the row of its twist, -1 for none; ``ends`` (s, 2) the nodes at the ends of each
    stretch; ``inside`` (s,) the first node inside each stretch.
    """

    places_m: Array
    transform: Matrix
    freedoms: tuple[Freedom, ...]
    chain: Indices
    stretch: Indices
    twists: Indices
    ends: Indices
    inside: Indices

    def along(self, stretch: int, count: int) -> tuple[int, ...]:
        """The nodes of a stretch of ``count`` pieces, from start to end."""
        first = int(self.inside[stretch])
        return (int(self.ends[stretch, 0]), *range(first, first + count - 1), int(self.ends[stretch, 1]))


def number_nodes(layout: Layout, counts: Indices) -> Nodes:
    """Number the nodes of a layout whose stretches are cut into ``counts`` (s,) pieces.

    Raises
    ------
    ModelError
        There would be more freedoms than `MOST_FREEDOMS`.
    """
    stretches = layout.stretches
    soft = stretches.bars.twists_softly()
    inner = int((counts - 1).sum())
    size = 6 * inner + int(counts[soft].sum())
    if size > MOST_FREEDOMS:
        raise ModelError(
            f"the members would be cut into {int(counts.sum())} pieces with {size} freedoms, more than "
            f"{MOST_FREEDOMS}; ask for a lower frequency limit or fewer modes, or for less accuracy"
        )
    first_end = len(layout.ties.hub)
    separate = stretches.separate
    ends = np.where(separate, first_end + np.cumsum(separate).reshape(-1, 2) - 1, stretches.ends)
    first_inner = first_end + int(separate.sum())
    inside = first_inner + np.concatenate([[0], np.cumsum(counts - 1)[:-1]]).astype(np.intp)[: len(counts)]
    stretch = np.repeat(np.arange(len(counts)), counts)
    step = np.arange(len(stretch)) - np.repeat(np.cumsum(counts) - counts, counts)
    behind = np.where(step == 0, ends[stretch, 0], inside[stretch] + step - 1)
    ahead = np.where(step == counts[stretch] - 1, ends[stretch, 1], inside[stretch] + step)
    cut = step > 0
    share = (step[cut] / counts[stretch[cut]])[:, None]
    tips = stretches.tips_m
    between = (1 - share) * tips[stretch[cut], 0] + share * tips[stretch[cut], 1]
    places = np.concatenate([layout.coordinates_m, layout.bodies.centres_m, tips[separate], between])
    twisting = soft[stretch]
    twists = np.where(twisting, 6 * len(places) - 1 + np.cumsum(twisting), -1)
    transform, freedoms = _transform(layout, separate, 6 * inner + int(twisting.sum()))
    freedoms += _names_inside(layout, counts)
    freedoms += [
        Freedom(f"{layout.stretches.labels[s]} piece {k + 1}/{counts[s]}", "rx")
        for s, k in zip(stretch[twisting].tolist(), step[twisting].tolist(), strict=True)
    ]
    chain = np.stack([behind, ahead], axis=1)
    return Nodes(places, transform, tuple(freedoms), chain, stretch, twists, ends, inside)


def _transform(layout: Layout, separate: NDArray[np.bool_], own_rows: int) -> tuple[Matrix, list[Freedom]]:
    """The sparse matrix, and the names of all freedoms but the last, those inside stretches.

    ``own_rows`` counts the rows inside stretches, which are freedoms themselves.
    """
    ties, stretches = layout.ties, layout.stretches
    column = np.full(ties.kept.shape, -1, dtype=np.intp)
    column[ties.kept] = np.arange(ties.kept.sum())
    hub_names = (*layout.point_names, *layout.bodies.names)
    names = [Freedom(hub_names[h], COMPONENTS[c]) for h, c in zip(*np.nonzero(ties.kept), strict=True)]
    released = stretches.released[separate]
    own = np.full(released.shape, -1, dtype=np.intp)
    own[released] = len(names) + np.arange(released.sum())
    labels = [
        f"{stretches.labels[s]} at {layout.point_names[stretches.ends[s, e]]}"
        for s, e in zip(*np.nonzero(separate), strict=True)
    ]
    names += [Freedom(labels[x], COMPONENTS[c]) for x, c in zip(*np.nonzero(released), strict=True)]

    at = stretches.ends[separate]
    follow = stretches.attachment()[separate] @ ties.follow[at]
    axes = stretches.axes[np.nonzero(separate)[0]]
    along = np.zeros((len(at), 6, 6))
    along[:, :3, :3] = along[:, 3:, 3:] = np.swapaxes(axes, 1, 2)
    outer = len(ties.hub) + len(at)
    rows, columns, values = (
        np.concatenate(parts)
        for parts in zip(
            _entries(ties.follow, column[ties.hub], 0),
            _entries(follow, column[ties.hub[at]], len(ties.hub)),
            _entries(along, own, len(ties.hub)),
            (6 * outer + np.arange(own_rows), len(names) + np.arange(own_rows), np.ones(own_rows)),
            strict=True,
        )
    )
    shape = (6 * outer + own_rows, len(names) + own_rows)
    return sparse.coo_array((values, (rows, columns)), shape=shape).tocsr(), names


def _entries(blocks: Array, columns: Indices, first_node: int) -> tuple[Indices, Indices, Array]:
    """Row, column and value of what is not zero in (k, 6, 6) blocks with columns (k, 6); -1 is no column."""
    node, row, place = np.nonzero((blocks != 0) & (columns >= 0)[:, None, :])
    return 6 * (first_node + node) + row, columns[node, place], blocks[node, row, place]


def _names_inside(layout: Layout, counts: Indices) -> list[Freedom]:
    return [
        Freedom(f"{label} at {k}/{count}", component)
        for label, count in zip(layout.stretches.labels, counts.tolist(), strict=True)
        for k in range(1, count)
        for component in COMPONENTS
    ]
