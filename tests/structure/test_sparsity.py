"""Assembly against plain summation of element matrices, and the laws it keeps."""

import tracemalloc

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from vib.errors import ModelError
from vib.progress import listening
from vib.structure import sparsity
from vib.structure.cells import FAMILIES, Properties
from vib.structure.sparsity import Assembly, Group, assemble, find_pattern

STEEL = Properties(youngs_modulus=210e9, poissons_ratio=0.3, density=7850.0, thickness=0.1)


def box(across: int) -> tuple[np.ndarray, np.ndarray]:
    """Nodes and eight-node cells of a cube with displaced nodes, divided evenly; one node is left over."""
    steps = np.linspace(0, 1, across + 1)
    nodes = np.stack(np.meshgrid(steps, steps, steps, indexing="ij"), axis=-1).reshape(-1, 3)
    nodes += np.random.default_rng(2).uniform(-0.1, 0.1, size=nodes.shape) / across
    number = np.arange(len(nodes)).reshape((across + 1,) * 3)
    low, high = slice(None, -1), slice(1, None)
    bottom = [number[low, low, low], number[high, low, low], number[high, high, low], number[low, high, low]]
    top = [number[low, low, high], number[high, low, high], number[high, high, high], number[low, high, high]]
    cells = np.stack([corner.ravel() for corner in bottom + top], axis=1)
    return np.vstack([nodes, [[9.0, 9.0, 9.0]]]), cells


def mixed(across: int = 2) -> tuple[np.ndarray, list[Group]]:
    """Hexahedra, some of them cut into wedges, with plates of quads and triangles on one side."""
    nodes, cells = box(across)
    wedges = np.vstack([cells[:2][:, [0, 1, 2, 4, 5, 6]], cells[:2][:, [0, 2, 3, 4, 6, 7]]])
    soft = Properties(np.linspace(1e9, 2e9, len(cells) - 2), 0.2, np.linspace(1e3, 2e3, len(cells) - 2))
    return nodes, [
        Group(FAMILIES["hexahedron"], cells[2:], soft),
        Group(FAMILIES["wedge"], wedges, STEEL),
        Group(FAMILIES["quad"], cells[1:4, [0, 1, 2, 3]], STEEL),
        Group(FAMILIES["triangle"], cells[4:6, [0, 1, 2]], STEEL),
    ]


def plain(nodes: np.ndarray, groups: list[Group], assembly: Assembly) -> tuple[np.ndarray, np.ndarray]:
    """Dense stiffness and mass, cell by cell."""
    size, pattern = assembly.pattern.size, assembly.pattern
    stiffness, mass = np.zeros((size, size)), np.zeros((size, size))
    for group in groups:
        for number, cell in enumerate(group.connectivity):
            own = group.properties.of(np.array([number]))
            first = 3 * pattern.first[cell]
            rows = (first[:, None] + np.arange(group.family.freedoms)).ravel()
            stiffness[np.ix_(rows, rows)] += group.family.stiffness(nodes[cell][None], own)[0]
            mass[np.ix_(rows, rows)] += group.family.mass(nodes[cell][None], own)[0]
    return stiffness, mass


def test_the_sum_of_all_cells() -> None:
    nodes, groups = mixed()
    found = assemble(nodes, groups)
    for matrix, expected in zip((found.stiffness, found.mass), plain(nodes, groups, found), strict=True):
        np.testing.assert_allclose(matrix.toarray(), expected, atol=1e-13 * np.abs(expected).max())


def test_one_family_of_solids() -> None:
    nodes, cells = box(3)
    groups = [Group(FAMILIES["hexahedron"], cells, STEEL)]
    found = assemble(nodes, groups)
    for matrix, expected in zip((found.stiffness, found.mass), plain(nodes, groups, found), strict=True):
        np.testing.assert_allclose(matrix.toarray(), expected, atol=1e-13 * np.abs(expected).max())


def test_both_matrices_share_their_indices_and_are_exactly_symmetric() -> None:
    nodes, groups = mixed()
    found = assemble(nodes, groups)
    assert np.shares_memory(found.stiffness.indices, found.mass.indices)
    assert np.shares_memory(found.stiffness.indptr, found.mass.indptr)
    for matrix in (found.stiffness, found.mass):
        assert matrix.has_canonical_format
        np.testing.assert_array_equal((matrix - matrix.T).toarray(), 0)


