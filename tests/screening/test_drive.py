"""How strongly a mode can be driven from a place, over two points made by hand."""

import numpy as np
import pytest
import scipy.sparse as sparse

from vib.errors import ModelError
from vib.screening.drive import drive
from vib.system import Anatomy, Freedom, Place, System, Wireframe

COMPONENTS = ("x", "y", "z", "rx", "ry", "rz")


@pytest.fixture
def two_points(modes_at):
    return lambda shapes, whole=0.0: _two_points(modes_at, shapes, whole)


def _two_points(modes_at, shapes, whole):
    """Modes of two points A (0, 0, 0) and B (2, 0, 0) with all six freedoms each."""
    freedoms = tuple(Freedom(point, component) for point in "AB" for component in COMPONENTS)
    places = {
        name: Place(name, position, sparse.csr_array(np.eye(12)[6 * i : 6 * i + 6]))
        for i, (name, position) in enumerate({"A": (0.0, 0.0, 0.0), "B": (2.0, 0.0, 0.0)}.items())
    }
    held = Place("held", (0.0, 0.0, 0.0), sparse.csr_array((6, 12)))
    wireframe = Wireframe(
        np.array([[0.0, 0, 0], [2.0, 0, 0]]), sparse.csr_array(np.eye(12)[[0, 1, 2, 6, 7, 8]]), ()
    )
    anatomy = Anatomy({**places, "held": held}, (), wireframe, np.zeros((12, 6)), whole * np.eye(6))
    shapes = np.asarray(shapes).T
    modes = modes_at(np.arange(1.0, shapes.shape[1] + 1))
    system = System(mass=np.eye(12), stiffness=np.eye(12), freedoms=freedoms, anatomy=anatomy)
    return type(modes)(**{**vars(modes), "system": system, "shapes": shapes})


def shape(**moved):
    """A shape from entries such as A_x=1."""
    values = np.zeros(12, dtype=complex)
    for name, value in moved.items():
        point, component = name.split("_")
        values[6 * "AB".index(point) + COMPONENTS.index(component)] = value
    return values


def test_a_force_along_a_direction(two_points, excitation):
    modes = two_points([shape(A_x=3.0, A_y=4.0, B_x=10.0)])
    assert drive(modes, excitation(speed="1 Hz", at="A", along="x")) == pytest.approx([0.3])
    assert drive(modes, excitation(speed="1 Hz", at="A", along="-y")) == pytest.approx([0.4])
    assert drive(modes, excitation(speed="1 Hz", at="A", along=[3, 4, 0])) == pytest.approx([0.5])


def test_without_a_direction_the_greatest_counts(two_points, excitation):
    modes = two_points([shape(A_x=3.0, A_y=4.0, B_x=10.0), shape(A_x=1.0, A_y=1.0j, B_z=2.0)])
    # the second shape runs A round a circle of radius 1
    assert drive(modes, excitation(speed="1 Hz", at="A")) == pytest.approx([0.5, 0.5])


def test_a_mode_of_pure_twisting_is_hardly_driven(two_points, excitation):
    """With a mass of 4 kg moving as one, a mode of unit modal mass moves 1 / sqrt(4) somewhere."""
    modes = two_points([shape(A_rx=1.0, A_y=0.01)], whole=4.0)
    assert drive(modes, excitation(speed="1 Hz", at="A")) == pytest.approx([0.01 / 0.5], rel=1e-3)


def test_a_moment_is_compared_with_rotations(two_points, excitation):
    modes = two_points([shape(A_rz=0.1, B_rz=0.2), shape(A_y=1.0, B_y=1.0, A_rz=1e-17)])
    found = drive(modes, excitation(speed="1 Hz", at="A", along="rz"))
    assert found == pytest.approx([0.5, 0.0], abs=1e-12)


def test_a_moment_on_a_mode_that_mostly_translates(two_points, excitation):
    modes = two_points([shape(A_y=1.0, B_y=1.0, A_rz=0.1)])
    # greatest translation over extent is 1 m / 2 m = 0.5 rad, more than any rotation
    assert drive(modes, excitation(speed="1 Hz", at="A", along="rz")) == pytest.approx([0.2])


def test_held_and_unknown_places_are_errors(two_points, excitation):
    modes = two_points([shape(A_x=1.0)])
    with pytest.raises(ModelError, match=r"held: it is held in every direction"):
        drive(modes, excitation(speed="1 Hz", at="held"))
    with pytest.raises(ModelError, match=r"held: it is held along x"):
        drive(modes, excitation(speed="1 Hz", at="held", along="x"))
    with pytest.raises(ModelError, match="there is no such place"):
        drive(modes, excitation(speed="1 Hz", at="C", along="x"))


def test_nothing_is_said_without_a_place_or_of_unsymmetric_stiffness(modes_at, excitation):
    modes = modes_at([1.0, 2.0])
    assert drive(modes, excitation(speed="1 Hz")) is None
    declared = System(mass=np.eye(2), stiffness=[[2.0, 1.0], [-1.0, 2.0]], unsymmetric=True)
    unsymmetric = type(modes)(**{**vars(modes), "system": declared})
    assert drive(unsymmetric, excitation(speed="1 Hz", at="1")) is None


def test_named_freedoms_of_bare_matrices(modes_at, excitation):
    freedoms = tuple(Freedom("tip", component) for component in "xyz")
    shapes = np.array([[3.0, 0.0], [4.0, 0.0], [0.0, 2.0]])
    modes = modes_at([1.0, 2.0])
    system = System(mass=np.eye(3), stiffness=np.eye(3), freedoms=freedoms)
    named = type(modes)(**{**vars(modes), "system": system, "shapes": shapes})
    assert drive(named, excitation(speed="1 Hz", at="tip", along="x")) == pytest.approx([0.75, 0.0])
    # all three freedoms of the point move together: 5 over the greatest freedom, 4, is held to 1
    assert drive(named, excitation(speed="1 Hz", at="tip")) == pytest.approx([1.0, 1.0])


def test_no_modes_have_no_drive(two_points, excitation):
    modes = two_points([shape(A_x=1.0)])
    none = type(modes)(**{**vars(modes), "shapes": np.zeros((12, 0))})
    for along in (None, "rz"):
        found = drive(none, excitation(speed="1 Hz", at="A", along=along))
        assert found is not None
        assert found.shape == (0,)
