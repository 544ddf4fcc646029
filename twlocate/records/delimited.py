"""Delimited numbers, fast where the text is regular and forgiving where it is not."""

import warnings

import numpy as np
from numpy.typing import NDArray

from twlocate.arrays import FloatArray

BLOCK_CHARACTERS = 1 << 22
"""Text is parsed in blocks of about this size, cut at line ends."""


def line_blocks(data: bytes) -> list[bytes]:
    """Cut `data` into blocks that end at a line end."""
    blocks = []
    start = 0
    while start < len(data):
        stop = start + BLOCK_CHARACTERS
        end = data.find(b"\n", stop) + 1 if stop < len(data) else len(data)
        blocks.append(data[start : end or len(data)])
        start = end or len(data)
    return blocks


def regular_numbers(data: bytes, columns: int) -> NDArray[np.number] | None:
    """Return comma-delimited rows of `columns` whole numbers or decimals, or None where the text is not that regular.

    Rows whose numbers of fields differ but add up are the caller's to notice, by the row numbers.
    """
    flat = data.strip().replace(b"\n", b",")
    for dtype in (np.int64, np.float64):
        try:
            with warnings.catch_warnings():
                warnings.simplefilter("error")
                numbers = np.fromstring(flat, dtype=dtype, sep=",")
        except (ValueError, DeprecationWarning):
            continue
        return numbers.reshape(-1, columns) if numbers.size % columns == 0 else None
    return None


def forgiving_numbers(lines: list[str], columns: int, delimiter: str | None = ",") -> tuple[FloatArray, list[int]]:
    """Return rows of `columns` numbers, NaN where a field is blank or no number, and which lines had too few fields.

    Lines with too few fields are left out; surplus fields are ignored.
    """
    rows, short = [], []
    for index, line in enumerate(lines):
        fields = line.split(delimiter)
        if len(fields) < columns:
            short.append(index)
            continue
        rows.append([_number(field) for field in fields[:columns]])
    return np.array(rows, dtype=np.float64).reshape(-1, columns), short


def _number(field: str) -> float:
    try:
        return float(field)
    except ValueError:
        return np.nan
