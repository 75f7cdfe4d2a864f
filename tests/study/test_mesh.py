"""The tables [mesh], [mesh.regions.NAME] and points that are found in a mesh."""

import pytest
from pydantic import ValidationError

from vib.study import Study
from vib.study.mesh import Finder

UNITS = {"units": {"length": "mm"}}
REGION = {"material": "structural steel"}


def study(points=None, **mesh):
    tables = {"mesh": {"file": "m.vtu", "length": "mm", "regions": {"all": REGION}, **mesh}}
    return Study.model_validate({**tables, "points": points or {}}, context=UNITS)


def test_lengths_have_units():
    """Bare numbers of points in the unit of [units], coordinates of the file in that of [mesh]."""
    found = study({"A": {"nearest": [1000, 0, "2 m"]}, "B": [500, 0, 0]}, length="inch", join_within=2)
    assert found.mesh is not None
    assert found.mesh.metres == pytest.approx(0.0254)
    assert found.mesh.join_within == pytest.approx(0.002)
    point = found.points["A"]
    assert isinstance(point, Finder)
    assert point.nearest == pytest.approx((1.0, 0.0, 2.0))
    assert not point.several
    assert found.points["B"] == (0.5, 0.0, 0.0)


def test_boxes_and_sets_are_several():
    found = study({"A": {"box": [[0, 0, 0], [1, 1, 1]]}, "B": {"set": "sole"}})
    assert all(isinstance(point, Finder) and point.several for point in found.points.values())


@pytest.mark.parametrize(
    ("region", "said"),
    [
        ({"use": "ignore", "material": "x"}, "leaves nothing to say about material"),
        ({"thickness": 5}, "needs a material"),
        ({**REGION, "thickness": 5, "section": "s"}, "not both"),
        ({**REGION, "offset": 5}, "offset is for shells"),
        ({**REGION, "up": "z"}, "up are for lines"),
        ({**REGION, "thickness": 0}, "must be greater than 0"),
    ],
)
def test_regions_that_make_no_sense(region, said):
    with pytest.raises(ValidationError, match=said):
        study(regions={"a": region})


def test_a_length_that_is_none():
    with pytest.raises(ValidationError, match="length"):
        study(length="kg")


@pytest.mark.parametrize("point", [{}, {"node": 1, "set": "a"}])
def test_one_way_to_find_a_point(point):
    with pytest.raises(ValidationError, match="needs exactly one of nearest, node, box, set"):
        study({"A": point})


def test_the_length_may_be_the_one_that_the_study_declares():
    tables = {"mesh": {"file": "m.vtu", "regions": {"all": REGION}}}
    mesh = Study.model_validate(tables, context={"units": {"length": "mm"}}).mesh
    assert mesh is not None
    assert mesh.metres == 1e-3
    with pytest.raises(ValidationError, match="is missing: the unit of the coordinates"):
        Study.model_validate(tables)
