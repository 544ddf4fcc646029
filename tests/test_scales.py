"""Numbers as people read them: digits to match the uncertainty (GUM 7.2.6: two digits of u at most)."""

import pytest
from hypothesis import given
from hypothesis import strategies as st

from twlocate.scales import length_scale, length_text, time_scale, time_text, two_digits


@pytest.mark.parametrize(
    ("extent", "u", "value", "text"),
    [
        (118e3, 29.4, 73_512.3, "73.512 km"),
        (118e3, 167.0, 10_000.0, "10.00 km"),
        (1386.0, 0.62, 734.567, "734.57 m"),
        (1386.0, 6.2, 734.567, "734.6 m"),
        (0.06, 0.0007, 0.0496, "49.60 mm"),
        (100.0, 0.0, 3.0, "3.000 m"),
    ],
)
def test_lengths(extent, u, value, text):
    assert length_scale(extent, u)(value) == text


@pytest.mark.parametrize(
    ("extent", "u", "value", "text"),
    [
        (7.4e-3, 0.12e-6, 7.4123456e-3, "7.41235 ms"),
        (18.0, 2e-3, 18.0361, "18.0361 s"),
        (6e-10, 3e-12, 6.94e-10, "0.6940 ns"),
    ],
)
def test_times(extent, u, value, text):
    assert time_scale(extent, u)(value) == text


@given(st.floats(1e-3, 1e6), st.floats(1e-6, 1e5), st.floats(-1e6, 1e6))
def test_what_is_printed_is_within_a_tenth_of_u(extent, u, value):
    scale = length_scale(extent, u)
    if scale.decimals < 6:
        assert abs(float(scale.number(value)) * scale.size - value) <= 0.1 * u + 1e-9 * abs(value)


@pytest.mark.parametrize(
    ("value", "text"), [(0.0, "0"), (0.0523, "0.052"), (12.34, "12"), (1234.5, "1234"), (3e-7, "3e-07")]
)
def test_two_digits(value, text):
    assert two_digits(value) == text


@pytest.mark.parametrize(
    ("write", "value", "text"),
    [
        (length_text, 1.148, "1.1 m"),
        (length_text, 88.2, "88 m"),
        (length_text, 0.0523, "52 mm"),
        (length_text, 12_345.0, "12 km"),
        (time_text, 2e-3, "2.0 ms"),
        (time_text, 240e-9, "240 ns"),
        (time_text, 0.0, "0 ns"),
    ],
)
def test_small_values(write, value, text):
    assert write(value) == text
