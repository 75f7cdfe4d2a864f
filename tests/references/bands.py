"""Screening against a running speed."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

import vib
from tests.references.common import Check, Entry, covers, matrices_study


@covers("STD-BAND")
def running_speed(entry: Entry) -> Iterator[Check]:
    """Uncoupled masses with the natural frequencies of the entry."""
    frequencies = np.array(entry["inputs"]["f"])
    built = matrices_study(
        np.eye(len(frequencies)),
        np.diag((2 * np.pi * frequencies) ** 2),
        extra=f'[[excitations]]\nspeed = "{entry["inputs"]["speed"]} rpm"\norders = [1, 2]\n',
    )
    found = vib.screen(built.system().modes(), built.excitations)
    for line, order in zip(found.lines, ("1x", "2x"), strict=True):
        edges = zip(("from", "to"), (line.band_from_hz, line.band_to_hz), strict=True)
        for (side, ours), value in zip(edges, entry["expected"][f"{order}_band"], strict=True):
            yield Check(f"band of {order}, {side}, Hz", ours, value, 1e-7)
        flagged = [row.frequency_hz for row in found.rows if row.line == line and row.counts]
        expected = entry["expected"][f"flagged_{order}"]
        yield Check(f"modes inside the band of {order}", len(flagged), len(expected), 0.0, absolute=True)
        for ours, value in zip(flagged, expected, strict=True):
            yield Check(f"inside the band of {order}, Hz", ours, value, 1e-9)
