"""Run-up: against dense solutions made by hand here, balances of force, laws, peaks, and what is refused."""

from __future__ import annotations

import numpy as np
import pytest

import vib
import vib.response.receptance as receiving
import vib.response.steady as steadying
from tests.response.machines import FRAME, MOUNTS, SKID, TAU, ran, skew, study_of
from vib.errors import ModelError


def lever(reach):
    """Displacement of a point of a rigid body from the six components of its centre."""
    return np.hstack([np.eye(3), -skew(reach)])


def skid_matrices():
    """M, C, K and the gyroscopic matrix per rad/s of two rigid bodies, 12 freedoms, by hand."""
    skid, rotor = np.array([1.0, 0.5, 0.1]), np.array([0.9, 0.5, 0.6])
    mass = np.diag([900.0] * 3 + [90, 300, 370] + [250.0] * 3 + [20, 26, 26])
    stiffness, damping = np.zeros((12, 12)), np.zeros((12, 12))
    for corner in ([0, 0, 0], [2, 0, 0], [2, 1, 0], [0, 1, 0]):
        row = np.zeros((3, 12))
        row[:, :6] = lever(np.array(corner) - skid)
        stiffness += row.T @ np.diag([3e5, 3.5e5, 5e5]) @ row
        damping += row.T @ np.diag([1e3, 1.2e3, 2e3]) @ row
    for x in (0.4, 1.6):
        place = np.array([x, 0.5, 0.6])
        row = np.zeros((3, 12))
        row[:, :6], row[:, 6:] = -lever(place - skid), lever(place - rotor)
        stiffness += row.T @ np.diag([2e7, 1.2e7, 3e7]) @ row
        damping += row.T @ np.diag([3e3, 4e3, 6e3]) @ row
        stiffness[np.ix_([3, 9], [3, 9])] += 1e3 * np.array([[1, -1], [-1, 1]])
        damping[np.ix_([3, 9], [3, 9])] += 5 * np.array([[1, -1], [-1, 1]])
    gyroscopic = np.zeros((12, 12))
    # I' + Ip W x turning: the momentum Ip W e_x follows the tilt, see any text on spinning tops
    gyroscopic[9:, 9:] = -20 * skew([1.0, 0, 0])
    return mass, damping, stiffness, gyroscopic


def skid_answer(speeds, unbalance, phase):
    """Displacements (k, 12) by a dense solve at each speed."""
    mass, damping, stiffness, gyroscopic = skid_matrices()
    found = []
    for n in speeds:
        w = TAU * n
        force = np.zeros(12, complex)
        force[7], force[8] = 1, -1j  # y, then z a quarter turn later: cos, sin
        force *= unbalance * w**2 * np.exp(1j * phase)
        found.append(np.linalg.solve(stiffness - w**2 * mass + 1j * w * (damping + w * gyroscopic), force))
    return np.array(found)


def test_a_rotor_on_a_skid_equals_a_dense_solution_by_hand(tmp_path):
    run = ran(
        study_of(tmp_path, SKID),
        watch=[(body, axis) for body in ("skid", "rotor") for axis in ("x", "y", "z", "rx", "ry", "rz")],
    )
    unbalance = 250 * 6.3e-3 / (TAU * 50)
    wanted = skid_answer(run.speed_hz, unbalance, np.radians(30))
    top = np.abs(wanted).max(axis=0)
    assert (np.abs(run.displacement_m[:, 0] - wanted)[:, top > 0] / top[top > 0]).max() < 1e-9
    velocity = TAU * run.speed_hz[:, None] * np.abs(wanted) / np.sqrt(2)
    assert np.allclose(run.velocity_rms_m_s, velocity, rtol=1e-8, atol=1e-15)
    corners = {"A": [0, 0, 0], "B": [2, 0, 0], "C": [2, 1, 0], "D": [0, 1, 0]}
    for name, corner in corners.items():
        moved = wanted[:, :6] @ lever(np.array(corner) - np.array([1.0, 0.5, 0.1])).T
        for axis, (k, c) in enumerate(((3e5, 1e3), (3.5e5, 1.2e3), (5e5, 2e3))):
            column = run.transmitted.names.index(f"isolators {name} {'xyz'[axis]}")
            force = (k + 1j * TAU * run.speed_hz * c) * moved[:, axis]
            assert np.allclose(run.transmitted.force_n[:, 0, column], force, rtol=1e-7, atol=1e-9)


def with_mounts(tmp_path, text=FRAME % MOUNTS):
    return study_of(tmp_path, text)


def test_both_ways_of_solving_agree(tmp_path, monkeypatch):
    speeds = np.linspace(5.0, 50.0, 7)
    study = with_mounts(tmp_path)
    found = []
    for solved in (0, 10_000):
        monkeypatch.setattr(steadying, "SOLVED", solved)
        found.append(ran(study, speeds_hz=speeds))
    first, second = found
    assert "residues of all" in first.method
    assert "solved at every point" in second.method
    top = np.abs(second.displacement_m).max(axis=0) + 1e-30
    assert (np.abs(first.displacement_m - second.displacement_m) / top).max() < 1e-8
    forces = np.abs(second.transmitted.force_n).max(axis=(0, 2))[:, None]
    assert (np.abs(first.transmitted.force_n - second.transmitted.force_n) / forces).max() < 1e-7


