"""Functions that solids lack: zero at their nodes, with the gradients said, shared by neighbours."""

import numpy as np
import pytest

from vib.structure.cells import FAMILIES
from vib.structure.cells import surplus as room
from vib.structure.cells.edges import EDGES, FACES
from vib.structure.cells.quadrature import Rule
from vib.structure.cells.solid import Solid
from vib.structure.cells.surplus import surplus_of

SOLIDS = {kind: family for kind, family in FAMILIES.items() if isinstance(family, Solid)}


def at(family, points, monkeypatch):
    """The functions at any points."""
    rule = Rule(points, np.ones(len(points)))
    monkeypatch.setattr(room, "_RULES", dict.fromkeys(room._RULES, (rule, rule)))
    return surplus_of(family)


def inside(family, count, seed=1):
    """Points inside the reference cell."""
    return (
        np.random.default_rng(seed).dirichlet(np.ones(family.corners), count)
        @ family.reference[: family.corners]
    )


@pytest.mark.parametrize("kind", SOLIDS)
def test_zero_at_the_nodes_and_not_within_reach_of_the_cell(kind, monkeypatch):
    family = SOLIDS[kind]
    nodes = family.reference * (1 - 1e-9)  # off the apex of pyramids
    own = at(family, nodes, monkeypatch)
    assert np.abs(own.values).max() < 1e-6
    points = inside(family, 400)
    together = np.hstack([family.shape(points), at(family, points, monkeypatch).values])
    assert np.linalg.matrix_rank(together) == together.shape[1]


@pytest.mark.parametrize("kind", SOLIDS)
def test_gradients(kind, monkeypatch):
    """By central differences of 1e-5: round-off and the third derivative leave less than 1e-8."""
    family = SOLIDS[kind]
    points = inside(family, 5)
    gradients = at(family, points, monkeypatch).gradients
    for axis in range(3):
        step = 1e-5 * np.eye(3)[axis]
        ahead, back = (at(family, points + way * step, monkeypatch).values for way in (1, -1))
        np.testing.assert_allclose((ahead - back) / 2e-5, gradients[:, :, axis], atol=1e-8)


@pytest.mark.parametrize("kind", SOLIDS)
def test_zero_on_every_face_that_does_not_hold_it(kind, monkeypatch):
    family = SOLIDS[kind]
    for face in FACES[family.corners]:
        share = np.random.default_rng(2).dirichlet(np.ones(len(face)), 6)
        found = at(family, (share @ family.reference[list(face)]) * (1 - 1e-12), monkeypatch)
        for column, corners in enumerate(found.corners):
            if not set(corners) <= set(face):
                assert np.abs(found.values[:, column]).max() < 1e-9


def test_edges_are_those_of_the_second_order_cells():
    """Their mid-edge nodes lie half way."""
    for kind in ("tetra10", "pyramid13", "wedge15", "hexahedron20"):
        family = SOLIDS[kind]
        ends = np.array(EDGES[family.corners])
        np.testing.assert_allclose(family.reference[ends].mean(axis=1), family.reference[family.corners :])


@pytest.mark.parametrize("order", [("tetra", "wedge", "pyramid", "hexahedron")])
def test_neighbours_of_all_kinds_have_the_same_trace(order, monkeypatch):
    """On a quadrangle and on a triangle, mapped to the reference face of each kind."""
    second = {"tetra": "tetra10", "wedge": "wedge15", "pyramid": "pyramid13", "hexahedron": "hexahedron20"}
    for size in (3, 4):
        for named in (order, [second[kind] for kind in order]):
            traces = []
            for kind in named:
                family = SOLIDS[kind]
                for face in FACES[family.corners]:
                    if len(face) != size:
                        continue
                    u, v = np.random.default_rng(3).uniform(0, 0.5, (2, 7))
                    weights = (
                        np.stack([1 - u - v, u, v], axis=1)
                        if size == 3
                        else np.stack([(1 - u) * (1 - v), u * (1 - v), u * v, (1 - u) * v], axis=1)
                    )
                    points = (weights @ family.reference[list(face)]) * (1 - 1e-12)
                    found = at(family, points, monkeypatch)
                    trace = {}
                    for column, (what, corners) in enumerate(zip(found.kinds, found.corners, strict=True)):
                        if set(corners) <= set(face):
                            places = [face.index(corner) for corner in corners]
                            sign = -1 if what == "odd edge" and places[0] > places[1] else 1
                            trace[what, tuple(sorted(places))] = sign * found.values[:, column]
                    traces.append(trace)
            for trace in traces[1:]:
                assert trace.keys() == traces[0].keys()
                for key, values in trace.items():
                    np.testing.assert_allclose(values, traces[0][key], atol=1e-9)
