"""Limits of the user's own against the levels that they are for."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any, Literal

import numpy as np
from numpy.typing import NDArray

from vib.errors import ModelError
from vib.study.severity import OwnLimits
from vib.study.severity import Severity as Table

if TYPE_CHECKING:
    from vib.response.run_up import RunUp

Array = NDArray[np.float64]
Owned = Literal["velocity_rms", "displacement_rms", "displacement_peak", "force"]
_UNITS = {"velocity_rms": "m_s", "displacement_rms": "m", "displacement_peak": "m", "force": "n"}


@dataclass(frozen=True)
class OwnCheck:
    """One limit at one place.

    ``quantity`` as in the study; ``output`` such as "motor y", or the support; ``speed_hz`` of the reference
    shaft, rev/s, where the level is highest; ``level`` and ``limit`` in SI; ``source`` the limit's name.
    """

    quantity: Owned
    output: str
    speed_hz: float
    level: float
    limit: float
    source: str

    @property
    def exceeded(self) -> bool:
        """Whether the level is above the limit."""
        return self.level > self.limit * (1 + 1e-12)

    def to_dict(self) -> dict[str, Any]:
        """Plain values, the unit in the names."""
        unit = _UNITS[self.quantity]
        return {
            "quantity": self.quantity,
            "output": self.output,
            "speed_rpm": 60 * self.speed_hz,
            f"level_{unit}": self.level,
            f"limit_{unit}": self.limit,
            "exceeded": self.exceeded,
            "source": self.source,
        }


def check_own(
    run_up: RunUp, table: Table, watched: Sequence[int], chosen: NDArray[np.bool_]
) -> tuple[OwnCheck, ...]:
    """Every limit at every place that it is for, over the speeds (k,) that are chosen.

    A limit that names no places is for the outputs ``watched``.

    Raises
    ------
    ModelError
        A limit is for a place that is not among the outputs, or for forces where there are no supports.
    """
    for limits in table.limits:
        known = {*run_up.outputs, *(place for place, _ in run_up.places)}
        for name in limits.at or ():
            if name not in known:
                raise ModelError(
                    f'severity.limits: {limits.name}: "{name}" is not among the outputs: '
                    f"{', '.join(run_up.outputs)}"
                )
        if limits.force is not None and run_up.transmitted is None:
            raise ModelError(
                f"severity.limits: {limits.name}: force: there are no supports in bare matrices; leave it out"
            )
    return tuple(
        check for limits in table.limits for check in _checks(run_up, limits, watched, np.flatnonzero(chosen))
    )


def _checks(
    run_up: RunUp, limits: OwnLimits, watched: Sequence[int], chosen: NDArray[np.intp]
) -> Iterator[OwnCheck]:
    levels: dict[Owned, Array] = {
        "velocity_rms": run_up.velocity_rms_m_s,
        "displacement_rms": run_up.displacement_rms_m,
        "displacement_peak": run_up.displacement_peak_m,
    }
    for quantity, values in levels.items():
        limit = getattr(limits, quantity)
        for column, output in enumerate(run_up.outputs):
            named = column in watched
            if limits.at is not None:
                named = output in limits.at or run_up.places[column][0] in limits.at
            if limit is not None and named and not run_up.rotational[column]:
                yield _check(run_up, quantity, output, values[:, column], limit, limits.name, chosen)
    if limits.force is not None and run_up.transmitted is not None:
        for column, (owner, component) in enumerate(
            zip(run_up.transmitted.names, run_up.transmitted.components, strict=True)
        ):
            if not component.startswith("r"):
                forces = run_up.transmitted_peak_n[:, column]
                yield _check(run_up, "force", owner, forces, limits.force, limits.name, chosen)


def _check(
    run_up: RunUp,
    quantity: Owned,
    output: str,
    values: Array,
    limit: float,
    source: str,
    chosen: NDArray[np.intp],
) -> OwnCheck:
    k = int(chosen[np.argmax(values[chosen])])
    return OwnCheck(quantity, output, float(run_up.speed_hz[k]), float(values[k]), limit, source)
