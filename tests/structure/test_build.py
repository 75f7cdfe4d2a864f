"""The system of a study: damping, parts, pictures, remarks, and errors that name the entry and the mend."""

from typing import Any

import numpy as np
import pytest

import vib
from vib.errors import MatrixError, ModelError

BAR = {"shape": "rectangle", "width": 0.08, "height": 0.05}
POINTS: dict[str, Any] = {"A": [0, 0, 0], "B": [2, 0, 0], "C": [2, 0, 1]}


@pytest.fixture(scope="session")
def bars(describe):
    """Two bars A-B-C, clamped at A; entries of the member table and other tables on top."""

    def make(members=None, **tables):
        table = {
            "name": "bars",
            "section": "bar",
            "material": "steel",
            "runs": [["A", "B", "C"]],
            **(members or {}),
        }
        whole = {"points": POINTS, "sections": {"bar": BAR}, "supports": [{"at": "A", "hold": "all"}]}
        return describe(**{**whole, "members": [table], **tables})

    return make


def test_parts_add_up(bars):
    """The shares of members, springs and bodies make up the whole; symmetric to the last bit."""
    study = bars(
        bodies=[{"name": "motor", "mass": 20, "inertia": [1, 2, 3], "carried_by": "C"}],
        springs=[
            {"name": "mount", "between": ["B", "ground"], "stiffness": {"z": 1e5}, "dashpot": {"z": 30}}
        ],
    )
    system = study.system()
    parts = system.anatomy.parts
    assert [(part.name, part.kind) for part in parts] == [
        ("bars", "members"),
        ("mount", "springs"),
        ("motor", "body"),
    ]
    for what in ("mass", "stiffness"):
        whole = getattr(system, what)
        total = sum(getattr(part, what) for part in parts if getattr(part, what) is not None)
        assert abs(whole - total).max() <= 1e-12 * abs(whole).max()
        assert abs(whole - whole.T).max() == 0
    assert parts[2].stiffness is None
    assert parts[1].mass is None


def test_damping_adds_up(bars):
    """Dashpots and the Rayleigh curve are a matrix; ratios and materials are a law."""
    study = bars(
        {"material": "lossy"},
        materials={"lossy": {"like": "steel", "damping_ratio": 0.004}},
        springs=[{"name": "d", "between": ["C", "ground"], "dashpot": {"x": 50.0}}],
        damping={"ratio": 0.01, "rayleigh": [[10, 0.02], [100, 0.03]], "ranges": [[0, 50, 0.005]]},
    )
    system = study.system()
    along = system.direction("C", "x")
    alpha, beta = vib.study.machine.rayleigh_constants(((10.0, 0.02), (100.0, 0.03)))
    wanted = alpha * system.mass + beta * system.stiffness
    np.testing.assert_allclose(
        (system.damping - wanted).toarray(), 50 * np.outer(along, along), atol=1e-9 * abs(wanted).max()
    )
    assert system.damping_law.ratio == 0.01
    assert system.damping_law.bands == ((0.0, 50.0, 0.005),)
    assert system.damping_law.material
    assert system.anatomy.parts[0].damping_ratio == 0.004
    assert not any("undamped" in remark for remark in system.anatomy.remarks)
    plain = bars().system()
    assert plain.damping is None
    assert not plain.damping_law.material
    assert "no damping is given: everything is undamped" in plain.anatomy.remarks


def test_places_and_lines(bars):
    """Places follow the freedoms, lines join nodes of the wireframe."""
    study = bars(
        {"offset_end": [0, 0.1, 0]},
        bodies=[{"name": "motor", "mass": 20, "centre": [2, 0, 1.5], "carried_by": "C"}],
        springs=[{"name": "tie", "between": ["A", "C"], "stiffness": {"x": 1.0}}],
    )
    anatomy = study.system().anatomy
    assert list(anatomy.places) == ["A", "B", "C", "motor"]
    assert anatomy.places["A"].motion.nnz == 0
    # the body turns about x: C, half a metre below its centre, moves along y
    about_x = study.system().direction("motor", "rx")
    np.testing.assert_allclose(anatomy.places["C"].motion @ about_x, [0, 0.5, 0, 1, 0, 0])
    frame = anatomy.wireframe
    assert frame.motion.shape == (3 * len(frame.nodes_m), len(about_x))
    by_name: dict[str, Any] = {}
    for name, nodes in frame.lines:
        by_name.setdefault(name, []).append(frame.nodes_m[list(nodes)])
    np.testing.assert_allclose(by_name["bars"][0], [[x, 0, 0] for x in (0, 0.5, 1, 1.5, 2)])
    np.testing.assert_allclose(by_name["bars"][1][-1], [2, 0.1, 1])
    np.testing.assert_allclose(by_name["bars"][2], np.array([[2, 0, 1], [2, 0.1, 1]]))
    np.testing.assert_allclose(by_name["tie"][0], np.array([[0, 0, 0], [2, 0, 1]]))
    np.testing.assert_allclose(by_name["motor"][0], np.array([[2, 0, 1.5], [2, 0, 1]]))


