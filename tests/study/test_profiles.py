"""Cross sections from their dimensions: closed forms, published tables, laws, and refusals."""

import math
import re
from dataclasses import fields
from typing import Any

import pytest
from hypothesis import example, given, settings
from hypothesis import strategies as st

from vib.errors import ModelError
from vib.study import profiles
from vib.study.profiles import (
    angle,
    channel,
    circular_hollow,
    flat,
    general,
    i_section,
    rectangle,
    rectangular_hollow,
    round_bar,
    square_hollow,
    t_section,
    tapered_channel,
)

RADIUS = {"root_radius", "toe_radius", "outer_radius", "inner_radius"}
# One of each shape, by name, with the arguments it takes; metres.
SHAPES: dict[str, tuple[Any, dict[str, float]]] = {
    "rectangle": (rectangle, {"width": 0.04, "height": 0.06}),
    "flat": (flat, {"width": 0.06, "thickness": 0.01}),
    "round_bar": (round_bar, {"diameter": 0.03}),
    "circular_hollow": (circular_hollow, {"diameter": 0.1, "thickness": 0.005}),
    "square_hollow": (
        square_hollow,
        {"width": 0.1, "thickness": 0.006, "outer_radius": 0.009, "inner_radius": 0.006},
    ),
    "rectangular_hollow": (
        rectangular_hollow,
        {"width": 0.06, "height": 0.12, "thickness": 0.005, "outer_radius": 0.0075, "inner_radius": 0.005},
    ),
    "i_section": (
        i_section,
        {
            "height": 0.2,
            "width": 0.1,
            "web_thickness": 0.0056,
            "flange_thickness": 0.0085,
            "root_radius": 0.012,
        },
    ),
    "t_section": (
        t_section,
        {
            "height": 0.1,
            "width": 0.1,
            "web_thickness": 0.011,
            "flange_thickness": 0.011,
            "root_radius": 0.011,
        },
    ),
    "channel": (
        channel,
        {
            "height": 0.2,
            "width": 0.08,
            "web_thickness": 0.006,
            "flange_thickness": 0.011,
            "root_radius": 0.013,
        },
    ),
    "tapered_channel": (
        tapered_channel,
        {
            "height": 0.12,
            "width": 0.055,
            "web_thickness": 0.007,
            "flange_thickness": 0.009,
            "flange_slope": 0.08,
            "root_radius": 0.009,
            "toe_radius": 0.0045,
        },
    ),
    "angle": (
        angle,
        {"height": 0.1, "width": 0.05, "thickness": 0.008, "root_radius": 0.008, "toe_radius": 0.004},
    ),
}


def build(name, scale=1.0, **changes):
    shape, dimensions = SHAPES[name]
    sized = {key: value if key == "flange_slope" else value * scale for key, value in dimensions.items()}
    return shape(**{**sized, **changes})


# --- closed forms and tables ---


@pytest.mark.parametrize(
    ("ratio", "beta", "printed"),
    [
        (1.0, 0.140577015, 0.1406),
        (1.5, 0.1957607089, 0.196),
        (2.0, 0.2286816771, 0.229),
        (3.0, 0.263316931, 0.263),
        (5.0, 0.2913167542, 0.291),
        (10.0, 0.3123250375, 0.312),
    ],
)
def test_torsion_of_rectangles(ratio, beta, printed):
    """J = beta a b^3; the long digits are the Fourier series in 40 digits.

    Source: Timoshenko & Goodier, Theory of Elasticity, torsion of rectangular bars (printed, from memory).
    """
    lying, upright = rectangle(0.02 * ratio, 0.02), rectangle(0.02, 0.02 * ratio)
    assert lying.torsion_constant == pytest.approx(beta * ratio * 0.02**4, rel=1e-8)
    assert upright.torsion_constant == pytest.approx(lying.torsion_constant, rel=1e-14)
    assert beta == pytest.approx(printed, abs=6e-4)


