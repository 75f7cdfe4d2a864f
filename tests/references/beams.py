"""Beams and rods: the closed forms of continuous members against members cut into pieces."""

from __future__ import annotations

from collections.abc import Iterable, Iterator

import numpy as np

import vib
from tests.references.common import (
    CLOSED_FORM,
    ENTRIES,
    Check,
    Entry,
    covers,
    frequency_checks,
    picked,
    study,
)

BENDING = ("z", "ry")
E, DENSITY, AREA = 210e9, 7850.0, 1e-2
# a radius of gyration of 1e-4 of the length: rotary inertia, which Euler and Bernoulli leave out, is 1e-6
SECOND_MOMENT = 1e-10
# little of both, so that few bending modes lie below the axial and the torsional ones
ROD_AREA, ROD_TORSION = 1e-6, SECOND_MOMENT / 25
EI, LINE = E * SECOND_MOMENT, DENSITY * AREA

_CLAMPED, _PINNED = ["z", "ry"], ["z"]
ENDS: dict[str, list[str]] = {"C": _CLAMPED, "P": _PINNED, "F": [], "S": ["ry"]}
_OTHER_PLANE = ["x", "y", "rx", "rz"]  # held at the first point, so that only bending in x-z can be rigid


def beam_text(
    stations: dict[str, float],
    holds: dict[str, list[str]],
    *,
    section: str = "",
    more: str = "",
    accuracy: float = 5e-4,
    density: float = DENSITY,
) -> str:
    """A study of a beam along x through named stations; the first one also holds what is not looked at."""
    first, *_ = stations
    section = section or (
        f"area = {AREA}\nsecond_moment_y = {SECOND_MOMENT}\nsecond_moment_z = {4 * SECOND_MOMENT}\n"
        f"torsion_constant = {SECOND_MOMENT}\n"
    )
    held = {first: list(_OTHER_PLANE)}
    for name, components in holds.items():
        held[name] = held.get(name, []) + components
    points = "\n".join(f"{name} = [{x}, 0, 0]" for name, x in stations.items())
    supports = "\n".join(f'[[supports]]\nat = "{name}"\nhold = {hold}' for name, hold in held.items() if hold)
    return f"""
accuracy = {accuracy}
[units]
length = "m"
[materials.m]
youngs_modulus = "{E} Pa"
poissons_ratio = 0.3
density = "{density} kg/m^3"
[sections.s]
{section}
[points]
{points}
[[members]]
section = "s"
material = "m"
runs = [{list(stations)}]
{supports}
{more}
"""


def solved(text: str, highest_hz: float) -> vib.Modes:
    """Modes up to a little above the highest frequency expected."""
    return study(text).system(up_to=1.02 * highest_hz).modes(up_to=1.02 * highest_hz)


def hz(b: Iterable[float]) -> list[float]:
    """Frequencies of a beam of 1 m with these roots b = beta L."""
    return [value**2 * float(np.sqrt(EI / LINE)) / (2 * np.pi) for value in b]


@covers(*(f"BEAM-{ends}" for ends in ("CF", "PP", "CC", "FF", "CP", "FP", "CS", "FS", "PS", "SS")))
def single_span(entry: Entry) -> Iterator[Check]:
    ends = entry["id"].removeprefix("BEAM-")
    expected = hz(entry["expected"]["b"])
    modes = solved(beam_text({"A": 0, "B": 1}, {"A": ENDS[ends[0]], "B": ENDS[ends[1]]}), expected[-1])
    rigid = entry["expected"]["rigid_modes"]
    yield Check("rigid-body modes", modes.rigid_body_count, rigid, 0.0, absolute=True)
    yield from frequency_checks(modes, BENDING, expected)


@covers("BEAM-EX1")
def flat_cantilever(entry: Entry) -> Iterator[Check]:
    given = entry["inputs"]
    area, second = given["width"] * given["thickness"], given["width"] * given["thickness"] ** 3 / 12
    # Euler-Bernoulli: the same EI and mass per metre with 10^4 times the area has no rotary inertia
    section = (
        f"area = {area * 1e4}\nsecond_moment_y = {second}\nsecond_moment_z = {9 * second}\n"
        f"torsion_constant = {second}"
    )
    text = beam_text({"A": 0, "B": given["L"]}, {"A": _CLAMPED}, section=section, density=given["rho"] * 1e-4)
    expected = entry["expected"]["f"]
    yield from frequency_checks(solved(text, expected[-1]), BENDING, expected)


@covers("BEAM-2SPAN")
def two_spans(entry: Entry) -> Iterator[Check]:
    expected = hz(entry["expected"]["b"])
    text = beam_text({"A": 0, "M": 1, "B": 2}, {"A": _PINNED, "M": _PINNED, "B": _PINNED})
    yield from frequency_checks(solved(text, expected[-1]), BENDING, expected)


