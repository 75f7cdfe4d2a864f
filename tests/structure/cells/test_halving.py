"""Halved shell meshes, and the error that the two levels tell."""

import numpy as np
import pytest

from tests.structure.cells.meshes import angular_frequencies, cube, square
from tests.structure.cells.test_plate_frequencies import THIN
from vib.errors import ModelError
from vib.structure.cells import FAMILIES, Properties, check_cells
from vib.structure.cells.halving import halved, remaining_error
from vib.structure.sparsity import Group, assemble

PLATE = Properties(youngs_modulus=1.0, poissons_ratio=0.3, density=1.0, thickness=0.001)


def parameters(nodes, groups, edges):
    held = np.zeros((len(nodes), 6), dtype=bool)
    held[:, [0, 1, 5]] = True
    for axis in range(2):
        side = (nodes[:, axis] < 1e-9) | (nodes[:, axis] > 1 - 1e-9)
        held[side, 2] |= edges != "FFFF"
        held[side, 3 + axis] |= edges != "FFFF"
        held[side, 4 - axis] |= edges == "CCCC"
    unit = np.sqrt(0.001**2 / 12 / (1 - 0.3**2))
    skipped = 3 if edges == "FFFF" else 0
    return angular_frequencies(assemble(nodes, groups), held, 6 + skipped, -(unit**2))[skipped:] / unit


@pytest.mark.parametrize("kind", ["quad", "triangle"])
@pytest.mark.parametrize("edges", ["SSSS", "CCCC", "FFFF"])
def test_two_levels_tell_the_error(kind, edges):
    """Estimated over true error between 0.3 and 3 (references: Leissa's plates, see there)."""
    nodes, cells = square(kind, 8)
    groups = [Group(FAMILIES[kind], cells, PLATE)]
    finer = halved(nodes, groups)
    coarse = parameters(nodes, groups, edges)
    fine = parameters(finer.nodes_m, finer.groups, edges)
    estimated = 4 * remaining_error(coarse, fine)
    true = coarse - THIN[edges]
    told = np.abs(true) > 5e-4 * coarse  # below, the reference and chance cancellations decide
    ratio = (estimated / true)[told]
    assert told.sum() >= 3
    assert ratio.min() > 0.3
    assert ratio.max() < 3


@pytest.mark.parametrize("kind", ["quad", "triangle"])
def test_halved_mesh_is_the_finer_mesh(kind):
    nodes, cells = square(kind, 3)
    finer = halved(nodes, [Group(FAMILIES[kind], cells, PLATE)])
    expected, direct = square(kind, 6)
    check_cells(FAMILIES[kind], finer.nodes_m[finer.groups[0].connectivity])
    assert len(finer.nodes_m) == len(expected)
    np.testing.assert_array_equal(finer.nodes_m[: len(nodes)], nodes)
    np.testing.assert_allclose(finer.nodes_m[len(nodes) :], nodes[finer.parents].mean(axis=1))

    def outlines(places, connectivity):
        return sorted(sorted(map(tuple, np.round(places[cell], 9).tolist())) for cell in connectivity)

    assert outlines(finer.nodes_m, finer.groups[0].connectivity) == outlines(expected, direct)


def test_groups_share_the_new_nodes_and_keep_their_properties():
    nodes, cells = square("quad", 2)
    triangles = cells[2:][:, [[0, 1, 2], [0, 2, 3]]].reshape(-1, 3)
    graded = Properties(np.array([1.0, 2.0]), 0.3, 1.0, np.array([0.1, 0.2]))
    finer = halved(
        nodes, [Group(FAMILIES["quad"], cells[:2], graded), Group(FAMILIES["triangle"], triangles, PLATE)]
    )
    assert len(finer.nodes_m) == 25  # of a 4 x 4 division; the triangles' diagonals pass through its nodes
    centres = finer.nodes_m[finer.groups[0].connectivity].mean(axis=1)
    np.testing.assert_array_equal(
        finer.groups[0].properties.thickness, np.where(centres[:, 1] < 0.5, 0.1, 0.2)
    )


def test_solids_are_refused():
    nodes, cells = cube("hexahedron", (1, 1, 1))
    with pytest.raises(ModelError, match="hexahedron cells can't be divided in four"):
        halved(nodes, [Group(FAMILIES["hexahedron"], cells, PLATE)])