def test_shear_areas_of_solid_sections():
    """Energy values: 5/6 (rectangle) and 9/10 (round bar).

    Source: Timoshenko, Strength of Materials, Part I, strain energy of shear (from memory). The values of
    Cowper (1966) for nu = 0.3, 0.8497 and 0.8864, lie 2 % and 1.5 % apart from them.
    """
    assert rectangle(0.03, 0.07).shear_area_y == pytest.approx(5 / 6 * 0.03 * 0.07, rel=1e-14)
    assert rectangle(0.03, 0.07).shear_area_z == pytest.approx(5 / 6 * 0.03 * 0.07, rel=1e-14)
    bar = round_bar(0.05)
    assert bar.shear_area_y / bar.area == pytest.approx(0.9, rel=1e-14)
    assert bar.shear_area_y / bar.area == pytest.approx(0.8863636364, rel=0.016)


def test_shear_area_of_a_thin_tube():
    """Half of the area in the limit (Timoshenko, as above); Cowper (1966) gives 0.5306 for nu = 0.3."""
    tube = circular_hollow(1.0, 1e-4)
    assert tube.shear_area_y / tube.area == pytest.approx(0.5, rel=1e-6)


def test_shear_area_of_a_thin_square_tube():
    """The flow by hand, side 1: Q = t s / 2 in the flanges, t (1/4 + (1/4 - z^2) / 2) in the webs."""
    tube = square_hollow(1.0, 1e-5)
    flanges = 4 * (1 / 4) * (1 / 2) ** 3 / 3
    webs = 2 * ((1 / 4) ** 2 + 2 * (1 / 4) * (1 / 8) * (2 / 3) + (1 / 8) ** 2 * (8 / 15))
    expected = (2 / 3) ** 2 / (flanges + webs)
    assert tube.shear_area_z / 1e-5 == pytest.approx(expected, rel=1e-4)
    assert tube.shear_area_y == pytest.approx(tube.shear_area_z, rel=1e-12)


def test_round_sections_in_closed_form():
    """CHS 114.3 x 5, pi (D^2 - d^2) / 4 and so on in long digits; a round bar by pi d^4 / 64."""
    tube, bar = circular_hollow(0.1143, 0.005), round_bar(0.02)
    assert tube.area * 1e4 == pytest.approx(17.168804, rel=1e-7)
    assert tube.second_moment_y * 1e8 == pytest.approx(256.9202, rel=1e-6)
    assert tube.torsion_constant * 1e8 == pytest.approx(513.84041, rel=1e-8)
    assert bar.second_moment_z == pytest.approx(math.pi * 0.02**4 / 64, rel=1e-13)
    assert bar.polar_moment == pytest.approx(bar.torsion_constant, rel=1e-13)


def test_flat_lies_down():
    lying = flat(0.06, 0.01)
    assert lying.second_moment_y == pytest.approx(0.06 * 0.01**3 / 12, rel=1e-13)
    assert lying.second_moment_z == pytest.approx(0.01 * 0.06**3 / 12, rel=1e-13)


def test_roundings_add_what_they_should():
    """Each root rounding adds (1 - pi/4) r^2, each corner of a hollow takes as much away."""
    missing = (1 - math.pi / 4) * 0.01**2
    sharp, rounded = i_section(0.2, 0.1, 0.006, 0.01), i_section(0.2, 0.1, 0.006, 0.01, 0.01)
    assert rounded.area - sharp.area == pytest.approx(4 * missing, rel=1e-10)
    sharp, rounded = square_hollow(0.1, 0.01), square_hollow(0.1, 0.01, 0.01, 0.0)
    assert sharp.area - rounded.area == pytest.approx(4 * missing, rel=1e-10)


def test_tapered_channel_thickness():
    """The same thickness nearer to the free edge: 8 % over 5 mm more of it on both flanges."""
    half, other = build("tapered_channel"), build("tapered_channel", thickness_at=0.0225)
    assert other.area - half.area == pytest.approx(2 * 0.08 * 0.005 * (0.055 - 0.007), rel=0.02)


