"""How members are cut: nested, fine enough, and never absurdly fine."""

from fractions import Fraction

import numpy as np
import pytest
import scipy.linalg

from vib.errors import ModelError
from vib.structure import survey
from vib.system import Freedom

TAU = 2 * np.pi


@pytest.fixture(scope="session")
def portal(describe):
    """A portal of I sections with a hinge, an offset and a motor."""
    return describe(
        points={"A": [0, 0, 0], "B": [0, 0, 3], "C": [4, 0, 3], "D": [4, 1, 0]},
        sections={
            "I": {
                "shape": "I",
                "height": 0.2,
                "width": 0.1,
                "web_thickness": 0.006,
                "flange_thickness": 0.009,
            }
        },
        members=[
            {"name": "posts", "section": "I", "material": "steel", "runs": [["A", "B"], ["D", "C"]]},
            {
                "name": "beam",
                "section": "I",
                "material": "steel",
                "runs": [["B", "C"]],
                "offset_start": [0, 0, 0.1],
                "releases": {"end": ["ry"]},
            },
        ],
        bodies=[
            {"name": "motor", "mass": 80, "inertia": [2, 3, 4], "centre": [0, 0.2, 3.4], "carried_by": "B"}
        ],
        supports=[{"at": ["A", "D"], "hold": "all"}],
    )


def test_half_the_pieces_span_a_part_of_the_same_space(portal):
    """Static condensation of the finer structure on the coarser freedoms gives its matrices exactly."""
    fine = portal.system()
    coarse = fine.anatomy.division.coarser()

    def key(freedom):
        """`posts A-B at 2/4` is `posts A-B at 1/2`."""
        label, found, share = freedom.point.rpartition(" at ")
        return (label, float(Fraction(share)), freedom.component) if found and "/" in share else freedom

    order = {key(freedom): i for i, freedom in enumerate(fine.freedoms)}
    twists = [i for i, freedom in enumerate(coarse.freedoms) if " piece " in freedom.point]
    kept = np.array([order[key(freedom)] for freedom in coarse.freedoms[: min(twists)]])
    inner = np.setdiff1d(np.arange(fine.size), kept)
    stiffness, mass = fine.stiffness.toarray(), fine.mass.toarray()
    expansion = np.zeros((fine.size, coarse.size))
    expansion[kept, range(len(kept))] = 1.0
    expansion[inner, : len(kept)] = -np.linalg.solve(
        stiffness[np.ix_(inner, inner)], stiffness[np.ix_(inner, kept)]
    )
    # 4 s (1 - s) is one at the middle, and on either half a line and a quarter of the same function
    axes = {run.start + run.end: run.x for run in survey(portal).runs}
    for column in twists:
        label, _, share = coarse.freedoms[column].point.rpartition(" piece ")
        piece, count = (int(number) for number in share.split("/"))
        for half in (2 * piece - 1, 2 * piece):
            expansion[order[Freedom(f"{label} piece {half}/{2 * count}", "rx")], column] = 0.25
        for component, share_of_x in zip(("rx", "ry", "rz"), axes[label[-3] + label[-1]], strict=True):
            middle = Freedom(f"{label} at {2 * piece - 1}/{2 * count}", component)
            expansion[order[key(middle)], column] = share_of_x
    for small, large in ((coarse.stiffness, stiffness), (coarse.mass, mass)):
        scale = np.sqrt(np.outer(small.diagonal(), small.diagonal()))
        np.testing.assert_allclose(
            expansion.T @ large @ expansion / scale, small.toarray() / scale, atol=1e-9
        )


def test_more_pieces_lower_every_frequency(portal, frequencies):
    """The smaller space lies in the larger one, so Rayleigh's principle holds for every frequency."""
    division = portal.system().anatomy.division
    coarse, middle, fine = (
        frequencies(system) for system in (division.coarser(), portal.system(), division.finer())
    )
    assert (middle[: len(coarse)] <= coarse * (1 + 1e-9)).all()
    assert (fine[: len(middle)] <= middle * (1 + 1e-9)).all()


def test_one_piece_cannot_be_halved(portal, cut):
    assert cut(portal, 1).anatomy.division.coarser() is None
    assert cut(portal, 3).anatomy.division.coarser() is None
    assert cut(portal, 3).anatomy.division.finer().anatomy.division.coarser().size == cut(portal, 3).size


