"""Dates and decimal numbers read exactly: integers of nanoseconds, never through a float."""

import re
from dataclasses import dataclass
from datetime import date

SECOND_NS = 1_000_000_000
DAY_NS = 86_400 * SECOND_NS
UNIX_EPOCH_DAY = date(1970, 1, 1).toordinal()

DECIMAL = re.compile(r"([+-]?)(\d*)(?:\.(\d*))?(?:[eE]([+-]?\d{1,3}))?")

NUMBER = re.compile(r"[+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d{1,3})?")

ISO_8601 = re.compile(
    r"(\d{4})-(\d\d)-(\d\d)(?:[T ](\d\d):(\d\d)(?::(\d\d)(?:[.,](\d+))?)?)?\s*(Z|UTC|[+-]\d\d(?::?\d\d)?)?",
    re.IGNORECASE,
)


SLASHED = re.compile(r"(\d{1,2})[/.](\d{1,2})[/.](\d{4})[ T]+(\d\d?)(:\d\d(?::\d\d(?:[.,]\d+)?)?)")
"""A date as spreadsheets write it, its day and month in either order."""


@dataclass(frozen=True)
class Moment:
    """A calendar time as integer nanoseconds since 1970-01-01 on the clock it was written by."""

    ns: int
    resolution_ns: int
    digits: int = 0
    """How many digits of a second were written."""
    offset_s: int | None = None
    """Offset of that clock from UTC, where written; `ns` is UTC already when it is."""


def day_ns(year: int, month: int, day: int) -> int:
    """Return midnight of a calendar day in nanoseconds since 1970-01-01; ValueError where there is no such day."""
    return (date(year, month, day).toordinal() - UNIX_EPOCH_DAY) * DAY_NS


def time_of_day_ns(hour: int, minute: int, second: int, fraction: str) -> int:
    """Return a time of day in nanoseconds; digits beyond the ninth are dropped."""
    return ((hour * 60 + minute) * 60 + second) * SECOND_NS + int(fraction[:9].ljust(9, "0"))


def resolution_ns(digits: int) -> int:
    """Return the size in nanoseconds of the last of so many digits of a second."""
    return int(10 ** (9 - min(digits, 9)))


def iso_moment(text: str) -> Moment:
    """Read an ISO 8601 date and time, to the nanosecond.

    Raises
    ------
    ValueError
        `text` is not of that form, or no such day or time exists.
    """
    match = ISO_8601.fullmatch(text.strip())
    if match is None:
        raise ValueError(f"{text.strip()!r} is not an ISO 8601 time such as 2026-03-02T04:11:07.25Z")
    year, month, day, hour, minute, second, fraction, zone = match.groups()
    if int(hour or 0) > 24 or int(minute or 0) > 59 or int(second or 0) > 60:
        raise ValueError(f"{text.strip()!r} is not a time of day")
    offset = zone_offset_s(zone)
    local = day_ns(int(year), int(month), int(day)) + time_of_day_ns(
        int(hour or 0), int(minute or 0), int(second or 0), fraction or ""
    )
    digits = len(fraction or "")
    return Moment(local - (offset or 0) * SECOND_NS, resolution_ns(digits), digits, offset)


def zone_offset_s(zone: str | None) -> int | None:
    """Return the offset from UTC in seconds of an ISO 8601 zone; None where there is none."""
    if not zone:
        return None
    if zone.upper() in ("Z", "UTC"):
        return 0
    figures = zone[1:].replace(":", "").ljust(4, "0")
    seconds = int(figures[:2]) * 3600 + int(figures[2:]) * 60
    return -seconds if zone[0] == "-" else seconds


def exact_decimal(text: str, scale: int) -> int:
    """Return a decimal number times `scale` as an integer, rounded half up, without going through a float.

    Raises
    ------
    ValueError
        `text` is not a decimal number.
    """
    match = DECIMAL.fullmatch(text.strip())
    if match is None or not (match[2] or match[3]):
        raise ValueError(f"{text.strip()!r} is not a decimal number")
    sign, whole, fraction, exponent = match[1], match[2], match[3] or "", int(match[4] or 0)
    shift = exponent - len(fraction)
    scaled = int((whole + fraction) or "0") * scale
    result = scaled * int(10**shift) if shift >= 0 else (2 * scaled + 10**-shift) // (2 * 10**-shift)
    return -result if sign == "-" else result
