"""Where an entry stands in a TOML file: the parser of the standard library does not say."""

from __future__ import annotations

import re
from collections.abc import Mapping

_KEY = r"""(?:[A-Za-z0-9_-]+|"(?:[^"\\]|\\.)*"|'[^']*')"""
_DOTTED = rf"{_KEY}(?:\s*\.\s*{_KEY})*"
_HEADER = re.compile(rf"\s*(\[\[?)\s*({_DOTTED})\s*\]")
_ENTRY = re.compile(rf"\s*({_DOTTED})\s*=")
_TOKEN = re.compile(r'"""|\'\'\'|"(?:[^"\\]|\\.)*"|\'[^\']*\'|#.*|[\[\]{}]')

Path = tuple[str | int, ...]


def line_numbers(text: str) -> Mapping[Path, int]:
    """Line (from 1) of each table and of each entry that starts a line, by its path in the file.

    Lists of tables count from 0: ``("members", 2, "section")``. Entries inside inline tables and lists
    are not listed; `find_line` falls back on what holds them.
    """
    found: dict[Path, int] = {}
    counts: dict[Path, int] = {}
    table: Path = ()
    depth, quote = 0, ""  # open brackets, and the open multi-line quote: such lines start no entry
    for number, line in enumerate(text.splitlines(), start=1):
        start = 0
        if depth == 0 and not quote:
            if header := _HEADER.match(line):
                table = _resolve(header[2], header[1] == "[[", counts)
                found.setdefault(table, number)
                continue
            if entry := _ENTRY.match(line):
                found.setdefault(table + _keys(entry[1]), number)
                start = entry.end()
        depth, quote = _scan(line, start, depth, quote)
    return found


def find_line(path: Path, found: Mapping[Path, int]) -> int | None:
    """The line of an entry, or of the nearest table or list that holds it."""
    for length in range(len(path), 0, -1):
        if path[:length] in found:
            return found[path[:length]]
    return None


def _keys(dotted: str) -> Path:
    return tuple(key.strip("\"'") for key in re.findall(_KEY, dotted))


def _resolve(dotted: str, is_list: bool, counts: dict[Path, int]) -> Path:
    """The path of a header, with the position of each list of tables put in."""
    path: Path = ()
    keys = _keys(dotted)
    for position, key in enumerate(keys):
        path += (key,)
        if is_list and position == len(keys) - 1:
            counts[path] = counts.get(path, -1) + 1
        if path in counts:
            path += (counts[path],)
    return path


def _scan(line: str, start: int, depth: int, quote: str) -> tuple[int, str]:
    """Brackets and the multi-line quote left open at the end of a line."""
    while start < len(line):
        if quote:
            end = line.find(quote, start)
            if end < 0:
                return depth, quote
            start, quote = end + 3, ""
            continue
        token = _TOKEN.search(line, start)
        if token is None:
            break
        start = token.end()
        if token[0] in ('"""', "'''"):
            quote = token[0]
        elif token[0] in "[{":
            depth += 1
        elif token[0] in "]}":
            depth = max(0, depth - 1)
    return depth, quote
