"""The estimated error of frequencies of solids against the true one."""

import numpy as np
import pytest
from scipy.sparse.linalg import eigsh

from tests.structure.cells.meshes import cube
from tests.structure.cells.test_solid_frequencies import CLAMPED_CUBE, FREE_CUBE, SHEAR_ONE
from vib.errors import AccuracyError
from vib.structure.cells import FAMILIES, Properties
from vib.structure.mesh import richer, solid_errors
from vib.structure.sparsity import Group, assemble, find_pattern

# Block 3:1:1 clamped on one end: bending pair, torsion, bending pair, axial, torsion; independent computation
# by edge-graded second-order hexahedra and by polynomial Ritz series, upper bounds that agree within 1.5e-4.
CANTILEVER = [0.1702, 0.1702, 0.4834, 0.7756, 0.7756, 0.8511, 1.449]


def modes(nodes, groups, held, count, shift=0.0):
    """Angular frequencies and shapes of unit modal mass on all freedoms, and the pattern."""
    assembly = assemble(nodes, groups)
    free = ~held.ravel()
    squares, shapes = eigsh(
        assembly.stiffness[free][:, free].tocsc(),
        count,
        assembly.mass[free][:, free].tocsc(),
        sigma=shift,
        v0=np.random.default_rng(1).normal(size=free.sum()),
    )
    whole = np.zeros((len(free), count))
    whole[free] = shapes[:, np.argsort(squares)]
    return np.sqrt(np.abs(np.sort(squares))), whole, assembly.pattern


def estimated(nodes, groups, pattern, held, shapes, angular):
    """Relative error of each frequency."""
    gain = solid_errors.solid_errors(nodes, groups, pattern, held, shapes, angular)
    return 1 - 1 / np.sqrt(1 + gain / angular**2)


def ratios(kind, counts, size, expected, held_below=None, seed=None):
    """Estimated over true error of the first modes of a block; ``seed`` moves nodes by a fifth of a cell."""
    nodes, cells = cube(kind, counts)
    if seed is not None:
        inner = np.sin(np.pi * nodes) * np.array([0.05, 0.04, -0.05])
        nodes = nodes + inner * np.cos(2 * np.pi * nodes[:, [1, 2, 0]] + seed)
    nodes = nodes * np.array(size)
    groups = [Group(FAMILIES[kind], cells, SHEAR_ONE)]
    held = np.zeros((len(nodes), 3), dtype=bool)
    if held_below is not None:
        held[nodes[:, 0] < held_below] = True
    rigid = 0 if held.any() else 6
    found, shapes, pattern = modes(nodes, groups, held, len(expected) + rigid, 0.0 if held.any() else -1.0)
    error = estimated(nodes, groups, pattern, held, shapes[:, rigid:], found[rigid:])
    return error / (found[rigid:] / np.array(expected) - 1)


@pytest.mark.parametrize(
    ("kind", "across"),
    [
        *(("tetra10", 3), ("hexahedron20", 2), ("hexahedron27", 2), ("wedge15", 2), ("pyramid13", 2)),
        *(("hexahedron", 4), ("wedge", 4), ("tetra", 4), ("pyramid", 3)),
    ],
)
def test_free_cube(kind, across):
    """All 14 elastic modes (converged values: see there), also on coarse cells of first order."""
    found = ratios(kind, (across,) * 3, (1, 1, 1), FREE_CUBE)
    assert found.min() > 0.7
    assert found.max() < 2.1


@pytest.mark.parametrize("seed", [None, 0.3])
@pytest.mark.parametrize(
    ("kind", "across"),
    [
        ("tetra10", 3),
        ("hexahedron20", 3),
        ("hexahedron27", 3),
        ("wedge15", 3),
        ("hexahedron", 5),
        ("tetra", 5),
    ],
)
def test_clamped_cube(kind, across, seed):
    """Singular stresses along the clamped edges, with even and with curved, uneven cells."""
    found = ratios(kind, (across,) * 3, (1, 1, 1), CLAMPED_CUBE, 1e-9, seed)
    assert found.min() > 0.5
    assert found.max() < 3


@pytest.mark.parametrize(
    ("kind", "counts"),
    [
        *(
            ("tetra10", (6, 2, 2)),
            ("hexahedron20", (6, 2, 2)),
            ("wedge15", (6, 2, 2)),
            ("pyramid13", (6, 2, 2)),
        ),
        *(("hexahedron", (9, 3, 3)), ("tetra", (12, 4, 4)), ("wedge", (12, 4, 4)), ("pyramid", (9, 3, 3))),
    ],
)
def test_cantilever_block(kind, counts):
    found = ratios(kind, counts, (3, 1, 1), CANTILEVER, 1e-9)
    assert found.min() > 0.5
    assert found.max() < 2.5