def test_general_section():
    plain = general(1e-3, 2e-6, 3e-6, 4e-7)
    assert plain.polar_moment == pytest.approx(5e-6, rel=1e-14)
    assert plain.shear_area_y == math.inf == plain.shear_area_z
    assert plain.remarks == tuple(
        f"shear_area_{axis} was not given: no shear flexibility along {axis}" for axis in "yz"
    )
    assert general(1e-3, 2e-6, 3e-6, 4e-7, 5e-4, 6e-4).remarks == ()


# --- laws ---


@pytest.mark.parametrize("name", SHAPES)
@settings(deadline=None)
@given(scale=st.floats(1e-3, 1e3))
def test_scaling(name, scale):
    """Lengths times s: areas times s^2, fourth powers times s^4, angles unchanged."""
    one, other = build(name), build(name, scale)
    powers = {"area": 2, "shear_area_y": 2, "shear_area_z": 2, "principal_angle": 0}
    powers |= {"second_moment_y": 4, "second_moment_z": 4, "torsion_constant": 4}
    for key, power in powers.items():
        assert getattr(other, key) == pytest.approx(getattr(one, key) * scale**power, rel=1e-9), key
    assert other.remarks == one.remarks


@pytest.mark.parametrize("name", SHAPES)
def test_bounds(name):
    """J is at most Iy + Iz (equal for circles), shear areas less than A; the outline is closed."""
    profile = build(name)
    assert 0 < profile.torsion_constant <= profile.polar_moment * (1 + 1e-12)
    assert 0 < profile.shear_area_y < profile.area
    assert 0 < profile.shear_area_z < profile.area
    for line in profile.outline:
        assert line[0] == line[-1]
    assert len(profile.outline) == (2 if "hollow" in name else 1)
    low = [min(point[k] for point in profile.outline[0]) for k in (0, 1)]
    assert profile.centroid == pytest.approx([-low[0], -low[1]], abs=1e-15)
    assert all(getattr(profile, field.name) is not None for field in fields(profile))


@settings(deadline=None)
@given(width=st.floats(0.01, 1), height=st.floats(0.01, 1), share=st.floats(0.01, 0.49))
def test_sharp_hollow_is_outer_minus_inner(width, height, share):
    t = share * min(width, height)
    hollow, outer = rectangular_hollow(width, height, t), rectangle(width, height)
    inner = rectangle(width - 2 * t, height - 2 * t)
    for key in ("area", "second_moment_y", "second_moment_z"):
        difference = getattr(outer, key) - getattr(inner, key)
        # The difference of two like numbers loses digits; so its round-off is that of the outer one.
        assert getattr(hollow, key) == pytest.approx(difference, abs=1e-12 * getattr(outer, key))
    assert hollow.remarks[0] == "the corners are taken as sharp: no outer_radius was given"


@settings(deadline=None)
@given(a=st.floats(0.03, 0.3), b=st.floats(0.03, 0.3), share=st.floats(0.05, 0.3))
def test_invariants_of_turned_axes(a, b, share):
    """Iy + Iz and Iy Iz - Iyz^2 do not depend on the axes; the drawn ones from two rectangles by hand."""
    t = share * min(a, b)
    parts = [(t, a, t / 2, a / 2), (b - t, t, (b + t) / 2, t / 2)]
    area = sum(w * h for w, h, _, _ in parts)
    y = sum(w * h * cy for w, h, cy, _ in parts) / area
    z = sum(w * h * cz for w, h, _, cz in parts) / area
    about_y = sum(w * h**3 / 12 + w * h * (cz - z) ** 2 for w, h, _, cz in parts)
    about_z = sum(h * w**3 / 12 + w * h * (cy - y) ** 2 for w, h, cy, _ in parts)
    mixed = sum(w * h * (cy - y) * (cz - z) for w, h, cy, cz in parts)
    found = angle(a, b, t)
    assert found.area == pytest.approx(area, rel=1e-12)
    assert found.centroid == pytest.approx((y, z), rel=1e-12)
    assert found.polar_moment == pytest.approx(about_y + about_z, rel=1e-11)
    product = found.second_moment_y * found.second_moment_z
    assert product == pytest.approx(about_y * about_z - mixed**2, rel=1e-9)
    # Turned back, the principal moments give the mixed one: its sign says which way the axes were turned.
    back = 0.5 * (found.second_moment_z - found.second_moment_y) * math.sin(2 * found.principal_angle)
    assert back == pytest.approx(mixed, rel=1e-9)


