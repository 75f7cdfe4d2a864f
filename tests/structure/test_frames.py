"""Frames against exact solutions, and laws that every frame obeys."""

import numpy as np
import pytest
import scipy.linalg
from hypothesis import given, settings
from hypothesis import strategies as st

from vib.structure.assembly import assemble
from vib.structure.build import to_system
from vib.structure.division import first_counts
from vib.structure.layout import read_layout

TAU = 2 * np.pi
STEEL = {"youngs_modulus": 210e9, "poissons_ratio": 0.3, "density": 7850.0}


def section(area, iy, iz=None, torsion=1e-6):
    return {"area": area, "second_moment_y": iy, "second_moment_z": iz or iy, "torsion_constant": torsion}


def planar(matrix, system, components):
    keep = [i for i, freedom in enumerate(system.freedoms) if freedom.component in components.split()]
    return matrix.toarray()[np.ix_(keep, keep)]


@pytest.fixture(scope="session")
def frame(describe):
    """A frame of one section."""

    def make(points, runs, profile, material=STEEL, **tables):
        return describe(
            points=points,
            materials={"m": material},
            sections={"s": profile},
            members=[{"name": "frame", "section": "s", "material": "m", "runs": runs}],
            **tables,
        )

    return make


@pytest.fixture(scope="session")
def without_rotary_inertia(cut):
    """In-plane frequencies (x, z, ry) with the rotary inertia of bending taken out.

    The references leave it out. Without shear the mass matrix is linear in the second moments, through
    rotary inertia alone, so twice the mass less that of doubled second moments has none.
    """

    def solve(make, area, second_moment, pieces):
        system, doubled = (cut(make(section(area, factor * second_moment)), pieces) for factor in (1, 2))
        mass = 2 * planar(system.mass, system, "x z ry") - planar(doubled.mass, doubled, "x z ry")
        values = scipy.linalg.eigh(planar(system.stiffness, system, "x z ry"), mass, eigvals_only=True)
        return np.sqrt(values) / TAU

    return solve


def test_portal_that_stretches(frame, without_rotary_inertia):
    """Exact dynamic stiffness of an extensible portal, distributed mass, no shear; 5e-4 with 8 pieces."""
    points = {"A": [0, 0, 0], "B": [0, 0, 3], "C": [4, 0, 3], "D": [4, 0, 0]}

    def make(profile):
        return frame(points, [["A", "B", "C", "D"]], profile, supports=[{"at": ["A", "D"], "hold": "all"}])

    found = without_rotary_inertia(make, 0.00285, 1.94e-5, 8)
    wanted = [21.26417564, 61.92552868, 138.9271218, 146.1209857, 212.7643653]
    np.testing.assert_allclose(found[:5], wanted, rtol=5e-4)


def test_square_portal_that_does_not_stretch(frame, without_rotary_inertia):
    """Exact dynamic stiffness, three equal members with clamped feet, EI = m = L = 1; beta L to 1e-5."""
    points = {"A": [0, 0, 0], "B": [0, 0, 1], "C": [1, 0, 1], "D": [1, 0, 0]}
    small = 1e-7  # EI / (EA L^2): stretching changes beta L by about a tenth of this
    material = {"youngs_modulus": 1 / small, "poissons_ratio": 0.3, "density": 1.0}

    def make(profile):
        hold = [{"at": ["A", "D"], "hold": "all"}]
        return frame(points, [["A", "B", "C", "D"]], profile, material, supports=hold)

    found = np.sqrt(TAU * without_rotary_inertia(make, 1.0, small, 24))[:6]
    wanted = [1.790132142, 3.55640846, 4.541924465, 4.730040745, 6.723273752, 7.429541333]
    np.testing.assert_allclose(found, wanted, rtol=1e-5)


