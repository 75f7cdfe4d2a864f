"""From a file to a study: parse, check the names, type the entries, and report every fault at once."""

from __future__ import annotations

import tomllib
from collections.abc import Iterable
from pathlib import Path as FilePath
from typing import Any, get_args

from pydantic import BaseModel, ValidationError

from vib.errors import Fault, StudyError
from vib.study.lines import Path, find_line, line_numbers
from vib.study.matrices import load_matrices
from vib.study.names import Finding, check_names, did_you_mean
from vib.study.schema import Study, Units
from vib.study.tolerances import Tolerance, check_tolerances, mark
from vib.study.varying import Source
from vib.units import KINDS

_LARGEST_FILE = 50 * 2**20
_NAMED = {
    "members": "members",
    "springs": "spring",
    "bodies": "body",
    "excitations": "excitation",
    "loads": "load",
}


def read(path: str | FilePath) -> Study:
    """Read a study file.

    Parameters
    ----------
    path
        A TOML study file.

    Returns
    -------
    Study
        Frozen; SI floats inside.

    Raises
    ------
    StudyError
        The file cannot be read, or has faults: every fault that could be found, each with its entry
        and line.
    """
    if not isinstance(path, (str, FilePath)):
        raise StudyError(repr(path), [Fault("", "the path of a study file is needed, as text or a Path.")])
    file = FilePath(path)
    text = _text_of(file)
    raw = _parse(text, file)
    lines = line_numbers(text)
    findings = list(check_names(raw))
    study = None
    tolerances: dict[str, Tolerance] = {}
    marked = mark(_with_names(raw))
    try:
        units = _units(raw)
        study = Study.model_validate(marked, context={"units": units, "tolerances": tolerances})
    except ValidationError as error:
        findings += [_finding(detail) for detail in error.errors(include_url=False)]
    findings += check_tolerances(tolerances)
    if study is None or findings:
        raise StudyError(str(path), _faults(findings, lines))
    study._file = file
    study._source = Source(marked, units, tolerances)
    if study.mesh is not None and not (file.parent / study.mesh.file).is_file():
        missing = f'there is no file "{study.mesh.file}" beside the study'
        raise StudyError(str(path), _faults([(("mesh", "file"), missing)], lines))
    if study.matrices is not None:
        loaded, faults = load_matrices(study.matrices, file.parent, units)
        if faults:
            placed = [Fault(f.entry, f.message, find_line(tuple(f.entry.split(".")), lines)) for f in faults]
            raise StudyError(str(path), placed)
        study._loaded = loaded
    study._records = _records(study, file, lines, str(path))
    return study


def _records(study: Study, file: FilePath, lines: Any, shown: str) -> dict[str, Any]:
    if not study.loads and study.base_motion is None:
        return {}
    from vib.study.records import load_records

    records, faults = load_records(study, file.parent)
    if faults:
        placed = [Fault(f.entry, f.message, find_line(_path_of(f.entry), lines)) for f in faults]
        raise StudyError(shown, placed)
    return records


def _path_of(entry: str) -> Path:
    """The path of an entry such as ``loads[0].file``."""
    steps = entry.replace("[", ".").replace("]", "").split(".")
    return tuple(int(step) if step.isdigit() else step for step in steps)


def _text_of(file: FilePath) -> str:
    try:
        if file.is_dir():
            raise StudyError(str(file), [Fault("", "is a folder; wanted a study file (.toml)")])
        if file.stat().st_size > _LARGEST_FILE:
            raise StudyError(
                str(file), [Fault("", "is larger than 50 MiB; put large matrices into .mtx or .npz files")]
            )
        return file.read_bytes().decode("utf-8-sig")
    except StudyError:
        raise
    except FileNotFoundError:
        raise StudyError(str(file), [Fault("", "there is no such file")]) from None
    except UnicodeDecodeError as error:
        raise StudyError(str(file), [Fault("", f"is not UTF-8 text (byte {error.start})")]) from None
    except OSError as error:
        raise StudyError(str(file), [Fault("", f"cannot be read: {error.strerror or error}")]) from None
    except ValueError as error:  # a null byte in the path
        raise StudyError(str(file), [Fault("", f"cannot be read: {error}")]) from None


