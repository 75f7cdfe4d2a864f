"""Forces on supports and springs to the ground: balances of the whole machine, and very stiff springs."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
import scipy.sparse.linalg as sparse_linalg

import vib
import vib.drive
from tests.response.machines import AT_THE_ARM, FRAME, MOUNTS, TAU, dynamic, ran, skew, study_of


@pytest.mark.parametrize("extra", ["", AT_THE_ARM, MOUNTS])
def test_forces_on_the_ground_balance_the_machine(tmp_path, extra):
    """Newton and Euler, about the origin: what is put in less what the masses take reaches the ground."""
    study = study_of(tmp_path, (FRAME % extra).replace("rayleigh =", "# rayleigh ="))
    speeds = np.array([6.0, 17.3, 40.0])
    run = ran(study, speeds_hz=speeds)
    system = run.system
    planned = vib.drive.drive(system, study.excitations)
    places = system.anatomy.places
    for number, line in enumerate(planned.lines):
        omega = TAU * run.lines[number].frequency_hz
        forces = planned.forces(line, speeds)
        for k in range(len(speeds)):
            matrix = dynamic(system, speeds[k], omega[k])
            moved = np.linalg.solve(matrix, planned.directions @ forces[k])
            # spin brings a moment of its own: Ip W (v x a), taken from the structure by the gyroscopic matrix
            inertia = -(omega[k] ** 2) * (system.anatomy.carried.T @ moved)
            turning = places["fan"].motion[3:] @ moved * 1j * omega[k]
            inertia[3:] += -6.0 * TAU * speeds[k] * skew([0, 1, 0]) @ turning
            applied = sum(
                wrench(np.real(aim.weights), places[aim.place].position_m) * force
                for aim, force in zip(planned.inputs, forces[k], strict=True)
            )
            arrived = np.zeros(6, complex)
            for column, (owner, component) in enumerate(
                zip(run.transmitted.owners, run.transmitted.components, strict=True)
            ):
                weights = np.eye(6)[["x", "y", "z", "rx", "ry", "rz"].index(component)]
                at = places[owner.split()[-1]].position_m
                arrived += wrench(weights, at) * run.transmitted.force_n[k, number, column]
            scale = np.abs(applied).max() + np.abs(inertia).max()
            assert np.abs(arrived - (applied - inertia)).max() < 1e-8 * scale


def wrench(weights, at):
    """Force, and moment about the origin, of a force and a moment at a place."""
    return np.concatenate([weights[:3], weights[3:] + np.cross(at, weights[:3])])


def test_supports_carry_what_very_stiff_springs_carry(tmp_path):
    speeds = np.array([6.0, 17.3, 40.0])
    k = '"1e13 N/m"'
    turn = '"1e13 N m/rad"'
    stiff = f"""[[springs]]
