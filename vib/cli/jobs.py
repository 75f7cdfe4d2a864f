"""What each command does: read, compute, make the answer, deliver it."""

from __future__ import annotations

import json
from functools import cache
from pathlib import Path
from typing import TYPE_CHECKING, Any, Literal

from vib.cli.delivery import DONE, OBJECTION, Answer, Wish, at_work_on, deliver, put

if TYPE_CHECKING:
    from vib.cli.starts import StartOptions
    from vib.modes import Modes
    from vib.response.ring import Ring
    from vib.screening import Screening
    from vib.speeds import SpeedCurves
    from vib.structure.survey import Survey
    from vib.study import Study
    from vib.units import UnitSystem

Chosen = Literal["si", "us"] | None
_USUAL_COUNT = 12
_FEW = 6


def new_study(kind: str | None, out: Path | None, wish: Wish) -> int:
    """Write a starter, or list them."""
    from vib.show.blocks import Facts, Sentence
    from vib.show.files import write_new
    from vib.study.starters import STARTERS, starter_text

    if kind is None:
        listed = Facts(tuple(STARTERS.items()))
        return deliver(Answer([Sentence("Starters, for vib new KIND:"), listed], lambda: STARTERS), wish)
    starter = starter_text(kind)
    target = out if out is not None else Path(f"{kind}.toml")
    write_new(target, starter.encode("utf-8"))
    put(f"{target}\n")
    wish.tell(f"next: vib check {target}")
    return DONE


def check_study(path: Path, units: Chosen, pictures: str, wish: Wish) -> int:
    """Read the study back."""
    with at_work_on(path, wish) as study:
        from vib.show.tables.check import check_blocks, check_document

        survey = _survey(study)

        @cache
        def document() -> dict[str, Any]:
            return check_document(study, survey)

        def files() -> dict[str, bytes]:
            from vib.show.bundles import check_files

            return check_files(study, survey, document(), pictures)

        return deliver(Answer(check_blocks(study, survey, _units(study, units)), document, files=files), wish)


def show_modes(
    path: Path, count: int | None, up_to: str | None, units: Chosen, pictures: str, wish: Wish
) -> int:
    """Natural frequencies and shapes."""
    with at_work_on(path, wish) as study:
        from vib.show.documents import modes_document
        from vib.show.tables.modes import modes_blocks

        modes = _modes(study, count, up_to)
        curves = _curves(study, modes)

        def files() -> dict[str, bytes]:
            from vib.show.bundles import modes_files

            return modes_files(modes, study.title, pictures, study.up, curves)

        answer = Answer(
            modes_blocks(modes, study.title, curves),
            lambda: modes_document(modes, study.title, curves),
            modes.remarks,
            files,
            DONE if modes.stable and modes.stability_known and not _grows_below(curves) else OBJECTION,
        )
        return deliver(answer, wish)


def _grows_below(curves: tuple[SpeedCurves, ...]) -> bool:
    """Whether something grows on the way to the fastest speed that a shaft runs at."""
    return any(row.onset is not None and row.onset.speed_hz <= row.stated_hz for row in curves)


def _curves(study: Study, modes: Modes) -> tuple[SpeedCurves, ...]:
    """The modes against the speed of each shaft that something spins with."""
    if not modes.system.rotations:
        return ()
    from vib.speeds import speed_curves

    orders = {row.name: row.orders for row in study.excitations if row.speed_ranges}
    return tuple(
        speed_curves(modes.system, row.shaft, count=modes.count, orders=orders.get(row.shaft, (1.0,)))
        for row in modes.system.rotations
    )


def _survey(study: Study) -> Survey:
    """The study read back; of a mesh with the factorisations that its modes are found with."""
    from vib.structure.survey import survey

    if study.mesh is None:
        return survey(study)
    from vib.solve.static import static_solver

    return survey(study, static_solver)


def _units(study: Study, chosen: Chosen) -> UnitSystem:
    return chosen or study.output_units


def _modes(study: Study, count: int | None, up_to: str | None) -> Modes:
    """The modes asked for; without a wish the slowest ones, or all of a small set of matrices."""
    if up_to is not None:
        from vib.cli.starts import read_option

        limit = read_option(study, "up-to", up_to, "frequency")
        return study.system(up_to=limit).modes(count=count, up_to=limit)
    system = study.system()
    if count is None and study.matrices is not None and system.size <= _USUAL_COUNT:
        return system.modes()
    return system.modes(count=count or _USUAL_COUNT)


