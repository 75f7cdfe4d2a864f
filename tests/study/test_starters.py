"""Starter studies: each is complete, is read without faults, and runs."""

import pytest

import vib
from vib.errors import ModelError
from vib.screening import highest_needed_hz
from vib.study.starters import STARTERS, starter_text


@pytest.fixture(scope="module")
def starters(tmp_path_factory):
    """Each starter written to a file and read back."""
    folder = tmp_path_factory.mktemp("starters")
    found = {}
    for kind in STARTERS:
        path = folder / f"{kind}.toml"
        path.write_text(starter_text(kind), encoding="utf-8")
        found[kind] = vib.read(path)
    return found


@pytest.mark.parametrize("kind", STARTERS)
def test_a_starter_has_all_that_a_report_shows(starters, kind):
    study = starters[kind]
    assert study.excitations
    assert study.impact is not None


@pytest.mark.parametrize("kind", STARTERS)
def test_a_starter_begins_with_a_comment_and_explains_itself(kind):
    text = starter_text(kind)
    assert text.startswith("# ")
    assert text.count("#") >= 3


@pytest.mark.parametrize("kind", STARTERS)
def test_a_starter_runs(starters, kind):
    study = starters[kind]
    needed = highest_needed_hz(study.excitations, accuracy=study.accuracy)
    modes = study.system(up_to=needed).modes(up_to=needed)
    found = vib.screen(modes, study.excitations)
    assert found.covered or not modes.proportional  # dashpots: not every solver can count the modes
    assert modes.stable
    assert modes.rigid_body_count == 0
    assert len(found.rows) == modes.count * len(found.lines)


def test_an_unknown_kind_is_answered_with_the_nearest():
    with pytest.raises(ModelError, match=r'no starter is named "cantilevr" \(did you mean "cantilever"\?\)'):
        starter_text("cantilevr")
