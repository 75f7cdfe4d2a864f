"""No failure of a linear algebra library and no TypeError of Python gets out of a public call."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pytest
import scipy.sparse.linalg as sparse_linalg

import vib
from vib.errors import AccuracyError, ModelError, StudyError, in_own_words


@pytest.mark.parametrize(
    "fault",
    [
        np.linalg.LinAlgError("SVD did not converge"),
        sparse_linalg.ArpackError(1, {1: "could not be reordered by LAPACK routine dtrsen"}),
        sparse_linalg.ArpackNoConvergence("No convergence", np.zeros(0), np.zeros((0, 0))),
        RuntimeError("Factor is exactly singular"),
        MemoryError(),
    ],
)
def test_failures_of_libraries_are_told_in_our_words(fault):
    def public():
        raise fault

    with pytest.raises(AccuracyError) as met:
        in_own_words(public)()
    assert met.value.__cause__ is fault
    assert not any(word in str(met.value) for word in ("dtrsen", "SVD", "ARPACK", "Factor is"))


def test_faults_of_ours_and_of_the_caller_pass_as_they_are():
    for fault in (
        ModelError("as it is"),
        TypeError("as it is"),
        RuntimeError("as it is"),
        KeyError("as it is"),
    ):

        def public(fault=fault):
            raise fault

        with pytest.raises(type(fault), match="as it is"):
            in_own_words(public)()


@pytest.mark.parametrize("limit", [[1], (3.0,), {}, np.ones(1), True, 2j, -1.0, 0, float("nan"), object()])
def test_a_highest_frequency_that_is_none(limit):
    system = vib.System(mass=[[1.0]], stiffness=[[4.0]])
    with pytest.raises(ModelError, match="up_to: a positive frequency"):
        system.modes(up_to=limit)


@pytest.mark.parametrize("count", [[1], "3", {}, True, 2.5, 0, -1, float("inf"), float("nan"), 1j])
def test_a_number_of_modes_that_is_none(count):
    system = vib.System(mass=[[1.0]], stiffness=[[4.0]])
    with pytest.raises(ModelError, match="count: a whole number"):
        system.modes(count=count)


def test_numbers_of_other_kinds_are_taken():
    system: Any = vib.System(mass=np.eye(3), stiffness=np.diag([1.0, 4.0, 9.0]))
    assert system.modes(count=np.int64(2)).count == system.modes(count=2.0).count == 2
    assert system.modes(up_to=np.float32(0.2)).count == 1


@pytest.mark.parametrize("path", [5, None, 2.5, ["study.toml"], b"study.toml"])
def test_a_path_that_is_none(path):
    with pytest.raises(StudyError, match="the path of a study file is needed"):
        vib.read(path)


DISC = """
[materials.steel]
youngs_modulus = "210 GPa"
poissons_ratio = 0.3
density = "7850 kg/m^3"
[sections.post]
shape = "rectangle"
width = "60 mm"
height = "60 mm"
[points]
A = ["0 m", "0 m", "0 m"]
B = ["0 m", "0 m", "1 m"]
[[members]]
section = "post"
material = "steel"
runs = [["A", "B"]]
[[supports]]
at = ["A"]
hold = "all"
[[bodies]]
name = "wheel"
mass = "40 kg"
inertia = ["0.8 kg m^2", "0.5 kg m^2", "0.5 kg m^2"]
carried_by = ["B"]
spin = {axis = [1, 0, 0], speed = "1500 rpm", inertia = "INERTIA kg m^2"}
"""


def test_what_spins_is_part_of_its_body(tmp_path: Path) -> None:
    file = tmp_path / "wheel.toml"
    file.write_text(DISC.replace("INERTIA", "0.8"))
    assert vib.read(file).bodies[0].spin is not None
    file.write_text(DISC.replace("INERTIA", "0.9"))
    with pytest.raises(StudyError, match=r"spin.inertia 0.9 kg m\^2 is more than the 0.8 kg m\^2"):
        vib.read(file)
