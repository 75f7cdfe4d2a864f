"""The commands and their options. What they do is in ``vib.cli.jobs``, which is loaded when one runs."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated, Literal

import typer

from vib.cli.delivery import Wish

_HELP = """Natural frequencies, ring-down and resonance screening of machine frames.

A study is one TOML file with units. In the order of work: new, check, modes, ring, respond, screen,
scatter, sweep, report.

\b
Example:
  vib new portal --out portal.toml
  vib report portal.toml

Results support, and do not replace, review by a licensed engineer under the local code.
"""

app = typer.Typer(
    name="vib",
    help=_HELP,
    rich_markup_mode=None,
    pretty_exceptions_enable=False,
    context_settings={"help_option_names": ["-h", "--help"]},
)

StudyFile = Annotated[Path, typer.Argument(metavar="STUDY.toml", help="The study file.", show_default=False)]
AsJson = Annotated[bool, typer.Option("--json", help="Print one JSON document instead of tables.")]
Out = Annotated[
    Path | None,
    typer.Option("--out", metavar="FOLDER", help="Write data files and pictures into this folder."),
]
Quiet = Annotated[bool, typer.Option("--quiet", help="No remarks and no progress, errors only.")]
Units = Annotated[
    Literal["si", "us"] | None,
    typer.Option("--units", help="Units of what is shown; default: [units] output of the study, else si."),
]
Pictures = Annotated[Literal["svg", "png"], typer.Option("--pictures", help="Kind of pictures for --out.")]
Count = Annotated[
    int | None,
    typer.Option(
        "--count",
        metavar="NUMBER",
        min=1,
        help="How many modes, slowest first (12 if nothing is asked).",
        show_default=False,
    ),
]
UpTo = Annotated[
    str | None,
    typer.Option("--up-to", metavar="FREQUENCY", help='Modes up to this frequency, such as "200 Hz".'),
]
Band = Annotated[
    str | None,
    typer.Option(
        "--band",
        metavar="RATIO",
        help='Half width of the bands, such as "25 %", for excitations without their own.',
        show_default="20 %",
    ),
]
Workers = Annotated[
    int | None,
    typer.Option(
        "--workers",
        metavar="NUMBER",
        min=1,
        help="How many work at a time.",
        show_default="one for each core",
    ),
]
Cluster = Annotated[
    str | None,
    typer.Option(
        "--cluster",
        metavar="ADDRESS",
        help='Run on a Dask cluster instead: the address of its scheduler, such as "tcp://host:8786".',
    ),
]
Resume = Annotated[
    Path | None,
    typer.Option(
        "--resume",
        metavar="FOLDER",
        help="Keep what is done in this folder, and take it up again from there.",
    ),
]


def _show_version(wanted: bool) -> None:
    if wanted:
        from vib import __version__
        from vib.cli.delivery import put

        put(f"vib {__version__}\n")
        raise typer.Exit


@app.callback()
def main(
    version: Annotated[
        bool, typer.Option("--version", callback=_show_version, is_eager=True, help="Print the version.")
    ] = False,
) -> None:
    """The options that come before the command; the help of the whole is given to the app."""


@app.command(short_help="Write a starter study.")
def new(
    kind: Annotated[
        str | None, typer.Argument(metavar="[KIND]", help="Which starter; without it they are listed.")
    ] = None,
    out: Annotated[
        Path | None, typer.Option("--out", metavar="FILE", help="The file to write; default: KIND.toml.")
    ] = None,
    quiet: Quiet = False,
) -> int:
    """Write a starter study to begin from.

    A file that is there already is never overwritten.

    \b
    Example:
      vib new cantilever --out beam.toml
    """
    from vib.cli.jobs import new_study

    return new_study(kind, out, Wish(quiet=quiet))


@app.command(short_help="Read a study back: mass, supports, sag.")
def check(
    study: StudyFile,
    json: AsJson = False,
    out: Out = None,
    quiet: Quiet = False,
    units: Units = None,
    pictures: Pictures = "svg",
) -> int:
    """Read a study back: mass, centre of mass, supports, sag, orientation.

    With --out it also draws the model.

    \b
    Example:
      vib check frame.toml --out drawing
    """
    from vib.cli.jobs import check_study

    return check_study(study, units, pictures, Wish(json, out, quiet))


@app.command(short_help="Natural frequencies, damping, shapes.")
def modes(
    study: StudyFile,
    count: Count = None,
    up_to: UpTo = None,
    json: AsJson = False,
    out: Out = None,
    quiet: Quiet = False,
    units: Units = None,
    pictures: Pictures = "svg",
) -> int:
    """Natural frequencies, damping ratios and mode shapes.

    Exit status 1 if the system is unstable.

    \b
    Example:
      vib modes frame.toml --up-to "200 Hz"
    """
    from vib.cli.jobs import show_modes

    return show_modes(study, count, up_to, units, pictures, Wish(json, out, quiet))


@app.command(short_help="Free response after an impact.")
def ring(
    study: StudyFile,
    impulse: Annotated[str | None, typer.Option(metavar="SIZE", help='A blow, such as "12 N s".')] = None,
    pulse: Annotated[
        tuple[str, str] | None,
        typer.Option(metavar="PEAK DURATION", help='A half-sine pulse, such as "2 kN" "5 ms".'),
    ] = None,
    pull: Annotated[
        str | None, typer.Option(metavar="FORCE", help='A steady pull, let go, such as "500 N".')
    ] = None,
    displacement: Annotated[
        str | None, typer.Option(metavar="LENGTH", help='Pulled so far, then let go, such as "2 mm".')
    ] = None,
    velocity: Annotated[
        str | None, typer.Option(metavar="SPEED", help='The place starts so fast, such as "50 mm/s".')
    ] = None,
    at: Annotated[str | None, typer.Option(metavar="PLACE", help="Point, body or freedom.")] = None,
    along: Annotated[
        str | None, typer.Option(metavar="DIRECTION", help='x, y, z, rx, ry, rz, -x, ... or "1, 1, 0".')
    ] = None,
    duration: Annotated[str | None, typer.Option(metavar="TIME", help='How long, such as "2 s".')] = None,
    watch: Annotated[
        list[str] | None,
        typer.Option(metavar="PLACE", help='Place to show, such as "motor" or "motor x"; may be repeated.'),
    ] = None,
    json: AsJson = False,
    out: Out = None,
    quiet: Quiet = False,
    units: Units = None,
    pictures: Pictures = "svg",
) -> int:
    """Free response after an impact: how it rings and dies away.

    What strikes and where is [impact] of the study; the options stand in for its entries.

    \b
    Example:
      vib ring frame.toml --impulse "12 N s" --at motor --along x
    """
    from vib.cli.jobs import show_ring
    from vib.cli.starts import StartOptions

    options = StartOptions(impulse, pulse, pull, displacement, velocity, at, along, duration, watch or [])
    return show_ring(study, options, units, pictures, Wish(json, out, quiet))


@app.command(short_help="Forced response over time and frequency.")
def respond(
    study: StudyFile,
    duration: Annotated[str | None, typer.Option(metavar="TIME", help='How long, such as "2 s".')] = None,
    step: Annotated[
        str | None, typer.Option(metavar="TIME", help='Step of the record, such as "1 ms".')
    ] = None,
    frequencies: Annotated[
        tuple[str, str] | None,
        typer.Option(metavar="FROM TO", help='Frequency response, such as "1 Hz" "100 Hz".'),
    ] = None,
    lines: Annotated[
        int | None,
        typer.Option(metavar="NUMBER", min=2, help="How many lines the frequency response has."),
    ] = None,
    at: Annotated[
        str | None, typer.Option(metavar="PLACE", help="Where the force of the frequency response acts.")
    ] = None,
    along: Annotated[
        str | None, typer.Option(metavar="DIRECTION", help='x, y, z, rx, ry, rz, -x, ... or "1, 1, 0".')
    ] = None,
    watch: Annotated[
        list[str] | None,
        typer.Option(metavar="PLACE", help='Place to show, such as "motor" or "motor x"; may be repeated.'),
    ] = None,
    run_up: Annotated[
        bool,
        typer.Option("--run-up", help="Steady vibration over the running speeds, by the forces stated."),
    ] = False,
    shaft: Annotated[
        str | None,
        typer.Option(metavar="NAME", help="With --run-up: the excitation whose speed varies."),
    ] = None,
    json: AsJson = False,
    out: Out = None,
    quiet: Quiet = False,
    units: Units = None,
    pictures: Pictures = "svg",
) -> int:
    """Forced response: to loads and motions of the ground over time, over frequency, or over running speeds.

    What acts is [[loads]] and [base_motion] of the study, what is recorded [response]; the options stand in
    for its entries. With --run-up it is the forces of [[excitations]], judged by [severity]. Exit status 1 if
    the system is unstable, or the vibration of a run-up is not acceptable.

    \b
    Example:
      vib respond frame.toml --frequencies "1 Hz" "100 Hz" --at motor --along x
      vib respond frame.toml --run-up
    """
    from vib.cli.responses import RespondOptions, show_responses, show_run_up

    options = RespondOptions(duration, step, frequencies, lines, at, along, watch or [], shaft)
    if run_up:
        return show_run_up(study, options, units, pictures, Wish(json, out, quiet))
    return show_responses(study, options, units, pictures, Wish(json, out, quiet))


@app.command(short_help="Resonance screening at running speed.")
def screen(
    study: StudyFile,
    band: Band = None,
    json: AsJson = False,
    out: Out = None,
    quiet: Quiet = False,
    pictures: Pictures = "svg",
) -> int:
    """Resonance screening: does a mode lie near a running speed or one of its orders?

    Exit status 1 if a mode that can be driven lies inside a band, or the system is unstable.

    \b
    Example:
      vib screen frame.toml --band "25 %"
    """
    from vib.cli.jobs import show_screening

    return show_screening(study, band, pictures, Wish(json, out, quiet))


@app.command(short_help="What tolerances do to the frequencies.")
def scatter(
    study: StudyFile,
    samples: Annotated[
        int, typer.Option("--samples", metavar="NUMBER", min=2, help="How many; best a power of two.")
    ] = 1024,
    seed: Annotated[
        int, typer.Option("--seed", metavar="NUMBER", min=0, help="The same seed draws the same samples.")
    ] = 0,
    method: Annotated[
        Literal["sobol", "latin-hypercube"], typer.Option("--method", help="How the samples are spread.")
    ] = "sobol",
    levels: Annotated[
        int,
        typer.Option(
            "--levels", metavar="NUMBER", min=0, help="For how many samples vibration is predicted by forces."
        ),
    ] = 128,
    count: Count = None,
    up_to: UpTo = None,
    band: Band = None,
    workers: Workers = None,
    cluster: Cluster = None,
    resume: Resume = None,
    json: AsJson = False,
    out: Out = None,
    quiet: Quiet = False,
    units: Units = None,
    pictures: Pictures = "svg",
) -> int:
    """What the tolerances of a study do: scatter of frequencies and levels, probability of resonance.

    Quantities are drawn within the tolerances that the study states, such as "2 kN/mm +- 20 %". Exit status
    1 if the probability of a resonance, or of a level in zone C or worse, is above 5 %, or a sample is
    unstable.

    \b
    Example:
      vib scatter frame.toml --samples 4096 --out scatter
    """
    from vib.cli.scattering import Running, show_scatter

    running = Running(count, up_to, workers, cluster, resume)
    wish = Wish(json, out, quiet)
    return show_scatter(study, (samples, seed, method, levels), band, running, units, pictures, wish)


@app.command(
    short_help="Modes while a quantity or two vary.",
    context_settings={"ignore_unknown_options": True},  # "-5 mm" is a value; what is left over is counted
)
def sweep(
    study: StudyFile,
    ends: Annotated[list[str] | None, typer.Argument(metavar="FROM TO", hidden=True)] = None,
    vary: Annotated[
        list[str] | None,
        typer.Option(
            metavar="ENTRY FROM TO",
            help='Entry of the study and its ends, such as "springs[0].stiffness.x" "1 kN/mm" "9 kN/mm"; '
            "may be given twice.",
        ),
    ] = None,
    steps: Annotated[
        int | None,
        typer.Option(
            "--steps", metavar="NUMBER", min=2, help="How many values of each.", show_default="41, 15 of two"
        ),
    ] = None,
    spacing: Annotated[
        Literal["linear", "logarithmic"], typer.Option("--spacing", help="How the values are spaced.")
    ] = "linear",
    levels: Annotated[
        bool, typer.Option("--levels/--no-levels", help="Predict vibration too, where forces are stated.")
    ] = True,
    count: Count = None,
    up_to: UpTo = None,
    workers: Workers = None,
    cluster: Cluster = None,
    resume: Resume = None,
    json: AsJson = False,
    out: Out = None,
    quiet: Quiet = False,
    units: Units = None,
    pictures: Pictures = "svg",
) -> int:
    """Natural frequencies and damping while one quantity of the study, or two, run from one value to another.

    \b
    Example:
      vib sweep frame.toml --vary "springs[0].stiffness.x" "1 kN/mm" "9 kN/mm" --out sweep
    """
    from vib.cli.scattering import Running, show_sweep

    running = Running(count, up_to, workers, cluster, resume)
    wish = Wish(json, out, quiet)
    return show_sweep(
        study, (vary or [], ends or []), (steps, spacing, levels), running, units, pictures, wish
    )


@app.command(short_help="All of it as one printable page.")
def report(
    study: StudyFile,
    count: Count = None,
    up_to: UpTo = None,
    band: Band = None,
    out: Annotated[
        Path | None,
        typer.Option("--out", metavar="FOLDER", help="Folder of the page; default: the current one."),
    ] = None,
    json: AsJson = False,
    quiet: Quiet = False,
    units: Units = None,
) -> int:
    """All of it as one printable page, STUDY.html.

    Exit status 0 once the page is written; its first line is the verdict.

    \b
    Example:
      vib report frame.toml --out results
    """
    from vib.cli.jobs import write_report

    return write_report(study, (count, up_to), band, units, out, Wish(json, None, quiet))


@app.command(short_help="JSON Schema of the study file.")
def schema() -> int:
    """Print the JSON Schema of the study file, for editors that complete it.

    \b
    Example:
      vib schema > study.schema.json
    """
    from vib.cli.jobs import print_schema

    return print_schema()
