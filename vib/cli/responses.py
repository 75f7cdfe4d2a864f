"""What ``vib respond`` does: loads and lines of the study, and the options that stand in for its entries."""

from __future__ import annotations

from dataclasses import dataclass, field
from functools import cache
from pathlib import Path
from typing import TYPE_CHECKING, Any, Literal

from vib.cli.delivery import DONE, OBJECTION, Answer, Wish, at_work_on, deliver
from vib.errors import ModelError

if TYPE_CHECKING:
    from vib.modes import Modes
    from vib.response.frequency import FrequencyResponse
    from vib.response.respond import Response
    from vib.show.tables.respond import Responses
    from vib.study import Study
    from vib.system import System

Chosen = Literal["si", "us"] | None


@dataclass(frozen=True)
class RespondOptions:
    """The options as typed; None where not given."""

    duration: str | None = None
    step: str | None = None
    frequencies: tuple[str, str] | None = None
    lines: int | None = None
    at: str | None = None
    along: str | None = None
    watch: list[str] = field(default_factory=list)
    shaft: str | None = None


def show_responses(path: Path, options: RespondOptions, units: Chosen, pictures: str, wish: Wish) -> int:
    """Response over time where something acts, and over frequency where lines are asked for."""
    with at_work_on(path, wish) as study:
        from vib.show.tables.respond import respond_blocks, respond_document

        shown = units or study.output_units
        if options.shaft is not None:
            raise ModelError("--shaft goes with --run-up")
        found = responses_of(study, options)
        if found is None:
            raise ModelError(
                "nothing to respond to: add [[loads]] or [base_motion] to the study, or ask for a frequency "
                'response with --frequencies "1 Hz" "100 Hz" --at PLACE --along x, or for a run-up with '
                "--run-up"
            )

        @cache
        def document() -> dict[str, Any]:
            return respond_document(found)

        def files() -> dict[str, bytes]:
            from vib.show.response_files import respond_files

            return respond_files(found, document(), shown, pictures)

        answer = Answer(
            respond_blocks(found, shown),
            document,
            found.remarks,
            files,
            DONE if found.stable else OBJECTION,
        )
        return deliver(answer, wish)


def responses_of(study: Study, options: RespondOptions) -> Responses | None:
    """The response to what acts, and the lines that are asked for; None where there is neither."""
    from vib.show.tables.respond import Responses

    acts = bool(study.loads) or study.base_motion is not None
    lines = _lines(study, options)
    if not acts and lines is None:
        return None
    system = study.system()
    modes = None
    if lines is not None and study.matrices is None:  # one division of the structure for both
        modes = system.modes(up_to=float(lines.max()))
    return Responses(
        study.title,
        _record(study, system, modes, options) if acts else None,
        None if lines is None else _frequency(study, system, modes, options, lines),
    )


def show_run_up(path: Path, options: RespondOptions, units: Chosen, pictures: str, wish: Wish) -> int:
    """Steady vibration over the running speeds, and how bad it is."""
    with at_work_on(path, wish) as study:
        from vib.cli.run_ups import run_up_of
        from vib.show.tables.run_up import run_up_blocks, run_up_document

        for name in ("duration", "step", "frequencies", "lines", "at", "along"):
            if getattr(options, name) is not None:
                raise ModelError(f"--{name} does not go with --run-up; --watch and --shaft do")
        shown = units or study.output_units
        found = run_up_of(study, options.shaft, options.watch)
        severity = found.severity

        @cache
        def document() -> dict[str, Any]:
            return run_up_document(found)

        def files() -> dict[str, bytes]:
            from vib.show.run_up_files import run_up_files

            return run_up_files(found, document(), shown, pictures)

        fine = found.run_up.stable and (severity is None or severity.acceptable)
        answer = Answer(
            run_up_blocks(found, shown), document, found.remarks, files, DONE if fine else OBJECTION
        )
        return deliver(answer, wish)


def _record(study: Study, system: System, modes: Modes | None, options: RespondOptions) -> Response:
    from vib.cli.starts import read_option
    from vib.response.from_study import ground_of, loads_of

    duration, step = study.response.duration, study.response.step
    if options.duration is not None:
        duration = read_option(study, "duration", options.duration, "time")
    if options.step is not None:
        step = read_option(study, "step", options.step, "time")
    return system.respond(
        loads=loads_of(study),
        ground=ground_of(study),
        watch=_watch(study, options),
        duration_s=duration,
        step_s=step,
        modes=modes,
    )


def _lines(study: Study, options: RespondOptions) -> Any:
    from vib.cli.starts import read_option
    from vib.response.from_study import lines_of, spaced

    if options.frequencies is None:
        if options.lines is not None and study.response.frequencies is not None:
            return spaced(study.response.frequencies, options.lines, study.response.spacing)
        return lines_of(study)
    low, high = (read_option(study, "frequencies", one, "frequency") for one in options.frequencies)
    if not 0 < low < high:
        raise ModelError("--frequencies: two frequencies above 0 are needed, the lower one first")
    return spaced((low, high), options.lines or study.response.lines, study.response.spacing)


def _frequency(
    study: Study, system: System, modes: Modes | None, options: RespondOptions, lines: Any
) -> FrequencyResponse:
    from vib.cli.starts import direction

    watch = _watch(study, options)
    if options.at is not None:
        along = None if options.along is None else direction(options.along)
        inputs: list[Any] = [(options.at, along)]
    elif study.loads:
        inputs = list(dict.fromkeys((load.at, load.along) for load in study.loads))
    elif study.base_motion is not None:
        return system.frequency_response(
            lines_hz=lines, ground=[study.base_motion.along.lstrip("-")], outputs=watch, modes=modes
        )
    else:
        raise ModelError("--frequencies needs --at and --along: the place where the force acts")
    return system.frequency_response(lines_hz=lines, inputs=inputs, outputs=watch or inputs, modes=modes)


def _watch(study: Study, options: RespondOptions) -> Any:
    from vib.cli.starts import direction
    from vib.response.from_study import watch_place, watched

    if not options.watch:
        return watched(study)
    if options.along is not None:
        known = {*study.points, *(body.name for body in study.bodies)}
        return [
            (name, direction(options.along)) if name in known else watch_place(study, name)
            for name in options.watch
        ]
    return [watch_place(study, name) for name in options.watch]
