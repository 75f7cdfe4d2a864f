"""Meshes drawn, and written for any viewer."""

import io
import re

import meshio
import numpy as np
import pytest

from tests.structure.mesh.builders import anatomy_of, block, study_of, write
from vib.show.bundles import modes_files
from vib.show.figures import surface
from vib.show.figures.shapes import shape_picture
from vib.show.figures.structure import structure_picture
from vib.show.viewer import vtu_bytes

TEXT = """[points]
end = {box = [[0, 0, 0], [0, 1, 1]]}
tip = {nearest = [0.6, 0.1, 0.08]}
[[supports]]
at = "end"
hold = "all"
"""


@pytest.fixture
def solved(tmp_path):
    nodes, cells = block("hexahedron", (6, 2, 2))
    write(tmp_path, nodes, [("hexahedron", cells)])
    study = study_of(tmp_path, TEXT)
    return study, study.system().modes(count=3)


def test_the_skin_is_closed_and_turned_outwards(solved):
    """Area and, by the divergence theorem, volume of the block."""
    mesh = anatomy_of(solved[1].system).mesh
    assert mesh is not None
    faces = np.concatenate([corners for _, corners in mesh.faces])
    at = mesh.nodes_m[faces]
    vector = np.cross(at[:, 2] - at[:, 0], at[:, 3] - at[:, 1]) / 2
    assert len(faces) == 2 * (6 * 2 + 6 * 2 + 2 * 2)
    assert np.linalg.norm(vector, axis=1).sum() == pytest.approx(2 * (0.6 * 0.1 + 0.6 * 0.08 + 0.1 * 0.08))
    volume = np.einsum("fi,fi->", vector, at.mean(axis=1)) / 3
    assert volume == pytest.approx(0.6 * 0.1 * 0.08)


def test_only_faces_towards_the_eye_are_painted(solved):
    """Three sides of a block are seen: half of its faces."""
    study, modes = solved
    picture = structure_picture(study, modes.system)
    (painted,) = (c for c in picture.figure.axes[0].collections if type(c).__name__ == "PolyCollection")
    assert len(painted.get_paths()) == 6 * 2 + 6 * 2 + 2 * 2
    assert "end" in picture.svg()


def test_thinned_out_surfaces_keep_their_shape(tmp_path, monkeypatch):
    """Fewer faces, between nodes of the mesh, around nearly the same volume."""
    nodes, cells = block("hexahedron", (18, 6, 6))
    write(tmp_path, nodes, [("hexahedron", cells)])
    mesh = anatomy_of(study_of(tmp_path, TEXT).system()).mesh
    assert mesh is not None
    whole, _ = surface.corners_of(mesh)
    assert sum(len(corners) for corners in whole) == 2 * (18 * 6 + 18 * 6 + 6 * 6)
    monkeypatch.setattr(surface, "MOST_FACES", 400)
    faces, parts = surface.corners_of(mesh)
    assert 50 < sum(len(corners) for corners in faces) <= 400
    assert set(parts) == {"all"}
    at = mesh.nodes_m[np.concatenate(faces)]
    volume = np.einsum("fi,fi->", np.cross(at[:, 1] - at[:, 0], at[:, 2] - at[:, 0]) / 2, at.mean(axis=1)) / 3
    assert volume == pytest.approx(0.6 * 0.1 * 0.08, rel=0.4)


def test_many_faces_become_an_image(solved, monkeypatch):
    monkeypatch.setattr(surface, "VECTORS", 10)
    drawn = shape_picture(solved[1], 0).svg("m")
    assert "data:image/png;base64" in drawn
    assert len(drawn) < 300_000


def test_outline_of_a_block(solved):
    """Twelve edges: four of each length, in pieces of the cells."""
    mesh = anatomy_of(solved[1].system).mesh
    assert mesh is not None
    assert len(surface.sharp_edges(mesh)) == 4 * (6 + 2 + 2)


def test_shapes_for_any_viewer(solved, tmp_path):
    """Read back by meshio: nodes, cells and the displacement of each mode, compressed."""
    _, modes = solved
    (tmp_path / "back.vtu").write_bytes(vtu_bytes(modes))
    back = meshio.read(tmp_path / "back.vtu")
    mesh = anatomy_of(modes.system).mesh
    assert mesh is not None
    np.testing.assert_allclose(back.points, mesh.nodes_m)
    assert [(block.type, len(block.data)) for block in back.cells] == [("hexahedron", 24)]
    names = list(back.point_data)
    assert [re.match(r"mode (\d), [\d.e+]+ Hz$", name)[1] for name in names] == ["1", "2", "3"]  # type: ignore[index]
    for index, name in enumerate(names):
        expected = (mesh.motion @ modes.shapes[:, index]).reshape(-1, 3)
        np.testing.assert_allclose(back.point_data[name], expected)
    assert b'compressor="vtkZLibDataCompressor"' in (tmp_path / "back.vtu").read_bytes()


def test_files_of_a_mesh(solved):
    _, modes = solved
    files = modes_files(modes, "Block", "svg", "z")
    assert {"modes.json", "modes.csv", "shapes.npz", "shapes.vtu", "mode_01.svg"} <= set(files)
    with np.load(io.BytesIO(files["shapes.npz"])) as arrays:
        assert arrays["displacements"].shape == (len(arrays["nodes_m"]), 3, 3)
