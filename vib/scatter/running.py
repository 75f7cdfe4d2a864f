"""Running samples: in chunks over all cores or a cluster, with the same numbers whoever works on them.

How samples are cut into chunks depends on nothing but the task, and every chunk is worked on by one thread.
"""

from __future__ import annotations

import hashlib
import os
import pickle
import signal
import sys
import threading
import time
from collections.abc import Callable, Iterator, Mapping
from concurrent.futures import ProcessPoolExecutor, ThreadPoolExecutor, as_completed
from concurrent.futures.process import BrokenProcessPool
from contextlib import contextmanager
from multiprocessing import get_context
from pathlib import Path
from typing import Any, NamedTuple, Protocol

import numpy as np
from numpy.typing import NDArray
from threadpoolctl import threadpool_limits

from vib.errors import AccuracyError, ModelError, VibError
from vib.scatter.batch import Array, Batch
from vib.scatter.keeping import Kept

Progress = Callable[[float, float], None]
# work that takes longer is shared out to threads, which wait for each other while they run Python, and to
# processes, which take seconds to start
THREADS_PAY_S, PROCESSES_PAY_S = 0.2, 15.0
MOST_BREAKS = 3  # times in a row that processes may die before anything new is done


class Task(Protocol):
    """What is done to samples (N, d); it can be pickled."""

    @property
    def chunk(self) -> int:
        """How many samples are handed out at a time."""
        ...

    @property
    def fingerprint(self) -> str:
        """Equal for tasks that give the same results."""
        ...

    def __call__(self, samples: Array) -> Batch:
        """The results, in the order of the samples."""
        ...


class Outcome(NamedTuple):
    """What came of a chunk: arrays by their name, or the words of an error, perhaps one of accuracy."""

    arrays: dict[str, NDArray[Any]]
    error: str = ""
    accuracy: bool = False


def run(
    task: Task,
    samples: Array,
    *,
    workers: int | None = None,
    cluster: str | None = None,
    resume_in: str | Path | None = None,
    progress: Progress | None = None,
) -> Batch:
    """Do a task for samples (N, d), in chunks.

    Parameters
    ----------
    task
        Such as `vib.scatter.reanalysis.Reanalysis.evaluator`.
    workers
        How many work at the same time; default: one for each core that this process may use. They are
        processes where the work is long, threads where it is short.
    cluster
        Address of a Dask scheduler, such as ``"tcp://host:8786"``, whose workers do it instead.
    resume_in
        A folder that keeps what is done, chunk by chunk; the same call takes it up again after a break.
    progress
        Receives the share done, 0 to 1, and the seconds left.

    Raises
    ------
    ModelError
        A sample can't be built; a number of workers below one; a folder that keeps another run.
    AccuracyError
        A result that can't be trusted.
    VibError
        Workers that die again and again; no cluster at the address, or extra ``cluster`` is not installed.
    """
    if workers is not None and workers < 1:
        raise ModelError(f"workers: a number from 1 is needed, got {workers}")
    samples = np.ascontiguousarray(samples, dtype=float)
    starts = range(0, len(samples), task.chunk)
    chunks = {number: samples[first : first + task.chunk] for number, first in enumerate(starts)}
    if not chunks:
        return task(samples)
    kept = None if resume_in is None else Kept(Path(resume_in), _fingerprint(task, samples), len(chunks))
    done: dict[int, Mapping[str, NDArray[Any]]] = {} if kept is None else kept.load()
    waiting = {number: chunk for number, chunk in chunks.items() if number not in done}
    clock = _Clock(progress, len(samples), sum(len(chunks[number]) for number in done))
    for number, outcome in _outcomes(task, waiting, workers, cluster):
        if outcome.error:
            raise (AccuracyError if outcome.accuracy else ModelError)(outcome.error)
        done[number] = outcome.arrays
        if kept is not None:
            kept.save(number, outcome.arrays)
        clock.tell(len(chunks[number]))
    return Batch.joined([done[number] for number in chunks])


def work(task: Task, samples: Array) -> Outcome:
    """Do a task on one thread; errors of ours come back as words, since not all can be pickled."""
    try:
        with _one_thread:
            return Outcome(task(samples).arrays())
    except VibError as error:
        return Outcome({}, str(error), isinstance(error, AccuracyError))


