"""Write the two pages that are made, not written: docs/study-file.md and docs/validation.md.

Run from the top folder: python docs/make_pages.py. A test fails where a page is stale.
"""

from __future__ import annotations

import json
import sys
from collections.abc import Iterator
from pathlib import Path
from typing import Any

HERE = Path(__file__).parent
sys.path.insert(0, str(HERE.parent))  # the reference tests are not part of the installed package

# what JSON Schema can't say of entries whose kind depends on another entry
_WORDS = {
    ("Impact", "impulse"): "an impulse (`N s`), along a rotation an angular impulse (`N m s`)",
    ("Impact", "pull"): "a force (`N`), along a rotation a moment (`N m`)",
    ("Impact", "displacement"): "a length (`m`), along a rotation an angle (`rad`)",
    ("Impact", "velocity"): "a velocity (`m/s`), along a rotation an angular velocity (`rad/s`)",
    ("Pulse", "peak"): "a force (`N`), along a rotation a moment (`N m`)",
    ("Wave", "amplitude"): "a force (`N`), a moment (`N m`); of the ground an acceleration (`m/s^2`)",
    ("SweptSine", "amplitude"): "a force (`N`), a moment (`N m`); of the ground an acceleration (`m/s^2`)",
    ("SweptSine", "frequencies"): "two frequencies (`Hz`)",
    ("AppliedLoad", "constant"): "a force (`N`), along a rotation a moment (`N m`)",
    ("AppliedLoad", "impulse"): "an impulse (`N s`), along a rotation an angular impulse (`N m s`)",
    ("AppliedLoad", "along"): "a component or three numbers",
    ("Respond", "frequencies"): "two frequencies (`Hz`)",
    ("Excitation", "speed"): "a running speed (`rpm`), or a list of two",
    ("Excitation", "along"): "a component or three numbers",
    ("Excitation", "axis"): "an axis or three numbers",
    **{
        (name, "along"): "a component or three numbers"
        for name in (
            "Unbalance",
            "Forces",
            "Misalignment",
            "Belt",
            "Blades",
            "Gear",
            "Crank",
            "Strokes",
            "Mains",
        )
    },
    **{
        (name, "amplitude"): "a force (`N`), along a rotation a moment (`N m`)"
        for name in ("Forces", "Misalignment", "Belt", "Blades", "Gear", "Mains")
    },
    ("Unbalance", "grade"): 'text such as `"G 6.3"`, or a velocity (`m/s`)',
    ("Forces", "table"): "a list of lists",
    ("Strokes", "peak"): "a force (`N`), along a rotation a moment (`N m`)",
    ("Shaking", "displacement"): "a length (`m`), about an axis an angle (`rad`)",
    ("Shaking", "velocity"): "a velocity (`m/s`), about an axis an angular velocity (`rad/s`)",
    ("Shaking", "acceleration"): "an acceleration (`m/s^2`), about an axis an angular one (`rad/s^2`)",
    ("Severity", "support"): '`"rigid"`, `"flexible"` or a table',
    ("Impact", "along"): "a component or three numbers",
    ("Members", "up"): "an axis or three numbers",
    ("MeshRegion", "up"): "an axis or three numbers",
    ("Mesh", "regions"): "tables",
    ("Spring", "x_axis"): "an axis or three numbers",
    ("Spring", "y_axis"): "an axis or three numbers",
    ("Support", "hold"): "components",
    ("Releases", "start"): "components",
    ("Releases", "end"): "components",
    ("Spring", "between"): "two names, or a list of such pairs",
    ("Members", "runs"): "a list of lists of names",
    ("Matrices", "mass"): "a matrix",
    ("Matrices", "stiffness"): "a matrix",
    ("Matrices", "damping"): "a matrix",
    ("Matrices", "gyroscopic"): "a matrix",
}
_TABLES = {
    "materials": "[materials.NAME]",
    "sections": "[sections.NAME]",
    "mesh": "[mesh]",
    "points": "[points]",
    "members": "[[members]]",
    "bodies": "[[bodies]]",
    "supports": "[[supports]]",
    "springs": "[[springs]]",
    "damping": "[damping]",
    "excitations": "[[excitations]]",
    "impact": "[impact]",
    "loads": "[[loads]]",
    "base_motion": "[base_motion]",
    "response": "[response]",
    "severity": "[severity]",
    "matrices": "[matrices]",
}
_SPREAD = "#/$defs/Spread"
_INTRODUCTION = """# The study file

Results support, and do not replace, review by a licensed engineer under the local code.

This page is generated from the schema that reads the file (`python docs/make_pages.py`); `vib schema` prints
the same as a JSON Schema, with which an editor completes and checks entries.

A study is one TOML file. A quantity is text with a unit (`"210 GPa"`, `"12 kip/inch"`, `"1480 rpm"`), or a
bare number whose unit `[units]` declares; a bare number without a declared unit is an error. Text with a unit
always wins. A ratio is a plain number or a percentage (`0.02`, `"2 %"`). Unknown keys, dangling names and
quantities of the wrong dimension are errors that name the entry and its line.

A *component* is one of `"x"`, `"y"`, `"z"` (translations) and `"rx"`, `"ry"`, `"rz"` (rotations about these
axes); a minus sign turns it round: `"-z"`. *Components* are a list of them, or `"all"`, `"translations"`,
`"rotations"`. An *axis* is `"x"`, `"-x"`, `"y"`, ... Axes are right-handed.

A *matrix* is a file name (`"mass.mtx"`, Matrix Market, or `"mass.npz"`, one array or a SciPy sparse matrix,
without pickles), rows (`[[2, 0], [0, 1]]`), or a table that also names the unit of the numbers.
"""

