"""Files that an answer is written to: CSV, npz, and all-or-nothing writing."""

from __future__ import annotations

import contextlib
import csv
import io
import os
import tempfile
from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import Any

from vib.errors import VibError
from vib.show.documents import clean


def csv_bytes(rows: Sequence[Mapping[str, Any]]) -> bytes:
    """Rows of a JSON document as CSV (RFC 4180), nested fields joined by ``_``, SI, full precision."""
    flat = [_flat(clean(row)) for row in rows]
    names = list(dict.fromkeys(name for row in flat for name in row))
    out = io.StringIO(newline="")
    writer = csv.DictWriter(out, names, restval="", lineterminator="\r\n")
    writer.writeheader()
    writer.writerows({name: _harmless(entry) for name, entry in row.items()} for row in flat)
    return out.getvalue().encode("utf-8")


def _flat(row: Mapping[str, Any], before: str = "") -> dict[str, Any]:
    found: dict[str, Any] = {}
    for name, value in row.items():
        if isinstance(value, Mapping):
            found |= _flat(value, f"{before}{name}_")
        else:
            found[before + name] = value
    return found


def _harmless(entry: Any) -> Any:
    """Text that a spreadsheet would run as a formula gets a quote mark before it."""
    return f"'{entry}" if isinstance(entry, str) and entry[:1] in ("=", "+", "-", "@") else entry


def npz_bytes(arrays: Mapping[str, Any]) -> bytes:
    """Arrays as a compressed .npz file without pickles."""
    import numpy as np

    out = io.BytesIO()
    stored: dict[str, Any] = {name: np.asarray(array) for name, array in arrays.items()}
    np.savez_compressed(out, **stored)
    return out.getvalue()


def write_files(folder: Path, contents: Mapping[str, bytes]) -> list[Path]:
    """Write files into a folder, which is made if need be; each appears whole or not at all.

    All are written under temporary names first and renamed when the last one is safe on the disk, so
    that a full disk leaves nothing behind.

    Raises
    ------
    VibError
        The folder or a file in it cannot be written.
    """
    made = _missing_folders(folder)
    staged: list[tuple[str, Path]] = []
    try:
        try:
            folder.mkdir(parents=True, exist_ok=True)
            for name, content in contents.items():
                staged.append((_stage(folder, content), folder / name))
            for temporary, target in staged:
                os.replace(temporary, target)
        except BaseException:
            for temporary, _ in staged:
                with contextlib.suppress(OSError):
                    os.unlink(temporary)
            for empty in made:
                with contextlib.suppress(OSError):
                    empty.rmdir()
            raise
    except (OSError, ValueError) as error:
        raise VibError(f"{folder}: cannot be written: {_reason(error)}") from None
    return [target for _, target in staged]


def write_new(target: Path, content: bytes) -> None:
    """Write a file that is not there yet, whole or not at all.

    Raises
    ------
    VibError
        It is there already, or cannot be written.
    """
    temporary = None
    try:
        temporary = _stage(target.parent, content)
        _publish(temporary, target)
    except FileExistsError:
        raise VibError(f"{target}: is there already and is left as it is; choose another --out") from None
    except (OSError, ValueError) as error:
        raise VibError(f"{target}: cannot be written: {_reason(error)}") from None
    finally:
        if temporary is not None:
            with contextlib.suppress(OSError):
                os.unlink(temporary)


def _publish(temporary: str, target: Path) -> None:
    """Give a finished file its name; fails where the name is taken, if only since a moment."""
    try:
        os.link(temporary, target)
    except FileExistsError:
        raise
    except OSError:  # a file system without links
        with open(target, "xb"):
            pass
        os.replace(temporary, target)


def _stage(folder: Path, content: bytes) -> str:
    handle, name = tempfile.mkstemp(prefix=".vib-", suffix=".part", dir=folder)
    try:
        with os.fdopen(handle, "wb") as file:
            file.write(content)
            file.flush()
            os.fsync(file.fileno())
        os.chmod(name, 0o666 & ~_umask())
    except BaseException:
        with contextlib.suppress(OSError):
            os.unlink(name)
        raise
    return name


def _umask() -> int:
    mask = os.umask(0o022)
    os.umask(mask)
    return mask


def _missing_folders(folder: Path) -> list[Path]:
    """The folders that have to be made, deepest first."""
    return [place for place in (folder, *folder.parents) if not os.path.lexists(place)]


def _reason(error: OSError | ValueError) -> str:
    return str(getattr(error, "strerror", None) or error)
