"""The printable page: everything about a study in one HTML file that needs nothing else."""

from __future__ import annotations

from dataclasses import dataclass
from datetime import date
from typing import TYPE_CHECKING

import numpy as np

from vib.show.blocks import SYMBOLS, Bullets, Facts, Sentence, unit_label
from vib.show.driven import response_section, run_up_section, severity_section, severity_words
from vib.show.figures.ringing import ring_pictures
from vib.show.figures.shapes import shape_picture
from vib.show.figures.speeds import speed_pictures
from vib.show.figures.structure import structure_picture
from vib.show.how_sure import scatter_sections, scatter_words
from vib.show.numbers import joined, significant
from vib.show.sections import Drawing, Section, drawings
from vib.show.tables.check import axes_table, facts, part_table, reaction_table, sag_table, support_table
from vib.show.tables.data import material_table, section_table
from vib.show.tables.modes import NONE_FOUND, energy_words, frequency_table, mass_table
from vib.show.tables.ring import fall_table, peak_table, ring_facts, ring_stability, share_table
from vib.show.tables.screen import (
    keep_out_table,
    line_table,
    meeting_table,
    objection_words,
    screening_verdict,
)
from vib.show.tables.speeds import speed_blocks
from vib.show.words import CAUTION, completeness, rigid_motion, stability
from vib.units import UnitSystem

if TYPE_CHECKING:
    from vib.modes import Modes
    from vib.response.ring import Ring
    from vib.scatter.scatter import Scatter
    from vib.screening import Screening
    from vib.show.tables.respond import Responses
    from vib.show.tables.run_up import RunUps
    from vib.speeds import SpeedCurves
    from vib.structure.survey import Survey
    from vib.study import Study

_MOST_SHAPES = 12


@dataclass(frozen=True, eq=False)
class Findings:
    """Everything that goes on the page; what the study does not ask for is None.

    ``start`` is what set it ringing, in words; ``curves`` the modes against the speed of each shaft;
    ``run_ups`` the run-up and its severity; ``responses`` the response to loads and a moving ground;
    ``scatter`` what the tolerances do.
    """

    study: Study
    survey: Survey
    modes: Modes
    ring: Ring | None
    screening: Screening | None
    units: UnitSystem
    start: str = ""
    curves: tuple[SpeedCurves, ...] = ()
    run_ups: RunUps | None = None
    responses: Responses | None = None
    scatter: Scatter | None = None


def render_page(findings: Findings, created: date | None = None) -> str:
    """The page as HTML text.

    Parameters
    ----------
    findings
        What was found.
    created
        The date on the page; default: today.
    """
    from jinja2 import Environment, PackageLoader, StrictUndefined

    from vib import __version__

    environment = Environment(
        loader=PackageLoader("vib.show"),
        autoescape=True,
        undefined=StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
    )
    environment.filters["unit"] = unit_label
    environment.filters["kind"] = lambda item: type(item).__name__
    study = findings.study
    return environment.get_template("page.html").render(
        title=study.title,
        file=study.file.name if study.file is not None else "",
        created=(created or date.today()).isoformat(),
        version=__version__,
        verdict=verdict(findings),
        sections=sections(findings),
        symbols=SYMBOLS,
        caution=CAUTION,
    )


def verdict(findings: Findings) -> list[Sentence]:
    """What the reader must know first; an unstable system before all else."""
    modes, screening, ring = findings.modes, findings.screening, findings.ring
    first = stability(modes)
    told = [first] if not modes.stable else []
    if screening is None:
        told.append(
            Sentence("Not screened for resonance: the study names no excitations.", "careful"),
        )
    elif modes.stable or screening.objections:
        told.append(screening_verdict(screening))
        told += [Sentence(words) for words in objection_words(screening)]
    told += severity_words(findings.run_ups)
    told += scatter_words(findings.scatter)
    if modes.stable:
        told.append(first)
    told += rigid_motion(modes)
    if ring is not None and ring.stable:
        told.append(_ring_words(ring, findings.start))
    told += [completeness(modes), _error_words(modes)]
    return told


def _ring_words(ring: Ring, start: str) -> Sentence:
    fall = ring.falls[0]
    when = fall.envelope_to_1_percent_s
    if when is None:
        return Sentence(f"Ring-down ({start}): {fall.output} does not die away altogether.", "careful")
    return Sentence(f"Ring-down ({start}): {fall.output} falls to 1 % within {significant(when, 3)} s.")


def _error_words(modes: Modes) -> Sentence:
    elastic = modes.frequencies_hz > 0
    if not elastic.any():
        return Sentence("No mode above 0 Hz was found, so there is no numerical error to state.", "careful")
    worst = float((modes.errors_hz[elastic] / modes.frequencies_hz[elastic]).max())
    return Sentence(f"Numerical error of the frequencies: at most {significant(100 * worst, 2)} %.")


def sections(findings: Findings) -> list[Section]:
    """The parts of the page in their order."""
    asked = findings.study.severity is not None
    return [
        _model(findings),
        _assumptions(findings),
        _modes(findings),
        _ring(findings),
        _screening(findings),
        severity_section(findings.run_ups, asked, findings.units),
        run_up_section(findings.run_ups, bool(findings.study.excitations), findings.units),
        response_section(findings.responses, findings.units),
        *scatter_sections(findings.scatter, findings.units),
        _evidence(findings),
    ]