def test_long_cells():
    """Six times as long as wide: the conjugate gradients take more steps."""
    found = ratios("tetra10", (4, 8, 8), (3, 1, 1), CANTILEVER, 1e-9)
    assert found.min() > 0.5
    assert found.max() < 2


def everywhere(nodes):
    """All three components of the surface of the unit cube."""
    return np.repeat(((nodes < 1e-9) | (nodes > 1 - 1e-9)).any(axis=1)[:, None], 3, axis=1)


def test_a_field_in_balance_has_no_error():
    """Quadratic displacements without body force, within reach of the cells, on a held surface."""
    nodes, cells = cube("tetra10", (3, 3, 3))
    groups = [Group(FAMILIES["tetra10"], cells, SHEAR_ONE)]
    x, y, z = nodes.T
    field = np.stack([y * z, z * x, x * y + x**2 - y**2], axis=1).reshape(-1, 1)
    pattern = find_pattern(len(nodes), groups)
    arguments = nodes, groups, pattern, everywhere(nodes)
    slow = np.array([1e-9])
    assert solid_errors.solid_errors(*arguments, field, slow)[0] < 1e-20
    cubic = field + (z**3)[:, None].repeat(3, axis=1).reshape(-1, 1)
    assert solid_errors.solid_errors(*arguments, cubic, np.array([1.0]))[0] > 1e-3


def test_two_materials():
    """A bar of two stiffnesses whose stress is exact: nothing is smoothed across, the error is none."""
    nodes, cells = cube("hexahedron", (4, 2, 2))
    left = nodes[cells].mean(axis=1)[:, 0] < 0.5
    soft = Properties(youngs_modulus=1.0, poissons_ratio=0.0, density=1.0)
    hard = Properties(youngs_modulus=10.0, poissons_ratio=0.0, density=1.0)
    family = FAMILIES["hexahedron"]
    groups = [Group(family, cells[left], soft), Group(family, cells[~left], hard)]
    field = np.zeros((len(nodes), 3))
    field[:, 0] = np.minimum(nodes[:, 0], 0.5) + np.maximum(nodes[:, 0] - 0.5, 0) * 0.1
    held = np.zeros_like(field, dtype=bool)
    held[(nodes[:, 0] < 1e-9) | (nodes[:, 0] > 1 - 1e-9)] = True
    pattern = find_pattern(len(nodes), groups)
    shape, slow = field.reshape(-1, 1), np.array([1e-9])
    assert solid_errors.solid_errors(nodes, groups, pattern, held, shape, slow)[0] < 1e-20
    one = [Group(family, cells, soft)]
    assert solid_errors.solid_errors(nodes, one, pattern, held, shape, slow)[0] > 1e-3


@pytest.mark.parametrize("kind", ["hexahedron20", "hexahedron27", "tetra10", "wedge15"])
def test_numbering_changes_nothing(kind):
    """Nodes shuffled, and every cell turned to begin at another corner: signs and directions fit."""
    nodes, cells = cube(kind, (2, 2, 2))
    family, random = FAMILIES[kind], np.random.default_rng(7)
    held = everywhere(nodes) & (nodes[:, :1] < 0.5)
    groups = [Group(family, cells, SHEAR_ONE)]
    angular, shapes, pattern = modes(nodes, groups, held, 4)
    plain = solid_errors.solid_errors(nodes, groups, pattern, held, shapes, angular)
    place = random.permutation(len(nodes))
    turns = [turn for turn in _turns(family) if np.array_equal(np.sort(turn), np.arange(family.nodes))]
    assert len(turns) > 2
    turned = np.stack([cell[turns[random.integers(len(turns))]] for cell in place[cells]])
    moved, fixed, shuffled = np.empty_like(nodes), np.empty_like(held), np.empty_like(shapes)
    moved[place], fixed[place] = nodes, held
    shuffled.reshape(len(nodes), 3, -1)[place] = shapes.reshape(len(nodes), 3, -1)
    groups = [Group(family, turned, SHEAR_ONE)]
    pattern = find_pattern(len(nodes), groups)
    again = solid_errors.solid_errors(moved, groups, pattern, fixed, shuffled, angular)
    np.testing.assert_allclose(again, plain, rtol=1e-9)


