"""The commands scatter and sweep, and their part of the page."""

import csv
import json

import numpy as np
import pytest

from tests.scatter.conftest import DRIVEN, FRAME, SWAP
from vib.cli import run


@pytest.fixture
def study(tmp_path):
    def write(text=SWAP):
        file = tmp_path / "study.toml"
        file.write_text(text, encoding="utf-8")
        return str(file)

    return write


def test_scatter_shows_its_tables(study, capsys):
    status = run(["scatter", study(), "--samples", "256"])
    shown = capsys.readouterr()
    assert status == 1
    assert shown.err == ""
    for words in ("What scatters", "under one: stiffness x", "Natural frequencies", "Probability of a mode",
                  "any: of those", "What the scatter of the frequencies", "do not replace"):  # fmt: skip
        assert words in shown.out
    assert "UNSTABLE" not in shown.out


def test_scatter_json_holds_every_figure(study, capsys):
    assert run(["scatter", study(DRIVEN), "--samples", "64", "--levels", "8", "--seed", "3", "--json"]) == 1
    found = json.loads(capsys.readouterr().out)
    assert (found["samples"], found["seed"], found["method"]) == (64, 3, "sobol")
    assert found["quantities"][0]["entry"] == "materials.steel.youngs_modulus"
    first = found["modes"][0]["frequency"]
    assert first["least_hz"] <= first["percentiles"][3]["value_hz"] <= first["most_hz"]
    assert 0 <= found["probability_of_resonance"]["probability_from"] <= 1
    assert found["levels"]["samples"] == 8
    assert "ISO 20816-3" in found["levels"]["outputs"][0]["boundaries"][0]["source"]
    assert {row["factor"] for row in found["ranking"]["factors"]} == {
        row["entry"] for row in found["quantities"]
    }
    assert "do not replace" in found["caution"]


@pytest.mark.parametrize("method", ["sobol", "latin-hypercube"])
def test_the_number_of_workers_changes_no_figure(study, capsys, method):
    shown = []
    for workers in ("1", "3"):
        more = ["--samples", "600", "--method", method, "--workers", workers, "--json"]
        run(["scatter", study(FRAME), *more])
        shown.append(capsys.readouterr().out)
    assert shown[0] == shown[1]


def test_scatter_writes_files_and_takes_up_again(study, capsys, tmp_path):
    file, kept = study(), tmp_path / "kept"
    more = ["--samples", "64", "--resume", str(kept), "--pictures", "png"]
    run(["scatter", file, *more, "--out", str(tmp_path / "one")])
    run(["scatter", file, *more, "--out", str(tmp_path / "two")])
    one, other = (dict(np.load(tmp_path / name / "scatter.npz")) for name in ("one", "two"))
    assert set(one) >= {"entries", "values_si", "frequencies_hz", "swapped"}
    for name in one:
        np.testing.assert_array_equal(one[name], other[name])
    names = {path.name for path in (tmp_path / "one").iterdir()}
    assert names >= {"scatter.json", "bands.csv", "scatter_ranges.png", "scatter_ranking.png"}
    with open(tmp_path / "one" / "bands.csv", encoding="utf-8") as table:
        rows = list(csv.DictReader(table))
    assert rows[0]["excitation"] == "shaker"
    assert 0 <= float(rows[0]["probability"]) <= 1


def test_nothing_likely_is_status_0(study, capsys):
    text = SWAP.replace('frequencies = ["10.5 Hz"]', 'frequencies = ["40 Hz"]')
    assert run(["scatter", study(text), "--samples", "32"]) == 0
    assert "with a probability of 0 % (0 to" in " ".join(capsys.readouterr().out.split())


def test_a_study_without_tolerances_is_told_how_to_state_them(study, capsys):
    text = SWAP.replace(" +- 30 %", "")
    assert run(["scatter", study(text)]) == 2
    assert "2 kN/mm +- 20 %" in capsys.readouterr().err


def test_sweep_of_one_and_of_two(study, capsys, tmp_path):
    entry, ends = "springs[0].stiffness.x", ["100 N/mm", "800 N/mm"]
    out = tmp_path / "sweep"
    assert run(["sweep", study(), "--vary", entry, *ends, "--steps", "5", "--out", str(out)]) == 0
    assert "under one: stiffness x" in capsys.readouterr().out
    with open(out / "sweep.csv", encoding="utf-8") as table:
        rows = list(csv.DictReader(table))
    assert len(rows) == 5
    assert float(rows[0][f"{entry}_si"]) == 1e5
    assert (out / "sweep.svg").is_file()
    more = ["--vary", "bodies[0].mass", "50 kg", "200 kg", "--steps", "3", "--json"]
    assert run(["sweep", study(), "--vary", entry, *ends, *more]) == 0
    found = json.loads(capsys.readouterr().out)
    assert [one["entry"] for one in found["swept"]] == [entry, "bodies[0].mass"]
    assert np.shape(found["modes"][0]["frequency_hz"]) == (3, 3)


def test_sweep_of_levels(study, capsys, tmp_path):
    entry, ends = "springs[1].stiffness.rx", ["200 kN m/rad", "400 kN m/rad"]
    more = ["--steps", "3", "--out", str(tmp_path)]
    assert run(["sweep", study(DRIVEN), "--vary", entry, *ends, *more]) == 0
    assert "head y" in capsys.readouterr().out
    assert run(["sweep", study(DRIVEN), "--vary", entry, *ends, *more, "--no-levels"]) == 0
    assert "head y" not in capsys.readouterr().out


@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        ([], "each --vary takes an entry and two values"),
        (["--vary", "bodies[0].mass", "5 kg"], "each --vary takes an entry and two values"),
        (["--vary", "bodies[0].mass", "5 kg", "6 kg", "--stps", "5"], "--stps: there is no such option"),
        (["--vary", "bodies[0].mass", "-5 kg", "6 kg"], "must be greater than 0"),
        (["--vary", "bodies[7].mass", "5 kg", "6 kg"], "no such entry"),
        (["--vary", "bodies[0].mass", "5 kg", "6 kg"] * 2, "given twice"),
    ],
)
def test_a_sweep_that_cannot_be(study, capsys, arguments, message):
    assert run(["sweep", study(), *arguments]) == 2
    assert message in capsys.readouterr().err


def test_the_page_says_how_sure_it_is(study, capsys, tmp_path):
    run(["report", study(), "--out", str(tmp_path)])
    page = (tmp_path / "study.html").read_text("utf-8")
    assert "How sure" in page
    assert "Probability of a mode within a band" in page
    run(["report", study(SWAP.replace(" +- 30 %", "")), "--out", str(tmp_path)])
    assert "How sure" not in (tmp_path / "study.html").read_text("utf-8")
