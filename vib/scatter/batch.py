"""What is found for many samples of the same study: arrays whose first axis counts the samples."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, fields
from typing import Any

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]
Flags = NDArray[np.bool_]


@dataclass(frozen=True, eq=False)
class Batch:
    """Frequencies and damping of N samples; columns follow the m nominal modes by shape.

    Attributes
    ----------
    frequencies_hz, damping_ratios
        (N, m) natural frequency and damping ratio as in `vib.modes.Modes`; NaN where a sample has no such
        mode, because an overdamped motion has two where one that swings has one.
    errors_hz
        (N, m) error bar of each frequency against a full solution of the same division into pieces.
    likeness
        (N, m) modal assurance between the mode and the nominal mode of its column, 0 to 1.
    swapped
        (N,) the columns are not in the nominal order of frequency.
    full
        (N,) solved in full, because the error check failed or the matrices could not be interpolated.
    stable
        (N,) nothing grows in this sample, as far as was computed.
    complete_hz
        (N,) no mode below this frequency is missing from the columns.
    levels
        (N, q, 4) r.m.s. velocity (m/s) and displacement (m) of q outputs in the band of a standard, and
        the same of all frequencies; None where no levels were asked for.
    """

    frequencies_hz: Array
    damping_ratios: Array
    errors_hz: Array
    likeness: Array
    swapped: Flags
    full: Flags
    stable: Flags
    complete_hz: Array
    levels: Array | None = None

    def __len__(self) -> int:
        return len(self.frequencies_hz)

    def arrays(self) -> dict[str, NDArray[Any]]:
        """Every array by its name, those that are None left out."""
        found = {field.name: getattr(self, field.name) for field in fields(self)}
        return {name: value for name, value in found.items() if value is not None}

    @classmethod
    def joined(cls, parts: Sequence[Batch | Mapping[str, NDArray[Any]]]) -> Batch:
        """Batches, or their arrays, one after the other."""
        rows = [part.arrays() if isinstance(part, Batch) else part for part in parts]
        return cls(**{name: np.concatenate([row[name] for row in rows]) for name in rows[0]})