def _model(findings: Findings) -> Section:
    study, survey, units = findings.study, findings.survey, findings.units
    drawing: list[Drawing] = []
    if study.matrices is None:
        frames = [(np.array(run.origin_m), np.array([run.x, run.y, run.z])) for run in survey.runs]
        drawing = drawings([structure_picture(study, findings.modes.system, frames)], "model")
    return Section(
        "Model",
        "model",
        (
            *drawing,
            facts(study, survey, units),
            part_table(survey, units),
            section_table(study, units),
            material_table(study, units),
            support_table(survey),
            axes_table(survey, units),
            sag_table(survey, units),
            reaction_table(survey, units),
        ),
    )


def _assumptions(findings: Findings) -> Section:
    remarks = findings.survey.remarks
    damping = Sentence(f"Damping: {findings.modes.damping_note}")
    return Section("Assumptions", "assumptions", (damping, Bullets(remarks) if remarks else None))


def _modes(findings: Findings) -> Section:
    modes, up = findings.modes, findings.study.up
    drawn = range(min(modes.count, _MOST_SHAPES))
    pictures = [
        Drawing(
            shape_picture(modes, index, up).svg(f"shape-{index + 1}"),
            _shape_caption(modes, index),
            small=True,
        )
        for index in drawn
    ]
    said = "Grey: at rest. Colour: displaced, dark where it moves most; not to scale."
    if modes.system.anatomy is None:
        said = "Each shape is scaled to a largest motion of 1."
    if modes.count > _MOST_SHAPES:
        said += f" The first {_MOST_SHAPES} of {modes.count} modes are drawn; vib modes --out draws all."
    return Section(
        "Modes",
        "modes",
        (
            frequency_table(modes) if modes.count else NONE_FOUND,
            stability(modes),
            *rigid_motion(modes),
            *speed_blocks(findings.curves),
            Sentence(said, "quiet"),
            *pictures,
            mass_table(modes),
        ),
    )


def _shape_caption(modes: Modes, index: int) -> str:
    strain, moving = energy_words(modes.strain_energy, index), energy_words(modes.kinetic_energy, index)
    told = [f"{modes.descriptions[index].rstrip('.')}."]
    if strain:
        told.append(f"Strain energy: {strain}.")
    if moving:
        told.append(f"Moving mass: {moving}.")
    return " ".join(told)


def _ring(findings: Findings) -> Section:
    ring, units = findings.ring, findings.units
    if ring is None:
        return Section(
            "Ring-down", "ring", (Sentence("Not computed: the study has no [impact].", "careful"),)
        )
    return Section(
        "Ring-down",
        "ring",
        (
            Sentence(f"Start: {findings.start}."),
            ring_stability(ring),
            *drawings(ring_pictures(ring, units), "ring"),
            peak_table(ring, False, units),
            peak_table(ring, True, units),
            fall_table(ring),
            share_table(ring),
            Bullets(ring.remarks) if ring.remarks else None,
        ),
    )


def _screening(findings: Findings) -> Section:
    screening = findings.screening
    if screening is None:
        return Section(
            "Resonance screening",
            "screening",
            (Sentence("Not done: the study names no [[excitations]].", "careful"),),
        )
    return Section(
        "Resonance screening",
        "screening",
        (
            screening_verdict(screening),
            line_table(screening),
            meeting_table(screening, findings.units) or Sentence("No mode lies inside a band."),
            *drawings(speed_pictures(screening, findings.modes, findings.curves), "speeds"),
            keep_out_table(screening),
            Bullets(screening.remarks) if screening.remarks else None,
        ),
    )


def _evidence(findings: Findings) -> Section:
    """What makes the figures trustworthy, or says how far they are."""
    modes, ring = findings.modes, findings.ring
    worst = significant(float(modes.condition.max(initial=1.0)), 3)
    rows = [
        ("completeness", completeness(modes).text),
        ("largest error bar", _error_words(modes).text),
        ("freedoms", f"{modes.system.size} in the division used"),
        (
            "damping",
            "proportional: the shapes are those of the undamped system"
            if modes.proportional
            else "not proportional: complex shapes from the first-order model",
        ),
        (
            "condition",
            f"largest condition number of an eigenvalue: {worst}",
        ),
    ]
    sums = _mass_sums(modes)
    if sums:
        rows.append(("effective mass", sums))
    if ring is not None:
        rows += [(f"ring-down, {name}", value) for name, value in ring_facts(ring).rows]
    more = tuple(remark for remark in modes.remarks if remark not in findings.survey.remarks)
    return Section("Numerical evidence", "evidence", (Facts(tuple(rows)), Bullets(more) if more else None))


def _mass_sums(modes: Modes) -> str:
    anatomy = modes.system.anatomy
    if modes.effective_mass is None or anatomy is None or anatomy.rigid_mass[0, 0] <= 0:
        return ""
    shares = modes.effective_mass[:, :3].sum(axis=0) / anatomy.rigid_mass[0, 0]
    told = [f"{100 * share:.1f} % along {axis}" for axis, share in zip("xyz", shares, strict=True)]
    rule = "all modes of a held structure: 100 %"
    if not modes.proportional:
        rule = "shapes are complex, so that the sum over all modes need not be exactly 100 %"
    return f"the modes found hold {joined(told)} of the whole mass ({rule})"
