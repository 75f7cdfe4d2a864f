"""Cross-references of a study file: every name that is used must be one that is defined.

These checks run on the file as written, before the typed reading, so that one pass reports a wrong
reference together with a wrong unit.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterable, Iterator, Mapping
from difflib import get_close_matches
from itertools import pairwise
from typing import Any

from vib.study.lines import Path

Finding = tuple[Path, str]


def check_names(raw: Mapping[str, Any]) -> Iterator[Finding]:
    """Every dangling or doubly used name, as (path in the file, message)."""
    if any(not isinstance(raw.get(table, {}), Mapping) for table in ("points", "sections", "materials")):
        return  # the table itself is at fault, which the schema reports; every name in it would follow
    points = _keys(raw.get("points"))
    bodies = [body.get("name") for _, body in _rows(raw, "bodies")]
    places = [*points, *(name for name in bodies if isinstance(name, str))]
    yield from _double_names(raw, points)
    if "ground" in points:
        yield ("points", "ground"), '"ground" is the fixed ground; give the point another name'
    yield from _check_members(raw, points)
    yield from _check_regions(raw)
    yield from _check_sets(raw)
    for i, body in _rows(raw, "bodies"):
        yield from _unknown("point", points, _listed(body.get("carried_by"), ("bodies", i, "carried_by")))
        yield from _check_spin(raw, body, ("bodies", i, "spin", "shaft"))
    for i, support in _rows(raw, "supports"):
        yield from _unknown("point", points, _listed(support.get("at"), ("supports", i, "at")))
    for i, spring in _rows(raw, "springs"):
        yield from _check_spring(spring, ("springs", i, "between"), points)
    yield from _check_main(raw)
    yield from _check_leaders(raw)
    if "matrices" in raw:
        # a freedom may also be named by its number, and the number of rows is not known here
        return
    yield from _check_excitations(raw, places)
    for i, load in _rows(raw, "loads"):
        yield from _unknown("point or body", places, _listed(load.get("at"), ("loads", i, "at")))
        if "along" not in load:
            yield ("loads", i, "along"), 'is missing: the direction in which the load acts, such as "x"'
    impact = raw.get("impact")
    if isinstance(impact, Mapping):
        for key in ("at", "watch"):
            yield from _unknown("point or body", places, _listed(impact.get(key), ("impact", key)))
    response = raw.get("response")
    if isinstance(response, Mapping):
        watched = _listed(response.get("watch"), ("response", "watch"))
        yield from _unknown("point or body", places, [(path, _place(name, places)) for path, name in watched])
    yield from _check_judged(raw, places)


def _check_main(raw: Mapping[str, Any]) -> Iterator[Finding]:
    """The main excitation of [severity] is one with a running speed."""
    severity = raw.get("severity")
    if isinstance(severity, Mapping) and isinstance(severity.get("main"), str):
        yield from _check_shaft(raw, severity["main"], ("severity", "main"), "is needed to judge by")


def _check_judged(raw: Mapping[str, Any], places: list[str]) -> Iterator[Finding]:
    """The places that [severity] judges, and those that limits of one's own hold for."""
    severity = raw.get("severity")
    if not isinstance(severity, Mapping):
        return
    judged = _listed(severity.get("places"), ("severity", "places"))
    limits = severity.get("limits")
    for i, row in enumerate(limits if isinstance(limits, list) else []):
        if isinstance(row, Mapping):
            judged += _listed(row.get("at"), ("severity", "limits", i, "at"))
    yield from _unknown("point or body", places, [(path, _place(name, places)) for path, name in judged])


def _check_leaders(raw: Mapping[str, Any]) -> Iterator[Finding]:
    """The excitations whose speed others follow, in no circle."""
    rows = {row.get("name", f"excitation {i + 1}"): row for i, row in _rows(raw, "excitations")}
    for i, excitation in _rows(raw, "excitations"):
        shaft, path = excitation.get("shaft"), ("excitations", i, "shaft")
        if not isinstance(shaft, str):
            continue
        yield from _check_shaft(raw, shaft, path, "could be followed")
        seen = [excitation.get("name", f"excitation {i + 1}")]
        while isinstance(shaft, str) and shaft in rows and shaft not in seen:
            seen.append(shaft)
            shaft = rows[shaft].get("shaft")
        if shaft in seen:
            yield path, f'"{shaft}" follows its own speed; one needs a speed of its own'


