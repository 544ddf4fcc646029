"""Delimited numbers, fast where the text is regular and forgiving where it is not."""

import re
import warnings
from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from twlocate.arrays import FloatArray

INTEGERS = np.iinfo(np.int64)
"""Numbers beyond come out of numpy's parser as the largest, not as a fault."""
BLANK_FIELD = re.compile(rb",[ \t]+(?=,)")
"""Blanks between commas: numpy's parser takes such a field for 0, or for the number before it."""


def regular_numbers(data: bytes, columns: int) -> NDArray[np.number] | None:
    """Return comma-delimited rows of `columns` numbers, or None where the text is not that regular.

    Whole numbers come as int64, decimals as float64 with NaN for a blank field between commas. Rows whose numbers
    of fields differ but add up are the caller's to notice, by the row numbers.
    """
    flat = data.strip().replace(b"\r\n", b"\n").replace(b"\r", b"\n").replace(b"\n", b",")
    if b" " in flat or b"\t" in flat:
        flat = BLANK_FIELD.sub(b",", flat)
    numbers = _parsed(flat, np.int64)
    if numbers is None or (numbers.size and not INTEGERS.min < numbers.min() <= numbers.max() < INTEGERS.max):
        blanks = flat.replace(b",,", b",nan,").replace(b",,", b",nan,")
        numbers = _parsed(blanks, np.float64)
    if numbers is None or numbers.size % columns:
        return None
    return numbers.reshape(-1, columns)


def _parsed(flat: bytes, dtype: type[np.number]) -> NDArray[np.number] | None:
    """Return comma-delimited numbers, or None where one is not of this type."""
    try:
        with warnings.catch_warnings():
            warnings.simplefilter("error")  # older releases of numpy warn where newer ones raise
            return np.fromstring(flat, dtype=dtype, sep=",")
    except (ValueError, DeprecationWarning):
        return None


def forgiving_numbers(
    lines: Sequence[str], columns: int, delimiter: str | None = ","
) -> tuple[FloatArray, NDArray[np.bool_]]:
    """Return rows of `columns` numbers, and which lines had too few fields.

    Parameters
    ----------
    lines
        One a row; surplus fields are passed over.
    columns
        Number of fields wanted.
    delimiter
        Between fields; None for white space.

    Returns
    -------
    numbers
        Shape (lines, columns), NaN where a field is absent, blank or no number.
    short
        Shape (lines,).
    """
    fields = [line.split(delimiter, columns) for line in lines]
    rows = [[_number(field) for field in row[:columns]] + [np.nan] * (columns - len(row)) for row in fields]
    short = np.array([len(row) < columns for row in fields], dtype=np.bool_)
    return np.array(rows, dtype=np.float64).reshape(-1, columns), short


def _number(field: str) -> float:
    try:
        return float(field)
    except ValueError:
        return np.nan
