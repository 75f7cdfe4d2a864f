"""Single members against closed forms.

Unit beams with EI = rho A = L = 1, so that b = beta L is the square root of the circular frequency. The
radius of gyration is 3e-5 of the length: rotary inertia changes no frequency here by more than 1e-7.
"""

import numpy as np
import pytest

PI = np.pi
RATIO = 1e-9  # second moment over area
UNIT = {"like": None, "youngs_modulus": 1 / RATIO, "poissons_ratio": 0.25, "density": 1.0}
LINE = {"area": 1.0, "second_moment_y": RATIO, "second_moment_z": RATIO, "torsion_constant": RATIO}


@pytest.fixture(scope="session")
def beam(describe):
    """A unit beam A-B(-C) along x; supports such as {"A": ["y", "rz"]}; other tables as they are."""

    def make(supports, points=((0.0, 0.0, 0.0), (1.0, 0.0, 0.0)), material=UNIT, section=LINE, **tables):
        named = {"ABC"[i]: list(point) for i, point in enumerate(points)}
        return describe(
            points=named,
            materials={"unit": {key: value for key, value in material.items() if value is not None}},
            sections={"line": section},
            members=[{"name": "beam", "section": "line", "material": "unit", "runs": [list(named)]}],
            supports=[{"at": point, "hold": hold} for point, hold in supports.items() if hold],
            **tables,
        )

    return make


def bending(frequencies, system):
    """b = beta L of the modes in the x-y plane."""
    return np.sqrt(2 * PI * frequencies(system, "y rz"))


HOLDS = {"C": ["y", "rz"], "P": ["y"], "S": ["rz"], "F": []}
# R. D. Blevins, Formulas for Natural Frequency and Mode Shape (1979), table 8-1, confirmed by root finding
ROOTS = {
    "CF": (0, [1.875104068712, 4.6940911329742, 7.8547574382376, 10.995540734875, 14.137168391046]),
    "PP": (0, [PI, 2 * PI, 3 * PI, 4 * PI, 5 * PI]),
    "CC": (0, [4.7300407448627, 7.8532046240958, 10.995607838002, 14.137165491257, 17.278759657399]),
    "FF": (2, [4.7300407448627, 7.8532046240958, 10.995607838002, 14.137165491257, 17.278759657399]),
    "CP": (0, [3.9266023120479, 7.0685827456287, 10.210176122813, 13.351768777754, 16.493361431346]),
    "FP": (1, [3.9266023120479, 7.0685827456287, 10.210176122813, 13.351768777754, 16.493361431346]),
    "CS": (0, [2.3650203724314, 5.4978039190008, 8.6393798286997, 11.78097245102, 14.922565104552]),
    "FS": (1, [2.3650203724314, 5.4978039190008, 8.6393798286997, 11.78097245102, 14.922565104552]),
    "PS": (0, [PI / 2, 3 * PI / 2, 5 * PI / 2, 7 * PI / 2, 9 * PI / 2]),
    "SS": (1, [PI, 2 * PI, 3 * PI, 4 * PI, 5 * PI]),
}


@pytest.mark.parametrize("ends", ROOTS)
def test_beams_with_all_ends(beam, cut, frequencies, ends):
    """Blevins (1979), table 8-1; tolerance 1e-5 on b (the fifth needs 50 pieces: (k h)^4/2880)."""
    rigid, roots = ROOTS[ends]
    found = bending(frequencies, cut(beam({"A": HOLDS[ends[0]], "B": HOLDS[ends[1]]}), 50))
    assert (found[:rigid] < 0.05).all()  # the square root of round-off
    np.testing.assert_allclose(found[rigid : rigid + 5], roots, rtol=1e-5)


def test_the_strip_of_the_engineer(describe, cut, frequencies):
    """Steel flat 40 x 12 mm, 0.8 m, clamped-free: closed form of Euler and Bernoulli, tolerance 1e-4.

    A general section without shear areas; its rotary inertia lowers the fourth frequency by less than 2e-4.
    """
    width, thickness = 0.04, 0.012
    area = width * thickness
    section = {
        "area": area,
        "second_moment_y": area * thickness**2 / 12,
        "second_moment_z": area * width**2 / 12,
        "torsion_constant": 2e-8,
    }
    study = describe(
        points={"A": [0, 0, 0], "B": [0.8, 0, 0]},
        materials={"steel": {"youngs_modulus": 210e9, "poissons_ratio": 0.3, "density": 7850}},
        sections={"flat": section},
        members=[{"name": "strip", "section": "flat", "material": "steel", "runs": [["A", "B"]]}],
        supports=[{"at": "A", "hold": "all"}],
    )
    found = frequencies(cut(study, 24), "z ry")[:4]
    wanted = np.array([15.66593615, 98.17674597, 274.8977315, 538.6898384])
    # rotary inertia alone: f falls by the share (r/L)^2 b^2 (b^2 - 2 ...)/2 < (r/L)^2 b^2, small but known
    slender = area * thickness**2 / 12 / area / 0.8**2
    assert (found < wanted * (1 + 1e-7)).all()
    np.testing.assert_allclose(found, wanted, rtol=1e-4 + 120.9 * slender)
    np.testing.assert_allclose(found[:2], wanted[:2], rtol=4e-4)
    np.testing.assert_allclose(found[0], wanted[0], rtol=1e-4)


