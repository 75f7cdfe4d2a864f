"""Files that end: some of meshio's readers wait for a line for ever where a file is cut short."""

from __future__ import annotations

import contextlib
import io
from collections.abc import Iterator
from typing import Any

_PATIENCE = 100  # readers may ask once or twice at the end


class _Bytes(io.BufferedReader):
    """A file opened for reading bytes."""

    empty = 0

    def readline(self, size: int | None = -1, /) -> bytes:
        """The next line; raises where it is asked for again and again after the last one."""
        line = super().readline(size)
        self.empty = 0 if line else self.empty + 1
        _check(self.empty)
        return line


class _Text(io.TextIOWrapper):
    """A file opened for reading text."""

    empty = 0

    def readline(self, size: int = -1, /) -> str:  # type: ignore[override]
        """See above."""
        line = super().readline(size)
        self.empty = 0 if line else self.empty + 1
        _check(self.empty)
        return line


def _check(empty: int) -> None:
    if empty > _PATIENCE:
        raise EOFError("it ends too early")


def _opened(path: Any, mode: str = "r", *more: Any, **named: Any) -> Any:
    if mode == "rb":
        return _Bytes(io.FileIO(path))
    if mode in ("r", "rt") and not more and not named:
        return _Text(io.BufferedReader(io.FileIO(path)), encoding="utf-8")
    return open(path, mode, *more, **named)


@contextlib.contextmanager
def files_end() -> Iterator[None]:
    """While this lasts, meshio opens files that end."""
    from meshio import _files

    _files.open = _opened
    try:
        yield
    finally:
        del _files.open
