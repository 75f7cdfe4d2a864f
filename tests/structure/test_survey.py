"""What `check` reads back: masses, axes, sag and reactions, against strength of materials and statics."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

import vib
from vib.structure import survey

GRAVITY = 9.80665
STEEL = {"youngs_modulus": 210e9, "poissons_ratio": 0.3, "density": 7850.0}
BAR = {"shape": "rectangle", "width": 0.08, "height": 0.05}


@pytest.fixture(scope="session")
def bars(describe):
    def make(points, runs, members=None, **tables):
        table = {"name": "bars", "section": "bar", "material": "steel", "runs": runs, **(members or {})}
        return describe(points=points, sections={"bar": BAR}, members=[table], **tables)

    return make


def test_a_cantilever_sags(bars):
    """q L^4 / 8 EI + q L^2 / (2 G As) at the tip: any text on strength of materials."""
    found = survey(
        bars({"A": [0, 0, 0], "B": [2, 0, 0]}, [["A", "B"]], supports=[{"at": "A", "hold": "all"}])
    )
    area, second = 0.08 * 0.05, 0.08 * 0.05**3 / 12
    line = 7850 * area * GRAVITY
    wanted = line * 2**4 / (8 * 210e9 * second) + line * 2**2 / (2 * 210e9 / 2.6 * area * 5 / 6)
    assert found.sag is not None
    np.testing.assert_allclose(found.sag.greatest_m, wanted, rtol=1e-9)
    assert found.sag.greatest_at == "B"
    np.testing.assert_allclose(found.sag.displacement_m["B"], [0, 0, -wanted], rtol=1e-9, atol=1e-15)
    (reaction,) = found.sag.reactions
    np.testing.assert_allclose(reaction.force_n, [0, 0, 2 * line], rtol=1e-9, atol=1e-9)
    np.testing.assert_allclose(reaction.moment_nm, [0, -2 * line, 0], rtol=1e-9, atol=1e-9)


def test_the_middle_of_a_beam_sags_most(bars):
    """5 q L^4 / 384 EI + q L^2 / 8 G As between pinned ends."""
    held = [{"at": ["A", "B"], "hold": ["x", "y", "z", "rx"]}]
    sag = survey(bars({"A": [0, 0, 0], "B": [2, 0, 0]}, [["A", "B"]], supports=held)).sag
    area, second = 0.08 * 0.05, 0.08 * 0.05**3 / 12
    line = 7850 * area * GRAVITY
    wanted = 5 * line * 16 / (384 * 210e9 * second) + line * 4 / (8 * 210e9 / 2.6 * area * 5 / 6)
    assert sag is not None
    np.testing.assert_allclose(sag.greatest_m, wanted, rtol=1e-9)
    assert sag.greatest_at == "bars A-B at 2/4 of its length"
    np.testing.assert_allclose(sag.greatest_place_m, [1, 0, 0])


@settings(max_examples=10, deadline=None)
@given(up=st.sampled_from("xyz"), lift=st.tuples(*[st.floats(-0.2, 0.2)] * 3), stiffness=st.floats(1e4, 1e7))
def test_reactions_carry_the_weight(bars, up, lift, stiffness):
    """Forces balance the weight and moments balance it about the origin, whatever holds the structure up."""
    found = survey(
        bars(
            {"A": [0.1, 0, 0], "B": [0, 0.2, 2], "C": [1.5, 0, 2], "D": [1.6, 0.9, 0.1], "E": [0.5, 1, 0]},
            [["A", "B", "C"], ["C", "D"], ["B", "E"]],
            {"offset_start": list(lift), "offset_end": [0, 0.1, 0.05], "releases": {"end": ["ry"]}},
            up=up,
            bodies=[
                {
                    "name": "motor",
                    "mass": 60,
                    "inertia": [2, 3, 4],
                    "centre": [0.5, 0.4, 2.3],
                    "carried_by": ["B", "C"],
                },
                {
                    "name": "foot",
                    "mass": 5,
                    "inertia": [1, 1, 1],
                    "centre": [1.5, 1, 0.2],
                    "carried_by": ["D", "E"],
                },
            ],
            supports=[{"at": "A", "hold": "translations"}, {"at": ["D", "E"], "hold": ["x", "z"]}],
            springs=[
                {
                    "name": "mount",
                    "between": [["C", "ground"], ["ground", "E"]],
                    "stiffness": {"x": stiffness, "y": 2e5, "z": 1e5, "rx": 1e3},
                    "x_axis": [0.6, 0.0, 0.8],
                    "y_axis": "y",
                },
                {"name": "tie", "between": ["A", "D"], "stiffness": {"x": 1e5}},
            ],
        )
    )
    assert found.sag is not None
    assert found.mass_kg is not None
    assert found.centre_m is not None
    places = {"A": [0.1, 0, 0], "C": [1.5, 0, 2], "D": [1.6, 0.9, 0.1], "E": [0.5, 1, 0]}
    force = sum(np.array(reaction.force_n) for reaction in found.sag.reactions)
    moment = sum(
        np.array(reaction.moment_nm) + np.cross(places[reaction.point], reaction.force_n)
        for reaction in found.sag.reactions
    )
    weight = found.mass_kg * GRAVITY * np.eye(3)["xyz".index(up)]
    np.testing.assert_allclose(force, weight, atol=1e-6 * found.mass_kg)
    np.testing.assert_allclose(moment, np.cross(found.centre_m, weight), atol=1e-6 * found.mass_kg)
    assert sum(part.mass_kg for part in found.parts) == pytest.approx(found.mass_kg, rel=1e-12)


def test_mass_centre_and_inertia(bars):
    """A bar of 2 m and a body beside it: parallel-axis theorem by hand."""
    found = survey(
        bars(
            {"A": [0, 0, 0], "B": [2, 0, 0]},
            [["A", "B"]],
            bodies=[
                {
                    "name": "m",
                    "mass": 10,
                    "inertia": [1, 2, 3],
                    "products": [0.1, 0.2, 0.3],
                    "centre": [2, 1, 0.5],
                    "carried_by": "B",
                }
            ],
            supports=[{"at": "A", "hold": "all"}],
        )
    )
    bar = 7850 * 0.004 * 2
    assert found.mass_kg == pytest.approx(bar + 10, rel=1e-12)
    assert found.centre_m is not None
    assert found.inertia_kg_m2 is not None
    centres = np.array([[1, 0, 0], [2, 1, 0.5]])
    centre = np.array([bar, 10]) @ centres / (bar + 10)
    np.testing.assert_allclose(found.centre_m, centre, rtol=1e-12)
    iy, iz = 7850 * 2 * np.array([0.08 * 0.05**3, 0.05 * 0.08**3]) / 12
    own = [
        np.diag([iy + iz, iy + bar * 4 / 12, iz + bar * 4 / 12]),
        np.array([[1, -0.1, -0.3], [-0.1, 2, -0.2], [-0.3, -0.2, 3]]),
    ]
    wanted = sum(
        tensor
        + mass * ((place - centre) @ (place - centre) * np.eye(3) - np.outer(place - centre, place - centre))
        for tensor, mass, place in zip(own, (bar, 10), centres, strict=True)
    )
    np.testing.assert_allclose(found.inertia_kg_m2, wanted, rtol=1e-11, atol=1e-11)
    assert [(part.name, part.kind) for part in found.parts] == [("bars", "members"), ("m", "body")]
    assert found.parts[0].length_m == pytest.approx(2.0)
    assert found.supports[0].point == "A"
    assert found.supports[0].components == ("x", "y", "z", "rx", "ry", "rz")


AXES = {
    # study's up, run along, wanted z
    ("z", (1, 0, 0)): (0, 0, 1),
    ("z", (0, 0, 1)): (1, 0, 0),
    ("z", (0, 0, -1)): (1, 0, 0),
    ("z", (0, 1, 0)): (0, 0, 1),
    ("y", (0, 1, 0)): (0, 0, 1),
    ("y", (1, 0, 0)): (0, 1, 0),
    ("x", (1, 0, 0)): (0, 1, 0),
    ("x", (0, 0, 1)): (1, 0, 0),
    ("z", (0.6, 0, 0.8)): (-0.8, 0, 0.6),
}


@pytest.mark.parametrize(("up", "along"), AXES)
def test_default_axes(bars, up, along):
    """z towards up; for members along it, towards the next axis in cyclic order."""
    (run,) = survey(bars({"A": [0, 0, 0], "B": list(along)}, [["A", "B"]], up=up)).runs
    np.testing.assert_allclose(run.x, along, atol=1e-15)
    np.testing.assert_allclose(run.z, AXES[up, along], atol=1e-15)
    np.testing.assert_allclose(np.cross(run.x, run.y), run.z, atol=1e-15)
    assert (run.group, run.entry, run.start, run.end) == ("bars", "members[0].runs[0]", "A", "B")
    np.testing.assert_allclose(run.origin_m, 0.5 * np.array(along))


def test_turn_and_up(bars):
    """up turns z, then turn turns y towards z; a quarter turn is exact."""
    given_up = {"up": "y", "turn": np.pi / 2}
    (run,) = survey(bars({"A": [0, 0, 0], "B": [3, 0, 0]}, [["A", "B"]], given_up)).runs
    assert run.y == (0.0, 1.0, 0.0)
    assert run.z == (0.0, 0.0, 1.0)


def second_moments(outline):
    """Integrals of y^2, yz; yz, z^2 over a polygon (y, z), by Green's theorem."""
    first, second = np.array(outline), np.roll(np.array(outline), -1, axis=0)
    cross = first[:, 0] * second[:, 1] - second[:, 0] * first[:, 1]
    both = np.einsum("k,ki,kj->ij", cross, first, second)
    own = sum(np.einsum("k,ki,kj->ij", cross, points, points) for points in (first, second))
    return (2 * own + both + both.T) / 24 * np.sign(cross.sum())


