"""What meshio does with bad files stays inside; broken meshes are named by cell and node."""

import re

import meshio
import numpy as np
import pytest

from tests.structure.mesh.builders import STEEL, anatomy_of, block, plate, said_of, study_of, write
from vib.errors import ModelError, StudyError
from vib.structure import survey

SHELL = '[mesh.regions.all]\nmaterial = "structural steel"\nthickness = "5 mm"\n'


def faulty(study):
    with pytest.raises(ModelError) as caught:
        study.system()
    return str(caught.value)


@pytest.mark.parametrize(
    ("name", "content", "said"),
    [
        ("m.vtu", "no mesh at all", "cannot be read as a mesh"),
        ("m.msh", "$MeshFormat\n9.9 0 8\n", "cannot be read as a mesh"),
        ("m.vtk", "", "m.vtk is empty"),
        ("m.node", "", "m.node is empty"),
        ("m.inp", "*NODE\n1, x, 0, 0\n", "cannot be read as a mesh"),
        ("m.xyz9", "1 2 3", "is of no known kind of mesh file"),
    ],
)
def test_unreadable_files(tmp_path, capfd, name, content, said):
    """meshio prints and leaves the program on these; we say one sentence and print nothing."""
    (tmp_path / name).write_text(content)
    assert said in faulty(study_of(tmp_path, "", name=name))
    assert capfd.readouterr() == ("", "")


@pytest.mark.parametrize("name", ["m.vtu", "m.vtk", "m.msh", "m.inp", "m.mesh", "m.dat", "m.mdpa", "m.su2"])
@pytest.mark.parametrize("part", [0.3, 0.6, 0.9])
def test_files_cut_short(tmp_path, capfd, name, part):
    """Some readers of meshio would wait for more for ever."""
    nodes, cells = block("tetra", (3, 1, 1))
    write(tmp_path, nodes, [("tetra", cells)], name)
    whole = (tmp_path / name).read_bytes()
    capfd.readouterr()
    (tmp_path / name).write_bytes(whole[: int(part * len(whole))])
    try:
        study_of(tmp_path, "", name=name).system()
    except ModelError as error:
        assert str(error).startswith("mesh")  # noqa: PT017 - cut after the cells, a file may still do
    assert capfd.readouterr() == ("", "")


def test_a_missing_file_is_named_at_its_entry(tmp_path):
    with pytest.raises(StudyError, match=r'mesh\.file \(line 4\): there is no file "m\.vtu"'):
        study_of(tmp_path, "")


def spoilt(tmp_path, change, regions=STEEL, make=block, name="m.vtu"):
    """The message about a mesh that ``change`` has spoilt."""
    nodes, cells = make()
    kind = {10: "tetra10", 4: "quad" if make is plate else "tetra"}[cells.shape[1]]
    nodes, blocks = change(nodes.copy(), kind, cells.copy())
    write(tmp_path, nodes, blocks, name)
    return faulty(study_of(tmp_path, "", regions, name))


def test_coordinates_that_are_no_numbers(tmp_path):
    def change(nodes, kind, cells):
        nodes[[4, 9], 1] = np.nan
        return nodes, [(kind, cells)]

    assert "no finite numbers at nodes 5, 10" in spoilt(tmp_path, change)


def test_node_numbers_out_of_range(tmp_path):
    def change(nodes, kind, cells):
        cells[3, 2] = len(nodes)
        return nodes, [(kind, cells)]

    said = spoilt(tmp_path, change, name="m.vtk")
    assert "cell 4 (tetra10) name nodes that do not exist" in said


def test_a_node_named_twice(tmp_path):
    def change(nodes, kind, cells):
        cells[7, 1] = cells[7, 0]
        return nodes, [(kind, cells)]

    assert "cell 8 (tetra10) name a node twice" in spoilt(tmp_path, change)


def test_unknown_kinds(tmp_path):
    def change(nodes, kind, cells):
        return nodes, [(kind, cells), ("wedge18", np.arange(18)[None])]

    said = spoilt(tmp_path, change, name="m.vtu")
    assert "1 cells of the kind wedge18, which can't be computed" in said


def test_no_cells(tmp_path):
    (tmp_path / "m.off").write_text("OFF\n3 0 0\n0 0 0\n1 0 0\n0 1 0\n")
    assert "m.off holds no cells" in faulty(study_of(tmp_path, "", name="m.off"))
    write(tmp_path, np.eye(3), [("vertex", np.array([[0], [1]]))])
    assert re.search("has no region|is left|no cells", faulty(study_of(tmp_path, "")))


