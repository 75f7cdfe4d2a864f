"""Records under inputs: laws of linear systems, exact discretisation, integration by SciPy, files."""

from __future__ import annotations

import os
from itertools import pairwise
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.integrate import solve_ivp

import vib
from vib.errors import AccuracyError, ModelError, ShapeError
from vib.response import simulate as simulating
from vib.response.signals import Constant, Harmonic, Impulse, Points, Samples, Signal, Steps, Sweep, half_sine
from vib.response.simulate import simulate, simulate_to
from vib.response.transition import constant_input

MATRICES: dict[str, Any] = {
    "damped": [[0, 1, 0, 0], [-400, -2, 150, 1], [0, 0, 0, 1], [150, 1, -300, -3]],
    "rigid body": [[0, 1], [0, 0]],
    "three times the same": [[-2, 1, 0], [0, -2, 1], [0, 0, -2]],
    "critical beside slow": [[0, 1, 0], [-25, -10, 0], [0, 0, -0.1]],
    "spiral out": [[0, 1], [-90, 0.5]],
}
SIGNALS: dict[str, Signal] = {
    "constant": Constant(2.0, 0.1034, 0.73),
    "points": Points(np.array([0.05, 0.2031, 0.61, 0.7]), np.array([0.0, 3, -1, 2])),
    "steps": Steps(np.array([0.05, 0.2, 0.61]), np.array([2.0, -1.0])),
    "half sine": half_sine(3.0, 0.313, 0.0777),
    "harmonic": Harmonic(2.0, 3.0, 0.3),
    "at resonance": Harmonic(2.0, np.sqrt(90 - 0.0625) / (2 * np.pi)),
    "sweep": Sweep(1.0, 2.0, 9.0, 0.8, False, 0.05),
    "exponential sweep": Sweep(1.0, 2.0, 20.0, 0.8, True, 0.0512),
    "blows": Impulse(1.5, 0.2222),
}


def space(name):
    matrix = np.array(MATRICES[name], float)
    push = np.linspace(1, 2, len(matrix))[:, None]
    return vib.StateSpace(matrix, push)


def integrated(model, signal, times):
    """By SciPy, piece by piece between corners."""
    end = float(times[-1])
    cuts = {0.0, end, *(c for c in signal.corners if 0 < c < end), *(t for t, _ in signal.blows if t < end)}
    state, found = np.zeros(len(model.A)), np.zeros((len(times), len(model.A)))
    ordered = sorted(cuts)
    for low, high in pairwise(ordered):
        for when, size in signal.blows:
            if when == low:
                state = state + size * model.B[:, 0]
        inside = (times >= low) & (times <= high)
        asked = np.unique([*times[inside], high])

        def rate(time, x, low=low, high=high):
            held = np.array([np.clip(time, low + 1e-12, high - 1e-12)])
            return model.A @ x + model.B[:, 0] * signal.value(held)[0]

        solved = solve_ivp(rate, (low, high), state, "DOP853", t_eval=asked, rtol=1e-11, atol=1e-13)
        found[inside] = solved.y.T[np.isin(asked, times[inside])]
        state = solved.y[:, -1]
    return found


@pytest.mark.parametrize("signal", SIGNALS)
@pytest.mark.parametrize("name", MATRICES)
def test_records_agree_with_integration(name, signal):
    """SciPy asked for 1e-11 holds about 1e-9; the steps are far longer than those it takes."""
    model, step = space(name), 0.07
    found = simulate(model, [SIGNALS[signal]], step_s=step, count=14)
    wanted = integrated(model, SIGNALS[signal], step * np.arange(14))
    np.testing.assert_allclose(found, wanted, atol=3e-9 * np.abs(wanted).max())


@pytest.mark.parametrize("name", MATRICES)
def test_a_constant_input_agrees_with_van_loan(name):
    model = space(name)
    found = simulate(model, [Constant(3.0)], step_s=0.05, count=301)
    wanted = 3.0 * constant_input(model.A, model.B, 0.05 * np.arange(301)).input_effect[:, :, 0]
    np.testing.assert_allclose(found, wanted, atol=1e-11 * np.abs(wanted).max())


@pytest.mark.parametrize("name", MATRICES)
def test_a_free_record_agrees_with_transition_matrices(name):
    model, start = space(name), np.arange(1.0, len(MATRICES[name]) + 1)
    found = simulate(model, step_s=0.01, count=1500, start=start)
    wanted = model.transition(0.01 * 1499) @ start
    np.testing.assert_allclose(found[-1], wanted, atol=1e-11 * np.abs(found).max())


@pytest.mark.parametrize("signal", SIGNALS)
@settings(max_examples=8, deadline=None)
@given(parts=st.integers(2, 7), name=st.sampled_from(sorted(MATRICES)))
def test_a_record_does_not_depend_on_its_step(signal, parts, name):
    coarse = simulate(space(name), [SIGNALS[signal]], step_s=0.06, count=18)
    fine = simulate(space(name), [SIGNALS[signal]], step_s=0.06 / parts, count=17 * parts + 1)
    np.testing.assert_allclose(fine[::parts], coarse, atol=1e-10 * np.abs(coarse).max())


