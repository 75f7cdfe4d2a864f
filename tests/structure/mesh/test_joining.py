"""Points found in a mesh; supports, bodies, springs and members joined to it."""

import re

import numpy as np
import pytest
import scipy.linalg

import vib
from tests.structure.mesh.builders import STEEL, anatomy_of, block, plate, said_of, study_of, write
from vib.errors import ModelError, StudyError
from vib.structure import survey
from vib.structure.mesh.operators import CellOperator

SHELL = '[mesh.regions.all]\nmaterial = "structural steel"\nthickness = "5 mm"\n'
CLAMPED = """[points]
end = {box = [[0, 0, 0], [0, 1, 1]]}
tip = {nearest = [0.6, 0.1, 0.08]}
[[supports]]
at = "end"
hold = "all"
"""


@pytest.fixture
def solid(tmp_path):
    nodes, cells = block()
    write(tmp_path, nodes, [("tetra10", cells)])
    return tmp_path, nodes


def lowest(system, count):
    """Natural frequencies in Hz by LAPACK, dense."""
    values = scipy.linalg.eigh(system.stiffness.toarray(), system.mass.toarray(), eigvals_only=True)
    return np.sqrt(np.abs(values[:count])) / (2 * np.pi)


def test_the_declared_unit_of_the_coordinates(tmp_path):
    nodes, cells = block()
    write(tmp_path, 1000 * nodes, [("tetra10", cells)])
    found = survey(study_of(tmp_path, "", length="mm"))
    assert found.mass_kg == pytest.approx(7850 * 0.6 * 0.1 * 0.08)
    assert found.centre_m == pytest.approx([0.3, 0.05, 0.04])
    with pytest.raises(StudyError, match=r"mesh\.length.*kg"):
        study_of(tmp_path, "", length="kg")


def test_points_of_every_kind(solid):
    folder, nodes = solid
    text = """[points]
near = {nearest = [0.61, 0.1, 0.08]}
third = {node = 3}
face = {box = [[0.6, 0, 0], [0.6, 0.1, 0.08]]}
exact = [0.6, 0.1, 0.08]
apart = [0.7, 0, 0]
"""
    system = study_of(folder, text).system()
    places = anatomy_of(system).places
    last = int(np.flatnonzero((np.abs(nodes - [0.6, 0.1, 0.08]) < 1e-9).all(axis=1))[0])
    assert places["near"].position_m == pytest.approx([0.6, 0.1, 0.08])
    assert places["exact"].position_m == places["near"].position_m
    assert places["third"].position_m == pytest.approx(nodes[2])
    assert places["face"].position_m == pytest.approx([0.6, 0.05, 0.04])
    said = said_of(system)
    assert f"point near is node {last + 1} of the mesh, 10 mm from where it was asked" in said
    assert "points face: 25 nodes of the mesh" in said
    assert re.search("point apart is at no node of the mesh .*100 mm away.*a point of its own", said)
    moved = np.zeros(system.size)
    on_face = np.flatnonzero(np.abs(nodes[:, 0] - 0.6) < 1e-9)
    moved[3 * on_face + 1] = np.arange(len(on_face))
    assert (places["face"].motion @ moved)[1] == pytest.approx(np.arange(len(on_face)).mean())
    assert system.direction("exact", "z")[3 * last + 2] == 1.0
    assert str(system.freedoms[3 * last + 2]) == f"node {last + 1} z"
    with pytest.raises(ModelError, match="nodes of solids have no rotations"):
        system.direction("near", "rx")


