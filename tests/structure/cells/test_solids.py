"""Laws that every solid family keeps, on distorted cells."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from hypothesis.extra.numpy import arrays

from vib.errors import ModelError
from vib.structure.cells import FAMILIES, Properties, check_cells
from vib.structure.cells.family import Family
from vib.structure.cells.solid import Solid

MATERIAL = Properties(youngs_modulus=7.0, poissons_ratio=0.3, density=2.5)
SOLIDS = [family for family in FAMILIES.values() if isinstance(family, Solid)]
SECOND_ORDER = [family for family in SOLIDS if family.nodes > family.corners]
families = pytest.mark.parametrize("family", SOLIDS, ids=lambda family: family.kind)


def distorted(family: Solid, seed: int = 3, curved: float = 0.04) -> np.ndarray:
    """Two cells: one an affine image of the reference cell, one with every node displaced."""
    random = np.random.default_rng(seed)
    turn = np.eye(3) + 0.25 * random.normal(size=(3, 3))
    image = family.reference @ turn.T * np.sign(np.linalg.det(turn)) + [1.0, -2.0, 0.5]
    if np.linalg.det(turn) < 0:
        image = image * [1, 1, -1]
    return np.stack([image, image + curved * random.uniform(-1, 1, size=image.shape)])


def rigid_motions(coordinates: np.ndarray) -> np.ndarray:
    """(3 k, 6): translations along and rotations about the axes through the origin."""
    motions = np.zeros((len(coordinates), 3, 6))
    motions[:, :, :3] = np.eye(3)
    for axis in range(3):
        motions[:, :, 3 + axis] = np.cross(np.eye(3)[axis], coordinates)
    return motions.reshape(-1, 6)


def linear_field(coordinates: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Displacements of a constant strain, and its stress (xx, yy, zz, yz, zx, xy) by Hooke's law."""
    slope = np.array([[0.3, -0.2, 0.5], [0.1, 0.4, -0.6], [0.7, 0.2, -0.1]])
    strain = (slope + slope.T) / 2
    shear = 7.0 / 2.6
    lame = 7.0 * 0.3 / (1.3 * 0.4)
    stress = 2 * shear * strain + lame * np.trace(strain) * np.eye(3)
    return coordinates @ slope.T, stress[[0, 1, 2, 1, 2, 0], [0, 1, 2, 2, 0, 1]]


@families
def test_shape_functions_are_one_at_their_own_node(family: Solid) -> None:
    nodes = family.reference.copy()
    if family.kind.startswith("pyramid"):
        nodes[4, 2] -= 1e-12  # rational functions have a limit, not a value, at the apex
    np.testing.assert_allclose(family.shape(nodes), np.eye(family.nodes), atol=1e-11)


@families
def test_gradients_are_derivatives_of_the_shape_functions(family: Solid) -> None:
    points, step = family.stiffness_rule.points, 1e-5
    for axis in range(3):
        ahead, behind = (family.shape(points + sign * step * np.eye(3)[axis]) for sign in (1, -1))
        np.testing.assert_allclose(
            family.gradients(points)[:, :, axis], (ahead - behind) / (2 * step), atol=1e-8
        )


@families
def test_exactly_six_motions_without_strain(family: Solid) -> None:
    cells = distorted(family)
    for cell, matrix in zip(cells, family.stiffness(cells, MATERIAL), strict=True):
        stiffness = np.linalg.eigvalsh(matrix)
        assert (np.abs(stiffness) < 1e-12 * stiffness[-1]).sum() == 6
        assert stiffness[6] > 1e-4 * stiffness[-1]
        np.testing.assert_allclose(matrix @ rigid_motions(cell), 0, atol=1e-12 * stiffness[-1])


@families
def test_constant_stress_patch(family: Solid) -> None:
    """Constant strain: exact energy, exact stress at every point, on any shape of cell.

    Source: the patch test, B. M. Irons, A. Razzaque (1972); R. L. Taylor et al., IJNME 22 (1986) 39-62.
    """
    cells = distorted(family)
    displacements, stress = linear_field(cells)
    found = family.stresses(cells, MATERIAL, displacements.reshape(2, -1, 1)).values[..., 0]
    np.testing.assert_allclose(found, np.broadcast_to(stress, found.shape), rtol=1e-12, atol=1e-12)
    slope = np.linalg.lstsq(np.c_[np.ones(family.nodes), cells[1]], displacements[1], rcond=None)[0][1:]
    strain = (slope + slope.T) / 2
    density = stress @ (strain[[0, 1, 2, 1, 2, 0], [0, 1, 2, 2, 0, 1]] * [1, 1, 1, 2, 2, 2])
    volume = family.mass(cells, MATERIAL)[:, ::3, ::3].sum(axis=(1, 2)) / 2.5
    for cell in range(2):
        shift = displacements[cell].ravel()
        energy = shift @ family.stiffness(cells, MATERIAL)[cell] @ shift
        assert energy == pytest.approx(density * volume[cell], rel=1e-12)


