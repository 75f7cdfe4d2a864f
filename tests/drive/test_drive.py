"""Forces of machines against their course over time: paths of masses and pistons, blows, by Fourier."""

from __future__ import annotations

from pathlib import Path
from types import SimpleNamespace
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

import vib
from vib.drive import drive
from vib.drive.aim import across
from vib.drive.strength import stroke
from vib.errors import ModelError
from vib.study.motions import piston_orders

TAU = 2 * np.pi
HEAD = """
title = "A block"
[units]
length = "m"
[points]
A = [0, 0, 0]
B = [1, 0, 0]
[[bodies]]
name = "block"
mass = "100 kg"
centre = [0.4, 0, 0]
inertia = ["3 kg m^2", "4 kg m^2", "5 kg m^2"]
carried_by = ["A", "B"]
[[springs]]
between = [["A", "ground"], ["B", "ground"]]
stiffness = { x = "1 kN/mm", y = "1 kN/mm", z = "1 kN/mm", rx = "1 kN m/rad" }
[[excitations]]
name = "engine"
"""
N = 4096  # samples of a turn
ANGLES = TAU * np.arange(N) / N


def planned(tmp_path: Path, text: str) -> Any:
    file = tmp_path / "study.toml"
    file.write_text(HEAD + text)
    study = vib.read(file)
    return drive(study.system(), study.excitations)


def in_time(found, line, speed, turns=1.0):
    """The force (N, 6) of a line on each place over ``turns`` of its shaft, from its phasors."""
    forces = found.forces(line, np.array([speed]))[0]
    rate = found.frequency_hz(line, np.array([speed]))[0] / speed
    total: dict[str, Any] = {}
    for aim, force in zip(found.inputs, forces, strict=True):
        wave = (force * np.exp(1j * rate * turns * ANGLES)).real
        total[aim.place] = total.get(aim.place, 0) + wave[:, None] * np.real(aim.weights)
    return total


@pytest.mark.parametrize("axis", ["x", "-y", "z", [1, 2, -2]])
def test_an_unbalance_pulls_away_from_the_axis(tmp_path, axis):
    """The force is mass times acceleration of a small mass on a circle, by differences of its path."""
    found = planned(
        tmp_path,
        f'speed = "1500 rpm"\naxis = {axis!r}\nat = "block"\n'
        'unbalance = { amount = "3 kg mm", phase = "25 deg" }\n',
    )
    first, second = across(found_axis(axis))
    assert np.cross(first, second) @ found_axis(axis) == pytest.approx(1.0)
    angle = ANGLES + np.radians(25)
    path = 1e-3 * (np.cos(angle)[:, None] * first + np.sin(angle)[:, None] * second)
    step = 1 / 25 / N
    pull = -3 * (np.roll(path, 1, axis=0) - 2 * path + np.roll(path, -1, axis=0)) / step**2
    (line,) = found.lines
    force = in_time(found, line, 25.0)["block"][:, :3]
    assert np.abs(force - pull).max() < 1e-5 * np.abs(pull).max()


def found_axis(axis):
    named = {"x": [1, 0, 0], "-y": [0, -1, 0], "z": [0, 0, 1]}
    vector = np.array(named[axis] if isinstance(axis, str) else axis, dtype=float)
    return vector / np.linalg.norm(vector)


