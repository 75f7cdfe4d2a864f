"""Running chunks on the workers of a Dask cluster."""

from __future__ import annotations

import hashlib
import pickle
from collections.abc import Iterator, Mapping
from typing import Any, cast

from vib.errors import VibError
from vib.scatter.batch import Array
from vib.scatter.running import Outcome, Task, work

CONNECT_S = 10
# workers may die while they hold a chunk: how many of them before the chunk itself is suspected
MOST_DEATHS = 10


def on_cluster(address: str, task: Task, waiting: Mapping[int, Array]) -> Iterator[tuple[int, Outcome]]:
    """Outcomes as they come; what a lost worker held is done again by another.

    Raises
    ------
    VibError
        No scheduler answers, the workers can't load the task, or die with the same chunk again and again.
    """
    try:
        from distributed import Client, as_completed
        from distributed.scheduler import KilledWorker
    except ImportError:
        raise VibError('a cluster needs the extra "cluster": pip install "vib[cluster]"') from None
    try:
        client: Any = cast(Any, Client)(address, timeout=CONNECT_S, set_as_default=False)
    except (OSError, ValueError, TimeoutError) as error:
        raise VibError(f"cluster {address}: no scheduler answers there ({error})") from None
    with client:
        pickled = pickle.dumps(task)
        name = f"vib-{hashlib.sha256(pickled).hexdigest()[:16]}"
        # a result of the cluster rather than data sent to it: if its holder dies it is computed again
        held = client.submit(_unpacked, pickled, key=name)
        futures = {
            client.submit(_work, held, samples, key=(name, number), retries=MOST_DEATHS): number
            for number, samples in waiting.items()
        }
        deaths: dict[int, int] = {}
        arriving: Any = cast(Any, as_completed)(futures, loop=client.loop)
        try:
            for future in arriving:
                number = futures[future]
                try:
                    outcome = future.result()
                except KilledWorker:
                    deaths[number] = deaths.get(number, 0) + 1
                    if deaths[number] > MOST_DEATHS:
                        raise
                    again = client.submit(_work, held, waiting[number], key=(name, number, deaths[number]))
                    futures[again] = number
                    arriving.add(again)
                    continue
                yield number, outcome
        except KilledWorker as error:
            raise VibError(f"cluster {address}: workers die again and again ({error})") from None
        except ImportError as error:
            raise VibError(
                f"cluster {address}: its workers need the same version of vib as here ({error})"
            ) from None
        finally:
            client.cancel(list(futures))


def _unpacked(pickled: bytes) -> Task:
    task: Task = pickle.loads(pickled)
    return task


def _work(task: Task, samples: Array) -> Outcome:
    return work(task, samples)