@families
def test_internal_forces_of_constant_stress_balance_in_a_patch(family: Solid) -> None:
    """Nodal forces of a constant stress: by the matrix, and by the integral of the shape gradients."""
    cells = distorted(family)
    displacements, stress = linear_field(cells)
    tensor = stress[[0, 5, 4, 5, 1, 3, 4, 3, 2]].reshape(3, 3)
    rule = family.stiffness_rule
    nodal = family.gradients(rule.points)
    for cell in range(2):
        jacobian = np.einsum("gap,ai->gpi", nodal, cells[cell])
        gradients = np.linalg.solve(jacobian, nodal.swapaxes(1, 2))
        forces = np.einsum("g,gia,ij->aj", rule.weights * np.linalg.det(jacobian), gradients, tensor)
        found = family.stiffness(cells, MATERIAL)[cell] @ displacements[cell].ravel()
        np.testing.assert_allclose(found, forces.ravel(), atol=1e-12 * np.abs(forces).max())


@pytest.mark.parametrize("family", SECOND_ORDER, ids=lambda family: family.kind)
def test_second_order_cells_bend_exactly(family: Solid) -> None:
    """A beam in pure bending, u quadratic: x-stress linear in y, all others zero; energy exact."""
    cell = distorted(family)[:1]
    x, y, z = np.moveaxis(cell, 2, 0)
    bent = np.stack([x * y, -(x**2 + 0.3 * (y**2 - z**2)) / 2, -0.3 * y * z], axis=2)
    found = family.stresses(cell, MATERIAL, bent.reshape(1, -1, 1))
    expected = np.zeros_like(found.values[..., 0])
    expected[:, :, 0] = 7.0 * found.points_m[:, :, 1]
    np.testing.assert_allclose(found.values[..., 0], expected, atol=1e-11)
    energy = bent.ravel() @ family.stiffness(cell, MATERIAL)[0] @ bent.ravel()
    second_moment = y[0] @ family.mass(cell, MATERIAL)[0][::3, ::3] @ y[0] / 2.5
    assert energy == pytest.approx(7.0 * second_moment, rel=1e-12)


def test_incompatible_modes_bend_exactly() -> None:
    """One rectangular hexahedron in pure bending has the energy of beam theory (R. L. Taylor et al. 1976)."""
    family = FAMILIES["hexahedron"]
    cell = family.reference[None] * [2.0, 0.5, 0.25]  # type: ignore[attr-defined]
    x, y, z = np.moveaxis(cell, 2, 0)
    # the corners carry u = x y; what is quadratic is constant on them but for the internal modes
    bent = np.stack([x * y, 0 * x, -0.3 * y * z], axis=2).reshape(1, -1)
    energy = bent[0] @ family.stiffness(cell, MATERIAL)[0] @ bent[0]
    second_moment = 4 * 0.5 * (2 * 0.5) ** 3 / 12
    assert energy == pytest.approx(7.0 * second_moment, rel=1e-12)


@families
def test_mass_and_inertia_are_those_of_the_body(family: Solid) -> None:
    """Total mass, centre and inertia against an independent quadrature, on straight-sided cells."""
    cell = distorted(family)[:1]
    matrix = family.mass(cell, MATERIAL)[0]
    rule = family.mass_rule
    places = family.shape(rule.points) @ cell[0]
    volume = np.linalg.det(np.einsum("gap,ai->gpi", family.gradients(rule.points), cell[0])) * rule.weights
    motions = rigid_motions(places).reshape(-1, 3, 6)
    expected = 2.5 * np.einsum("g,gia,gib->ab", volume, motions, motions)
    rigid = rigid_motions(cell[0])
    np.testing.assert_allclose(rigid.T @ matrix @ rigid, expected, atol=1e-12 * np.abs(expected).max())
    assert np.linalg.eigvalsh(matrix)[0] > 0


