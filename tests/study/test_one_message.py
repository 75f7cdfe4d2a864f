"""One slip in a study file gives one message: nothing that only follows from it is reported as well."""

import pytest

from tests.study.test_faults import GOOD
from vib.errors import StudyError
from vib.study import read

RECTANGLE = 'shape = "rectangle"'

# what is replaced, by what, the entry that alone must be named, a part of the message
CASES = [
    ('length = "mm"', 'length = "10 mm"', "units.length", "is not a unit"),
    ('length = "mm"', "length = 3", "units.length", "expected text"),
    ("[points]\nA = [0, 0, 0]\nB = [0, 0, 900]", "[[points]]\nA = [0, 0, 0]", "points", "expected a table"),
    ("[materials.steel]", "[[materials.steel]]", "materials.steel", "expected a table"),
    ('runs = [["A", "B"]]', 'runs = ["A", "B"]', "members[0].runs", "a list of runs"),
    (
        "ratio = 0.01",
        'rayleigh = [["1 Hz", 0.1], ["2 Hz", 0.1], ["3 Hz", 0.1]]',
        "damping.rayleigh",
        "a list of 2, got 3",
    ),
    (
        'carried_by = "B"',
        'carried_by = "B"\ninertia = ["1 kg m^2", "1 kg m^2", "1 kg m^2", "1 kg m^2"]',
        "bodies[0].inertia",
        "a list of 3, got 4",
    ),
    (RECTANGLE, 'shape = "rectangel"', "sections.leg", 'did you mean "rectangle"'),
    (RECTANGLE, 'shape = "Rectangle"', "sections.leg", 'did you mean "rectangle"'),
    (RECTANGLE, 'shape = "blob"', "sections.leg", "rectangle, flat"),
    ('speed = "1480 rpm"', 'speed = "1480 rpm"\norders = []', "excitations[0].orders", "at least 1"),
    ('speed = "1480 rpm"', 'speed = "1480 rpm"\norders = [1e300]', "excitations[0]", "larger than any order"),
    ('impulse = "12 N s"', 'impulse = "12 N s"\nwatch = ["B", "B"]', "impact.watch", "stands there 2 times"),
    ("[impact]", '[[loads]]\nat = "B"\nconstant = "1 N"\n[impact]', "loads[0].along", "is missing"),
]


@pytest.mark.parametrize(("old", "new", "entry", "message"), CASES)
def test_one_slip_gives_one_message(tmp_path, old, new, entry, message):
    assert GOOD.count(old) >= 1, "the case replaces nothing"
    file = tmp_path / "study.toml"
    file.write_text(GOOD.replace(old, new, 1))
    with pytest.raises(StudyError) as caught:
        read(file)
    (fault,) = caught.value.faults
    assert fault.entry == entry
    assert message in fault.message
