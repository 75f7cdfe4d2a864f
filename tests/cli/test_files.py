"""Files that commands write: whole, only after success, never over a study."""

from __future__ import annotations

import csv
import json

import numpy as np
import pytest


def test_modes_out_writes_tables_shapes_and_pictures(vib, chain, tmp_path):
    out = tmp_path / "deep" / "out"
    done = vib("modes", chain, "--out", out)
    assert done.status == 0
    assert {path.name for path in out.iterdir()} == {
        "modes.json", "modes.csv", "shapes.npz", "mode_01.svg", "mode_02.svg",
    }  # fmt: skip
    rows = list(csv.DictReader((out / "modes.csv").read_text().splitlines()))
    document = json.loads((out / "modes.json").read_text())
    assert float(rows[1]["frequency_hz"]) == document["modes"][1]["frequency_hz"]
    assert float(rows[1]["eigenvalue_imag_rad_per_s"]) == document["modes"][1]["eigenvalue"]["imag_rad_per_s"]
    with np.load(out / "shapes.npz", allow_pickle=False) as stored:
        assert stored["shapes"].shape == (2, 2)
        assert list(stored["freedoms"]) == ["1", "2"]
    assert f"wrote {out / 'modes.csv'}" in done.err


def test_pictures_can_be_png(vib, chain, tmp_path):
    assert vib("modes", chain, "--out", tmp_path, "--pictures", "png", "--count", 1).status == 0
    assert (tmp_path / "mode_01.png").read_bytes().startswith(b"\x89PNG")


def test_ring_out_writes_the_history(vib, chain, tmp_path):
    out = tmp_path / "out"
    assert vib("ring", chain, "--out", out).status == 0
    rows = list(csv.DictReader((out / "ring.csv").read_text().splitlines()))
    with np.load(out / "ring.npz", allow_pickle=False) as stored:
        assert len(rows) == len(stored["time_s"])
        assert float(rows[5]["displacement_m 1"]) == stored["displacement_m"][5, 0]
    assert {"ring_01.svg", "ring_02.svg", "ring_shares.svg"} <= {path.name for path in out.iterdir()}


def test_check_and_screen_draw(vib, beam, resonant, tmp_path):
    assert vib("check", beam, "--out", tmp_path / "a").status == 0
    assert (tmp_path / "a" / "model.svg").read_text().count("<svg") == 1
    assert vib("screen", resonant, "--out", tmp_path / "b").status == 1
    assert (tmp_path / "b" / "speeds_01.svg").exists()
    assert (tmp_path / "b" / "screening.csv").exists()


@pytest.mark.parametrize("command", ["check", "modes", "ring", "screen", "report"])
def test_a_study_with_faults_leaves_nothing_behind(vib, tmp_path, command):
    bad = tmp_path / "bad.toml"
    bad.write_text('title = "bad"\n[points]\nA = [0, 0, 0]\nB = [1]\n')
    done = vib(command, bad, "--out", tmp_path / "out", *(["--json"] if command != "check" else []))
    assert done.status == 2
    assert done.out == ""
    assert all(line.startswith("error: ") for line in done.err.splitlines())
    assert len(done.err.splitlines()) > 1  # one line per fault
    assert sorted(path.name for path in tmp_path.iterdir()) == ["bad.toml"]


def test_a_folder_that_cannot_be_made_is_an_error_and_nothing_is_printed(vib, chain, tmp_path):
    (tmp_path / "taken").write_text("a file")
    done = vib("modes", chain, "--out", tmp_path / "taken" / "deeper")
    assert done.status == 2
    assert done.out == ""
    assert "cannot be written" in done.err
    assert (tmp_path / "taken").read_text() == "a file"


def test_report_writes_one_page_and_prints_its_path(vib, resonant, tmp_path):
    done = vib("report", resonant, "--out", tmp_path / "pages")
    assert done.status == 0  # written, although a mode lies inside a band
    assert done.out.strip() == str(tmp_path / "pages" / "resonant.html")
    page = (tmp_path / "pages" / "resonant.html").read_text(encoding="utf-8")
    assert page.index("Mode 1 lies inside a band") < page.index("<h2>")
    assert [path.name for path in (tmp_path / "pages").iterdir()] == ["resonant.html"]


def test_report_json_names_the_page(vib, chain, tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    done = vib("report", chain, "--json", "--quiet")
    assert json.loads(done.out) == {"page": "chain.html"}
    assert done.err == ""
    assert (tmp_path / "chain.html").exists()


def test_the_page_of_an_unstable_system_says_so_first(vib, unstable, tmp_path):
    assert vib("report", unstable, "--out", tmp_path).status == 0
    page = (tmp_path / "unstable.html").read_text(encoding="utf-8")
    verdict = page[page.index('class="verdict') :]
    assert verdict.index("UNSTABLE") < verdict.index("</p>")


def test_new_writes_a_study_that_checks_and_never_overwrites(vib, tmp_path):
    target = tmp_path / "mine.toml"
    done = vib("new", "chain", "--out", target)
    assert (done.status, done.out.strip()) == (0, str(target))
    assert vib("check", target).status == 0
    target.write_text("mine now")
    again = vib("new", "cantilever", "--out", target)
    assert again.status == 2
    assert "is there already" in again.err
    assert target.read_text() == "mine now"
    assert [path.name for path in tmp_path.iterdir()] == ["mine.toml"]


def test_new_names_its_starters(vib, tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    listed = vib("new")
    assert listed.status == 0
    assert {"cantilever", "portal", "skid", "chain", "matrices"} <= set(listed.out.split())
    wrong = vib("new", "cantilver")
    assert wrong.status == 2
    assert 'did you mean "cantilever"' in wrong.err
    assert not list(tmp_path.iterdir())
