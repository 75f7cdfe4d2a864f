"""Tasks for runs, in a module that other processes can import."""

import os
import signal
import time
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from vib.errors import AccuracyError, Fault, StudyError
from vib.scatter.batch import Batch


@dataclass(frozen=True)
class Squares:
    """Squares of the samples; slowly, and with accidents where asked for."""

    chunk: int = 3
    pause_s: float = 0.0
    fingerprint: str = "squares"
    fault: str = ""
    dies_once: str = ""  # a file that is there once the accident has happened

    def __call__(self, samples):
        time.sleep(self.pause_s)
        if self.dies_once and samples[0, 0] > 10:
            mark = Path(self.dies_once)
            if not mark.exists():
                mark.touch()
                os.kill(os.getpid(), signal.SIGKILL)
        if self.fault and samples[0, 0] > 10:
            if self.fault == "accuracy":
                raise AccuracyError("can't be trusted")
            raise StudyError("some.toml", [Fault("springs[0]", "is wrong")])
        square = samples**2
        flags = np.zeros(len(samples), dtype=bool)
        return Batch(square, square, square, square, flags, flags, ~flags, square[:, 0])
