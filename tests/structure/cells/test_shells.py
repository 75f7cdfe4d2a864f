"""Laws that every shell family keeps, on distorted cells, and published checks of curved shells."""

from collections.abc import Callable

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from hypothesis.extra.numpy import arrays
from scipy.sparse.linalg import spsolve

from vib.errors import ModelError
from vib.structure.cells import FAMILIES, Family, Properties, check_cells
from vib.structure.sparsity import Group, assemble

Place = Callable[[np.ndarray, np.ndarray], tuple[np.ndarray, ...]]
SHELLS = [family for family in FAMILIES.values() if family.dimension == 2]
STEEL = Properties(youngs_modulus=7.0, poissons_ratio=0.3, density=2.5, thickness=0.2)
families = pytest.mark.parametrize("family", SHELLS, ids=lambda family: family.kind)

CORNERS = {3: [[0.0, 0.0], [2.1, 0.3], [0.4, 1.7]], 4: [[0.0, 0.0], [2.1, 0.3], [2.4, 1.8], [-0.3, 1.5]]}


def rotation(vector: np.ndarray) -> np.ndarray:
    skew = np.array([[0, -vector[2], vector[1]], [vector[2], 0, -vector[0]], [-vector[1], vector[0], 0]])
    return np.asarray(np.eye(3) + 2 * skew @ (np.eye(3) + skew) / (1 + vector @ vector))


def cell(family: Family, warp: float = 0.0, seed: int = 1) -> np.ndarray:
    """One distorted cell in the plane z = 0, or with its nodes out of it by ``warp``; (1, k, 3)."""
    random = np.random.default_rng(seed)
    corners = np.array(CORNERS[family.corners])
    middle = (corners + np.roll(corners, -1, axis=0)) / 2
    nodes = np.vstack([corners, middle, [corners.mean(axis=0)]])[: family.nodes]
    nodes[family.corners :] += 0.08 * random.uniform(-1, 1, size=nodes[family.corners :].shape)
    return np.column_stack([nodes, warp * random.uniform(-1, 1, size=len(nodes))])[None]


def rigid_motions(nodes: np.ndarray) -> np.ndarray:
    """(6 k, 6): translations along and rotations about the axes through the origin."""
    motions = np.zeros((len(nodes), 6, 6))
    motions[:, :3, :3] = motions[:, 3:, 3:] = np.eye(3)
    for axis in range(3):
        motions[:, :3, 3 + axis] = np.cross(np.eye(3)[axis], nodes)
    return motions.reshape(-1, 6)