def test_a_reduced_model_keeps_within_its_bound(tmp_path, monkeypatch):
    """The lowest modes with static corrections, against every mode."""
    speeds = np.linspace(5.0, 50.0, 7)
    study = with_mounts(tmp_path)
    whole = ran(study, speeds_hz=speeds)
    monkeypatch.setattr(steadying, "SOLVED", 0)
    monkeypatch.setattr(receiving, "ALL_MODES", 30)
    less = ran(study, speeds_hz=speeds)
    assert "static correction" in less.method
    assert "at most" in less.errors[-1]
    top = np.abs(whole.displacement_m).max(axis=(0, 2))[:, None]
    off = np.abs(less.displacement_m - whole.displacement_m)
    assert (off <= less.error_m + 1e-9 * top).all()
    assert (off / top).max() < 1e-5


def test_no_peak_is_missed_and_each_is_met(tmp_path):
    """Lightly damped, against a scan a hundred times finer about each resonance."""
    text = (
        (FRAME % MOUNTS.replace("300 N s/m", "3 N s/m"))
        .replace("0.01]", "0.0004]")
        .replace("0.02]", "0.001]")
    )
    study = with_mounts(tmp_path, text)
    run = ran(study)
    assert len(run.resonances) > 6
    fine = np.unique(
        np.concatenate(
            [row.speed_hz * (1 + row.damping_ratio * np.linspace(-3, 3, 201)) for row in run.resonances]
        )
    )
    fine = fine[(fine >= 5) & (fine <= 50)]
    scan = ran(study, speeds_hz=fine, modes=run.system.modes(up_to=150))
    ours, theirs = run.velocity_rms_m_s.max(axis=0), scan.velocity_rms_m_s.max(axis=0)
    assert (ours >= theirs * (1 - 2e-3)).all()
    assert len(run.speed_hz) < 2000


def test_gyroscopic_resonances_are_the_critical_speeds(tmp_path):
    from vib.speeds import speed_curves

    text = SKID.replace("[20, 26, 26]", "[60, 36, 36]")
    study = study_of(tmp_path, text)
    run = ran(study)
    curves = speed_curves(study.system(), "fan", count=12, top_hz=70)
    wanted = [row.speed_hz for row in curves.critical if 5 <= row.speed_hz <= 70 and row.damping_ratio < 0.7]
    found = [row.speed_hz for row in run.resonances]
    assert len(found) == len(wanted) > 3
    widths = np.array([row.damping_ratio for row in run.resonances]) * wanted
    assert (np.abs(np.array(found) - wanted) <= 0.2 * widths).all()


def test_lines_of_one_frequency_add_as_vectors_and_others_as_mean_squares(tmp_path):
    head = SKID[: SKID.index("unbalance =")]
    speeds = np.array([7.0, 20.0, 33.0])
    alone = [
        'unbalance = { amount = "2000 g mm" }\n',
        'forces = { order = 1, along = "y", amplitude = "90 N", phase = "50 deg" }\n',
        'blades = { count = 5, along = "z", amplitude = "40 N" }\n',
    ]
    runs = [ran(study_of(tmp_path, head + one), speeds_hz=speeds) for one in alone]
    whole = ran(study_of(tmp_path, head + "".join(alone)), speeds_hz=speeds)
    assert whole.groups == ((0, 1), (2,))
    first = runs[0].displacement_m[:, 0] + runs[1].displacement_m[:, 0]
    second = runs[2].displacement_m[:, 0]
    rms = np.sqrt((np.abs(first) ** 2 + np.abs(second) ** 2) / 2)
    assert np.allclose(whole.displacement_rms_m, rms, rtol=1e-12)
    w = TAU * speeds[:, None]
    assert np.allclose(
        whole.velocity_rms_m_s, np.sqrt((w * np.abs(first)) ** 2 / 2 + (5 * w * np.abs(second)) ** 2 / 2)
    )
    assert np.allclose(whole.displacement_peak_m, np.abs(first) + np.abs(second), rtol=1e-12)


def test_a_shaft_that_follows_drives_at_its_own_speed(tmp_path):
    text = (
        SKID
        + """
[[excitations]]
name = "motor"
shaft = "fan"
ratio = 2.5
axis = "x"
at = "skid"
unbalance = { amount = "500 g mm" }
"""
    )
    study = study_of(tmp_path, text)
    run = ran(study, speeds_hz=[10.0])
    assert [line.frequency_hz[0] for line in run.lines] == [10.0, 25.0]
    turned = ran(study, shaft="motor", speeds_hz=[25.0])
    assert np.allclose(run.displacement_m, turned.displacement_m, rtol=1e-12)
    assert turned.service_hz == ((12.5, 175.0),)


