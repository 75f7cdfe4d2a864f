"""The error bar of a frequency covers the true error of beams with closed forms, however coarse they are cut.

The beams are those of cases.json (see there for the sources); the accuracy asked for ranges over two decades.
"""

import numpy as np
import pytest

from tests.references.beams import BENDING, ENDS, beam_text, hz, rod_speeds, rod_text, solved, timoshenko_text
from tests.references.common import ENTRIES, MODEL_GAP, picked


def true_errors(modes, components, expected):
    """Signed true errors and error bars (Hz) of the modes in these components."""
    found = picked(modes, components)[: len(expected)]
    assert len(found) == len(expected)
    return modes.frequencies_hz[found] - np.array(expected), modes.errors_hz[found]


@pytest.mark.parametrize("accuracy", [0.1, 0.02, 0.003])
@pytest.mark.parametrize("ends", ["CF", "PP", "FF", "CS"])
def test_bending(ends, accuracy):
    expected = np.array(hz(ENTRIES[f"BEAM-{ends}"]["expected"]["b"]))
    text = beam_text({"A": 0, "B": 1}, {"A": ENDS[ends[0]], "B": ENDS[ends[1]]}, accuracy=accuracy)
    errors, bars = true_errors(solved(text, expected[-1]), BENDING, expected)
    assert (np.abs(errors) <= bars + MODEL_GAP * expected).all()
    assert (bars <= accuracy * expected).all()


@pytest.mark.parametrize("accuracy", [0.1, 0.02, 0.005])
@pytest.mark.parametrize("name", ["TIM-PP-5", "TIM-CF-5"])
def test_thick_beams(name, accuracy):
    text, expected = timoshenko_text(ENTRIES[name], accuracy)
    errors, bars = true_errors(solved(text, expected[-1]), BENDING, expected)
    assert (np.abs(errors) <= bars).all()
    assert (bars <= accuracy * np.array(expected)).all()


@pytest.mark.parametrize("accuracy", [0.1, 0.02, 0.005])
@pytest.mark.parametrize("component", ["x", "rx"])
def test_rods(component, accuracy):
    """Axial and torsional waves of a rod fixed at one end; consistent mass makes every frequency too high."""
    roots = ENTRIES["ROD-1"]["expected"]["fixed_free"][:3]
    expected = np.array(roots) * rod_speeds()[component] / (2 * np.pi)
    text = rod_text(component, [component], [], accuracy=accuracy)
    errors, bars = true_errors(solved(text, expected[-1]), (component,), expected)
    assert (errors > 0).all()
    assert (errors <= bars).all()
