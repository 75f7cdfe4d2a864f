import numpy as np
import pytest

from tests.scatter.studies import BODIES, DASHPOT, FRAME, QUANTITIES, dense, family, samples, study
from vib.errors import ModelError
from vib.scatter.family import Family, nominal_value
from vib.scatter.pattern import MATRICES


@pytest.fixture(scope="module")
def frame(tmp_path_factory):
    return family(tmp_path_factory.mktemp("frame"), FRAME)


def apart(one, other):
    """Largest difference of two matrices, against the largest entries of its row and its column."""
    one, other = dense(one), dense(other)
    size = np.sqrt(np.abs(other).max(axis=1))
    return float(
        (np.abs(one - other) / np.where(size > 0, size, 1)[:, None] / np.where(size > 0, size, 1)).max()
    )


def test_what_is_affine_and_what_is_not(frame):
    assert frame.degrees[:5] == (1, 1, 1, 1, 1)
    assert frame.degrees[5] > 1
    assert frame.error < 1e-8
    assert "affine in 5 of 6 quantities" in frame.remarks[0]


def test_interpolated_matrices_are_those_of_the_rebuilt_study(frame):
    for sample in samples(frame, 6):
        built, found = frame.builder.system(sample), frame.interpolated(sample)
        assert apart(found.stiffness, built.stiffness) < 3e-8  # what counts as no change, over several terms
        assert apart(found.mass, built.mass) < 3e-8


def test_terms_and_coefficients_make_the_same_matrices(frame):
    points = samples(frame, 3)
    for factors, sample in zip(frame.coefficients(points), points, strict=True):
        for kind in MATRICES[:2]:
            terms = zip(factors, frame.terms(kind), strict=True)
            total = sum(factor * dense(term) for factor, term in terms if term is not None)
            assert apart(total, getattr(frame.interpolated(sample), kind)) < 1e-12


def test_affine_matrices_are_exact_far_outside_of_the_bounds(tmp_path):
    made = family(tmp_path, FRAME, QUANTITIES[:5], spread=0.05)
    sample = made.nominal * np.array([3.0, 0.2, 2.5, 0.4, 1.9])
    built, found = made.builder.system(sample), made.interpolated(sample)
    assert apart(found.stiffness, built.stiffness) < 1e-12
    assert apart(found.mass, built.mass) < 1e-12
    assert not made.covers(sample[None])[0]
    assert made.covers(made.bounds.T).all()


def test_every_kind_of_quantity(tmp_path):
    text = FRAME.replace(
        "[[springs]]", '[damping]\nratio = 0.02\nranges = [["0 Hz", "30 Hz", 0.01]]\n\n[[springs]]'
    )
    text = text.replace('density = "7850 kg/m^3"', 'density = "7850 kg/m^3"\ndamping_ratio = 0.01') + DASHPOT
    paths = (
        "points.B1[2]",
        "bodies[0].centre[0]",
        "bodies[0].inertia[1]",
        "materials.steel.poissons_ratio",
        "materials.steel.damping_ratio",
        "springs[0].dashpot.x",
        "damping.ratio",
        "sections.beam.height",
    )
    made = family(tmp_path, text, paths, spread=0.05)
    for sample in samples(made, 4):
        built, found = made.builder.system(sample), made.interpolated(sample)
        for kind in ("stiffness", "mass", "damping"):
            assert apart(getattr(found, kind), getattr(built, kind)) < 1e-7
        assert np.isclose(found.damping_law.ratio, built.damping_law.ratio, rtol=1e-12)
        assert found.damping_law.bands == built.damping_law.bands
        modes = made.modes
        ours, theirs = (
            system.damping_law.ratios(system, modes.undamped_frequencies_hz, modes.shapes.real)
            for system in (found, built)
        )
        assert np.allclose(ours, theirs, rtol=1e-7)


def test_an_entry_that_touches_no_matrix_has_no_terms(tmp_path):
    text = FRAME + '[[excitations]]\nname = "fan"\nspeed = "20 Hz"\n'
    made = family(tmp_path, text, ("springs[0].stiffness.x", "excitations[0].speed"), spread=0.1)
    assert made.degrees == (1, 0)
    assert len(made.changes) == 1
    assert "independent of 1" in made.remarks[0]


def test_what_is_no_low_polynomial_is_rebuilt(tmp_path):
    read = study(tmp_path, FRAME)
    # the upper storey shrinks to a twentieth: stiffness goes with the third power of its inverse
    made = Family.from_study(read, {"points.A1[2]": (1.0, 1.86), "points.B1[2]": (1.0, 1.86)}, count=4)
    assert made.interpolation is None
    assert "rebuilt for every sample" in made.remarks[0]
    assert "points.A1[2]" in made.remarks[0]
    assert not made.covers(made.nominal[None])[0]


def test_nominal_values_of_entries(tmp_path):
    text = FRAME.replace('"140 kg"', '{ from = "100 kg", to = "200 kg" }')
    text = text.replace('poissons_ratio = 0.3\ndensity = "7850 kg/m^3"', 'like = "structural steel"')
    text += '[[excitations]]\nspeed = "1200 rpm"\n'
    read = study(tmp_path, text)
    assert nominal_value(read, "bodies[0].mass") == 150
    assert nominal_value(read, "springs[0].stiffness.z") == 6e6
    assert nominal_value(read, "excitations[0].speed") == 20
    assert nominal_value(read, "points.B1[0]") == 1.4
    assert nominal_value(read, "materials.steel.density") == read.materials["steel"].data.density
    with pytest.raises(ModelError, match=r"bodies\[3\].mass: the study has no such entry \(3 is not there\)"):
        nominal_value(read, "bodies[3].mass")
    with pytest.raises(ModelError, match=r"bodies\[0\].name: this entry holds no single number"):
        nominal_value(read, "bodies[0].name")


def test_bounds_must_be_in_order(tmp_path):
    read = study(tmp_path, BODIES)
    for wrong in ((2.0, 1.0), (0.0, np.inf)):
        with pytest.raises(ModelError, match="a finite least and greatest value"):
            Family.from_study(read, {"springs[0].stiffness.x": wrong}, count=2)


def test_a_sample_that_cannot_be_built_names_its_values(tmp_path):
    made = family(tmp_path, FRAME, ("sections.post.thickness",), spread=0.1, count=3)
    with pytest.raises(ModelError, match=r"a sample can't be built \(sections.post.thickness = 0.05, in SI"):
        made.builder.system(np.array([0.05]))