_TOLERANCES = """## Tolerances

Any quantity may carry a tolerance, which `vib scatter` draws from; every other command uses the value alone.
In short as text: `"2 kN/mm +- 20 %"`, `"900 mm ± 2 mm"` (either way, and every value within is as likely as
another). A percentage is a share of the value. In full as a table: `{value = "2 kN/mm", tolerance = "20 %",
distribution = "normal", group = "mounts"}`, `{from = "1.5 kN/mm", to = "2.5 kN/mm"}`, `{value = "2 kN/mm",
standard_deviation = "10 %", distribution = "lognormal"}`.

| distribution | what the tolerance t says |
|---|---|
| `"uniform"` | all values lie between value - t and value + t, each as likely (JCGM 100:2008, 4.3.7) |
| `"triangular"` | all values lie between value - t and value + t, most of them near value |
| `"normal"` | 95 % of the values lie between value - t and value + t: t is 1.96 standard deviations |
| `"lognormal"` | the value is the median; 95 % lie between value / (1 + t/value) and value + t |

Entries of a table that stands for several springs or runs vary together; so do quantities of one `group`,
wholly or, with a `correlation` below 1, in part (normal correlation of their normal scores).
"""


def study_file_page() -> str:
    """The page of every key, unit and default."""
    from vib.study import Study

    schema = Study.model_json_schema()
    parts = [
        _INTRODUCTION,
        "## At the top of the file\n\n" + _rows_of("Study", schema, skip=set(_TABLES) | {"units"}),
    ]
    parts.append(_units_part())
    parts.append(_TOLERANCES + "\n" + _rows_of("Spread", schema["$defs"]["Spread"]))
    for key, heading in _TABLES.items():
        entry = schema["properties"][key]
        named = _reference(entry)
        if key == "points" or named is None:
            value = "a list of three lengths (`m`), or a table that finds it in the mesh"
            parts.append(f"## {heading}\n\nEach key is the name of a point, its value {value}.\n")
            parts.append(_sub_part(key, "Finder", schema["$defs"]["Finder"]))
            continue
        table = schema["$defs"][named]
        parts.append(f"## {heading}\n\n{_plain(table['description'])}\n\n{_rows_of(named, table)}")
        parts += [_sub_part(key, name, schema["$defs"][name]) for name in _parts_of(table)]
        if key == "materials":
            parts.append(_materials_part())
        if key == "sections":
            parts.append(_shapes_part())
    return "\n".join(parts)


def _rows_of(model: str, table: dict[str, Any], skip: set[str] = frozenset()) -> str:  # type: ignore[assignment]
    lines = ["| key | value | default | meaning |", "|---|---|---|---|"]
    for key, entry in table["properties"].items():
        if key in skip:
            continue
        value = _WORDS.get((model, key)) or _value(entry)
        default = "needed" if key in table.get("required", ()) else _default(entry.get("default"))
        lines.append(f"| `{key}` | {value} | {default} | {_meaning(entry)} |")
    return "\n".join(lines) + "\n"