def test_two_spans(beam, cut, frequencies):
    """Blevins (1979), multispan beams; tolerance 1e-5."""
    points = ((0, 0, 0), (1, 0, 0), (2, 0, 0))
    study = beam({"A": ["y"], "B": ["y"], "C": ["y"]}, points)
    wanted = [PI, 3.9266023120479, 2 * PI, 7.0685827456287, 3 * PI, 10.210176122813]
    np.testing.assert_allclose(bending(frequencies, cut(study, 30))[:6], wanted, rtol=1e-5)


TIPS = {
    0.1: [1.72274152059, 4.39952281616, 7.4510566733],
    0.5: [1.41996442977, 4.11113338642, 7.19033524196],
    1.0: [1.24791740961, 4.03113943671, 7.13413224094],
    2.0: [1.07619566408, 3.98257328776, 7.10265018605],
    5.0: [0.87002145889, 3.94998049114, 7.08253760284],
    10.0: [0.73578191939, 3.93846583325, 7.07561636703],
}


@pytest.mark.parametrize("share", TIPS)
def test_mass_at_the_tip(beam, cut, frequencies, share):
    """1 + cos b cosh b + mu b (cos b sinh b - sin b cosh b) = 0, as in Blevins (1979) ch. 8; 1e-6."""
    study = beam({"A": ["y", "rz"]}, bodies=[{"name": "tip", "mass": share, "carried_by": "B"}])
    np.testing.assert_allclose(bending(frequencies, cut(study, 40))[:3], TIPS[share], rtol=1e-6)


def test_mass_and_inertia_at_the_tip(beam, cut, frequencies):
    """Closed form: EI w'' = J omega^2 w', EI w''' = -M omega^2 w at the tip, M = 0.5, J = 0.02; 1e-6."""
    disc = {"name": "disc", "mass": 0.5, "inertia": [0.0, 0.0, 0.02], "carried_by": "B"}
    found = bending(frequencies, cut(beam({"A": ["y", "rz"]}, bodies=[disc]), 40))
    np.testing.assert_allclose(found[:3], [1.39976648207, 3.346903715, 5.36513086339], rtol=1e-6)


def test_mass_at_midspan(beam, cut, frequencies):
    """1 + (mu b / 4)(tanh(b/2) - tan(b/2)) = 0 with mu = 1, and b = 2 n pi; closed form, 1e-6."""
    points = ((0, 0, 0), (0.5, 0, 0), (1, 0, 0))
    study = beam({"A": ["y"], "C": ["y"]}, points, bodies=[{"name": "m", "mass": 1.0, "carried_by": "B"}])
    wanted = [2.3831906937, 6.28318530718, 8.23944143247]
    np.testing.assert_allclose(bending(frequencies, cut(study, 24))[:3], wanted, rtol=1e-6)


SPRUNG = {
    10.0: [2.03234135617, 2.76660910601, 4.91338272322, 7.8946892075],
    100.0: [2.87675069401, 4.66378459604, 6.07617114011, 8.27540433615],
    1000.0: [3.11106346888, 6.03706304389, 8.56559445744, 10.6109179627],
}


@pytest.mark.parametrize("stiffness", SPRUNG)
def test_free_beam_on_end_springs(beam, cut, frequencies, stiffness):
    """b^3 (tan(b/2) + tanh(b/2)) = 2 kappa and b^3 (coth(b/2) - cot(b/2)) = 2 kappa; closed form, 1e-6."""
    springs = [{"name": "s", "between": [["A", "ground"], ["ground", "B"]], "stiffness": {"y": stiffness}}]
    found = bending(frequencies, cut(beam({}, springs=springs), 60))
    np.testing.assert_allclose(found[:4], SPRUNG[stiffness], rtol=1e-6)


RODS = {
    "fixed-free": (["x"], [], [PI / 2, 3 * PI / 2, 5 * PI / 2]),
    "fixed-fixed": (["x"], ["x"], [PI, 2 * PI, 3 * PI]),
    "free-free": ([], [], [0.0, PI, 2 * PI, 3 * PI]),
}


