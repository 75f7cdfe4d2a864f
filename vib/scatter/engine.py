"""How samples get their modes: which modes are followed, and where the work is done."""

from __future__ import annotations

from collections.abc import Callable
from contextlib import AbstractContextManager, nullcontext
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np
from threadpoolctl import threadpool_limits

from vib.progress import tell
from vib.scatter.batch import Array, Batch
from vib.scatter.family import Family
from vib.scatter.reanalysis import Reanalysis
from vib.scatter.running import Task, run

if TYPE_CHECKING:
    from vib.study import Study

Progress = Callable[[float, float], None]
USUAL_COUNT, LEAST_COUNT = 12, 6
LARGE = 1000  # freedoms from which a second thread pays
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


def calmly(study: Study) -> AbstractContextManager[object]:
    """One BLAS thread for a frame: its matrices are small, and threads beside workers only wait."""
    rows = 0 if study.loaded is None else study.loaded.mass.shape[0]
    if study.mesh is not None or rows > LARGE:
        return nullcontext()
    import scipy.linalg  # noqa: F401  (only a library that is loaded can be told)

    return threadpool_limits(1, user_api="blas")  # type: ignore[no-any-return]


@dataclass(frozen=True)
class Where:
    """Where the work is done, what keeps it, and who hears how far it is; see `vib.scatter.running.run`."""

    workers: int | None = None
    cluster: str | None = None
    resume_in: str | Path | None = None
    progress: Progress | None = None

    def run(self, task: Task, values: Array, work: str) -> Batch:
        """Do a task for samples (N, d); ``work`` names it."""
        kept = None if self.resume_in is None else Path(self.resume_in) / work.replace(" ", "_")
        heard = self.progress or (lambda share, left: tell(work, share, left))
        return run(task, values, workers=self.workers, cluster=self.cluster, resume_in=kept, progress=heard)


def reanalysis_of(family: Family, values: Array) -> Reanalysis:
    """The reduced basis for samples (N, d) of a family."""
    tell("reduced basis of the samples")
    mixed = values[np.random.default_rng(0).permutation(len(values))]
    return Reanalysis.build(family, training=mixed if len(mixed) >= ENOUGH else None)
