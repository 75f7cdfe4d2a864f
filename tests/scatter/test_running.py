import os
import subprocess
import sys
import textwrap

import numpy as np
import pytest

from tests.scatter.studies import FRAME, family, samples
from tests.scatter.tasks import Squares
from vib.errors import AccuracyError, ModelError
from vib.scatter import running
from vib.scatter.reanalysis import Reanalysis
from vib.scatter.running import run

SAMPLES = np.arange(40.0).reshape(20, 2)


@pytest.fixture
def in_processes(monkeypatch):
    monkeypatch.setattr(running, "PROCESSES_PAY_S", 0.0)
    monkeypatch.setattr(running, "THREADS_PAY_S", 0.0)


def same(one, other):
    rows = other.arrays()
    return all(np.array_equal(value, rows[name], equal_nan=True) for name, value in one.arrays().items())


def test_results_come_in_the_order_of_the_samples():
    assert np.array_equal(run(Squares(), SAMPLES).frequencies_hz, SAMPLES**2)
    assert len(run(Squares(), SAMPLES[:0])) == 0


def test_the_same_numbers_whatever_the_number_of_workers(tmp_path, monkeypatch):
    made = family(tmp_path, FRAME, count=5)
    evaluator = Reanalysis.build(made).evaluator
    points = samples(made, 1300)
    alone = run(evaluator, points, workers=1)
    assert same(alone, run(evaluator, points, workers=3))  # threads, as this is quick
    monkeypatch.setattr(running, "PROCESSES_PAY_S", 0.0)
    monkeypatch.setattr(running, "THREADS_PAY_S", 0.0)
    assert same(alone, run(evaluator, points, workers=2))


def test_a_process_that_is_killed_costs_time_but_no_results(tmp_path, in_processes):
    task = Squares(dies_once=str(tmp_path / "happened"))
    found = run(task, SAMPLES, workers=2)
    assert (tmp_path / "happened").exists()
    assert np.array_equal(found.frequencies_hz, SAMPLES**2)


def test_errors_of_samples_come_back_as_words(in_processes):
    for workers in (1, 2):
        with pytest.raises(ModelError, match=r"some.toml: springs\[0\]: is wrong"):
            run(Squares(fault="study"), SAMPLES, workers=workers)
        with pytest.raises(AccuracyError, match="can't be trusted"):
            run(Squares(fault="accuracy"), SAMPLES, workers=workers)


def test_workers_must_be_at_least_one():
    with pytest.raises(ModelError, match="workers: a number from 1 is needed, got 0"):
        run(Squares(), SAMPLES, workers=0)


def test_progress_rises_to_all_and_tells_the_time_left():
    told = []
    run(Squares(pause_s=0.01), SAMPLES, workers=1, progress=lambda share, left: told.append((share, left)))
    shares, left = zip(*told, strict=True)
    assert list(shares) == sorted(shares)
    assert shares[-1] == 1
    assert len(shares) == 7
    assert left[-1] == 0
    assert 0.02 < left[0] < 5  # six more chunks of at least 10 ms


def test_a_run_is_taken_up_again(tmp_path):
    folder = tmp_path / "kept"
    with pytest.raises(ModelError):
        run(Squares(fault="study"), SAMPLES, workers=1, resume_in=folder)
    files = sorted(file.name for file in folder.iterdir())
    assert files == ["chunk-000000.npz", "chunk-000001.npz", "run.json"]
    told = []
    found = run(Squares(), SAMPLES, resume_in=folder, progress=lambda share, _: told.append(share))
    assert told[0] == pytest.approx(9 / 20)  # three of its own beside the six that were kept
    assert np.array_equal(found.frequencies_hz, SAMPLES**2)
    # all is there now: nothing is done again
    assert np.array_equal(run(Squares(fault="study"), SAMPLES, resume_in=folder).frequencies_hz, SAMPLES**2)


def test_a_damaged_file_is_done_again(tmp_path):
    run(Squares(), SAMPLES, resume_in=tmp_path)
    file = tmp_path / "chunk-000002.npz"
    file.write_bytes(file.read_bytes()[:50])
    assert np.array_equal(run(Squares(), SAMPLES, resume_in=tmp_path).frequencies_hz, SAMPLES**2)
    assert len(file.read_bytes()) > 50


def test_a_folder_keeps_one_run_only(tmp_path):
    run(Squares(), SAMPLES, resume_in=tmp_path)
    for task, points in ((Squares(fingerprint="other"), SAMPLES), (Squares(), SAMPLES + 1)):
        with pytest.raises(ModelError, match="keeps parts of another run"):
            run(task, points, resume_in=tmp_path)


def test_a_folder_that_cannot_be_made(tmp_path):
    (tmp_path / "file").write_text("")
    with pytest.raises(ModelError, match="what is done can't be kept there"):
        run(Squares(), SAMPLES, resume_in=tmp_path / "file" / "folder")


def test_the_fingerprint_knows_study_and_quantities(tmp_path):
    one = Reanalysis.build(family(tmp_path, FRAME, ("bodies[0].mass",), count=3)).evaluator
    again = Reanalysis.build(family(tmp_path, FRAME, ("bodies[0].mass",), count=3)).evaluator
    heavier = FRAME.replace('"140 kg"', '"150 kg"')
    other = Reanalysis.build(family(tmp_path, heavier, ("bodies[0].mass",), count=3)).evaluator
    assert one.fingerprint == again.fingerprint != other.fingerprint


@pytest.mark.parametrize("signalled", [False, True])
def test_a_script_needs_no_guard_and_can_be_interrupted(tmp_path, signalled):
    # processes do not run the user's script again; an interruption keeps what is done and leaves none behind
    script = tmp_path / "script.py"
    script.write_text(
        textwrap.dedent(
            f"""
            import os, signal, numpy as np
            from tests.scatter.tasks import Squares
            from vib.scatter import running
            running.PROCESSES_PAY_S = running.THREADS_PAY_S = 0.0
            def told(share, left):
                if {signalled} and share > 0.5:
                    os.kill(os.getpid(), signal.SIGINT)
            samples = np.arange(40.0).reshape(20, 2)
            found = running.run(
                Squares(pause_s=0.05), samples, workers=2, resume_in={str(tmp_path / "kept")!r}, progress=told
            )
            print("sum", found.frequencies_hz.sum())
            """
        )
    )
    environment = {**os.environ, "PYTHONPATH": os.getcwd()}
    done = subprocess.run(
        [sys.executable, str(script)],
        capture_output=True,
        text=True,
        env=environment,
        check=False,
        timeout=120,
    )
    kept = len(list((tmp_path / "kept").glob("chunk-*.npz")))
    if signalled:
        assert "KeyboardInterrupt" in done.stderr
        assert "sum" not in done.stdout
        assert kept >= 4
        assert not list((tmp_path / "kept").glob("*.part"))
    else:
        assert done.stderr == ""
        assert done.stdout.split() == ["sum", str((SAMPLES**2).sum())]
        assert kept == 7
