"""The same study with other values in some of its entries, checked as if they had been written there."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from functools import cache, cached_property
from typing import TYPE_CHECKING, Any, get_args

from pydantic import TypeAdapter, ValidationError

from vib.errors import Fault, ModelError, StudyError
from vib.study.lines import Path
from vib.study.names import did_you_mean
from vib.study.tolerances import Exactly, MarkedTable, Tolerance, entry

if TYPE_CHECKING:
    from vib.study.schema import Study

# read again as a whole: single tables, and excitations, of which one may follow the speed of another
_WHOLE = {"mesh", "damping", "impact", "base_motion", "response", "severity", "matrices", "excitations"}


@dataclass(frozen=True)
class Source:
    """What a study was read from: its tables as written, the declared units, the tolerances found."""

    raw: Mapping[str, Any]
    units: Mapping[str, str]
    tolerances: Mapping[str, Tolerance]

    @cached_property
    def entries(self) -> dict[str, Path]:
        """The path of every entry, by its name."""
        return {entry(path): path for path in _leaves(self.raw, ())}


def vary(study: Study, values: Mapping[str, float]) -> tuple[Study, dict[str, str]]:
    """The study with SI values in the place of entries, and the kind of each of these entries.

    Only the tables that hold the entries are read again, so that this costs well under a millisecond for a
    handful of them.

    Raises
    ------
    StudyError
        There is no such entry, it is no quantity, or a value is none that it may have.
    ModelError
        The study was not read from a file.
    """
    source = study._source
    if source is None:
        raise ModelError("only a study that was read with vib.read can vary: its entries are read again")
    raw: Any = source.raw
    tables: dict[Path, list[str]] = {}
    for name, value in values.items():
        path = _find(study, source, name)
        placed = Exactly(value)
        placed.path = path
        raw = _with(raw, path, placed)
        head = path[:1] if path[0] in _WHOLE or len(path) == 1 else path[:2]
        tables.setdefault(head, []).append(name)
    kinds: dict[str, str] = {}
    changed: dict[str, Any] = {}
    for head, names in tables.items():
        key = str(head[0])
        context = {"units": source.units, "kinds": kinds}
        try:
            read = _adapter(type(study), key, len(head) == 1).validate_python(_at(raw, head), context=context)
        except ValidationError as error:
            raise _fault(study, head, error, {name: values[name] for name in names}) from None
        before = changed.get(key, getattr(study, key))
        changed[key] = read if len(head) == 1 else _replaced(before, head[1], read)
    for name in values:
        if name not in kinds:
            raise StudyError(_shown(study), [Fault(name, "is no quantity that could vary")])
    varied = study.model_copy(update=changed)
    varied._one_way()  # type: ignore[operator]  # what holds between tables
    left = {name: tolerance for name, tolerance in source.tolerances.items() if name not in values}
    varied._source = Source(raw, source.units, left)
    return varied, kinds


def _fault(study: Study, head: Path, error: ValidationError, values: Mapping[str, float]) -> StudyError:
    from vib.study.reading import _finding

    detail = error.errors(include_url=False)[0]
    path, message = _finding({**detail, "loc": (*head, *detail["loc"])})
    given = ", ".join(f"{name} = {value:.6g}" for name, value in values.items())
    return StudyError(_shown(study), [Fault(entry(path), f"{message} (with {given} in SI units)")])


def _shown(study: Study) -> str:
    return str(study.file) if study.file is not None else study.title


def _at(raw: Any, head: Path) -> Any:
    for step in head:
        raw = raw[step]
    return raw


@cache
def _adapter(model: type[Study], key: str, whole: bool) -> TypeAdapter[Any]:
    """What reads a table at the top of a study, or one row of it."""
    annotation: Any = model.model_fields[key].annotation
    if whole:
        return TypeAdapter(annotation)
    arguments = get_args(annotation)  # of tuple[Row, ...] or dict[Name, Row]
    return TypeAdapter(arguments[0] if annotation.__origin__ is tuple else arguments[1])


def _replaced(rows: Any, step: str | int, row: Any) -> Any:
    if isinstance(rows, tuple):
        return tuple(row if number == step else kept for number, kept in enumerate(rows))
    return {**rows, step: row}


def _with(raw: Any, path: Path, value: Any) -> Any:
    """A copy of nested tables and lists with another value at a path; tables on the way are made."""
    if not path:
        return value
    step, rest = path[0], path[1:]
    if isinstance(raw, list):
        return [_with(kept, rest, value) if number == step else kept for number, kept in enumerate(raw)]
    table = dict(raw) if isinstance(raw, dict) and not isinstance(raw, MarkedTable) else {}
    table[step] = _with(table.get(step), rest, value)
    return table


def _find(study: Study, source: Source, name: str) -> Path:
    """The path of an entry that the file has, or that it could have."""
    known = source.entries
    if name in known:
        return known[name]
    path: Path = tuple(
        int(step) if step.isdigit() else step for step in name.replace("[", ".").replace("]", "").split(".")
    )
    table: Any = source.raw
    for depth, step in enumerate(path[:-1]):
        inside = step in table if isinstance(table, dict) else isinstance(step, int) and step < len(table)
        if not inside and (depth == 0 or isinstance(table, list) or isinstance(step, int)):
            raise _unknown(study, name, known)
        table = table[step] if inside else {}
        if not isinstance(table, dict | list):
            raise _unknown(study, name, known)
    return path


def _unknown(study: Study, name: str, known: Mapping[str, Path]) -> StudyError:
    return StudyError(_shown(study), [Fault(name, f"there is no such entry{did_you_mean(name, known)}")])


def _leaves(raw: Any, path: Path) -> Iterator[Path]:
    if isinstance(raw, dict) and not isinstance(raw, MarkedTable):
        for key, value in raw.items():
            yield from _leaves(value, (*path, key))
    elif isinstance(raw, list):
        for number, value in enumerate(raw):
            yield from _leaves(value, (*path, number))
    else:
        yield path