@pytest.mark.parametrize(
    ("kind", "volume", "second"),
    [
        ("tetra", 1 / 6, 1 / 60),
        ("tetra10", 1 / 6, 1 / 60),
        ("hexahedron", 8, 8 / 3),
        ("hexahedron20", 8, 8 / 3),
        ("hexahedron27", 8, 8 / 3),
        ("wedge", 1, 1 / 6),
        ("wedge15", 1, 1 / 6),
        ("pyramid", 4 / 3, 4 / 15),
        ("pyramid13", 4 / 3, 4 / 15),
    ],
)
def test_volume_and_second_moment_of_the_reference_cell(kind: str, volume: float, second: float) -> None:
    """Closed forms: integral of 1 and of x^2 over each reference cell."""
    family = FAMILIES[kind]
    assert isinstance(family, Solid)
    along = family.mass(family.reference[None], MATERIAL)[0][::3, ::3] / 2.5
    x = family.reference[:, 0]
    assert along.sum() == pytest.approx(volume, rel=1e-13)
    assert x @ along @ x == pytest.approx(second, rel=1e-13)


@families
def test_affine_cells_need_no_quadrature(family: Solid) -> None:
    cell = distorted(family)[:1]
    by_quadrature = family._condensed(family._quadrature_blocks(cell, MATERIAL))
    found = family.stiffness_blocks(cell, MATERIAL)
    np.testing.assert_allclose(found, by_quadrature, atol=1e-12 * np.abs(found).max())


@families
@settings(max_examples=10, deadline=None)
@given(
    vector=arrays(np.float64, 3, elements=st.floats(-1, 1)),
    shift=arrays(np.float64, 3, elements=st.floats(-10, 10)),
)
def test_turned_and_moved_cells_have_the_same_stiffness(
    family: Solid, vector: np.ndarray, shift: np.ndarray
) -> None:
    cells = distorted(family)
    rotation = np.eye(3) + 2 * _skew(vector) @ (np.eye(3) + _skew(vector)) / (1 + vector @ vector)
    large = np.kron(np.eye(family.nodes), rotation)
    moved = family.stiffness(cells @ rotation.T + shift, MATERIAL)
    expected = large @ family.stiffness(cells, MATERIAL) @ large.T
    np.testing.assert_allclose(moved, expected, atol=1e-11 * np.abs(expected).max())


def _skew(v: np.ndarray) -> np.ndarray:
    return np.array([[0, -v[2], v[1]], [v[2], 0, -v[0]], [-v[1], v[0], 0]])


@families
def test_mirrored_order_turns_a_cell_round(family: Solid) -> None:
    cells = distorted(family)
    inverted = cells * [1, 1, -1]
    with pytest.raises(ModelError, match=rf"{family.kind} cells 1, 2 are turned inside out"):
        check_cells(family, inverted)
    check_cells(family, inverted[:, family.mirrored])
    mended = family.stiffness(inverted[:, family.mirrored], MATERIAL)
    before = np.linalg.eigvalsh(family.stiffness(cells, MATERIAL))
    np.testing.assert_allclose(np.linalg.eigvalsh(mended), before, atol=1e-11 * before.max())


@families
def test_flat_and_folded_cells_are_named(family: Family) -> None:
    assert isinstance(family, Solid)
    cells = np.repeat(distorted(family), 7, axis=0)
    cells[2] = cells[2] * [1, 1, 0]
    cells[3:, :] = cells[3:, family.mirrored]
    with pytest.raises(ModelError, match=f"{family.kind} cell 102 is flat, without volume") as caught:
        check_cells(family, cells, np.arange(100, 114))
    assert "cells 103, 104, 105" in str(caught.value)
    assert "112 and 1 more are turned inside out" in str(caught.value)


def test_cells_without_a_place_are_named() -> None:
    cells = np.repeat(distorted(FAMILIES["wedge"]), 2, axis=0)  # type: ignore[arg-type]
    cells[3, 2, 1] = np.nan
    with pytest.raises(ModelError, match="wedge cell 4 is at a position that is not a finite number"):
        check_cells(FAMILIES["wedge"], cells)


@pytest.mark.parametrize(
    ("entry", "value"),
    [
        ("youngs_modulus", 0.0),
        ("youngs_modulus", np.nan),
        ("poissons_ratio", 0.5),
        ("density", -1.0),
        ("thickness", -0.1),
        ("offset", np.inf),
    ],
)
def test_impossible_properties_are_named(entry: str, value: float) -> None:
    given = {"youngs_modulus": 1.0, "poissons_ratio": 0.3, "density": 1.0} | {entry: value}
    with pytest.raises(ModelError, match=f"^{entry}: it must"):
        Properties(**given)


def test_properties_of_the_wrong_number_are_named() -> None:
    cells = distorted(FAMILIES["tetra"])  # type: ignore[arg-type]
    with pytest.raises(ModelError, match="density: one value or one for each of 2 cells"):
        FAMILIES["tetra"].mass(cells, Properties(1.0, 0.3, np.ones(3)))
