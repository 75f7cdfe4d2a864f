"""Studies from plain dictionaries in SI units, and eigenvalues of small systems by LAPACK."""

from collections.abc import Callable
from typing import Any

import numpy as np
import pytest
import scipy.linalg

from vib.structure.assembly import assemble
from vib.structure.build import to_system
from vib.structure.layout import read_layout
from vib.structure.remarks import assumptions
from vib.study import Study
from vib.system import System
from vib.units import KINDS

_SI = {kind: entry.si for kind, entry in KINDS.items() if kind != "ratio"}


def _describe(**tables: Any) -> Study:
    return Study.model_validate(tables, context={"units": _SI})


def _cut(study: Study, count: int) -> System:
    layout = read_layout(study)
    return to_system(assemble(layout, np.full(len(layout.stretches.labels), count)), assumptions(layout))


def _frequencies(system: System, components: str | None = None) -> np.ndarray:
    """Natural frequencies in Hz, ascending; only of freedoms along these components if any are named."""
    wanted = components.split() if components else None
    keep = [i for i, freedom in enumerate(system.freedoms) if not wanted or freedom.component in wanted]
    stiffness, mass = (matrix.toarray()[np.ix_(keep, keep)] for matrix in (system.stiffness, system.mass))
    values = scipy.linalg.eigh(stiffness, mass, eigvals_only=True)
    found: np.ndarray = np.sqrt(np.maximum(values, 0.0)) / (2 * np.pi)
    return found


@pytest.fixture(scope="session")
def describe() -> Callable[..., Study]:
    """A study from its tables, bare numbers in SI."""
    return _describe


@pytest.fixture(scope="session")
def cut() -> Callable[[Study, int], System]:
    """The system of a study with every member in so many pieces."""
    return _cut


@pytest.fixture(scope="session")
def frequencies() -> Callable[..., np.ndarray]:
    """Natural frequencies in Hz by LAPACK, dense."""
    return _frequencies
