"""Lumped systems: chains, rings, blocks, rotors, and damped systems, mostly entered as matrices."""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from typing import Any

import numpy as np

import vib
from tests.references.common import ENTRIES, Check, Entry, chain, covers, matrices_study, study

TWO_MASSES = ENTRIES["MDOF-2"]["inputs"]


def two_masses() -> tuple[Any, Any]:
    given = TWO_MASSES
    return chain([given["m1"], given["m2"]], [given["k1"], given["k2"]], last=given["k3"])


def omegas(modes: vib.Modes, expected: Iterable[float], tolerance: float, label: str = "") -> Iterator[Check]:
    """All circular frequencies beside the expected ones; zeros are rigid-body modes."""
    expected = list(expected)
    assert modes.count == len(expected)
    assert modes.rigid_body_count == expected.count(0.0)
    for i, value in enumerate(expected):
        what = f"{label}omega {i + 1}, rad/s"
        ours = 2 * np.pi * float(modes.frequencies_hz[i])
        yield Check(what, ours, value, tolerance if value else 0.0, absolute=not value)


def eigenvalues(
    modes: vib.Modes, expected: Iterable[Any], tolerance: float, label: str = ""
) -> Iterator[Check]:
    """All eigenvalues with an imaginary part of zero or more, by size."""
    numbers = [complex(*pair) if isinstance(pair, list) else complex(pair) for pair in expected]
    upper = sorted((value for value in numbers if value.imag >= 0), key=lambda v: (abs(v), v.imag))
    ours = sorted(modes.eigenvalues, key=lambda v: (abs(v), v.imag))
    assert len(ours) == len(upper)
    for i, (value, reference) in enumerate(zip(ours, upper, strict=True)):
        yield Check(f"{label}eigenvalue {i + 1}, 1/s", complex(value), reference, tolerance)


@covers("MDOF-CHAIN-FREE", "MDOF-CHAIN-FIX")
def equal_chains(entry: Entry) -> Iterator[Check]:
    """Bodies on springs along x, the way a user would draw them."""
    for name, expected in entry["expected"].items():
        size = len(expected)
        points = "\n".join(f"p{i} = [{i}, 0, 0]" for i in range(size))
        bodies = "\n".join(
            f'[[bodies]]\nname = "m{i}"\nmass = "1 kg"\ncarried_by = "p{i}"' for i in range(size)
        )
        pairs = [["ground", "p0"], *([f"p{i}", f"p{i + 1}"] for i in range(size - 1))]
        if entry["id"].endswith("FIX"):
            pairs.append([f"p{size - 1}", "ground"])
        text = f"""
[units]
length = "m"
[points]
{points}
{bodies}
[[supports]]
at = {[f"p{i}" for i in range(size)]}
hold = ["y", "z", "rx", "ry", "rz"]
[[springs]]
between = {pairs}
stiffness = {{ x = "1 N/m" }}
"""
        yield from omegas(study(text).system().modes(), expected, 1e-11, f"{name.removeprefix('omega_')}: ")


@covers("MDOF-2")
def two_mass_chain(entry: Entry) -> Iterator[Check]:
    modes = matrices_study(*two_masses()).system().modes()
    yield from omegas(modes, entry["expected"]["omega"], 1e-10)
    for i, ratio in enumerate(entry["expected"]["x2_over_x1"]):
        yield Check(f"x2 / x1 of mode {i + 1}", modes.shapes[1, i] / modes.shapes[0, i], ratio, 1e-10)


def rayleigh_rows(alpha: float, beta: float) -> str:
    """Two points of the curve, as a study file states them."""
    rows = [[f"{f} Hz", float(alpha / (4 * np.pi * f) + beta * np.pi * f)] for f in (4.0, 9.0)]
    return f"[damping]\nrayleigh = {rows}"


def damped_two_masses() -> vib.System:
    given = ENTRIES["MDOF-RAYL"]["inputs"]
    return matrices_study(*two_masses(), extra=rayleigh_rows(given["alpha"], given["beta"])).system()


@covers("MDOF-RAYL")
def rayleigh(entry: Entry) -> Iterator[Check]:
    modes = damped_two_masses().modes()
    for i, ratio in enumerate(entry["expected"]["zeta"]):
        yield Check(f"damping ratio {i + 1}", float(modes.damping_ratios[i]), ratio, 1e-9)
    yield from eigenvalues(modes, entry["expected"]["poles_upper"], 1e-9)


@covers("MDOF-RAYLFIT")
def rayleigh_fit(entry: Entry) -> Iterator[Check]:
    """Alpha and beta from the damping matrix of two uncoupled masses: alpha + beta k / m on the diagonal."""
    given = entry["inputs"]
    rows = [[f"{given['f1']} Hz", given["zeta1"]], [f"{given['f2']} Hz", given["zeta2"]]]
    system = matrices_study(np.eye(2), np.diag([1.0, 1e5]), extra=f"[damping]\nrayleigh = {rows}").system()
    assert system.damping is not None
    damping = system.damping.toarray() if hasattr(system.damping, "toarray") else system.damping
    beta = (damping[1, 1] - damping[0, 0]) / (1e5 - 1.0)
    yield Check("beta, s", float(beta), entry["expected"]["beta"], 1e-9)
    yield Check("alpha, 1/s", float(damping[0, 0] - beta), entry["expected"]["alpha"], 1e-9)


