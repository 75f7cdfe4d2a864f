"""The studies in models/: each runs through everything a report shows, and shows what its first lines say."""

from pathlib import Path

import numpy as np
import pytest
import scipy.linalg

import vib
from vib.screening import Verdict, highest_needed_hz
from vib.structure import survey

MODELS = Path(__file__).parent.parent / "models"
NAMES = sorted(path.stem for path in MODELS.glob("*.toml"))


@pytest.fixture(scope="module")
def solved():
    """Study and modes of each model, up to what its screening needs; solved once."""
    found = {}

    def get(name):
        if name not in found:
            study = vib.read(MODELS / f"{name}.toml")
            needed = highest_needed_hz(study.excitations, accuracy=study.accuracy)
            found[name] = study, study.system(up_to=needed).modes(up_to=needed)
        return found[name]

    return get


def test_there_are_at_least_four():
    assert len(NAMES) >= 4


@pytest.mark.parametrize("name", NAMES)
def test_a_model_says_what_it_shows(name):
    assert (MODELS / f"{name}.toml").read_text("utf-8").startswith("# Shows: ")


@pytest.mark.parametrize("name", NAMES)
def test_a_model_is_held_stable_and_accurate(solved, name):
    study, modes = solved(name)
    assert modes.stable
    assert modes.rigid_body_count == 0
    assert (modes.errors_hz <= study.accuracy * modes.frequencies_hz).all()


@pytest.mark.parametrize("name", NAMES)
def test_a_model_is_screened(solved, name):
    study, modes = solved(name)
    found = vib.screen(modes, study.excitations)
    assert found.objections
    assert found.covered or not modes.proportional  # dashpots: not every solver can count the modes


@pytest.mark.parametrize("name", NAMES)
def test_a_model_rings_and_dies_away(solved, name):
    study, modes = solved(name)
    impact = study.impact
    assert impact is not None
    start = {
        key: getattr(impact, key)
        for key in ("impulse", "pull", "displacement", "velocity")
        if getattr(impact, key) is not None
    }
    if impact.pulse is not None:
        start["pulse"] = (impact.pulse.peak, impact.pulse.duration)
    assert impact.watch is not None
    watch = [(place, impact.along) for place in impact.watch]
    ring = modes.system.ring(**start, at=impact.at, along=impact.along, watch=watch, modes=modes)
    moved = np.abs(ring.displacement_m)
    assert moved.max() > 0
    assert moved[-1].max() < 0.5 * moved.max()


@pytest.mark.parametrize("name", [name for name in NAMES if name != "trolley_line"])
def test_a_structure_has_a_sag(name):
    found = survey(vib.read(MODELS / f"{name}.toml"))
    assert found.mass_kg is not None
    assert found.sag is not None
    assert 0 < found.sag.greatest_m < 0.01


def test_the_fan_shakes_its_frame(solved):
    """Rubber mounts make complex modes; one lies beside the fan's speed, the motor can drive none."""
    study, modes = solved("fan_frame")
    found = vib.screen(modes, study.excitations)
    assert not modes.proportional
    assert np.iscomplexobj(modes.shapes)
    assert {row.mode for row in found.objections} == {3}
    by_motor = {row.verdict for row in found.rows if row.line.excitation == "motor unbalance" and row.inside}
    assert by_motor == {Verdict.HARDLY_DRIVEN}


def test_the_press_table_weighs_what_it_should():
    """Mass of the parts added up by hand from areas, lengths and densities."""
    found = survey(vib.read(MODELS / "press_table.toml"))
    leg, apron = 100**2 - 84**2, 2 * 55 * 9 + 102 * 7
    tie = np.pi * (60**2 - 52**2) / 4
    steel = leg * 4 * 750 + apron * 2 * (1200 + 700) + tie * 2 * (1200 + 700)
    expected = 7850e-9 * steel + 7200e-9 * 180 * 70 * 1200 + 320 + 38
    assert found.mass_kg == pytest.approx(expected, rel=1e-9)


def test_the_trolley_line_is_what_its_files_say(solved):
    """Without the buffer at the tail, the frequencies of the chain that the comment describes."""
    study, modes = solved("trolley_line")
    springs = np.array([1.8e6, 0.9e6, 0.9e6, 0.9e6, 0.9e6, 0.9e6])
    stiffness = np.diag(springs) + np.diag(np.append(springs[1:], 0.0))
    stiffness -= np.diag(springs[1:], 1) + np.diag(springs[1:], -1)
    assert (study.loaded.stiffness.toarray() == stiffness).all()
    assert study.loaded.mass.diagonal().tolist() == [850, 620, 620, 620, 620, 480]
    assert study.loaded.damping.toarray().nonzero() == (np.array([5]), np.array([5]))
    assert not modes.proportional


