"""What each command prints, as tables and as JSON, and its exit status."""

from __future__ import annotations

import json
import math

import numpy as np
import pytest

CAUTION = "Results support, and do not replace, review by a licensed engineer under the local code."


def test_modes_json_is_one_document_with_the_promised_names(vib, chain):
    done = vib("modes", chain, "--json")
    assert done.status == 0
    found = json.loads(done.out)
    assert {"modes", "rigid_body_modes", "stable", "complete_below_hz"} <= set(found)
    assert found["rigid_body_modes"] == 0
    assert found["stable"] is True
    first = found["modes"][0]
    assert {
        "number",
        "frequency_hz",
        "damped_frequency_hz",
        "damping_ratio",
        "error_hz",
        "eigenvalue",
    } <= set(first)
    assert set(first["eigenvalue"]) == {"real_per_s", "imag_rad_per_s"}
    # two masses of 1 kg on springs of 100 N/m: omega^2 = 100 (3 -+ sqrt 5) / 2, damping = 0.002 stiffness
    omega = np.sqrt(50 * (3 + np.array([-1, 1]) * math.sqrt(5)))
    np.testing.assert_allclose(
        [mode["frequency_hz"] for mode in found["modes"]], omega / (2 * np.pi), rtol=1e-12
    )
    np.testing.assert_allclose([mode["damping_ratio"] for mode in found["modes"]], 0.001 * omega, rtol=1e-9)


def test_a_number_that_json_has_not_becomes_null(vib, tmp_path):
    free = tmp_path / "free.toml"
    free.write_text(
        'title = "Free"\n[units]\nmass = "kg"\nstiffness = "N/m"\n'
        "[matrices]\nmass = [[1, 0], [0, 1]]\nstiffness = [[1, -1], [-1, 1]]\n"
    )
    done = vib("modes", free, "--json")
    found = json.loads(done.out, parse_constant=lambda name: pytest.fail(f"{name} is no JSON"))
    assert found["rigid_body_modes"] == 1
    assert found["modes"][0]["damping_ratio"] is None
    assert found["modes"][0]["frequency_hz"] == 0


def test_modes_table_carries_error_bars_completeness_damping_and_caution(vib, chain):
    done = vib("modes", chain)
    assert done.status == 0
    for wanted in ("Two masses in line", "± Hz", "0.98363", "2.5752", "complete", "Damping:", CAUTION):
        assert wanted in " ".join(done.out.split())
    assert max(map(len, done.out.splitlines())) <= 80


def test_remarks_go_to_standard_error_and_quiet_silences_them(vib, beam):
    loud, quiet = vib("modes", beam, "--count", 2), vib("modes", beam, "--count", 2, "--quiet")
    assert "remark: " in loud.err
    assert quiet.err == ""
    assert loud.out == quiet.out


def test_up_to_limits_the_modes(vib, chain):
    found = json.loads(vib("modes", chain, "--up-to", "120 rpm", "--json").out)  # 2 Hz
    assert [mode["number"] for mode in found["modes"]] == [1]


def test_a_range_without_modes_says_so(vib, chain, tmp_path):
    done = vib("modes", chain, "--up-to", "0.1 Hz")
    assert (done.status, "No mode was found" in done.out) == (0, True)
    assert vib("report", chain, "--up-to", "0.1 Hz", "--out", tmp_path).status == 0


@pytest.mark.parametrize("command", ["modes", "screen"])
def test_an_unstable_system_exits_with_1_and_says_so(vib, unstable, command):
    done = vib(command, unstable)
    assert done.status == 1
    assert "unstable" in done.out.lower()


def test_an_unstable_ringing_exits_with_1(vib, unstable):
    done = vib("ring", unstable, "--impulse", "1 N s", "--at", "1", "--duration", "1 s")
    assert done.status == 1
    assert "UNSTABLE" in done.out


def test_screening_status_tells_clear_from_resonant(vib, chain, resonant):
    clear, near = vib("screen", chain), vib("screen", resonant)
    assert (clear.status, near.status) == (0, 1)
    assert "✓ Clear" in clear.out
    assert "✗ Mode 1 lies inside a band" in near.out


def test_a_band_can_be_narrowed(vib, resonant):
    assert vib("screen", resonant, "--band", "1 %").status == 0
    done = vib("screen", resonant, "--band", "120 %")
    assert done.status == 2
    assert done.err.startswith("error: ")


def test_screen_json_has_rows_with_units(vib, resonant):
    done = vib("screen", resonant, "--json")
    assert done.status == 1
    found = json.loads(done.out)
    assert found["clear"] is False
    assert {"mode", "frequency_hz", "excitation", "separation", "counts", "speed_from_rpm"} <= set(
        found["rows"][0]
    )
    assert found["caution"] == CAUTION


def test_ring_json_carries_the_time_history(vib, chain):
    found = json.loads(vib("ring", chain, "--json").out)
    assert found["time_s"][0] == 0
    assert found["time_s"][-1] == pytest.approx(1.0)
    first = found["outputs"][0]
    assert len(first["displacement_m"]) == len(found["time_s"])
    assert first["velocity_m_s"][0] == pytest.approx(1.0)  # 1 N s on 1 kg


