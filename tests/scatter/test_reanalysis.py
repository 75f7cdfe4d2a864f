"""Samples on a reduced basis against full solutions of the rebuilt matrices by SciPy and NumPy."""

from dataclasses import replace

import numpy as np
import pytest
import scipy.linalg

import vib
from tests.scatter.studies import BODIES, DASHPOT, FRAME, QUANTITIES, dense, family, samples, study
from vib.scatter.batch import Batch
from vib.scatter.family import Family
from vib.scatter.reanalysis import Reanalysis


@pytest.fixture(scope="module")
def frame(tmp_path_factory):
    made = family(tmp_path_factory.mktemp("frame"), FRAME)
    return made, Reanalysis.build(made)


@pytest.fixture(scope="module")
def damped(tmp_path_factory):
    made = family(tmp_path_factory.mktemp("damped"), FRAME + DASHPOT, (*QUANTITIES, "springs[0].dashpot.z"))
    return made, Reanalysis.build(made)


def eigh(made, points, count):
    """Lowest frequencies, Hz, of the rebuilt matrices."""
    rows = []
    for point in points:
        system = made.builder.system(point)
        squares = scipy.linalg.eigh(dense(system.stiffness), dense(system.mass), eigvals_only=True)
        rows.append(np.sqrt(squares[:count]) / (2 * np.pi))
    return np.array(rows)


def test_frequencies_are_within_their_errors_of_scipy(frame):
    made, reanalysis = frame
    points = samples(made, 150)
    batch = reanalysis.evaluate(points)
    assert not batch.full.all()
    exact = eigh(made, points, made.modes.count + 4)
    # followed by shape: each is one of the lowest, and no two are the same
    order = np.argsort(batch.frequencies_hz, axis=1)
    found = np.take_along_axis(batch.frequencies_hz, order, axis=1)
    errors = np.take_along_axis(batch.errors_hz, order, axis=1)
    complete = found <= batch.complete_hz[:, None] * (1 + 1e-9)
    lowest = exact[:, : found.shape[1]]
    assert complete[:, :6].all()
    assert (np.abs(found - lowest) <= errors + 1e-9 * lowest)[complete].all()
    assert (errors <= 1e-4 * found * 1.001).all()


def test_percentiles_of_each_frequency(frame):
    made, reanalysis = frame
    points = samples(made, 200, seed=8)
    found = np.sort(reanalysis.evaluate(points).frequencies_hz, axis=1)[:, :6]
    exact = eigh(made, points, 6)
    for percentile in (2.5, 50, 97.5):
        ours, theirs = (np.percentile(rows, percentile, axis=0) for rows in (found, exact))
        assert np.abs(ours / theirs - 1).max() < 2e-4  # the tolerance of each sample is 1e-4


def test_a_few_samples_are_as_good_as_many_at_once(frame):
    made, reanalysis = frame
    points = samples(made, 20)
    whole = reanalysis.evaluate(points)
    parts = Batch.joined([reanalysis.evaluate(points[:7]), reanalysis.evaluate(points[7:])])
    for name, rows in whole.arrays().items():
        assert np.allclose(rows, parts.arrays()[name], rtol=1e-9, equal_nan=True), name


def test_the_nominal_sample_has_the_nominal_modes(frame):
    made, reanalysis = frame
    batch = reanalysis.evaluate(made.nominal[None])
    assert np.allclose(batch.frequencies_hz[0], made.modes.frequencies_hz, rtol=1e-9)
    assert np.allclose(batch.likeness, 1.0)
    assert not batch.swapped[0]
    assert np.allclose(batch.damping_ratios, 0.0)