name = "stand"
between = [["A", "ground"], ["B", "ground"]]
stiffness = {{ x = {k}, y = {k}, z = {k}, rx = {turn}, ry = {turn}, rz = {turn} }}
"""
    text = (FRAME % (MOUNTS + stiff)).replace('[[supports]]\nat = ["A", "B"]\nhold = "all"\n', "")
    text = text.replace("rayleigh =", "# rayleigh =")
    sprung = ran(study_of(tmp_path, text), speeds_hz=speeds)
    held = ran(study_of(tmp_path, (FRAME % MOUNTS).replace("rayleigh =", "# rayleigh =")), speeds_hz=speeds)
    for name in ("A x", "A z", "A ry", "B y", "B rz"):
        ours = held.transmitted.force_n[:, :, held.transmitted.names.index(name)]
        theirs = sprung.transmitted.force_n[:, :, sprung.transmitted.names.index(f"stand {name}")]
        # what the springs still give falls with their stiffness
        assert np.abs(ours - theirs).max() < 5e-5 * np.abs(theirs).max()


def test_a_shaken_ground_equals_the_transmissibility(tmp_path):
    text = FRAME % MOUNTS
    text = (
        text[: text.index("unbalance = {")]
        + 'ground = { along = "z", frequency = "13 Hz", velocity = "2 mm/s" }\n'
    )
    text = text.replace("rayleigh =", "# rayleigh =")  # damping by mass would pull at the fixed stars
    study = study_of(tmp_path, text.replace('[bodies.spin]\naxis = "y"\nshaft = "fan"\ninertia = 6\n', ""))
    run = ran(study, speeds_hz=[20.0], watch=[("fan", "z"), ("fan", "ry")])
    ride = study.system().frequency_response(
        lines_hz=[13.0], ground=["z"], outputs=[("fan", "z"), ("fan", "ry")]
    )
    wanted = ride.receptance[0, :, 0] * 2e-3 / (1j * TAU * 13)
    assert np.abs(run.displacement_m[0, 0] - wanted).max() < 1e-9 * np.abs(wanted).max()
    # momentum: what the feet press on the ground is what all masses take, those that are held too
    anatomy = run.system.anatomy
    lifted = [name.endswith(" z") for name in run.transmitted.names]
    ground = 2e-3 / (1j * TAU * 13)
    matrix = dynamic(run.system, 20.0, TAU * 13)
    relative = np.linalg.solve(matrix, (TAU * 13) ** 2 * anatomy.carried[:, 2] * ground)
    momentum = (TAU * 13) ** 2 * (anatomy.carried[:, 2] @ relative + anatomy.rigid_mass[2, 2] * ground)
    assert abs(run.transmitted.force_n[0, 0, lifted].sum() - momentum) < 1e-9 * abs(momentum)


@pytest.mark.parametrize(
    "extra", ["", '[[springs]]\nbetween = ["flank", "ground"]\nstiffness = { x = "9 kN/mm" }\n']
)
def test_the_sole_of_a_pedestal_of_cells_carries_its_forces(tmp_path, extra):
    """Momentum along each axis, with supports of a set of nodes."""
    text = Path("models/bearing_pedestal.toml").read_text()
    text = text[: text.index("[[excitations]]")].replace("damping_ratio = 0.008", "")
    (tmp_path / "bearing_pedestal.vtu").write_bytes(Path("models/bearing_pedestal.vtu").read_bytes())
    study = study_of(
        tmp_path,
        text
        + extra
        + """
[damping]
rayleigh = [["40 Hz", 0.004], ["4 kHz", 0.4]]
[[excitations]]
name = "rotor"
speed = "2950 rpm"
at = "bearing"
axis = "y"
unbalance = { amount = "9 kg mm" }
forces = { at = "flank", order = 2, along = [1, 1, 1], amplitude = "300 N" }
""",
    )
    speeds = np.array([30.0, 50.0])
    run = ran(study, speeds_hz=speeds)
    planned = vib.drive.drive(run.system, study.excitations)
    for number, line in enumerate(planned.lines):
        omega = TAU * run.lines[number].frequency_hz
        forces = planned.forces(line, speeds)
        for k in range(len(speeds)):
            whole = (
                run.system.stiffness - omega[k] ** 2 * run.system.mass + 1j * omega[k] * run.system.damping
            )
            moved = sparse_linalg.spsolve(whole.tocsc(), planned.directions @ forces[k])
            inertia = -(omega[k] ** 2) * (run.system.anatomy.carried[:, :3].T @ moved)
            applied = sum(
                np.real(aim.weights)[:3] * force for aim, force in zip(planned.inputs, forces[k], strict=True)
            )
            arrived = np.array(
                [
                    sum(
                        run.transmitted.force_n[k, number, column]
                        for column, component in enumerate(run.transmitted.components)
                        if component == axis
                    )
                    for axis in "xyz"
                ]
            )
            assert np.abs(arrived - (applied - inertia)).max() < 1e-6 * np.abs(applied).max()