@covers("MDOF-NP1", "MDOF-NP2", "MDOF-NP3", "MDOF-OD2", "QEP-SCALE")
def damped(entry: Entry) -> Iterator[Check]:
    given = entry["inputs"]
    modes = matrices_study(given["M"], given["K"], damping=given["C"]).system().modes()
    yield from eigenvalues(modes, entry["expected"]["eigenvalues"], 1e-9)
    for i, ratio in enumerate(entry["expected"].get("zeta", [])):
        yield Check(f"damping ratio {i + 1}", float(modes.damping_ratios[i]), ratio, 1e-9)


@covers("MDOF-OD1")
def overdamped(entry: Entry) -> Iterator[Check]:
    given = entry["inputs"]
    modes = matrices_study([[given["m"]]], [[given["k"]]], damping=[[given["c"]]]).system().modes()
    yield from eigenvalues(modes, entry["expected"]["poles"], 1e-10)
    assert (modes.damping_ratios == 1).all()


@covers("QEP-CHAIN-5-3")
def damped_chain(entry: Entry) -> Iterator[Check]:
    given = entry["inputs"]
    size = given["n"]
    tri = 3 * np.eye(size) - np.eye(size, k=1) - np.eye(size, k=-1)
    found = matrices_study(np.eye(size), given["kappa"] * tri, damping=given["tau"] * tri).system().modes()
    yield from eigenvalues(found, entry["expected"]["eigenvalues"], 1e-9)


@covers("ROT-TILT")
def tilting_rotor(entry: Entry) -> Iterator[Check]:
    given = entry["inputs"]
    for gamma, speed, forward, backward in entry["expected"]["rows"]:
        coupling = gamma * given["It"] * speed
        modes = matrices_study(
            given["It"] * np.eye(2),
            given["k_t"] * np.eye(2),
            gyroscopic=[[0, coupling], [-coupling, 0]],
        )
        yield from omegas(
            modes.system().modes(), sorted((forward, backward)), 1e-9, f"gamma = {gamma:g}, {speed:g} rad/s: "
        )


def _rotor(mass: float, tilt: float, polar: float, speed: float, stiffness: Any) -> vib.Study:
    """Freedoms x, turn about y; y, turn about x, with the gyroscopic moment between the turns."""
    coupling = np.zeros((4, 4))
    coupling[1, 3], coupling[3, 1] = polar * speed, -polar * speed
    whole = np.kron(np.eye(2), stiffness)
    return matrices_study(np.diag([mass, tilt, mass, tilt]), whole, gyroscopic=coupling)


@covers("ROT-RIGID")
def rigid_rotor(entry: Entry) -> Iterator[Check]:
    g = entry["inputs"]
    k12 = g["k2"] * g["b"] - g["k1"] * g["a"]
    stiffness = [[g["k1"] + g["k2"], k12], [k12, g["k1"] * g["a"] ** 2 + g["k2"] * g["b"] ** 2]]
    rotor = _rotor(g["m"], g["It"], g["Ip"], g["Omega"], stiffness)
    yield from omegas(rotor.system().modes(), sorted(map(abs, entry["expected"]["omega_signed"])), 1e-8)


@covers("ROT-OVH")
def overhung_disc(entry: Entry) -> Iterator[Check]:
    g = entry["inputs"]
    bending = g["E"] * np.pi * g["d"] ** 4 / 64
    length = g["L"]
    stiffness = [
        [12 * bending / length**3, -6 * bending / length**2],
        [-6 * bending / length**2, 4 * bending / length],
    ]
    for speed, *signed in entry["expected"]["rows"]:
        rotor = _rotor(g["m"], g["It"], g["Ip"], speed, stiffness)
        yield from omegas(rotor.system().modes(), sorted(map(abs, signed)), 1e-8, f"{speed:g} rad/s: ")


@covers("ROT-INT")
def internal_damping(entry: Entry) -> Iterator[Check]:
    g = entry["inputs"]
    for speed, *parts in entry["expected"]["rows"]:
        cross = 2 * g["zr"] * g["w0"] * speed
        built = matrices_study(
            np.eye(2),
            [[g["w0"] ** 2, cross], [-cross, g["w0"] ** 2]],
            damping=2 * (g["zn"] + g["zr"]) * g["w0"] * np.eye(2),
            extra="unsymmetric = true",
        )
        modes = built.system().modes()
        pairs = [[parts[0], abs(parts[1])], [parts[2], abs(parts[3])]]
        if speed != entry["expected"]["threshold"]:
            assert modes.stable == (speed < entry["expected"]["threshold"])
        yield from eigenvalues(modes, pairs, 1e-8, f"{speed:g} rad/s: ")