def _parse(text: str, file: FilePath) -> dict[str, Any]:
    try:
        return tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        raise StudyError(str(file), [Fault("", f"is not valid TOML: {error}")]) from None
    except RecursionError:
        raise StudyError(
            str(file), [Fault("", "is not valid TOML: lists or tables are nested too deeply")]
        ) from None
    except ValueError as error:  # e.g. an integer of more digits than Python converts
        raise StudyError(str(file), [Fault("", f"is not valid TOML: {error}")]) from None


def _units(raw: dict[str, Any]) -> dict[str, str]:
    """The declared units. The schema reports entries that are wrong; here SI stands in for them, so that
    the bare numbers that they are for are not reported as well."""
    table = raw.get("units")
    good: dict[str, Any] = {}
    for kind, unit in table.items() if isinstance(table, dict) else ():
        try:
            Units.model_validate({kind: unit})
            good[kind] = unit
        except ValidationError:
            if kind in KINDS and KINDS[kind].si:
                good[kind] = KINDS[kind].si
    return Units.model_validate(good).declared()


def _with_names(raw: dict[str, Any]) -> dict[str, Any]:
    """A name for each table that has none, such as "members 2", so that results can be told apart."""
    named = dict(raw)
    for table, word in _NAMED.items():
        rows = raw.get(table)
        if isinstance(rows, list):
            named[table] = [
                {"name": f"{word} {i + 1}", **row} if isinstance(row, dict) else row
                for i, row in enumerate(rows)
            ]
    return named


def _finding(detail: Any) -> Finding:
    """One of pydantic's errors in our words."""
    # steps in brackets are pydantic's own: "[key]", and the kinds of a point
    path: Path = tuple(step for step in detail["loc"] if not str(step).startswith("["))
    kind = detail["type"]
    if kind == "extra_forbidden":
        known = _known_keys(path[:-1])
        hint = did_you_mean(str(path[-1]), known) or (f" (known here: {', '.join(known)})" if known else "")
        return path, f"unknown key{hint}"
    if kind == "missing":
        return path, "is missing"
    if kind == "value_error":
        return path, str(detail["ctx"]["error"])
    if kind in ("model_type", "dict_type", "model_attributes_type"):
        return path, "expected a table"
    if kind in ("tuple_type", "list_type"):
        return path, "expected a list" + (" of tables ([[...]])" if len(path) == 1 else "")
    if kind in ("too_long", "too_short"):
        got = detail["ctx"]["actual_length"]
        if kind == "too_short":
            return path, f"expected at least {detail['ctx']['min_length']} in the list, got {got}"
        return path, f"expected a list of {detail['ctx']['max_length']}, got {got}"
    message = str(detail["msg"])
    return path, message[0].lower() + message[1:]


def _known_keys(path: Path) -> list[str]:
    """The keys that the table at a path may have."""
    model: Any = Study
    for step in path:
        if isinstance(step, int) or model is None:
            continue
        if step in getattr(model, "model_fields", {}):
            annotation = Units if step == "units" else model.model_fields[step].annotation
            model = _model_in(annotation)
    return list(model.model_fields) if model is not None else []


def _model_in(annotation: Any) -> type[BaseModel] | None:
    if isinstance(annotation, type) and issubclass(annotation, BaseModel):
        return annotation
    return next((found for part in get_args(annotation) if (found := _model_in(part))), None)


def _faults(findings: Iterable[Finding], lines: Any) -> list[Fault]:
    """Faults in the order of the file, each once."""
    faults: dict[tuple[str, str], Fault] = {}
    for path, message in findings:
        entry = "".join(f"[{step}]" if isinstance(step, int) else f".{step}" for step in path).lstrip(".")
        faults.setdefault((entry, message), Fault(entry, message, find_line(path, lines)))
    return sorted(faults.values(), key=lambda fault: fault.line or 0)
