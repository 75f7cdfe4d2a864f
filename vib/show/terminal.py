"""Blocks as text for a terminal or a pipe, laid out by rich."""

from __future__ import annotations

import io
from collections.abc import Sequence
from typing import TYPE_CHECKING

from vib.show.blocks import SYMBOLS, Block, Bullets, Facts, Heading, Sentence, Table, Tone, unit_label

if TYPE_CHECKING:
    from rich.console import Console
    from rich.table import Table as Grid

_STYLES: dict[Tone, str] = {
    "plain": "",
    "good": "green",
    "careful": "yellow",
    "bad": "bold red",
    "quiet": "dim",
}
_LEAST_WIDTH, _GREATEST_WIDTH = 60, 120
_UNBOUNDED = 1000


def render(blocks: Sequence[Block], *, width: int = 80, colour: bool = False) -> str:
    """The blocks as text.

    Parameters
    ----------
    blocks
        What to show, in this order.
    width
        Columns of the terminal; held between 60 and 120.
    colour
        Whether to write colour codes.
    """
    from rich.console import Console

    held = min(max(width, _LEAST_WIDTH), _GREATEST_WIDTH)
    console = Console(
        file=io.StringIO(),
        width=held,
        force_terminal=colour,
        color_system="standard" if colour else None,
        no_color=not colour,
        legacy_windows=False,
        highlight=False,
        markup=False,
        emoji=False,
    )
    for position, block in enumerate(blocks):
        if position and not (isinstance(block, Sentence) and isinstance(blocks[position - 1], Sentence)):
            console.print()
        _print(console, block)
    written = console.file.getvalue()  # type: ignore[attr-defined]
    return "\n".join(line.rstrip() for line in written.split("\n"))


def _print(console: Console, block: Block) -> None:
    from rich.text import Text

    if isinstance(block, Heading):
        console.print(Text(block.text, style="bold"))
    elif isinstance(block, Sentence):
        symbol = SYMBOLS[block.tone]
        line = Text(f"{symbol} {block.text}" if symbol else block.text, style=_STYLES[block.tone])
        console.print(line)
    elif isinstance(block, Facts):
        width = max((len(name) for name, _ in block.rows), default=0) + 2
        for name, value in block.rows:
            _hang(console, name.ljust(width), value)
    elif isinstance(block, Bullets):
        for row in block.rows:
            _hang(console, "- ", row)
    else:
        if block.title:
            console.print(Text(block.title, style="bold"))
        grid = _grid(block)
        # a table that can't be made narrow enough runs over the edge; nothing is cut off
        least = console.measure(grid, options=console.options.update(max_width=_UNBOUNDED)).minimum
        console.print(grid, width=max(console.width, least), crop=False, soft_wrap=False)


def _hang(console: Console, first: str, text: str) -> None:
    """Text after a first piece, further lines set in."""
    from rich.text import Text

    for line in Text(text).wrap(console, max(console.width - len(first), 20)):
        console.print(Text(first) + line)
        first = " " * len(first)


def _grid(block: Table) -> Grid:
    from rich import box
    from rich.table import Table as Grid
    from rich.text import Text

    grid = Grid(box=box.SIMPLE_HEAD, show_edge=False, pad_edge=False, padding=(0, 1), header_style="")
    for column in block.columns:
        heading = f"{column.heading}\n{unit_label(column.unit)}" if column.unit else column.heading
        widest = max((len(row[len(grid.columns)]) for row in block.rows), default=0)
        grid.add_column(
            Text(heading),
            justify="right" if column.figures else "left",
            vertical="top",
            overflow="fold",
            min_width=widest if column.figures else min(widest, 12),
        )
    plain: Tone = "plain"
    tones = block.tones or (plain,) * len(block.rows)
    for number, (row, tone) in enumerate(zip(block.rows, tones, strict=True)):
        if block.sums and number == len(block.rows) - block.sums:
            grid.add_section()
        grid.add_row(*(Text(cell) for cell in row), style=_STYLES[tone])
    return grid


# what stands for a character that the stream can't show
_PLAINER = {
    "±": "+/-", "✓": "OK:", "▲": "NOTE:", "✗": "WARNING:", "²": "^2", "³": "^3", "⁴": "^4",
    "·": ".", "×": "x", "–": "-", "—": "-", "−": "-", "─": "-", "≤": "<=", "≥": ">=", "°": " deg",
    "…": "...", "µ": "u", "μ": "u",
}  # fmt: skip


def plainer(text: str, encoding: str | None) -> str:
    """The text in characters that the encoding has; others are spelled out or escaped."""
    try:
        text.encode(encoding or "ascii")
        return text
    except UnicodeEncodeError:
        pass
    except LookupError:
        encoding = "ascii"
    codec = encoding or "ascii"
    return "".join(_fitting(character, codec) for character in text)


def _fitting(character: str, codec: str) -> str:
    try:
        character.encode(codec)
        return character
    except UnicodeEncodeError:
        spelled = _PLAINER.get(character)
        return spelled if spelled is not None else character.encode("ascii", "backslashreplace").decode()