def test_names_that_two_kinds_share_are_told_apart(bars):
    study = bars({"name": "motor"}, bodies=[{"name": "motor", "mass": 20, "carried_by": "C"}])
    assert [part.name for part in study.system().anatomy.parts] == ["motor (members)", "motor (body)"]


def test_a_run_given_twice_is_two_members(bars):
    study = bars({"runs": [["A", "B"], ["A", "B"]]}, points={"A": [0, 0, 0], "B": [2, 0, 0]})
    system = study.system()
    assert len(set(system.freedoms)) == system.size
    assert any(
        "2 members run side by side between points A and B" in remark for remark in system.anatomy.remarks
    )


@pytest.mark.parametrize(("inertia", "told"), [([1, 2, 3], False), ([1, 2, 3.1], True), ([0, 0, 0], False)])
def test_inertia_that_no_body_has_is_told(bars, inertia, told):
    """Ixx + Iyy = Izz + 2 int z^2 dm: no principal moment of a body exceeds the other two together."""
    body = {"name": "motor", "mass": 20, "inertia": inertia, "carried_by": "C"}
    remarks = bars(bodies=[body]).system().anatomy.remarks
    assert any("no body has such moments of inertia as motor" in remark for remark in remarks) is told


BALL = {"name": "b", "mass": 1, "inertia": [1, 1, 1], "carried_by": "E"}
CHANNEL = {
    "shape": "channel",
    "height": 0.1,
    "width": 0.05,
    "web_thickness": 0.006,
    "flange_thickness": 0.008,
}
GENERAL = {"area": 1e-3, "second_moment_y": 1e-6, "second_moment_z": 1e-6, "torsion_constant": 1e-6}
REMARKS: dict[str, Any] = {
    "unused": ({"points": {**POINTS, "E": [9, 9, 9]}}, "point E is used by no member, body or spring"),
    "held but unused": (
        {"points": {**POINTS, "E": [9, 9, 9]}, "supports": [{"at": ["A", "E"], "hold": "all"}]},
        "point E is used by no member, body or spring",
    ),
    "same place": (
        {"points": {**POINTS, "E": [2, 0, 1]}, "bodies": [BALL]},
        "points C and E are at the same place but not joined by it",
    ),
    "on a run": (
        {"points": {**POINTS, "E": [0.7, 0, 0]}, "bodies": [BALL]},
        "point E lies on bars A-B but is not joined to it",
    ),
    "free": ({"supports": []}, "nothing holds the structure"),
    "rotations": (
        {
            "points": {**POINTS, "E": [5, 0, 0]},
            "bodies": [{"name": "b", "mass": 1, "carried_by": "E"}],
            "springs": [{"name": "s", "between": ["E", "ground"], "stiffness": {"x": 1.0}}],
        },
        "left out: rx ry rz of b",
    ),
    "point masses": ({"bodies": [{"name": "b", "mass": 1, "carried_by": "C"}]}, "(point masses): b"),
    "shear centre": (
        {"sections": {"bar": CHANNEL}},
        "section bar: the shear centre is not at the centroid",
    ),
    "no shear": (
        {"sections": {"bar": GENERAL}},
        "section bar: shear_area_y was not given",
    ),
    "leaning": ({"points": {**POINTS, "C": [2.0005, 0, 1]}}, "count as standing along it"),
}


@pytest.mark.parametrize("case", REMARKS)
def test_remarks(bars, case):
    tables, wanted = REMARKS[case]
    assert any(wanted in remark for remark in bars(**tables).system().anatomy.remarks)


def test_a_member_free_to_spin_is_told(describe):
    releases = {"start": ["rx"], "end": ["rx"]}
    table = {"section": "bar", "material": "steel"}
    study = describe(
        points=POINTS,
        sections={"bar": BAR},
        members=[
            {**table, "name": "bars", "runs": [["A", "B"], ["C", "B"]]},
            {**table, "name": "strut", "runs": [["A", "C"]], "releases": releases},
        ],
        supports=[{"at": ["A", "C"], "hold": "all"}],
    )
    remarks = study.system().anatomy.remarks
    assert "members that their releases let move freely: strut A-C" in remarks


