"""The two date lines of a CFG and the time codes (IEEE C37.111-1991, -1999, -2013)."""

import re

from twlocate.records.moments import SECOND_NS, Moment, day_ns, resolution_ns, time_of_day_ns
from twlocate.records.repairs import LIKELY, SURE, RepairLog

DATE_AND_TIME = re.compile(
    r"\s*(\d{1,4})\s*[/.-]\s*(\d{1,2})\s*[/.-]\s*(\d{1,4})\s*[,;T ]\s*(\d{1,2}):(\d{1,2}):(\d{1,2})(?:[.,:](\d*))?\s*"
)
TIME_CODE = re.compile(r"\s*([+-]?)(\d{1,2})(?:h(\d{1,2}))?\s*", re.IGNORECASE)
CENTURY_PIVOT = 70
"""Two-digit years from 70 on belong to the twentieth century: the first edition is of 1991."""


def read_moment(text: str, where: str, month_first: bool, log: RepairLog) -> Moment | None:
    """Read a date line; None, with a repair, where it holds no time.

    Parameters
    ----------
    text
        The line, such as ``"02/03/2026,04:11:07.250000000"``.
    where
        What to call the line in a repair.
    month_first
        The edition writes mm/dd (1991) and not dd/mm.
    log
        Gets every departure from the form.
    """
    match = DATE_AND_TIME.fullmatch(text)
    day = _day_ns((int(match[1]), int(match[2]), int(match[3])), where, month_first, log) if match else None
    if match is None or day is None or int(match[4]) > 24 or int(match[5]) > 59 or int(match[6]) > 60:
        log.add(f"no date and time in {text.strip()[:40]!r}", where, "time unknown", SURE)
        return None
    fraction = match[7] or ""
    _check_fraction(fraction, where, log)
    if int(match[6]) == 60 or int(match[4]) == 24:
        log.add(f"time of day {match[4]}:{match[5]}:{match[6]}", where, "carried into the next minute or day", LIKELY)
    time = time_of_day_ns(int(match[4]), int(match[5]), int(match[6]), fraction)
    return Moment(day + time, resolution_ns(len(fraction)), len(fraction))


def _check_fraction(fraction: str, where: str, log: RepairLog) -> None:
    if len(fraction) not in (6, 9):
        log.add(f"{len(fraction)} digits of a second, not 6 or 9", where, "read as a decimal fraction", LIKELY)


def _day_ns(figures: tuple[int, int, int], where: str, month_first: bool, log: RepairLog) -> int | None:
    """Return midnight; the written order first, the other one where the calendar forbids it."""
    first, second, year = figures
    if first > 31:
        log.add("date starts with the year", where, "read as year, month, day", LIKELY)
        return _midnight(first, second, year)
    if year < 100:
        year = _full_year(year, where, month_first, log)
    month, day = (first, second) if month_first else (second, first)
    if month > 12 >= day:
        month, day = day, month
        order = "dd/mm" if month_first else "mm/dd"
        log.add(f"month {day} in the order of this edition", where, f"read as {order}", SURE)
    return _midnight(year, month, day)


def _full_year(year: int, where: str, month_first: bool, log: RepairLog) -> int:
    full = year + (1900 if year >= CENTURY_PIVOT else 2000)
    if not month_first:
        log.add("year of two digits", where, f"read as {full}", LIKELY)
    return full


def _midnight(year: int, month: int, day: int) -> int | None:
    try:
        return day_ns(year, month, day)
    except ValueError:
        return None


def read_time_code(text: str, where: str, log: RepairLog) -> int | None:
    """Return the offset from UTC in seconds of a time code such as ``-5h30``; None where not applicable (``x``)."""
    if text.strip().lower() in ("", "x"):
        return None
    match = TIME_CODE.fullmatch(text)
    if match is None or int(match[2]) > 14 or int(match[3] or 0) > 59:
        log.add(f"time code {text.strip()[:20]!r}", where, "offset from UTC unknown", SURE)
        return None
    seconds = int(match[2]) * 3600 + int(match[3] or 0) * 60
    return -seconds if match[1] == "-" else seconds


def utc_ns(moment: Moment, offset_s: int | None) -> int:
    """Return `moment`, written on a clock `offset_s` ahead of UTC, as UTC nanoseconds."""
    return moment.ns - (offset_s or 0) * SECOND_NS
