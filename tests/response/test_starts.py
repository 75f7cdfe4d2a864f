"""What may set a system ringing, in which words, and what is refused with what advice."""

from __future__ import annotations

import json

import numpy as np
import pytest
import scipy.sparse as sparse

from vib.errors import ModelError, ShapeError, UnitError
from vib.system import Anatomy, Freedom, Place, System, Wireframe

CHAIN = System(
    mass=np.diag([12.0, 5.0]),
    stiffness=[[25000.0, -7000.0], [-7000.0, 9500.0]],
    damping=[[30.0, -4.0], [-4.0, 6.0]],
)
FREE = System(mass=np.eye(2), stiffness=[[9.0, -9.0], [-9.0, 9.0]])
LIGHT = System(mass=np.diag([1.0, 0.0]), stiffness=[[9.0, -4.0], [-4.0, 8.0]])


def rocker():
    """A block that shifts along x and turns about rx, and a point P above it: x of P is x - 0.5 rx."""
    motion = np.zeros((6, 2))
    motion[0, 0] = motion[3, 1] = 1.0
    top = motion.copy()
    top[0, 1] = -0.5
    places = {
        "block": Place("block", (0.0, 0.0, 0.0), sparse.csr_array(motion)),
        "P": Place("P", (0.0, 0.0, 0.5), sparse.csr_array(top)),
    }
    nothing = Wireframe(np.zeros((0, 3)), sparse.csr_array((0, 2)), ())
    return System(
        mass=np.diag([4.0, 0.3]),
        stiffness=np.diag([900.0, 50.0]),
        damping=np.diag([1.0, 0.1]),
        freedoms=(Freedom("block", "x"), Freedom("block", "rx")),
        anatomy=Anatomy(places, (), nothing, np.zeros((2, 6)), np.zeros((6, 6))),
    )


@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        ({}, "nothing sets the system moving"),
        ({"impulse": 1.0, "pull": 2.0, "at": "1"}, "impulse and pull contradict each other"),
        ({"impulse": 1.0, "velocity": [1.0, 0]}, "impulse and velocity contradict"),
        ({"displacement": 1.0, "velocity": [1.0, 0], "at": "1"}, "displacement and velocity contradict"),
        ({"impulse": 1.0}, "impulse: say where, at = one of 1, 2"),
        ({"displacement": 0.1}, "displacement: say where"),
        ({"impulse": 1.0, "at": "3"}, "3: there is no such place"),
        ({"velocity": [1.0, 0], "at": "1"}, "at and along go with one number"),
        ({"impulse": 0.0, "at": "1"}, "impulse: it is 0"),
        ({"velocity": [0.0, 0.0]}, "all 0"),
        ({"velocity": [0.0, np.nan]}, "velocity: every entry must be a finite number"),
        ({"velocity": ["a", "b"]}, "velocity: every entry must be a finite number"),
        ({"pulse": "5 N", "at": "1"}, "pulse: give its peak and its duration"),
        ({"pulse": (1.0, 2.0, 3.0), "at": "1"}, "pulse: give its peak and its duration"),
        ({"pulse": ("5 N", "0 ms"), "at": "1"}, "longer than 0"),
        ({"impulse": 1.0, "at": "1", "duration": 1.0, "times": [0.0]}, "times and duration contradict"),
        ({"impulse": 1.0, "at": "1", "duration": "-1 s"}, "duration: it must be longer than 0"),
        ({"impulse": 1.0, "at": "1", "times": [-1.0]}, "not negative"),
        ({"impulse": 1.0, "at": "1", "times": []}, "times: give one row"),
        ({"impulse": 1.0, "at": "1", "times": ["x"]}, "times: give one row"),
        ({"impulse": 1.0, "at": "1", "watch": []}, "watch: it is empty"),
        ({"impulse": 1.0, "at": "1", "watch": ["1", ("1", None)]}, "watch: 1 is there more than once"),
        ({"impulse": 1.0, "at": "1", "watch": ["7"]}, "7: there is no such place"),
    ],
)
def test_contradictions_and_gaps(arguments, message):
    with pytest.raises(ModelError, match=message):
        CHAIN.ring(**arguments)


@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        ({"impulse": "12 N", "at": "1"}, "impulse: .*not a unit of impulse"),
        ({"pull": "12 kg", "at": "1"}, "pull: .*A mass is not a force"),
        ({"pulse": ("5 N", "3 m"), "at": "1"}, "pulse: .*not a unit of time"),
        ({"velocity": "fast", "at": "1"}, "velocity: expected a velocity"),
        ({"impulse": 1.0, "at": "1", "duration": "2 m"}, "duration: .*not a unit of time"),
        ({"impulse": float("nan"), "at": "1"}, "impulse: expected a finite number"),
    ],
)
def test_wrong_units_name_the_argument(arguments, message):
    with pytest.raises(UnitError, match=message):
        CHAIN.ring(**arguments)


