"""Modes of structures cut into pieces: error bars, refinement, participation, energy shares, words.

The structures here are made by hand, so that these tests stand on the anatomy alone.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np
import pytest
import scipy.sparse as sparse

from vib.convergence import _fall
from vib.errors import ShapeError
from vib.system import Anatomy, DampingLaw, Freedom, Part, Place, System, Wireframe

TAU = 2 * np.pi
ROOTS = np.array(
    [1.875104068711961, 4.694091132974175, 7.854757438237613, 10.995540734875467, 14.13716839104647]
)


@dataclass
class Cut:
    """A division of one member into equal pieces."""

    make: Callable[[int], System]
    pieces: int
    accuracy: float = 0.005
    planned: Callable[[float], int] | None = None

    def coarser(self):
        return None if self.pieces == 1 or self.pieces % 2 else self.make(self.pieces // 2)

    def finer(self):
        return self.make(self.pieces * 2)

    def for_frequency(self, frequency_hz):
        return self.make(self.planned(frequency_hz)) if self.planned else self.make(self.pieces)


def assembled(element, pieces, per_node, held):
    size = per_node * (pieces + 1)
    whole = np.zeros((size, size))
    for e in range(pieces):
        rows = slice(per_node * e, per_node * (e + 2))
        whole[rows, rows] += element
    keep = [i for i in range(size) if i not in held(size)]
    return whole[np.ix_(keep, keep)], keep


def structure(pieces, mass, stiffness, keep, per_node, make, carried, planned, accuracy):
    """A member along x of length 1; freedoms along x (rod) or along z and about -y (beam)."""
    nodes = pieces + 1
    moves = sparse.lil_array((3 * nodes, len(keep)))
    row = 0 if per_node == 1 else 2
    for column, freedom in enumerate(keep):
        if freedom % per_node == 0:
            moves[3 * (freedom // per_node) + row, column] = 1.0
    motion = sparse.csr_array(moves)
    ends = {}
    for name, node in (("root", 0), ("tip", pieces)):
        six = sparse.lil_array((6, len(keep)))
        six[:3] = motion[3 * node : 3 * node + 3]
        ends[name] = Place(name, (float(node) / pieces, 0.0, 0.0), sparse.csr_array(six))
    whole_mass = np.zeros((6, 6))
    whole_mass[row, row] = 1.0
    positions = np.column_stack([np.linspace(0, 1, nodes), np.zeros(nodes), np.zeros(nodes)])
    anatomy = Anatomy(
        places=ends,
        parts=(Part("bar", "members", sparse.csr_array(stiffness), sparse.csr_array(mass), 0.03),),
        wireframe=Wireframe(positions, motion, (("bar", tuple(range(nodes))),)),
        carried=carried,
        rigid_mass=whole_mass,
        division=Cut(make, pieces, accuracy, planned),
    )
    names = tuple(
        Freedom(f"node {f // per_node}", ("x" if per_node == 1 else ("z", "ry")[f % 2])) for f in keep
    )
    return System(
        mass=sparse.csr_array(mass),
        stiffness=sparse.csr_array(stiffness),
        freedoms=names,
        anatomy=anatomy,
    )


def rod(pieces, free=False, planned=None, accuracy=0.005):
    """Rod of unit length, mass and wave speed with linear elements, held at one end or free."""
    step = 1 / pieces
    k, m = np.array([[1, -1], [-1, 1]]) / step, step / 6 * np.array([[2, 1], [1, 2]])
    held = (lambda size: ()) if free else (lambda size: (0,))
    mass, keep = assembled(m, pieces, 1, held)
    stiffness, _ = assembled(k, pieces, 1, held)
    whole, _ = assembled(m, pieces, 1, lambda size: ())
    carried = np.zeros((len(keep), 6))
    carried[:, 0] = whole[keep].sum(axis=1)
    return structure(
        pieces, mass, stiffness, keep, 1,
        lambda n: rod(n, free, planned, accuracy), carried, planned, accuracy,
    )  # fmt: skip


def beam(pieces, planned=None, accuracy=0.005):
    """Cantilever of unit length, mass and bending stiffness with cubic elements."""
    s = 1 / pieces
    k = np.array([[12, 6 * s, -12, 6 * s], [6 * s, 4 * s * s, -6 * s, 2 * s * s],
                  [-12, -6 * s, 12, -6 * s], [6 * s, 2 * s * s, -6 * s, 4 * s * s]]) / s**3  # fmt: skip
    m = s / 420 * np.array(
        [[156, 22 * s, 54, -13 * s], [22 * s, 4 * s * s, 13 * s, -3 * s * s],
         [54, 13 * s, 156, -22 * s], [-13 * s, -3 * s * s, -22 * s, 4 * s * s]]
    )  # fmt: skip
    mass, keep = assembled(m, pieces, 2, lambda size: (0, 1))
    stiffness, _ = assembled(k, pieces, 2, lambda size: (0, 1))
    whole, _ = assembled(m, pieces, 2, lambda size: ())
    carried = np.zeros((len(keep), 6))
    carried[:, 2] = whole[np.ix_(keep, range(0, len(whole), 2))].sum(axis=1)
    return structure(
        pieces, mass, stiffness, keep, 2,
        lambda n: beam(n, planned, accuracy), carried, planned, accuracy,
    )  # fmt: skip


def rod_exact(count):
    return (2 * np.arange(1, count + 1) - 1) * np.pi / 2


@pytest.mark.parametrize("pieces", [2, 3, 4, 8, 16, 64])
@pytest.mark.parametrize("count", [1, 2, 3, 5])
def test_error_bar_bounds_the_true_error_of_rods(pieces, count):
    """Linear elements (h^2), from a much too coarse start: (2 j - 1) pi / 2, Rayleigh, Theory of Sound."""
    modes = rod(pieces).modes(count=count)
    exact = rod_exact(count) / TAU
    true = np.abs(modes.frequencies_hz - exact)
    assert (true <= modes.errors_hz).all()
    assert (modes.errors_hz <= 0.005 * modes.frequencies_hz * (1 + 1e-9)).all()
    assert (
        modes.errors_hz[-1] < 3 * true[-1] + 1e-9
    )  # and it is not blown up either: half over a third is 1.5


@pytest.mark.parametrize("pieces", [1, 2, 3, 6, 20])
@pytest.mark.parametrize("count", [1, 2, 5])
def test_error_bar_bounds_the_true_error_of_beams(pieces, count):
    """Cubic elements (h^4): roots of cos b cosh b = -1 (Rayleigh, Theory of Sound, vol. 1, section 174)."""
    modes = beam(pieces).modes(count=count)
    exact = ROOTS[:count] ** 2 / TAU
    assert (np.abs(modes.frequencies_hz - exact) <= modes.errors_hz).all()
    assert (modes.errors_hz <= 0.005 * modes.frequencies_hz).all()


@pytest.mark.parametrize("ratio", [0.0, 0.3])
@pytest.mark.parametrize("pieces", [2, 4, 8])
def test_error_bar_of_complex_modes(pieces, ratio):
    """Rod with a dashpot c = 0.3 at its tip: tanh(l) = -1 / c, so l = -atanh(c) + i (2 j - 1) pi / 2."""

    def damped(n):
        system = rod(n)
        damping = np.zeros((n, n))
        damping[-1, -1] = 0.3
        anatomy = replace(system.anatomy, division=Cut(damped, n))
        return replace(system, damping=sparse.csr_array(damping), anatomy=anatomy)

    modes = damped(pieces).modes(count=3)
    exact = np.abs(-np.arctanh(0.3) + 1j * rod_exact(3)) / TAU
    assert not modes.proportional
    assert (np.abs(modes.frequencies_hz - exact) <= modes.errors_hz).all()
    assert (modes.errors_hz <= 0.005 * modes.frequencies_hz * (1 + 1e-9)).all()


def test_the_plan_for_a_frequency_is_followed():
    asked = []

    def planned(frequency_hz):
        asked.append(frequency_hz)
        return 40

    modes = rod(4, planned=planned).modes(count=2)
    assert modes.system.size == 40
    assert asked[0] == pytest.approx(rod_exact(2)[1] / TAU, rel=0.1)


def test_up_to_a_frequency():
    modes = rod(4).modes(up_to=2.0)  # 0.25, 0.75, 1.25, 1.75 Hz
    np.testing.assert_allclose(modes.frequencies_hz, [0.25, 0.75, 1.25, 1.75], rtol=0.005)
    assert modes.complete_below_hz >= 2.0
    assert any("within 0.5 %" in remark for remark in modes.remarks)


def test_an_accuracy_that_can_not_be_met_is_owned_up_to():
    modes = rod(4, accuracy=1e-7).modes(count=5)
    assert modes.errors_hz[-1] > 1e-7 * modes.frequencies_hz[-1]
    assert any("still not within" in remark for remark in modes.remarks)
    assert (np.abs(modes.frequencies_hz - rod_exact(5) / TAU) <= modes.errors_hz).all()


def test_all_modes_of_one_division():
    modes = rod(8).modes()
    assert modes.count == 8
    assert modes.errors_hz[-1] > 0.1 * modes.frequencies_hz[-1]
    assert any("not refined" in remark for remark in modes.remarks)
    assert (np.abs(modes.frequencies_hz - rod_exact(8) / TAU) <= modes.errors_hz).all()


def test_effective_mass_of_a_cantilever():
    """0.6131, 0.1883, 0.0647, 0.0331 of the mass: Chopra, Dynamics of Structures [EFFM-2]."""
    modes = beam(40).modes(count=4)
    np.testing.assert_allclose(
        modes.effective_mass[:, 2],
        [0.613076090026, 0.188300361066, 0.0647322316854, 0.0330868902755],
        rtol=1e-5,
    )
    np.testing.assert_allclose(modes.participation**2, modes.effective_mass)
    np.testing.assert_allclose(modes.effective_mass_along([0, 0, 2, 0, 0, 0]), 4 * modes.effective_mass[:, 2])
    with pytest.raises(ShapeError, match="vector"):
        modes.effective_mass_along(np.ones(7))


@pytest.mark.parametrize("make", [rod, beam])
def test_sum_rule_of_effective_mass(make):
    """All effective masses add up to L' inv(M) L (Clough & Penzien, Dynamics of Structures)."""
    modes = make(10).modes()
    carried, mass = modes.system.anatomy.carried, modes.system.mass.toarray()
    expected = np.diag(carried.T @ np.linalg.solve(mass, carried))
    np.testing.assert_allclose(modes.effective_mass.sum(axis=0), expected, rtol=1e-11, atol=1e-15)