def test_flat_cells(tmp_path):
    def change(nodes, kind, cells):
        inside = cells[11]
        nodes[inside[3]] = nodes[inside[:3]].mean(axis=0)
        return nodes, [("tetra", cells[:, :4])]

    assert re.search(r"cells? .*12.* \(tetra\) without volume", spoilt(tmp_path, change))


def test_folded_cells(tmp_path):
    """A mid-edge node beyond the opposite face: no turning round mends that."""

    def change(nodes, kind, cells):
        nodes[cells[0, 4]] += np.array([0.0, 1.0, 1.0])
        return nodes, [(kind, cells)]

    assert re.search(r"cells? .*1.* \(tetra10\) folded", spoilt(tmp_path, change))


def test_a_bow_tie(tmp_path):
    def change(nodes, kind, cells):
        cells[5] = cells[5][[0, 2, 1, 3]]
        return nodes, [(kind, cells)]

    assert "cell 6 (quad) folded" in spoilt(tmp_path, change, SHELL, plate)


def test_duplicate_nodes(tmp_path):
    """Two blocks side by side with a face each; they would part there."""
    nodes, cells = block()
    both = np.vstack([nodes, nodes + np.array([0.6, 0, 0])])
    write(tmp_path, both, [("tetra10", np.vstack([cells, cells + len(nodes)]))])
    said = faulty(study_of(tmp_path, ""))
    assert "25 pairs of nodes are at the same place but not joined" in said
    system = study_of(tmp_path, "", more='join_within = "0.01 mm"\n').system()
    assert system.size == 3 * (2 * len(nodes) - 25)
    assert "25 nodes within 0.01 mm of others were joined" in said_of(system)
    too_far = faulty(study_of(tmp_path, "", more='join_within = "60 mm"\n'))
    assert "it would join nodes of the same cell" in too_far


def test_loose_parts(tmp_path):
    nodes, cells = block()
    both = np.vstack([nodes, nodes + np.array([2.0, 0, 0])])
    write(tmp_path, both, [("tetra10", np.vstack([cells, cells + len(nodes)]))])
    said = faulty(study_of(tmp_path, ""))
    assert "falls into 2 parts that nothing joins, and 2 of them hang on nothing" in said
    assert "cells 145, 146, 147" in said
    held = """[points]
one = {box = [[0, 0, 0], [0, 1, 1]]}
two = {box = [[2, 0, 0], [2, 1, 1]]}
[[supports]]
at = ["one", "two"]
hold = "all"
"""
    assert study_of(tmp_path, held).system().size > 0


def test_orphans_and_inside_out_cells_are_mended_and_said(tmp_path):
    nodes, cells = block()
    write(tmp_path, nodes, [("tetra10", cells)])
    right = study_of(tmp_path, "").system()
    turned = cells.copy()
    turned[[2, 5]] = turned[[2, 5]][:, [1, 0, 2, 3, 4, 6, 5, 8, 7, 9]]
    write(tmp_path, np.vstack([nodes, [[9.0, 9.0, 9.0]]]), [("tetra10", turned)])
    system = study_of(tmp_path, "").system()
    said = said_of(system)
    assert "cells 3, 6 (tetra10) were inside out and have been turned round" in said
    assert f"node {len(nodes) + 1} of the file belong to no cell and were left out" in said
    assert abs(system.stiffness - right.stiffness).max() < 1e-9 * abs(right.stiffness).max()


def test_mixed_normals(tmp_path):
    """Turned to one side where it does not matter; stopped where an offset makes it matter."""
    nodes, cells = plate()
    turned = cells.copy()
    turned[[3, 20]] = turned[[3, 20]][:, ::-1]
    write(tmp_path, nodes, [("quad", turned)])
    study = study_of(tmp_path, "", SHELL)
    said = said_of(study.system())
    assert "cells 4, 21 have been turned round" in said
    wrong = faulty(study_of(tmp_path, "", SHELL + 'offset = "2 mm"\n'))
    assert re.search("normals of the shells of region all point to both sides .*cells 4, 21", wrong)


def test_a_twisted_band_has_one_side(tmp_path):
    angle = np.linspace(0, 2 * np.pi, 25)[:-1]
    across = np.linspace(-0.1, 0.1, 3)
    radius = 1 + across[:, None] * np.cos(angle / 2)
    nodes = np.stack(
        [radius * np.cos(angle), radius * np.sin(angle), across[:, None] * np.sin(angle / 2)], axis=2
    )
    number = np.arange(72).reshape(3, 24)
    ahead = np.column_stack([number[:, 1:], number[::-1, 0]])
    cells = np.stack([number[:-1], ahead[:-1], ahead[1:], number[1:]], axis=2).reshape(-1, 4)
    write(tmp_path, nodes.reshape(-1, 3), [("quad", cells)])
    assert "has only one side" in said_of(study_of(tmp_path, "", SHELL).system())