def test_bare_modes_in_closed_form_that_change_places(tmp_path):
    # one body on one spring: f = sqrt(k / m) / (2 pi), zeta = c / (2 sqrt(k m)), as in any textbook
    read = study(tmp_path, BODIES)
    bounds = {f"springs[{i}].stiffness.x": (2e4, 1.6e5) for i in range(3)}
    bounds["bodies[1].mass"] = (5.0, 20.0)
    made = Family.from_study(read, bounds, count=3)
    reanalysis = Reanalysis.build(made)
    points = samples(made, 200)
    batch = reanalysis.evaluate(points)
    mass = np.column_stack([np.full(200, 10.0), points[:, 3], np.full(200, 10.0)])
    angular = np.sqrt(points[:, :3] / mass)
    assert np.allclose(batch.frequencies_hz, angular / (2 * np.pi), rtol=1e-8)
    assert np.allclose(batch.damping_ratios, np.array([100, 50, 400]) / (2 * mass * angular), rtol=1e-6)
    assert (batch.swapped == (np.diff(angular, axis=1) < 0).any(axis=1)).all()
    assert 0.3 < batch.swapped.mean() < 1
    assert np.isinf(batch.complete_hz).all()  # there are no other modes


def test_nominal_modes_of_equal_frequency_are_told_apart_as_samples_do(tmp_path):
    # one body on a spring along x and one along y that are equal nominally: any direction is a nominal mode
    text = """
    [points]
    A = ["0 m", "0 m", "0 m"]
    [[bodies]]
    mass = "10 kg"
    carried_by = "A"
    [[supports]]
    at = "A"
    hold = ["z", "rx", "ry", "rz"]
    [[springs]]
    between = ["A", "ground"]
    x_axis = [0.8, 0.6, 0.0]
    y_axis = [-0.6, 0.8, 0.0]
    stiffness = { x = "50 kN/m", y = "50 kN/m" }
    """
    made = family(tmp_path, text, ("springs[0].stiffness.x", "springs[0].stiffness.y"), count=2)
    points = samples(made, 100)
    batch = Reanalysis.build(made).evaluate(points)
    wanted = np.sqrt(points / 10) / (2 * np.pi)
    first = int(np.abs(batch.frequencies_hz[0, 0] - wanted[0]).argmin())
    assert np.allclose(batch.frequencies_hz, wanted[:, [first, 1 - first]], rtol=1e-8)
    assert (batch.likeness > 0.999).all()


def test_a_body_that_becomes_overdamped(tmp_path):
    text = BODIES.replace("400 N s/m", "1500 N s/m")
    made = family(tmp_path, text, ("springs[2].dashpot.x",), spread=0.6, count=3)
    reanalysis = Reanalysis.build(made)
    points = np.linspace(700, 2390, 30)[:, None]
    batch = reanalysis.evaluate(points)
    half = points[:, 0] / 20
    excess = half**2 - 9e3  # (c / 2 m)^2 - k / m: overdamped where positive
    over = excess > 0
    assert over.any()
    assert not over.all()
    column = int(np.argmax(made.modes.frequencies_hz))
    assert np.allclose(batch.damping_ratios[over, column], 1.0)
    slow = half[over] - np.sqrt(excess[over])
    assert np.allclose(2 * np.pi * batch.frequencies_hz[over, column], slow, rtol=1e-5)
    assert np.allclose(batch.damping_ratios[~over, column], half[~over] / np.sqrt(9e3), rtol=1e-5)


def test_complex_modes_are_those_of_numpy(damped):
    made, reanalysis = damped
    assert not made.modes.proportional
    points = samples(made, 25)
    batch = reanalysis.evaluate(points)
    assert not batch.full.all()
    for row, point in enumerate(points):
        system = made.builder.system(point)
        mass, damping, stiffness = (dense(part) for part in (system.mass, system.damping, system.stiffness))
        size = len(mass)
        rate = np.block(
            [
                [np.zeros((size, size)), np.eye(size)],
                [-np.linalg.solve(mass, stiffness), -np.linalg.solve(mass, damping)],
            ]
        )
        values = np.linalg.eigvals(rate)
        upper = values[values.imag >= 0]
        ours = 2 * np.pi * batch.frequencies_hz[row]
        ratio = batch.damping_ratios[row]
        ours = ours * (-ratio + 1j * np.sqrt(1 - ratio**2))
        nearest = upper[np.abs(ours[:, None] - upper).argmin(axis=1)]
        assert (np.abs(np.abs(ours) - np.abs(nearest)) <= 2 * np.pi * batch.errors_hz[row] * 1.001).all()
        assert np.abs(ours / nearest - 1).max() < 2e-4
        assert len(set(nearest.tolist())) == len(ours)