def test_freedoms_follow_the_cells_that_meet_at_a_node() -> None:
    nodes, groups = mixed()
    pattern = find_pattern(len(nodes), groups)
    shells = np.unique(np.concatenate([group.connectivity.ravel() for group in groups[2:]]))
    expected = np.full(len(nodes), 1)
    expected[shells] = 2
    expected[-1] = 0  # the node without cells
    np.testing.assert_array_equal(np.diff(pattern.first), expected)
    rows = pattern.freedoms(groups[2])
    assert rows.shape == (3, 24)
    np.testing.assert_array_equal(rows[0, :6], 3 * pattern.first[groups[2].connectivity[0, 0]] + np.arange(6))


def test_chunks_change_nothing_but_the_last_bits(monkeypatch: pytest.MonkeyPatch) -> None:
    nodes, groups = mixed(3)
    seen: list[tuple[str, float | None]] = []
    expected = assemble(nodes, groups)
    monkeypatch.setattr(sparsity, "_CHUNK_VALUES", 1500)
    monkeypatch.setattr(sparsity, "_BLOCKS", 7)
    with listening(lambda work, share, _: seen.append((work, share))):
        found = assemble(nodes, groups)
    total = sum(len(group.connectivity) for group in groups)
    assert seen[-1] == ("assembling", 1.0)
    assert len(seen) > total / 4
    for one, other in ((found.stiffness, expected.stiffness), (found.mass, expected.mass)):
        np.testing.assert_array_equal(one.indices, other.indices)
        np.testing.assert_allclose(one.data, other.data, atol=1e-14 * np.abs(other.data).max())


@settings(max_examples=10, deadline=None)
@given(seed=st.integers(0, 10**6))
def test_renumbered_nodes_and_cells_give_the_renumbered_matrices(seed: int) -> None:
    random = np.random.default_rng(seed)
    nodes, groups = mixed()
    expected = assemble(nodes, groups)
    moved = random.permutation(len(nodes))  # where each node goes
    shuffled = [
        Group(group.family, moved[group.connectivity][order], group.properties.of(order))
        for group in groups
        for order in [random.permutation(len(group.connectivity))]
    ]
    places = np.empty_like(nodes)
    places[moved] = nodes
    found = assemble(places, shuffled)
    count = np.diff(expected.pattern.first) * 3
    rows = np.concatenate(
        [3 * found.pattern.first[moved[node]] + np.arange(count[node]) for node in range(len(nodes))]
    )
    for one, other in ((found.stiffness, expected.stiffness), (found.mass, expected.mass)):
        np.testing.assert_allclose(
            one.toarray()[np.ix_(rows, rows)], other.toarray(), atol=1e-13 * np.abs(other.data).max()
        )


def test_rigid_motion_of_the_whole() -> None:
    """No force in rigid motion, and the total mass of a cube of solids: its volume times its density."""
    nodes, cells = box(3)
    found = assemble(nodes[:-1], [Group(FAMILIES["hexahedron"], cells, STEEL)])
    shift = np.tile([1.0, 0.0, 0.0], len(nodes) - 1)
    turn = np.cross([0.0, 0.0, 1.0], nodes[:-1]).ravel()
    for motion in (shift, turn):
        scale = np.abs(found.stiffness.data).max()
        np.testing.assert_allclose(found.stiffness @ motion, 0, atol=1e-12 * scale)
    flat = nodes[:-1].copy()
    cube = np.round(flat * 3) / 3
    whole = assemble(cube, [Group(FAMILIES["hexahedron"], cells, STEEL)])
    assert shift @ (whole.mass @ shift) == pytest.approx(7850.0, rel=1e-13)


def test_memory_is_that_of_the_matrices_and_of_one_chunk(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(sparsity, "_CHUNK_VALUES", 100_000)
    nodes, cells = box(16)
    groups = [Group(FAMILIES["hexahedron"], cells, STEEL)]
    tracemalloc.start()
    found = assemble(nodes, groups)
    _, peak = tracemalloc.get_traced_memory()
    tracemalloc.stop()
    kept = found.stiffness.data.nbytes + found.mass.data.nbytes + found.stiffness.indices.nbytes
    assert peak < 2.5 * kept


@pytest.mark.parametrize(("node", "message"), [(99, "does not exist"), (-1, "does not exist"), (0, "twice")])
def test_impossible_node_numbers_are_named(node: int, message: str) -> None:
    nodes, cells = box(1)
    wrong = np.vstack([cells, cells])
    wrong[1, 3] = node
    with pytest.raises(ModelError, match=f"hexahedron cell 2 names a node .*{message}|cell 2 .*{message}"):
        assemble(nodes, [Group(FAMILIES["hexahedron"], wrong, STEEL)])
