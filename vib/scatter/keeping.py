"""A folder that keeps what is done of a run, so that it can be taken up again."""

from __future__ import annotations

import io
import json
import os
from collections.abc import Mapping
from pathlib import Path
from typing import Any
from zipfile import BadZipFile

import numpy as np
from numpy.typing import NDArray

from vib.errors import ModelError

_HEADER = "run.json"


class Kept:
    """The chunks of one run in a folder: one file each, and one that says which run it is."""

    def __init__(self, folder: Path, fingerprint: str, chunks: int) -> None:
        """Open or make the folder.

        Raises
        ------
        ModelError
            It keeps another run, or can't be written to.
        """
        self.folder, self.chunks = folder, chunks
        header = folder / _HEADER
        try:
            folder.mkdir(parents=True, exist_ok=True)
            found = json.loads(header.read_text(encoding="utf-8")) if header.exists() else None
            if found is None:
                _write(header, json.dumps({"fingerprint": fingerprint, "chunks": chunks}).encode())
        except (OSError, ValueError) as error:
            raise ModelError(f"{folder}: what is done can't be kept there ({error})") from None
        if found is not None and (not isinstance(found, dict) or found.get("fingerprint") != fingerprint):
            raise ModelError(
                f"{folder}: keeps parts of another run, of another study, other samples or another version; "
                "name another folder, or remove this one"
            )

    def load(self) -> dict[int, Mapping[str, NDArray[Any]]]:
        """The chunks that are there, by their number; a damaged file counts as not there."""
        found: dict[int, Mapping[str, NDArray[Any]]] = {}
        for number in range(self.chunks):
            try:
                memory = io.BytesIO(self._file(number).read_bytes())
                with np.load(memory, allow_pickle=False) as stored:
                    found[number] = {name: stored[name] for name in stored.files}
            except (OSError, ValueError, EOFError, BadZipFile, KeyError):
                continue
        return found

    def save(self, number: int, arrays: Mapping[str, NDArray[Any]]) -> None:
        """Write a chunk; a file is either whole or not there.

        Raises
        ------
        ModelError
            It can't be written.
        """
        memory = io.BytesIO()
        np.savez(memory, **arrays)  # type: ignore[arg-type]
        try:
            _write(self._file(number), memory.getvalue())
        except OSError as error:
            raise ModelError(f"{self.folder}: what is done can't be kept there ({error})") from None

    def _file(self, number: int) -> Path:
        return self.folder / f"chunk-{number:06d}.npz"


def _write(file: Path, content: bytes) -> None:
    beside = file.with_name(f"{file.name}.{os.getpid()}.part")
    try:
        beside.write_bytes(content)
        os.replace(beside, file)
    finally:
        beside.unlink(missing_ok=True)