def _check_excitations(raw: Mapping[str, Any], places: list[str]) -> Iterator[Finding]:
    """The places of excitations and of their forces, and the directions of those."""
    from vib.study.excitations import FORCES, UPRIGHT

    for i, excitation in _rows(raw, "excitations"):
        yield from _unknown("point or body", places, _listed(excitation.get("at"), ("excitations", i, "at")))
        for name in FORCES:
            for path, row in _tables(excitation.get(name), ("excitations", i, name)):
                for key in ("at", "planes", "places"):
                    yield from _unknown("point or body", places, _listed(row.get(key), (*path, key)))
                if name in UPRIGHT and not (row.get("turning") or "along" in row or "along" in excitation):
                    turning = "" if name in ("crank", "strokes", "mains") else ", or turning = true"
                    yield (
                        (*path, "along"),
                        f'is missing: the direction in which the force acts, such as "x"{turning}',
                    )


def _tables(value: object, path: Path) -> list[tuple[Path, Mapping[str, Any]]]:
    """One table, or each of a list of tables, with its path."""
    if isinstance(value, Mapping):
        return [(path, value)]
    rows = value if isinstance(value, list) else []
    return [((*path, j), row) for j, row in enumerate(rows) if isinstance(row, Mapping)]


def _place(text: str, places: list[str]) -> str:
    """The place that "motor" or "motor y" watches."""
    name, _, component = text.rpartition(" ")
    known = component.lstrip("+-") in ("x", "y", "z", "rx", "ry", "rz")
    return name if text not in places and name and known else text


def did_you_mean(name: str, known: Iterable[str]) -> str:
    """A suggestion in words, or nothing where no known name is near."""
    near = get_close_matches(name.lower(), {k.lower(): k for k in known}, n=1, cutoff=0.6)
    spelled = {k.lower(): k for k in known}
    return f' (did you mean "{spelled[near[0]]}"?)' if near else ""


def _double_names(raw: Mapping[str, Any], points: list[str]) -> Iterator[Finding]:
    for table in ("members", "bodies", "springs", "excitations", "loads"):
        seen: dict[str, int] = {}
        for i, row in _rows(raw, table):
            name = row.get("name")
            if not isinstance(name, str):
                continue
            if name in seen:
                yield (table, i, "name"), f'"{name}" is already the name of {table}[{seen[name]}]'
            seen.setdefault(name, i)
            if table == "bodies" and name in points:
                yield (table, i, "name"), f'"{name}" is already the name of a point'


def _check_members(raw: Mapping[str, Any], points: list[str]) -> Iterator[Finding]:
    from vib.study.materials import MATERIALS

    sections = _keys(raw.get("sections"))
    materials = [*_keys(raw.get("materials")), *(material.name for material in MATERIALS)]
    for i, member in _rows(raw, "members"):
        yield from _unknown("section", sections, _listed(member.get("section"), ("members", i, "section")))
        yield from _unknown(
            "material", materials, _listed(member.get("material"), ("members", i, "material"))
        )
        runs = member.get("runs")
        for j, run in enumerate(runs if isinstance(runs, list) else []):
            path: Path = ("members", i, "runs", j)
            yield from _unknown("point", points, _listed(run, path) if isinstance(run, list) else [])
            if isinstance(run, list) and any(a == b for a, b in pairwise(run)):
                yield path, "a run joins a point to itself"


def _check_regions(raw: Mapping[str, Any]) -> Iterator[Finding]:
    """Materials and sections of the regions of the mesh."""
    from vib.study.materials import MATERIALS

    mesh = raw.get("mesh")
    regions = mesh.get("regions") if isinstance(mesh, Mapping) else None
    materials = [*_keys(raw.get("materials")), *(material.name for material in MATERIALS)]
    for name, region in regions.items() if isinstance(regions, Mapping) else ():
        if isinstance(region, Mapping):
            path: Path = ("mesh", "regions", name)
            yield from _unknown("material", materials, _listed(region.get("material"), (*path, "material")))
            sections = _keys(raw.get("sections"))
            yield from _unknown("section", sections, _listed(region.get("section"), (*path, "section")))