def test_equal_angle_turns_by_45_degrees():
    """EN 10056-1, L 80x80x8: Iu 115 and Iv 29.9 cm^4, centroid 2.26 cm (printed, from memory)."""
    profile = angle(0.08, 0.08, 0.008, 0.01, 0.005)
    assert profile.principal_angle == pytest.approx(math.pi / 4, rel=1e-14)
    assert profile.second_moment_y * 1e8 == pytest.approx(115, rel=0.005)
    assert profile.second_moment_z * 1e8 == pytest.approx(29.9, rel=0.005)
    assert profile.centroid == pytest.approx((0.0226, 0.0226), rel=0.005)


def test_unequal_angle_turns_as_printed():
    """EN 10056-1, L 100x50x8: tan of the turn 0.258, Iu 123 and Iv 12.8 cm^4 (printed, from memory)."""
    profile = build("angle")
    assert math.tan(profile.principal_angle) == pytest.approx(0.258, abs=1e-3)
    assert profile.second_moment_y * 1e8 == pytest.approx(123, rel=0.005)
    assert profile.second_moment_z * 1e8 == pytest.approx(12.8, rel=0.005)


def test_symmetric_shapes_are_not_turned():
    for name in set(SHAPES) - {"angle"}:
        assert build(name).principal_angle == 0.0, name


def test_thin_channel_shear_centre():
    """3 b^2 t_f / (h t_w + 6 b t_f) behind the web's middle line: Timoshenko, thin walls (from memory)."""
    h, b, t = 0.2, 0.08, 1e-5
    profile = channel(h + t, b + t / 2, t, t)
    from_web_back = profile.centroid[0] + profile.shear_centre[0]
    assert t / 2 - from_web_back == pytest.approx(3 * b**2 / (h + 6 * b), rel=1e-4)


def test_remarks_on_what_is_off():
    for name in ("t_section", "channel", "tapered_channel", "angle"):
        assert "shear centre" in build(name).remarks[0]
    assert build("i_section").remarks == ()
    for stocky in (i_section(0.1, 0.1, 0.02, 0.03), angle(0.06, 0.06, 0.02), square_hollow(0.1, 0.03, 0.0)):
        assert stocky.remarks[-1].startswith("thick walls")
    assert "torsion constant may be" in i_section(0.1, 0.08, 0.02, 0.005).remarks[0]
    assert "torsion constant may be" in t_section(0.1, 0.08, 0.005, 0.005, 0.011).remarks[1]


@settings(deadline=None)
@example(height=0.5, slender=0.21875, web=0.125, flange=0.4375)  # the junction's fit is negative there
@example(height=0.5, slender=0.8125, web=0.875, flange=0.375)  # hardly an I any more: nearly a solid block
@given(
    height=st.floats(0.05, 0.5), slender=st.floats(0.2, 2.0),
    web=st.floats(0.02, 0.9), flange=st.floats(0.02, 0.45),
)  # fmt: skip
def test_odd_proportions_stay_physical(height, slender, web, flange):
    """However stocky: 0 < J <= Iy + Iz, and no shear area above 5/6 of the area."""
    width = height * slender
    for shape in (i_section, t_section, channel):
        profile = shape(height, width, web * width, flange * height)
        assert 0 < profile.torsion_constant <= profile.polar_moment
        most = max(profile.shear_area_y, profile.shear_area_z)
        assert min(profile.shear_area_y, profile.shear_area_z) > 0
        assert most <= profile.area * (5 / 6 + 1e-12)
        if most >= profile.area * (5 / 6 - 1e-12):
            assert any(remark.startswith("thick walls") for remark in profile.remarks)


