"""What ``vib scatter`` and ``vib sweep`` do."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache
from pathlib import Path
from typing import TYPE_CHECKING, Any, Literal

from vib.cli.delivery import DONE, OBJECTION, Answer, Wish, at_work_on, deliver
from vib.errors import ModelError

if TYPE_CHECKING:
    from vib.scatter.scatter import Scatter
    from vib.study import Study

Chosen = Literal["si", "us"] | None
PAGE_SAMPLES, PAGE_LEVELS, MESH_SAMPLES = 256, 64, 64


@dataclass(frozen=True)
class Running:
    """Which modes, and where the work is done."""

    count: int | None = None
    up_to: str | None = None
    workers: int | None = None
    cluster: str | None = None
    resume: Path | None = None

    def arguments(self) -> dict[str, Any]:
        """As the functions take them."""
        return {
            "count": self.count,
            "up_to": self.up_to,
            "workers": self.workers,
            "cluster": self.cluster,
            "resume_in": self.resume,
        }


def show_scatter(
    path: Path,
    drawn: tuple[int, int, str, int],
    band: str | None,
    running: Running,
    units: Chosen,
    pictures: str,
    wish: Wish,
) -> int:
    """Draw the tolerances of a study; ``drawn`` is samples, seed, method, and samples with levels."""
    with at_work_on(path, wish) as study:
        from vib.scatter.scatter import scatter
        from vib.show.tables.scatter import objects, scatter_blocks, scatter_document

        shown = units or study.output_units
        samples, seed, method, levels = drawn
        found = scatter(
            study,
            samples=samples,
            seed=seed,
            method="sobol" if method == "sobol" else "latin hypercube",
            level_samples=levels,
            band=band,
            **running.arguments(),
        )

        @cache
        def document() -> dict[str, Any]:
            return scatter_document(found)

        def files() -> dict[str, bytes]:
            from vib.show.scatter_files import scatter_files

            return scatter_files(found, document(), shown, pictures)

        answer = Answer(
            scatter_blocks(found, shown),
            document,
            files=files,
            status=OBJECTION if objects(found) else DONE,
        )
        return deliver(answer, wish)


def scatter_of(study: Study, limits: tuple[int | None, str | None], band: str | None) -> Scatter | None:
    """What the tolerances do, by samples few enough for a quick page; None without tolerances."""
    if not study.tolerances:
        return None
    from vib.scatter.scatter import scatter

    count, up_to = limits
    levels = PAGE_LEVELS if study.mesh is None else 0
    return scatter(study, samples=PAGE_SAMPLES, level_samples=levels, count=count, up_to=up_to, band=band)


def show_sweep(
    path: Path,
    vary: tuple[list[str], list[str]],
    grid: tuple[int | None, str, bool],
    running: Running,
    units: Chosen,
    pictures: str,
    wish: Wish,
) -> int:
    """Modes while quantities run from one value to another; ``vary`` holds the entries and all their ends,
    ``grid`` how many values, their spacing, and whether levels are wanted."""
    with at_work_on(path, wish) as study:
        from vib.scatter.sweep import sweep
        from vib.show.tables.sweep import sweep_blocks, sweep_document

        steps, spacing, levels = grid
        found = sweep(
            study,
            _ends(*vary),
            steps=steps,
            spacing="linear" if spacing == "linear" else "logarithmic",
            levels=levels,
            **running.arguments(),
        )
        shown = units or study.output_units

        @cache
        def document() -> dict[str, Any]:
            return sweep_document(found)

        def files() -> dict[str, bytes]:
            from vib.show.scatter_files import sweep_files

            return sweep_files(found, document(), shown, pictures)

        status = DONE if found.stable else OBJECTION
        return deliver(Answer(sweep_blocks(found, shown), document, files=files, status=status), wish)


def _ends(entries: list[str], given: list[str]) -> dict[str, tuple[str, str]]:
    """From and to of each entry; the parser hands over the entries, and all the rest in one list."""
    unknown = [word for word in given if word.startswith("--")]
    if unknown:
        raise ModelError(f"{unknown[0]}: there is no such option")
    if not entries or len(given) != 2 * len(entries):
        raise ModelError(
            'each --vary takes an entry and two values, such as --vary "springs[0].stiffness.x" "1 kN/mm" '
            '"9 kN/mm"'
        )
    if len(set(entries)) != len(entries):
        raise ModelError("--vary: the same entry is given twice")
    return {entry: (given[2 * i], given[2 * i + 1]) for i, entry in enumerate(entries)}