def test_samples_outside_of_the_bounds_are_solved_in_full(frame):
    made, reanalysis = frame
    points = np.array([made.nominal, made.nominal * 1.5])
    batch = reanalysis.evaluate(points)
    assert batch.full.tolist() == [False, True]
    exact = eigh(made, points, made.modes.count)
    assert np.allclose(np.sort(batch.frequencies_hz, axis=1), exact, rtol=2e-4)


def test_a_basis_that_is_not_good_enough_is_not_used(frame):
    made, reanalysis = frame
    points = samples(made, 5)
    strict = replace(reanalysis.evaluator, tolerance=1e-13)
    found, usual = strict(points), reanalysis.evaluate(points)
    assert found.full.all()
    assert np.allclose(found.frequencies_hz, usual.frequencies_hz, rtol=1e-4)
    assert np.allclose(np.sort(found.frequencies_hz, axis=1), eigh(made, points, 8), rtol=1e-8)
    assert (found.swapped == usual.swapped).all()


def test_without_an_interpolation_every_sample_is_rebuilt(frame):
    made, reanalysis = frame
    bare = Reanalysis.build(replace(made, interpolation=None))
    points = samples(made, 4)
    batch = bare.evaluate(points)
    assert bare.basis_size == 0
    assert batch.full.all()
    assert np.allclose(batch.frequencies_hz, reanalysis.evaluate(points).frequencies_hz, rtol=1e-4)


def test_errors_follow_the_tolerance(frame):
    made, usual = frame
    fine = Reanalysis.build(made, tolerance=1e-7)
    assert fine.basis_size > usual.basis_size
    points = samples(made, 20)
    exact = eigh(made, points, 6)
    batch = fine.evaluate(points)
    assert np.abs(np.sort(batch.frequencies_hz, axis=1)[:, :6] / exact - 1).max() < 1e-7 + 2 * made.error


def test_training_samples_say_where_the_basis_is_needed(frame):
    made, usual = frame
    near = made.nominal + 0.05 * (samples(made, 300) - made.nominal)
    small = Reanalysis.build(made, training=near)
    assert small.basis_size < usual.basis_size
    assert small.evaluate(near).full.mean() < 0.02


def test_rigid_body_modes_stay_at_zero(tmp_path):
    text = FRAME[: FRAME.index("[[springs]]")]
    made = family(tmp_path, text, ("bodies[0].mass", "materials.steel.youngs_modulus"), count=9)
    batch = Reanalysis.build(made).evaluate(samples(made, 10))
    assert (batch.frequencies_hz[:, :6] == 0).all()
    assert np.isnan(batch.damping_ratios[:, :6]).all()
    exact = eigh_elastic(made, samples(made, 10), 3)
    assert np.allclose(np.sort(batch.frequencies_hz[:, 6:], axis=1), exact, rtol=1e-4)


def eigh_elastic(made, points, count):
    rows = []
    for point in points:
        system = made.builder.system(point)
        squares = scipy.linalg.eigh(dense(system.stiffness), dense(system.mass), eigvals_only=True)
        rows.append(np.sqrt(squares[6 : 6 + count]) / (2 * np.pi))
    return np.array(rows)


