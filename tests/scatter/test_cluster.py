"""Runs on a real scheduler and workers on this machine; skipped without the extra ``cluster``."""

import os
import signal
import subprocess
import sys
import time
from importlib.util import find_spec

import numpy as np
import pytest

from tests.scatter.studies import FRAME, family, samples
from tests.scatter.tasks import Squares
from vib.errors import ModelError, VibError
from vib.scatter.reanalysis import Reanalysis
from vib.scatter.running import run

with_cluster = pytest.mark.skipif(find_spec("distributed") is None, reason='needs the extra "cluster"')
SAMPLES = np.arange(120.0).reshape(60, 2)
ENVIRONMENT = {**os.environ, "PYTHONPATH": os.getcwd(), "PYTHONWARNINGS": "ignore"}


class Cluster:
    """A scheduler and two workers, each a process of its own."""

    def __init__(self, folder):
        self.folder, self.file = folder, folder / "scheduler.json"
        self.processes = [self._start("scheduler", "--host", "127.0.0.1", "--port", "0", "--no-dashboard")]
        for _ in range(2):
            self.add_worker()
        self._wait()

    def _start(self, kind, *options):
        command = [sys.executable, "-m", f"distributed.cli.dask_{kind}", "--scheduler-file", str(self.file)]
        log = (self.folder / f"{kind}.log").open("ab")
        with log:
            return subprocess.Popen([*command, *options], env=ENVIRONMENT, stdout=log, stderr=log)

    def add_worker(self):
        options = ("--no-nanny", "--no-dashboard", "--nthreads", "1", "--local-directory", str(self.folder))
        self.processes.append(self._start("worker", *options))
        return self.processes[-1]

    def _wait(self):
        import json

        from distributed import Client

        until = time.monotonic() + 60
        while not self.file.exists() and time.monotonic() < until:
            time.sleep(0.1)
        self.address = json.loads(self.file.read_text())["address"]
        with Client(self.address, set_as_default=False) as client:
            client.wait_for_workers(2, timeout=60)

    def close(self):
        for process in self.processes[::-1]:
            process.kill()
            process.wait()


@pytest.fixture
def cluster(tmp_path):
    made = Cluster(tmp_path)
    yield made
    made.close()


@with_cluster
def test_the_same_numbers_on_a_cluster(cluster, tmp_path):
    made = family(tmp_path, FRAME, count=5)
    evaluator = Reanalysis.build(made).evaluator
    points = samples(made, 700)
    here, there = run(evaluator, points, workers=1), run(evaluator, points, cluster=cluster.address)
    for name, rows in here.arrays().items():
        assert np.array_equal(rows, there.arrays()[name], equal_nan=True), name


@with_cluster
def test_a_killed_worker_costs_time_but_no_results(cluster):
    shares = []

    def told(share, left):
        shares.append(share)
        if len(shares) == 3:
            os.kill(cluster.processes[1].pid, signal.SIGKILL)

    found = run(Squares(pause_s=0.1), SAMPLES, cluster=cluster.address, progress=told)
    assert cluster.processes[1].wait(10) == -signal.SIGKILL
    assert np.array_equal(found.frequencies_hz, SAMPLES**2)
    assert shares[-1] == 1


@with_cluster
def test_all_workers_lost_and_one_that_comes_later(cluster):
    shares = []

    def told(share, left):
        shares.append(share)
        if len(shares) == 3:
            for process in cluster.processes[1:]:
                process.kill()
            cluster.add_worker()

    found = run(Squares(pause_s=0.1), SAMPLES, cluster=cluster.address, progress=told)
    assert np.array_equal(found.frequencies_hz, SAMPLES**2)


@with_cluster
def test_errors_of_samples_come_back_from_a_cluster(cluster):
    with pytest.raises(ModelError, match=r"some.toml: springs\[0\]: is wrong"):
        run(Squares(fault="study"), SAMPLES, cluster=cluster.address)


@with_cluster
def test_no_cluster_at_the_address(monkeypatch):
    monkeypatch.setattr("vib.scatter.cluster.CONNECT_S", 1)
    with pytest.raises(VibError, match=r"cluster tcp://127.0.0.1:9: no scheduler answers there"):
        run(Squares(), SAMPLES, cluster="tcp://127.0.0.1:9")


def test_without_the_extra_it_is_named(monkeypatch):
    monkeypatch.setitem(sys.modules, "distributed", None)
    with pytest.raises(VibError, match='needs the extra "cluster"'):
        run(Squares(), SAMPLES, cluster="tcp://127.0.0.1:8786")
