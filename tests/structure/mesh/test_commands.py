"""Commands on studies with meshes: one message and exit status 2 for what is broken."""

import json

import numpy as np

from tests.structure.mesh.builders import STEEL, block, study_of, write
from vib.cli import run


def test_a_broken_mesh_is_one_line_and_status_2(tmp_path, capsys):
    (tmp_path / "m.vtu").write_text("nothing")
    study = study_of(tmp_path, "")
    assert run(["modes", str(study.file)]) == 2
    shown = capsys.readouterr()
    assert shown.out == ""
    assert shown.err.count("\n") == 1
    assert 'mesh.file: "m.vtu" cannot be read as a mesh' in shown.err


def test_check_lists_regions_and_modes_stops(tmp_path, capsys):
    nodes, cells = block("hexahedron", (4, 2, 2))
    write(tmp_path, nodes, [("hexahedron", cells)], cell_data={"part": [np.arange(len(cells)) % 2]})
    study = study_of(tmp_path, "", STEEL.replace("all", "0"))
    assert run(["check", str(study.file), "--json", "--quiet"]) == 0
    listed = json.loads(capsys.readouterr().out)["regions"]
    assert listed == [
        {"name": "0", "cells": {"hexahedron": 8}, "use": "structural steel"},
        {"name": "1", "cells": {"hexahedron": 8}, "use": None},
    ]
    assert run(["modes", str(study.file)]) == 2
    assert '"1" (8 hexahedron): not yet assigned' in capsys.readouterr().err


def test_check_and_modes_of_a_mesh_write_their_files(tmp_path, capsys):
    nodes, cells = block("hexahedron", (4, 2, 2))
    write(tmp_path, nodes, [("hexahedron", cells)])
    held = '[[supports]]\nat = "end"\nhold = "all"\n'
    study = study_of(tmp_path, "[points]\nend = {box = [[0, 0, 0], [0, 1, 1]]}\n" + held)
    out = tmp_path / "out"
    assert run(["check", str(study.file), "--out", str(out), "--quiet"]) == 0
    assert run(["modes", str(study.file), "--count", "2", "--out", str(out), "--quiet"]) == 0
    assert {"model.svg", "shapes.vtu", "shapes.npz", "mode_01.svg"} <= {path.name for path in out.iterdir()}
    assert "hexahedron" in capsys.readouterr().out