def test_pistons_push_as_their_accelerations_say(tmp_path):
    """Against the exact path of the pistons of a two-throw crank, by its Fourier series."""
    found = planned(
        tmp_path,
        'speed = "1200 rpm"\nat = "block"\nalong = "z"\n'
        'crank = { mass = "2 kg", radius = "50 mm", rod = "160 mm", throws = ["10 deg", "190 deg"], '
        'places = ["A", "B"] }\n',
    )
    radius, rod = 0.05, 0.16
    for place, throw in (("A", 10), ("B", 190)):
        t = ANGLES - np.radians(throw)
        path = radius * np.cos(t) + np.sqrt(rod**2 - (radius * np.sin(t)) ** 2)
        series = np.fft.fft(path) / N
        order = np.fft.fftfreq(N, 1 / N)
        series[np.abs(order) > 40] = 0
        acceleration = np.fft.ifft(-((TAU * 20 * order) ** 2) * series * N).real
        force = sum(in_time(found, line, 20.0)[place][:, 2] for line in found.lines)
        assert np.abs(force + 2 * acceleration).max() < 1e-3 * np.abs(2 * acceleration).max()
    assert [line.order for line in found.lines] == [1.0, 2.0, 4.0]
    # opposite throws: the first order makes a couple only, the second adds up
    first, second = (found.forces(line, np.array([20.0]))[0] for line in found.lines[:2])
    assert abs(first.sum()) < 1e-9 * abs(first[0])
    assert abs(second.sum()) == pytest.approx(2 * abs(second[0]))


def test_secondary_share_of_a_piston():
    """A2 = l + l^3/4 + 15 l^5/128, A4 = -(l^3/4 + 3 l^5/16) (Den Hartog, Mechanical Vibrations, memory)."""
    ratio = 0.3
    found = piston_orders(ratio)
    assert found[2] == pytest.approx(ratio + ratio**3 / 4 + 15 * ratio**5 / 128, rel=2e-4)
    assert found[4] == pytest.approx(-(ratio**3 / 4 + 3 * ratio**5 / 16), rel=2e-2)


@pytest.mark.parametrize("key", ['share = "17 %"', 'duration = "85 ms"'])
def test_blows_add_up_to_half_sines(tmp_path, key):
    found = planned(
        tmp_path,
        f'speed = "120 rpm"\nat = "block"\nalong = "-z"\n'
        f'strokes = {{ peak = "5 kN", {key}, angle = "70 deg", harmonics = 200 }}\n',
    )
    away = (ANGLES - np.radians(70) + np.pi) % TAU - np.pi
    blow = np.where(np.abs(away) < np.pi * 0.17, 5e3 * np.cos(away / (2 * 0.17)), 0.0)
    force = -sum(in_time(found, line, 2.0)["block"][:, 2] for line in found.lines)
    assert np.abs(force - (blow - blow.mean())).max() < 5e-3 * 5e3  # the corners need orders without end
    assert not found.remarks


def test_blows_that_are_cut_short_say_so(tmp_path):
    found = planned(
        tmp_path,
        'speed = "60 rpm"\nat = "block"\nalong = "z"\n'
        'strokes = { peak = "5 kN", duration = "20 ms", harmonics = 20 }\n',
    )
    spectrum = np.abs(np.fft.rfft(np.where(ANGLES < TAU * 0.02, np.sin(ANGLES / 0.04), 0.0)))[1:] ** 2
    rest = spectrum[20:].sum() / spectrum.sum()
    assert f"hold {rest:.0%}"[:6] in found.remarks[0]


@settings(max_examples=40, deadline=None)
@given(order=st.integers(1, 60), share=st.floats(0.01, 0.99), angle=st.floats(-3, 3))
def test_every_order_of_a_blow_is_its_fourier_coefficient(order, share, angle):
    table: Any = SimpleNamespace(share=share, duration=None, peak=2.0, angle=angle, harmonics=order)
    t = (np.arange(20_000) + 0.5) / 20_000 * share - share / 2
    pulse = 2 * np.cos(np.pi * t / share)
    wanted = 2 * share * np.mean(pulse * np.exp(-1j * order * (TAU * t + angle)))
    assert abs(stroke(table, order)(np.array([1.0]))[0] - wanted) < 1e-6