def _turns(family):
    """Orders of the nodes after each rotation of the reference cell into itself."""
    places = family.reference - family.reference.mean(axis=0)
    corners = family.reference[: family.corners]
    found = []
    for a in range(family.corners):
        for b in range(family.corners):
            for c in range(family.corners):
                if len({a, b, c}) < 3:
                    continue
                third = family.corners - 1 if family.corners != 4 else 3
                start = np.column_stack([corners[1] - corners[0], corners[2] - corners[0]])
                end = np.column_stack([corners[b] - corners[a], corners[c] - corners[a]])
                for last in {*range(family.corners)} - {a, b, c}:
                    first = np.column_stack([start, corners[third] - corners[0]])
                    after = np.column_stack([end, corners[last] - corners[a]])
                    turn = after @ np.linalg.inv(first)
                    if np.linalg.det(turn) < 0.5:
                        continue
                    image = places @ turn.T
                    near = np.abs(image[:, None] - places[None]).max(axis=2)
                    if near.min(axis=1).max() < 1e-9:
                        # node k of the turned cell sits where its image lies
                        found.append(near.argmin(axis=1))
    return found


def test_in_pieces_it_is_the_same(monkeypatch):
    """Modes a few at a time, and stiffness computed again at each step, where memory is short."""
    nodes, cells = cube("tetra10", (3, 2, 2))
    groups = [Group(FAMILIES["tetra10"], cells, SHEAR_ONE)]
    held = np.repeat(nodes[:, :1] < 1e-9, 3, axis=1)
    angular, shapes, pattern = modes(nodes, groups, held, 6)
    arguments = nodes, groups, pattern, held, shapes, angular
    plain = solid_errors.solid_errors(*arguments)
    monkeypatch.setattr(solid_errors, "_KEPT_BYTES", 1000)
    monkeypatch.setattr(solid_errors, "_CHUNK_VALUES", 10_000)
    np.testing.assert_allclose(solid_errors.solid_errors(*arguments), plain, rtol=1e-9)
    monkeypatch.setattr(solid_errors, "_VECTOR_BYTES", 1)
    alone = solid_errors.solid_errors(*arguments)
    np.testing.assert_allclose(alone, plain, rtol=0.3)


def test_one_cell_will_do():
    """No patch of cells is needed; a single brick between two held ends keeps what runs from end to end."""
    found = ratios("hexahedron20", (1, 1, 1), (1, 1, 1), CLAMPED_CUBE, 1e-9)
    assert found.min() > 0.5
    assert found.max() < 3
    nodes, cells = cube("tetra10", (1, 1, 1))
    ends = np.repeat((np.abs(nodes[:, :1] - 0.5) > 0.4), 3, axis=1)
    functions = richer.richer([Group(FAMILIES["tetra10"], cells, SHEAR_ONE)], ends)
    assert functions.held.any()
    assert not functions.held.all()


def test_too_many_corners(monkeypatch):
    nodes, cells = cube("tetra", (2, 2, 2))
    monkeypatch.setattr(richer, "_MOST_CORNERS", 10)
    with pytest.raises(AccuracyError, match="more than 10 corners"):
        richer.richer([Group(FAMILIES["tetra"], cells, SHEAR_ONE)], np.zeros((len(nodes), 3), dtype=bool))


def test_modes_that_change_places_and_modes_far_apart():
    """The second mode falls by a third to below the first: the first listed is off by what separates them."""
    squares = np.array([1.0, 1.2])
    found = solid_errors._by_number(np.diag([0.01, 0.6]), squares)
    left = squares**2 / (squares + found)
    np.testing.assert_allclose(left, [1.2 / 1.5, 1 / 1.01])
    wide = np.geomspace(1e-6, 1e12, 7)
    np.testing.assert_allclose(solid_errors._by_number(np.diag(1e-6 * wide), wide), 1e-6 * wide, rtol=1e-8)


def test_cells_that_are_folded():
    """A cell turned inside out: its stiffness is negative, which is said rather than counted."""
    nodes, cells = cube("tetra10", (2, 2, 2))
    groups = [Group(FAMILIES["tetra10"], cells, SHEAR_ONE)]
    held = np.repeat(nodes[:, :1] < 1e-9, 3, axis=1)
    angular, shapes, pattern = modes(nodes, groups, held, 2)
    folded = cells.copy()
    folded[:6] = folded[:6][:, FAMILIES["tetra10"].mirrored]
    groups = [Group(FAMILIES["tetra10"], folded, SHEAR_ONE)]
    with pytest.raises(AccuracyError, match="so distorted"):
        solid_errors.solid_errors(nodes, groups, pattern, held, shapes, angular)
