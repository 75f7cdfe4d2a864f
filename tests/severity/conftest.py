"""Run-ups that the tests of severity make by hand."""

import numpy as np
import pytest

import vib
from vib.response.run_up import Line, RunUp, Transmitted
from vib.study.severity import Severity


def _run_up(speed_hz, lines, moved, *, places=(("motor", "y"),), service=None, forces=None, shaft="fan"):
    """A run-up of one shaft: ``lines`` (order, or None and a frequency), ``moved`` (k, lines, p) in m."""
    speed_hz = np.asarray(speed_hz, dtype=float)
    moved = np.asarray(moved, dtype=complex).reshape(len(speed_hz), len(lines), len(places))
    found = [
        Line(shaft or "mains", "forces", order, speed_hz * order if order else np.full(len(speed_hz), fixed))
        for order, fixed in lines
    ]
    groups: dict[tuple[float, ...], list[int]] = {}
    for number, line in enumerate(found):
        groups.setdefault(tuple(line.frequency_hz), []).append(number)
    components = tuple(along for _, along in places)
    return RunUp(
        system=vib.System(mass=np.eye(1), stiffness=np.eye(1)),
        shaft=shaft,
        speed_hz=speed_hz,
        service_hz=((float(speed_hz[0]), float(speed_hz[-1])),) if service is None else service,
        lines=tuple(found),
        groups=tuple(tuple(group) for group in groups.values()),
        outputs=tuple(f"{place} {along}" if along else place for place, along in places),
        places=tuple(places),
        rotational=tuple(bool(along) and along.startswith("r") for along in components),
        displacement_m=moved,
        error_m=np.zeros(moved.shape),
        transmitted=None
        if forces is None
        else Transmitted(
            ("foot z", "foot rx"),
            ("foot", "foot"),
            ("z", "rx"),
            ("support", "support"),
            np.asarray(forces, complex),
        ),
        resonances=(),
        stable_at=np.isfinite(moved).all(axis=(1, 2)),
        method="made by hand",
        errors=(),
        remarks=(),
    )


@pytest.fixture(scope="session")
def run_up():
    return _run_up


@pytest.fixture(scope="session")
def table():
    return lambda **entries: Severity.model_validate(entries)
