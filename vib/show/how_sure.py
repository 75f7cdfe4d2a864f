"""The section of the page about tolerances: how sure its figures are."""

from __future__ import annotations

from typing import TYPE_CHECKING

from vib.show.blocks import Sentence
from vib.show.figures.scatter import scatter_pictures
from vib.show.sections import Section, drawings
from vib.show.tables.scatter import scatter_parts, verdict
from vib.units import UnitSystem

if TYPE_CHECKING:
    from vib.scatter.scatter import Scatter


def scatter_words(found: Scatter | None) -> list[Sentence]:
    """What the head of the page says about the tolerances; nothing where there are none."""
    return [] if found is None else verdict(found)


def scatter_sections(found: Scatter | None, units: UnitSystem) -> list[Section]:
    """What the tolerances of the study do; no section where it states none."""
    if found is None:
        return []
    blocks = scatter_parts(found, units)
    pictures = drawings(scatter_pictures(found, units), "scatter")
    more = Sentence("vib scatter draws more samples, and gives every figure as data.", "quiet")
    return [Section("How sure", "scatter", (*blocks, *pictures, more))]