def _default(value: object) -> str:
    return "" if value in (None, [], "", {}) or isinstance(value, dict) else f"`{json.dumps(value)}`"


def _meaning(entry: dict[str, Any]) -> str:
    text = entry.get("description", "")
    return "" if "x-quantity" in entry and ": text with a unit" in text else _plain(text)


def _plain(text: str) -> str:
    return " ".join(text.replace("``", "`").split())


def _value(entry: dict[str, Any]) -> str:
    """What an entry may be, in words."""
    from vib.units import KINDS

    if "x-quantity" in entry:
        kind = KINDS[entry["x-quantity"]]
        return f"{kind.words} (`{kind.si}`)" if kind.si else kind.words
    if "enum" in entry:
        return " or ".join(f"`{json.dumps(choice)}`" for choice in entry["enum"])
    if "$ref" in entry:
        return "a table"
    if "anyOf" in entry:
        written = [option for option in entry["anyOf"] if option.get("$ref") != _SPREAD]
        options = [_value(option) for option in written if option.get("type") != "null"]
        return " or ".join(dict.fromkeys(options))
    if "prefixItems" in entry:
        items = [_value(item) for item in entry["prefixItems"]]
        return f"a list of {len(items)}: {', '.join(dict.fromkeys(items))}"
    if entry.get("type") == "array":
        return f"a list: {_value(entry.get('items', {}))}"
    if isinstance(entry.get("type"), list):
        return "text with a unit, or a number"
    kinds = {"string": "text", "number": "a number", "integer": "a whole number", "boolean": "true or false"}
    return kinds.get(entry.get("type", ""), "a value")


def _reference(entry: dict[str, Any]) -> str | None:
    """The name of the table model that an entry holds, if it does."""
    found = list(_references(entry))
    return found[0] if found else None


def _references(entry: object) -> Iterator[str]:
    if isinstance(entry, dict):
        if "$ref" in entry:
            yield entry["$ref"].rsplit("/", 1)[-1]
        for value in entry.values():
            yield from _references(value)
    elif isinstance(entry, list):
        for value in entry:
            yield from _references(value)


def _parts_of(table: dict[str, Any]) -> list[str]:
    return [name for name in dict.fromkeys(_references(table["properties"])) if name != "Spread"]


def _sub_part(key: str, name: str, table: dict[str, Any]) -> str:
    from vib.study.excitations import FORCES

    where = {
        "Releases": "releases",
        "Pulse": "pulse" if key == "impact" else "half_sine",
        "Wave": "harmonic",
        "SweptSine": "sweep",
        "SixStiffnesses": "stiffness",
        "StandPerAxis": "support",
        "SixDashpots": "dashpot",
        "Shaking": "ground",
        **{name.capitalize(): name for name in FORCES},
    }
    shown = where.get(name, "a matrix as a table")
    if name == "MeshRegion":
        title = "[mesh.regions.NAME]"
    elif name == "Finder":
        title = "A point found in the mesh"
    elif name == "OwnLimits":
        title = "[[severity.limits]]"
    else:
        title = f"`{shown}` of `{key}`" if name in where else f"{shown[0].upper()}{shown[1:]}"
    return f"### {title}\n\n{_plain(table['description'])}\n\n{_rows_of(name, table)}"


def _units_part() -> str:
    from vib.units import KINDS

    lines = [
        "## [units]",
        "",
        "What a bare number means, by kind of quantity. Areas and second moments follow the length unless",
        'they are declared themselves. `output = "si"` (the default) or `"us"` chooses the units of results.',
        "",
        "| key | what it is for | SI unit | shown in SI | shown in US units |",
        "|---|---|---|---|---|",
    ]
    lines += [
        f"| `{key}` | {kind.words} | `{kind.si}` | `{kind.shown_si}` | `{kind.shown_us}` |"
        for key, kind in KINDS.items()
        if kind.si
    ]
    return "\n".join(lines) + "\n"