def test_bracket_in_its_plane(frame, without_rotary_inertia):
    """L of strip 50 x 10 mm with 1.5 kg at its free end; exact dynamic stiffness, 5e-4 with 8 pieces."""
    points = {"A": [0, 0, 0], "B": [0, 0, 0.6], "C": [0.4, 0, 0.6]}

    def make(profile):
        mass = [{"name": "tip", "mass": 1.5, "carried_by": "C"}]
        return frame(points, [["A", "B", "C"]], profile, supports=[{"at": "A", "hold": "all"}], bodies=mass)

    found = without_rotary_inertia(make, 0.0005, 4.16666666667e-09, 8)
    np.testing.assert_allclose(found[:4], [7.092745252, 20.04346576, 121.5511114, 205.1350888], rtol=5e-4)


def test_bracket_out_of_its_plane(frame, cut):
    """L of round bar 20 mm in bending and torsion, torsional inertia rho J only; exact solution, 5e-4.

    Second moments are doubled one at a time to take the rotary inertia of bending out and to leave the
    polar inertia in (it is the sum of the two). Linear torsion pieces need 16 for the fifth mode.
    """
    points = {"A": [0, 0, 0], "B": [0.5, 0, 0], "C": [0.5, 0.35, 0]}
    area, second = np.pi * 0.02**2 / 4, np.pi * 0.02**4 / 64
    plain, first, other = (
        cut(
            frame(
                points,
                [["A", "B", "C"]],
                section(area, iy * second, iz * second, 2 * second),
                supports=[{"at": "A", "hold": "all"}],
            ),
            16,
        )
        for iy, iz in ((1, 1), (2, 1), (1, 2))
    )
    mass, more, polar = (planar(system.mass, system, "z rx ry") for system in (plain, first, other))
    values = scipy.linalg.eigh(
        planar(plain.stiffness, plain, "z rx ry"), mass - (more - mass) + (polar - mass), eigvals_only=True
    )
    wanted = [25.26789494, 69.16635951, 295.8067823, 636.3933519, 933.9279876]
    np.testing.assert_allclose(np.sqrt(values[:5]) / TAU, wanted, rtol=5e-4)


SWAY = {
    0.25: (10.90909091, 2.0),
    0.5: (13.71428571, 3.0),
    1.0: (16.8, 4.0),
    2.0: (19.5, 4.8),
    5.0: (21.88235294, 5.454545455),
}


@pytest.mark.parametrize("ratio", SWAY)
@pytest.mark.parametrize("feet", ["clamped", "pinned"])
def test_sway_stiffness_of_a_portal(describe, cut, ratio, feet):
    """24 EI/h^3 (6g+1)/(6g+4) and EI/h^3 12g/(2g+1) by slope-deflection; Chopra (ch. 1)."""
    stiff = 1e8  # area: members do not stretch to speak of
    study = describe(
        points={"A": [0, 0, 0], "B": [0, 0, 1], "C": [1, 0, 1], "D": [1, 0, 0]},
        materials={"m": {"youngs_modulus": 1.0, "poissons_ratio": 0.3, "density": 0.0}},
        sections={"column": section(stiff, 1.0, torsion=1.0), "beam": section(stiff, ratio, torsion=1.0)},
        members=[
            {"name": "columns", "section": "column", "material": "m", "runs": [["A", "B"], ["D", "C"]]},
            {"name": "beam", "section": "beam", "material": "m", "runs": [["B", "C"]]},
        ],
        bodies=[{"name": "deck", "mass": 1.0, "carried_by": "B"}],
        supports=[{"at": ["A", "D"], "hold": "all" if feet == "clamped" else ["x", "y", "z", "rx", "rz"]}],
    )
    system = cut(study, 2)
    push = 0.5 * (system.direction("B", "x") + system.direction("C", "x"))
    moved = push @ np.linalg.solve(system.stiffness.toarray(), push)
    np.testing.assert_allclose(1 / moved, SWAY[ratio][feet == "pinned"], rtol=1e-6)


