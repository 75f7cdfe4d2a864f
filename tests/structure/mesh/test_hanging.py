"""Nodes on edges and faces of cells that do not have them stop; meshes that fit do not."""

import numpy as np
import pytest

from tests.structure.cells.meshes import cube
from tests.structure.mesh.builders import STEEL, plate, study_of, write
from vib.errors import ModelError
from vib.structure.mesh.model import read_mesh_study

SHELL = '[mesh.regions.all]\nmaterial = "structural steel"\nthickness = "5 mm"\n'


def merged(*parts):
    """Nodes and blocks of meshes side by side, nodes at one place made one."""
    nodes = np.vstack([own for own, _, _ in parts])
    _, kept, place = np.unique(np.round(nodes, 7) + 0.0, axis=0, return_index=True, return_inverse=True)
    blocks, start = [], 0
    for own, kind, cells in parts:
        blocks.append((kind, place.ravel()[cells + start]))
        start += len(own)
    return nodes[kept], blocks


def at(mesh, kind, corner):
    """A mesh moved to its corner."""
    return mesh[0] + np.array(corner), kind, mesh[1]


def said(folder, nodes, blocks, regions=STEEL):
    write(folder, nodes, blocks)
    with pytest.raises(ModelError) as caught:
        read_mesh_study(study_of(folder, "", regions))
    return str(caught.value)


@pytest.mark.parametrize("kind", ["hexahedron", "hexahedron27", "tetra", "tetra10", "wedge"])
def test_solids_divided_differently(tmp_path, kind):
    """A cube of one cell along each edge on a cube of two: the nodes half way hang."""
    coarse, fine = cube(kind, (1, 1, 1)), cube(kind, (2, 2, 2))
    nodes, blocks = merged(at(coarse, kind, (0, 0, 0)), at(fine, kind, (0, 0, 1)))
    found = said(tmp_path, nodes, blocks)
    numbers = [
        int(word)
        for word in found.split(" lie on ")[0].split(" and ")[0].replace(",", " ").split()
        if word.isdigit()
    ]
    quarters = 4 * nodes[np.array(numbers) - 1]
    np.testing.assert_allclose(quarters, np.round(quarters), atol=1e-9)
    np.testing.assert_allclose(quarters[:, 2], 4)
    assert (np.round(quarters) % 4 != 0).any(axis=1).all()


def test_shells_divided_differently(tmp_path):
    """Three quads against two along their common edge."""
    left, right = plate("quad", 3), plate("quad", 2)
    nodes, blocks = merged(at(left, "quad", (0, 0, 0)), at(right, "quad", (1, 0, 0)))
    found = said(tmp_path, nodes, blocks, SHELL)
    places = [
        int(word.strip(",")) for word in found.split(" lie on ")[0].split() if word.strip(",").isdigit()
    ]
    assert len(places) == 3
    np.testing.assert_allclose(nodes[np.array(places) - 1, 0], 1)
    np.testing.assert_allclose(sorted(nodes[np.array(places) - 1, 1]), [1 / 3, 1 / 2, 2 / 3])


def test_a_rib_whose_nodes_are_not_those_of_the_plate(tmp_path):
    """Shells that stand on a plate, between its lines of nodes."""
    flat, rib = plate("quad", 4), plate("quad", 4)
    upright = rib[0][:, [1, 2, 0]] * [1, 1, 0.3] + [0, 0.4, 0]
    nodes, blocks = merged(at(flat, "quad", (0, 0, 0)), (upright, "quad", rib[1]))
    assert "lie on an edge or a face of cells" in said(tmp_path, nodes, blocks, SHELL)


def test_a_member_beside_the_nodes_of_a_plate(tmp_path):
    """One line cell along an edge of four quads: three nodes lie on it."""
    nodes, cells = plate("quad", 4)
    ends = [int(np.argmin(np.linalg.norm(nodes - place, axis=1))) for place in ([0, 0, 0], [1, 0, 0])]
    names = {"part": [np.zeros(16, dtype=int), np.ones(1, dtype=int)]}
    write(tmp_path, nodes, [("quad", cells), ("line", np.array([ends]))], cell_data=names)
    regions = """[sections.bar]
shape = "rectangle"
width = "10 mm"
height = "20 mm"
[mesh.regions.0]
material = "structural steel"
thickness = "5 mm"
[mesh.regions.1]
material = "structural steel"
section = "bar"
up = [0, 0, 1]
"""
    with pytest.raises(ModelError, match=r"nodes 6, 11, 16 lie on .* \(cell 17\)"):
        read_mesh_study(study_of(tmp_path, "", regions))


def test_first_order_beside_second_order(tmp_path):
    one, two = cube("tetra", (1, 1, 1)), cube("tetra10", (1, 1, 1))
    nodes, blocks = merged(at(one, "tetra", (0, 0, 0)), at(two, "tetra10", (1, 0, 0)))
    found = said(tmp_path, nodes, blocks)
    assert "in the middle of an edge" in found
    assert "cells of first and second order meet" in found


