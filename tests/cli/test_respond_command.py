"""`vib respond`: tables, JSON, files, exit status, and what it refuses."""

from __future__ import annotations

import csv
import json

import numpy as np
import pytest

LOADED = """
[[loads]]
name = "fan"
at = "block"
along = "z"
harmonic = {amplitude = "20 N", frequency = "3 Hz"}
[response]
duration = "4 s"
watch = ["block", "block x"]
"""
SHAKEN = """
[base_motion]
along = "x"
file = "floor.csv"
"""


@pytest.fixture
def loaded(block):
    block.write_text(block.read_text("utf-8") + LOADED, encoding="utf-8")
    return block


@pytest.fixture
def shaken(block):
    block.write_text(block.read_text("utf-8") + SHAKEN, encoding="utf-8")
    rows = "".join(f"{0.02 * k:.2f},{np.sin(0.3 * k):.4f}\n" for k in range(100))
    (block.parent / "floor.csv").write_text("time [s],floor [m/s^2]\n" + rows, encoding="utf-8")
    return block


def test_tables_tell_loads_peaks_and_the_steady_part(vib, loaded):
    done = vib("respond", loaded)
    assert done.status == 0
    for words in ("fan: harmonic, 20 N at 3 Hz", "Largest in the record", "Steady part", "licensed engineer"):
        assert words in done.out


def test_json_is_the_closed_form_of_a_mass_on_a_spring(vib, loaded):
    """F / (k - m w^2 + i w c) along z: 3 kN/m, 12 kg, 5 N s/m and 2 % more of critical."""
    document = json.loads(vib("respond", loaded, "--json", "--quiet").out)
    (steady,) = document["record"]["steady"]
    omega, natural = 2 * np.pi * 3.0, np.sqrt(3000 / 12)
    damping = 5.0 + 2 * 0.02 * natural * 12
    wanted = 20 / (3000 - 12 * omega**2 + 1j * omega * damping)
    along_z = next(output for output in steady["outputs"] if output["name"] == "block z")
    assert along_z["amplitude_m"] == pytest.approx(abs(wanted), rel=1e-9)
    assert along_z["phase_deg"] == pytest.approx(np.degrees(np.angle(wanted)), rel=1e-9)
    assert document["stable"] is True
    assert len(document["record"]["time_s"]) == len(document["record"]["outputs"][0]["acceleration_m_s2"])


def test_lines_by_option(vib, block):
    done = vib(
        "respond",
        block,
        "--frequencies",
        "1 Hz",
        "5 Hz",
        "--lines",
        9,
        "--at",
        "block",
        "--along",
        "z",
        "--json",
    )
    found = json.loads(done.out)["frequency_response"]
    np.testing.assert_allclose(found["frequency_hz"], np.linspace(1, 5, 9))
    (pair,) = found["channels"]
    assert (pair["input"], pair["output"]) == ("block z", "block z")
    units = [pair[kind]["unit"] for kind in ("receptance", "mobility", "accelerance")]
    assert units == ["m/N", "m/s/N", "m/s^2/N"]
    assert "record" not in json.loads(done.out)


def test_files_carry_units_in_their_names(vib, shaken, tmp_path):
    folder = tmp_path / "out"
    done = vib("respond", shaken, "--frequencies", "1 Hz", "4 Hz", "--lines", 20, "--out", folder)
    assert done.status == 0
    assert {path.name for path in folder.iterdir()} == {
        "respond.json",
        "record.csv",
        "record.npz",
        "frequency_response.csv",
        "frequency_response.npz",
        "respond_01.svg",
        "transmissibility_01.svg",
        "parts_01.svg",
        "polar_01.svg",
    }
    with open(folder / "record.csv", newline="", encoding="utf-8") as file:
        header = next(csv.reader(file))
    assert header[:2] == ["time_s", "displacement_m block x"]
    assert header[-1] == "relative_m block x"
    with np.load(folder / "record.npz") as record:
        assert record["relative_m"].shape == (record["time_s"].size, 1)
    with np.load(folder / "frequency_response.npz") as lines:
        assert lines["transmissibility"].shape == (20, 1, 1)
    for picture in folder.glob("*.svg"):
        assert "mathdefault" not in picture.read_text("utf-8")
    assert "against the moving ground" in done.out


def test_an_unstable_study_ends_with_status_1(vib, unstable):
    done = vib("respond", unstable, "--frequencies", "1 Hz", "3 Hz", "--lines", 5, "--at", "1")
    assert done.status == 1
    assert "UNSTABLE" in done.out


@pytest.mark.parametrize(
    ("options", "message"),
    [
        ([], "nothing to respond to"),
        (["--frequencies", "1 Hz", "3 Hz"], "needs --at"),
        (["--frequencies", "3 Hz", "1 Hz", "--at", "block", "--along", "x"], "the lower one first"),
        (["--frequencies", "3 m", "1 Hz", "--at", "block", "--along", "x"], "--frequencies"),
        (["--frequencies", "1 Hz", "3 Hz", "--at", "blok", "--along", "x"], "blok"),
    ],
)
def test_what_is_missing_is_named(vib, block, options, message):
    done = vib("respond", block, *options)
    assert done.status == 2
    assert message in done.err
    assert done.out == ""
