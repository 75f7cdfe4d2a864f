"""Whether anything grows in a system whose response came from some of its modes only."""

from __future__ import annotations

import numpy as np
import scipy.sparse as sparse

from vib.modes import find_modes
from vib.solve.damping import feeding_reach
from vib.solve.factor import negative_count
from vib.solve.growth import LIFT
from vib.solve.stability import takes_energy
from vib.system import System

ALL_MODES = 400  # freedoms up to which all eigenvalues are looked at
SLOWEST = 12  # that are looked at beyond, besides what can be proved


def judged(system: System) -> tuple[bool, tuple[str, ...]]:
    """False if something grows, as far as it is known, and a remark where it is not known.

    Told from the matrices where that is enough, else from eigenvalues; see `vib.solve.stability`.
    """
    if _passive(system):
        return True, ()
    modes = find_modes(system) if system.size <= ALL_MODES else find_modes(system, count=SLOWEST)
    if modes.stable and not modes.stability_known:
        return True, (
            "Forces can feed energy in: whether a motion beyond the slowest grows was not proved, and then "
            "there would be no steady state.",
        )
    return modes.stable, ()


def _passive(system: System) -> bool:
    if feeding_reach(system.damping_law):
        return False
    if system.unsymmetric and abs(system.stiffness - system.stiffness.T).max() > 0:
        return False
    diagonal = np.abs(np.asarray(system.stiffness.diagonal()))
    lift = sparse.diags_array(diagonal) if sparse.issparse(system.stiffness) else np.diag(diagonal)
    if negative_count(system.stiffness + LIFT * lift) != 0:
        return False
    return all(takes_energy(part) for part in (system.damping, system.gyroscopic) if part is not None)
