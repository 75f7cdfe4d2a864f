"""Text and numbers to SI and back."""

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from vib.errors import UnitError
from vib.units import KINDS, factor, parse, shown, shown_unit, text


def test_one_cycle_per_second_is_sixty_rpm_and_two_pi_radians():
    assert parse("60 rpm", "speed") == 1.0
    assert parse("1 Hz", "speed") == 1.0
    assert parse("1 Hz", "frequency") == 1.0
    assert parse("60 rpm", "frequency") == 1.0
    assert parse(f"{2 * math.pi!r} rad/s", "frequency") == 1.0
    assert parse("360 deg/s", "frequency") == pytest.approx(1.0, rel=1e-15)
    assert parse("60 r/min", "speed") == parse("60 rev/min", "speed") == 1.0


@pytest.mark.parametrize(
    ("entry", "kind", "wanted"),
    [
        ("210 GPa", "stress", 210e9),
        ("6 mm", "length", 0.006),
        # exact definitions: NIST SP 811 (2008), B.8: 1 in = 0.0254 m, 1 lb = 0.45359237 kg, g = 9.80665 m/s2
        ("1 in", "length", 0.0254),
        ("1 lb", "mass", 0.45359237),
        ("1 lbf", "force", 0.45359237 * 9.80665),
        ("12 kip/inch", "stiffness", 12e3 * 0.45359237 * 9.80665 / 0.0254),
        ("12 lbf s/in", "damping", 12 * 0.45359237 * 9.80665 / 0.0254),
        ("1 ksi", "stress", 1e3 * 0.45359237 * 9.80665 / 0.0254**2),
        ("5 kN·m", "moment", 5000.0),
        ("3 mm²", "area", 3e-6),
        ("2 N m/deg", "rotational_stiffness", 360 / math.pi),
        ("2 N m", "rotational_stiffness", 2.0),
        ("2 %", "ratio", 0.02),
        (".5e1 Hz", "frequency", 5.0),
        ("-5 mm", "length", -0.005),
    ],
)
def test_text_becomes_si(entry, kind, wanted):
    assert parse(entry, kind) == pytest.approx(wanted, rel=1e-14)


def test_a_bare_number_takes_the_declared_unit_and_text_wins():
    assert parse(6, "length", unit="mm") == pytest.approx(0.006, rel=1e-15)
    assert parse("6", "length", unit="mm") == pytest.approx(0.006, rel=1e-15)
    assert parse("6 cm", "length", unit="mm") == pytest.approx(0.06, rel=1e-15)
    assert parse(0.02, "ratio") == 0.02


@pytest.mark.parametrize(
    ("entry", "kind", "message"),
    [
        (6, "length", r"6 has no unit, and \[units\] names none for length"),
        ("6 kg", "length", "'kg' is not a unit of length"),
        ("5 lb", "force", "A mass is not a force: .*lbf"),
        ("5 lb/in", "stiffness", "A mass is not a force"),
        ("5 lbf", "mass", "A force is not a mass: .*'lb'"),
        ("5 kgf", "mass", "A force is not a mass"),
        ("20 degC", "length", "offset temperature unit"),
        ("20 degF", "stress", "offset temperature unit"),
        ("2 furlonx", "length", "unknown unit 'furlonx'"),
        ("2 mpa", "stress", r"did you mean 'MPa'\?"),
        ("2 Nm", "moment", r"did you mean 'N m'\?"),
        ("2 Ns/m", "damping", r"did you mean 'N s/m'\?"),
        ("2 m**99999999", "length", "is not a unit"),
        ("2 m/0", "length", "is not a unit"),
        ("2 m)(", "length", "is not a unit"),
        ("2*3 m", "length", "is not a unit"),
        ("nan m", "length", "expected a length"),
        ("inf m", "length", "expected a length"),
        (math.nan, "length", "finite"),
        (math.inf, "length", "finite"),
        ("1e999 m", "length", "finite"),
        (10**400, "length", "too large"),
        ("1e300 kg", "mass", "check its unit"),
        ("9e307 km", "length", "check its unit"),
        (True, "length", "expected a length"),
        (None, "length", "expected a length"),
        ([1], "length", "expected a length"),
        ("", "length", "expected a length"),
        ("2 mm", "ratio", "plain number or a percentage"),
        ("__import__('os')", "length", "expected a length"),
    ],
)
def test_what_is_not_the_quantity_is_named(entry, kind, message):
    with pytest.raises(UnitError, match=message):
        parse(entry, kind, unit="mm" if isinstance(entry, float | bool) or entry == 10**400 else None)


@pytest.mark.parametrize("kind", [kind for kind in KINDS if kind != "ratio"])
@pytest.mark.parametrize("system", ["si", "us"])
def test_every_kind_can_be_shown_and_read_back(kind, system):
    value = 1.2345678901234567
    unit = shown_unit(kind, system)
    # three roundings: the conversion factor, the division, the multiplication
    assert parse(f"{shown(value, kind, system)!r} {unit}", kind) == pytest.approx(value, rel=1e-15)
    assert text(value, kind, system).endswith(unit)


@given(st.floats(-1e30, 1e30, allow_subnormal=False), st.sampled_from(["mm", "in", "ft", "km"]))
def test_conversion_is_linear(number, unit):
    assert parse(number, "length", unit=unit) == number * factor(unit, "length")


@given(st.text(max_size=40), st.sampled_from(sorted(KINDS)))
def test_any_text_is_a_number_or_a_unit_error(entry, kind):
    message = ""
    try:
        value = parse(entry, kind)
    except UnitError as error:
        value, message = 0.0, str(error)
    assert math.isfinite(value)
    assert "\n" not in message
