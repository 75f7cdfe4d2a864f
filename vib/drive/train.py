"""Which shaft varies in a run-up, and how fast every other one turns then."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from vib.errors import ModelError
from vib.study.excitations import Excitation, leader

Array = NDArray[np.float64]
Range = tuple[float, float]


@dataclass(frozen=True)
class Train:
    """Speeds of all shafts against that of the reference shaft, ``reference`` ("" if nothing turns).

    ``ratios``: own speed over reference speed of the shafts tied to it; ``held``: speeds, rev/s, of shafts
    that turn by themselves; ``ranges``: stated speeds of the reference shaft.
    """

    reference: str
    ratios: Mapping[str, float]
    held: Mapping[str, float]
    ranges: tuple[Range, ...]
    remarks: tuple[str, ...]

    def speed(self, name: str, reference_hz: Array) -> Array:
        """Own speed (k,) of a shaft at speeds (k,) of the reference shaft, rev/s."""
        if name in self.ratios:
            return np.asarray(self.ratios[name] * reference_hz)
        return np.full(len(reference_hz), self.held[name])


def train(
    excitations: Sequence[Excitation], shaft: str | None = None, held_hz: Mapping[str, float] | None = None
) -> Train:
    """The train of shafts.

    Parameters
    ----------
    excitations
        As in a study.
    shaft
        The reference shaft; default: the first with a range of speeds, else the first that turns.
    held_hz
        Speeds, rev/s, of other machines, which don't follow the reference shaft; default: their fastest.

    Raises
    ------
    ModelError
        No such shaft.
    """
    led = {row.name: leader(row, excitations) for row in excitations if row.turns}
    if not led:
        if shaft is not None:
            raise ModelError(f"{shaft}: no excitation of that name has a running speed")
        return Train("", {}, {}, (), ())
    by_name = {row.name: row for row in excitations}
    if shaft is None:
        leaders = [row for row in excitations if row.turns and row.shaft is None]
        ranging = [row for row in leaders if any(low < high for low, high in row.speed_ranges)]
        shaft = (ranging or leaders)[0].name
    if shaft not in led:
        raise ModelError(
            f"{shaft}: no excitation of that name has a running speed; there are {', '.join(led)}"
        )
    first, own = led[shaft]
    ratios = {name: ratio / own for name, (root, ratio) in led.items() if root is first}
    held, remarks = {}, []
    for name, (root, ratio) in led.items():
        if root is first:
            continue
        fastest = max(high for _, high in root.speed_ranges)
        held[name] = ratio * float((held_hz or {}).get(root.name, fastest))
        if root.name == name:
            remarks.append(
                f"{name} turns by itself, at {60 * held[name]:.6g} rpm throughout"
                + (", its fastest." if name not in (held_hz or {}) and _varies(root) else ".")
            )
    others = {root.name for root, _ in led.values() if root is not first}
    if unknown := sorted(set(held_hz or {}) - others):
        raise ModelError(f"held speeds: {', '.join(unknown)} is no other machine with a speed of its own")
    return Train(shaft, ratios, held, by_name[shaft].speed_ranges, tuple(remarks))


def _varies(excitation: Excitation) -> bool:
    speeds = {speed for speeds in excitation.speed_ranges for speed in speeds}
    return len(speeds) > 1