def two_storeys():
    """Two floors on soft legs below and stiff ones above, moving along x, y and turning about z."""
    mass = np.kron(np.diag([2.0, 1.0]), np.diag([1.0, 1.0, 0.4]))
    legs = np.kron([[1.0, 0], [0, 0]], np.diag([100.0, 220.0, 90.0]))
    posts = np.kron([[1.0, -1], [-1, 1]], np.diag([1000.0, 2200.0, 900.0]))
    corners = np.array([(x, y) for x in (-1.0, 1.0) for y in (-1.0, 1.0)])
    moves = np.zeros((24, 6))
    nodes: list[tuple[float, float, float]] = []
    for floor in (0, 1):
        for x, y in corners:
            row = 3 * len(nodes)
            moves[row : row + 2, 3 * floor : 3 * floor + 3] = [[1, 0, -y], [0, 1, x]]
            nodes.append((x, y, 1.0 + floor))
    places = {}
    for floor, name in enumerate(("lower floor", "upper floor")):
        six = np.zeros((6, 6))
        six[[0, 1, 5], 3 * floor : 3 * floor + 3] = np.eye(3)
        places[name] = Place(name, (0.0, 0.0, 1.0 + floor), sparse.csr_array(six))
    rigid = np.zeros((6, 6))
    rigid[:3, [0, 1, 5]] = rigid[3:, [0, 1, 5]] = np.eye(3)
    parts = (
        Part("legs", "springs", sparse.csr_array(legs), None, 0.04),
        Part("posts", "springs", sparse.csr_array(posts), None, 0.01),
        Part("floors", "body", None, sparse.csr_array(mass)),
    )
    anatomy = Anatomy(
        places=places,
        parts=parts,
        wireframe=Wireframe(np.array(nodes), sparse.csr_array(moves), (("floors", (0, 1, 3, 2)),)),
        carried=mass @ rigid,
        rigid_mass=rigid.T @ mass @ rigid,
    )
    names = tuple(Freedom(name, component) for name in places for component in ("x", "y", "rz"))
    return System(
        mass=mass,
        stiffness=legs + posts,
        freedoms=names,
        anatomy=anatomy,
        damping_law=DampingLaw(material=True),
    )