@pytest.mark.parametrize(
    "kind", ["tetra", "tetra10", "hexahedron", "hexahedron20", "hexahedron27", "wedge", "pyramid"]
)
def test_meshes_that_fit(tmp_path, kind):
    """Also curved and with a second block of the same cells beside it."""
    first, second = cube(kind, (2, 2, 2)), cube(kind, (3, 2, 2))
    nodes, blocks = merged(at(first, kind, (0, 0, 0)), at(second, kind, (1, 0, 0)))
    nodes = nodes + 0.1 * np.sin(3 * nodes[:, [1, 2, 0]])
    write(tmp_path, nodes, blocks)
    read_mesh_study(study_of(tmp_path, ""))


@pytest.mark.parametrize("kind", ["quad", "triangle"])
def test_shells_that_fit(tmp_path, kind):
    """A rolled plate on the rim of another one, node on node."""
    one, two = plate(kind, 4), plate(kind, 4)
    angle = one[0][:, 1]
    rolled = np.column_stack([one[0][:, 0], np.sin(angle), 1 - np.cos(angle)])
    flat = two[0] * [1, -1, 1]
    nodes, blocks = merged((rolled, kind, one[1]), (flat, kind, two[1]))
    write(tmp_path, nodes, blocks)
    read_mesh_study(study_of(tmp_path, "", SHELL))


def test_a_small_gap_is_a_gap(tmp_path):
    """Blocks a thousandth of a cell apart are not said to hang."""
    one, two = cube("hexahedron", (2, 2, 2)), cube("hexahedron", (4, 4, 4))
    nodes, blocks = merged(at(one, "hexahedron", (0, 0, 0)), at(two, "hexahedron", (1.0005, 0, 0)))
    write(tmp_path, nodes, blocks)
    read_mesh_study(study_of(tmp_path, ""))
    # moved sideways, so that no two corners are at one place
    nodes[nodes[:, 0] > 1.0001] -= [0.0005, 0.1, 0.1]
    assert "lie on an edge or a face" in said(tmp_path, nodes, blocks)


@pytest.mark.parametrize(("kind", "make"), [("tetra10", cube), ("hexahedron", cube), ("quad", plate)])
def test_a_cell_that_is_there_twice(tmp_path, kind, make):
    """Numbered from another corner the second time."""
    nodes, cells = make(kind, (3, 2, 2)) if make is cube else make(kind, 3)
    again = cells[4:5]
    if kind != "tetra10":
        again = again[:, [1, 2, 3, 0, 5, 6, 7, 4][: cells.shape[1]]]
    found = said(tmp_path, nodes, [(kind, np.vstack([cells, again]))], SHELL if kind == "quad" else STEEL)
    assert f"mesh: cells 5, {len(cells) + 1} have the same corners" in found


def test_solids_in_each_other(tmp_path):
    """A third tetrahedron on a face that two share already."""
    nodes = np.array([[0, 0, 0], [1, 0, 0], [0, 1, 0], [0.3, 0.3, 1], [0.3, 0.3, -1], [0.4, 0.3, 0.8]])
    cells = np.array([[0, 1, 2, 3], [0, 2, 1, 4], [0, 1, 2, 5]])
    assert "cells 1, 2, 3 lie in each other" in said(tmp_path, nodes, [("tetra", cells)])


def test_bricks_beside_tetrahedra(tmp_path):
    """All nodes are shared, but a square meets two triangles: said, not stopped."""
    one, two = cube("hexahedron", (2, 2, 2)), cube("tetra", (2, 2, 2))
    nodes, blocks = merged(at(one, "hexahedron", (0, 0, 0)), at(two, "tetra", (1, 0, 0)))
    write(tmp_path, nodes, blocks)
    model = read_mesh_study(study_of(tmp_path, ""))[1]
    assert any("faces of cells 5, 6, 7, 8 with four corners meet two triangles" in r for r in model.remarks)
    write(tmp_path, *merged(at(one, "hexahedron", (0, 0, 0)), at(two, "tetra", (1.5, 0, 0))))
    model = read_mesh_study(study_of(tmp_path, ""))[1]
    assert not any("two triangles" in remark for remark in model.remarks)


def test_braces_may_cross(tmp_path):
    """A line through the end of another one, not joined to it."""
    nodes = np.array([[0, 0, 0], [2, 0, 0], [1, 0, 0], [1, 1, 0]], dtype=float)
    write(tmp_path, nodes, [("line", np.array([[0, 1], [2, 3]]))])
    bar = '[sections.bar]\nshape = "rectangle"\nwidth = "10 mm"\nheight = "20 mm"\n'
    region = '[mesh.regions.all]\nmaterial = "structural steel"\nsection = "bar"\nup = [0, 0, 1]\n'
    read_mesh_study(study_of(tmp_path, "", bar + region))
