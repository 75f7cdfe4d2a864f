"""Records of a state-space model under given inputs, in memory or streamed to a file."""

from __future__ import annotations

import os
import zipfile
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import ArrayLike

from vib.errors import ModelError, ShapeError
from vib.response.exponential import Array
from vib.response.groups import take_apart
from vib.response.record import Driven, Sink
from vib.response.signals import Samples, Signal
from vib.statespace import StateSpace

Input = Signal | ArrayLike | Sequence[Signal] | None
_SHARE_OF_MEMORY = 0.5


def simulate(
    space: StateSpace,
    inputs: Sequence[Input] = (),
    *,
    step_s: float,
    count: int,
    start: ArrayLike | None = None,
) -> Array:
    """The outputs of x' = A x + B u, y = C x + D u at 0, h, ..., (count - 1) h, without stepping error.

    Parameters
    ----------
    space
        Any model, stable or not, defective or not.
    inputs
        One entry per column of B: a signal of `vib.response.signals`, several that act together, an array of
        ``count`` samples (linear between them), or None. Left out: free motion.
    step_s, count
        The step h, s, and how many times.
    start
        x(0), (s,); at rest if left out.

    Returns
    -------
    ndarray
        (count, o).

    Raises
    ------
    ShapeError, ModelError
        The inputs do not fit; or the record does not fit into memory (then use `simulate_to`).
    AccuracyError
        The motion grows past the largest number.

    References
    ----------
    C. F. Van Loan, IEEE Trans. Automatic Control 23 (1978) 395-404, doi:10.1109/TAC.1978.1101743.

    Examples
    --------
    >>> space = StateSpace([[-1.0]], [[1.0]])
    >>> simulate(space, [Samples([1.0, 1.0], 1.0)], step_s=1.0, count=2).round(6).ravel().tolist()
    [0.0, 0.632121]
    """
    check_memory(count, len(space.outputs))
    return driven(space, inputs, step_s=step_s, count=count, start=start).record(step_s, count)


def simulate_to(
    path: str | os.PathLike[str],
    space: StateSpace,
    inputs: Sequence[Input] = (),
    *,
    step_s: float,
    count: int,
    start: ArrayLike | None = None,
) -> Path:
    """As `simulate`, written piece by piece to a file; only one piece is in memory at a time.

    A ``.npy`` file holds the outputs (count, o), to be opened with ``numpy.load(path, mmap_mode="r")``; a
    ``.npz`` file holds ``step_s``, the names of the ``outputs``, and the outputs as ``record``.

    Raises
    ------
    ModelError
        Another kind of file; otherwise as `simulate`.
    """
    model = driven(space, inputs, step_s=step_s, count=count, start=start)
    with record_file(path, count, space.outputs, step_s) as sink:
        model.record(step_s, count, sink)
    return Path(path)


def driven(
    space: StateSpace, inputs: Sequence[Input], *, step_s: float, count: int, start: ArrayLike | None
) -> Driven:
    """The model taken apart, with its inputs as signals."""
    if len(inputs) > len(space.inputs):
        raise ShapeError(
            "inputs", expected=(len(space.inputs),), got=(len(inputs),), hint="One per column of B."
        )
    signals: list[tuple[int, Signal]] = []
    for column, given in enumerate(inputs):
        signals += [(column, signal) for signal in _signals(given, step_s, count, space.inputs[column])]
    state = np.zeros(len(space.states)) if start is None else np.asarray(start, dtype=np.float64)
    if state.shape != (len(space.states),):
        raise ShapeError(
            "start", expected=(len(space.states),), got=state.shape, hint="One number per state."
        )
    return Driven(take_apart(space.A), space.C, space.B, (space.D,), signals, state)


def _signals(given: Any, step_s: float, count: int, name: str) -> list[Signal]:
    if given is None:
        return []
    if hasattr(given, "expand"):
        return [given]
    if isinstance(given, list | tuple) and given and all(hasattr(one, "expand") for one in given):
        return list(given)
    samples = np.asarray(given, dtype=np.float64)
    if samples.shape != (count,):
        raise ShapeError(
            f"input {name}", expected=(count,), got=samples.shape, hint="One sample per time of the record."
        )
    return [Samples(samples, step_s)] if count > 1 else []


def check_memory(count: int, outputs: int) -> None:
    """Refuse records that would not leave half of the free memory.

    Raises
    ------
    ModelError
        With the way out.
    """
    try:
        free = os.sysconf("SC_PAGE_SIZE") * os.sysconf("SC_AVPHYS_PAGES")
    except (AttributeError, ValueError, OSError):  # not on this system: the allocation itself will tell
        return
    if 8 * count * outputs > _SHARE_OF_MEMORY * free:
        raise ModelError(
            f"record: {count} times of {outputs} outputs take {8e-9 * count * outputs:.3g} GB, more than "
            "half of the free memory; write them to a file piece by piece (simulate_to), or ask for fewer"
        )


@contextmanager
def record_file(
    path: str | os.PathLike[str], count: int, outputs: Sequence[str], step_s: float
) -> Iterator[Sink]:
    """A sink that writes a record (count, outputs) to a .npy or .npz file; no file is left after an error.

    Raises
    ------
    ModelError
        Another kind of file.
    """
    target = Path(path)
    if target.suffix not in (".npy", ".npz"):
        raise ModelError(f"{target.name}: a record is written as .npy or .npz")
    try:
        with open(target, "wb") as file:
            if target.suffix == ".npy":
                _header(file, (count, len(outputs)))
                yield lambda first, values: _write(file, values)
                return
            with zipfile.ZipFile(file, "w", zipfile.ZIP_STORED) as archive:
                for name, array in (("step_s", np.array(step_s)), ("outputs", np.array(list(outputs)))):
                    with archive.open(f"{name}.npy", "w") as member:
                        np.lib.format.write_array(member, array, allow_pickle=False)
                with archive.open("record.npy", "w", force_zip64=True) as member:
                    _header(member, (count, len(outputs)))
                    yield lambda first, values: _write(member, values)
    except BaseException:
        target.unlink(missing_ok=True)
        raise


def _header(file: Any, shape: tuple[int, int]) -> None:
    head = {
        "descr": np.lib.format.dtype_to_descr(np.dtype(np.float64)),
        "fortran_order": False,
        "shape": shape,
    }
    np.lib.format.write_array_header_2_0(file, head)


def _write(file: Any, values: Array) -> None:
    file.write(np.ascontiguousarray(values).data.cast("B"))