@pytest.mark.parametrize(("width", "turn"), [(0.06, 0.0), (0.04, 0.0), (0.09, 0.7)])
def test_an_angle_bends_aside(describe, width, turn):
    """The tip of an angle under a force along y also moves along z: L^3/3E times the inverse of the second
    moments of the drawn outline, turned with the member; unsymmetrical bending in any text.
    """
    study = describe(
        points={"A": [0, 0, 0], "B": [2, 0, 0]},
        sections={"L": {"shape": "angle", "height": 0.06, "width": width, "thickness": 0.006}},
        members=[{"name": "m", "section": "L", "material": "steel", "runs": [["A", "B"]], "turn": turn}],
        supports=[{"at": "A", "hold": "all"}],
    )
    moments = second_moments(study.sections["L"].profile.outline[0])
    cos, sin = np.cos(turn), np.sin(turn)
    axes = np.array([[cos, -sin], [sin, cos]])  # the section's y and z as columns, in global y and z
    wanted = axes @ np.linalg.inv(moments) @ axes.T * 2**3 / (3 * 210e9)
    system = study.system()
    push = np.array([system.direction("B", "y"), system.direction("B", "z")])
    flexibility = push @ np.linalg.solve(system.stiffness.toarray(), push.T)
    np.testing.assert_allclose(flexibility, wanted, rtol=0.01)  # shear adds less than a hundredth
    assert abs(flexibility[0, 1]) > 0.1 * flexibility[0, 0]


