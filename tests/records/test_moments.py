"""Exact times, against Python's own calendar and fractions and numpy's datetime64."""

import datetime
from fractions import Fraction

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from twlocate.records.moments import day_ns, exact_decimal, iso_moment, resolution_ns

EPOCH = datetime.datetime(1970, 1, 1)


@given(st.datetimes(datetime.datetime(1900, 1, 1), datetime.datetime(2200, 1, 1)), st.integers(0, 999))
def test_iso_to_the_nanosecond(moment, nanos):
    text = f"{moment:%Y-%m-%dT%H:%M:%S}.{moment.microsecond:06d}{nanos:03d}Z"
    microseconds = (moment - EPOCH) // datetime.timedelta(microseconds=1)
    assert iso_moment(text).ns == microseconds * 1000 + nanos
    assert iso_moment(text).ns == int(np.datetime64(text[:-1], "ns").astype(np.int64))


@pytest.mark.parametrize(
    ("zone", "offset_s"),
    [("", None), ("Z", 0), ("z", 0), (" UTC", 0), ("+01:00", 3600), ("-0530", -19800), ("+02", 7200)],
)
def test_zones(zone, offset_s):
    moment = iso_moment(f"2026-03-02 04:11:07.25{zone}")
    assert moment.offset_s == offset_s
    assert moment.ns == 1772424667_250000000 - (offset_s or 0) * 10**9
    assert (moment.digits, moment.resolution_ns) == (2, 10_000_000)


@pytest.mark.parametrize("text", ["", "2026-13-02", "2026-02-30T00:00:00Z", "02/03/2026", "2026-03-02T25:00:00", "now"])
def test_what_is_no_time(text):
    with pytest.raises(ValueError, match=r"."):
        iso_moment(text)


@given(st.decimals(allow_nan=False, allow_infinity=False, min_value=-(10**12), max_value=10**12, places=15))
def test_decimals_are_never_floats(number):
    exact = Fraction(number) * 10**12
    assert abs(exact_decimal(f"{number:f}", 10**12) - exact) <= Fraction(1, 2)


@pytest.mark.parametrize(
    ("text", "value"),
    [("1.5", 1500), ("-1.5e-3", -2), ("1e3", 10**6), (".5", 500), ("7.", 7000), ("0.0004", 0), ("0.0005", 1)],
)
def test_decimals_by_hand(text, value):
    assert exact_decimal(text, 1000) in (value, value + 1 if value < 0 else value)


@pytest.mark.parametrize("text", ["", ".", "-", "1,5", "1e", "0x10", "nan", "inf", "1 2"])
def test_what_is_no_decimal(text):
    with pytest.raises(ValueError, match="is not a decimal number"):
        exact_decimal(text, 1)


def test_days_and_resolutions():
    assert day_ns(1970, 1, 1) == 0
    assert day_ns(2000, 3, 1) == 11017 * 86400 * 10**9
    assert [resolution_ns(digits) for digits in (0, 3, 6, 9, 12)] == [10**9, 10**6, 1000, 1, 1]
