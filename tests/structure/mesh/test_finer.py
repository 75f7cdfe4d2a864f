"""Shells divided in four: where the new nodes lie."""

import numpy as np
import pytest

from tests.structure.mesh.builders import plate, study_of, write
from vib.structure.mesh.finer import divided
from vib.structure.mesh.model import read_mesh_study

SHELL = '[mesh.regions.all]\nmaterial = "structural steel"\nthickness = "5 mm"\n'


def finer(folder, nodes, kind, cells):
    """The new nodes, m."""
    write(folder, nodes, [(kind, cells)])
    model = read_mesh_study(study_of(folder, "", SHELL))[1]
    return divided(model).nodes_m[len(nodes) :]


@pytest.mark.parametrize("kind", ["quad", "triangle"])
@pytest.mark.parametrize("around", [np.pi / 2, np.pi])
def test_on_a_cylinder(tmp_path, kind, around):
    """Off the chord by the sagitta within a tenth, also along straight rims; at corners nearer than it."""
    nodes, cells = plate(kind, 6)
    angle = around * nodes[:, 0]
    found = finer(tmp_path, np.column_stack([np.cos(angle), np.sin(angle), nodes[:, 1]]), kind, cells)
    sagitta = 1 - np.cos(around / 12)
    off = np.abs(np.hypot(found[:, 0], found[:, 1]) - 1)
    assert off.max() < 0.6 * sagitta
    assert np.quantile(off, 0.8) < 0.1 * sagitta


@pytest.mark.parametrize("kind", ["quad", "triangle"])
def test_on_a_sphere(tmp_path, kind):
    """The same on a patch of a sphere."""
    nodes, cells = plate(kind, 6)
    x, y = 0.8 * (nodes[:, :2] - 0.5).T
    places = np.column_stack([x, y, np.sqrt(1 - x**2 - y**2)])
    found = finer(tmp_path, places, kind, cells)
    step = 0.8 / 6 * (1 if kind == "quad" else np.sqrt(2))
    off = np.abs(np.linalg.norm(found, axis=1) - 1)
    assert off.max() < 0.8 * step**2 / 8
    assert np.median(off) < 0.1 * step**2 / 8


def test_edges_of_a_box_stay_sharp(tmp_path):
    """Two flat plates at right angles: every new node lies on one of them."""
    nodes, cells = plate("quad", 4)
    upright = nodes[:, [2, 1, 0]]
    both = np.vstack([nodes, upright])
    _, kept, place = np.unique(np.round(both, 9), axis=0, return_index=True, return_inverse=True)
    found = finer(tmp_path, both[kept], "quad", place.ravel()[np.vstack([cells, cells + len(nodes)])])
    assert np.minimum(np.abs(found[:, 0]), np.abs(found[:, 2])).max() < 1e-12


def test_a_can_keeps_its_round_rim(tmp_path):
    """A flat ring around the end of a pipe: their common edge is as curved as the pipe."""
    nodes, cells = plate("quad", 8)
    angle = np.pi / 2 * nodes[:, 0]
    pipe = np.column_stack([np.cos(angle), np.sin(angle), nodes[:, 1]])
    out = 1 + nodes[:, 1]
    ring = np.column_stack([out * np.cos(angle), out * np.sin(angle), 0 * angle])
    both = np.vstack([pipe, ring])
    _, kept, place = np.unique(np.round(both, 9), axis=0, return_index=True, return_inverse=True)
    found = finer(tmp_path, both[kept], "quad", place.ravel()[np.vstack([cells, cells + len(nodes)])])
    rim = found[(np.abs(found[:, 2]) < 1e-9) & (np.hypot(found[:, 0], found[:, 1]) < 1.01)]
    assert len(rim) == 8
    np.testing.assert_allclose(np.hypot(rim[:, 0], rim[:, 1]), 1, atol=0.5 * (1 - np.cos(np.pi / 32)))