def _body(point: str, mass: float, inertia: float = 0.0) -> str:
    return (
        f'[[bodies]]\nname = "mass"\nmass = "{mass} kg"\ncarried_by = "{point}"\n'
        f'inertia = ["{inertia} kg m^2", "{inertia} kg m^2", "{inertia} kg m^2"]\n'
    )


@covers("BEAM-TIP")
def tip_mass(entry: Entry) -> Iterator[Check]:
    for ratio, *roots in entry["expected"]["rows"][::2]:  # every other ratio, for the sake of time
        text = beam_text({"A": 0, "B": 1}, {"A": _CLAMPED}, more=_body("B", ratio * LINE))
        yield from frequency_checks(solved(text, hz(roots)[-1]), BENDING, hz(roots), f"mu = {ratio:g}, mode")


@covers("BEAM-TIPJ")
def tip_inertia(entry: Entry) -> Iterator[Check]:
    given, expected = entry["inputs"], hz(entry["expected"]["b"])
    body = _body("B", given["mu"] * LINE, given["j"] * LINE)
    yield from frequency_checks(
        solved(beam_text({"A": 0, "B": 1}, {"A": _CLAMPED}, more=body), expected[-1]), BENDING, expected
    )


@covers("BEAM-MIDM")
def mass_at_midspan(entry: Entry) -> Iterator[Check]:
    expected = hz(entry["expected"]["b"])
    body = _body("M", entry["inputs"]["mu"] * LINE)
    text = beam_text({"A": 0, "M": 0.5, "B": 1}, {"A": _PINNED, "B": _PINNED}, more=body)
    yield from frequency_checks(solved(text, expected[-1]), BENDING, expected)


@covers("BEAM-SPR")
def end_springs(entry: Entry) -> Iterator[Check]:
    for stiffness, *roots in entry["expected"]["rows"]:
        springs = (
            '[[springs]]\nbetween = [["A", "ground"], ["B", "ground"]]\n'
            f'stiffness = {{ z = "{stiffness * EI} N/m" }}\n'
        )
        modes = solved(beam_text({"A": 0, "B": 1}, {}, more=springs), hz(roots)[-1])
        yield from frequency_checks(modes, BENDING, hz(roots), f"kappa = {stiffness:g}, mode")


def rod_speeds() -> dict[str, float]:
    """Speed of axial and of torsional waves, m/s."""
    polar = 5 * SECOND_MOMENT
    return {
        "x": float(np.sqrt(E / DENSITY)),
        "rx": float(np.sqrt(E / 2.6 * ROD_TORSION / (DENSITY * polar))),
    }


@covers("ROD-1")
def rods(entry: Entry) -> Iterator[Check]:
    """Axial and torsional waves: x or rx is held where the entry fixes an end."""
    for component, speed in rod_speeds().items():
        for ends, roots in entry["expected"].items():
            expected = [root * speed / (2 * np.pi) for root in roots[:2]]
            at_a = [] if ends.startswith("free") else [component]
            at_b = [component] if ends == "fixed_fixed" else []
            found = solved(rod_text(component, at_a, at_b), expected[-1])
            label = f"{'axial' if component == 'x' else 'torsion'}, {ends.replace('_', ' ')}, mode"
            yield from frequency_checks(found, (component,), expected, label)


def rod_text(
    component: str, at_a: list[str], at_b: list[str], more: str = "", *, accuracy: float = 5e-4
) -> str:
    """A rod that is held at both ends in all that is not looked at."""
    others = [c for c in ("x", "y", "z", "rx", "ry", "rz") if c != component]
    section = (
        f"area = {ROD_AREA}\nsecond_moment_y = {SECOND_MOMENT}\nsecond_moment_z = {4 * SECOND_MOMENT}\n"
        f"torsion_constant = {ROD_TORSION if component == 'rx' else SECOND_MOMENT}\n"
    )
    text = beam_text({"A": 0, "B": 1}, {}, section=section, more=more, accuracy=accuracy)
    text = text[: text.index("[[supports]]")] + more
    for point, own in (("A", at_a), ("B", at_b)):
        text += f'[[supports]]\nat = "{point}"\nhold = {others + own}\n'
    return text


@covers("ROD-TIP")
def rod_with_end_mass(entry: Entry) -> Iterator[Check]:
    speed = np.sqrt(E / DENSITY)
    for ratio, *roots in entry["expected"]["rows"][::2]:  # every other ratio, for the sake of time
        expected = [root * speed / (2 * np.pi) for root in roots[:2]]
        text = rod_text("x", ["x"], [], _body("B", DENSITY * ROD_AREA / ratio))
        yield from frequency_checks(solved(text, expected[-1]), ("x",), expected, f"C = {ratio:g}, mode")


