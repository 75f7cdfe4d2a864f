"""Share of a search that is done and the time it will still take, from the pace so far."""

from __future__ import annotations

import math
import time

from vib.progress import tell
from vib.solve.backends.interface import Factor
from vib.solve.krylov import Krylov
from vib.solve.pencil import Pencil

# Blocks that a search takes beyond twice the wanted modes, before its own pace is known.
BLOCKS_BEYOND = 7


class Clock:
    """Times factorisations and steps; tells the share done and the seconds left (`vib.progress`).

    ``seconds`` is the time spent in factorisations and steps so far.
    """

    def __init__(self) -> None:
        self._began = time.perf_counter()
        self.seconds = 0.0
        self._factor = self._step = self._share = 0.0
        self._falls: list[float] = []
        self._steps = 0

    def time_factor(self, pencil: Pencil, shift: float) -> Factor:
        """Factorise K - shift M."""
        tell(f"factorising {pencil.size} equations", self._share or None)
        start = time.perf_counter()
        factor = pencil.factorise(shift)
        self._factor = time.perf_counter() - start
        self.seconds += self._factor
        return factor

    def time_step(self, krylov: Krylov) -> None:
        """One step of the basis."""
        start = time.perf_counter()
        krylov.step()
        self._step = time.perf_counter() - start
        self.seconds += self._step
        self._steps += 1

    def tell(self, slowest: float | None, blocks: float) -> None:
        """Report, given the slowest residual over what is asked of it and the wanted modes in blocks."""
        left = max(1.0, 2 * blocks + BLOCKS_BEYOND - self._steps)
        if slowest:
            self._falls.append(math.log10(max(slowest, 1.0)))
            fall = self._falls[0] - self._falls[-1]
            if len(self._falls) > 3 and fall > 0:
                left = max(1.0, self._falls[-1] * (len(self._falls) - 1) / fall)
        seconds = left * self._step + self._factor
        past = time.perf_counter() - self._began
        self._share = max(self._share, past / (past + seconds))
        tell("searching modes", self._share, seconds)
