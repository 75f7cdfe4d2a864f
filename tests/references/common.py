"""What the reference cases share: the data file, one check, and the public path from study text to modes."""

from __future__ import annotations

import json
import tempfile
from collections.abc import Callable, Iterable
from dataclasses import dataclass
from functools import cache
from pathlib import Path
from typing import Any

import numpy as np

import vib

MODEL_GAP = 1e-5  # slender members stand for ones without shear, stretch or rotary inertia; see beams.py
CLOSED_FORM = 1e-3  # of a structure cut into pieces, against a closed form of the continuous one


@dataclass(frozen=True)
class Check:
    """One number of ours beside its reference value."""

    what: str
    ours: complex
    reference: complex
    tolerance: float
    absolute: bool = False
    error_bar: float | None = None  # must cover the difference
    model_gap: float = MODEL_GAP  # relative; what the reference leaves out that our members have

    @property
    def agrees(self) -> bool:
        """Within the tolerance."""
        return self.difference <= self.tolerance

    @property
    def covered(self) -> bool:
        """The error bar, where there is one, covers the difference, but for what the models differ in."""
        if self.error_bar is None:
            return True
        return abs(self.ours - self.reference) <= self.error_bar + self.model_gap * abs(self.reference)

    @property
    def difference(self) -> float:
        """Relative to the reference, or as it is where ``absolute``."""
        gap = abs(self.ours - self.reference)
        return gap if self.absolute else gap / abs(self.reference)


Entry = dict[str, Any]
Builder = Callable[[Entry], Iterable[Check]]
ENTRIES: dict[str, Entry] = {
    entry["id"]: entry for entry in json.loads(Path(__file__).with_name("cases.json").read_text("utf-8"))
}
BUILDERS: dict[str, Builder] = {}


def covers(*ids: str) -> Callable[[Builder], Builder]:
    """Register the function that runs these entries of the data file."""

    def register(builder: Builder) -> Builder:
        for name in ids:
            assert name in ENTRIES, name
            assert name not in BUILDERS, name
            BUILDERS[name] = builder
        return builder

    return register


@cache
def results(name: str) -> tuple[Check, ...]:
    """All checks of one entry; solved once per session."""
    return tuple(BUILDERS[name](ENTRIES[name]))


def study(text: str) -> vib.Study:
    """A study from its text, read the way a user's file is."""
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "study.toml"
        path.write_text(text, encoding="utf-8")
        return vib.read(path)


def matrices_study(mass: Any, stiffness: Any, *, extra: str = "", **others: Any) -> vib.Study:
    """A study of matrices written as rows, SI units."""
    rows = {"mass": mass, "stiffness": stiffness, **others}
    listed = "\n".join(f"{name} = {np.asarray(matrix, float).tolist()}" for name, matrix in rows.items())
    units = '[units]\nmass = "kg"\nstiffness = "N/m"\ndamping = "N s/m"\n'
    return study(f"{units}[matrices]\n{listed}\n{extra}")


def chain(masses: Any, springs: Any, *, last: float = 0.0) -> tuple[Any, Any]:
    """Mass and stiffness of masses in line; ``springs[i]`` is before mass i, ``last`` behind the last."""
    stiffness = np.diag(np.asarray(springs, float))
    for i, k in enumerate(springs[1:]):
        stiffness[i, i] += k
        stiffness[i, i + 1] = stiffness[i + 1, i] = -k
    stiffness[-1, -1] += last
    return np.diag(np.asarray(masses, float)), stiffness


def share(modes: vib.Modes, components: Iterable[str]) -> Any:
    """(m,) share of each mode's kinetic energy in freedoms of these components."""
    energy = (modes.shapes.conj() * (modes.system.mass @ modes.shapes)).real
    wanted = np.array([freedom.component in set(components) for freedom in modes.system.freedoms])
    return energy[wanted].sum(axis=0) / energy.sum(axis=0)


def picked(modes: vib.Modes, components: Iterable[str]) -> list[int]:
    """Positions of the elastic modes that mostly move in these components."""
    shares = share(modes, components)
    return [i for i in range(modes.rigid_body_count, modes.count) if shares[i] > 0.5]


def frequency_checks(
    modes: vib.Modes, components: Iterable[str], expected_hz: Iterable[float], label: str = "mode"
) -> list[Check]:
    """The lowest modes in these components beside the expected frequencies, in order, none left out."""
    expected = list(expected_hz)
    found = picked(modes, components)
    assert len(found) >= len(expected), f"{label}: {len(found)} modes found, {len(expected)} expected"
    return [
        Check(
            f"{label} {number}, Hz",
            float(modes.frequencies_hz[i]),
            value,
            CLOSED_FORM,
            error_bar=float(modes.errors_hz[i]),
        )
        for number, (i, value) in enumerate(zip(found, expected, strict=False), start=1)
    ]