def _materials_part() -> str:
    from vib.study.materials import MATERIALS

    lines = [
        "### Built-in materials",
        "",
        "| name | E | Poisson's ratio | density | source |",
        "|---|---|---|---|---|",
    ]
    lines += [
        f"| {one.name} | {one.youngs_modulus / 1e9:g} GPa | {one.poissons_ratio:g} "
        f"| {one.density:g} kg/m^3 | {one.source} |"
        for one in MATERIALS
    ]
    return "\n".join(lines) + "\n"


def _shapes_part() -> str:
    from vib.study.geometry import SHAPES

    lines = ["### Shapes and their dimensions", "", "| shape | needs | may have |", "|---|---|---|"]
    for shape, (_, words) in SHAPES.items():
        needs = ", ".join(f"`{word}`" for word in words.split() if not word.endswith("?"))
        may = ", ".join(f"`{word[:-1]}`" for word in words.split() if word.endswith("?"))
        lines.append(f"| `{json.dumps(shape)}` | {needs} | {may} |")
    lines += [
        "| a designation | nothing | |",
        "| no shape | `area`, `second_moment_y`, `second_moment_z`, `torsion_constant` "
        "| `shear_area_y`, `shear_area_z` |",
    ]
    return "\n".join(lines) + "\n"


_VALIDATION = """# Validation

Results support, and do not replace, review by a licensed engineer under the local code.

This page is generated from the reference tests (`tests/references/`, `python docs/make_pages.py`). Each value
of ours went the way a user's study goes: text of a study, system, modes or ring. Members are cut into pieces
by the program itself. *From memory* means that the source was quoted from memory; the value itself was
computed from the formula it names. The last column bounds the difference by a power of ten, relative to the
reference unless it is marked *absolute*.

The error bar is the one that the program states for its value; it covers the difference, but for what the
reference leaves out that our members always have (stretch, rotary inertia). The tests choose members so
slender that this matters less than 1e-5; in FRAME-L, whose proportions are given, rotary inertia lowers the
modes by up to 4e-4, and in FRAME-PORTAL-EX the mass is carried as points instead.
"""


def validation_page() -> str:
    """The page of every reference check."""
    from tests.references.common import ENTRIES, results
    from tests.references.families import FAMILIES, family_of

    parts = [_VALIDATION]
    for family, title in FAMILIES.items():
        parts.append(f"## {title}\n")
        for name, entry in ENTRIES.items():
            if family_of(name) is family:
                parts.append(_case(entry, results(name)))
    return "\n".join(parts)


def _case(entry: dict[str, Any], checks: Any) -> str:
    memory = " (from memory)" if entry["from_memory"] else ""
    lines = [
        f"### {entry['id']}: {entry['title'].replace('|', chr(92) + '|')}",
        "",
        f"Source{memory}: {entry['source']} [{entry['provenance']}]",
        "",
        "| what | ours | reference | error bar | difference |",
        "|---|---|---|---|---|",
    ]
    lines += [
        f"| {check.what} | {_number(check.ours, check)} | {_number(check.reference, check)} "
        f"| {'' if check.error_bar is None else format(check.error_bar, '.0e')} | {_difference(check)} |"
        for check in checks
    ]
    return "\n".join(lines) + "\n"


def _number(value: complex, check: Any) -> str:
    """Seven digits; what is below the tolerance of an absolute check is 0."""
    if isinstance(value, complex):
        parts = [0.0 if abs(part) < 1e-9 * abs(value) else part for part in (value.real, value.imag)]
        return f"{parts[0]:.6g} {'-' if parts[1] < 0 else '+'} {abs(parts[1]):.6g}i"
    if check.absolute and abs(value) <= max(check.tolerance, 1e-12):
        return "0"
    return f"{float(value):.7g}"


def _difference(check: Any) -> str:
    kind = " absolute" if check.absolute else ""
    for decade in range(-10, 0):
        if check.difference < 10.0**decade:
            return f"below 1e{decade}{kind}"
    return f"{check.difference:.1g}{kind}"


def main() -> None:
    """Write both pages."""
    for name, page in {"study-file.md": study_file_page, "validation.md": validation_page}.items():
        (HERE / name).write_text(page(), encoding="utf-8")
        print(f"docs/{name}")


if __name__ == "__main__":
    main()
