"""How far the absolute time of a COMTRADE record may be trusted: the time-quality fields of C37.111-2013."""

import math

from twlocate.records.record import Clock

QUALITY_BOUND_S = {
    "1": 1e-9, "2": 1e-8, "3": 1e-7, "4": 1e-6, "5": 1e-5, "6": 1e-4, "7": 1e-3, "8": 1e-2, "9": 1e-1,
    "A": 1.0, "B": 10.0,
}  # fmt: skip
"""Bound on the error against UTC by time-quality code (IEEE Std 1344-1995, the table of clock quality)."""


def quality_u_s(code: str) -> float:
    """Return the standard uncertainty that a time-quality code states.

    The code bounds the error by ±bound and says no more; the error is taken as equally probable anywhere
    inside, whose standard deviation is bound/√3 (JCGM 100:2008, GUM, 4.3.7).
    """
    return QUALITY_BOUND_S[code] / math.sqrt(3.0)


def stated_clock(
    quality: str | None, leap_second: str | None, offset_s: int | None, resolution_s: float, doubts: list[str]
) -> Clock:
    """Return the clock that the time-quality fields state.

    Parameters
    ----------
    quality
        Time-quality code, one hexadecimal digit; None where the file has none.
    leap_second
        Leap-second indicator: 0 none, 1 added, 2 taken away, 3 unknown; None where the file has none.
    offset_s
        Offset from UTC of the clock the file is stamped by; None where not stated.
    resolution_s
        Size of the last digit of the start; a note tells when it is coarser than the clock, and it is for whoever
        uses the start to count it.
    doubts
        Whatever else makes the absolute time unusable, one sentence each.
    """
    u_s, usable, notes = _quality(quality)
    if u_s is not None and resolution_s > u_s:
        notes.append(f"the start is given to {resolution_s:g} s, coarser than the clock")
    if leap_second in ("1", "2"):
        notes.append("a leap second falls inside the record: a second may be counted twice or not at all")
    if leap_second == "3":
        notes.append("the source cannot tell of leap seconds")
    if offset_s is None:
        notes.append("offset from UTC not stated: stamps taken as UTC")
    usable = usable and not doubts and leap_second not in ("1", "2")
    return Clock(u_s, usable, tuple(notes + doubts), offset_s)


def _quality(code: str | None) -> tuple[float | None, bool, list[str]]:
    """Return the standard uncertainty, whether the clock is usable, and notes."""
    if code is None:
        return None, True, ["accuracy not stated in the file"]
    if code == "0":
        return None, True, ["locked to its source (time quality 0); no accuracy stated"]
    if code == "F":
        return None, False, ["the recorder reports a clock fault (time quality F)"]
    if code not in QUALITY_BOUND_S:
        return None, False, [f"time quality {code!r} is not one of the standard's"]
    return quality_u_s(code), True, [f"time quality {code}: within {QUALITY_BOUND_S[code]:g} s of UTC"]
