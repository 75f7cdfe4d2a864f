"""`vib respond --run-up`, and what `screen` and `report` say of the same forces."""

from __future__ import annotations

import csv
import json

import numpy as np
import pytest

FORCED = """
[[excitations]]
name = "fan"
speed = "{speed}"
at = "block"
along = "z"
forces = {{order = 1, amplitude = "{force}"}}
[severity]
group = 1
{more}
"""


@pytest.fixture
def forced(block):
    """A block at 2.52 Hz along z under a force of one order, judged as a large machine."""

    def written(speed="180 rpm", force="20 N", more=""):
        text = block.read_text("utf-8").split("[[excitations]]")[0]
        block.write_text(text + FORCED.format(speed=speed, force=force, more=more), encoding="utf-8")
        return block

    return written


def moved(force, frequency):
    """F / (k - m w^2 + i w c) along z: 3 kN/m, 12 kg, 5 N s/m and 2 % more of critical."""
    omega, natural = 2 * np.pi * frequency, np.sqrt(3000 / 12)
    return force / (3000 - 12 * omega**2 + 1j * omega * (5.0 + 2 * 0.02 * natural * 12))


def test_json_is_the_closed_form_of_a_mass_on_a_spring(vib, forced):
    done = vib("respond", forced(), "--run-up", "--json", "--quiet")
    document = json.loads(done.out)
    along_z = next(row for row in document["severity"]["places"] if row["output"] == "block z")
    wanted = abs(moved(20.0, 3.0)) / np.sqrt(2)
    assert along_z["displacement_rms_m"] == pytest.approx(wanted, rel=1e-9)
    assert along_z["velocity_rms_m_s"] == pytest.approx(2 * np.pi * 3 * wanted, rel=1e-9)
    assert along_z["speed_rpm"] == pytest.approx(180)
    assert along_z["support"] == "flexible"  # 2.52 Hz against 3 Hz
    assert along_z["zone"] == "D"  # 10 mm r.m.s.
    assert done.status == 1
    assert document["run_up"]["speeds_rpm"][0] == pytest.approx(18)
    assert document["caution"].startswith("Results support")


@pytest.mark.parametrize(
    ("force", "zone", "status"), [("0.05 N", "A", 0), ("0.15 N", "B", 0), ("0.25 N", "C", 1)]
)
def test_exit_status_follows_the_zone(vib, forced, force, zone, status):
    done = vib("respond", forced(force=force), "--run-up", "--json", "--quiet")
    assert json.loads(done.out)["severity"]["zone"] == zone
    assert done.status == status


def test_tables_name_the_standard_beside_its_numbers(vib, forced):
    done = vib("respond", forced(), "--run-up")
    for words in (
        "Zone D (severe enough to cause damage) at block z, 180 rpm; ISO 20816-3:2022, group 1",
        "Zone boundaries",
        "How the machine stands",
        "What drives the machine",
        "Forces on supports and mounts",
        "Where lines meet modes",
        "licensed engineer",
    ):
        assert words in " ".join(done.out.split())


def test_own_limits_alone(vib, forced, block):
    more = '[[severity.limits]]\nname = "order 7"\nvelocity_rms = "{limit}"'
    study = forced(more=more.format(limit="1 m/s"))
    study.write_text(study.read_text("utf-8").replace("group = 1\n", ""), encoding="utf-8")
    done = vib("respond", study, "--run-up")
    assert done.status == 0
    assert "Every limit of your own is kept." in done.out
    assert "ISO" not in done.out
    study.write_text(study.read_text("utf-8").replace("1 m/s", "1 mm/s"), encoding="utf-8")
    assert vib("respond", study, "--run-up").status == 1


def test_without_severity_there_are_levels_and_no_judgement(vib, forced):
    study = forced()
    study.write_text(study.read_text("utf-8").split("[severity]")[0], encoding="utf-8")
    done = vib("respond", study, "--run-up", "--json")
    assert done.status == 0
    assert json.loads(done.out)["severity"] is None


def test_units_change_what_is_shown_and_nothing_else(vib, forced):
    done = vib("respond", forced(), "--run-up", "--units", "us")
    assert "mil" in done.out
    assert "in/s" in done.out
    assert done.status == 1


def test_files_carry_units_in_their_names(vib, forced, tmp_path):
    folder = tmp_path / "out"
    done = vib("respond", forced(), "--run-up", "--out", folder, "--pictures", "png")
    assert {path.name for path in folder.iterdir()} == {
        "run_up.json", "run_up.csv", "run_up.npz", "severity.csv",
        "run_up_01.png", "waterfall.png", "orders.png",
    }  # fmt: skip
    assert "wrote" in done.err
    with open(folder / "run_up.csv", encoding="utf-8", newline="") as file:
        rows = list(csv.DictReader(file))
    row = min(rows, key=lambda row: abs(float(row["speed_rpm"]) - 180))
    wanted = 2 * np.pi * 3 * abs(moved(20.0, 3.0)) / np.sqrt(2)
    assert float(row["velocity_rms_m_s block z"]) == pytest.approx(wanted, rel=1e-9)
    with np.load(folder / "run_up.npz") as stored:
        assert stored["displacement_m"].shape == (len(rows), 1, len(stored["outputs"]))
    with open(folder / "severity.csv", encoding="utf-8", newline="") as file:
        levels = list(csv.DictReader(file))
    assert float(levels[0]["velocity_rms_b_c_m_s"]) == pytest.approx(7.1e-3)
    assert levels[0]["source"].startswith("ISO 20816-3:2022")


