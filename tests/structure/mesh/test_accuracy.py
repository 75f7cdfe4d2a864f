"""Error bars of mesh frequencies against the true errors, and the way from a file to modes."""

import numpy as np
import pytest

import vib
from tests.structure.cells.test_plate_frequencies import THIN
from tests.structure.cells.test_solid_frequencies import FREE_CUBE
from tests.structure.mesh.builders import anatomy_of, block, plate, study_of, write

UNIT = """[materials.unit]
youngs_modulus = "2.6 Pa"
poissons_ratio = 0.3
density = "1 kg/m^3"
"""
SOLID = '[mesh.regions.all]\nmaterial = "unit"\n'
SHELL = SOLID + 'thickness = "1 mm"\n'
EDGES = """[points]
whole = {box = [[0, 0, 0], [1, 1, 0]]}
left = {box = [[0, 0, 0], [0, 1, 0]]}
low = {box = [[0, 0, 0], [1, 0, 0]]}
right = {box = [[1, 0, 0], [1, 1, 0]]}
high = {box = [[0, 1, 0], [1, 1, 0]]}
[[supports]]
at = "whole"
hold = ["x", "y", "rz"]
"""


def plate_modes(folder, kind, across, edges):
    """A square plate of side 1 m; edges left, low, right, high clamped, simply supported or free."""
    nodes, cells = plate(kind, across)
    write(folder, nodes, [(kind, cells)])
    text = EDGES
    for name, edge, turn in zip(
        ("left", "low", "right", "high"), edges, ("rx", "ry", "rx", "ry"), strict=True
    ):
        if edge != "F":
            hold = '"all"' if edge == "C" else f'["z", "{turn}"]'
            text += f'[[supports]]\nat = "{name}"\nhold = {hold}\n'
    return study_of(folder, UNIT + text, SHELL).system().modes(count=9 if edges == "FFFF" else 6)


def lambdas(modes):
    """omega a^2 sqrt(density h / D) of the elastic modes."""
    unit = np.sqrt(2.6 * 1e-6 / 12 / (1 - 0.3**2)) / (2 * np.pi)
    return modes.frequencies_hz[modes.rigid_body_count :] / unit


@pytest.mark.parametrize("kind", ["quad", "triangle"])
@pytest.mark.parametrize("edges", THIN)
def test_plates(tmp_path, kind, edges):
    """Published values (see THIN) within the error bar, which is between 0.3 and 3 times the true error."""
    modes = plate_modes(tmp_path, kind, 10, edges)
    free = modes.rigid_body_count
    assert free == (3 if edges == "FFFF" else 0)
    true = np.abs(lambdas(modes) / THIN[edges] - 1)
    ratio = modes.errors_hz[free:] / modes.frequencies_hz[free:] / np.maximum(true, 1e-4)
    assert ratio.min() > 0.3
    assert ratio.max() < 3
    assert modes.complete_below_hz is not None


def test_plates_by_their_stresses(tmp_path, monkeypatch):
    """Where the divided mesh would be too large: the same bounds, by jumps of the moments."""
    monkeypatch.setattr("vib.structure.mesh.accuracy.MOST_COMPARED", 0)
    modes = plate_modes(tmp_path, "quad", 10, "SSSS")
    ratio = modes.errors_hz / modes.frequencies_hz / np.abs(lambdas(modes) / THIN["SSSS"] - 1)
    assert ratio.min() > 0.3
    assert ratio.max() < 3
    assert any("by the stresses of the modes" in remark for remark in modes.remarks)


@pytest.mark.parametrize(("kind", "across"), [("tetra10", 3), ("hexahedron", 6), ("tetra", 6)])
def test_a_free_cube(tmp_path, kind, across):
    """Converged values of the free cube (see FREE_CUBE); also the too stiff first-order tetrahedra."""
    nodes, cells = block(kind, (across,) * 3, (1.0, 1.0, 1.0))
    write(tmp_path, nodes, [(kind, cells)])
    modes = study_of(tmp_path, UNIT, SOLID).system().modes(count=14)
    assert modes.rigid_body_count == 6
    assert modes.rigid_descriptions[0] == "the whole structure can move freely along x"
    true = 2 * np.pi * modes.frequencies_hz[6:] / FREE_CUBE[:8] - 1
    ratio = modes.errors_hz[6:] / modes.frequencies_hz[6:] / true
    assert ratio.min() > 0.3
    assert ratio.max() < 3
    said = " ".join(modes.remarks)
    assert ("too stiff" in said) == (kind == "tetra")