def show_ring(path: Path, options: StartOptions, units: Chosen, pictures: str, wish: Wish) -> int:
    """The free response."""
    with at_work_on(path, wish) as study:
        from vib.cli.starts import start_arguments
        from vib.show.tables.ring import ring_blocks, ring_document, start_words

        arguments = start_arguments(study, options)
        ring = study.system().ring(**arguments)
        shown = _units(study, units)

        @cache
        def document() -> dict[str, Any]:
            return ring_document(ring, study.title)

        def files() -> dict[str, bytes]:
            from vib.show.bundles import ring_files

            return ring_files(ring, document(), shown, pictures)

        answer = Answer(
            ring_blocks(ring, study.title, start_words(arguments, shown), shown),
            document,
            ring.remarks,
            files,
            DONE if ring.stable else OBJECTION,
        )
        return deliver(answer, wish)


def show_screening(path: Path, band: str | None, pictures: str, wish: Wish) -> int:
    """Modes against what shakes the machine."""
    with at_work_on(path, wish) as study:
        from vib.show.tables.screen import screening_blocks, screening_document

        modes = screening_modes(study, band)
        screening = _screened(study, modes, band)
        curves = _curves(study, modes)

        @cache
        def document() -> dict[str, Any]:
            return screening_document(screening, study.title, modes)

        def files() -> dict[str, bytes]:
            from vib.show.bundles import screening_files

            return screening_files(screening, modes, document(), pictures, curves)

        answer = Answer(
            screening_blocks(screening, study.title, study.output_units),
            document,
            [*screening.remarks, *modes.remarks],
            files,
            OBJECTION
            if screening.objections
            or not (screening.stable and modes.stability_known)
            or _grows_below(curves)
            else DONE,
        )
        return deliver(answer, wish)


def _screened(study: Study, modes: Modes, band: str | None) -> Screening:
    """The screening; where forces are stated, with the level at each coincidence."""
    from vib.cli.run_ups import coincidences
    from vib.screening import screen

    found = screen(modes, study.excitations, band=band)
    run_ups = coincidences(study, modes, found)
    if not run_ups:
        return found
    return screen(modes, study.excitations, band=band, run_ups=run_ups, severity=study.severity)


def screening_modes(study: Study, band: str | None) -> Modes:
    """The modes up to the top of the highest band."""
    from vib.screening.lines import highest_needed_hz

    limit = highest_needed_hz(study.excitations, band=band, accuracy=study.accuracy)
    return study.system(up_to=limit).modes(up_to=limit)


def write_report(
    path: Path,
    limits: tuple[int | None, str | None],
    band: str | None,
    units: Chosen,
    out: Path | None,
    wish: Wish,
) -> int:
    """The page; its path is the result."""
    with at_work_on(path, wish) as study:
        from vib.cli.responses import RespondOptions, responses_of
        from vib.cli.run_ups import drives, run_up_of
        from vib.cli.scattering import scatter_of
        from vib.show.documents import to_json
        from vib.show.files import write_files
        from vib.show.page import Findings, render_page

        survey = _survey(study)
        modes = _report_modes(study, limits, band)
        shown = _units(study, units)
        ring, start = _report_ring(study, modes, shown)
        screening = None
        if study.excitations:
            screening = _screened(study, modes, band)
        found = Findings(
            study,
            survey,
            modes,
            ring,
            screening,
            shown,
            start,
            _curves(study, modes),
            run_ups=run_up_of(study) if drives(study) else None,
            responses=responses_of(study, RespondOptions()),
            scatter=scatter_of(study, limits, band),
        )
        wish.tell("drawing the page")
        page = render_page(found)
        name = f"{path.stem}.html"
        (written,) = write_files(out if out is not None else Path(), {name: page.encode("utf-8")})
    # a path must not be broken into lines, however long it is
    put(to_json({"page": str(written)}) + "\n" if wish.json else f"{written}\n")
    return DONE


def _report_modes(study: Study, limits: tuple[int | None, str | None], band: str | None) -> Modes:
    """The modes that were asked for; else those that the screening needs, and a few at the least."""
    count, up_to = limits
    if count is not None or up_to is not None or not study.excitations:
        return _modes(study, count, up_to)
    found = screening_modes(study, band)
    return found if found.count >= _FEW else _modes(study, _FEW, None)


def _report_ring(study: Study, modes: Modes, units: UnitSystem) -> tuple[Ring | None, str]:
    """The ringing that [impact] asks for, and its start in words."""
    if study.impact is None:
        return None, ""
    from vib.cli.starts import StartOptions, start_arguments
    from vib.show.tables.ring import start_words

    arguments = start_arguments(study, StartOptions())
    return modes.system.ring(**arguments, modes=modes), start_words(arguments, units)


def print_schema() -> int:
    """The JSON Schema of the study file."""
    from vib.study import Study

    found = {"$schema": "https://json-schema.org/draft/2020-12/schema", **Study.model_json_schema()}
    put(json.dumps(found, indent=2) + "\n")
    return DONE
