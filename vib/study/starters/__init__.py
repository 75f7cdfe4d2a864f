"""Starter studies: complete, commented files that run as they are, to be changed into one's own.

A new starter is a new .toml file in this folder and one line in `STARTERS`.
"""

from __future__ import annotations

from importlib.resources import files

from vib.errors import ModelError
from vib.study.names import did_you_mean

STARTERS = {
    "cantilever": "a flat bar clamped at one end",
    "portal": "a portal frame that carries a hoist",
    "skid": "a pump and its motor on a skid with isolators",
    "chain": "three masses in line, joined by springs",
    "matrices": "mass, damping and stiffness matrices, written as rows",
}


def starter_text(kind: str) -> str:
    """The text of a starter study.

    Parameters
    ----------
    kind
        A key of `STARTERS`.

    Raises
    ------
    ModelError
        No such kind; the message suggests the nearest one.
    """
    if kind not in STARTERS:
        raise ModelError(
            f'no starter is named "{kind}"{did_you_mean(kind, STARTERS)}; there are: {", ".join(STARTERS)}'
        )
    return (files(__package__) / f"{kind}.toml").read_text(encoding="utf-8")
