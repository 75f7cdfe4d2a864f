"""Releases, offsets, bodies, springs and supports against structures that are known to be the same."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from vib.structure.rigid import arms, eliminate

TAU = 2 * np.pi
BAR = {"bar": {"shape": "rectangle", "width": 0.08, "height": 0.05}}


@pytest.fixture(scope="session")
def bars(describe):
    """Steel bars of one section; ``members`` are extra entries of the one member table."""

    def make(points, runs, members=None, **tables):
        table = {
            "name": "bars",
            "section": "bar",
            "material": "structural steel",
            "runs": runs,
            **(members or {}),
        }
        return describe(points=points, sections=BAR, members=[table], **tables)

    return make


@given(rows=st.lists(st.lists(st.integers(-3, 3), min_size=6, max_size=6), max_size=8))
def test_elimination_solves_what_can_be_solved(rows):
    """What remains satisfies every row, and there is as much of it as the rank leaves."""
    matrix = np.array(rows, dtype=float).reshape(-1, 6)
    scale = np.array([1.0, 1, 1, 0.1, 0.1, 0.1])
    free, expansion = eliminate(matrix, scale)
    assert free.sum() == 6 - (np.linalg.matrix_rank(matrix) if rows else 0)
    np.testing.assert_allclose(matrix @ expansion, 0, atol=1e-9)
    assert np.array_equal(expansion[np.ix_(free, free)], np.eye(free.sum()))
    assert not expansion[:, ~free].any()


def test_hinged_ends_make_a_clamped_beam_a_pinned_one(bars, cut, frequencies):
    points = {"A": [0, 0, 0], "B": [2, 0, 0]}
    hinges = {"releases": {"start": ["ry", "rz"], "end": ["ry", "rz"]}}
    clamped = [{"at": ["A", "B"], "hold": "all"}]
    pinned = [{"at": ["A", "B"], "hold": ["x", "y", "z", "rx"]}]
    released = cut(bars(points, [["A", "B"]], hinges, supports=clamped), 6)
    np.testing.assert_allclose(
        frequencies(released), frequencies(cut(bars(points, [["A", "B"]], supports=pinned), 6)), rtol=1e-9
    )
    names = {
        str(freedom) for freedom in released.freedoms if " at A" in freedom.point or " at B" in freedom.point
    }
    assert names == {f"bars A-B at {end} {turn}" for end in "AB" for turn in ("ry", "rz")}


def test_a_release_in_the_axes_of_a_slanting_member(bars, cut, frequencies):
    """The same hinge on a member along x and on one that slants: the same frequencies."""
    releases = {"releases": {"end": ["rz", "x"]}, "turn": 0.4}
    straight = bars(
        {"A": [0, 0, 0], "B": [3, 0, 0]}, [["A", "B"]], releases, supports=[{"at": ["A", "B"], "hold": "all"}]
    )
    slanting = bars(
        {"A": [0, 0, 0], "B": [1, 2, 2]}, [["A", "B"]], releases, supports=[{"at": ["A", "B"], "hold": "all"}]
    )
    np.testing.assert_allclose(frequencies(cut(slanting, 4)), frequencies(cut(straight, 4)), rtol=1e-9)


def test_releases_hold_at_the_ends_of_a_run_only(bars, cut):
    study = bars(
        {"A": [0, 0, 0], "B": [1, 0, 0], "C": [2, 0, 0]},
        [["A", "B", "C"]],
        {"releases": {"start": ["rz"], "end": ["ry"]}},
        supports=[{"at": ["A", "C"], "hold": "all"}],
    )
    own = [str(freedom) for freedom in cut(study, 1).freedoms if " at " in freedom.point]
    assert own == ["bars A-B at A rz", "bars B-C at C ry"]


def test_an_offset_is_a_rigid_arm(bars, cut, frequencies):
    """A member on arms from A and B is the member between the tips, the body at B standing off its end."""
    arm, lift = np.array([0.1, -0.2, 0.3]), np.array([-0.05, 0.1, 0.15])
    a, b = np.array([0.0, 0, 0]), np.array([2.0, 0.3, 0.4])
    motor = {"name": "motor", "mass": 30.0, "inertia": [1, 2, 3], "centre": b.tolist(), "carried_by": "B"}
    offset = bars(
        {"A": a.tolist(), "B": b.tolist()},
        [["A", "B"]],
        {"offset_start": arm.tolist(), "offset_end": lift.tolist()},
        bodies=[motor],
        supports=[{"at": "A", "hold": "all"}],
    )
    direct = bars(
        {"A": (a + arm).tolist(), "B": (b + lift).tolist()},
        [["A", "B"]],
        bodies=[motor],
        supports=[{"at": "A", "hold": "all"}],
    )
    one, two = cut(offset, 4), cut(direct, 4)
    np.testing.assert_allclose(frequencies(one), frequencies(two), rtol=1e-9)
    np.testing.assert_allclose(one.anatomy.rigid_mass, two.anatomy.rigid_mass, rtol=1e-12, atol=1e-9)


def test_two_bodies_on_one_point_are_one(bars, cut, frequencies):
    """Merged by the parallel-axis theorem; the tie is told."""
    points = {"A": [0, 0, 0], "B": [1, 0, 0]}
    clamp = [{"at": "A", "hold": "all"}]
    centres, masses = np.array([[1.2, 0, 0], [1.0, 0.3, 0.1]]), np.array([3.0, 2.0])
    apart = [
        {
            "name": f"m{i}",
            "mass": masses[i],
            "centre": centres[i].tolist(),
            "inertia": [0.1, 0.2, 0.15],
            "carried_by": "B",
        }
        for i in range(2)
    ]
    middle = masses @ centres / masses.sum()
    tensor = 2 * np.diag([0.1, 0.2, 0.15])
    for mass, centre in zip(masses, centres, strict=True):
        reach = centre - middle
        tensor += mass * (reach @ reach * np.eye(3) - np.outer(reach, reach))
    merged = {
        "name": "both",
        "mass": masses.sum(),
        "centre": middle.tolist(),
        "inertia": np.diag(tensor).tolist(),
        "products": [-tensor[0, 1], -tensor[1, 2], -tensor[2, 0]],
        "carried_by": "B",
    }
    two = cut(bars(points, [["A", "B"]], bodies=apart, supports=clamp), 4)
    one = cut(bars(points, [["A", "B"]], bodies=[merged], supports=clamp), 4)
    np.testing.assert_allclose(frequencies(two), frequencies(one), rtol=1e-9)
    assert "point B carries m0 and m1: they are rigidly tied to one another" in two.anatomy.remarks


def test_a_door_on_two_hinges(describe, frequencies):
    """Two held points leave one turn: k/(J + m r^2), and the hinges do not over-determine it."""
    study = describe(
        points={"low": [0.3, 0.2, 0.0], "high": [0.3, 0.2, 2.0], "handle": [1.2, 0.2, 1.0]},
        bodies=[
            {
                "name": "door",
                "mass": 40.0,
                "centre": [0.75, 0.2, 1.0],
                "inertia": [14, 17, 3],
                "carried_by": ["low", "high", "handle"],
            }
        ],
        springs=[{"name": "closer", "between": ["handle", "ground"], "stiffness": {"y": 500.0}}],
        supports=[{"at": ["low", "high"], "hold": "translations"}],
    )
    system = study.system()
    assert system.size == 1
    wanted = np.sqrt(500.0 * 0.9**2 / (3 + 40 * 0.45**2)) / TAU
    np.testing.assert_allclose(frequencies(system), [wanted], rtol=1e-12)
    low, handle, door = (
        system.anatomy.places[name].motion.toarray()[:, 0] for name in ("low", "handle", "door")
    )
    np.testing.assert_allclose(low[:3], 0, atol=1e-12)
    np.testing.assert_allclose(handle / door[5], [0, 0.9, 0, 0, 0, 1], atol=1e-12)


def test_a_clamped_body_is_held(describe):
    study = describe(
        points={"A": [0, 0, 0], "B": [1, 0, 0]},
        bodies=[
            {"name": "block", "mass": 4.0, "centre": [0.5, 0, 0], "carried_by": ["A"]},
            {"name": "free", "mass": 1.0, "inertia": [1, 1, 1], "carried_by": ["B"]},
        ],
        supports=[{"at": "A", "hold": "all"}],
    )
    system = study.system()
    assert {freedom.point for freedom in system.freedoms} == {"free"}
    assert system.anatomy.rigid_mass[0, 0] == 5.0
    assert "block" in system.anatomy.places


def test_a_truss_whose_joints_turn_freely(describe):
    """Two slanting bars with all but axial released and a mass at the top: 2 EA cos^2 / L, statics.

    Every rotation at the top is left out, and this is said.
    """
    study = describe(
        points={"A": [-3, 0, 0], "B": [3, 0, 0], "T": [0, 0, 4]},
        sections=BAR,
        members=[
            {
                "name": "ties",
                "section": "bar",
                "material": "steel",
                "runs": [["A", "T"], ["B", "T"]],
                "releases": {"end": "rotations", "start": ["ry", "rz"]},
            }
        ],
        bodies=[{"name": "load", "mass": 10.0, "carried_by": "T"}],
        supports=[{"at": ["A", "B"], "hold": "all"}, {"at": "T", "hold": ["y"]}],
    )
    system = study.system()
    assert "load" not in {freedom.point for freedom in system.freedoms if freedom.component.startswith("r")}
    assert any("rx ry rz of load" in remark for remark in system.anatomy.remarks)
    flexibility = np.linalg.inv(system.stiffness.toarray())
    axial = 210e9 * 0.08 * 0.05 / 5
    for along, share in (("x", 0.36), ("z", 0.64)):
        push = system.direction("load", along)
        np.testing.assert_allclose(1 / (push @ flexibility @ push), 2 * axial * share, rtol=1e-9)


def test_a_slanting_torsion_joint_keeps_its_one_turn(bars):
    """At the tip of a slanting bar released in bending, one turn remains: about the bar."""
    study = bars(
        {"A": [0, 0, 0], "B": [1, 2, 2]},
        [["A", "B"]],
        {"releases": {"end": ["ry", "rz"]}},
        supports=[{"at": "A", "hold": "all"}],
    )
    system = study.system()
    turns = [
        freedom.component for freedom in system.freedoms if freedom.point == "B" and "r" in freedom.component
    ]
    assert len(turns) == 1
    motion = system.anatomy.places["B"].motion.toarray()[3:, [f == ("B", turns[0]) for f in system.freedoms]]
    np.testing.assert_allclose(np.cross(motion[:, 0], [1, 2, 2]), 0, atol=1e-12)


@given(
    moved=st.tuples(*[st.floats(-2, 2)] * 6),
    far=st.tuples(*[st.floats(-2, 2)] * 3),
    constants=st.tuples(*[st.floats(0.1, 9)] * 6),
)
def test_a_spring_between_distant_points_is_in_balance(moved, far, constants):
    """Its forces on the two points balance about any point, and a rigid motion strains nothing."""
    half = 0.5 * np.array(far)
    follow = np.concatenate([-arms(half), arms(-half)], axis=1)
    matrix = follow.T @ np.diag(constants) @ follow
    rigid = np.concatenate([np.eye(6), arms(np.array(far))])
    np.testing.assert_allclose(matrix @ rigid @ np.array(moved), 0, atol=1e-11)
    np.testing.assert_allclose(rigid.T @ matrix, 0, atol=1e-11)


def test_a_slanting_spring(describe, frequencies):
    """Constants along the spring's own axes: 30 degrees from x in the x-z plane."""
    study = describe(
        points={"A": [0, 0, 0]},
        bodies=[{"name": "m", "mass": 2.0, "carried_by": "A"}],
        springs=[
            {
                "name": "s",
                "between": ["ground", "A"],
                "stiffness": {"x": 800.0, "z": 50.0},
                "dashpot": {"x": 3.0},
                "x_axis": [np.sqrt(3), 0.0, 1.0],
                "y_axis": "y",
            }
        ],
        supports=[{"at": "A", "hold": ["y"]}],
    )
    system = study.system()
    np.testing.assert_allclose(frequencies(system), np.sqrt([50 / 2, 800 / 2]) / TAU, rtol=1e-12)
    np.testing.assert_allclose(
        system.damping.toarray(), 3.0 * np.array([[0.75, 0.4330127], [0.4330127, 0.25]]), rtol=1e-7
    )


def test_products_of_inertia_are_integrals_of_plus_xy(describe, frequencies):
    """Two masses at +-(1, 1, 0): Ixy = +2 m, so no inertia about the line through them."""
    study = describe(
        points={"A": [0, 0, 0]},
        bodies=[{"name": "d", "mass": 2.0, "inertia": [2, 2, 4], "products": [2, 0, 0], "carried_by": "A"}],
        springs=[{"name": "s", "between": ["A", "ground"], "stiffness": {"rx": 1.0, "ry": 1.0, "rz": 1.0}}],
        supports=[{"at": "A", "hold": "translations"}],
    )
    mass = study.system().mass.toarray()
    np.testing.assert_allclose(mass @ [1, 1, 0], 0, atol=1e-15)
    np.testing.assert_allclose(mass @ [1, -1, 0], [4, -4, 0])
