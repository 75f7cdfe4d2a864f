"""From a file to a study."""

from pathlib import Path
from typing import Any

import numpy as np
import pytest
import scipy.io
import scipy.sparse as sparse

from vib.errors import StudyError
from vib.study import Study
from vib.study import read as read_study
from vib.study.lines import find_line, line_numbers

FRAME = """
[points]
A = ["0 m", "0 m", "0 m"]
"B 1" = ["0 m", "0 m", "36 in"]
[sections]
leg = {shape = "round bar", diameter = "2 in"}
[[members]]
section = "leg"
material = "structural steel"
runs = [["A", "B 1"]]
"""


def read(file: Path) -> Any:
    """A study whose optional tables the test knows to be there."""
    return read_study(file)


def write(tmp_path, text, name="study.toml"):
    file = tmp_path / name
    file.write_text(text)
    return file


def test_a_study_is_si_frozen_and_named(tmp_path):
    study = read(write(tmp_path, FRAME))
    assert study.points["B 1"][2] == pytest.approx(36 * 0.0254, rel=1e-15)
    assert study.members[0].name == "members 1"
    assert study.accuracy == 0.005
    with pytest.raises(ValueError, match="frozen"):
        study.title = "other"


def test_bare_areas_follow_the_declared_length(tmp_path):
    text = FRAME.replace('leg = {shape = "round bar", diameter = "2 in"}', "").replace(
        "[[members]]",
        "[sections.leg]\narea = 100\nsecond_moment_y = 2000\nsecond_moment_z = 3000\ntorsion_constant = 400\n"
        '[units]\nlength = "mm"\n[[members]]',
    )
    profile = read(write(tmp_path, text)).sections["leg"].profile
    assert profile.area == pytest.approx(1e-4, rel=1e-14)
    assert profile.second_moment_z == pytest.approx(3e-9, rel=1e-14)


def test_a_material_starts_from_a_built_in_one_and_is_overridden(tmp_path):
    text = FRAME + '[materials.own]\nlike = "structural steel"\ndensity = "8000 kg/m^3"\n'
    material = read(write(tmp_path, text)).materials["own"]
    assert material.data.density == 8000
    assert material.data.youngs_modulus == 210e9
    assert material.shear == pytest.approx(210e9 / 2.6, rel=1e-15)


def test_rotations_take_rotational_quantities(tmp_path):
    text = FRAME + '[impact]\nat = "B 1"\nalong = "-rz"\nimpulse = "3 N m s"\n'
    assert read(write(tmp_path, text)).impact.impulse == 3.0
    with pytest.raises(StudyError, match="not a unit of angular impulse"):
        read(write(tmp_path, text.replace("3 N m s", "3 N s")))


def test_a_pulse_has_a_peak_and_a_duration(tmp_path):
    text = FRAME + '[impact]\nat = "B 1"\nalong = [0, 3, 4]\npulse = {peak = "2 kN", duration = "8 ms"}\n'
    impact = read(write(tmp_path, text)).impact
    assert (impact.pulse.peak, impact.pulse.duration) == (2000.0, 0.008)
    assert impact.along == (0.0, 0.6, 0.8)


MATRICES = """
[units]
mass = "t"
stiffness = "kN/m"
damping = "N s/mm"
[matrices]
mass = [[2, 0], [0, 1]]
stiffness = "k.mtx"
damping = {file = "c.npz", unit = "N s/m"}
"""


def matrix_files(tmp_path):
    scipy.io.mmwrite(tmp_path / "k.mtx", sparse.coo_array(np.array([[3.0, -1.0], [-1.0, 1.0]])))
    np.savez(tmp_path / "c.npz", np.array([[0.3, 0.0], [0.0, 0.1]]))


def test_matrices_are_scaled_by_their_units(tmp_path):
    matrix_files(tmp_path)
    loaded = read(write(tmp_path, MATRICES)).loaded
    np.testing.assert_array_equal(loaded.mass, [[2000, 0], [0, 1000]])
    np.testing.assert_array_equal(loaded.stiffness.toarray(), [[3000, -1000], [-1000, 1000]])
    np.testing.assert_array_equal(loaded.damping, [[0.3, 0], [0, 0.1]])
    assert loaded.gyroscopic is None


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        ('mass = "t"\n', "", "matrices.mass .*add mass ="),
        ('"k.mtx"', '"none.mtx"', "matrices.stiffness .*no file"),
        ('"k.mtx"', '"study.toml"', "neither a .mtx"),
        ('"k.mtx"', '"bad.mtx"', "cannot be read as a matrix"),
        ('"c.npz"', '"pickle.npz"', "cannot be read as a matrix"),
        ('"c.npz"', '"two.npz"', "holds 2 arrays"),
        ('"c.npz"', '"flat.npz"', "holds an array of shape"),
        ("[[2, 0], [0, 1]]", "[[2, 0], [0]]", "different lengths"),
        ("[[2, 0], [0, 1]]", "[[2, 0, 0], [0, 1, 0]]", "matrices.mass .*is 2 x 3"),
        ("[[2, 0], [0, 1]]", "[[2]]", "matrices.stiffness .*is 2 x 2; wanted 1 x 1"),
        ("[[2, 0], [0, 1]]", '[["2", 0], [0, 1]]', r"matrices.mass.*plain number"),
        ("[[2, 0], [0, 1]]", "[[1e300, 0], [0, 1]]", r"matrices.mass.*above 1e\+60"),
        ("[[2, 0], [0, 1]]", "[[nan, 0], [0, 1]]", r"finite"),
        ("[matrices]", '[matrices]\nfreedoms = ["a"]', "names 1 freedoms"),
        ("[matrices]", '[matrices]\nfreedoms = ["a", "a"]', "twice"),
    ],
)
def test_faulty_matrices_are_named(tmp_path, old, new, message):
    matrix_files(tmp_path)
    (tmp_path / "bad.mtx").write_text("not a matrix")
    np.savez(tmp_path / "two.npz", np.eye(2), np.eye(2))
    np.savez(tmp_path / "flat.npz", np.ones(4))
    np.savez(tmp_path / "pickle.npz", np.array([[object(), 1]], dtype=object))
    with pytest.raises(StudyError, match=message):
        read(write(tmp_path, MATRICES.replace(old, new, 1)))


def test_entries_are_found_in_the_text():
    text = 'a = 1\n[t]\n"b c" = [\n  1,\n  "x = [2]", # ]\n]\nd = """\ne = 1\n"""\n'
    text += "[[l]]\nf = 1\n[[l]]\ng.h = 2\n"
    found = line_numbers(text)
    assert found == {
        ("a",): 1, ("t",): 2, ("t", "b c"): 3, ("t", "d"): 7, ("l", 0): 10, ("l", 0, "f"): 11, ("l", 1): 12,
        ("l", 1, "g", "h"): 13,
    }  # fmt: skip
    assert find_line(("t", "b c", 1), found) == 3
    assert find_line(("l", 1, "nothing"), found) == 12
    assert find_line(("nothing",), found) is None


def test_the_schema_describes_every_table_and_forbids_others():
    schema = Study.model_json_schema()
    assert schema["additionalProperties"] is False
    assert {"points", "members", "units", "matrices", "impact"} <= set(schema["properties"])
    assert schema["$defs"]["Units"]["properties"]["length"]["default"] is None
