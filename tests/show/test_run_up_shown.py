"""Run-up and severity shown: pictures are valid and true, names are text, tables keep their units apart."""

from __future__ import annotations

import xml.etree.ElementTree as Tree

import numpy as np
import pytest

import vib
from vib.severity import judge
from vib.show.figures.running import order_picture, run_up_pictures, spectra_picture
from vib.show.tables.run_up import RunUps, run_up_blocks
from vib.show.tables.severity import boundary_table, counts, level_table, severity_verdict
from vib.show.terminal import render

SVG = "{http://www.w3.org/2000/svg}"
STUDY = """
title = "Skid <b> & $x$"
[points]
A = ["0 m", "0 m", "0 m"]
[[bodies]]
name = "motor <svg onload=x>"
mass = "100 kg"
inertia = ["4 kg m^2", "4 kg m^2", "4 kg m^2"]
carried_by = "A"
[[springs]]
name = "mount"
between = ["A", "ground"]
stiffness = {x = "4 kN/mm", y = "2 kN/mm", z = "1 kN/mm", rx = "9e6 N m", ry = "9e6 N m", rz = "9e6 N m"}
[damping]
ratio = 0.03
[[excitations]]
name = "fan </title> $1$"
speed = ["900 rpm", "1500 rpm"]
at = "motor <svg onload=x>"
axis = "x"
unbalance = {grade = "G 6.3", mass = "20 kg"}
forces = {order = 2, amplitude = "30 N", along = "z"}
[severity]
group = 2
"""


@pytest.fixture(scope="module")
def found(tmp_path_factory):
    path = tmp_path_factory.mktemp("run_up") / "skid.toml"
    path.write_text(STUDY, encoding="utf-8")
    study = vib.read(path)
    run_up = vib.run_up(study)
    assert study.severity is not None
    return RunUps(study, run_up, judge(run_up, study.severity, run_up.system.modes(up_to=60.0)))


def test_pictures_are_valid_and_hold_no_element_made_from_a_name(found):
    pictures = run_up_pictures(found.run_up, found.severity, "si")
    again = run_up_pictures(found.run_up, found.severity, "si")
    assert [picture.name for picture in pictures] == ["run_up_01", "waterfall", "orders"]
    for picture, same in zip(pictures, again, strict=True):
        svg = picture.svg()
        root = Tree.fromstring(svg)
        assert root.get("aria-label") == picture.words
        assert {element.tag.removeprefix(SVG) for element in root.iter()} <= {
            "svg", "g", "path", "text", "tspan", "use", "defs", "clipPath", "rect", "style",
        }  # fmt: skip
        assert svg == same.svg()


def test_the_curve_marks_modes_and_names_the_standard(found):
    first = run_up_pictures(found.run_up, found.severity, "si")[0]
    shown = ["".join(node.itertext()).strip() for node in Tree.fromstring(first.svg()).iter(f"{SVG}text")]
    assert "zones by ISO 20816-3:2022, from memory" in shown
    assert any(text.startswith("mode ") for text in shown)
    assert "velocity, mm/s r.m.s." in shown
    (axes,) = first.figure.axes
    drawn = np.asarray(axes.lines[0].get_ydata())
    assert drawn == pytest.approx(1e3 * found.run_up.velocity_rms_m_s[:, 0])
    american = run_up_pictures(found.run_up, found.severity, "us")[0]
    drawn = np.asarray(american.figure.axes[0].lines[0].get_ydata())
    assert drawn == pytest.approx(found.run_up.velocity_rms_m_s[:, 0] / 0.0254)


def test_the_orders_add_up_to_the_whole(found):
    (axes,) = order_picture(found.run_up, 2, "si", "orders").figure.axes
    drawn = [np.asarray(line.get_ydata()) for line in axes.lines]
    whole, *parts = [curve for curve in drawn if len(curve) > 2]
    assert len(parts) == 2
    assert np.sqrt(sum(part**2 for part in parts)) == pytest.approx(whole, rel=1e-9)


def test_the_waterfall_holds_every_line_at_its_frequency(found):
    (axes,) = spectra_picture(found.run_up, 2, "si", "waterfall").figure.axes
    sticks = [np.asarray(path.vertices) for group in axes.collections for path in group.get_paths()]
    speeds = np.array([segment[0, 1] for segment in sticks]) / 60
    orders = np.array([segment[0, 0] for segment in sticks]) / speeds
    assert set(orders.round(9)) == {1.0, 2.0}
    assert speeds.min() == pytest.approx(15)
    assert speeds.max() == pytest.approx(25)


def test_tables_in_both_units_tell_the_same(found):
    si, us = (level_table(found.severity, units) for units in ("si", "us"))
    assert [column.unit for column in si.columns[1:5:1]] == ["rpm", "mm/s", "", "µm"]
    assert [column.unit for column in us.columns[1:5:1]] == ["rpm", "in/s", "", "mil"]
    for metric, american in zip(si.rows, us.rows, strict=True):
        assert float(metric[2]) == pytest.approx(25.4 * float(american[2]), rel=0.01)  # three digits each
        assert float(metric[4]) == pytest.approx(25.4 * float(american[4]), rel=0.01)
        assert metric[3::2] == american[3::2]


def test_every_boundary_stands_beside_its_source(found):
    table = boundary_table(found.severity, "si")
    assert table is not None
    for row in table.rows:
        assert row[-1].startswith("ISO 20816-3:2022, group 2, ")
        assert row[-1].endswith("figures from memory")
    assert any(row[2:5] in (("2.30", "4.50", "7.10"), ("1.40", "2.80", "4.50")) for row in table.rows)


def test_the_verdict_is_coloured_by_the_zone(found):
    zone = found.severity.zone
    tone = severity_verdict(found.severity).tone
    assert {"A": "good", "B": "good", "C": "careful", "D": "bad"}[zone] in (tone, "good")
    assert (tone == "bad") == (zone == "D")


@pytest.mark.parametrize("width", [60, 80, 120])
def test_no_table_loses_a_column_on_a_narrow_terminal(found, width):
    text = render(run_up_blocks(found, "si"), width=width)
    for heading in ("zone", "support", "source", "at most", "damping", "mostly by"):
        assert heading in text
    assert "…" not in text
    assert "21940-11" in text.replace("\n", "")  # the source of the balance grade


def test_rounding_is_no_vibration_and_instability_is_no_rounding(found):
    assert level_table(found.severity, "si").rows[0][2] == "0"  # nothing acts along x
    assert not counts(1e-13, 1.0)
    assert counts(1e-8, 1.0)
    assert counts(np.inf, np.inf)
    assert not counts(0.0, 0.0)
