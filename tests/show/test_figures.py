"""Pictures: valid, the same every time, names as text, shapes true."""

from __future__ import annotations

import re
import xml.etree.ElementTree as Tree

import numpy as np
import pytest

from vib.show.figures.canvas import Picture, sheet, style
from vib.show.figures.ringing import ring_pictures, thinned
from vib.show.figures.shapes import shape_picture
from vib.show.figures.space import moved, on_paper, smooth, view
from vib.show.figures.speeds import speed_pictures
from vib.show.figures.structure import structure_picture

SVG = "{http://www.w3.org/2000/svg}"


def texts(svg):
    return ["".join(node.itertext()).strip() for node in Tree.fromstring(svg).iter(f"{SVG}text")]


@pytest.fixture(scope="module")
def drawn(frame):
    frames = [(np.array(run.origin_m), np.array([run.x, run.y, run.z])) for run in frame.survey.runs]
    found = [structure_picture(frame.study, frame.modes.system, frames)]
    found += [shape_picture(frame.modes, 0), *ring_pictures(frame.ring, "us")]
    found += speed_pictures(frame.screening, frame.modes)
    return [(picture, picture.svg()) for picture in found]


def test_pictures_are_valid_and_hold_no_element_made_from_a_name(drawn):
    assert len(drawn) == 6
    for picture, svg in drawn:
        root = Tree.fromstring(svg)
        assert root.get("aria-label") == picture.words
        assert {element.tag.removeprefix(SVG) for element in root.iter()} <= {
            "svg", "g", "path", "text", "tspan", "use", "defs", "clipPath", "rect", "style",
        }  # fmt: skip
        assert "Date" not in svg
        assert "http" not in re.sub(r'xmlns(:\w+)?="[^"]*"', "", svg)


def test_names_are_shown_as_they_are_written(drawn):
    shown = [text for _, svg in drawn for text in texts(svg)]
    assert "_legs $a_1$ <i>" in shown
    assert "$C$ <b>" in shown
    assert "motor <svg onload=x>" in shown
    assert "Modes against fan </title> $1$" in shown


def test_ids_start_with_the_prefix_and_references_find_them(drawn):
    for picture, _ in drawn:
        svg = picture.svg("left side")
        ids = re.findall(r'\bid="([^"]+)"', svg)
        assert ids
        assert all(name.startswith("left-side-") for name in ids)
        assert len(ids) == len(set(ids))
        used = re.findall(r"url\(#([^)]+)\)", svg) + re.findall(r'href="#([^"]+)"', svg)
        assert set(used) <= set(ids)


def test_the_same_picture_is_the_same_file_whatever_the_users_settings(frame):
    import matplotlib

    first = shape_picture(frame.modes, 0).content("svg")
    with matplotlib.rc_context({"font.size": 30, "axes.facecolor": "red", "text.parse_math": True}):
        second = shape_picture(frame.modes, 0).content("svg")
    assert first == second
    assert shape_picture(frame.modes, 1).content("png")[1].startswith(b"\x89PNG")


def test_a_name_in_another_script_draws_without_a_warning():
    with style():
        figure = sheet(2.0, 1.0)
        figure.add_subplot().set_title("電動機")
    assert "電動機" in texts(Picture("x", figure, "x").svg())


def test_bare_matrices_are_drawn_as_bars(bare):
    shown = texts(shape_picture(bare.modes, 0).svg())
    assert {"freedom (hollow: a quarter cycle later)", "1", "2"} <= set(shown)


@pytest.mark.parametrize("up", ["x", "y", "z"])
def test_the_axis_up_is_upright_and_the_view_keeps_lengths_in_its_plane(up):
    matrix = view(up)
    upright = matrix[:, "xyz".index(up)]
    assert upright[0] == pytest.approx(0.0, abs=1e-15)
    assert upright[1] > 0.8
    np.testing.assert_allclose(matrix @ matrix.T, np.eye(2), atol=1e-15)
    # seen from above, x to y turns the way z to x and y to z do: the right hand is kept
    following = ["xyz".index(axis) for axis in {"x": "yz", "y": "zx", "z": "xy"}[up]]
    first, second = matrix[:, following[0]], matrix[:, following[1]]
    assert first[0] * second[1] - first[1] * second[0] > 0


def test_a_spline_through_a_cubic_is_the_cubic():
    """A not-a-knot cubic spline reproduces cubic polynomials (de Boor 1978, chapter IV)."""
    steps = np.arange(6.0)
    curve = np.stack([steps**3 - 2 * steps, 0.5 * steps**2], axis=1)
    fine = np.linspace(0, 5, 26)
    expected = np.stack([fine**3 - 2 * fine, 0.5 * fine**2], axis=1)
    np.testing.assert_allclose(smooth(curve), expected, atol=1e-11)
    parabola = (np.arange(3.0) ** 2)[:, None]
    np.testing.assert_allclose(smooth(parabola)[:, 0], np.linspace(0, 2, 11) ** 2, atol=1e-13)
    np.testing.assert_array_equal(smooth(curve[:2]), curve[:2])


def test_the_wireframe_moves_as_the_places_do(frame):
    system = frame.modes.system
    shape = np.real(frame.modes.shapes[:, 0])
    nodes = moved(system.anatomy.wireframe, shape)
    for name, place in system.anatomy.places.items():
        near = np.linalg.norm(system.anatomy.wireframe.nodes_m - np.array(place.position_m), axis=1)
        np.testing.assert_allclose(
            nodes[np.argmin(near)], (place.motion @ shape)[:3], atol=1e-12, err_msg=name
        )
    assert on_paper(np.zeros((4, 3))).shape == (4, 2)


def test_round_off_is_not_drawn_as_a_shape(tmp_path):
    """A bar along x that turns freely about x moves none of its points."""
    path = tmp_path / "bar.toml"
    path.write_text(
        '[points]\nA = ["0 m", "0 m", "0 m"]\nB = ["1 m", "0 m", "0 m"]\n'
        '[sections.s]\nshape = "SHS 60x60x4"\n'
        '[[members]]\nsection = "s"\nmaterial = "structural steel"\nruns = [["A", "B"]]\n'
        '[[supports]]\nat = ["A", "B"]\nhold = "translations"\n'
    )
    import vib

    modes = vib.read(path).system().modes(count=2)
    assert modes.rigid_body_count == 1
    assert "turns on the spot: no point moves" in texts(shape_picture(modes, 0).svg())
    assert "turns on the spot: no point moves" not in texts(shape_picture(modes, 1).svg())


def test_a_thinned_record_keeps_its_peaks():
    times = np.linspace(0, 1, 50001)
    values = np.sin(2 * np.pi * 50 * times)
    values[31234] = 7.0
    at, kept = thinned(times, values)
    assert len(kept) < 3000
    assert kept.max() == 7.0
    assert kept.min() == values.min()
    assert (np.diff(at) > 0).all()