@pytest.mark.parametrize("ends", RODS)
@pytest.mark.parametrize("component", ["x", "rx"])
def test_rods_and_shafts(beam, cut, frequencies, ends, component):
    """omega = lambda c / L, c^2 = E/rho or G J/(rho Ip); Blevins (1979) ch. 8.

    Linear pieces are too high by (k h)^2/24, and that law itself is checked.
    """
    start, end, roots = RODS[ends]
    turned = {"A": [component] * bool(start), "B": [component] * bool(end)}
    material = {"youngs_modulus": 4.0, "shear_modulus": 3.0, "density": 2.0}
    section = {"area": 1.0, "second_moment_y": 0.7, "second_moment_z": 0.3, "torsion_constant": 0.6}
    speed = np.sqrt(4.0 / 2.0) if component == "x" else np.sqrt(3.0 * 0.6 / (2.0 * 1.0))
    found = frequencies(cut(beam(turned, material=material, section=section), 80), component) * 2 * PI / speed
    wanted = np.array(roots)
    dispersion = 1 + (wanted / 80) ** 2 / 24
    np.testing.assert_allclose(
        found[: len(roots)], wanted * dispersion, rtol=2e-7, atol=1e-5
    )  # root of round-off


ROD_TIPS = {
    0.1: [0.3110528482, 3.17309717669, 6.2990593599],
    0.5: [0.653271187094, 3.29231002128, 6.36162039207],
    1.0: [0.860333589019, 3.42561845948, 6.43729817917],
    2.0: [1.07687398631, 3.64359716743, 6.57833373272],
    10.0: [1.42887001121, 4.30580141312, 7.22810977163],
    100.0: [1.55524512926, 4.66576514173, 7.77637407785],
}


@pytest.mark.parametrize("ratio", ROD_TIPS)
def test_rod_with_an_end_mass(beam, cut, frequencies, ratio):
    """x tan x = C = rod mass / end mass: Carslaw & Jaeger, Conduction of Heat in Solids (1959), App. IV."""
    material = {"youngs_modulus": 1.0, "poissons_ratio": 0.25, "density": 1.0}
    mass = {"name": "end", "mass": 1 / ratio, "carried_by": "B"}
    found = frequencies(cut(beam({"A": ["x"]}, material=material, bodies=[mass]), 80), "x") * 2 * PI
    np.testing.assert_allclose(found[:3], ROD_TIPS[ratio], rtol=1e-3)
    np.testing.assert_allclose(found[0], ROD_TIPS[ratio][0], rtol=3e-5)


def test_two_discs_on_a_shaft(describe, cut, frequencies):
    """omega = sqrt(k (J1 + J2) / (J1 J2)), Den Hartog, Mechanical Vibrations."""
    discs = [
        {"name": f"disc {point}", "mass": 1.0, "inertia": [size, size, size], "carried_by": point}
        for point, size in (("A", 0.8), ("B", 0.3))
    ]
    study = describe(
        points={"A": [0, 0, 0], "B": [0, 0, 0.5]},
        materials={"massless": {"youngs_modulus": 2e11, "shear_modulus": 8e10, "density": 0.0}},
        sections={
            "shaft": {
                "area": 1e-3,
                "second_moment_y": 1e-7,
                "second_moment_z": 1e-7,
                "torsion_constant": 12000.0 * 0.5 / 8e10,
            }
        },
        members=[{"name": "shaft", "section": "shaft", "material": "massless", "runs": [["A", "B"]]}],
        bodies=discs,
    )
    system = cut(study, 1)
    keep = [i for i, freedom in enumerate(system.freedoms) if freedom.component == "rz"]
    found = frequencies(system, "rz") * 2 * PI
    np.testing.assert_allclose(found, [0.0, 234.520787991], rtol=1e-10, atol=1e-4)
    assert [system.freedoms[i].point for i in keep] == ["disc A", "disc B"]


# B = omega sqrt(m L^4 / EI);
# S. P. Timoshenko, Phil. Mag. 41 (1921) 744; T. C. Huang, J. Appl. Mech. 28 (1961) 579
TIMOSHENKO = {
    ("PP", 20): [9.82812715081, 38.8299089395, 85.6619051081, 148.384635391, 224.779375912],
    ("PP", 5): [9.27403971192, 32.1665009539, 61.4580633042, 93.2594183133, 125.93419049],
    ("CF", 20): [3.50902684658, 21.7345802627, 59.7602533704, 114.19447577, 183.111088772],
    ("CF", 5): [3.40978315251, 18.3637030909, 43.7090820928, 72.5670092598, 103.1929746],
}


