"""The time column of a table: calendar times, numbers from the record's start, or numbers from 1970-01-01."""

import re
import warnings
from collections.abc import Sequence
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from twlocate.errors import RecordError
from twlocate.records.assembling import UNIT_NS, Times, epoch_unit_ns
from twlocate.records.moments import ISO_8601, NUMBER, SECOND_NS, SLASHED, exact_decimal, iso_moment, resolution_ns
from twlocate.records.repairs import GUESS, LIKELY, SURE, RepairLog

SECONDS_OF_UTC = "2026-03-02T04:11:07.Z"
"""The form of a UTC time, before the digits of a second."""
PICO = 1000
"""Of a nanosecond: relative times are read to the picosecond."""


def time_pattern(first: str) -> re.Pattern[str]:
    """Return what every time must look like when the first looks like this."""
    return next((pattern for pattern in (ISO_8601, SLASHED) if pattern.fullmatch(first)), NUMBER)


def parse_times(texts: Sequence[str], unit: str, log: RepairLog) -> Times:
    """Return the times of the rows.

    Parameters
    ----------
    texts
        One a row, all of the pattern of the first.
    unit
        Of times that are numbers; empty where not stated.
    log
        Gets the unit that had to be assumed.

    Raises
    ------
    RecordError
        A row holds no existing day or time, or the unit is unknown.
    """
    if SLASHED.fullmatch(texts[0]):
        texts, doubt = _iso_texts(texts, log)
        return replace(_calendar_times(texts), doubt=doubt)
    if ISO_8601.fullmatch(texts[0]):
        return _calendar_times(texts)
    if unit and unit not in UNIT_NS:
        raise RecordError(f"the time column is in {unit!r}; known are {' '.join(UNIT_NS)}")
    if not NUMBER.fullmatch(texts[0]):
        raise RecordError(f"row 1: the time {texts[0]!r} is neither a number nor an ISO 8601 time")
    return _counted_times(texts, UNIT_NS.get(unit), log)


def _iso_texts(texts: Sequence[str], log: RepairLog) -> tuple[list[str], str]:
    """Return dates such as 02/03/2026 in ISO 8601, and a doubt where nothing tells the day from the month."""
    parts = [match.groups() for text in texts if (match := SLASHED.fullmatch(text))]
    first, second = (max(int(part[index]) for part in parts) for index in (0, 1))
    month_first = second > 12
    order = "mm/dd" if month_first else "dd/mm"
    sure = first > 12 or month_first
    log.add("dates not in ISO 8601", "time column", f"read as {order}", SURE if sure else GUESS)
    month, day = (0, 1) if month_first else (1, 0)
    iso = [f"{part[2]}-{part[month]:0>2}-{part[day]:0>2} {part[3]:0>2}{part[4]}" for part in parts]
    return iso, "" if sure else "day and month could be exchanged"


def _calendar_times(texts: Sequence[str]) -> Times:
    ns = _plain_utc_ns(texts)
    if ns is not None:
        return Times((ns - ns[0]) * 1e-9, int(ns[0]), resolution_ns(max(map(len, texts)) - len(SECONDS_OF_UTC)))
    try:
        moments = [iso_moment(text) for text in texts]
    except ValueError as error:
        raise RecordError(f"time column: {error}") from None
    ns = np.array([moment.ns for moment in moments], dtype=np.int64)
    digits = max(moment.digits for moment in moments)
    return Times((ns - ns[0]) * 1e-9, int(ns[0]), resolution_ns(digits), moments[0].offset_s is not None)


def _plain_utc_ns(texts: Sequence[str]) -> NDArray[np.int64] | None:
    """Return times all written like ``2026-03-02T04:11:07.25Z`` in one go; None where one is not."""
    if not all(text.endswith("Z") and len(text) >= len(SECONDS_OF_UTC) - 1 for text in texts):
        return None
    try:
        with warnings.catch_warnings():
            warnings.simplefilter("error")  # a second zone inside a text is warned of and dropped
            moments = np.array([text[:-1] for text in texts], dtype="datetime64[ns]")
    except (ValueError, UserWarning):
        return None
    return None if np.isnat(moments).any() else moments.astype(np.int64)


def _counted_times(texts: Sequence[str], unit_ns: int | None, log: RepairLog) -> Times:
    """Return times given as numbers: from the record's start, or from 1970-01-01 when that large."""
    epoch_unit = epoch_unit_ns(float(texts[0]), unit_ns)
    if unit_ns is None and epoch_unit is None:
        log.add("no unit of time", "time column", "seconds", LIKELY)
    scale = epoch_unit or unit_ns or SECOND_NS
    picos = [exact_decimal(text, scale * PICO) for text in texts]
    zero = picos[0] if epoch_unit else 0
    seconds = np.array([value - zero for value in picos], dtype=np.float64) * 1e-12
    tick_ns = scale * 10.0 ** -max(_decimals(text) for text in texts)
    return Times(seconds, zero // PICO if epoch_unit else None, tick_ns)


def _decimals(text: str) -> int:
    """Return the place of the last digit of a decimal number: 3 for 0.125 and for 125e-3."""
    mantissa, _, exponent = text.lower().partition("e")
    return len(mantissa.partition(".")[2]) - int(exponent or 0)