@pytest.mark.parametrize(
    ("table", "order", "force"),
    [
        ('blades = { count = 7, along = "x", amplitude = "40 N", at_speed = "600 rpm" }', 7.0, 160.0),
        ('gear = { teeth = 21, along = "x", amplitude = "40 N" }', 21.0, 40.0),
        (
            'belt = { pulley = "200 mm", length = "2 m", along = "x", amplitude = "40 N", harmonics = [1] }',
            TAU / 20,
            40.0,
        ),
        ('misalignment = { along = "x", amplitude = "40 N", orders = [2] }', 2.0, 40.0),
        (
            'forces = { order = 0.5, along = "x", amplitude = "40 N", growth = "linear", '
            'at_speed = "600 rpm" }',
            0.5,
            80.0,
        ),
    ],
)
def test_orders_and_growth(tmp_path, table, order, force):
    found = planned(tmp_path, f'speed = "1200 rpm"\nat = "block"\n{table}\n')
    (line,) = found.lines
    assert line.order == pytest.approx(order)
    assert found.forces(line, np.array([20.0]))[0] == pytest.approx([force])


def test_half_orders_by_table_and_a_moment(tmp_path):
    found = planned(
        tmp_path,
        'speed = "1200 rpm"\nat = "block"\nforces = { along = "rx", table = [[0.5, "120 N m", "30 deg"], '
        '[1.5, "60 N m"]] }\n',
    )
    assert [line.order for line in found.lines] == [0.5, 1.5]
    assert found.forces(found.lines[0], np.array([20.0]))[0] == pytest.approx([120 * np.exp(1j * np.pi / 6)])


def test_the_mains_and_a_shaken_ground_keep_their_frequencies(tmp_path):
    found = planned(
        tmp_path,
        'speed = "1470 rpm"\nat = "block"\n'
        'mains = { frequency = "50 Hz", along = "rx", amplitude = "9 N m" }\n'
        'ground = [{ along = "-y", frequency = "8 Hz", acceleration = "0.5 m/s^2" }, '
        '{ along = "z", order = 2, displacement = "1 mm" }]\n',
    )
    speeds = np.array([10.0, 20.0])
    by_source = {(line.source, line.order, line.fixed_hz): line for line in found.lines}
    assert found.frequency_hz(by_source["mains", None, 100.0], speeds).tolist() == [100.0, 100.0]
    shaken = by_source["ground", None, 8.0]
    # a = -w^2 x
    assert found.ground_m(shaken, speeds)[:, 1] == pytest.approx([0.5 / (TAU * 8) ** 2] * 2)
    assert found.ground_m(by_source["ground", 2.0, None], speeds)[:, 2] == pytest.approx([1e-3] * 2)


def test_planes_share_an_unbalance_by_their_levers(tmp_path):
    found = planned(
        tmp_path,
        'speed = "1500 rpm"\naxis = "x"\nat = "block"\n'
        'unbalance = { amount = "10 g mm", planes = ["A", "B"] }\n',
    )
    pull = 1e-5 * (TAU * 25) ** 2
    forces = {
        aim.place: abs(force)
        for aim, force in zip(found.inputs, found.forces(found.lines[0], np.array([25.0]))[0], strict=True)
    }
    assert forces == pytest.approx({"A": 0.6 * pull, "B": 0.4 * pull})


@pytest.mark.parametrize(
    ("text", "message"),
    [
        (
            'speed = "900 rpm"\nat = "block"\nunbalance = { amount = "9 g mm" }\n',
            "which way the shaft points",
        ),
        ('speed = "900 rpm"\nat = "block"\naxis = "x"\nunbalance = { grade = "G 6.3" }\n', "needs the mass"),
        (
            'speed = "900 rpm"\nat = "block"\nalong = "z"\nstrokes = { peak = "9 kN", duration = "90 ms" }\n',
            "takes longer than a stroke",
        ),
        ('speed = "900 rpm"\nat = "block"\n', "none of them states a force"),
    ],
)
def test_what_is_refused(tmp_path, text, message):
    with pytest.raises(ModelError, match=message):
        planned(tmp_path, text)
