"""JSON documents, CSV, and writing that is all or nothing."""

from __future__ import annotations

import csv
import json
import os

import numpy as np
import pytest

from vib.errors import VibError
from vib.show.documents import clean, modes_document, to_json
from vib.show.files import csv_bytes, write_files, write_new


def test_everything_becomes_plain_json():
    document = {
        "a": np.array([1.0, np.nan, np.inf]),
        "b": np.float64(2),
        "c": (np.int64(3), None),
        "4": 1 + 2j,
    }
    text = to_json(document)
    assert json.loads(text) == {
        "a": [1.0, None, None],
        "b": 2.0,
        "c": [3, None],
        "4": {"real": 1.0, "imag": 2.0},
    }
    assert clean(True) is True


def test_the_modes_document_keeps_every_digit(frame):
    document = json.loads(to_json(modes_document(frame.modes, "t")))
    assert [mode["frequency_hz"] for mode in document["modes"]] == list(frame.modes.frequencies_hz)
    first = document["modes"][0]
    assert set(first["effective_mass"]) == {"x_kg", "y_kg", "z_kg", "rx_kg_m2", "ry_kg_m2", "rz_kg_m2"}
    assert sum(first["strain_energy_share"].values()) == pytest.approx(1.0)
    assert sum(first["kinetic_energy_share"].values()) == pytest.approx(1.0)


def test_csv_is_flat_and_harmless_in_a_spreadsheet():
    rows = [{"a": {"b": 1.25, "c": None}, "name": "=cmd()"}, {"a": {"b": -2.0}, "name": 'x, "y"'}]
    read = list(csv.DictReader(csv_bytes(rows).decode().splitlines()))
    assert read[0] == {"a_b": "1.25", "a_c": "", "name": "'=cmd()"}
    assert read[1]["a_b"] == "-2.0"
    assert read[1]["name"] == 'x, "y"'


def test_files_are_written_whole_with_usual_rights(tmp_path):
    folder = tmp_path / "a" / "b"
    written = write_files(folder, {"one.txt": b"1", "two.txt": b"2"})
    assert [path.read_bytes() for path in written] == [b"1", b"2"]
    assert sorted(path.name for path in folder.iterdir()) == ["one.txt", "two.txt"]
    mask = os.umask(0)
    os.umask(mask)
    assert written[0].stat().st_mode & 0o777 == 0o666 & ~mask
    write_files(folder, {"one.txt": b"new"})
    assert (folder / "one.txt").read_bytes() == b"new"


def test_a_failure_in_the_middle_leaves_nothing(tmp_path, monkeypatch):
    import vib.show.files as files

    stage, calls = files._stage, []

    def full_disk(folder, content):
        calls.append(content)
        if len(calls) == 2:
            raise OSError(28, "No space left on device")
        return stage(folder, content)

    monkeypatch.setattr(files, "_stage", full_disk)
    with pytest.raises(VibError, match="No space left"):
        write_files(tmp_path / "a" / "b", {"one.txt": b"1", "two.txt": b"2"})
    assert not list(tmp_path.iterdir())


def test_an_interrupt_while_writing_leaves_nothing(tmp_path, monkeypatch):
    def interrupt(source, target):
        raise KeyboardInterrupt

    monkeypatch.setattr(os, "replace", interrupt)
    with pytest.raises(KeyboardInterrupt):
        write_files(tmp_path / "a", {"one.txt": b"1"})
    assert not list(tmp_path.iterdir())


def test_a_new_file_also_where_the_file_system_has_no_links(tmp_path, monkeypatch):
    def no_links(source, target):
        raise OSError(95, "Operation not supported")

    monkeypatch.setattr(os, "link", no_links)
    write_new(tmp_path / "new.txt", b"1")
    with pytest.raises(VibError, match="is there already"):
        write_new(tmp_path / "new.txt", b"2")
    assert (tmp_path / "new.txt").read_bytes() == b"1"
    assert [path.name for path in tmp_path.iterdir()] == ["new.txt"]


def test_a_new_file_in_no_folder_is_an_error(tmp_path):
    with pytest.raises(VibError, match="cannot be written"):
        write_new(tmp_path / "none" / "new.txt", b"1")
