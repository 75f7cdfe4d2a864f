"""What the page is made of: sections with blocks and drawings."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from vib.show.blocks import Block, Table

if TYPE_CHECKING:
    from vib.show.figures.canvas import Picture


@dataclass(frozen=True)
class Drawing:
    """A picture on the page, as an SVG element, with a caption."""

    svg: str
    caption: str = ""
    small: bool = False


@dataclass(frozen=True)
class Section:
    """A part of the page under its own heading."""

    title: str
    name: str
    items: tuple[Block | Drawing | None, ...]

    @property
    def shown(self) -> list[Block | Drawing | list[Any]]:
        """What there is; small drawings in a row, and tables in a row, are one group."""
        found: list[Any] = []
        for item in self.items:
            if isinstance(item, Table) or (isinstance(item, Drawing) and item.small):
                if not (found and isinstance(found[-1], list) and type(found[-1][0]) is type(item)):
                    found.append([])
                found[-1].append(item)
            elif item is not None:
                found.append(item)
        return found


def drawings(pictures: Sequence[Picture], prefix: str, small: bool = False) -> list[Drawing]:
    """Pictures as drawings, their ids told apart by the prefix."""
    return [Drawing(picture.svg(f"{prefix}-{picture.name}"), small=small) for picture in pictures]
