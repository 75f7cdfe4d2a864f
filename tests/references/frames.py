"""Plane frames: slope-deflection and exact dynamic stiffness against members cut into pieces."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace
from itertools import pairwise

import numpy as np

from tests.references.beams import DENSITY, E, solved
from tests.references.common import CLOSED_FORM, Check, Entry, covers, frequency_checks, study

IN_PLANE = ("x", "z", "ry")


def frame_text(
    points: dict[str, tuple[float, float, float]],
    members: dict[str, tuple[str, list[str]]],
    sections: dict[str, str],
    *,
    clamped: list[str],
    density: float = DENSITY,
    more: str = "",
    extra: str = "",
) -> str:
    """A study of a frame: members are name -> (section, points in a row)."""
    listed = "\n".join(f"{name} = {list(at)}" for name, at in points.items())
    drawn = "\n".join(f"[sections.{name}]\n{text}" for name, text in sections.items())
    built = "\n".join(
        f'[[members]]\nname = "{name}"\nsection = "{section}"\nmaterial = "m"\nruns = [{run}]\n{extra}'
        for name, (section, run) in members.items()
    )
    return f"""
accuracy = 5e-4
[units]
length = "m"
[materials.m]
youngs_modulus = "{E} Pa"
poissons_ratio = 0.3
density = "{density} kg/m^3"
{drawn}
[points]
{listed}
{built}
[[supports]]
at = {clamped}
hold = "all"
{more}
"""


def section(area: float, second: float, other: float | None = None, torsion: float | None = None) -> str:
    """General figures without shear flexibility, as the references have none."""
    return (
        f"area = {area}\nsecond_moment_y = {second}\nsecond_moment_z = {other or 4 * second}\n"
        f"torsion_constant = {torsion or second}\n"
    )


def portal_text(
    columns: str, beam: str, *, height: float, span: float, density: float = DENSITY, more: str = ""
) -> str:
    return frame_text(
        {"A": (0, 0, 0), "B": (0, 0, height), "C": (span, 0, height), "D": (span, 0, 0)},
        {"left": ("c", ["A", "B"]), "right": ("c", ["D", "C"]), "beam": ("b", ["B", "C"])},
        {"c": columns, "b": beam},
        clamped=["A", "D"],
        density=density,
        more=more,
    )


def sway_stiffness(text: str) -> float:
    """Force at both tops per unit sway, from the matrices of the study: half at B, half at C."""
    system = study(text).system()
    stiffness = system.stiffness.toarray() if hasattr(system.stiffness, "toarray") else system.stiffness
    load = (system.direction("B", "x") + system.direction("C", "x")) / 2
    return float(1.0 / (load @ np.linalg.solve(stiffness, load)))


@covers("FRAME-SWAY")
def sway(entry: Entry) -> Iterator[Check]:
    second = 1e-8
    for ratio, fixed, pinned in entry["expected"]["rows"]:
        text = portal_text(section(1e-2, second), section(1e-2, max(ratio, 1e-9) * second), height=1, span=1)
        unit = E * second
        # a beam without stiffness is one with a hinge at each end
        hinged = text.replace(
            "runs = [['B', 'C']]", "runs = [['B', 'C']]\nreleases = {start=['ry'], end=['ry']}"
        )
        built = text if ratio else hinged
        assert ratio or built != text
        yield Check(f"gamma = {ratio:g}, clamped feet", sway_stiffness(built) / unit, fixed, CLOSED_FORM)
        if ratio:
            feet = built.replace('hold = "all"', 'hold = ["x", "y", "z", "rx", "rz"]')
            yield Check(f"gamma = {ratio:g}, pinned feet", sway_stiffness(feet) / unit, pinned, CLOSED_FORM)


@covers("FRAME-SWAY-EX")
def rigid_beam_on_columns(entry: Entry) -> Iterator[Check]:
    given = entry["inputs"]
    height = given["h"]
    text = frame_text(
        {"A": (0, 0, 0), "B": (0, 0, height), "C": (4, 0, height), "D": (4, 0, 0)},
        {"left": ("c", ["A", "B"]), "right": ("c", ["D", "C"])},
        {"c": section(1.0, given["Ic"], 100 * given["Ic"])},
        clamped=["A", "D"],
        density=0.0,
        more=f'[[bodies]]\nname = "beam"\nmass = "{given["m"]} kg"\ncentre = [2, 0, {height}]\n'
        'carried_by = ["B", "C"]\n',
    )
    modes = study(text).system().modes(count=1)
    yield Check("sway, Hz", float(modes.frequencies_hz[0]), entry["expected"]["f_sway"], CLOSED_FORM)


@covers("FRAME-PORTAL")
def square_portal(entry: Entry) -> Iterator[Check]:
    area, second = 1e-2, 1e-9  # radius of gyration of 3e-4 of the length: no stretch, no rotary inertia
    expected = [
        b**2 * float(np.sqrt(E * second / (DENSITY * area))) / (2 * np.pi) for b in entry["expected"]["betaL"]
    ]
    text = portal_text(section(area, second), section(area, second), height=1, span=1)
    yield from frequency_checks(solved(text, expected[-1]), IN_PLANE, expected)


@covers("FRAME-L")
def bracket_in_its_plane(entry: Entry) -> Iterator[Check]:
    """The reference has no rotary inertia of bending, which lowers a mode by at most about (k r)^2, k the
    wave number of bending and r the radius of gyration."""
    given = entry["inputs"]
    text = frame_text(
        {"A": (0, 0, 0), "B": (0, 0, 0.6), "C": (0.4, 0, 0.6)},
        {"leg": ("s", ["A", "B"]), "arm": ("s", ["B", "C"])},
        {"s": section(given["A"], given["I"], 25 * given["I"])},
        clamped=["A"],
        density=given["rho"],
        more=f'[[bodies]]\nname = "tip"\nmass = "{given["tip_mass"]} kg"\ncarried_by = "C"\n',
    )
    expected = entry["expected"]["f"]
    squared_radius = given["I"] / given["A"]
    for check in frequency_checks(solved(text, expected[-1]), IN_PLANE, expected):
        omega = 2 * np.pi * check.reference.real
        squared_k = omega * np.sqrt(given["rho"] * given["A"] / (E * given["I"]))
        yield replace(check, model_gap=float(squared_k * squared_radius))


@covers("FRAME-L-OUT")
def bracket_out_of_its_plane(entry: Entry) -> Iterator[Check]:
    """Both legs lie flat and move up and down. Without rotary inertia of bending: 10^4 times the area at a
    10^-4 of the density; the stiff sideways second moment then restores the inertia against twisting."""
    given = entry["inputs"]
    area, second = np.pi * given["d"] ** 2 / 4, np.pi * given["d"] ** 4 / 64
    text = frame_text(
        {"A": (0, 0, 0), "B": (0.5, 0, 0), "C": (0.5, 0.35, 0)},
        {"leg": ("s", ["A", "B"]), "arm": ("s", ["B", "C"])},
        {"s": section(1e4 * area, second, 1e4 * 2 * second - second, 2 * second)},
        clamped=["A"],
        density=given["rho"] * 1e-4,
    )
    expected = entry["expected"]["f"]
    yield from frequency_checks(solved(text, expected[-1]), ("z", "rx", "ry"), expected)


@covers("FRAME-PORTAL-EX")
def portal_that_stretches(entry: Entry) -> Iterator[Check]:
    """The reference stretches but has no rotary inertia, which no section can do at these proportions (it
    would lower these modes by 0.1 % to 1 %): members without mass carry it as points, 24 to a member."""
    given = entry["inputs"]
    pieces, height, span = 24, given["h"], given["span"]
    corners = [(0, 0, 0), (0, 0, height), (span, 0, height), (span, 0, 0)]
    points: dict[str, tuple[float, float, float]] = {}
    runs: list[list[str]] = []
    masses: dict[str, float] = {}
    for side, (start, end) in enumerate(pairwise(np.array(corners, float))):
        piece = float(np.linalg.norm(end - start)) / pieces
        names = [f"p{side * pieces + i}" for i in range(pieces + 1)]
        runs.append(names)
        for i, name in enumerate(names):
            x, y, z = start + (end - start) * i / pieces
            points[name] = (float(x), float(y), float(z))
            share_of_piece = 0.5 if i in (0, pieces) else 1.0
            masses[name] = masses.get(name, 0.0) + share_of_piece * piece * given["rho"] * given["A"]
    first, last = runs[0][0], runs[-1][-1]
    bodies = "".join(
        f'[[bodies]]\nname = "m {name}"\nmass = "{mass} kg"\ncarried_by = "{name}"\n'
        for name, mass in masses.items()
        if name not in (first, last)
    )
    text = frame_text(
        points,
        {f"side {side}": ("s", run) for side, run in enumerate(runs)},
        {"s": section(given["A"], given["I"])},
        clamped=[first, last],
        density=0.0,
        more=bodies,
    )
    expected = entry["expected"]["f"]
    for check in frequency_checks(solved(text, expected[-1]), IN_PLANE, expected):
        yield replace(check, error_bar=None)  # it knows nothing of the points that stand for spread mass