@pytest.mark.parametrize(
    ("options", "more", "message"),
    [
        (["--run-up", "--duration", "2 s"], "", "--duration does not go with --run-up"),
        (["--run-up", "--shaft", "pump"], "", "pump: no excitation of that name has a running speed"),
        (["--run-up", "--watch", "blok"], "", "blok"),
        (["--shaft", "fan"], "", "--shaft goes with --run-up"),
        ([], "", "or for a run-up with --run-up"),
        (["--run-up"], 'main = "pump"\n[[excitations]]\nname = "pump"\nspeed = "90 rpm"', "severity.main"),
    ],
)
def test_what_cannot_be_done_is_named(vib, forced, options, more, message):
    done = vib("respond", forced(more=more), *options)
    assert done.status == 2
    assert message in done.err
    assert done.out == ""
    assert "Traceback" not in done.err
    assert len([line for line in done.err.splitlines() if line.startswith("error:")]) == 1


def test_what_is_watched_is_shown_beside_what_is_judged(vib, forced):
    document = json.loads(vib("respond", forced(), "--run-up", "--watch", "A y", "--json", "--quiet").out)
    outputs = [row["output"] for row in document["run_up"]["outputs"]]
    assert outputs == ["A y", "block x", "block y", "block z"]
    assert [row["output"] for row in document["severity"]["places"]] == outputs[1:]


def test_where_nothing_turns_the_lines_are_drawn(vib, forced, tmp_path):
    study = forced()
    text = (
        study.read_text("utf-8").replace('speed = "180 rpm"\n', "").replace("order = 1", 'frequency = "8 Hz"')
    )
    study.write_text(text, encoding="utf-8")
    done = vib("respond", study, "--run-up", "--json", "--out", tmp_path / "out")
    document = json.loads(done.out)
    assert (tmp_path / "out" / "lines.svg").exists()
    assert document["severity"]["main_excitation_to_hz"] == 8.0
    along_z = next(row for row in document["severity"]["places"] if row["output"] == "block z")
    # the main excitation is slower than 600 r/min, so that the band begins at 2 Hz (ISO 20816-3, from memory)
    assert along_z["velocity_rms_m_s"] == pytest.approx(2 * np.pi * 8 * abs(moved(20.0, 8.0)) / np.sqrt(2))


def test_nothing_drives(vib, resonant):
    done = vib("respond", resonant, "--run-up")
    assert done.status == 2
    assert "none of them states a force" in done.err


def test_screen_shows_the_level_and_keeps_its_status(vib, forced):
    """The block meets the fan at 151 rpm; however weak the force, the coincidence counts."""
    weak = vib("screen", forced(speed="150 rpm", force="0.002 N"))
    said = " ".join(weak.out.split())
    assert weak.status == 1
    assert "predicted level is in zone A at worst" in said
    assert "So the coincidence stands, but does no harm by this prediction." in said
    document = json.loads(vib("screen", forced(speed="150 rpm"), "--json").out)
    row = next(row for row in document["rows"] if row["counts"])
    natural = np.sqrt(3000 / 12) / (2 * np.pi)
    peak = max(abs(moved(20.0, f)) * 2 * np.pi * f for f in np.linspace(0.99, 1.01, 401) * natural) / np.sqrt(
        2
    )
    assert row["consequence"]["zone"] == "D"
    assert row["consequence"]["velocity_rms_m_s"] == pytest.approx(
        peak, rel=0.01
    )  # five speeds about the peak
    assert "ISO 20816-3:2022" in row["consequence"]["source"]
    clear = vib("screen", forced(speed="600 rpm", force="200 N"))
    assert clear.status == 0  # severity is not screening's business: no mode lies inside a band


def test_the_page_holds_severity_run_up_and_forced_response(vib, forced, tmp_path):
    study = forced(more='[[loads]]\nat = "block"\nalong = "z"\nimpulse = "2 N s"')
    assert vib("report", study, "--out", tmp_path / "page").status == 0
    page = (tmp_path / "page" / "block.html").read_text("utf-8")
    for heading in ("Severity", "Run-up", "Forced response"):
        assert f"<h2>{heading}</h2>" in page
    verdict = page.split('aria-label="Verdict"')[1].split("</section>")[0]
    assert "Zone D" in verdict
    assert "ISO 20816-3:2022" in verdict
    assert "API 617" in page
    assert page.count("Waterfall of") == 1


def test_the_page_of_a_study_without_forces_says_what_is_missing(vib, chain, tmp_path):
    assert vib("report", chain, "--out", tmp_path).status == 0
    page = (tmp_path / "chain.html").read_text("utf-8")
    for words in (
        "the study has no [severity]",
        "no excitation states a force",
        "the study has no [[loads]]",
    ):
        assert words in page
