"""A COMTRADE record from its parts."""

from dataclasses import replace
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from twlocate.arrays import FloatArray
from twlocate.errors import RecordError
from twlocate.records.assembling import note_missing
from twlocate.records.comtrade.ascii import FILLING, AsciiRows, parse_ascii
from twlocate.records.comtrade.binary import ANALOG_TYPES, BinaryRows, open_binary
from twlocate.records.comtrade.clock import stated_clock
from twlocate.records.comtrade.configuration import AnalogLine, Configuration, parse_configuration
from twlocate.records.comtrade.container import COMPANIONS, Parts, find_parts
from twlocate.records.comtrade.dates import utc_ns
from twlocate.records.comtrade.scaling import Scaling, scaling_of
from twlocate.records.comtrade.timeline import Timeline, timeline
from twlocate.records.record import Channel, Clock, Record, StatusChannel
from twlocate.records.repairs import GUESS, LIKELY, SURE, RepairLog
from twlocate.records.text import decode
from twlocate.records.windows import windowed_stretches

NUMBER_SHARE = 0.9
"""Rows numbered one after another in at least this share tell that the row layout is right."""
UNBOUNDED = 1e37
"""A range as wide as single precision states no converter."""
PROBED_ROWS = 64
HEAD_BYTES = 4096
NUMBER_TEXT = b"0123456789+-., \t\r\neENnAaIiFf\x1a"
"""The bytes of which ASCII data is made."""


def read_comtrade(path: Path, span: tuple[float, float] | None) -> Record:
    """Read a CFG/DAT pair, from either file, or a CFF.

    Raises
    ------
    RecordError
        It cannot be read even with repairs.
    """
    if path.suffix.lower() in COMPANIONS:
        raise RecordError("a companion text without samples; give the .cfg file")
    log = RepairLog()
    parts = find_parts(path, log)
    configuration = parse_configuration(decode(parts.cfg, "CFG", log), log)
    file_type = _fitting_type(parts, configuration, log)
    scaling = scaling_of(configuration.analog, file_type, configuration.edition)
    rows = _open_rows(parts, file_type, scaling, len(configuration.status), log)
    _check_row_count(len(rows), configuration, log)
    times = timeline(rows, configuration.tick_s, configuration.rates, log, probe_only=span is not None)
    stretches, ranges = windowed_stretches(times.stretches, span) if span else (times.stretches, [(0, len(rows))])
    analog, status = _samples(rows, scaling, len(configuration.status), ranges)
    return Record(
        path=path,
        format=f"COMTRADE {configuration.edition} {rows.file_type}",
        channels=_channels(configuration.analog, analog, file_type, log),
        stretches=stretches,
        station=configuration.station,
        device=configuration.device,
        start_ns=_start_ns(configuration),
        resolution_ns=configuration.start.resolution_ns if configuration.start else None,
        trigger_s=_trigger_s(configuration, times, log),
        line_frequency_hz=configuration.line_frequency_hz,
        status=_status(configuration, status),
        clock=_clock(configuration, times, log),
        repairs=log.repairs,
        files=tuple(dict.fromkeys((parts.cfg_path, parts.data_path))),
    )


def _open_rows(parts: Parts, file_type: str, scaling: Scaling, n_status: int, log: RepairLog) -> BinaryRows | AsciiRows:
    if file_type == "ASCII":
        with parts.data_path.open("rb") as file:
            file.seek(parts.offset)
            return parse_ascii(file, parts.length, scaling, n_status, log)
    rows = open_binary(parts, file_type, len(scaling.a), n_status)
    if len(rows) == 0:
        raise RecordError(f"the DAT has {parts.length} bytes, less than one row of {rows.layout.itemsize}")
    if tail := rows.tail():
        stray = not tail.strip(FILLING)
        assumed = "stray bytes, ignored" if stray else "a row cut short, left out"
        log.add(f"{len(tail)} bytes after the last whole row", "DAT", assumed, SURE if stray else LIKELY)
    return rows


def _fitting_type(parts: Parts, configuration: Configuration, log: RepairLog) -> str:
    """Return the stated file type, or the one the data fits where it does not fit the stated one.

    Raises
    ------
    RecordError
        There is no data.
    """
    stated = configuration.file_type or parts.file_type
    with parts.data_path.open("rb") as file:
        file.seek(parts.offset)
        head = file.read(min(parts.length, HEAD_BYTES))
    if not head.strip(FILLING):
        raise RecordError("the DAT holds no samples")
    is_text = not head.rstrip(FILLING).translate(None, NUMBER_TEXT)
    order = ["ASCII"] if is_text else sorted(ANALOG_TYPES, key=lambda name: name != stated)
    counts = (len(configuration.analog), len(configuration.status))
    fitting = next((name for name in order if is_text or _numbered(parts, name, *counts)), stated or order[0])
    if fitting != configuration.file_type:
        log.add(f"file type {stated or 'not stated'}", "CFG", f"the data is {fitting}", LIKELY)
    return fitting


def _numbered(parts: Parts, file_type: str, n_analog: int, n_status: int) -> bool:
    """Tell whether the first sample numbers count up when the rows are laid out as `file_type` says."""
    rows = open_binary(parts, file_type, n_analog, n_status)
    blocks = rows.blocks(0, min(PROBED_ROWS, len(rows)))
    steps = [step for _, block in blocks for step in np.diff(block["number"].astype(np.int64)).tolist()]
    return len(rows) == 1 or (len(steps) > 0 and steps.count(1) >= NUMBER_SHARE * len(steps))


