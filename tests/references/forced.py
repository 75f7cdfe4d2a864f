"""Forced vibration: frequency response, shocks, unbalance, isolation, and conversions of harmonic motion."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

import vib
from tests.references.common import Check, Entry, covers, study
from tests.references.lumped import damped_two_masses, two_masses
from tests.references.times import one_mass
from vib.response.loads import Load
from vib.response.signals import Constant, Harmonic

NATURAL_HZ = 5.0
STIFFNESS = (2 * np.pi * NATURAL_HZ) ** 2  # of 1 kg


def at_ratios(ratios: list[float], damping_ratio: float) -> vib.FrequencyResponse:
    """Receptance of 1 kg at these multiples of its natural frequency."""
    return one_mass(1.0, NATURAL_HZ, damping_ratio).frequency_response(lines_hz=NATURAL_HZ * np.array(ratios))


def mounted(
    damping_ratio: float, extra: str = "", mass: float = 1.0, natural_hz: float = NATURAL_HZ
) -> vib.Study:
    """A mass (1 kg) on a vertical spring and dashpot, as a structure with a ground."""
    omega = 2 * np.pi * natural_hz
    constant = 2 * damping_ratio * omega * mass
    dashpot = f'dashpot = {{ z = "{float(constant)!r} N s/m" }}' if damping_ratio else ""
    return study(
        f"""