@pytest.mark.parametrize("held", [[], ["x", "y", "z", "rx"], ["x", "y", "rx", "ry", "rz"]])
def test_no_sag_where_nothing_is_in_balance(bars, held):
    supports = [{"at": "A", "hold": held}] if held else []
    found = survey(bars({"A": [0, 0, 0], "B": [2, 1, 0]}, [["A", "B"]], supports=supports))
    assert found.sag is None
    assert any(remark.startswith("no sag:") for remark in found.remarks)


def test_a_very_soft_mount_still_sags(bars):
    """1 N/m under a steel bar is soft, but no mechanism: m g / k."""
    found = survey(
        bars(
            {"A": [0, 0, 0], "B": [2, 0, 0]},
            [["A", "B"]],
            supports=[{"at": "A", "hold": ["x", "y", "rx", "ry", "rz"]}],
            springs=[{"name": "s", "between": ["A", "ground"], "stiffness": {"z": 1.0}}],
        )
    )
    assert found.sag is not None
    assert found.mass_kg is not None
    np.testing.assert_allclose(found.sag.displacement_m["A"][2], -found.mass_kg * GRAVITY, rtol=1e-4)
    assert found.grounded == ("s A-ground",)


def test_a_study_of_matrices(tmp_path):
    file = tmp_path / "two.toml"
    file.write_text(
        '[units]\nmass = "kg"\nstiffness = "N/m"\n[matrices]\nmass = [[2, 0], [0, 1]]\n'
        'stiffness = [[3, -1], [-1, 1]]\nfreedoms = ["low", "top"]\n[damping]\nratio = 0.02\n'
    )
    study = vib.read(file)
    found = survey(study)
    assert (found.mass_kg, found.sag, found.freedoms) == (None, None, 2)
    system = study.system()
    assert [str(freedom) for freedom in system.freedoms] == ["low", "top"]
    assert system.anatomy is None
    assert system.damping_law.ratio == 0.02
    assert system.damping is None
