"""How far long work is: one line on a terminal's standard error, which goes before all else."""

from __future__ import annotations

import math
import os
import time
from collections.abc import Iterator
from contextlib import contextmanager, suppress
from typing import TextIO

from vib.progress import listening

PATIENCE_S, INTERVAL_S = 1.0, 0.2


class ProgressLine:
    """One line that is written over; silent through the first second, and wherever there is no terminal."""

    def __init__(self) -> None:
        self._stream: TextIO | None = None
        self._began, self._last = math.inf, -math.inf
        self._work, self._shown = "", False

    @contextmanager
    def shown(self, stream: TextIO | None, *, quiet: bool) -> Iterator[None]:
        """Listen to the work done in this block."""
        dumb = os.environ.get("TERM") == "dumb"
        if quiet or dumb or stream is None or stream.closed or not stream.isatty():
            yield
            return
        self._stream, self._began = stream, time.monotonic()
        try:
            with listening(self.hear):
                yield
        finally:
            self.clear()
            self._stream = None

    def hear(self, work: str, share: float | None, seconds_left: float | None) -> None:
        """Show it, unless it is too early or too soon after the last time."""
        now = time.monotonic()
        if now - self._began < PATIENCE_S or (now - self._last < INTERVAL_S and work == self._work):
            return
        self._last, self._work, self._shown = now, work, True
        done = "" if share is None else f", {100 * share:.0f} %"
        left = "" if seconds_left is None else f", about {_rounded(seconds_left)} left"
        self._write(f"{work}{done}{left}")

    def clear(self) -> None:
        """Take the line off the screen."""
        if self._shown:
            self._shown = False
            self._write("")

    def _write(self, text: str) -> None:
        if self._stream is None:
            return
        import shutil

        width = shutil.get_terminal_size((80, 24)).columns
        with suppress(OSError, ValueError):
            self._stream.write(f"\r{text[: width - 1]}\x1b[K")
            self._stream.flush()


def _rounded(seconds: float) -> str:
    return f"{seconds:.0f} s" if seconds < 100 else f"{seconds / 60:.0f} min"
