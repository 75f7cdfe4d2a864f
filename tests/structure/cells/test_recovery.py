"""The estimated error of frequencies against the true one."""

import numpy as np
import pytest
from scipy.sparse.linalg import eigsh

from tests.structure.cells.meshes import cube, square
from tests.structure.cells.test_solid_frequencies import CLAMPED_CUBE, FREE_CUBE, SHEAR_ONE
from vib.errors import AccuracyError
from vib.structure.cells import FAMILIES, Properties
from vib.structure.cells.recovery import energy_errors
from vib.structure.sparsity import Group, assemble


def modes(nodes, groups, held, count, shift):
    """Angular frequencies and shapes on all freedoms, and the pattern."""
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


@pytest.mark.parametrize(
    ("kind", "across"),
    [("tetra10", 4), ("hexahedron20", 6), ("wedge15", 4), ("pyramid13", 3), ("hexahedron", 6), ("wedge", 6)],
)
def test_free_cube(kind, across):
    """Estimated over true error between 0.3 and 3 for the 14 elastic modes (converged values: see there)."""
    nodes, cells = cube(kind, (across,) * 3)
    groups = [Group(FAMILIES[kind], cells, SHEAR_ONE)]
    found, shapes, pattern = modes(nodes, groups, np.zeros((len(nodes), 3), dtype=bool), 20, -1.0)
    estimated = energy_errors(nodes, groups, pattern, shapes[:, 6:]) / 2
    ratio = estimated / (found[6:] / FREE_CUBE - 1)
    assert ratio.min() > 0.3
    assert ratio.max() < 3


@pytest.mark.parametrize(("kind", "across"), [("tetra10", 4), ("hexahedron27", 4), ("hexahedron", 6)])
def test_clamped_cube(kind, across):
    """The same where the clamped edges are singular."""
    nodes, cells = cube(kind, (across,) * 3)
    groups = [Group(FAMILIES[kind], cells, SHEAR_ONE)]
    held = np.repeat(nodes[:, :1] < 1e-9, 3, axis=1)
    found, shapes, pattern = modes(nodes, groups, held, 6, 0.0)
    ratio = energy_errors(nodes, groups, pattern, shapes) / 2 / (found / CLAMPED_CUBE - 1)
    assert ratio.min() > 0.3
    assert ratio.max() < 3


def test_a_field_within_reach_of_the_cells_has_no_error():
    """Quadratic displacements on quadratic cells: stresses linear, recovered exactly."""
    nodes, cells = cube("tetra10", (2, 2, 2))
    groups = [Group(FAMILIES["tetra10"], cells, SHEAR_ONE)]
    x, y, z = nodes.T
    field = np.stack([x * y, y * z - x**2, z**2 + x], axis=1).reshape(-1, 1)
    assert energy_errors(nodes, groups, assemble(nodes, groups).pattern, field)[0] < 1e-20


def test_two_materials_are_not_smoothed_into_each_other():
    """A bar of two stiffnesses: the stress jumps where they meet, and is exact in each group."""
    nodes, cells = cube("hexahedron", (4, 2, 2))
    left = nodes[cells].mean(axis=1)[:, 0] < 0.5
    soft = Properties(youngs_modulus=1.0, poissons_ratio=0.0, density=1.0)
    hard = Properties(youngs_modulus=10.0, poissons_ratio=0.0, density=1.0)
    family = FAMILIES["hexahedron"]
    groups = [Group(family, cells[left], soft), Group(family, cells[~left], hard)]
    field = np.zeros((len(nodes), 3))
    field[:, 0] = np.minimum(nodes[:, 0], 0.5) + np.maximum(nodes[:, 0] - 0.5, 0) * 0.3
    pattern = assemble(nodes, groups).pattern
    assert energy_errors(nodes, groups, pattern, field.reshape(-1, 1))[0] < 1e-20
    one = [Group(family, cells, soft)]
    assert energy_errors(nodes, one, pattern, field.reshape(-1, 1))[0] > 1e-3


def test_too_few_cells_and_shells_say_so():
    nodes, cells = cube("hexahedron20", (1, 1, 1))
    groups = [Group(FAMILIES["hexahedron20"], cells, SHEAR_ONE)]
    pattern = assemble(nodes, groups).pattern
    with pytest.raises(AccuracyError, match="hexahedron20 cells are too few"):
        energy_errors(nodes, groups, pattern, np.ones((pattern.size, 1)))
    nodes, cells = square("quad", 2)
    plates = [Group(FAMILIES["quad"], cells, Properties(1.0, 0.3, 1.0, 0.1))]
    pattern = assemble(nodes, plates).pattern
    with pytest.raises(AccuracyError, match="error of quad cells can't be estimated"):
        energy_errors(nodes, plates, pattern, np.ones((pattern.size, 1)))