@covers("MDOF-FF3", "MDOF-FFN")
def free_chains(entry: Entry) -> Iterator[Check]:
    given, expected = entry["inputs"], entry["expected"]["omega"]
    masses = given.get("m", [1.0] * len(expected))
    springs = given.get("k", [1.0] * (len(expected) - 1))
    modes = matrices_study(*chain(masses, [0.0, *springs])).system().modes()
    yield from omegas(modes, expected, 1e-10)


@covers("MDOF-RING")
def rings(entry: Entry) -> Iterator[Check]:
    for name, squares in entry["expected"].items():
        size = len(squares)
        shift = np.roll(np.eye(size), 1, axis=0)
        modes = matrices_study(np.eye(size), 2 * np.eye(size) - shift - shift.T).system().modes()
        yield from omegas(modes, np.sqrt(squares).tolist(), 1e-10, f"{name.removeprefix('omega2_')}: ")


@covers("MDOF-INT")
def integer_chain(entry: Entry) -> Iterator[Check]:
    size = entry["inputs"]["n"]
    masses, springs = 1 / np.arange(1.0, size + 1), np.arange(size, 0, -1.0)
    modes = matrices_study(*chain(masses, springs)).system().modes()
    yield from omegas(modes, entry["expected"]["omega"], 1e-11)


@covers("TEXT-1")
def two_storeys(entry: Entry) -> Iterator[Check]:
    given = entry["inputs"]
    modes = matrices_study(*chain(given["m"], given["k"])).system().modes()
    yield from omegas(modes, entry["expected"]["omega"], 1e-10)
    for i, shape in enumerate(entry["expected"]["shapes"]):
        yield Check(f"x1 / x2 of mode {i + 1}", modes.shapes[0, i] / modes.shapes[1, i], shape[0], 1e-10)


@covers("TEXT-2")
def three_storeys(entry: Entry) -> Iterator[Check]:
    """In kip and inch; the freedoms run from the top down, the last storey stands on the ground."""
    given = entry["inputs"]
    mass, stiffness = chain(given["m"], [0.0, *given["k"][:2]], last=given["k"][2])
    text = f"""
[units]
mass = "kip s^2/inch"
stiffness = "kip/inch"
[matrices]
mass = {mass.tolist()}
stiffness = {stiffness.tolist()}
"""
    modes = study(text).system().modes()
    yield from omegas(modes, entry["expected"]["omega"], 1e-8)
    for i, value in enumerate(entry["expected"]["shape1"]):
        yield Check(f"shape 1, freedom {i + 1}", modes.shapes[i, 0] / modes.shapes[0, 0], value, 1e-5)


@covers("MDOF-BLOCK")
def block_on_springs(entry: Entry) -> Iterator[Check]:
    given, expected = entry["inputs"], entry["expected"]
    corners = {
        f"c{i}": (x, y, -0.3) for i, (x, y) in enumerate(((0.5, 0.3), (-0.5, 0.3), (0.5, -0.3), (-0.5, -0.3)))
    }
    points = "\n".join(f"{name} = {list(at)}" for name, at in corners.items())
    text = f"""
[units]
length = "m"
[points]
{points}
[[bodies]]
name = "block"
mass = "{given["m"]} kg"
centre = [0, 0, 0]
inertia = {[f"{j} kg m^2" for j in expected["J"]]}
carried_by = {list(corners)}
[[springs]]
between = {[[name, "ground"] for name in corners]}
stiffness = {{ x = "{given["k_x = k_y"]} N/m", y = "{given["k_x = k_y"]} N/m", z = "{given["k_z"]} N/m" }}
"""
    modes = study(text).system().modes()
    along = {
        "f_heave": "z", "f_yaw": "rz", "f_x_sway_pitch": "x", "f_y_sway_roll": "y",
    }  # fmt: skip
    for name, component in along.items():
        values = expected[name] if isinstance(expected[name], list) else [expected[name]]
        moved = np.abs(modes.system.direction("block", component) @ modes.shapes)
        found = np.flatnonzero(moved > 1e-6 * moved.max())
        assert len(found) == len(values)
        for i, value in zip(found, values, strict=True):
            yield Check(
                f"{name.removeprefix('f_').replace('_', ' ')}, Hz", modes.frequencies_hz[i], value, 1e-9
            )


@covers("MAC-2")
def assurance(entry: Entry) -> Iterator[Check]:
    modes = matrices_study(*two_masses()).system().modes()
    yield Check("between mode 1 and 2", float(modes.assurance(modes)[0, 1]), entry["expected"]["MAC12"], 1e-9)


@covers("EFFM-1")
def effective_mass(entry: Entry) -> Iterator[Check]:
    modes = matrices_study(*two_masses()).system().modes()
    found = modes.effective_mass_along([1.0, 1.0])
    for i, value in enumerate(entry["expected"]["m_eff"]):
        yield Check(f"effective mass {i + 1}, kg", float(found[i]), value, 1e-9)
    yield Check("sum, kg", float(found.sum()), entry["expected"]["sum"], 1e-10)