@pytest.mark.parametrize(("ends", "slenderness"), TIMOSHENKO)
def test_thick_beams(beam, cut, frequencies, ends, slenderness):
    """Rectangle, nu = 0.3, shear factor 5/6; within 0.1 %, falling at second order or faster."""
    pieces = {20: 64, 5: 128}[slenderness]
    height = 1.0 / slenderness
    material = {"youngs_modulus": 12.0 / height**2, "poissons_ratio": 0.3, "density": 1 / height}
    section = {"shape": "rectangle", "width": 1.0, "height": height}
    held = {"P": ["z"], "C": ["z", "ry"], "F": []}
    study = beam({"A": held[ends[0]], "B": held[ends[1]]}, material=material, section=section)
    scale = np.sqrt(material["youngs_modulus"] * height**3 / 12)  # EI over a mass of one per length
    wanted = np.array(TIMOSHENKO[ends, slenderness])
    coarse, fine = (2 * PI * frequencies(cut(study, n), "z ry")[:5] / scale for n in (pieces // 2, pieces))
    np.testing.assert_allclose(fine, wanted, rtol=1e-3)
    rate = (coarse / wanted - 1) / (fine / wanted - 1)
    # the fourth order of bending or the second order of the shear waves, whichever is larger
    assert (rate > 3.8).all()
    assert (rate < 17).all()
    # and the two together, extrapolated, are exact to the accuracy of the reference
    if slenderness == 5:
        np.testing.assert_allclose(fine + (fine - coarse) / 3, wanted, rtol=1e-5)


def test_effective_mass_of_a_cantilever(beam, cut):
    """(2 sigma / b)^2 of the total: Chopra, Dynamics of Structures; tolerance 1e-4."""
    import scipy.linalg

    system = cut(beam({"A": ["y", "rz", "x", "z", "rx", "ry"]}), 30)
    keep = [i for i, freedom in enumerate(system.freedoms) if freedom.component in ("y", "rz")]
    stiffness, mass = (matrix.toarray()[np.ix_(keep, keep)] for matrix in (system.stiffness, system.mass))
    _, shapes = scipy.linalg.eigh(stiffness, mass)
    carried = system.anatomy.carried[keep, 1]
    share = (shapes.T @ carried) ** 2 / system.anatomy.rigid_mass[1, 1]
    wanted = [0.613076090026, 0.188300361066, 0.0647322316854, 0.0330868902755]
    np.testing.assert_allclose(share[:4], wanted, rtol=1e-4)


@pytest.mark.parametrize("ends", ["CF", "PP"])
def test_error_bars_cover_a_thick_steel_beam(describe, ends):
    """Through the public way: frequencies within their bars of the exact ones, which lie below the accuracy.

    T. C. Huang, J. Appl. Mech. 28 (1961) 579: B = omega sqrt(m L^4 / EI), rectangle, L/h = 20.
    """
    height, length = 0.05, 1.0
    held = {"P": ["x", "y", "z", "rx", "rz"], "C": "all"}
    study = describe(
        points={"A": [0, 0, 0], "B": [length, 0, 0]},
        materials={"steel": {"youngs_modulus": 210e9, "poissons_ratio": 0.3, "density": 7850}},
        sections={"bar": {"shape": "rectangle", "width": 1.5 * height, "height": height}},
        members=[{"name": "bar", "section": "bar", "material": "steel", "runs": [["A", "B"]]}],
        supports=[
            {"at": point, "hold": held[end]} for point, end in zip("AB", ends, strict=True) if end != "F"
        ],
    )
    scale = np.sqrt(210e9 * height**2 / 12 / 7850) / length**2 / (2 * PI)
    modes = study.system().modes(count=8)
    for wanted in np.array(TIMOSHENKO[ends, 20][:2]) * scale:
        nearest = np.argmin(np.abs(modes.frequencies_hz - wanted))
        off = abs(modes.frequencies_hz[nearest] - wanted)
        assert off <= modes.errors_hz[nearest] * (1 + 1e-9)
        assert off <= 0.005 * wanted


def test_a_free_portal_has_six_rigid_modes(describe):
    """Whatever its offsets and hinges: counted and at zero (any text on free structures)."""
    study = describe(
        points={"A": [0, 0, 0], "B": [0, 0, 2], "C": [3, 0.2, 2.1], "D": [3, 0.4, 0]},
        sections={"pipe": {"shape": "circular hollow", "diameter": 0.1, "thickness": 0.005}},
        members=[
            {
                "name": "portal",
                "section": "pipe",
                "material": "steel",
                "runs": [["A", "B", "C", "D"]],
                "offset_start": [0.1, 0, 0],
            }
        ],
        bodies=[
            {"name": "hoist", "mass": 90, "centre": [1, 0, 2.5], "inertia": [2, 3, 4], "carried_by": "B"}
        ],
    )
    modes = study.system().modes(count=8)
    assert modes.rigid_body_count == 6
    assert (modes.frequencies_hz[:6] == 0).all()
    assert modes.frequencies_hz[6] > 1
