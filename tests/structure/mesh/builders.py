"""Mesh files and studies about them, in a folder of the test."""

from pathlib import Path
from typing import Any

import meshio
import numpy as np

import vib
from tests.structure.cells.meshes import cube, square
from vib.study import Study
from vib.system import Anatomy, System

UNITS = '[units]\nlength = "m"\n'
STEEL = '[mesh.regions.all]\nmaterial = "structural steel"\n'


def block(kind="tetra10", counts=(6, 2, 2), size=(0.6, 0.1, 0.08)):
    """Nodes (m) and cells of a block."""
    nodes, cells = cube(kind, counts)
    return nodes * np.array(size), cells


def plate(kind="quad", across=8, size=(1.0, 1.0)):
    """Nodes (m) and cells of a plate in z = 0."""
    nodes, cells = square(kind, across)
    return nodes * np.array([*size, 1.0]), cells


def write(folder: Path, nodes: Any, cells: Any, name: str = "m.vtu", **more: Any) -> None:
    """A mesh file."""
    meshio.Mesh(nodes, cells, **more).write(folder / name)


def study_of(
    folder: Path, text: str, regions: str = STEEL, name: str = "m.vtu", more: str = "", length: str = "m"
) -> Study:
    """A study beside the mesh file; ``more`` entries of [mesh]."""
    file = folder / "study.toml"
    mesh = f'[mesh]\nfile = "{name}"\nlength = "{length}"\n{more}'
    file.write_text(UNITS + mesh + regions + text, encoding="utf-8")
    return vib.read(file)


def anatomy_of(system: System) -> Anatomy:
    """What the system of a structure has."""
    assert system.anatomy is not None
    return system.anatomy


def said_of(system: System) -> str:
    """All remarks in a row."""
    return " ".join(anatomy_of(system).remarks)