@pytest.mark.parametrize(
    ("point", "said"),
    [
        ("{nearest = [0.7, 0.1, 0.08]}", "100 mm away, more than half"),
        ("{node = 99999}", "there is no node 99999"),
        ("{box = [[1, 0, 0], [2, 1, 1]]}", r"no node of the mesh is in the box; .* and \[600, 100, 80\] mm"),
        ('{set = "sole"}', 'has no point set or region "sole"'),
    ],
)
def test_points_that_are_not_there(solid, point, said):
    with pytest.raises(ModelError, match=said):
        study_of(solid[0], f"[points]\nA = {point}\n").system()


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("[points]\nA = {node = 1, box = [[0, 0, 0], [1, 1, 1]]}\n", "needs exactly one of nearest, node"),
        ("[points]\nA = {nerest = [0, 0, 0]}\n", r'unknown key \(did you mean "nearest"\?\)'),
        ('[points]\nA = {node = 0}\n[[supports]]\nat = "A"\nhold = "all"\n', r"points\.A\.node"),
        (
            '[points]\nA = {box = [[0, 0, 0], [1, 1, 1]]}\nB = [0, 0, 5]\n[sections.s]\nshape = "IPE 200"\n'
            '[[members]]\nsection = "s"\nmaterial = "aluminium"\nruns = [["A", "B"]]\n',
            '"A" is a set of points; a run joins single points',
        ),
        (
            '[points]\nA = {box = [[0, 0, 0], [1, 1, 1]]}\n[[bodies]]\nmass = "1 kg"\ncarried_by = "A"\n',
            "is needed where a set of points carries a body",
        ),
        (
            '[points]\nA = {set = "x"}\nB = [0, 0, 5]\n[[springs]]\nbetween = ["A", "B"]\n'
            'stiffness = {x = "1 N/m"}\n',
            r'"A" is a set of points, .* ground only; .*carried_by = \["A", "foot"\].* \["foot", "B"\]',
        ),
        ('[mesh.regions.b]\nmaterial = "steal"\n', 'no material is named "steal"'),
        ('[mesh.regions.b]\nuse = "ignore"\nmaterial = "aluminium"\n', "leaves nothing to say"),
        ('[mesh.regions.b]\nmaterial = "aluminium"\noffset = "1 mm"\n', "offset is for shells"),
    ],
)
def test_faults_of_the_study_file(solid, text, said):
    with pytest.raises(StudyError, match=said):
        study_of(solid[0], text)


def test_a_finder_needs_a_mesh(tmp_path):
    file = tmp_path / "s.toml"
    file.write_text('[points]\nA = {node = 1}\n[[bodies]]\nmass = "1 kg"\ncarried_by = "A"\n')
    with pytest.raises(StudyError, match=r"points\.A is to be found in a mesh, and there is no \[mesh\]"):
        vib.read(file)


def test_a_clamped_end_stands_still(solid):
    """Held rows are cut; the matrices are those of the free block without them."""
    folder, nodes = solid
    free = study_of(folder, "").system()
    held = study_of(folder, CLAMPED).system()
    rows = np.repeat(nodes[:, 0] > 1e-9, 3)
    assert abs(held.stiffness - free.stiffness[rows][:, rows]).max() == 0
    assert abs(held.mass - free.mass[rows][:, rows]).max() == 0
    anatomy = anatomy_of(held)
    assert anatomy.rigid_mass[0, 0] == pytest.approx(7850 * 0.6 * 0.1 * 0.08)
    assert not (anatomy.places["end"].motion @ np.ones(held.size)).any()


def test_sag_and_reactions(tmp_path):
    """The support carries the weight, with its moment about the middle of the face.

    Tip sag by the slender beam, q L^4 / (8 E I) plus shear q L^2 / (2 k G A) with k = 5/6 (S. Timoshenko,
    Strength of Materials, from memory); 2 % for the face that can't swell where it is clamped.
    """
    nodes, cells = block(counts=(12, 3, 3))
    write(tmp_path, nodes, [("tetra10", cells)])
    found = survey(study_of(tmp_path, CLAMPED))
    weight = 7850 * 0.6 * 0.1 * 0.08 * 9.80665
    sag = found.sag
    assert sag is not None
    (support,) = sag.reactions
    assert support.force_n == pytest.approx([0, 0, weight], abs=1e-6 * weight)
    assert support.moment_nm == pytest.approx([0, -0.3 * weight, 0], abs=1e-5 * weight)
    line = weight / 0.6
    second, area = 0.1 * 0.08**3 / 12, 0.1 * 0.08
    expected = line * 0.6**4 / (8 * 210e9 * second) + line * 0.6**2 / (2 * 5 / 6 * 210e9 / 2.6 * area)
    assert sag.greatest_m == pytest.approx(expected, rel=0.02)
    assert sag.displacement_m["tip"][2] == pytest.approx(-sag.greatest_m, rel=0.01)
    assert [(s.point, s.nodes) for s in found.supports] == [("end", 49)]