# --- refusals ---

LENGTHS = [(name, key) for name, (_, given_) in SHAPES.items() for key in given_]


@pytest.mark.parametrize(("name", "key"), LENGTHS)
@pytest.mark.parametrize("value", [-0.001, math.nan, math.inf])
def test_impossible_dimensions_are_named(name, key, value):
    with pytest.raises(ModelError, match=f"^{key}: must "):
        build(name, **{key: value})


@pytest.mark.parametrize(("name", "key"), [(n, k) for n, k in LENGTHS if k not in RADIUS | {"flange_slope"}])
def test_zero_is_refused_where_it_leaves_nothing(name, key):
    with pytest.raises(ModelError, match=f"^{key}: must be above zero, got 0"):
        build(name, **{key: 0.0})


@pytest.mark.parametrize(
    ("name", "changes", "message"),
    [
        (
            "circular_hollow",
            {"thickness": 0.05},
            "thickness: 50 mm must be less than half of diameter, 100 mm",
        ),
        ("square_hollow", {"thickness": 0.05}, "thickness: 50 mm must be less than half of width, 100 mm"),
        (
            "rectangular_hollow",
            {"thickness": 0.03},
            "thickness: 30 mm must be less than half of width, 60 mm",
        ),
        ("i_section", {"flange_thickness": 0.1}, "flange_thickness: 100 mm must be less than half of height"),
        ("i_section", {"web_thickness": 0.1}, "web_thickness: 100 mm must be less than width, 100 mm; give"),
        ("t_section", {"flange_thickness": 0.1}, "flange_thickness: 100 mm must be less than height"),
        ("channel", {"web_thickness": 0.09}, "web_thickness: 90 mm must be less than width, 80 mm"),
        ("angle", {"thickness": 0.06}, "thickness: 60 mm must be less than width, 50 mm"),
        ("tapered_channel", {"flange_slope": 0.4}, "flange_slope: 0.4 leaves no thickness at the free edge"),
        ("square_hollow", {"outer_radius": 0.06, "inner_radius": 0.04}, "outer_radius: 60 mm does not fit"),
        ("square_hollow", {"outer_radius": 0.045, "inner_radius": 0.045}, "inner_radius: 45 mm does not fit"),
        (
            "square_hollow",
            {"outer_radius": 0.04, "inner_radius": 0.0},
            "outer_radius: 40 mm leaves no wall at",
        ),
        (
            "i_section",
            {"root_radius": 0.05},
            "root_radius: 50 mm does not fit on a side of 47.2 mm; give a small",
        ),
        ("angle", {"toe_radius": 0.009}, "toe_radius: 9 mm does not fit on a side of 8 mm"),
    ],
)
def test_dimensions_that_do_not_fit(name, changes, message):
    with pytest.raises(ModelError, match=re.escape(message)):
        build(name, **changes)


@pytest.mark.parametrize("key", ["area", "second_moment_y", "torsion_constant", "shear_area_y"])
def test_general_refuses_what_is_not_above_zero(key):
    good = {"area": 1e-3, "second_moment_y": 1e-6, "second_moment_z": 1e-6, "torsion_constant": 1e-7}
    with pytest.raises(ModelError, match=f"^{key}: must be above zero, got -1"):
        general(**{**good, key: -1.0})


def test_public_names():
    assert set(SHAPES) | {"Profile", "general"} == set(profiles.__all__)
    assert all(hasattr(profiles, name) for name in profiles.__all__)