ERRORS: dict[str, Any] = {
    "zero length": (
        {"points": {"A": [0, 0, 0], "B": [0, 0, 0], "C": [1, 0, 0]}},
        {},
        r'members\[0\]\.runs\[0\] \("bars"\): no length between A and B',
    ),
    "zero length through offsets": (
        {"points": {"A": [0, 0, 0], "B": [1, 0, 0], "C": [1, 0, 2]}},
        {"offset_end": [0, 0, -2]},
        r"members\[0\]\.runs\[0\] .*no length between B and C",
    ),
    "up along the member": ({}, {"up": "x"}, r'members\[0\]\.runs\[0\] \("bars"\): up lies along the member'),
    "loose point": (
        {
            "points": {**POINTS, "E": [5, 0, 0]},
            "springs": [{"name": "s", "between": ["E", "C"], "stiffness": {"x": 1.0}}],
        },
        {},
        r'points\.E: nothing resists a movement along y and z .*hold = \["y", "z"\]',
    ),
    "a point that all its members release": (
        {},
        {"releases": {"end": "all"}},
        r"points\.C: nothing resists a movement along x and y and z",
    ),
    "numbers too small": (
        {
            "materials": {"hard": {"like": "steel", "youngs_modulus": 1e-305}},
            "points": POINTS,
        },
        {"material": "hard"},
        r'members\[0\]\.runs\[0\] \("bars"\): its length, section and material give .* check their units',
    ),
    "a point too far": ({"points": {**POINTS, "C": [1e50, 0, 0]}}, {}, r"points\.C: lies 1e\+50 m away"),
    "unclear spring axes": (
        {
            "springs": [
                {
                    "name": "s",
                    "between": ["C", "ground"],
                    "stiffness": {"x": 1, "y": 2},
                    "x_axis": [1.0, 1.0, 0.0],
                }
            ]
        },
        {},
        r'springs\[0\]\.y_axis \("s"\) is missing',
    ),
    "loose massless member": (
        {"materials": {"light": {"like": "steel", "density": 0}}},
        {"material": "light", "releases": {"start": ["rx"], "end": ["rx"]}, "runs": [["A", "B"], ["A", "C"]]},
        r"members\[0\]\.runs\[0\].*no mass",
    ),
}


@pytest.mark.parametrize("case", ERRORS)
def test_errors_name_the_entry(bars, case):
    tables, members, message = ERRORS[case]
    with pytest.raises(ModelError, match=message):
        bars(members, **tables).system()


def test_a_structure_that_is_held_altogether(describe):
    study = describe(
        points={"A": [0, 0, 0]},
        bodies=[{"name": "block", "mass": 1.0, "carried_by": "A"}],
        supports=[{"at": "A", "hold": "all"}],
    )
    with pytest.raises(ModelError, match="nothing can vibrate; hold fewer components"):
        study.system()


def test_a_structure_without_mass(bars):
    study = bars({"material": "light"}, materials={"light": {"like": "steel", "density": 0}})
    with pytest.raises(ModelError, match="nothing that can move has a mass"):
        study.system()


def test_several_faults_come_together(bars):
    study = bars({"up": "x"}, points={**POINTS, "C": [2, 0, 0]})
    with pytest.raises(ModelError, match=r"(?s)no length.*up lies along"):
        study.system()


def test_matrices_that_do_not_vibrate_name_the_entry(tmp_path):
    file = tmp_path / "skewed.toml"
    file.write_text(
        '[units]\nmass = "kg"\nstiffness = "N/m"\n[matrices]\nmass = [[1, 0], [0, 1]]\n'
        "stiffness = [[2, 1], [0, 2]]\n"
    )
    with pytest.raises(MatrixError, match=r"matrices\.stiffness"):
        vib.read(file).system()


def test_rayleigh_damping_of_matrices(tmp_path):
    file = tmp_path / "damped.toml"
    file.write_text(
        '[units]\nmass = "kg"\nstiffness = "N/m"\ndamping = "N s/m"\n[matrices]\nmass = [[1, 0], [0, 1]]\n'
        "stiffness = [[2, 0], [0, 3]]\ndamping = [[0.1, 0], [0, 0.2]]\n"
        '[damping]\nrayleigh = [["1 Hz", 0.01], ["2 Hz", 0.01]]\n'
    )
    alpha, beta = vib.study.machine.rayleigh_constants(((1.0, 0.01), (2.0, 0.01)))
    wanted = np.diag([0.1 + alpha + 2 * beta, 0.2 + alpha + 3 * beta])
    found: Any = vib.read(file).system().damping
    np.testing.assert_allclose(found, wanted)