def test_energy_shares_and_words():
    system = two_storeys()
    modes = system.modes()
    for shares in (modes.strain_energy, modes.kinetic_energy):
        np.testing.assert_allclose(sum(shares.values()), np.ones(6), rtol=1e-12)
    first = modes.shapes[:, 0]
    legs = first @ system.anatomy.parts[0].stiffness @ first / (TAU * modes.frequencies_hz[0]) ** 2
    assert modes.strain_energy["legs"][0] == pytest.approx(legs, rel=1e-12)
    np.testing.assert_array_equal(modes.kinetic_energy["floors"], np.ones(6))
    share = f"{100 * legs:.0f} % of the strain energy in the legs"
    assert modes.descriptions[0] == f"sway along x, {share}"
    assert modes.descriptions[1].startswith("sway along y, ")
    assert modes.descriptions[2].startswith("twist about z, ")


def test_material_ratios_are_weighted_by_strain_energy():
    """C. D. Johnson, D. A. Kienholz, AIAA J. 20 (1982) 1284-1290: ratios times shares of strain energy."""
    modes = two_storeys().modes()
    expected = 0.04 * modes.strain_energy["legs"] + 0.01 * modes.strain_energy["posts"]
    np.testing.assert_allclose(modes.damping_ratios, expected, rtol=1e-12)
    assert "weighted by strain energy" in modes.damping_note


