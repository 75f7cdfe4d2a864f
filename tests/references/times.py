"""Transition matrices, free decay and pulses."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

import numpy as np

import vib
from tests.references.common import ENTRIES, Check, Entry, covers, matrices_study, study
from tests.references.lumped import damped_two_masses
from vib.response.decay import cycles_to, damping_from_decrement, logarithmic_decrement
from vib.structure import survey

TRANSITION = 1e-10  # relative to the greatest entry


def matrix_checks(what: str, ours: Any, reference: Any) -> Iterator[Check]:
    """The greatest entry, and the greatest difference of any entry as a share of it."""
    reference = np.array([[float(value) for value in row] for row in reference])
    place = np.unravel_index(np.abs(reference).argmax(), reference.shape)
    greatest = float(reference[place])
    yield Check(f"{what}, its greatest entry", float(ours[place]), greatest, TRANSITION)
    apart = float(np.abs(ours - reference).max() / abs(greatest))
    yield Check(f"{what}, greatest difference over that", apart, 0.0, TRANSITION, absolute=True)


@covers("STM-2R", "STM-2C", "STM-3M", "STM-3R", "STM-D2", "STM-D3", "STM-STIFF", "STM-PROP")
def transitions(entry: Entry) -> Iterator[Check]:
    space = vib.StateSpace(A=np.array(entry["inputs"]["A"], float))
    for name, reference in entry["expected"].items():
        time = float(name.removeprefix("Phi(").removeprefix("t=").removesuffix(")"))
        yield from matrix_checks(f"Phi({time:g})", space.transition(time), reference)


@covers("STM-RB")
def rigid_state(entry: Entry) -> Iterator[Check]:
    time = entry["inputs"]["t"]
    damped = vib.StateSpace(A=np.array([[0.0, 1.0], [0.0, -entry["inputs"]["c"]]]))
    yield from matrix_checks(
        f"with a damper, Phi({time:g})", damped.transition(time), entry["expected"]["Phi_damped"]
    )
    free = vib.StateSpace(A=np.array([[0.0, 1.0], [0.0, 0.0]]))
    yield from matrix_checks(f"free, Phi({time:g})", free.transition(time), [[1, time], [0, 1]])


@covers("STM-STEP")
def step(entry: Entry) -> Iterator[Check]:
    """The answer to a constant input is a corner of the transition matrix of the state with the input."""
    matrix = np.zeros((3, 3))
    matrix[:2, :2] = entry["inputs"]["A"]
    matrix[1, 2] = 1.0
    found = vib.StateSpace(A=matrix).transition(entry["inputs"]["t"])[:2, 2]
    for what, ours, value in zip(("x, m", "v, m/s"), found, entry["expected"]["x"], strict=True):
        yield Check(what, float(ours), value, TRANSITION)


@covers("STM-FREE2")
def two_masses_ring(entry: Entry) -> Iterator[Check]:
    rows = np.array(entry["expected"]["rows"])
    given = entry["inputs"]
    found = damped_two_masses().ring(displacement=given["x0"], velocity=given["v0"], times=rows[:, 0])
    for i, (time, *moved) in enumerate(rows):
        for j, value in enumerate(moved):
            yield Check(f"x{j + 1} at {time:g} s, m", float(found.displacement_m[i, j]), value, 1e-8)


@covers("DECAY-LD")
def decrements(entry: Entry) -> Iterator[Check]:
    for ratio, decrement, share in entry["expected"]["rows"]:
        yield Check(f"decrement at {ratio:g}", logarithmic_decrement(ratio) or 0.0, decrement, 1e-11)
        yield Check(f"ratio back from {decrement:.4g}", damping_from_decrement(1.0, share), ratio, 1e-11)


@covers("DECAY-N")
def decrement_over_periods(entry: Entry) -> Iterator[Check]:
    for first, later, periods, _, ratio in entry["expected"]["rows"]:
        found = damping_from_decrement(first, later, int(periods))
        yield Check(f"{first:g} to {later:g} in {periods:g} periods", found, ratio, 1e-10)


@covers("DECAY-HALF")
def cycles_to_half(entry: Entry) -> Iterator[Check]:
    found = cycles_to(0.5, entry["inputs"]["zeta"])
    yield Check("cycles to half", found, entry["expected"]["n_half"], 1e-10)


def one_mass(mass: float, frequency_hz: float, ratio: float) -> vib.System:
    stiffness = mass * (2 * np.pi * frequency_hz) ** 2
    return matrices_study([[mass]], [[stiffness]], extra=f"[damping]\nratio = {ratio}").system()


def _struck(times: Any) -> vib.Ring:
    given = ENTRIES["DECAY-IMP"]["inputs"]
    system = one_mass(given["m"], given["f0"], given["zeta"])
    return system.ring(impulse=f"{given['impulse']} N s", at="1", times=times)


@covers("DECAY-IMP")
def impulse(entry: Entry) -> Iterator[Check]:
    expected = entry["expected"]
    found = _struck(expected["t_extrema"])
    for i, value in enumerate(expected["x_extrema"]):
        yield Check(f"extremum {i + 1}, m", float(found.displacement_m[i, 0]), value, 1e-8)
        speed = float(found.velocity_m_s[i, 0]) / (value * expected["omega_d"])
        yield Check("its velocity over omega x", speed, 0.0, 1e-8, absolute=True)
    peak = next(peak for peak in found.peaks if peak.quantity == "displacement")
    yield Check("greatest displacement, m", peak.value, expected["x_extrema"][0], 1e-8)
    yield Check("its time, s", peak.time_s, expected["t_extrema"][0], 1e-6)


@covers("DECAY-ENV")
def envelope(entry: Entry) -> Iterator[Check]:
    expected = entry["expected"]
    found = _struck([expected["t_touch_first"]])
    yield Check("envelope, m", float(found.envelope_m[0, 0]), expected["envelope_there"], 1e-8)
    yield Check("displacement, m", float(found.displacement_m[0, 0]), expected["envelope_there"], 1e-8)


@covers("DECAY-REL")
def release(entry: Entry) -> Iterator[Check]:
    ratio = entry["inputs"]["zeta"]
    half = 0.5 / (5.0 * np.sqrt(1 - ratio**2))
    found = one_mass(2.0, 5.0, ratio).ring(displacement="4 mm", at="1", times=half * np.arange(1, 4))
    for i, value in enumerate(entry["expected"]["x_over_x0_at_k1_2_3"]):
        yield Check(
            f"x / x0 after {i + 1} half periods", float(found.displacement_m[i, 0]) / 4e-3, value, 1e-8
        )


@covers("SHOCK-HS")
def half_sine(entry: Entry) -> Iterator[Check]:
    system = one_mass(1.0, 10.0, 0.0)
    stiffness = (2 * np.pi * 10.0) ** 2
    for share, greatest, _, residual in entry["expected"]["rows"]:
        length = share / 10.0
        found = system.ring(pulse=(1.0, length), at="1", duration=length + 0.5)
        peak = next(peak for peak in found.peaks if peak.quantity == "displacement")
        yield Check(f"td/T = {share:g}, greatest", abs(peak.value) * stiffness, greatest, 1e-6)
        after = system.ring(pulse=(1.0, length), at="1", times=[length + 0.01])
        size = stiffness * np.hypot(after.displacement_m[0, 0], after.velocity_m_s[0, 0] / np.sqrt(stiffness))
        yield Check(f"td/T = {share:g}, residual", float(size), residual, 1e-6, absolute=True)


@covers("ISOL-STAT")
def static_deflection(entry: Entry) -> Iterator[Check]:
    """A mass sags on its spring as the table says for its natural frequency."""
    for sag_mm, frequency in entry["expected"]["rows"]:
        stiffness = 50.0 * (2 * np.pi * frequency) ** 2
        built = study(
            f"""
[units]
length = "m"
[points]
p = [0, 0, 0]
[[bodies]]
name = "m"
mass = "50 kg"
carried_by = "p"
[[supports]]
at = "p"
hold = ["x", "y", "rx", "ry", "rz"]
[[springs]]
between = ["p", "ground"]
stiffness = {{ z = "{stiffness} N/m" }}
"""
        )
        sag = survey(built).sag
        assert sag is not None
        yield Check(f"sag at {frequency:.4g} Hz, mm", 1e3 * sag.greatest_m, sag_mm, 1e-8)