def test_a_body_on_a_box_of_nodes_moves_as_one(solid):
    """All nodes of the face follow the body exactly, and the mass of the whole is the sum."""
    folder, nodes = solid
    text = (
        CLAMPED.replace("[[supports]]", "face = {box = [[0.6, 0, 0], [0.6, 1, 1]]}\n[[supports]]", 1)
        + """
[[bodies]]
name = "motor"
mass = "10 kg"
centre = [0.7, 0.05, 0.04]
inertia = ["0.1 kg m^2", "0.2 kg m^2", "0.3 kg m^2"]
carried_by = "face"
"""
    )
    system = study_of(folder, text).system()
    anatomy = anatomy_of(system)
    face = np.flatnonzero(np.abs(nodes[:, 0] - 0.6) < 1e-9)
    state = np.random.default_rng(1).standard_normal(system.size)
    motor = anatomy.places["motor"].motion @ state
    assert anatomy.mesh is not None
    moved = (anatomy.mesh.motion @ state).reshape(-1, 3)[face]
    rigid = motor[:3] + np.cross(motor[3:], nodes[face] - [0.7, 0.05, 0.04])
    np.testing.assert_allclose(moved, rigid, atol=1e-12)
    assert anatomy.rigid_mass[2, 2] == pytest.approx(7850 * 0.6 * 0.1 * 0.08 + 10)
    np.testing.assert_allclose(
        anatomy.carried.T @ np.linalg.solve(system.mass.toarray(), anatomy.carried) <= anatomy.rigid_mass + 1,
        True,
    )
    modes = system.modes(count=4)
    assert modes.kinetic_energy is not None
    assert modes.strain_energy is not None
    assert sum(modes.kinetic_energy.values()) == pytest.approx(np.ones(4))
    assert sum(modes.strain_energy.values()) == pytest.approx(np.ones(4))


def test_springs_shared_by_a_set(solid):
    """A free block on a bed of springs bobs at sqrt(k / m): the whole constant, evenly shared.

    The springs are so soft that the block is rigid.
    """
    text = """[points]
sole = {box = [[0, 0, 0], [1, 1, 0]]}
[[springs]]
name = "bed"
between = ["sole", "ground"]
stiffness = {x = "1 kN/m", y = "1 kN/m", z = "2 kN/m"}
"""
    modes = study_of(solid[0], text).system().modes(count=6)
    mass = 7850 * 0.6 * 0.1 * 0.08
    bob = np.sqrt(2e3 / mass) / (2 * np.pi)
    assert np.abs(modes.frequencies_hz / bob - 1).min() < 1e-3
    found = survey(study_of(solid[0], text))
    assert found.sag is not None
    assert sum(r.force_n[2] for r in found.sag.reactions) == pytest.approx(mass * 9.80665)
    assert found.sag.displacement_m["sole"][2] == pytest.approx(-mass * 9.80665 / 2e3, rel=1e-3)


def test_a_spring_between_a_set_and_a_point(solid):
    """As the message about it says: by a light body that the set carries. The block bobs on its foot."""
    text = """[points]
sole = {box = [[0, 0, 0], [1, 1, 0]]}
foot = {nearest = [0.3, 0.05, 0]}
low = [0.3, 0.05, -0.2]
[[bodies]]
mass = "1 g"
centre = [0.3, 0.05, 0]
carried_by = ["sole", "foot"]
[[springs]]
between = ["foot", "low"]
stiffness = {x = "9 kN/m", y = "9 kN/m", z = "2 kN/m", rx = "9 kN m/rad", ry = "9 kN m/rad"}
[[supports]]
at = "low"
hold = "all"
"""
    modes = study_of(solid[0], text).system().modes(count=6)
    mass = 7850 * 0.6 * 0.1 * 0.08 + 1e-3
    bob = np.sqrt(2e3 / mass) / (2 * np.pi)
    assert np.abs(modes.frequencies_hz / bob - 1).min() < 1e-3


POST = """[sections.post]
shape = "SHS 40x40x4"
[[members]]
name = "post"
section = "post"
material = "structural steel"
runs = [["foot", "head"]]
"""


def test_a_member_on_one_node_of_a_solid_is_hinged_and_named(solid):
    points = "[points]\nfoot = {nearest = [0.3, 0.05, 0.08]}\nhead = [0.3, 0.05, 0.5]\n"
    system = study_of(solid[0], points + POST).system()
    assert "hinged there" in said_of(system)
    modes = system.modes(count=10)
    assert modes.rigid_body_count == 9  # six of the whole, and three turns of the post
    carried = (
        points
        + "around = {box = [[0.2, 0, 0.08], [0.4, 0.1, 0.08]]}\n"
        + POST
        + """
[[bodies]]
name = "foot plate"
mass = "1 kg"
centre = [0.3, 0.05, 0.08]
carried_by = ["foot", "around"]
"""
    )
    system = study_of(solid[0], carried).system()
    assert "hinged there" not in said_of(system)
    assert system.modes(count=8).rigid_body_count == 6