@covers("ROD-2DISC")
def two_discs(entry: Entry) -> Iterator[Check]:
    given = entry["inputs"]
    discs = "".join(
        f'[[bodies]]\nname = "disc {n}"\nmass = "1 kg"\ncarried_by = "{point}"\n'
        f'inertia = ["{given[f"J{n}"]} kg m^2", "1 kg m^2", "1 kg m^2"]\n'
        for n, point in ((1, "A"), (2, "B"))
    )
    text = f"""
[units]
length = "m"
[points]
A = [0, 0, 0]
B = [0.7, 0, 0]
{discs}
[[supports]]
at = ["A", "B"]
hold = ["x", "y", "z", "ry", "rz"]
[[springs]]
between = ["A", "B"]
stiffness = {{ rx = "{given["k_t"]} N m/rad" }}
"""
    modes = study(text).system().modes()
    yield Check("rigid-body modes", modes.rigid_body_count, 1, 0.0, absolute=True)
    yield Check("omega, rad/s", 2 * np.pi * modes.frequencies_hz[1], entry["expected"]["omega"], 1e-9)
    turns = [float(modes.system.direction(f"disc {n}", "rx") @ modes.shapes[:, 1]) for n in (1, 2)]
    node = turns[0] / (turns[0] - turns[1])
    yield Check("node from disc 1, of the length", node, entry["expected"]["node_fraction_from_disc1"], 1e-9)


def timoshenko_text(entry: Entry, accuracy: float = 5e-4) -> tuple[str, list[float]]:
    """A beam of rectangular section, half as wide as high, as a study; and its expected frequencies in Hz."""
    given = entry["inputs"]
    height = 1 / given["L_over_h"]
    area, second = 0.5 * height * height, 0.5 * height**4 / 12
    section = (
        f"area = {area}\nsecond_moment_y = {second}\nsecond_moment_z = {second / 4}\n"
        f"torsion_constant = {second / 2}\nshear_area_z = {area * 5 / 6}\nshear_area_y = {area * 5 / 6}\n"
    )
    clamped = "CF" in entry["id"]
    holds = {"A": _CLAMPED} if clamped else {"A": _PINNED, "B": _PINNED}
    unit = float(np.sqrt(E * second / (DENSITY * area))) / (2 * np.pi)
    expected = [b * unit for b in entry["expected"]["B" if clamped else "B_bending_n1_to_5"]]
    return beam_text({"A": 0, "B": 1}, holds, section=section, accuracy=accuracy), expected


@covers("TIM-PP-20", "TIM-PP-5", "TIM-CF-20", "TIM-CF-5")
def timoshenko(entry: Entry) -> Iterator[Check]:
    text, expected = timoshenko_text(entry)
    yield from frequency_checks(solved(text, expected[-1]), BENDING, expected)


@covers("EFFM-2")
def effective_masses(entry: Entry) -> Iterator[Check]:
    """Shares of the mass that goes with a shaking ground; held ends count as mass too."""
    cases = {
        "cantilever": (beam_text({"A": 0, "B": 1}, {"A": _CLAMPED}), BENDING, 2, "BEAM-CF", 1),
        "pinned_pinned_n1_3_5": (
            beam_text({"A": 0, "B": 1}, {"A": _PINNED, "B": _PINNED}), BENDING, 2, "BEAM-PP", 2
        ),
    }  # fmt: skip
    for name, (text, components, along, same, step) in cases.items():
        reference = entry["expected"][name][:3]
        modes = solved(text, hz(ENTRIES[same]["expected"]["b"])[-1])
        assert modes.effective_mass is not None
        found = picked(modes, components)[::step]
        for number, (i, value) in enumerate(zip(found, reference, strict=False), start=1):
            ours = float(modes.effective_mass[i, along]) / LINE
            yield Check(f"{name.replace('_', ' ')}, {number}", ours, value, CLOSED_FORM)


@covers("QEP-BEAM")
def beam_with_dashpot(entry: Entry) -> Iterator[Check]:
    """The continuous beam; antisymmetric modes have a node at the dashpot and are not damped."""
    given, expected = entry["inputs"], entry["expected"]
    second = given["EI"] / E
    section = (
        f"area = {AREA}\nsecond_moment_y = {second}\nsecond_moment_z = {9 * second}\n"
        f"torsion_constant = {second}\n"
    )
    damper = f'{{ z = "{given["c"]} N s/m" }}'
    dashpot = f'[[springs]]\nbetween = ["M", "ground"]\ndashpot = {damper}\n'
    text = beam_text(
        {"A": 0, "M": 0.5, "B": 1},
        {"A": _PINNED, "B": _PINNED},
        section=section,
        density=given["m"] / AREA,
        more=dashpot,
    )
    damped = [complex(*pair) for pair in expected["continuous_symmetric_1_3_5"]]
    undamped = [complex(0, omega) for omega in expected["continuous_antisymmetric_2_4_6"]]
    references = sorted(damped + undamped, key=abs)
    modes = solved(text, abs(references[-1]) / (2 * np.pi))
    found = picked(modes, BENDING)
    assert len(found) == len(references)
    for number, (i, reference) in enumerate(zip(found, references, strict=True), start=1):
        bar = 2 * np.pi * float(modes.errors_hz[i])
        yield Check(
            f"eigenvalue {number}, 1/s", complex(modes.eigenvalues[i]), reference, CLOSED_FORM, error_bar=bar
        )