def _fingerprint(task: Task, samples: Array) -> str:
    found = hashlib.sha256(task.fingerprint.encode())
    found.update(repr((samples.shape, task.chunk)).encode())
    found.update(samples.tobytes())
    return found.hexdigest()


def _outcomes(
    task: Task, waiting: Mapping[int, Array], workers: int | None, cluster: str | None
) -> Iterator[tuple[int, Outcome]]:
    if cluster is not None:
        from vib.scatter.cluster import on_cluster

        yield from on_cluster(cluster, task, waiting)
        return
    cores = len(os.sched_getaffinity(0)) if hasattr(os, "sched_getaffinity") else os.cpu_count() or 1
    many = min(workers if workers is not None else cores, len(waiting) - 1)
    left = dict(waiting)
    for number in waiting:
        start = time.perf_counter()
        outcome = work(task, left.pop(number))
        expected = (time.perf_counter() - start) * len(left)
        yield number, outcome
        if many > 1 and expected > THREADS_PAY_S:
            shared = _in_processes if expected > PROCESSES_PAY_S else _in_threads
            yield from shared(task, left, many)
            return


def _in_threads(task: Task, waiting: dict[int, Array], workers: int) -> Iterator[tuple[int, Outcome]]:
    with _one_thread, ThreadPoolExecutor(workers) as pool:
        futures = {pool.submit(work, task, samples): number for number, samples in waiting.items()}
        try:
            for future in as_completed(futures):
                yield futures[future], future.result()
        finally:
            pool.shutdown(wait=True, cancel_futures=True)


_task: Task | None = None


def _begin(pickled: bytes) -> None:
    """In a new process: get the task, and leave interruptions to the one that started it."""
    global _task
    signal.signal(signal.SIGINT, signal.SIG_IGN)
    _task = pickle.loads(pickled)


def _work(samples: Array) -> Outcome:
    if _task is None:
        raise VibError("A worker was given samples before its task.")
    return work(_task, samples)


def _in_processes(task: Task, waiting: dict[int, Array], workers: int) -> Iterator[tuple[int, Outcome]]:
    """Outcomes as they come; processes that die are started again, and only what they held is done again."""
    pickled, breaks = pickle.dumps(task), 0
    while waiting:
        pool = ProcessPoolExecutor(
            min(workers, len(waiting)), get_context("spawn"), initializer=_begin, initargs=(pickled,)
        )
        try:
            with _nameless_main():
                futures = {pool.submit(_work, samples): number for number, samples in waiting.items()}
            for future in as_completed(futures):
                outcome = future.result()
                breaks = 0
                del waiting[futures[future]]
                yield futures[future], outcome
        except BrokenProcessPool:
            breaks += 1
            if breaks >= MOST_BREAKS:
                raise VibError(
                    "The processes that work on samples die before they finish any; is there enough memory? "
                    "Fewer workers need less."
                ) from None
        finally:
            pool.shutdown(wait=True, cancel_futures=True)


@contextmanager
def _nameless_main() -> Iterator[None]:
    """New processes shall not run the user's script again, which they would take for a module to import."""
    main = sys.modules["__main__"]
    file, spec = main.__dict__.pop("__file__", None), main.__spec__
    main.__spec__ = None
    try:
        yield
    finally:
        main.__spec__ = spec
        if file is not None:
            main.__file__ = file


class _OneThread:
    """While anyone is inside, linear algebra runs on one thread, so that it rounds the same everywhere."""

    def __init__(self) -> None:
        self.lock, self.inside = threading.Lock(), 0
        self.limits: Any = None

    def __enter__(self) -> None:
        with self.lock:
            if self.inside == 0:
                self.limits = threadpool_limits(limits=1)
            self.inside += 1

    def __exit__(self, *_: object) -> None:
        with self.lock:
            self.inside -= 1
            if self.inside == 0:
                self.limits.restore_original_limits()


_one_thread = _OneThread()


class _Clock:
    """The share done, and the time left by the pace since the start."""

    def __init__(self, progress: Progress | None, whole: int, before: int) -> None:
        self.progress, self.whole, self.before, self.done = progress, whole, before, 0
        self.start = time.perf_counter()

    def tell(self, more: int) -> None:
        self.done += more
        if self.progress is not None:
            left = self.whole - self.before - self.done
            pace = (time.perf_counter() - self.start) / self.done
            self.progress(1 - left / self.whole, left * pace)
