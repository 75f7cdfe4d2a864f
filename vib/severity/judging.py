"""How a `Severity` is made: predicted vibration at the running speeds, judged place by place."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from vib.errors import ModelError
from vib.severity.levels import band_levels, strain, zone_numbers
from vib.severity.margins import Critical, critical_speeds, judge_margins, needed_hz
from vib.severity.own import check_own
from vib.severity.severity import Judged, Severity
from vib.severity.standards import Boundaries, band_from_hz, band_words, boundaries, outside_scope
from vib.severity.support import AXES, Support, judge_support
from vib.study.severity import Severity as Table
from vib.study.severity import Stand

if TYPE_CHECKING:
    from vib.modes import Modes
    from vib.response.run_up import RunUp

Array = NDArray[np.float64]


def judge(run_up: RunUp, table: Table | None, modes: Modes | None = None) -> Severity:
    """Judge predicted vibration at the running speeds.

    Parameters
    ----------
    run_up
        Its outputs at the places that the table names are judged; without such, those at bodies; angles are
        left out. Its running speeds are judged, all its speeds where it states none.
    table
        ``study.severity``.
    modes
        Of the same structure, best complete up to 1.4 times the main excitation frequency, for the support
        and the separation margins; default: they are computed.

    Raises
    ------
    ModelError
        There is no table; the main excitation that it names has no force in the run-up; or there is no output
        to judge.
    """
    if table is None:
        raise ModelError("severity: the study has no [severity] table; say what the machine is judged by")
    watched = judged_outputs(run_up, table)
    if not watched:
        raise ModelError("severity: there is no place to judge; name bearings or feet in severity.places")
    chosen = run_up.in_service if run_up.in_service.any() else np.ones(len(run_up.speed_hz), dtype=bool)
    main = main_frequency(run_up, table)
    highest = float(main[chosen].max())
    if modes is None:
        modes = run_up.system.modes(up_to=needed_hz(table, highest))
    places = [run_up.places[column][0] for column in watched]
    supports = judge_support(modes, table, list(dict.fromkeys(places)), highest)
    levels = band_levels(run_up.frequency_hz, run_up.combined_m, band_from_hz(table, main))
    rows = tuple(
        _row(run_up, table, supports, column, levels, main, np.flatnonzero(chosen)) for column in watched
    )
    speeds = run_up.speed_hz[chosen]
    critical = critical_speeds(modes, _met(run_up, main), (float(main.min()), float(main.max())))
    return Severity(
        rows=rows,
        own=check_own(run_up, table, watched, chosen),
        supports=supports,
        margins=judge_margins(critical, table, _running(run_up, main), main, _turning(run_up, main, watched)),
        machine=table.machine_words,
        band=band_words(table),
        shaft=run_up.shaft,
        speeds_hz=(float(speeds.min()), float(speeds.max())),
        main_hz=(float(main[chosen].min()), float(main[chosen].max())),
        stable=bool(run_up.stable_at[chosen].all()),
        remarks=tuple(_remarks(run_up, table, supports, modes, highest)),
    )


def judged_outputs(run_up: RunUp, table: Table) -> list[int]:
    """Which outputs are judged: at the places that the table names, else at bodies, else all; no angles."""
    straight = [column for column, turning in enumerate(run_up.rotational) if not turning]
    if table.places is not None:
        named = set(table.places)
        return [k for k in straight if run_up.outputs[k] in named or run_up.places[k][0] in named]
    anatomy = run_up.system.anatomy
    bodies = {part.name for part in anatomy.parts if part.kind == "body"} if anatomy is not None else set()
    return [k for k in straight if run_up.places[k][0] in bodies] or straight


def main_frequency(run_up: RunUp, table: Table) -> Array:
    """(k,) the main excitation frequency, Hz, at each speed: mostly the running speed.

    Where nothing turns it is the frequency of the line that shakes the outputs most.

    Raises
    ------
    ModelError
        The table names an excitation without a force in the run-up.
    """
    if not run_up.shaft:
        moved = np.abs(run_up.combined_m).max(axis=2) * run_up.frequency_hz
        strongest = int(np.argmax(np.nan_to_num(moved).max(axis=0)))
        return np.asarray(run_up.frequency_hz[:, strongest])
    if table.main is None or table.main == run_up.shaft:
        return run_up.speed_hz
    for line in run_up.lines:
        if line.excitation == table.main and line.order:
            return np.asarray(line.frequency_hz / line.order)
    raise ModelError(
        f'severity.main: "{table.main}" has no force at an order of its speed, so its speed in the run-up is '
        "not known; name an excitation that has, or leave main out"
    )


def axis_of(along: Any) -> str:
    """The axis of an output, the nearest one of a slanting direction; "" where none is known."""
    if along is None:
        return ""
    if isinstance(along, str):
        return along.strip().lstrip("+-")
    return AXES[int(np.argmax(np.abs(np.asarray(along, dtype=np.float64))))]


def _row(
    run_up: RunUp,
    table: Table,
    supports: Mapping[str, Support],
    column: int,
    levels: tuple[Array, Array],
    main: Array,
    chosen: NDArray[np.intp],
) -> Judged:
    place, along = run_up.places[column]
    axis = axis_of(along)
    support = supports.get(axis) or next(iter(supports.values()), None)
    best: tuple[tuple[int, float], int, Stand | None, tuple[Boundaries, ...]] | None = None
    for stand in ("rigid", "flexible"):
        here = chosen
        if support is not None:
            stands = np.array([support.stand_at(float(main[k])) == stand for k in chosen])
            here = chosen[stands]
        if not len(here):
            continue
        limits = boundaries(table, stand)
        velocity, displacement = (level[here, column] for level in levels)
        zones, strains = zone_numbers(velocity, displacement, limits), strain(velocity, displacement, limits)
        k = int(np.lexsort((strains, zones))[-1])
        rank = (int(zones[k]), float(strains[k]))
        if best is None or rank > best[0]:
            best = rank, int(here[k]), None if support is None else stand, limits
        if support is None:
            break
    assert best is not None
    _, k, found, limits = best
    return Judged(
        output=run_up.outputs[column],
        place=place,
        axis=axis,
        speed_hz=float(run_up.speed_hz[k]),
        velocity_rms_m_s=float(levels[0][k, column]),
        displacement_rms_m=float(levels[1][k, column]),
        support=found,
        limits=limits,
    )


def _running(run_up: RunUp, main: Array) -> list[tuple[float, float]]:
    """The running speeds of the main shaft, rev/s; none where nothing turns."""
    if not run_up.shaft:
        return []
    return [
        (float(np.interp(low, run_up.speed_hz, main)), float(np.interp(high, run_up.speed_hz, main)))
        for low, high in run_up.service_hz
    ]


def _met(run_up: RunUp, main: Array) -> list[Critical]:
    """Where the run-up found that the turning of the main shaft meets modes."""
    return [
        Critical(row.mode, row.frequency_hz, row.damping_ratio)
        for row in run_up.resonances
        if np.allclose(run_up.lines[row.line].frequency_hz, main, rtol=1e-9, atol=0)
    ]


def _turning(run_up: RunUp, main: Array, watched: list[int]) -> Array:
    """(k, p) amplitude at the turning frequency of the main shaft, at each place judged."""
    same = [
        group
        for group in range(len(run_up.groups))
        if np.allclose(run_up.frequency_hz[:, group], main, rtol=1e-9, atol=0)
    ]
    if not same or not run_up.stable:
        return np.zeros((len(main), 0))
    return np.asarray(np.abs(run_up.combined_m[:, same[0], :][:, watched]))


def _remarks(
    run_up: RunUp, table: Table, supports: Mapping[str, Support], modes: Modes, main_hz: float
) -> Iterator[str]:
    yield (
        "Levels are predicted from the forces that the study states; what shakes the machine besides is not "
        "in them."
    )
    if any(run_up.rotational):
        yield "Angles are not judged."
    unknown = [axis for axis, support in supports.items() if not support.known]
    if unknown:
        yield (
            f"How the machine stands along {', '.join(unknown)} is not known; the stricter limits of a rigid "
            "support are used."
        )
    if any(not support.stated for support in supports.values()):
        yield (
            "A mode is one along an axis where the judged places move at least 10 % of its greatest motion, "
            "and 30 % of their squared motion is along that axis (conventions of this program)."
        )
    reach = modes.complete_below_hz
    if reach is None or reach < needed_hz(table, main_hz):
        yield "The modes found do not reach far enough above the running speeds to judge every margin there."
    if table.separation_margin is None and run_up.shaft:
        yield (
            "Separation margins by the amplification factor are those of rotors (API 617 / API RP 684, from "
            "memory); for a frame they are a yardstick."
        )
    yield from outside_scope(table, main_hz) if run_up.shaft else ()
    if table.rules is not None:
        yield "The standard's figures are quoted from memory: check them against its text before they decide."