def test_bodies_alone_have_no_coarser_division(describe):
    study = describe(
        points={"A": [0, 0, 0]}, bodies=[{"name": "m", "mass": 1, "inertia": [1, 1, 1], "carried_by": "A"}]
    )
    assert study.system().anatomy.division.coarser() is None


@pytest.mark.parametrize("accuracy", [0.02, 0.005, 0.001])
def test_cut_for_a_frequency_meets_the_accuracy(describe, accuracy):
    """All modes up to the limit, in bending, torsion and axially.

    The true error is below 4/3 of the change when the pieces are halved, for a rate of two or more.
    """
    study = describe(
        accuracy=accuracy,
        points={"A": [0, 0, 0], "B": [0, 0, 1.2], "C": [1.0, 0, 1.2]},
        sections={"bar": {"shape": "rectangle", "width": 0.05, "height": 0.1}},
        members=[{"name": "frame", "section": "bar", "material": "steel", "runs": [["A", "B", "C"]]}],
        supports=[{"at": ["A"], "hold": "all"}],
    )
    system = study.system(up_to="600 Hz")
    finer = system.anatomy.division.finer()

    def lowest(system):
        values = scipy.linalg.eigh(
            system.stiffness.toarray(), system.mass.toarray(), eigvals_only=True, subset_by_index=[0, 9]
        )
        return np.sqrt(values) / TAU

    found, better = lowest(system), lowest(finer)
    assert 500 < found[-1] < 700
    assert (4 / 3 * (found / better - 1)).max() < accuracy
    assert system.anatomy.division.accuracy == accuracy


def test_error_laws_of_the_pieces(describe, cut, frequencies):
    """(k h)^4/1440 of a pinned beam in bending: the law that the counts come from, here within 10 %."""
    study = describe(
        points={"A": [0, 0, 0], "B": [1, 0, 0]},
        materials={"m": {"youngs_modulus": 1e6, "poissons_ratio": 0.3, "density": 1.0}},
        sections={
            "s": {"area": 1, "second_moment_y": 1e-6, "second_moment_z": 1e-6, "torsion_constant": 1e-6}
        },
        members=[{"name": "m", "section": "s", "material": "m", "runs": [["A", "B"]]}],
        supports=[{"at": ["A", "B"], "hold": ["x", "y", "z", "rx"]}],
    )
    system = cut(study, 4)
    keep = [i for i, freedom in enumerate(system.freedoms) if freedom.component in ("y", "rz")]
    stiffness, mass = (matrix.toarray()[np.ix_(keep, keep)] for matrix in (system.stiffness, system.mass))
    values = np.sqrt(scipy.linalg.eigh(stiffness, mass, eigvals_only=True))[:2]
    wave = np.pi * np.arange(1, 3)
    exact = wave**2 / np.sqrt(1 + 1e-6 * wave**2)
    np.testing.assert_allclose(values / exact - 1, (wave / 4) ** 4 / 1440, rtol=0.1)


def test_torsion_of_open_sections(describe, cut, frequencies):
    """Torsion waves of an I section, omega = n pi c / L: too high by (k h)^4/1440, here within 10 %."""
    study = describe(
        points={"A": [0, 0, 0], "B": [2, 0, 0]},
        sections={
            "I": {
                "shape": "I",
                "height": 0.2,
                "width": 0.1,
                "web_thickness": 0.006,
                "flange_thickness": 0.009,
            }
        },
        members=[{"name": "m", "section": "I", "material": "steel", "runs": [["A", "B"]]}],
        supports=[{"at": ["A", "B"], "hold": ["rx"]}],
    )
    profile = study.sections["I"].profile
    speed = np.sqrt(210e9 / 2.6 * profile.torsion_constant / (7850 * profile.polar_moment))
    found = frequencies(cut(study, 8), "rx")[:3]
    wave = np.pi * np.arange(1, 4)
    exact = wave * speed / 2 / TAU
    np.testing.assert_allclose(found / exact - 1, (wave / 8) ** 4 / 1440, rtol=0.1)
    # the count that follows meets the accuracy asked for
    system = study.system(up_to=float(exact[2]) * 1.01)
    assert (frequencies(system, "rx")[:3] / exact - 1 < 0.005).all()
    assert system.size < 100


def test_absurd_frequencies_are_refused(portal):
    with pytest.raises(ModelError, match=r"more than 200000; ask for a lower frequency limit"):
        portal.system(up_to="1e9 Hz")
    with pytest.raises(ModelError, match="wanted a frequency above zero"):
        portal.system(up_to=0.0)