CANTILEVER = """[points]
end = {box = [[0, 0, 0], [0, 1, 1]]}
tip = {nearest = [1, 0, 0]}
[[supports]]
at = "end"
hold = "all"
"""


@pytest.mark.parametrize(
    ("kind", "coarse"), [("tetra10", (8, 2, 2)), ("hexahedron", (16, 4, 4)), ("tetra", (10, 3, 3))]
)
def test_a_cantilever_block(tmp_path, kind, coarse):
    """Against the same block of far smaller second-order bricks."""
    found = []
    for name, counts in ((kind, coarse), ("hexahedron20", (24, 5, 5))):
        nodes, cells = block(name, counts, (1.0, 0.2, 0.2))
        write(tmp_path, nodes, [(name, cells)])
        found.append(study_of(tmp_path, UNIT + CANTILEVER, SOLID).system().modes(count=6))
    modes, fine = found
    true = modes.frequencies_hz / fine.frequencies_hz - 1
    ratio = modes.errors_hz / modes.frequencies_hz / np.maximum(true, 1e-5)
    assert ratio.min() > 0.3
    assert ratio.max() < 3
    assert (fine.errors_hz < modes.errors_hz).all()


def test_by_blocks_and_dense_agree(tmp_path, monkeypatch):
    """The search for large systems finds what the one for small ones finds, by count and by limit."""
    nodes, cells = block("tetra10", (8, 2, 2), (1.0, 0.2, 0.2))
    write(tmp_path, nodes, [("tetra10", cells)])
    system = study_of(tmp_path, UNIT + CANTILEVER, SOLID).system()
    plain = system.modes(count=10)
    monkeypatch.setattr("vib.solve.search.LARGE", 100)
    by_blocks = system.modes(count=10)
    np.testing.assert_allclose(by_blocks.frequencies_hz, plain.frequencies_hz, rtol=1e-9)
    limit = float(plain.frequencies_hz[6] + plain.frequencies_hz[7]) / 2
    limited = system.modes(up_to=limit)
    np.testing.assert_allclose(limited.frequencies_hz, plain.frequencies_hz[:7], rtol=1e-9)
    assert limited.complete_below_hz == limit
    with_damping = study_of(tmp_path, UNIT + CANTILEVER + "[damping]\nratio = 0.02\n", SOLID).system()
    damped = with_damping.modes(count=10)
    np.testing.assert_allclose(damped.frequencies_hz, plain.frequencies_hz, rtol=1e-9)
    np.testing.assert_allclose(damped.damping_ratios, 0.02)


def test_too_coarse_is_said(tmp_path):
    nodes, cells = block("tetra10", (4, 1, 1), (1.0, 0.2, 0.2))
    write(tmp_path, nodes, [("tetra10", cells)])
    modes = study_of(tmp_path, UNIT + CANTILEVER, SOLID).system().modes(count=6)
    assert any("The mesh is too coarse for" in remark for remark in modes.remarks)


def test_ring_and_screening(tmp_path):
    """A blow on a set of nodes, watched elsewhere; and an excitation."""
    nodes, cells = block("tetra10", (4, 1, 1), (1.0, 0.2, 0.2))
    write(tmp_path, nodes, [("tetra10", cells)])
    text = (
        CANTILEVER.replace("tip =", "face = {box = [[1, 0, 0], [1, 1, 1]]}\ntip =")
        + """[damping]
ratio = 0.01
[[excitations]]
name = "fan"
speed = "6000 rpm"
at = "face"
along = "z"
"""
    )
    study = study_of(tmp_path, text, '[mesh.regions.all]\nmaterial = "structural steel"\n')
    system = study.system()
    ring = system.ring(impulse=1.0, at="face", along="z", watch=[("tip", "z")], duration=0.05)
    assert np.abs(ring.displacement_m).max() > 0
    screening = vib.screen(system.modes(count=6), study.excitations)
    assert len(screening.lines) == 1
    assert anatomy_of(system).places["face"].position_m == pytest.approx([1, 0.1, 0.1])
