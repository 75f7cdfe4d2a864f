"""Which places a run-up watches unasked."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

from vib.drive import Drive
from vib.response.frequency import Channel
from vib.study import Study
from vib.system import COMPONENTS, System

_EVERY = 12  # freedoms of bare matrices up to which all are watched


def places_to_watch(system: System, study: Study | None, planned: Drive) -> Sequence[Channel] | None:
    """What [response] watches and [severity] judges; else the bodies and the places of the forces.

    A place without a component is watched along x, y and z, where it can move. None: every freedom.
    """
    if system.anatomy is None:
        named = list(study.response.watch or ()) if study is not None else []
        if not named and system.size <= _EVERY:
            return None
        return named or list(dict.fromkeys((aim.place, aim.along) for aim in planned.inputs))
    named = []
    if study is not None:
        judged = study.severity.places if study.severity is not None else None
        limited = [name for row in study.severity.limits for name in row.at or ()] if study.severity else []
        named = [*(study.response.watch or ()), *(judged or ()), *limited]
        if study.severity is not None and judged is None:
            named += [body.name for body in study.bodies]
    if not named:
        bodies = [part.name for part in system.anatomy.parts if part.kind == "body"]
        named = [*(name for name in bodies if name in system.anatomy.places)]
        named += [aim.place for aim in planned.inputs]
    return list(dict.fromkeys(pair for name in named for pair in _pairs(system, name)))


def _pairs(system: System, name: str) -> Iterator[tuple[str, str]]:
    assert system.anatomy is not None
    places = system.anatomy.places
    place, _, component = name.rpartition(" ")
    if name not in places and place in places and component.lstrip("+-") in COMPONENTS:
        yield place, component
    elif name in places:
        motion = places[name].motion
        moving = [c for row, c in enumerate(COMPONENTS[:3]) if motion[[row]].count_nonzero()]
        yield from ((name, component) for component in moving)
    else:
        yield name, "x"  # unknown: the error says what is near
