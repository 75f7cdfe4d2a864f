"""Tables and pictures of scatter and sweeps."""

import numpy as np
import pytest

from tests.scatter.conftest import DRIVEN, SWAP
from vib.scatter.scatter import scatter
from vib.scatter.sweep import sweep
from vib.show.figures.scatter import scatter_pictures
from vib.show.figures.sweep import sweep_pictures
from vib.show.tables.quantities import entry_words, quantity_texts
from vib.show.tables.scatter import chance_table, frequency_table, objects, ranking_table, scatter_blocks
from vib.show.tables.sweep import sweep_blocks, sweep_rows
from vib.show.terminal import render
from vib.study import read


@pytest.fixture(scope="module")
def study(tmp_path_factory):
    def make(text):
        file = tmp_path_factory.mktemp("show") / "study.toml"
        file.write_text(text, encoding="utf-8")
        return read(file)

    return make


@pytest.fixture(scope="module")
def driven(study):
    return scatter(study(DRIVEN), samples=64, level_samples=16)


@pytest.mark.parametrize(
    ("path", "words"),
    [
        ("springs[1].stiffness.rx", "tilting foot: stiffness rx"),
        ("bodies[0].mass", "head: mass"),
        ("materials.steel.youngs_modulus", "steel: youngs modulus"),
        ("points.B[2]", "point B: z"),
        ("damping.ratio", "damping: ratio"),
        ("excitations[0].speed", "pump: speed"),
    ],
)
def test_entries_are_told_by_their_owners(study, path, words):
    assert entry_words(study(DRIVEN), path) == words


def test_quantities_are_shown_in_the_units_asked_for():
    assert quantity_texts("mass", (1.0, 2.0), "si") == ("1.000", "2.000", "kg")
    assert quantity_texts("mass", (0.45359237,), "us") == ("1.000", "lb")
    assert quantity_texts("ratio", (0.02,), "us") == ("2.000", "%")


def test_pictures_name_what_they_show_and_are_drawn(driven):
    pictures = scatter_pictures(driven, "us")
    assert [picture.name for picture in pictures] == [
        "scatter_ranges", "scatter_histograms", "scatter_levels", "scatter_ranking"
    ]  # fmt: skip
    for picture in pictures:
        svg = picture.svg()
        assert "Hz" in svg or "in/s" in svg or "variance" in svg
        assert "nan" not in svg


def test_tables_agree_with_what_was_found(driven):
    table = frequency_table(driven)
    assert [row[0] for row in table.rows] == [str(mode + 1) for mode in range(driven.modes.count)]
    median = driven.frequencies_hz[0].percentiles[50.0].value
    assert float(table.rows[0][4]) == pytest.approx(median, rel=1e-3)
    chances = chance_table(driven)
    assert chances is not None
    assert chances.rows[-1][3] == "any"
    assert objects(driven)
    ranking = ranking_table(driven)
    assert ranking is not None
    assert ranking.rows[0][1].startswith("tilting foot")


@pytest.mark.parametrize("width", [80, 120])
def test_every_word_fits_the_terminal(driven, width):
    shown = render(scatter_blocks(driven, "si"), width=width)
    assert max(len(line) for line in shown.splitlines()) <= width
    assert "ISO 20816-3" in shown


def test_what_does_not_scatter_has_no_ranking(study):
    text = SWAP.replace(" +- 30 %", "").replace('["10.5 Hz"]', '["10.5 Hz +- 2 %"]')
    found = scatter(study(text), samples=16)
    assert ranking_table(found) is None
    assert [picture.name for picture in scatter_pictures(found, "si")] == [
        "scatter_ranges",
        "scatter_histograms",
    ]


def test_a_sweep_is_shown_value_by_value_and_drawn(study):
    found = sweep(study(DRIVEN), {"springs[1].stiffness.rx": (2e5, 4e5)}, steps=4)
    shown = render(sweep_blocks(found, "si"), width=100)
    assert "R.m.s. velocity at the worst running speed" in shown
    rows = sweep_rows(found)
    assert len(rows) == 4
    assert rows[2]["mode_1_frequency_hz"] == found.frequencies_hz[2, 0]
    assert rows[0]["head y_velocity_rms_m_s"] == found.velocity_rms_m_s[0, found.outputs.index("head y")]
    (picture,) = sweep_pictures(found, "si")
    assert "zone" in picture.svg()


def test_maps_of_two_quantities_are_drawn(study):
    vary = {"springs[1].stiffness.rx": (2e5, 4e5), "bodies[0].mass": (60.0, 100.0)}
    found = sweep(study(DRIVEN), vary, steps=3)
    assert [picture.name for picture in sweep_pictures(found, "si")] == ["sweep_map", "sweep_level_map"]
    for picture in sweep_pictures(found, "si"):
        assert "head: mass, kg" in picture.svg()
    assert np.isfinite(found.frequencies_hz).all()
