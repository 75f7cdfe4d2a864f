"""What an answer is made of before anyone sees it: tables and sentences as plain data.

The terminal and the page render the same blocks, so that they can't tell different stories.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

Tone = Literal["plain", "good", "careful", "bad", "quiet"]

# a symbol beside the colour, so that a grey print and a colour-blind reader lose nothing
SYMBOLS: dict[Tone, str] = {"plain": "", "good": "✓", "careful": "▲", "bad": "✗", "quiet": ""}


@dataclass(frozen=True)
class Column:
    """One column: its heading, the unit of its figures, and whether it holds figures (right-aligned)."""

    heading: str
    unit: str = ""
    figures: bool = True


@dataclass(frozen=True)
class Table:
    """Rows of text under headings. ``sums`` rows at the end are set apart; ``tones`` colour whole rows."""

    title: str
    columns: tuple[Column, ...]
    rows: tuple[tuple[str, ...], ...]
    sums: int = 0
    tones: tuple[Tone, ...] = ()


@dataclass(frozen=True)
class Heading:
    """A title."""

    text: str


@dataclass(frozen=True)
class Sentence:
    """A sentence or two; the tone chooses symbol and colour."""

    text: str
    tone: Tone = "plain"


@dataclass(frozen=True)
class Facts:
    """Pairs of a name and a value."""

    rows: tuple[tuple[str, str], ...]


@dataclass(frozen=True)
class Bullets:
    """A list of sentences."""

    rows: tuple[str, ...]


Block = Bullets | Table | Heading | Sentence | Facts


def unit_label(unit: str) -> str:
    """A unit as it is printed: "kg m^2" is "kg·m²"."""
    for plain, raised in (("^2", "²"), ("^3", "³"), ("^4", "⁴")):
        unit = unit.replace(plain, raised)
    return unit if "%" in unit or " to " in unit or "±" in unit else unit.replace(" ", "·")


def text_column(heading: str) -> Column:
    """A column of words, left-aligned."""
    return Column(heading, figures=False)