def test_ring_options_stand_in_for_the_impact_of_the_study(vib, chain):
    found = json.loads(
        vib("ring", chain, "--velocity", "3 m/s", "--at", "2", "--duration", "0.5 s", "--json").out
    )
    at_two = next(output for output in found["outputs"] if output["name"] == "2")
    assert at_two["velocity_m_s"][0] == pytest.approx(3.0)
    assert found["time_s"][-1] == pytest.approx(0.5)


def test_ring_of_a_structure_watches_the_struck_place_unless_told(vib, block):
    found = json.loads(vib("ring", block, "--json").out)
    assert [output["name"] for output in found["outputs"]] == ["block z"]
    assert found["outputs"][0]["velocity_m_s"][0] == pytest.approx(0.5)  # 6 N s on 12 kg
    found = json.loads(vib("ring", block, "--watch", "block x", "--watch", "A", "--json").out)
    assert [output["name"] for output in found["outputs"]] == ["block x", "A z"]


def test_ring_tables_keep_angles_apart_and_use_the_units_asked_for(vib, block):
    done = vib("ring", block, "--watch", "block rx", "--watch", "block z", "--units", "us")
    assert done.status == 0
    assert "impulse of 1.349 lbf·s at block along z" in done.out
    assert "Peaks of angles" in done.out
    assert "deg" in done.out
    assert "in/s" in done.out


@pytest.mark.parametrize(
    ("options", "said"),
    [
        (["--impulse", "1 N s", "--pull", "1 N"], "give one of --impulse, --pull"),
        (["--impulse", "1 kg"], "--impulse: "),
        (["--along", "upwards", "--pull", "1 N"], "--along: expected one of x"),
        (["--pulse", "1 N", "1 m"], "--pulse: "),
        (["--duration", "-1 s"], "duration"),
        (["--along", "0, 0, 0", "--pull", "1 N"], "--along: expected one of x"),
        (["--along", "nan, 0, 0", "--pull", "1 N"], "--along: expected one of x"),
        (["--along", "", "--pull", "1 N"], "--along: expected one of x"),
        (["--at", "", "--pull", "1 N"], "there is no such place"),
    ],
)
def test_wrong_ring_options_are_named(vib, chain, options, said):
    done = vib("ring", chain, *options)
    assert done.status == 2
    assert done.out == ""
    assert done.err.startswith("error: ")
    assert said in done.err


def test_ring_of_a_structure_without_a_direction_names_the_entry(vib, block):
    without = block.with_name("without.toml")
    without.write_text(block.read_text().replace('along = "z"\n', ""))
    assert "impact.along is missing" in vib("ring", without).err
    assert "--along is missing" in vib("ring", without, "--pull", "3 N").err
    assert vib("ring", without, "--along", "x").status == 0


def test_ring_without_a_start_says_how_to_give_one(vib, beam):
    done = vib("ring", beam)
    assert done.status == 2
    assert "[impact]" in done.err


def test_check_reads_mass_supports_sag_and_axes_back(vib, beam):
    done = vib("check", beam)
    assert done.status == 0
    # 60 x 8 mm flat bar of 0.5 m at 7850 kg/m^3: 1.884 kg
    for wanted in (
        "mass 1.884 kg",
        "250.0, 0, 0 mm",
        "A to B",
        "Sag under its own weight",
        "Assumptions",
        CAUTION,
    ):
        assert wanted in " ".join(done.out.split())
    found = json.loads(vib("check", beam, "--json").out)
    assert found["mass_kg"] == pytest.approx(1.884)
    # clamped bar under its own weight w per length: w L^4 / (8 E I), shear adds little (slender)
    inertia = 0.06 * 0.008**3 / 12
    sag = 1.884 * 9.80665 * 0.5**3 / (8 * 210e9 * inertia)
    assert found["sag"]["greatest_m"] == pytest.approx(sag, rel=2e-3)


def test_check_of_matrices_says_that_mass_cannot_be_told(vib, chain):
    found = json.loads(vib("check", chain, "--json").out)
    assert found["kind"] == "matrices"
    assert found["mass_kg"] is None


def test_units_change_what_is_shown_and_not_what_is_found(vib, beam):
    assert "4.1535 lb" in vib("check", beam, "--units", "us").out  # 1.884 kg / 0.45359237
    si = json.loads(vib("check", beam, "--json").out)
    us = json.loads(vib("check", beam, "--json", "--units", "us").out)
    assert si == us


def test_schema_is_json_and_knows_every_table(vib):
    done = vib("schema")
    assert done.status == 0
    schema = json.loads(done.out)
    assert schema["$schema"].startswith("https://json-schema.org/")
    tables = {
        "units",
        "materials",
        "sections",
        "points",
        "members",
        "bodies",
        "supports",
        "springs",
        "matrices",
    }
    assert tables <= set(schema["properties"])
    assert schema["additionalProperties"] is False
    names = {reference.rsplit("/", 1)[1] for reference in _references(schema)}
    assert names <= set(schema["$defs"])


def _references(node):
    if isinstance(node, dict):
        if "$ref" in node:
            yield node["$ref"]
        for entry in node.values():
            yield from _references(entry)
    elif isinstance(node, list):
        for entry in node:
            yield from _references(entry)
