"""Nested dissection of a symmetric pattern: an elimination order that leaves few, large dense blocks.

A. George, SIAM J. Numer. Anal. 10 (1973) 345-363. The graph is laid out in space by its own distances
(D. Harel, Y. Koren, J. Graph Algorithms Appl. 8 (2004) 195-214) and halved across its longest direction
(inertial bisection, H. D. Simon, Comput. Syst. Eng. 2 (1991) 135-148); the cut edges give the smallest
separator that covers them (D. Koenig's theorem; A. Pothen, C.-J. Fan, ACM Trans. Math. Softw. 16 (1990)
303-324).
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
import scipy.sparse as sparse
from numpy.typing import NDArray

Numbers = NDArray[np.intp]
Flags = NDArray[np.bool_]
Points = NDArray[np.float64]

# Equations of a part that is not halved any more: its dense block is quicker than more small ones.
LEAF = 160
LANDMARKS = 8
# A node with this many times the mean of neighbours joins the last block: it would tie everything together.
HUB = 12.0
# A direction is tried as well as the longest where the part reaches this share as far in it.
NEARLY_AS_LONG = 0.6


@dataclass(frozen=True, eq=False)
class Dissection:
    """Blocks of equations in the order of elimination, children before parents.

    ``order`` (n,) lists the equations; block b holds those from ``starts[b]`` to ``starts[b + 1]``;
    ``parents`` (blocks,) is the block that follows each in the tree, -1 for a root.
    """

    order: Numbers
    starts: Numbers
    parents: Numbers


def dissect(pattern: sparse.csr_array, leaf: int = LEAF) -> Dissection:
    """Order the equations of a matrix given by (the upper triangle of) its symmetric pattern."""
    nodes = _alike(pattern)
    count = int(nodes.max()) + 1
    weights = np.bincount(nodes, minlength=count)
    graph = _quotient(pattern, nodes, count)
    degree = np.diff(graph.indptr)
    hubs = np.flatnonzero(degree > HUB * max(degree.mean(), 4.0))
    rest = np.setdiff1d(np.arange(count), hubs)
    blocks = _Blocks(leaf, weights)
    root = blocks.add(hubs, -1) if hubs.size else -1
    inner = graph[rest][:, rest] if hubs.size else graph
    for part in _components(inner):
        inside = inner[part][:, part] if len(part) < inner.shape[0] else inner
        blocks.halve(rest[part], inside, root)
    return blocks.finish(nodes)


class _Blocks:
    """Blocks of nodes, parents found before children."""

    def __init__(self, leaf: int, weights: Numbers) -> None:
        self._leaf, self._weights = leaf, weights
        self._nodes: list[Numbers] = []
        self._parents: list[int] = []

    def add(self, nodes: Numbers, parent: int) -> int:
        self._nodes.append(nodes)
        self._parents.append(parent)
        return len(self._nodes) - 1

    def halve(self, nodes: Numbers, graph: sparse.csr_array, root: int) -> None:
        """Halve a connected part of the graph over and over."""
        points = _layout(graph)
        sources = np.repeat(np.arange(len(nodes)), np.diff(graph.indptr))
        waiting = [(np.arange(len(nodes)), sources, np.asarray(graph.indices, dtype=np.intp), root)]
        local = np.empty(len(nodes), dtype=np.intp)
        while waiting:
            part, start, end, parent = waiting.pop()
            cut = None
            if self._weights[nodes[part]].sum() > self._leaf:
                cut = _separator(points[part], self._weights[nodes[part]], start, end)
            if cut is None:
                self.add(nodes[part], parent)
                continue
            between = np.flatnonzero(cut == 2)
            block = self.add(nodes[part[between[_along(points[part[between]])]]], parent)
            for side in (0, 1):
                chosen = cut == side
                local[: len(part)] = np.cumsum(chosen) - 1
                inside = chosen[start] & chosen[end]
                waiting.append((part[chosen], local[start[inside]], local[end[inside]], block))

    def finish(self, nodes: Numbers) -> Dissection:
        """Number the blocks from the leaves up and spell out the equations of their nodes."""
        depth_first = _postorder(self._parents)
        place = np.empty(len(depth_first), dtype=np.intp)
        place[depth_first] = np.arange(len(depth_first))
        old = np.asarray(self._parents, dtype=np.intp)[depth_first]
        parents = np.where(old >= 0, place[old], -1)
        listed = np.concatenate([self._nodes[b] for b in depth_first])
        by_node = np.argsort(nodes, kind="stable")
        firsts = np.concatenate([[0], np.cumsum(self._weights)])
        order = by_node[_ranges(firsts[listed], self._weights[listed])]
        sizes = [int(self._weights[self._nodes[b]].sum()) for b in depth_first]
        return Dissection(order, np.concatenate([[0], np.cumsum(sizes)]).astype(np.intp), parents)


def _postorder(parents: list[int]) -> Numbers:
    """Blocks with every child before its parent, each subtree in one piece."""
    children: dict[int, list[int]] = {}
    for block, parent in enumerate(parents):
        children.setdefault(parent, []).append(block)
    order: list[int] = []
    stack = list(children.get(-1, []))
    while stack:
        block = stack.pop()
        order.append(block)
        stack.extend(children.get(block, []))
    return np.asarray(order[::-1], dtype=np.intp)


def _ranges(starts: Numbers, lengths: Numbers) -> Numbers:
    """The numbers start, start + 1, ... of several ranges, one after another."""
    ends = np.cumsum(lengths)
    return np.arange(int(ends[-1]) if len(ends) else 0) + np.repeat(starts - ends + lengths, lengths)


def _distinct(numbers: Numbers) -> Numbers:
    """The different numbers, ascending; by sorting, which beats the hashing of numpy.unique here."""
    ordered = np.sort(numbers)
    return ordered[np.diff(ordered, prepend=-1) > 0]


def _alike(pattern: sparse.csr_array) -> Numbers:
    """A node for each equation; equations of the same pattern (the freedoms of one point) share one."""
    size = pattern.shape[0]
    mark = np.random.default_rng(7).integers(1, 2**40, size=size).astype(np.float64)
    ones = sparse.csr_array((np.ones(pattern.nnz), pattern.indices, pattern.indptr), shape=pattern.shape)
    sums = ones @ mark + ones.T @ mark - mark
    # sums of whole numbers below 2**53 are exact, so equal patterns have equal sums
    _, first, same = np.unique(sums, return_index=True, return_inverse=True)
    rank = np.empty(len(first), dtype=np.intp)
    rank[np.argsort(first)] = np.arange(len(first))
    return rank[same.ravel()]


def _quotient(pattern: sparse.csr_array, nodes: Numbers, count: int) -> sparse.csr_array:
    """The graph of the nodes: symmetric, no loops."""
    speakers = np.empty(count, dtype=np.intp)  # one equation for each node; the others have the same pattern
    speakers[nodes[::-1]] = np.arange(len(nodes))[::-1]
    ones = np.ones(pattern.nnz, dtype=np.int8)
    between = sparse.csr_array((ones, pattern.indices, pattern.indptr), shape=pattern.shape)[speakers][
        :, speakers
    ]
    above = sparse.triu(between, k=1) + sparse.tril(between, k=-1).T  # speakers may be out of order
    return sparse.csr_array(above + above.T)


def _components(graph: sparse.csr_array) -> list[Numbers]:
    from scipy.sparse.csgraph import connected_components

    number, labels = connected_components(graph, directed=False)
    order = np.argsort(labels, kind="stable")
    return np.split(order, np.searchsorted(labels[order], np.arange(1, number))) if number else []


def _layout(graph: sparse.csr_array) -> Points:
    """Places of the nodes (n, <=3): principal directions of their distances from a few far-apart ones."""
    far = _distances(graph, int(np.argmax(_distances(graph, 0))))
    columns, nearest = [far], far.copy()
    for _ in range(LANDMARKS - 1):
        columns.append(_distances(graph, int(np.argmax(nearest))))
        nearest = np.minimum(nearest, columns[-1])
    table = np.stack(columns, axis=1).astype(np.float64)
    table -= table.mean(axis=0)
    return _principal(table)[0]


def _principal(points: Points) -> tuple[Points, Points]:
    """Up to three principal coordinates of centred points, longest first, and their spreads."""
    values, axes = np.linalg.eigh(points.T @ points)
    chosen = np.argsort(-values)[:3]
    return points @ axes[:, chosen], np.sqrt(np.maximum(values[chosen], 0.0))


def _distances(graph: sparse.csr_array, root: int) -> Numbers:
    """Edges from the root to each node of a connected graph."""
    distance = np.full(graph.shape[0], -1, dtype=np.intp)
    distance[root] = 0
    front = np.array([root])
    step = 0
    while front.size:
        step += 1
        starts = graph.indptr[front].astype(np.intp)
        reached = graph.indices[_ranges(starts, graph.indptr[front + 1] - starts)]
        front = _distinct(reached[distance[reached] < 0])
        distance[front] = step
    return distance


def _separator(points: Points, weights: Numbers, start: Numbers, end: Numbers) -> Numbers | None:
    """For each node 0 or 1, its side, or 2, in the separator; None where the part does not come apart."""
    centred = points - np.average(points, axis=0, weights=weights)
    places, spreads = _principal(centred)
    best, fewest = None, np.inf
    for axis in range(places.shape[1]):
        if axis and spreads[axis] < NEARLY_AS_LONG * spreads[0]:
            break
        order = np.argsort(places[:, axis], kind="stable")
        heavy = np.cumsum(weights[order])
        sides = np.empty(len(points), dtype=np.int8)
        sides[order] = heavy > heavy[-1] / 2
        cut = (sides[start] == 0) & (sides[end] == 1)
        found = sides.astype(np.intp)
        found[_cover(start[cut], end[cut], len(points))] = 2
        shares = np.bincount(found, weights=weights, minlength=3)
        if min(shares[0], shares[1]) > 0 and shares[2] < fewest:
            best, fewest = found, shares[2]
    return best


def _cover(left: Numbers, right: Numbers, size: int) -> Numbers:
    """The fewest nodes that touch every edge from ``left`` to ``right`` (two disjoint sets of nodes)."""
    from scipy.sparse.csgraph import maximum_bipartite_matching

    if left.size == 0:
        return left
    rows, row = np.unique(left, return_inverse=True)
    columns, column = np.unique(right, return_inverse=True)
    ones = np.ones(len(row), dtype=np.int8)
    edges = sparse.csr_array((ones, (row.ravel(), column.ravel())), shape=(len(rows), len(columns)))
    partner = maximum_bipartite_matching(edges, perm_type="column")  # of each row, -1: none
    of_column = np.full(len(columns), -1)
    of_column[partner[partner >= 0]] = np.flatnonzero(partner >= 0)
    row_seen, column_seen = partner < 0, np.zeros(len(columns), dtype=bool)
    front = np.flatnonzero(row_seen)
    while front.size:  # along alternating paths from the rows without partner
        starts = edges.indptr[front].astype(np.intp)
        reached = _distinct(edges.indices[_ranges(starts, edges.indptr[front + 1] - starts)])
        reached = reached[~column_seen[reached]]
        column_seen[reached] = True
        front = of_column[reached]
        front = front[front >= 0]
        front = front[~row_seen[front]]
        row_seen[front] = True
    return np.concatenate([rows[~row_seen], columns[column_seen]])


def _along(points: Points) -> Numbers:
    """An order in which neighbours in space stay together: halves of halves, along the longest direction."""
    order = np.arange(len(points))
    waiting: list[tuple[int, int]] = [(0, len(points))]
    while waiting:
        first, last = waiting.pop()
        if last - first <= 4:
            continue
        inside = points[order[first:last]]
        axis: Any = np.argmax(np.ptp(inside, axis=0))
        order[first:last] = order[first:last][np.argsort(inside[:, axis], kind="stable")]
        middle = (first + last) // 2
        waiting += [(first, middle), (middle, last)]
    return order