def test_rigid_beam_on_two_columns(describe, cut, frequencies):
    """24 EI/h^3 = 2284016.33 N/m under 5000 kg: 3.40161165966 Hz, closed form."""
    study = describe(
        points={"A": [0, 0, 0], "B": [0, 0, 3.5], "C": [6, 0, 3.5], "D": [6, 0, 0]},
        materials={"m": {**STEEL, "density": 0.0}},
        sections={"s": section(1e4, 1.943e-5)},
        members=[{"name": "columns", "section": "s", "material": "m", "runs": [["A", "B"], ["D", "C"]]}],
        bodies=[{"name": "beam", "mass": 5000, "centre": [3, 0, 3.5], "carried_by": ["B", "C"]}],
        supports=[{"at": ["A", "D"], "hold": "all"}],
    )
    system = cut(study, 1)
    flexibility = np.linalg.inv(system.stiffness.toarray())
    push = system.direction("beam", "x")
    np.testing.assert_allclose(
        np.sqrt(1 / (push @ flexibility @ push) / 5000) / TAU, 3.40161165966, rtol=1e-8
    )


def test_block_on_four_springs(describe, frequencies):
    """Sway and rocking of a supported body: Harris & Crede (eds.), Shock and Vibration Handbook"""
    corners = {
        f"P{i}": [x, y, -0.3] for i, (x, y) in enumerate([(0.5, 0.3), (0.5, -0.3), (-0.5, 0.3), (-0.5, -0.3)])
    }
    study = describe(
        points=corners,
        bodies=[
            {
                "name": "block",
                "mass": 600,
                "centre": [0, 0, 0],
                "inertia": [50, 90, 104],
                "carried_by": list(corners),
            }
        ],
        springs=[
            {
                "name": "mounts",
                "between": [[point, "ground"] for point in corners],
                "stiffness": {"x": 1.2e5, "y": 1.2e5, "z": 2e5},
            }
        ],
    )
    system = study.system()
    assert [str(freedom) for freedom in system.freedoms] == [
        f"block {c}" for c in ("x", "y", "z", "rx", "ry", "rz")
    ]
    wanted = sorted([5.81151683133, 6.3046871244, 3.94993098685, 8.55046024683, 3.3040347709, 8.22852312017])
    np.testing.assert_allclose(frequencies(system), wanted, rtol=1e-10)


def rotation(angles):
    a, b, c = angles
    about_z = np.array([[np.cos(a), -np.sin(a), 0], [np.sin(a), np.cos(a), 0], [0, 0, 1]])
    about_x = np.array([[1, 0, 0], [0, np.cos(b), -np.sin(b)], [0, np.sin(b), np.cos(b)]])
    again = np.array([[np.cos(c), -np.sin(c), 0], [np.sin(c), np.cos(c), 0], [0, 0, 1]])
    return about_z @ about_x @ again