def _check_row_count(rows: int, configuration: Configuration, log: RepairLog) -> None:
    declared = configuration.declared_rows
    if declared is not None and rows != declared:
        assumed = "only what is there is read" if rows < declared else "all rows kept"
        log.add(f"{rows} rows, {declared} declared", "DAT", assumed, SURE)


def _samples(
    rows: BinaryRows | AsciiRows, scaling: Scaling, n_status: int, ranges: list[tuple[int, int]]
) -> tuple[FloatArray, NDArray[np.uint8]]:
    """Return readings and states of the rows in `ranges`, shape (channels, rows)."""
    pieces = [rows.samples(first, stop, scaling, n_status) for first, stop in ranges]
    if len(pieces) == 1:
        return pieces[0]
    readings, states = zip(*pieces, strict=True)
    return np.hstack(readings), np.hstack(states)


def _channels(
    lines: tuple[AnalogLine, ...], readings: FloatArray, file_type: str, log: RepairLog
) -> tuple[Channel, ...]:
    """Return the analog channels; missing samples and ranges that cannot be true go to the log."""
    channels = tuple(_channel(line, samples, file_type, log) for line, samples in zip(lines, readings, strict=True))
    note_missing(channels, log)
    return channels


def _channel(line: AnalogLine, samples: FloatArray, file_type: str, log: RepairLog) -> Channel:
    stepless = file_type == "FLOAT32" and abs(line.a) == 1.0  # readings as computed, not converter counts
    low, high = _converter_range(line, samples, log)
    return Channel(
        name=line.name, unit=line.unit, samples=samples, phase=line.phase, skew_s=line.skew_us * 1e-6,
        step=None if stepless else abs(line.a) or None, offset=line.b, low=low, high=high,
        side={"P": "primary", "S": "secondary"}.get(line.side, ""),
        ratio=line.primary / line.secondary if line.primary and line.secondary else None,
    )  # fmt: skip


def _converter_range(line: AnalogLine, samples: FloatArray, log: RepairLog) -> tuple[float | None, float | None]:
    """Return the least and greatest reading the converter can give; None each where the stated range is not that."""
    low, high = sorted((line.a * line.low + line.b, line.a * line.high + line.b))
    if not 0.0 < high - low < UNBOUNDED:
        return None, None
    margin = 0.5 * abs(line.a)
    if np.fmin.reduce(samples) < low - margin or np.fmax.reduce(samples) > high + margin:
        log.add("samples beyond the stated range", f"channel {line.name!r}", "the range is not the converter's", LIKELY)
        return None, None
    return low, high


def _status(configuration: Configuration, states: NDArray[np.uint8]) -> tuple[StatusChannel, ...]:
    pairs = zip(configuration.status, states, strict=True)
    return tuple(StatusChannel(line.name, row, line.normal) for line, row in pairs)


def _start_ns(configuration: Configuration) -> int | None:
    if configuration.start is None:
        return None
    return utc_ns(configuration.start, configuration.time_offset_s)


def _trigger_s(configuration: Configuration, times: Timeline, log: RepairLog) -> float | None:
    """Return the trigger in seconds from the start; None, with a repair, where it lies outside the record."""
    if configuration.trigger is None or configuration.start is None:
        return None
    trigger_s = (configuration.trigger.ns - configuration.start.ns) * 1e-9
    ends = [stretch.start_s + stretch.span_s for stretch in times.stretches]
    step_s = 1.0 / times.stretches[0].rate_hz
    if -step_s <= trigger_s <= max(ends) + step_s:
        return trigger_s
    log.add(
        f"trigger {trigger_s:.6g} s after the start, outside the record",
        "CFG",
        "passed over: no sample lies there",
        SURE,
    )
    return None


def _clock(configuration: Configuration, times: Timeline, log: RepairLog) -> Clock:
    doubts = list(times.doubts)
    if configuration.start is None:
        doubts.append("no start time")
    doubts += _first_stamp_doubts(configuration, times, log)
    resolution_s = configuration.start.resolution_ns * 1e-9 if configuration.start else 0.0
    stated = (configuration.time_quality, configuration.leap_second, configuration.time_offset_s)
    clock = stated_clock(*stated, resolution_s, doubts)
    if configuration.edition > 1991:
        return clock
    return replace(clock, notes=(*clock.notes, "dates of 1991 put the month first; some makers put the day first"))


def _first_stamp_doubts(configuration: Configuration, times: Timeline, log: RepairLog) -> list[str]:
    """Weigh a first stamp other than 0: the start is the first sample's, unless stamp 0 is the start's.

    The standard gives the start as the time of the first sample. A recorder that counts its stamps from the
    trigger shows it by a first stamp of start minus trigger.
    """
    first_s = times.first_stamp_s
    if first_s == 0.0:
        return []
    start, trigger = configuration.start, configuration.trigger
    what = f"first stamp is {first_s:.9g} s, not 0"
    if start and trigger and abs((start.ns - trigger.ns) * 1e-9 - first_s) <= 2.0 * configuration.tick_s:
        log.add(what, "DAT", "stamps counted from the trigger; the start is the first sample's", SURE)
        return []
    log.add(what, "DAT", "the start is taken as the first sample's", GUESS)
    return [f"the start may belong to stamp 0, {abs(first_s):.6g} s away from the first sample"]