[points]
p = ["0 m", "0 m", "0 m"]
[[bodies]]
name = "m"
mass = "{mass} kg"
carried_by = "p"
[[supports]]
at = "p"
hold = ["x", "y", "rx", "ry", "rz"]
[[springs]]
between = ["p", "ground"]
stiffness = {{ z = "{float(omega**2 * mass)!r} N/m" }}
{dashpot}
{extra}
"""
    )


@covers("FRF-2")
def receptance(entry: Entry) -> Iterator[Check]:
    line = entry["inputs"]["omega"] / (2 * np.pi)
    found = damped_two_masses().frequency_response(lines_hz=[line])
    places = {"H11": (0, 0), "H12": (0, 1), "H22": (1, 1)}
    expected = {name: complex(*value[0]) for name, value in entry["expected"].items()}
    for name, place in places.items():
        yield Check(f"{name}, m/N", complex(found.receptance[0][place]), expected[name], 1e-10)
    yield Check("mobility 11", complex(found.mobility[0, 0, 0]), expected["mobility11"], 1e-10)
    yield Check("accelerance 11", complex(found.accelerance[0, 0, 0]), expected["accelerance11"], 1e-10)


@covers("FRF-ANTI")
def antiresonance(entry: Entry) -> Iterator[Check]:
    mass, stiffness = two_masses()
    system = vib.System(mass=mass, stiffness=stiffness)
    found = system.state_space(inputs=["1"], outputs=["1"]).zeros()
    omega = entry["expected"]["omega"]
    yield Check("transmission zero, rad/s", float(found[-1].imag), omega, 1e-10)
    beside = system.frequency_response(lines_hz=[0.0, omega / (2 * np.pi)]).receptance[:, 0, 0]
    yield Check("H11 there over H11 at 0 Hz", complex(beside[1] / beside[0]), 0.0, 1e-10, absolute=True)


@covers("SHOCK-RECT")
def rectangular_pulse(entry: Entry) -> Iterator[Check]:
    for length, factor in entry["expected"]["rows"]:
        period = 1 / NATURAL_HZ
        load = Load(Constant(STIFFNESS, 0.0, length * period), "1")
        # a step that meets the end of the pulse and every quarter of a period
        found = one_mass(1.0, NATURAL_HZ, 0.0).respond(
            loads=[load], duration_s=3 * period, step_s=period / 4000
        )
        yield Check(f"td/T = {length:g}", abs(found.extremes[0].value), factor, 1e-6)


@covers("FORCED-RES")
def build_up(entry: Entry) -> Iterator[Check]:
    time = entry["inputs"]["w t"] / (2 * np.pi * NATURAL_HZ)
    load = Load(Harmonic(STIFFNESS, NATURAL_HZ), "1")
    found = one_mass(1.0, NATURAL_HZ, 0.0).respond(loads=[load], duration_s=time, step_s=time / 10)
    yield Check(
        "x k / F0 at resonance", float(found.displacement_m[-1, 0]), entry["expected"]["x_k_over_F0"], 1e-9
    )
    for cycles, share in entry["expected"]["rows"]:
        found = one_mass(1.0, NATURAL_HZ, 0.01).respond(
            loads=[load], duration_s=cycles / NATURAL_HZ, step_s=0.01 / NATURAL_HZ
        )
        steady = abs(found.steady[0].amplitude[0])
        last = float(np.abs(found.displacement_m[-101:, 0]).max())
        yield Check(f"build-up after {cycles:g} cycles", last / steady, share, 0.01, absolute=True)


@covers("FORCED-PEAK")
def peaks(entry: Entry) -> Iterator[Check]:
    ratio, expected = entry["inputs"]["zeta"], entry["expected"]
    for name in ("force", "unbalance", "transmissibility"):
        place = expected[f"r_{name}"]
        top = f"peak_{name}" if name == "transmissibility" else f"peak_{name}_factor"
        near = place + 1e-4 * np.arange(-1.0, 2.0)
        if name == "transmissibility":
            found = (
                mounted(ratio)
                .system()
                .frequency_response(lines_hz=NATURAL_HZ * near, outputs=[("m", "z")], ground=["z"])
            )
            sizes = np.abs(found.receptance[:, 0, 0])
        else:
            found = at_ratios(near.tolist(), ratio)
            kind = found.receptance * STIFFNESS if name == "force" else found.accelerance
            sizes = np.abs(kind[:, 0, 0])
        yield Check(
            f"peak, {name}",
            float(sizes[1]),
            expected[top],
            1e-9,
        )
        # the vertex of the parabola through three close lines
        bend = sizes[0] - 2 * sizes[1] + sizes[2]
        vertex = place + 1e-4 * (sizes[0] - sizes[2]) / (2 * bend)
        yield Check(f"its place, {name}", float(vertex), place, 1e-7)
    yield Check(
        "factor at r = 1",
        float(abs(at_ratios([1.0], ratio).receptance[0, 0, 0]) * STIFFNESS),
        expected["factor_at_r1"],
        1e-10,
    )


@covers("FORCED-UNB")
def unbalance(entry: Entry) -> Iterator[Check]:
    rows = entry["expected"]["rows"]
    found = at_ratios([row[0] for row in rows], entry["inputs"]["zeta"])
    for line, (ratio, factor, lag) in enumerate(rows):
        # unit m e / M: a force w^2, and so the receptance times w^2
        motion = -found.accelerance[line, 0, 0]
        yield Check(f"r = {ratio:g}, factor", float(abs(motion)), factor, 1e-10)
        yield Check(f"r = {ratio:g}, lag, deg", float(-np.degrees(np.angle(motion))), lag, 1e-9)
    driven = '[[excitations]]\nspeed = "300 rpm"\nat = "m"\nunbalance = { along = "z", amount = "1 kg m" }'
    run = vib.run_up(
        mounted(entry["inputs"]["zeta"], driven), speeds_hz=[NATURAL_HZ * row[0] for row in rows]
    )
    for motion, (ratio, factor, lag) in zip(run.displacement_m[:, 0, 0].tolist(), rows, strict=True):
        yield Check(f"r = {ratio:g}, factor, by run-up", abs(motion), factor, 1e-10)
        yield Check(f"r = {ratio:g}, lag, deg, by run-up", float(-np.degrees(np.angle(motion))), lag, 1e-9)


@covers("FORCED-HP")
def half_power(entry: Entry) -> Iterator[Check]:
    for ratio, low, high, *_ in entry["expected"]["rows"]:
        top = np.sqrt(1 - 2 * ratio**2)
        sizes = np.abs(at_ratios([low, top, high], ratio).receptance[:, 0, 0])
        for name, size in (("lower", sizes[0]), ("upper", sizes[2])):
            yield Check(
                f"zeta = {ratio:g}, {name} point over peak", float(size / sizes[1]), np.sqrt(0.5), 1e-9
            )


@covers("ISOL-T")
def transmissibility(entry: Entry) -> Iterator[Check]:
    rows = entry["expected"]["rows"]
    for column, ratio in enumerate((0.0, 0.05, 0.1, 0.2), 1):
        finite = [row for row in rows if not isinstance(row[column], str)]
        found = (
            mounted(ratio)
            .system()
            .frequency_response(
                lines_hz=NATURAL_HZ * np.array([row[0] for row in finite]),
                outputs=[("m", "z")],
                ground=["z"],
            )
        )
        for line, row in enumerate(finite):
            what = f"zeta = {ratio:g}, r = {row[0]:g}"
            yield Check(what, float(abs(found.receptance[line, 0, 0])), row[column], 1e-9)


@covers("ISOL-REQ")
def required_ratio(entry: Entry) -> Iterator[Check]:
    (ratios,) = entry["expected"].values()
    found = (
        mounted(0.0)
        .system()
        .frequency_response(lines_hz=NATURAL_HZ * np.array(ratios), outputs=[("m", "z")], ground=["z"])
    )
    for line, wanted in enumerate((0.5, 0.2, 0.1, 0.05)):
        yield Check(f"r = {ratios[line]:.6g}", float(abs(found.receptance[line, 0, 0])), wanted, 1e-9)


@covers("ISOL-EX")
def transmitted_force(entry: Entry) -> Iterator[Check]:
    """What spring and dashpot pass on to the ground, from the motion that the unbalance makes."""
    given, expected = entry["inputs"], entry["expected"]
    omega, mass, ratio = 2 * np.pi * given["speed"] / 60, given["m"], given["zeta"]
    natural = np.sqrt(9.80665 / (1e-3 * given["delta"]))
    system = one_mass(mass, float(natural / (2 * np.pi)), ratio)
    yield Check("natural frequency, Hz", float(system.modes().frequencies_hz[0]), expected["f_n"], 1e-9)
    force = given["m_u e"] * omega**2
    motion = force * system.frequency_response(lines_hz=[omega / (2 * np.pi)]).receptance[0, 0, 0]
    passed = (mass * natural**2 + 1j * omega * 2 * ratio * natural * mass) * motion
    yield Check("unbalance force, N", float(force), expected["F0"], 1e-9)
    yield Check("transmitted force, N", float(abs(passed)), expected["F_transmitted"], 1e-8)
    speed = 1e3 * omega * abs(motion) / np.sqrt(2)
    yield Check("velocity rms, mm/s", float(speed), expected["v_rms_machine"], 1e-8)
    driven = (
        f'[[excitations]]\nspeed = "{given["speed"]} rpm"\nat = "m"\n'
        f'unbalance = {{ along = "z", amount = "{given["m_u e"]} kg m" }}'
    )
    run = vib.run_up(
        mounted(ratio, driven, mass, float(natural / (2 * np.pi))), speeds_hz=[given["speed"] / 60]
    )
    assert run.transmitted is not None
    passed = run.transmitted.force_n[0, 0, run.transmitted.names.index("spring 1 p z")]
    yield Check("transmitted force, by run-up, N", float(abs(passed)), expected["F_transmitted"], 1e-8)
    speed = 1e3 * run.velocity_rms_m_s[0, 0]
    yield Check("velocity rms, by run-up, mm/s", float(speed), expected["v_rms_machine"], 1e-8)


@covers("SEV-CONV")
def conversions(entry: Entry) -> Iterator[Check]:
    """A harmonic motion of known peak-to-peak displacement, its velocity and acceleration from a record."""
    given, expected = entry["inputs"], entry["expected"]
    line, amplitude = given["f"], 0.5e-6 * given["x_pp"]
    system = one_mass(1.0, NATURAL_HZ, 0.05)
    force = amplitude / abs(system.frequency_response(lines_hz=[line]).receptance[0, 0, 0])
    # long after the start only the steady part is left: exp(-0.05 w 40 s) = 1e-27
    found = system.respond(
        loads=[Load(Harmonic(float(force), line), "1")], duration_s=40.0, step_s=1 / (40 * line)
    )
    last = slice(-40, None)  # one whole cycle
    speed, jerk = found.velocity_m_s[last, 0], found.acceleration_m_s2[last, 0]
    yield Check("v rms, mm/s", 1e3 * float(np.sqrt(np.mean(speed**2))), expected["v_rms"], 1e-8)
    yield Check("a rms, m/s^2", float(np.sqrt(np.mean(jerk**2))), expected["a_rms"], 1e-8)
    yield Check("v peak, mm/s", 1e3 * float(np.sqrt(2 * np.mean(speed**2))), expected["v_peak"], 1e-8)