def test_free_structures_are_described_by_place():
    modes = rod(8, free=True).modes(count=3)
    assert modes.rigid_descriptions == ("the whole structure can move freely along x",)
    assert modes.rigid_body_count == 1
    assert 0 < modes.errors_hz[0] < 1e-4 * modes.frequencies_hz[-1]  # what round-off may hide
    np.testing.assert_allclose(modes.frequencies_hz[1:], [0.5, 1.0], rtol=0.005)  # j / 2, free-free rod
    assert (np.abs(modes.frequencies_hz - [0, 0.5, 1.0]) <= modes.errors_hz).all()
    np.testing.assert_allclose(modes.strain_energy["bar"], [0, 1, 1], rtol=1e-12)
    np.testing.assert_allclose(modes.kinetic_energy["bar"], [1, 1, 1], rtol=1e-12)


def test_a_mechanism_is_named():
    """Two floors whose upper one turns freely about z."""
    system = two_storeys()
    stiffness = np.array(system.stiffness)
    stiffness[2, 2], stiffness[[2, 5], [5, 2]], stiffness[5, 5] = 90.0, 0.0, 0.0
    modes = replace(system, stiffness=stiffness, damping_law=DampingLaw()).modes()
    assert modes.rigid_descriptions == ("upper floor can turn freely about z",)
    assert modes.descriptions[0] == "upper floor can turn freely about z"
    assert modes.effective_mass[0, 5] == pytest.approx(0.4, rel=1e-12)


def test_whole_and_mechanism_together():
    """Nothing to the ground, the upper floor loose about z: three motions of the whole, one of the part."""
    system = two_storeys()
    stiffness = np.array(system.anatomy.parts[1].stiffness.toarray())
    stiffness[np.ix_([2, 5], [2, 5])] = 0.0
    modes = replace(system, stiffness=stiffness, damping_law=DampingLaw()).modes()
    assert modes.rigid_body_count == 4
    assert modes.rigid_descriptions[:3] == tuple(
        f"the whole structure can {what}"
        for what in ("move freely along x", "move freely along y", "turn freely about z")
    )
    assert modes.rigid_descriptions[3] in (
        "upper floor can turn freely about z",
        "lower floor can turn freely about z",
    )
    modal = modes.shapes.T @ system.mass @ modes.shapes
    np.testing.assert_allclose(modal, np.eye(6), atol=1e-12)


def test_modes_that_change_places_share_their_error():
    """A fast-converging mode between the two values of a slow one must not hide how far that one fell."""
    fine, coarse = np.array([50.0, 101.0, 102.0, 200.0]), np.array([51.0, 102.1, 105.0, 203.0])
    np.testing.assert_allclose(_fall(fine, coarse), [1.0, 4.0, 3.0, 3.0], rtol=1e-12)