def test_wrong_size_of_an_initial_state():
    with pytest.raises(ShapeError, match=r"displacement: expected shape \(2,\), got \(3,\)"):
        CHAIN.ring(displacement=[1.0, 2.0, 3.0])


def test_impulse_where_there_is_no_mass():
    with pytest.raises(ModelError, match=r"impulse: 2 has no mass.*use a pulse or a pull"):
        LIGHT.ring(impulse=1.0, at="2")


@pytest.mark.parametrize("start", ["pull", "displacement"])
def test_pull_on_a_free_body(start):
    with pytest.raises(ModelError, match=f"{start}: nothing holds the system against this pull"):
        FREE.ring(**{start: 1.0}, at="1")


def test_pull_on_a_free_body_without_symmetry():
    system = System(mass=np.eye(2), stiffness=[[9.0, -9.0], [-9.0, 9.0]], unsymmetric=True)
    with pytest.raises(ModelError, match="nothing holds"):
        system.ring(pull=1.0, at="1")


def test_balanced_pull_on_a_mechanism_is_fine():
    """One held mass beside a free one: the held one can be pulled."""
    system = System(mass=np.eye(2), stiffness=np.diag([9.0, 0.0]), damping=[[0, 0], [0, 0.5]])
    found = system.ring(pull=18.0, at="1", times=[0.0])
    np.testing.assert_allclose(found.displacement_m[0], [2.0, 0.0], rtol=1e-14)


def test_units_of_texts():
    one = CHAIN.ring(impulse="2 lbf s", at="1", times=[0.1]).displacement_m
    two = CHAIN.ring(impulse=2 * 4.4482216152605, at="1", times=[0.1]).displacement_m
    np.testing.assert_allclose(one, two, rtol=1e-14)
    found = CHAIN.ring(impulse=np.float64(2.0), at="1", duration="250 ms")
    assert found.time_s[-1] == pytest.approx(0.25)
    assert found.start == "impulse of 2 N s at 1"


def test_massless_start_is_remarked():
    found = LIGHT.ring(displacement=[0.0, 1.0], velocity=[1.0, 0.0], times=[0.0])
    assert any("leave the position given" in remark for remark in found.remarks)
    assert any("take the velocity the others give" in remark for remark in found.remarks)
    clean = LIGHT.ring(displacement=[1.0, 0.5], times=[0.0])
    assert not any("without mass" in remark for remark in clean.remarks)


def test_rotations_are_angles_and_named_so():
    found = rocker().ring(impulse="0.6 N m s", at="block", along="rx", watch=[("block", "rx"), ("P", "x")])
    assert found.rotational == (True, False)
    assert found.freedoms == ("block rx", "P x")
    np.testing.assert_allclose(found.velocity_m_s[0], [2.0, -1.0], rtol=1e-13)
    angle, top = found.to_dict()["outputs"]
    assert {"angle_rad", "angular_velocity_rad_s", "angular_acceleration_rad_s2", "envelope_rad"} <= set(
        angle
    )
    assert {"displacement_m", "velocity_m_s", "acceleration_m_s2", "envelope_m"} <= set(top)
    with pytest.raises(UnitError, match="impulse"):
        rocker().ring(impulse="0.6 N s", at="block", along="rx")


def test_velocity_of_a_place_that_cannot_move_alone():
    with pytest.raises(ModelError, match="velocity: P can't move along x with everything else at rest"):
        rocker().ring(velocity=1.0, at="P", along="x")
    found = rocker().ring(velocity=1.0, at="block", along="-x", times=[0.0])
    assert found.velocity_m_s[0, 0] == pytest.approx(1.0)
    assert found.freedoms[0] == "block -x"


def test_default_outputs_begin_with_the_struck_place():
    found = rocker().ring(impulse=1.0, at="P", along="x", times=[0.0])
    assert found.freedoms == ("P x", "block x")


def test_dictionary_is_plain_json():
    found = CHAIN.ring(pulse=("50 N", "20 ms"), at="2")
    read = json.loads(json.dumps(found.to_dict(), allow_nan=False))
    assert read["outputs"][0]["name"] == "1"
    assert len(read["time_s"]) == len(read["outputs"][1]["displacement_m"]) == len(found.time_s)
    assert read["outputs"][0]["envelope_m"][0] is None  # during the pulse
    assert read["modes"][0]["frequency_hz"] == pytest.approx(found.modes[0].frequency_hz)
    assert read["outputs"][1]["peaks"][1]["velocity_m_s"] == pytest.approx(found.peaks[3].value)
    assert found.peaks[3].output == "2"
    assert found.peaks[3].quantity == "velocity"
    assert read["truncation"] == {"displacement": 0.0, "velocity": 0.0, "acceleration": 0.0}
