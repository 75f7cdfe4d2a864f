"""Natural frequencies, ring-down and resonance screening of machine frames.

The public names are loaded when they are first used, so that importing the package costs nothing.
Results support, and do not replace, review by a licensed engineer under the local code.
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from vib.errors import VibError
    from vib.modes import Modes
    from vib.response.frequency import FrequencyResponse
    from vib.response.loads import Load
    from vib.response.over_speeds import run_up
    from vib.response.respond import Response
    from vib.response.ring import Ring
    from vib.response.run_up import RunUp
    from vib.response.simulate import simulate, simulate_to
    from vib.scatter.scatter import Scatter, scatter
    from vib.scatter.sweep import Sweep, sweep
    from vib.screening import Screening, screen
    from vib.severity import Severity, judge
    from vib.statespace import StateSpace
    from vib.study import Study, read
    from vib.system import System

__version__ = "0.1.0"
__all__ = [
    "FrequencyResponse",
    "Load",
    "Modes",
    "Response",
    "Ring",
    "RunUp",
    "Scatter",
    "Screening",
    "Severity",
    "StateSpace",
    "Study",
    "Sweep",
    "System",
    "VibError",
    "judge",
    "read",
    "run_up",
    "scatter",
    "screen",
    "simulate",
    "simulate_to",
    "sweep",
]

_HOME = {
    "FrequencyResponse": "vib.response.frequency",
    "Load": "vib.response.loads",
    "Modes": "vib.modes",
    "Response": "vib.response.respond",
    "Ring": "vib.response.ring",
    "RunUp": "vib.response.run_up",
    "Scatter": "vib.scatter.scatter",
    "Screening": "vib.screening",
    "Severity": "vib.severity",
    "StateSpace": "vib.statespace",
    "Study": "vib.study",
    "Sweep": "vib.scatter.sweep",
    "System": "vib.system",
    "VibError": "vib.errors",
    "judge": "vib.severity",
    "read": "vib.study",
    "run_up": "vib.response.over_speeds",
    "scatter": "vib.scatter.scatter",
    "screen": "vib.screening",
    "simulate": "vib.response.simulate",
    "simulate_to": "vib.response.simulate",
    "sweep": "vib.scatter.sweep",
}


def __getattr__(name: str) -> Any:
    if name in _HOME:
        return getattr(import_module(_HOME[name]), name)
    raise AttributeError(f"module 'vib' has no attribute {name!r}")


def __dir__() -> list[str]:
    return sorted([*__all__, "__version__"])
