"""The line that says how far long work is."""

from __future__ import annotations

import io

import pytest

from vib.cli import progress_line
from vib.cli.progress_line import ProgressLine
from vib.progress import tell


class Terminal(io.StringIO):
    def isatty(self) -> bool:
        return True


@pytest.fixture
def at_once(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(progress_line, "PATIENCE_S", 0.0)
    monkeypatch.setenv("TERM", "xterm")
    monkeypatch.setenv("COLUMNS", "60")


@pytest.mark.usefixtures("at_once")
def test_what_is_told_shows_on_a_terminal_and_vanishes() -> None:
    screen = Terminal()
    line = ProgressLine()
    with line.shown(screen, quiet=False):
        tell("searching modes", 0.25, 130.0)
        tell("searching modes", 0.26, 120.0)  # too soon after the other
        tell("assembling")
    assert screen.getvalue() == "\rsearching modes, 25 %, about 2 min left\x1b[K\rassembling\x1b[K\r\x1b[K"


@pytest.mark.usefixtures("at_once")
def test_long_lines_are_cut_to_the_width() -> None:
    screen = Terminal()
    with ProgressLine().shown(screen, quiet=False):
        tell("x" * 100)
    assert screen.getvalue().split("\x1b")[0] == "\r" + 59 * "x"


@pytest.mark.usefixtures("at_once")
@pytest.mark.parametrize(("stream", "quiet"), [(io.StringIO(), False), (Terminal(), True), (None, False)])
def test_nothing_without_a_terminal_or_where_quiet_was_asked(stream: io.StringIO | None, quiet: bool) -> None:
    with ProgressLine().shown(stream, quiet=quiet):
        tell("searching modes", 0.5, 1.0)
    assert stream is None or stream.getvalue() == ""


def test_quick_work_says_nothing(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("TERM", "xterm")
    screen = Terminal()
    with ProgressLine().shown(screen, quiet=False):
        tell("searching modes", 0.5, 1.0)
    assert screen.getvalue() == ""


def test_nobody_listens_outside() -> None:
    tell("searching modes", 0.5, 1.0)