def _check_sets(raw: Mapping[str, Any]) -> Iterator[Finding]:
    """Sets of points of a mesh where one single point is needed."""
    points = raw.get("points")
    sets = [
        name
        for name, point in (points.items() if isinstance(points, Mapping) else ())
        if isinstance(point, Mapping) and ("box" in point or "set" in point)
    ]
    for i, member in _rows(raw, "members"):
        runs = member.get("runs")
        for j, run in enumerate(runs if isinstance(runs, list) else []):
            for name in run if isinstance(run, list) else []:
                if name in sets:
                    yield ("members", i, "runs", j), f'"{name}" is a set of points; a run joins single points'
    for i, spring in _rows(raw, "springs"):
        between = spring.get("between")
        for pair in between if isinstance(between, list) else []:
            ends = between if isinstance(pair, str) else pair
            if isinstance(ends, list) and "ground" not in ends and any(name in sets for name in ends):
                name = next(name for name in ends if name in sets)
                other = next((end for end in ends if end not in sets), "...")
                yield (
                    ("springs", i, "between"),
                    f'"{name}" is a set of points, which takes springs to the ground only; name one point '
                    "amid it (foot = { nearest = [...] } in [points]), let a light body be carried by both "
                    f'([[bodies]] with mass, centre and carried_by = ["{name}", "foot"]) and write '
                    f'between = ["foot", "{other}"]',
                )
                break
    for i, body in _rows(raw, "bodies"):
        carried = _listed(body.get("carried_by"), ())
        if "centre" not in body and any(name in sets for _, name in carried):
            yield ("bodies", i, "centre"), "is needed where a set of points carries a body"


def _check_spin(raw: Mapping[str, Any], body: Mapping[str, Any], path: Path) -> Iterator[Finding]:
    """The shaft of a spin is an excitation with a running speed."""
    spin = body.get("spin")
    shaft = spin.get("shaft") if isinstance(spin, Mapping) else None
    if isinstance(shaft, str):
        yield from _check_shaft(raw, shaft, path, "a body could follow")


def _check_shaft(raw: Mapping[str, Any], shaft: str, path: Path, use: str) -> Iterator[Finding]:
    rows = {row.get("name", f"excitation {i + 1}"): row for i, row in _rows(raw, "excitations")}
    known = [name for name in rows if isinstance(name, str)]
    yield from _unknown("excitation", known, [(path, shaft)])
    if shaft in rows and not {"speed", "speeds", "shaft"} & rows[shaft].keys():
        yield path, f'the excitation "{shaft}" has no running speed that {use}'


def _check_spring(spring: Mapping[str, Any], path: Path, points: list[str]) -> Iterator[Finding]:
    between = spring.get("between")
    if not isinstance(between, list):
        return
    single = all(isinstance(name, str) for name in between)
    for j, pair in enumerate([between] if single else between):
        if not isinstance(pair, list):
            continue
        here = path if single else (*path, j)
        yield from _unknown("point", [*points, "ground"], _listed(pair, here))
        if len(pair) == 2 and pair[0] == pair[1]:
            yield here, f'both ends are "{pair[0]}"'


def _unknown(what: str, known: list[str], used: Iterable[tuple[Path, str]]) -> Iterator[Finding]:
    used = list(used)
    for path, name in used:
        if name not in known:
            yield path, f'no {what} is named "{name}"{did_you_mean(name, known)}'
    for name, times in Counter(name for _, name in used).items():
        if times > 1 and name != "ground" and used[0][0][0] in ("bodies", "supports", "impact"):
            yield used[0][0][:-1], f'"{name}" stands there {times} times'


def _listed(value: object, path: Path) -> list[tuple[Path, str]]:
    """The names in an entry that is a name or a list of names; anything else is the schema's business."""
    if isinstance(value, str):
        return [(path, value)]
    if isinstance(value, list):
        return [((*path, i), name) for i, name in enumerate(value) if isinstance(name, str)]
    return []


def _rows(raw: Mapping[str, Any], table: str) -> list[tuple[int, Mapping[str, Any]]]:
    rows = raw.get(table)
    return [
        (i, row) for i, row in enumerate(rows if isinstance(rows, list) else []) if isinstance(row, Mapping)
    ]


def _keys(table: object) -> list[str]:
    return list(table) if isinstance(table, Mapping) else []
