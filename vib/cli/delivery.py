"""How an answer leaves: results on standard output, all else on standard error, files whole or not at all."""

from __future__ import annotations

import os
import sys
from collections.abc import Callable, Iterator, Mapping, Sequence
from contextlib import contextmanager, suppress
from dataclasses import dataclass, field
from pathlib import Path
from typing import TYPE_CHECKING, Any, TextIO

from vib.cli.progress_line import ProgressLine
from vib.errors import AccuracyError, MatrixError, ModelError, VibError

if TYPE_CHECKING:
    from vib.show.blocks import Block
    from vib.study import Study

DONE, OBJECTION, FAILED, INTERRUPTED = 0, 1, 2, 130


@dataclass(frozen=True)
class Answer:
    """What a command found: blocks to read, a JSON document, remarks, files, and the exit status.

    ``document`` and ``files`` (the content of every file by its name) are made only where they are wanted.
    """

    blocks: Sequence[Block]
    document: Callable[[], Mapping[str, Any]]
    remarks: Sequence[str] = ()
    files: Callable[[], Mapping[str, bytes]] | None = None
    status: int = DONE


@dataclass(frozen=True)
class Wish:
    """How the user wants an answer: as JSON or to read, with files in a folder, with or without remarks."""

    json: bool = False
    out: Path | None = None
    quiet: bool = False
    said: list[str] = field(default_factory=list)
    line: ProgressLine = field(default_factory=ProgressLine)

    def tell(self, text: str) -> None:
        """A line on standard error, once, unless quiet was asked for."""
        if not self.quiet and text not in self.said:
            self.said.append(text)
            self.line.clear()
            write_line(sys.stderr, text)


def deliver(answer: Answer, wish: Wish) -> int:
    """Write the files, then the result, then the remarks; the exit status."""
    from vib.show.documents import to_json
    from vib.show.files import write_files
    from vib.show.terminal import plainer, render

    stream = output()
    wish.line.clear()
    if wish.json:
        shown = to_json(answer.document()) + "\n"
    else:
        width = _width(stream)
        colour = _colourful(stream)
        # spelling out what the stream can't show makes words longer, so it is done before the layout
        shown = plainer(render(answer.blocks, width=width, colour=colour), stream.encoding)
    written = write_files(wish.out, answer.files()) if wish.out is not None and answer.files else []
    put(shown)
    for remark in answer.remarks:
        wish.tell(f"remark: {remark}")
    for path in written:
        wish.tell(f"wrote {path}")
    return answer.status


def output() -> TextIO:
    """Standard output, if there is one.

    Raises
    ------
    VibError
        It is closed.
    """
    stream: TextIO | None = sys.stdout
    if stream is None or stream.closed:
        raise VibError("standard output is closed, so the result can't be written")
    return stream


def put(text: str) -> None:
    """Write a result to standard output, all of it, now."""
    stream = output()
    try:
        stream.write(text)
        stream.flush()
    except BrokenPipeError:
        # whoever read us has seen enough; that is no failure of the work
        go_quiet_on_broken_pipe()
    except OSError as error:
        go_quiet_on_broken_pipe()
        raise VibError(f"standard output can't be written: {error.strerror or error}") from None


def go_quiet_on_broken_pipe() -> None:
    """Point standard output at nothing, so that the flush at exit does not fail again."""
    with suppress(Exception):
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())


def write_line(stream: TextIO | None, text: str) -> None:
    """One line, its control characters made harmless; a stream that is gone is no reason to fail."""
    if stream is None or stream.closed:
        return
    from vib.show.terminal import plainer

    with suppress(OSError):
        stream.write(plainer(harmless(text), stream.encoding) + "\n")
        stream.flush()


def harmless(text: str) -> str:
    """The text with control characters written out, so that no name can steer a terminal."""
    return "".join(
        character if character.isprintable() else character.encode("unicode_escape").decode()
        for character in text
    )


def explain(error: Exception | str, status: int = FAILED) -> int:
    """Say what went wrong, one line per fault, never a traceback; the exit status."""
    if os.environ.get("VIB_DEBUG") and isinstance(error, Exception):
        import traceback

        traceback.print_exception(error)
    for line in _fault_lines(error):
        write_line(sys.stderr, f"error: {line}")
    if hasattr(error, "format_message") and getattr(error, "ctx", None) is not None:
        write_line(sys.stderr, f"Help: {error.ctx.command_path} --help")  # type: ignore[union-attr]
    return status


def _fault_lines(error: Exception | str) -> list[str]:
    if isinstance(error, str):
        return [error]
    if hasattr(error, "faults"):
        return [f"{error.file}: {fault}" for fault in error.faults]  # type: ignore[attr-defined]
    if isinstance(error, VibError):
        about = f"{error.file}: " if error.file else ""
        return [about + line.strip() for line in str(error).splitlines() if line.strip()]
    if hasattr(error, "format_message"):  # the parser's usage errors, whichever package they live in
        return [" ".join(str(error.format_message()).replace("Value error, ", "").split())]
    if isinstance(error, MemoryError):
        return ["not enough memory for this; ask for fewer modes (--count, --up-to) or use a larger machine"]
    name = type(error).__name__
    said = " ".join(str(error).split())
    return [
        f"internal error ({name}{': ' if said else ''}{said}); this is a fault of vib, please report it with "
        "the study file (set VIB_DEBUG=1 to see where it happened)"
    ]


def _width(stream: TextIO) -> int:
    import shutil

    return shutil.get_terminal_size((80, 24)).columns if stream.isatty() or "COLUMNS" in os.environ else 80


def _colourful(stream: TextIO) -> bool:
    """Colour on a terminal only, and not where NO_COLOR is set (no-color.org) or the terminal is dumb."""
    return stream.isatty() and not os.environ.get("NO_COLOR") and os.environ.get("TERM") != "dumb"


@contextmanager
def at_work_on(path: Path, wish: Wish) -> Iterator[Study]:
    """The study; warnings of the libraries become remarks, errors are told which study they are about."""
    import warnings

    from vib.study import read

    def tell(message: Warning | str, category: type[Warning], *place: Any, **more: Any) -> None:
        wish.tell(f"remark: a library warns: {' '.join(str(message).split())} ({category.__name__})")

    with warnings.catch_warnings(), wish.line.shown(sys.stderr, quiet=wish.quiet):
        warnings.showwarning = tell
        try:
            study = read(path)
            _calm_threads(study)
            yield study
        except (ModelError, MatrixError, AccuracyError) as error:
            error.file = str(path)
            raise


def _calm_threads(study: Study) -> None:
    """One BLAS thread for a frame: its matrices are small, and a second thread costs more than it brings."""
    if study.matrices is None and study.mesh is None:
        import scipy.linalg  # noqa: F401  (only a library that is loaded can be told)
        from threadpoolctl import threadpool_limits

        threadpool_limits(1, user_api="blas")