@settings(max_examples=12, deadline=None)
@given(
    angles=st.tuples(*[st.floats(-3, 3)] * 3),
    shift=st.tuples(*[st.floats(-3, 3)] * 3),
    turn=st.floats(-1.5, 1.5),
)
def test_turning_and_moving_everything_changes_no_frequency(describe, frequencies, angles, shift, turn):
    """Angles, a body off its carriers with products of inertia, offsets, releases, an oriented spring."""

    def build(turned, shift):
        def at(*place):
            return (turned @ np.array(place) + shift).tolist()

        def along(*direction):
            return (turned @ np.array(direction)).tolist()

        tensor = turned @ np.array([[9.0, -2.0, 1.0], [-2.0, 7.0, -1.5], [1.0, -1.5, 5.0]]) @ turned.T
        return describe(
            points={"A": at(0, 0, 0), "B": at(1, 0.2, 0.1), "C": at(1.3, 1.1, 0.4), "D": at(0.2, 1.4, -0.3)},
            sections={"angle": {"shape": "angle", "height": 0.08, "width": 0.05, "thickness": 0.006}},
            members=[
                {
                    "name": "frame",
                    "section": "angle",
                    "material": "structural steel",
                    "runs": [["A", "B", "C"], ["B", "D"]],
                    "up": along(0.1, 0.2, 1.0),
                    "turn": turn,
                    "offset_start": along(0.05, 0.02, -0.04),
                    "releases": {"end": ["ry", "rz"]},
                }
            ],
            bodies=[
                {
                    "name": "motor",
                    "mass": 40.0,
                    "centre": at(1.2, 1.2, 0.9),
                    "inertia": np.diag(tensor).tolist(),
                    "products": [-tensor[0, 1], -tensor[1, 2], -tensor[2, 0]],
                    "carried_by": ["C", "D"],
                }
            ],
            springs=[
                {
                    "name": "strut",
                    "between": ["A", "C"],
                    "stiffness": {"x": 3e6, "y": 2e5, "rz": 4e3},
                    "x_axis": along(0.6, 0.0, 0.8),
                    "y_axis": along(0.0, 1.0, 0.0),
                }
            ],
            supports=[{"at": "A", "hold": "all"}],
        )

    plain = frequencies(build(np.eye(3), np.zeros(3)).system())
    moved = frequencies(build(rotation(angles), np.array(shift)).system())
    np.testing.assert_allclose(moved[:20], plain[:20], rtol=1e-7)


@settings(max_examples=15, deadline=None)
@given(
    moved=st.tuples(*[st.floats(-2, 2)] * 6),
    offset=st.tuples(*[st.floats(-0.3, 0.3)] * 3),
    turn=st.floats(-3, 3),
)
def test_a_free_structure_moves_as_one_body_for_nothing(describe, moved, offset, turn):
    """No strain energy in a free structure with offsets, bodies and springs; it carries its rigid mass."""
    study = describe(
        points={"A": [0.3, 0, 0], "B": [1, 0.2, 0.1], "C": [1.3, 1.1, 0.4], "D": [0.2, 1.4, -0.3]},
        sections={"bar": {"shape": "rectangle", "width": 0.08, "height": 0.05}},
        members=[
            {
                "name": "frame",
                "section": "bar",
                "material": "aluminium",
                "runs": [["A", "B", "C"]],
                "offset_end": list(offset),
                "turn": turn,
            }
        ],
        bodies=[
            {"name": "motor", "mass": 4.0, "centre": [1, 1, 1], "inertia": [1, 2, 3], "carried_by": ["C"]},
            {"name": "pump", "mass": 3.0, "inertia": [1, 2, 2], "carried_by": ["D"]},
        ],
        springs=[
            {
                "name": "s",
                "between": [["A", "D"], ["C", "D"]],
                "stiffness": {"x": 1e5, "rx": 1e3, "y": 2e4, "z": 1e4},
            }
        ],
    )
    layout = read_layout(study)
    assembly = assemble(layout, first_counts(layout))
    system = to_system(assembly)
    assert system.anatomy is not None
    transform, rigid = assembly.nodes.transform.toarray(), assembly.rigid_motion()
    freely = np.linalg.lstsq(transform, rigid, rcond=None)[0]
    np.testing.assert_allclose(transform @ freely, rigid, atol=1e-12)  # no tie hinders it
    vector = freely @ np.array(moved)
    scale = abs(system.stiffness) @ np.abs(vector)
    assert np.abs(system.stiffness @ vector).max() <= 1e-13 * scale.max()
    carried = system.anatomy.carried @ np.array(moved)
    np.testing.assert_allclose(system.mass @ vector, carried, atol=1e-11 * abs(system.mass).max())
    wanted = np.array(moved) @ system.anatomy.rigid_mass @ np.array(moved)
    np.testing.assert_allclose(vector @ system.mass @ vector, wanted, rtol=1e-11, atol=1e-13)