@settings(max_examples=30, deadline=None)
@given(
    first=st.sampled_from(sorted(SIGNALS)),
    second=st.sampled_from(sorted(SIGNALS)),
    name=st.sampled_from(sorted(MATRICES)),
)
def test_inputs_add_up(first, second, name):
    one, other = ([SIGNALS[key]] for key in (first, second))
    model = space(name)
    both = simulate(model, [one + other], step_s=0.03, count=60)
    alone = [simulate(model, [each], step_s=0.03, count=60) for each in (one, other)]
    apart = alone[0] + alone[1]
    np.testing.assert_allclose(both, apart, atol=1e-11 * np.abs(both).max())


@settings(max_examples=20, deadline=None)
@given(seed=st.integers(0, 1000), delay=st.integers(1, 40), name=st.sampled_from(sorted(MATRICES)))
def test_a_later_input_gives_the_same_later(seed, delay, name):
    values = np.random.default_rng(seed).normal(size=50)
    at_once = simulate(space(name), [Samples(values, 0.02)], step_s=0.02, count=60)
    later = simulate(space(name), [Samples(values, 0.02, 0.02 * delay)], step_s=0.02, count=60 + delay)
    scale = np.abs(at_once).max()
    np.testing.assert_allclose(later[:delay], 0, atol=1e-12 * scale)
    np.testing.assert_allclose(later[delay:], at_once, atol=1e-10 * scale)


def test_samples_are_linear_between_them():
    values = np.random.default_rng(3).normal(size=401)
    model = space("damped")
    sampled = simulate(model, [values], step_s=0.01, count=401)
    pointed = simulate(model, [Points(np.linspace(0.0, 4.0, 401), values)], step_s=0.01, count=401)
    np.testing.assert_allclose(sampled, pointed, atol=1e-12 * np.abs(sampled).max())


def test_a_blow_is_the_rate_of_a_step():
    model = space("damped")
    width = 1e-7
    blow = simulate(model, [Impulse(1.0, 0.123)], step_s=0.05, count=40)
    short = simulate(model, [Constant(1 / width, 0.123, 0.123 + width)], step_s=0.05, count=40)
    np.testing.assert_allclose(blow, short, atol=1e-5 * np.abs(blow).max())


def test_a_blow_at_the_start_is_an_initial_state():
    model = space("damped")
    blow = simulate(model, [Impulse(2.0)], step_s=0.05, count=400)
    free = simulate(model, step_s=0.05, count=400, start=2.0 * model.B[:, 0])
    np.testing.assert_allclose(blow, free, atol=1e-12 * np.abs(free).max())


def test_contributions_add_up_to_the_record():
    from vib.response.simulate import driven

    model = space("critical beside slow")
    acting: list[Signal] = [Harmonic(1.0, 2.0), Impulse(1.0, 0.31)]
    task = driven(model, [acting], step_s=0.01, count=900, start=None)
    record, moments = task.record(0.01, 900), [0, 17, 640, 899]
    added = task.contributions(0.01, moments).sum(axis=2)
    np.testing.assert_allclose(added, record[moments], atol=1e-12 * np.abs(record).max())


@pytest.mark.parametrize("ending", [".npy", ".npz"])
def test_a_streamed_record_is_the_same(tmp_path, monkeypatch, ending):
    from vib.response import record as recording

    model, values = space("damped"), np.random.default_rng(5).normal(size=5000)
    whole = simulate(model, [values], step_s=0.01, count=5000)
    monkeypatch.setattr(recording, "_CHUNK", 20_000)  # so that it comes in several pieces
    path = simulate_to(tmp_path / f"record{ending}", model, [values], step_s=0.01, count=5000)
    if ending == ".npy":
        loaded = np.load(path, mmap_mode="r")
    else:
        with np.load(path) as archive:
            assert archive["step_s"] == 0.01
            assert archive["outputs"].tolist() == list(model.outputs)
            loaded = archive["record"]
    np.testing.assert_allclose(loaded, whole, atol=1e-12 * np.abs(whole).max())


def test_a_failed_stream_leaves_no_file(tmp_path):
    with pytest.raises(AccuracyError, match="unstable"):
        simulate_to(tmp_path / "x.npy", space("spiral out"), [Constant(1.0)], step_s=10.0, count=1000)
    assert not list(tmp_path.iterdir())
    with pytest.raises(ModelError, match=r"\.npy or \.npz"):
        simulate_to(tmp_path / "x.txt", space("damped"), step_s=0.1, count=3)


def test_records_that_do_not_fit_are_refused(monkeypatch):
    with pytest.raises(ModelError, match="simulate_to"):
        simulate(space("damped"), step_s=1e-9, count=10**15)
    monkeypatch.setattr(os, "sysconf", lambda name: (_ for _ in ()).throw(ValueError(name)))
    simulating.check_memory(10**15, 4)  # a system that can't tell


@pytest.mark.parametrize(
    ("arguments", "kind", "message"),
    [
        ({"inputs": [None, None]}, ShapeError, "One per column"),
        ({"inputs": [np.zeros(7)]}, ShapeError, "input 1: expected shape"),
        ({"start": [1.0]}, ShapeError, "One number per state"),
        ({"step_s": 0.0}, ModelError, "positive step"),
    ],
)
def test_faults_are_named(arguments, kind, message):
    with pytest.raises(kind, match=message):
        simulate(space("damped"), **{"step_s": 0.1, "count": 5, **arguments})
