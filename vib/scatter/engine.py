"""How samples get their modes: which modes are followed, and where the work is done."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from vib.scatter.batch import Array, Batch
from vib.scatter.family import Family
from vib.scatter.reanalysis import Reanalysis

if TYPE_CHECKING:
    from vib.study import Study

Progress = Callable[[float, float], None]
USUAL_COUNT, LEAST_COUNT = 12, 6
ENOUGH = 128  # samples that tell where samples lie
BEYOND = 1.25  # modes are followed so far above the highest band, as they may fall into it


def limits_of(
    study: Study, count: int | None, up_to: str | float | None, band: float | str | None
) -> dict[str, Any]:
    """Which modes: those asked for, those that may fall within a band, or a usual number."""
    if count is not None or up_to is not None:
        return {"count": count, "up_to": up_to}
    if not study.excitations:
        return {"count": USUAL_COUNT}
    from vib.screening import highest_needed_hz

    limit = BEYOND * highest_needed_hz(study.excitations, band=band, accuracy=study.accuracy)
    few = study.system(up_to=limit).modes(up_to=limit).count < LEAST_COUNT
    return {"count": LEAST_COUNT} if few else {"up_to": limit}


def evaluate(
    family: Family,
    values: Array,
    *,
    workers: int | None,
    cluster: str | None,
    resume_in: str | Path | None,
    progress: Progress | None,
) -> tuple[Batch, tuple[str, ...]]:
    """The modes of samples (N, d) of a family, and what there is to remark."""
    mixed = values[np.random.default_rng(0).permutation(len(values))]
    reanalysis = Reanalysis.build(family, training=mixed if len(mixed) >= ENOUGH else None)
    return reanalysis.evaluate(values), reanalysis.remarks
