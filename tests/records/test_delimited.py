"""Delimited numbers against Python's own reading of each field."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from twlocate.records.delimited import forgiving_numbers, regular_numbers

ODD = ["", " ", "\t", "  7 ", "+3", "007", "1e3", "x", "1 2", "--1", "nan", str(10**20), str(-(10**20))]
INTEGERS = st.integers(-(10**9), 10**9).map(str)
DOUBLES = st.floats(allow_nan=False, allow_infinity=False).map(repr)
FIELDS = st.one_of(INTEGERS, DOUBLES, st.sampled_from(ODD))


def by_hand(field: str) -> float:
    try:
        return float(field)
    except ValueError:
        return np.nan


@given(
    rows=st.lists(st.lists(FIELDS, min_size=3, max_size=3), min_size=1, max_size=6),
    line_end=st.sampled_from(["\n", "\r\n", "\r"]),
)  # fmt: skip
def test_the_fast_way_agrees_with_python_or_declines(rows, line_end):
    """Whatever the fields: where the fast way returns numbers they are those of each field, blank ones NaN."""
    text = line_end.join(",".join(row) for row in rows)
    numbers = regular_numbers(text.encode(), 3)
    if numbers is not None and numbers.shape == (len(rows), 3):
        np.testing.assert_array_equal(numbers, [[by_hand(field) for field in row] for row in rows])


@given(rows=st.lists(st.lists(FIELDS, max_size=6), min_size=1, max_size=6))
def test_the_forgiving_way_agrees_with_python(rows):
    numbers, short = forgiving_numbers([",".join(row) for row in rows], 3)
    split = [",".join(row).split(",") for row in rows]
    expected = [[by_hand(field) for field in [*row, "", "", ""][:3]] for row in split]
    np.testing.assert_array_equal(numbers, expected)
    assert short.tolist() == [len(row) < 3 for row in split]


@pytest.mark.parametrize(
    ("text", "numbers"),
    [
        (b"1,2\n3,4\n", [[1, 2], [3, 4]]),
        (b"1,2\r\n3,\r\n", None),
        (b" 1,  2\n 3,  4", [[1, 2], [3, 4]]),
        (b"1, \n3,4", [[1, np.nan], [3, 4]]),
        (b"1,,\n3,4", None),
        (b"1.5,2\n3,4", [[1.5, 2], [3, 4]]),
        (b"1,2,3\n4,5,6", [[1, 2], [3, 4], [5, 6]]),
        (b"1,2\n3", None),
        (b"a,b", None),
    ],
)
def test_by_hand(text, numbers):
    read = regular_numbers(text, 2)
    if numbers is None:
        assert read is None
    else:
        np.testing.assert_array_equal(read, numbers)