def bent_and_stretched(nodes: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Displacements (k, 6) of constant membrane strain and curvature in z = 0, and the eight resultants."""
    x, y = nodes.T[:2]
    stretch = np.array([0.3, -0.2, 0.5])
    bend = np.array([0.7, 0.4, -0.6])
    shift = np.zeros((len(nodes), 6))
    shift[:, 0] = stretch[0] * x + 0.2 * y
    shift[:, 1] = stretch[1] * y + (stretch[2] - 0.2) * x
    shift[:, 5] = (stretch[2] - 0.2 - 0.2) / 2
    # w'' = -curvature, and no shear: beta = -slope of w, rx = -beta_y, ry = beta_x
    shift[:, 2] = -(bend[0] * x**2 + bend[1] * y**2 + bend[2] * x * y) / 2
    shift[:, 4] = bend[0] * x + bend[2] * y / 2
    shift[:, 3] = -(bend[1] * y + bend[2] * x / 2)
    plane = 7.0 / 0.91 * np.array([[1, 0.3, 0], [0.3, 1, 0], [0, 0, 0.35]])
    forces = np.concatenate([0.2 * plane @ stretch, 0.2**3 / 12 * plane @ bend, [0, 0]])
    return shift, forces


@families
@pytest.mark.parametrize("warp", [0.0, 0.1])
@pytest.mark.parametrize("offset", [0.0, 0.35])
def test_exactly_six_motions_without_strain(family: Family, warp: float, offset: float) -> None:
    nodes = cell(family, warp)
    matrix = family.stiffness(nodes, Properties(7.0, 0.3, 2.5, 0.2, offset))[0]
    stiffness = np.linalg.eigvalsh(matrix)
    assert (np.abs(stiffness) < 1e-12 * stiffness[-1]).sum() == 6
    assert stiffness[6] > 1e-5 * stiffness[-1]
    np.testing.assert_allclose(matrix @ rigid_motions(nodes[0]), 0, atol=1e-12 * stiffness[-1])


@families
def test_constant_resultants_and_their_energy(family: Family) -> None:
    """Constant membrane strain and constant curvature (patch test of B. M. Irons): exact on any flat cell."""
    nodes = cell(family)
    turn = rotation(np.array([0.3, -0.5, 0.7]))
    shift, forces = bent_and_stretched(nodes[0])
    moved = np.concatenate([shift[:, :3] @ turn.T, shift[:, 3:] @ turn.T], axis=1).reshape(1, -1, 1)
    found = family.stresses(nodes @ turn.T, STEEL, moved)
    assert found.frames is not None
    for point in range(found.values.shape[1]):
        axes = found.frames[0, point] @ turn
        tensors = [_tensor(found.values[0, point, :3, 0]), _tensor(found.values[0, point, 3:6, 0])]
        for tensor, expected in zip(tensors, (forces[:3], forces[3:6]), strict=True):
            back = axes[:2, :2].T @ tensor @ axes[:2, :2]
            np.testing.assert_allclose(back, _tensor(expected), atol=1e-11)
        np.testing.assert_allclose(found.values[0, point, 6:, 0], 0, atol=1e-11)
    energy = moved.ravel() @ family.stiffness(nodes @ turn.T, STEEL)[0] @ moved.ravel()
    expected = found.weights.sum() * forces @ found.compliance[0] @ forces
    # the frame turns xy-components; energy of an isotropic plate does not depend on it
    assert energy == pytest.approx(expected, rel=1e-11)


def _tensor(components: np.ndarray) -> np.ndarray:
    return components[[0, 2, 2, 1]].reshape(2, 2)


def patch(kind: str) -> tuple[np.ndarray, np.ndarray]:
    """A 3 x 3 division of a rectangle with its inner nodes displaced."""
    random = np.random.default_rng(5)
    x, y = np.meshgrid(np.linspace(0, 3, 4), np.linspace(0, 2, 4), indexing="ij")
    nodes = np.column_stack([x.ravel(), y.ravel(), 0 * x.ravel()])
    inner = (nodes[:, 0] % 3 > 0) & (nodes[:, 1] % 2 > 0)
    nodes[inner, :2] += random.uniform(-0.2, 0.2, size=(inner.sum(), 2))
    number = np.arange(16).reshape(4, 4)
    quads = np.stack([number[:-1, :-1], number[1:, :-1], number[1:, 1:], number[:-1, 1:]], axis=-1)
    quads = quads.reshape(-1, 4)
    return nodes, quads if kind == "quad" else np.vstack([quads[:, [0, 1, 2]], quads[:, [0, 2, 3]]])


@pytest.mark.parametrize("kind", ["triangle", "quad"])
def test_patch_of_distorted_cells_finds_the_field_inside(kind: str) -> None:
    """Boundary given, inside solved for: the exact constant state comes out (Irons' patch test)."""
    nodes, cells = patch(kind)
    shift, _ = bent_and_stretched(nodes)
    matrix = assemble(nodes, [Group(FAMILIES[kind], cells, STEEL)]).stiffness
    inner = (nodes[:, 0] % 3 > 0) & (nodes[:, 1] % 2 > 0)
    free = np.repeat(inner, 6)
    found = spsolve(matrix[free][:, free].tocsc(), -matrix[free][:, ~free] @ shift.ravel()[~free])
    np.testing.assert_allclose(found, shift.ravel()[free], atol=1e-11)


@pytest.mark.parametrize("length", [1.0, 4.0, 10.0])
def test_rectangles_bend_exactly_in_their_plane(length: float) -> None:
    """Energy of one quad in pure in-plane bending is that of beam theory (Felippa 2003, optimality)."""
    nodes = np.array([[-length, -1, 0], [length, -1, 0], [length, 1, 0], [-length, 1, 0]])
    x, y = nodes[:, 0], nodes[:, 1]
    bent = np.stack([x * y, -(x**2 + 0.3 * y**2) / 2, 0 * x, 0 * x, 0 * x, -x], axis=1).ravel()
    energy = bent @ FAMILIES["quad"].stiffness(nodes[None], STEEL)[0] @ bent
    assert energy == pytest.approx(7.0 * 0.2 * 2**3 / 12 * 2 * length, rel=1e-9)


@families
def test_mass_and_inertia_are_those_of_the_plate(family: Family) -> None:
    """Total mass, moments and inertia tensor of a flat plate with thickness and offset; mass positive."""
    nodes = cell(family)
    matrix = family.mass(nodes, Properties(7.0, 0.3, 2.5, 0.2, 0.35))[0]
    found = rigid_motions(nodes[0]).T @ matrix @ rigid_motions(nodes[0])
    expected = np.zeros((6, 6))
    pieces = getattr(family, "pieces", ((0, 1, 2),))
    shares = getattr(family, "shares", (1.0,))
    outline = nodes[0]
    if family.kind == "quad8":
        outline = np.vstack([outline, 0.5 * outline[4:].sum(axis=0) - 0.25 * outline[:4].sum(axis=0)])
    for piece, share in zip(pieces, shares, strict=True):
        corners = outline[list(piece)] + [0, 0, 0.35]
        area = np.cross(corners[1] - corners[0], corners[2] - corners[0])[2] / 2
        # degree two on a triangle, midpoint rule exact; through the thickness Gauss's two points
        for middle in (corners + np.roll(corners, 1, axis=0)) / 2:
            for height in (-0.1 / 3**0.5, 0.1 / 3**0.5):
                motion = rigid_motions(middle[None] + np.array([0, 0, height]))[:3]
                expected += share * 2.5 * 0.2 * area / 6 * motion.T @ motion
    np.testing.assert_allclose(found, expected, atol=1e-12 * np.abs(expected).max())
    assert np.linalg.eigvalsh(matrix)[0] > 0


@families
@settings(max_examples=4, deadline=None)
@given(
    vector=arrays(np.float64, 3, elements=st.floats(-1, 1)),
    shift=arrays(np.float64, 3, elements=st.floats(-10, 10)),
)
def test_turned_and_moved_cells_are_the_same(family: Family, vector: np.ndarray, shift: np.ndarray) -> None:
    nodes, turn = cell(family, 0.1), rotation(vector)
    large = np.kron(np.eye(2 * family.nodes), turn)
    for compute in (family.stiffness, family.mass):
        expected = large @ compute(nodes, STEEL) @ large.T
        found = compute(nodes @ turn.T + shift, STEEL)
        np.testing.assert_allclose(found, expected, atol=1e-10 * np.abs(expected).max())


@families
@pytest.mark.parametrize("flipped", [False, True])
def test_node_order_does_not_matter(family: Family, flipped: bool) -> None:
    """Starting at another corner, or going round the other way, renumbers the matrices and no more."""
    nodes, corners = cell(family, 0.1), family.corners
    order = np.concatenate([np.roll(np.arange(corners), 1), corners + np.roll(np.arange(corners), 1), [8]])
    order = family.mirrored if flipped else order[: family.nodes]
    rows = (6 * order[:, None] + np.arange(6)).ravel()
    for compute in (family.stiffness, family.mass):
        expected = compute(nodes, STEEL)[:, rows][:, :, rows]
        found = compute(nodes[:, order], STEEL)
        np.testing.assert_allclose(found, expected, atol=1e-11 * np.abs(expected).max())


def test_offset_follows_the_parallel_axis_theorem() -> None:
    """A strip of two quads with offset e, bent about the node line: width E (h^3 / 12 + h e^2) per length."""
    nodes = np.array([[0, 0, 0], [1, 0, 0], [1, 0.5, 0], [0, 0.5, 0]], dtype=float)
    plate = Properties(youngs_modulus=7.0, poissons_ratio=0.0, density=1.0, thickness=0.1, offset=0.4)
    bent = np.zeros((4, 6))
    bent[:, 2], bent[:, 4] = -(nodes[:, 0] ** 2) / 2, nodes[:, 0]
    energy = bent.ravel() @ FAMILIES["quad"].stiffness(nodes[None], plate)[0] @ bent.ravel()
    assert energy == pytest.approx(0.5 * 7.0 * (0.1**3 / 12 + 0.1 * 0.4**2), rel=1e-11)


@families
def test_flat_cells_are_named(family: Family) -> None:
    cells = np.repeat(cell(family), 3, axis=0)
    cells[1, :, 1] = 0
    with pytest.raises(ModelError, match=f"{family.kind} cell 2 is flat, without area"):
        check_cells(family, cells)


@pytest.mark.parametrize("kind", ["quad", "quad8", "quad9"])
def test_folded_quads_are_named(kind: str) -> None:
    cells = np.repeat(cell(FAMILIES[kind]), 2, axis=0)
    cells[1, :2] = cells[1, 1::-1]
    with pytest.raises(ModelError, match=f"{kind} cell 2 is turned inside out or folded"):
        check_cells(FAMILIES[kind], cells)


def test_shells_need_a_thickness() -> None:
    with pytest.raises(ModelError, match="thickness: these cells need one"):
        FAMILIES["quad"].stiffness(cell(FAMILIES["quad"]), Properties(7.0, 0.3, 2.5))


def surface(across: int, along: int, place: Place, kind: str) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Nodes and cells of a mapped rectangle, and node numbers by row and column."""
    s, t = np.meshgrid(np.linspace(0, 1, across + 1), np.linspace(0, 1, along + 1), indexing="ij")
    nodes = np.stack(np.broadcast_arrays(*place(s.ravel(), t.ravel())), axis=1)
    number = np.arange(len(nodes)).reshape(across + 1, along + 1)
    quads = np.stack([number[:-1, :-1], number[1:, :-1], number[1:, 1:], number[:-1, 1:]], axis=-1)
    quads = quads.reshape(-1, 4)
    return nodes, quads if kind == "quad" else np.vstack([quads[:, [0, 1, 2]], quads[:, [0, 2, 3]]]), number


def deflection(
    nodes: np.ndarray,
    cells: np.ndarray,
    kind: str,
    properties: Properties,
    held: np.ndarray,
    load: np.ndarray,
) -> np.ndarray:
    matrix = assemble(nodes, [Group(FAMILIES[kind], cells, properties)]).stiffness
    free = ~held.ravel()
    found = np.zeros(held.size)
    found[free] = spsolve(matrix[free][:, free].tocsc(), load.ravel()[free])
    return found.reshape(-1, 6)


@pytest.mark.parametrize("kind", ["triangle", "quad"])
@pytest.mark.parametrize(("along", "expected"), [(1, 0.001754), (2, 0.005424)])
def test_twisted_beam(kind: str, along: int, expected: float) -> None:
    """Warped cells: tip deflection of a beam twisted by 90 degrees under a tip load, 24 x 4 cells.

    Source: R. H. MacNeal, R. L. Harder, Finite Elem. Anal. Des. 1 (1985) 3-20 (values from memory).
    """

    def place(s: np.ndarray, t: np.ndarray) -> tuple[np.ndarray, ...]:
        angle = s * np.pi / 2
        return 12 * s, 1.1 * (t - 0.5) * np.cos(angle), 1.1 * (t - 0.5) * np.sin(angle)

    nodes, cells, number = surface(24, 4, place, kind)
    held, load = np.zeros((len(nodes), 6), dtype=bool), np.zeros((len(nodes), 6))
    held[number[0]] = True
    load[number[-1, 2], along] = 1.0
    found = deflection(nodes, cells, kind, Properties(29e6, 0.22, 1.0, 0.32), held, load)
    assert found[number[-1, 2], along] == pytest.approx(expected, rel=0.01)


@pytest.mark.parametrize("kind", ["triangle", "quad"])
def test_roof_under_its_weight(kind: str) -> None:
    """Cylindrical roof on end diaphragms, a quarter of it with 12 x 12 cells: deflection of the free edge.

    Source: A. C. Scordelis, K. S. Lo, J. Am. Concr. Inst. 61 (1964) 539-561; 0.3024 in the form that
    MacNeal and Harder (1985) give it (value from memory; shear-flexible shells converge to 0.3006).
    """
    half = np.radians(40)
    nodes, cells, number = surface(
        12, 12, lambda s, t: (25 * np.sin(half * t), 25 * s, 25 * np.cos(half * t)), kind
    )
    held = np.zeros((len(nodes), 6), dtype=bool)
    held[number[0]] |= np.array([1, 0, 1, 0, 1, 0], dtype=bool)
    held[number[-1]] |= np.array([0, 1, 0, 1, 0, 1], dtype=bool)
    held[number[:, 0]] |= np.array([1, 0, 0, 0, 1, 1], dtype=bool)
    roof = Properties(4.32e8, 0.0, 360.0, 0.25)
    weight = np.zeros((len(nodes), 6))
    weight[:, 2] = -1.0
    load = assemble(nodes, [Group(FAMILIES[kind], cells, roof)]).mass @ weight.ravel()
    found = deflection(nodes, cells, kind, roof, held, load)
    assert found[number[-1, -1], 2] == pytest.approx(-0.3024, rel=0.01)


@pytest.mark.parametrize("kind", ["triangle", "quad"])
def test_pinched_hemisphere(kind: str) -> None:
    """Doubly curved, thin, inextensional: radius / thickness 250, a quarter with 32 x 32 cells, 18 deg hole.

    Source: R. H. MacNeal, R. L. Harder, Finite Elem. Anal. Des. 1 (1985) 3-20: 0.094 (value from memory).
    """
    hole = np.radians(72)

    def place(s: np.ndarray, t: np.ndarray) -> tuple[np.ndarray, ...]:
        flat = 10 * np.cos(s * hole)
        return flat * np.cos(t * np.pi / 2), flat * np.sin(t * np.pi / 2), 10 * np.sin(s * hole)

    nodes, cells, number = surface(32, 32, place, kind)
    held, load = np.zeros((len(nodes), 6), dtype=bool), np.zeros((len(nodes), 6))
    held[number[:, 0]] |= np.array([0, 1, 0, 1, 0, 1], dtype=bool)
    held[number[:, -1]] |= np.array([1, 0, 0, 0, 1, 1], dtype=bool)
    held[number[0, 0], 2] = True
    load[number[0, 0], 0], load[number[0, -1], 1] = 1.0, -1.0
    found = deflection(nodes, cells, kind, Properties(6.825e7, 0.3, 1.0, 0.04), held, load)
    assert found[number[0, 0], 0] == pytest.approx(0.094, rel=0.02)
    # the two loads are mirror images but for the diagonals of the triangles, which all run one way
    assert found[number[0, -1], 1] == pytest.approx(-found[number[0, 0], 0], rel=5e-3)
