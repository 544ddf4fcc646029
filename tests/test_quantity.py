"""Quantities with an uncertainty, read from text. Conversions: SI Brochure and NIST SP 811 (exact factors)."""

import pytest
from hypothesis import given
from hypothesis import strategies as st

from twlocate.quantity import Quantity, parse_quantity, unit_scale


@pytest.mark.parametrize(
    ("text", "unit", "value", "u"),
    [
        ("118.4 km ± 60 m", "m", 118_400.0, 60.0),
        ("118.4 km +/- 60 m", "m", 118_400.0, 60.0),
        ("294.6 m/µs ± 0.5 m/µs", "m/s", 294.6e6, 0.5e6),
        ("294.6 m/us ± 0.5 m/us", "m/s", 294.6e6, 0.5e6),
        ("294.6 ± 0.5 m/us", "m/s", 294.6e6, 0.5e6),
        ("1180 m/s ± 2 %", "m/s", 1180.0, 23.6),
        ("± 0.1 µs", "s", 0.0, 1e-7),
        ("-0.4 µs ± 20 ns", "s", -4e-7, 2e-8),
        ("385 ohm", "ohm", 385.0, 0.0),
        ("1 mi", "m", 1609.344, 0.0),  # exact, NIST SP 811
        ("1 ft", "m", 0.3048, 0.0),  # exact, NIST SP 811
        ("14.5 psi", "Pa", 99_973.98, 0.0),  # 6894.757 Pa a psi, NIST SP 811
        ("0.67 c", "m/s", 0.67 * 299_792_458.0, 0.0),
        ("20 degC ± 1 degC", "K", 293.15, 1.0),  # a difference of a degree is a kelvin
        ("1e3 m", "m", 1000.0, 0.0),
    ],
)
def test_reads_value_and_uncertainty_in_si(text, unit, value, u):
    found = parse_quantity(text, unit)
    assert found.value == pytest.approx(value, rel=1e-6)
    assert found.u == pytest.approx(u, rel=1e-9)


@pytest.mark.parametrize(
    ("text", "unit", "words"),
    [
        ("118.4", "m", "'118.4' has no unit"),
        ("5 kg", "m", "'5 kg' cannot be read in 'm'; check the unit 'kg'"),
        ("118,4 km", "m", "check the unit ',4 km'"),
        ("3 m ± 2 s", "m", "check the unit 's'"),
        ("3 m ± -2 m", "m", "negative uncertainty"),
        ("3 m ± 1 m ± 1 m", "m", "more than one ±"),
        ("5 ± 3", "s", "has no unit"),
        ("", "m", "not a number with a unit"),
        ("long", "m", "not a number with a unit"),
        ("1e999 m", "m", "not a finite number"),
    ],
)
def test_says_what_is_wrong(text, unit, words):
    with pytest.raises(ValueError, match=words.replace("(", r"\(")):
        parse_quantity(text, unit)


@given(st.floats(-1e9, 1e9), st.floats(0, 1e6))
def test_scaling_the_unit_scales_value_and_uncertainty(value, u):
    in_km = parse_quantity(f"{value!r} km ± {u!r} km", "m")
    in_m = parse_quantity(f"{value!r} m ± {u!r} m", "m")
    assert in_km.value == pytest.approx(1000 * in_m.value)
    assert in_km.u == pytest.approx(1000 * in_m.u)


def test_unit_scale():
    assert unit_scale("kV", "V") == pytest.approx(1000)
    assert unit_scale("bar", "Pa") == pytest.approx(1e5)
    with pytest.raises(ValueError, match="'kV' cannot be read in 'A'"):
        unit_scale("kV", "A")


def test_a_quantity_without_uncertainty_is_exact():
    assert Quantity(3.0) == Quantity(3.0, 0.0)