def test_a_spinning_wheel_splits_its_tilting_modes(tmp_path):
    # a disc on tilting springs: the spin couples two tilts of equal stiffness, which whirl at
    # w = sqrt(w0^2 + g^2) -+ g with g = Ip W / (2 It)
    # (G. Genta, Dynamics of Rotating Systems, 2005, chapter 4)
    text = """
    [points]
    A = ["0 m", "0 m", "0 m"]
    [[bodies]]
    mass = "20 kg"
    inertia = ["0.6 kg m^2", "0.6 kg m^2", "1.1 kg m^2"]
    carried_by = "A"
    spin = { axis = "z", speed = "50 Hz" }
    [[supports]]
    at = "A"
    hold = ["x", "y", "z", "rz"]
    [[springs]]
    between = ["A", "ground"]
    stiffness = { rx = "30 kN m/rad", ry = "30 kN m/rad" }
    """
    paths = ("bodies[0].inertia[2]", "bodies[0].spin.speed")
    made = family(tmp_path, text, paths, spread=0.1, count=2)
    points = samples(made, 40)
    batch = Reanalysis.build(made).evaluate(points)
    turn = points[:, 0] * 2 * np.pi * points[:, 1] / (2 * 0.6)
    middle = np.sqrt(30e3 / 0.6 + turn**2)
    assert np.allclose(2 * np.pi * batch.frequencies_hz[:, 0], middle - turn, rtol=1e-6)
    assert np.allclose(2 * np.pi * batch.frequencies_hz[:, 1], middle + turn, rtol=1e-6)
    assert batch.stable.all()


def test_a_mesh_whose_materials_damp(tmp_path):
    # the shared model of a plate on rubber strips: cells of a file, two machines, material damping
    read = vib.read("models/base_plate.toml")
    modulus = read.materials["plate"].data.youngs_modulus
    bounds = {
        "bodies[0].mass": (140.0, 180.0),
        "materials.plate.youngs_modulus": (0.9 * modulus, 1.1 * modulus),
    }
    made = Family.from_study(read, bounds, count=4)
    assert made.interpolation is not None
    points = samples(made, 3)
    batch = Reanalysis.build(made).evaluate(points)
    assert not batch.full.any()
    for row, point in enumerate(points):
        modes = made.builder.system(point).modes(count=4)
        order = np.argsort(batch.frequencies_hz[row])
        assert np.allclose(batch.frequencies_hz[row, order], modes.frequencies_hz, rtol=2e-4)
        assert np.allclose(batch.damping_ratios[row, order], modes.damping_ratios, rtol=1e-3)


def test_equal_modes_in_every_sample_are_no_missing_ones():
    # the four legs of this model have local modes of one frequency, which no shape tells apart
    read = vib.read("models/bolted_frame.toml")
    bounds = {path: (tolerance.low, tolerance.high) for path, tolerance in read.tolerances.items()}
    made = Family.from_study(read, bounds, count=8)
    assert np.ptp(made.modes.frequencies_hz[6:8]) < 1e-6
    reanalysis = Reanalysis.build(made)
    assert reanalysis.basis_size > 0
    assert not reanalysis.evaluate(samples(made, 50)).full.any()


def test_buckled_samples_are_not_reported_as_stable(tmp_path):
    # posts in compression: a sample is stable where the stiffness has no negative eigenvalue
    text = FRAME.replace('name = "posts"', 'name = "posts"\ntension = "-10 kN"')
    read = study(tmp_path, text)
    made = Family.from_study(read, {"members[0].tension": (-1.5e5, -2e3)}, count=4)
    points = np.linspace(-1.5e5, -2e3, 9)[:, None]
    least = [np.linalg.eigvalsh(dense(made.builder.system(point).stiffness))[0] for point in points]
    stable = np.array(least) > 0
    assert stable.any()
    assert not stable.all()
    batch = Reanalysis.build(made).evaluate(points)
    assert (batch.stable == stable).all()
    assert (batch.damping_ratios[~stable] < 0).any(axis=1).all()