def test_regions_by_every_way_that_files_have(tmp_path):
    """Cell sets, physical names and integer data tell the same two halves."""
    nodes, cells = block("hexahedron", (4, 2, 2))
    left = nodes[cells].mean(axis=1)[:, 0] < 0.3
    tags = np.where(left, 7, 9)
    named = '[mesh.regions.{}]\nmaterial = "structural steel"\n[mesh.regions.{}]\nmaterial = "aluminium"\n'
    write(tmp_path, nodes, [("hexahedron", cells)], cell_data={"part": [tags]})
    by_tag = study_of(tmp_path, "", named.format("7", "9")).system()
    sets = {"left": [np.flatnonzero(left)], "right": [np.flatnonzero(~left)]}
    write(tmp_path, nodes, [("hexahedron", cells)], "m.inp", cell_sets=sets)
    by_set = study_of(tmp_path, "", named.format("left", "right"), "m.inp").system()
    data = {"gmsh:physical": [tags], "gmsh:geometrical": [tags]}
    mesh = meshio.Mesh(nodes, [("hexahedron", cells)], cell_data=data)
    mesh.field_data = {"left": np.array([7, 3]), "right": np.array([9, 3])}
    mesh.write(tmp_path / "m.msh", file_format="gmsh22")
    by_name = study_of(tmp_path, "", named.format("left", "right"), "m.msh").system()
    for system in (by_set, by_name):
        assert abs(system.stiffness - by_tag.stiffness).max() < 1e-6 * abs(by_tag.stiffness).max()
    assert [part.name for part in anatomy_of(by_name).parts] == ["left", "right"]


def test_regions_that_are_not_assigned_are_listed(tmp_path):
    nodes, cells = block("hexahedron", (4, 2, 2))
    write(tmp_path, nodes, [("hexahedron", cells)], cell_data={"part": [np.arange(len(cells)) % 2]})
    study = study_of(tmp_path, "", '[mesh.regions.0]\nmaterial = "structural steel"\n')
    said = faulty(study)
    assert '"0" (8 hexahedron): structural steel; "1" (8 hexahedron): not yet assigned' in said
    found = survey(study)
    assert [(r.name, dict(r.cells), r.use) for r in found.regions][1] == ("1", {"hexahedron": 8}, "")
    assert found.mass_kg is None
    half = STEEL.replace("all", "0") + '[mesh.regions.1]\nuse = "ignore"\n'
    assert survey(study_of(tmp_path, "", half)).regions[1].use == "ignored"


def test_several_tags_must_be_chosen_from(tmp_path):
    nodes, cells = block("hexahedron", (4, 2, 2))
    tags = {"part": [np.full(len(cells), 1)], "job": [np.full(len(cells), 2)]}
    write(tmp_path, nodes, [("hexahedron", cells)], cell_data=tags)
    assert re.search(r"mesh\.tag is missing: .*\((part, job|job, part)\)", faulty(study_of(tmp_path, "")))
    chosen = 'tag = "job"\n' + STEEL.replace("all", "2")
    assert study_of(tmp_path, "", chosen).system().size == 3 * len(nodes)
    assert "has no integer cell data" in faulty(study_of(tmp_path, "", 'tag = "no"\n' + STEEL))


@pytest.mark.parametrize(
    ("regions", "said"),
    [
        (STEEL.replace("all", "al"), 'has no region "al"'),
        (STEEL + 'thickness = "3 mm"\n', "a thickness is for triangles and quads, and it has none"),
        ('[mesh.regions.all]\nuse = "ignore"\n', "every region is ignored"),
        (
            '[mesh.regions.all]\nmaterial = "odd"\n[materials.odd]\nyoungs_modulus = "1 GPa"\n'
            'poissons_ratio = 0.3\nshear_modulus = "1 GPa"\ndensity = "1 kg/m^3"\n',
            "cells of a mesh are isotropic",
        ),
    ],
)
def test_wrong_assignments(tmp_path, regions, said):
    write(tmp_path, *(lambda n, c: (n, [("tetra10", c)]))(*block()))
    assert said in faulty(study_of(tmp_path, "", regions))


def test_shells_need_a_thickness(tmp_path):
    nodes, cells = plate()
    write(tmp_path, nodes, [("quad", cells)])
    assert "it has quad cells and needs a thickness" in faulty(study_of(tmp_path, ""))