def test_the_portal_is_the_same_in_si_units(tmp_path, solved):
    """The same study with every bare number converted by hand: ft, lb and lb ft^2 to SI."""
    _, modes = solved("portal_us")
    text = (MODELS / "portal_us.toml").read_text("utf-8")
    si = text.replace('length = "ft"', 'length = "m"').replace('mass = "lb"', 'mass = "kg"')
    si = si.replace('inertia = "lb ft^2"', 'inertia = "kg m^2"').replace('output = "us"', 'output = "si"')
    foot, pound = 0.3048, 0.45359237
    lines = []
    for line in si.splitlines():
        head, _, tail = line.partition(" = ")
        bare, _, comment = tail.partition("#")
        factor = {"mass": pound, "inertia": pound * foot**2, "centre": foot}.get(head.strip())
        if bare.strip().startswith("[") and len(head.strip()) <= 2:  # a point
            factor = foot
        if factor is not None and '"' not in bare:
            values = [repr(float(entry) * factor) for entry in bare.strip(" []").split(",")]
            tail = f"[{', '.join(values)}]" if bare.strip().startswith("[") else values[0]
            line = f"{head} = {tail} # {comment}"
        lines.append(line)
    path = tmp_path / "portal_si.toml"
    path.write_text("\n".join(lines), encoding="utf-8")
    study = vib.read(path)
    needed = highest_needed_hz(study.excitations, accuracy=study.accuracy)
    again = study.system(up_to=needed).modes(up_to=needed)
    np.testing.assert_allclose(again.frequencies_hz, modes.frequencies_hz, rtol=1e-9)


def test_the_fan_skid_at_one_speed_by_hand(solved):
    """Unbalance of the fan at 2000 rpm of the fan: force, gyroscopic term and solve written out here."""
    study, modes = solved("fan_skid")
    speed = 1600 / 60
    run = vib.run_up(study, speeds_hz=[speed], watch=[("drive bearing", "x"), ("motor", "z")], modes=modes)
    system = modes.system
    own = 1.25 * speed
    omega = 2 * np.pi * own
    # 130 kg, G 6.3 at 2250 rpm; the shaft points along y, so angles begin at z and go on to x
    unbalance = 130 * 6.3e-3 / (2 * np.pi * 2250 / 60)
    turned = np.exp(1j * np.pi / 3) * unbalance * omega**2
    force = turned * (system.direction("impeller", "z") - 1j * system.direction("impeller", "x"))
    tilt = {axis: system.direction("impeller", axis) for axis in ("rx", "rz")}
    # momentum h along y: a turn v of the body changes it by h v x y = h (-v_z, 0, v_x)
    gyroscopic = 9.0 * omega * (np.outer(tilt["rz"], tilt["rx"]) - np.outer(tilt["rx"], tilt["rz"]))
    squares, shapes = scipy.linalg.eigh(system.stiffness.toarray(), system.mass.toarray())
    moved = system.mass @ shapes
    law = (moved * (2 * 0.01 * np.sqrt(squares))) @ moved.T  # 1 % of every mode
    matrix = system.stiffness.toarray() - omega**2 * system.mass.toarray()
    matrix = matrix + 1j * omega * (system.damping.toarray() + gyroscopic + law)
    motion = np.linalg.solve(matrix, force)
    number = [(line.excitation, line.source) for line in run.lines].index(("fan", "unbalance"))
    for column, (place, axis) in enumerate((("drive bearing", "x"), ("motor", "z"))):
        wanted = system.direction(place, axis) @ motion
        assert abs(run.displacement_m[0, number, column] - wanted) < 1e-6 * abs(wanted)


def test_the_fan_skid_over_its_range(solved):
    """Moderate levels over the range, and isolators that pass on little of the pull of the fan."""
    study, modes = solved("fan_skid")
    run = vib.run_up(study, modes=modes)
    assert run.stable
    assert run.speed_hz[[0, -1]] * 60 == pytest.approx([600, 1800])
    assert {(line.excitation, line.source) for line in run.lines} == {
        ("motor", "unbalance"),
        ("motor", "belt"),
        ("fan", "unbalance"),
        ("fan", "forces"),
    }
    level = 1e3 * run.velocity_rms_m_s.max(axis=0)
    assert ((level > 0.5) & (level < 12)).all()
    pull = 130 * 6.3e-3 / (2 * np.pi * 37.5) * (2 * np.pi * 37.5) ** 2
    assert run.transmitted is not None
    vertical = [name.endswith(" z") for name in run.transmitted.names]
    number = [(line.excitation, line.source) for line in run.lines].index(("fan", "unbalance"))
    assert abs(run.transmitted.force_n[-1, number, vertical].sum()) < 0.15 * pull
