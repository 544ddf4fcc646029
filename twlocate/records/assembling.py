"""From columns of readings, times and a few settings to a record: what formats without a clock of their own share."""

from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from twlocate.arrays import FloatArray
from twlocate.errors import RecordError
from twlocate.quantity import parse_quantity
from twlocate.records.moments import NUMBER, SECOND_NS, iso_moment
from twlocate.records.record import Channel, Clock, Record, Stretch
from twlocate.records.repairs import LIKELY, SURE, RepairLog
from twlocate.records.spacing import counted, stretches_by_stamps

UNIT_NS = {"s": 10**9, "sec": 10**9, "ms": 10**6, "us": 10**3, "µs": 10**3, "μs": 10**3, "ns": 1, "min": 60 * 10**9}
EPOCH_S = 10**8
"""Times from here on (1973) count from 1970-01-01 and not from the record's start."""
EPOCH_UNITS = ((10**17, 1), (10**14, 10**3), (10**11, 10**6), (EPOCH_S, SECOND_NS))
"""Smallest number of each unit that counts from 1970-01-01, and the unit in nanoseconds: told by size alone."""
MAX_RATE_HZ = 1e12
NO_OFFSET = "offset from UTC not stated: times taken as UTC"


@dataclass(frozen=True)
class Times:
    """Time of each sample: seconds from `zero_ns`, which is UTC, or from the record's start where that is None."""

    seconds: FloatArray
    zero_ns: int | None
    tick_ns: float
    offset_stated: bool = True
    doubt: str = ""
    """What makes the absolute time doubtful, if anything."""


def epoch_unit_ns(size: float, unit_ns: int | None) -> int | None:
    """Return the nanoseconds a time counts in when it counts from 1970-01-01; None when it is relative.

    Parameters
    ----------
    size
        The first time, as written.
    unit_ns
        Its unit in nanoseconds; None where not stated.
    """
    if unit_ns is not None:
        return unit_ns if abs(size) * unit_ns >= EPOCH_S * SECOND_NS else None
    return next((unit for least, unit in EPOCH_UNITS if abs(size) >= least), None)


def assemble(
    path: Path,
    format_name: str,
    channels: tuple[Channel, ...],
    times: Times | None,
    settings: Mapping[str, str],
    log: RepairLog,
) -> Record:
    """Return the record of channels of equal length.

    Parameters
    ----------
    path, format_name
        Where it comes from.
    channels
        All of the same number of samples.
    times
        Time of each sample; None where the rate rules.
    settings
        ``rate``, ``start``, ``clock``, ``station`` as text, any of them absent.
    log
        The repairs so far; gets the counts of missing samples and contradictions.

    Raises
    ------
    RecordError
        There is no channel, nothing gives the samples a time, or a setting cannot be read.
    """
    if not channels or not channels[0].samples.size:
        raise RecordError("there is no column of readings")
    for channel in channels:
        if channel.missing:
            log.add(
                f"{counted(channel.missing, 'sample')} missing", f"channel {channel.name!r}", "left out (NaN)", SURE
            )
    stretches, doubts = _stretches(times, _rate_hz(settings), channels[0].samples.size, log)
    start_ns, resolution, notes = _start(settings, times, log)
    return Record(
        path=path, format=format_name, channels=channels, stretches=stretches, station=settings.get("station", ""),
        start_ns=start_ns, resolution_ns=resolution, clock=_clock(settings, start_ns, notes, doubts, log),
        repairs=log.repairs,
    )  # fmt: skip


def note_missing(channels: tuple[Channel, ...], log: RepairLog) -> None:
    """Write down how many samples each channel lacks."""
    for channel in channels:
        if missing := channel.missing:
            log.add(f"{counted(missing, 'sample')} missing", f"channel {channel.name!r}", "left out (NaN)", SURE)


def _rate_hz(settings: Mapping[str, str]) -> float | None:
    text = settings.get("rate")
    if text is None:
        return None
    try:
        rate = float(text) if NUMBER.fullmatch(text) else parse_quantity(text, "Hz").value
    except ValueError as error:
        raise RecordError(f"rate {error}") from None
    if not 0.0 < rate <= MAX_RATE_HZ:
        raise RecordError(f"rate {text!r} is no sampling rate; it lies above 0 and up to {MAX_RATE_HZ:g} Hz")
    return rate


def _stretches(
    times: Times | None, rate_hz: float | None, count: int, log: RepairLog
) -> tuple[tuple[Stretch, ...], list[str]]:
    if rate_hz is not None and (times is None or count == 1):
        return (Stretch(0, count, 0.0 if times is None else float(times.seconds[0]), rate_hz),), []
    if times is None:
        raise RecordError("nothing is called time and no setting such as 'rate: 500 Hz' gives the sampling rate")
    stretches, doubts = stretches_by_stamps(times.seconds, times.tick_ns * 1e-9, "the time column", log)
    doubts += [times.doubt] if times.doubt else []
    measured = stretches[0].rate_hz
    if rate_hz is None or abs(measured / rate_hz - 1.0) <= 1e-3:
        return stretches, doubts
    what = f"rate {rate_hz:g} Hz stated, {measured:.6g} Hz by the time column"
    log.add(what, "setting 'rate'", "the time column rules", LIKELY)
    return stretches, [*doubts, what]


def _start(
    settings: Mapping[str, str], times: Times | None, log: RepairLog
) -> tuple[int | None, int | None, list[str]]:
    """Return the record's zero in UTC nanoseconds, its resolution, and notes on the clock."""
    if times is not None and times.zero_ns is not None:
        return times.zero_ns, max(1, round(times.tick_ns)), [] if times.offset_stated else [NO_OFFSET]
    text = settings.get("start")
    if text is None:
        return None, None, []
    try:
        moment = iso_moment(text)
    except ValueError as error:
        log.add(f"start {error}", "setting 'start'", "no absolute time", SURE)
        return None, None, []
    return moment.ns, moment.resolution_ns, [] if moment.offset_s is not None else [NO_OFFSET]


def _clock(
    settings: Mapping[str, str], start_ns: int | None, notes: list[str], doubts: list[str], log: RepairLog
) -> Clock:
    text = settings.get("clock")
    if start_ns is None:
        return Clock(None, False, ("no absolute time", *doubts))
    offset_s = 0 if NO_OFFSET not in notes else None
    if text is None:
        return Clock(None, not doubts, ("accuracy not stated in the file", *notes, *doubts), offset_s)
    if text.strip().lower() == "free":
        return Clock(None, False, ("declared free in the file", *notes, *doubts), offset_s)
    try:
        return Clock(parse_quantity(text, "s").u, not doubts, (*notes, *doubts), offset_s)
    except ValueError as error:
        log.add(f"clock {error}", "setting 'clock'", "the clock cannot be used", SURE)
        return Clock(None, False, ("the stated accuracy cannot be read", *notes, *doubts), offset_s)


def as_readings(values: object) -> FloatArray:
    """Return numbers of any kind as contiguous float64 readings, NaN where infinite; shape (samples,)."""
    readings = np.array(values, dtype=np.float64)
    readings[~np.isfinite(readings)] = np.nan
    return readings