def test_a_member_clamped_on_shells(tmp_path):
    """A post on a clamped plate has no mechanism: shells have rotations."""
    nodes, cells = plate()
    write(tmp_path, nodes, [("quad", cells)])
    text = """[points]
foot = [0.5, 0.5, 0]
head = [0.5, 0.5, 0.4]
left = {box = [[0, 0, 0], [0, 1, 0]]}
[[supports]]
at = "left"
hold = "all"
"""
    system = study_of(tmp_path, text + POST, SHELL).system()
    modes = system.modes(count=6)
    assert modes.rigid_body_count == 0
    assert "a point of its own" in said_of(system)  # head
    assert modes.strain_energy is not None
    assert set(modes.strain_energy) == {"post", "all"}
    assert sum(modes.strain_energy.values()) == pytest.approx(np.ones(6))


def test_lines_of_a_mesh_are_members(tmp_path):
    """A portal as a mesh of lines has the frequencies of the same portal in the study file."""
    nodes = np.array([[0, 0, 0], [0, 0, 1], [1.2, 0, 1], [1.2, 0, 0], [0.6, 0, 1.0]])
    cells = [("line", np.array([[0, 1], [2, 3]])), ("line3", np.array([[1, 2, 4]]))]
    write(tmp_path, nodes, cells)
    regions = '[mesh.regions.all]\nmaterial = "structural steel"\nsection = "bar"\n'
    rest = '[[supports]]\nat = ["A", "D"]\nhold = "all"\n[sections.bar]\nshape = "IPE 200"\n'
    meshed = study_of(tmp_path, "[points]\nA = {node = 1}\nD = {node = 4}\n" + rest, regions)
    members = """[[members]]
section = "bar"
material = "structural steel"
runs = [["A", "B"], ["C", "D"], ["B", "E", "C"]]
[points]
A = [0, 0, 0]
B = [0, 0, 1]
C = [1.2, 0, 1]
D = [1.2, 0, 0]
E = [0.6, 0, 1]
"""
    file = tmp_path / "plain.toml"
    file.write_text('[units]\nlength = "m"\n' + members + rest)
    expected = vib.read(file).system().modes(count=6)
    found = meshed.system().modes(count=6)
    np.testing.assert_allclose(found.frequencies_hz, expected.frequencies_hz, rtol=1e-9)
    np.testing.assert_allclose(found.errors_hz, expected.errors_hz, rtol=1e-3, atol=1e-9)


def test_shares_of_two_regions(tmp_path):
    """The operators of the regions add up to the whole."""
    nodes, cells = block("hexahedron", (4, 2, 2))
    left = nodes[cells].mean(axis=1)[:, 0] < 0.3
    write(tmp_path, nodes, [("hexahedron", cells)], cell_data={"part": [left.astype(int)]})
    regions = STEEL.replace("all", "0") + '[mesh.regions.1]\nmaterial = "aluminium"\n'
    system = study_of(tmp_path, CLAMPED, regions).system()
    parts = anatomy_of(system).parts
    assert all(isinstance(part.stiffness, CellOperator) for part in parts)
    state = np.random.default_rng(2).standard_normal((system.size, 3))
    for kind, whole in (("stiffness", system.stiffness), ("mass", system.mass)):
        total = sum(getattr(part, kind) @ state for part in parts)
        np.testing.assert_allclose(total, whole @ state, atol=1e-9 * abs(whole @ state).max())
    found = survey(study_of(tmp_path, CLAMPED, regions))
    assert [part.mass_kg for part in found.parts] == pytest.approx([7850 * 0.0024, 2700 * 0.0024])


def test_a_point_joined_to_the_mesh_changes_nothing_by_itself(solid):
    """A massless spring of no stiffness along z at a node makes it a point; frequencies stay."""
    folder, _ = solid
    plain = study_of(folder, CLAMPED).system()
    text = CLAMPED + '[[springs]]\nbetween = ["tip", "ground"]\nstiffness = {x = "1e-3 N/m"}\n'
    joined = study_of(folder, text).system()
    assert joined.size == plain.size
    np.testing.assert_allclose(lowest(joined, 8), lowest(plain, 8), rtol=1e-8)
