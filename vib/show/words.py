"""The sentences that every answer carries: stability, completeness, caution."""

from __future__ import annotations

from typing import TYPE_CHECKING

from vib.show.blocks import Sentence
from vib.show.numbers import significant

if TYPE_CHECKING:
    from vib.modes import Modes

CAUTION = "Results support, and do not replace, review by a licensed engineer under the local code."


def caution() -> Sentence:
    """The line at the end of every screen and page."""
    return Sentence(CAUTION, "quiet")


def stability(modes: Modes) -> Sentence:
    """Whether every motion dies away, stays, or grows."""
    growing = [number for number, value in enumerate(modes.eigenvalues, start=1) if value.real > 0]
    if not modes.stable:
        which = f": {numbered(growing)} of the table" if growing else ""
        return Sentence(f"The system is UNSTABLE: motion once started grows by itself{which}.", "bad")
    if not modes.stability_known:
        return Sentence(
            "NOT SHOWN TO BE STABLE: no mode of the table grows, but forces can feed energy in, "
            "and whether a faster one grows is not known.",
            "bad",
        )
    return Sentence("The system is stable: no motion grows by itself.", "good")


def numbered(numbers: list[int]) -> str:
    """Numbers of modes in words: "mode 3", "modes 1, 2 and 5"."""
    from vib.show.numbers import joined

    return ("mode " if len(numbers) == 1 else "modes ") + joined([str(number) for number in numbers])


def completeness(modes: Modes) -> Sentence:
    """Whether a mode may be missing below the last one found."""
    if modes.complete_below_hz is None:
        return Sentence(
            "Completeness was not checked: a mode between those listed may be missing.", "careful"
        )
    if modes.complete_below_hz == float("inf"):
        return Sentence("The list is complete: all modes of the system were computed.", "good")
    limit = significant(modes.complete_below_hz, 5)
    return Sentence(f"The list is complete below {limit} Hz: no mode is missing there.", "good")


def rigid_motion(modes: Modes) -> list[Sentence]:
    """What moves freely, without any stiffness; nothing where all is held."""
    if not modes.rigid_body_count:
        return []
    count = modes.rigid_body_count
    head = "1 motion meets no stiffness (0 Hz)" if count == 1 else f"{count} motions meet no stiffness (0 Hz)"
    if not modes.rigid_descriptions:
        return [Sentence(f"{head}.", "careful")]
    motions = "; ".join(described.rstrip(". ") for described in modes.rigid_descriptions)
    return [Sentence(f"{head}: {motions}.", "careful")]