def test_a_machine_that_turns_by_itself_keeps_its_speed(tmp_path):
    text = (
        SKID
        + """
[[excitations]]
name = "pump"
speed = ["1200 rpm", "1500 rpm"]
axis = "x"
at = "skid"
unbalance = { amount = "500 g mm" }
"""
    )
    study = study_of(tmp_path, text)
    run = ran(study, speeds_hz=[10.0, 25.0])
    assert run.lines[1].frequency_hz.tolist() == [25.0, 25.0]
    assert run.groups == ((0,), (1,))  # equally fast at 25 Hz, yet no vector sum: they drift
    assert any("pump turns by itself, at 1500 rpm throughout, its fastest" in one for one in run.remarks)
    slow = ran(study, speeds_hz=[10.0], held_hz={"pump": 20.0})
    assert slow.lines[1].frequency_hz.tolist() == [20.0]


UNSTABLE = """
title = "Rotor with internal damping"
[matrices]
mass = { rows = [[1, 0], [0, 1]], unit = "kg" }
stiffness = { rows = [[1e4, 0], [0, 1e4]], unit = "N/m" }
damping = { rows = [[10, 0], [0, 10]], unit = "N s/m" }
circulatory = { rows = [[0, 2000], [-2000, 0]], unit = "N/m" }
speed = "1200 rpm"
freedoms = ["y", "z"]
[[excitations]]
name = "rotor"
speed = ["300 rpm", "1800 rpm"]
at = "y"
unbalance = [{ amount = "100 g mm" }, { at = "z", amount = "100 g mm", phase = "-90 deg" }]
"""


def test_an_unstable_rotor_has_no_level_beyond_the_onset(tmp_path):
    """Onset where the circulatory term is damping x natural frequency: 100 n = 10 x 100 rad/s."""
    run = ran(study_of(tmp_path, UNSTABLE))
    assert not run.stable
    onset = run.speed_hz[~run.stable_at].min()
    assert onset == pytest.approx(10.0, abs=0.2)
    assert run.speed_hz[run.stable_at].max() < onset
    assert np.isinf(run.velocity_rms_m_s[~run.stable_at]).all()
    assert np.isfinite(run.velocity_rms_m_s[run.stable_at]).all()
    assert run.remarks[0].startswith("The system is UNSTABLE at 600")
    assert run.to_dict()["stable"] is False
    k = 3
    w = TAU * run.speed_hz[k]
    matrix = 1e4 * np.eye(2) - w**2 * np.eye(2) + 10j * w * np.eye(2)
    matrix = matrix + 100 * run.speed_hz[k] * np.array([[0, 1], [-1, 0]])
    wanted = np.linalg.solve(matrix, 1e-4 * w**2 * np.array([1, -1j]))
    assert np.allclose(run.displacement_m[k, 0], wanted, rtol=1e-9)


def test_an_undamped_resonance_is_owned_up_to(tmp_path):
    text = SKID.replace("dashpot = {", "#")
    run = ran(study_of(tmp_path, text))
    assert run.remarks[0].startswith("Undamped modes")
    assert run.displacement_peak_m.max() > 1.0  # metres: nobody takes that for a level


@pytest.mark.parametrize(
    ("change", "message"),
    [
        (('unbalance = { grade = "G 6.3", at_speed = "3000 rpm", phase = "30 deg" }', ""), "states a force"),
        (('at = "rotor"', 'at = "skid"'), "needs the mass of the rotor"),
        (
            (
                'at = "rotor"\nunbalance = { grade = "G 6.3",',
                'at = "skid"\nunbalance = { grade = "G 6.3", planes = ["A", "D"], mass = 250,',
            ),
            "does not lie between the planes",
        ),
    ],
)
def test_what_is_refused(tmp_path, change, message):
    with pytest.raises(ModelError, match=message):
        ran(study_of(tmp_path, SKID.replace(*change)))


def test_wrong_speeds_and_shafts_are_refused(tmp_path):
    study = study_of(tmp_path, SKID)
    for arguments, message in (
        ({"speeds_hz": [0.0]}, "above zero"),
        ({"shaft": "motor"}, "no excitation of that name has a running speed"),
        ({"held_hz": {"fan": 3.0}}, "no other machine"),
        ({"watch": [("nowhere", "x")]}, "no such place"),
    ):
        with pytest.raises(ModelError, match=message):
            ran(study, **arguments)


def test_what_grows_at_every_speed_is_unstable_at_every_speed(tmp_path):
    path = tmp_path / "grows.toml"
    path.write_text(
        '[units]\nmass = "kg"\nstiffness = "N/m"\ndamping = "N s/m"\n[matrices]\nmass = [[1]]\n'
        "stiffness = [[900]]\ndamping = [[-1]]\n"
        '[[excitations]]\nname = "motor"\nspeed = ["60 rpm", "600 rpm"]\n'
        'at = "1"\nforces = {order = 1, amplitude = "1 N"}\n',
        encoding="utf-8",
    )
    found = vib.run_up(vib.read(path))
    assert not found.stable_at.any()
    assert np.isinf(found.velocity_rms_m_s).all()
