"""Delimited text tables: a header with units, or comment lines that give rate and start."""

import re
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from twlocate.arrays import FloatArray
from twlocate.errors import RecordError
from twlocate.quantity import parse_quantity
from twlocate.records.delimited import forgiving_numbers
from twlocate.records.moments import ISO_8601, SECOND_NS, Moment, exact_decimal, iso_moment, resolution_ns
from twlocate.records.record import Channel, Clock, Record, Stretch
from twlocate.records.repairs import LIKELY, SURE, RepairLog
from twlocate.records.spacing import stretches_by_stamps
from twlocate.records.text import decode
from twlocate.records.windows import cut

Span = tuple[float, float]

SETTING = re.compile(r"#+\s*([A-Za-z][\w ]*?)\s*[:=]\s*(.*\S)\s*")
COLUMN = re.compile(r"(.*?)\s*[\[(]([^\[\]()]*)[\])]\s*")
SPACED_TITLE = re.compile(r"\S+(?:\s*[\[(][^\[\]()]*[\])])?")
TIME_NAME = re.compile(r"(t|time|timestamp|date|datetime|date time|utc|elapsed)(\s.*)?", re.IGNORECASE)
NUMBER = re.compile(r"[+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?")
BLANK = ("", "nan", "NaN", "NAN", "null", "-", "—", "N/A")
DELIMITERS = ("\t", ";", ",", "|")
UNIT_NS = {"s": 10**9, "sec": 10**9, "ms": 10**6, "us": 10**3, "µs": 10**3, "μs": 10**3, "ns": 1, "min": 60 * 10**9}
EPOCH_UNITS = ((10**17, 1), (10**14, 10**3), (10**11, 10**6), (10**8, 10**9))
"""Smallest number that counts from 1970-01-01 (1973 on), and the nanoseconds it counts in, by size."""


@dataclass(frozen=True)
class Layout:
    """Where in the lines of a table what stands."""

    settings: dict[str, str]
    names: list[str]
    units: list[str]
    rows: list[str]
    """The data lines, decimal points in them."""
    delimiter: str | None
    """None: white space."""


@dataclass(frozen=True)
class Times:
    """The time column: nanoseconds from `zero_ns`, which is UTC, or None where times are relative."""

    seconds: FloatArray
    zero_ns: int | None
    tick_ns: float
    offset_stated: bool = True


def read_table(path: Path, span: Span | None) -> Record:
    """Read a delimited text table.

    The first lines may be comments such as ``# rate: 500 Hz``, ``# start: 2026-03-02T04:11:07.25Z`` and
    ``# clock: ± 1 ms`` (a standard uncertainty, or ``free``). A header names the columns, units in brackets.

    Raises
    ------
    RecordError
        There are no numbers, or nothing gives them a time.
    """
    log = RepairLog()
    layout = lay_out(decode(path.read_bytes(), "the text", log))
    numbers = _numbers(layout, log)
    time_columns = _time_columns(layout)
    times = _times(layout, time_columns, log) if time_columns else None
    rate_hz = _rate_hz(layout)
    stretches, doubts = _stretches(times, rate_hz, len(numbers), log)
    start_ns, tick_ns, notes = _start(layout, times)
    record = Record(
        path=path, format="text table", station=layout.settings.get("station", ""),
        channels=_channels(layout, numbers, time_columns, log), stretches=stretches,
        start_ns=start_ns, resolution_ns=tick_ns, clock=_clock(layout, start_ns, doubts, notes),
        repairs=tuple(log.entries),
    )  # fmt: skip
    return cut(record, span) if span is not None else record


def lay_out(text: str) -> Layout:
    """Tell settings, header and data lines of a table apart.

    Raises
    ------
    RecordError
        No line holds numbers.
    """
    lines = [line for line in text.replace("\0", "").splitlines() if line.strip()]
    settings = {match[1].lower(): match[2] for line in lines if (match := SETTING.fullmatch(line.strip()))}
    body = [line for line in lines if not line.lstrip().startswith("#")]
    delimiter = _delimiter(body)
    comma = _has_decimal_comma(body, delimiter)
    plain = [line.replace(",", ".") for line in body] if comma else body
    first = next((index for index, line in enumerate(plain) if _is_data(split(line, delimiter))), None)
    if first is None:
        raise RecordError("no line of numbers")
    width = len(split(plain[first], delimiter))
    names, units = _header([_titles(line, delimiter, width) for line in body[max(0, first - 2) : first]], width)
    return Layout(settings, names, units, plain[first:], delimiter)


def split(line: str, delimiter: str | None) -> list[str]:
    """Return the fields of a line, without quotes and surrounding blanks."""
    return [field.strip().strip('"').strip() for field in line.split(delimiter)]


def _titles(line: str, delimiter: str | None, width: int) -> list[str]:
    """Return the column titles of a header line; between blanks a title keeps its bracketed unit."""
    if delimiter is not None:
        return split(line, delimiter)
    return [line.strip()] if width == 1 else SPACED_TITLE.findall(line)


def _delimiter(body: list[str]) -> str | None:
    """Return the delimiter that the last lines use; None for white space."""
    tail = body[-20:]
    counts = {delimiter: [line.count(delimiter) for line in tail] for delimiter in DELIMITERS}
    steady = [delimiter for delimiter in DELIMITERS if counts[delimiter] and min(counts[delimiter]) > 0]
    return steady[0] if steady else None


def _has_decimal_comma(body: list[str], delimiter: str | None) -> bool:
    if delimiter == ",":
        return False
    fields = [field for line in body[-20:] for field in split(line, delimiter)]
    return any(re.fullmatch(r"[+-]?\d+,\d+(?:[eE][+-]?\d+)?", field) for field in fields)


def _is_data(fields: list[str]) -> bool:
    numeric = [bool(NUMBER.fullmatch(field)) for field in fields]
    others = [field for field, number in zip(fields, numeric, strict=True) if not number]
    return any(numeric) and all(field in BLANK or ISO_8601.fullmatch(field) for field in others)


def _header(lines: list[list[str]], width: int) -> tuple[list[str], list[str]]:
    """Return column names and units; units in brackets, or on a line of their own."""
    rows = [row for row in lines if len(row) == width]
    if not rows:
        return [f"column {index + 1}" for index in range(width)], [""] * width
    if len(rows) == 2 and all(not field or (COLUMN.fullmatch(field) and field[0] in "([") for field in rows[1]):
        return rows[0], [field.strip("()[] ") for field in rows[1]]
    matches = [COLUMN.fullmatch(field) for field in rows[-1]]
    names = [match[1] if match else field for match, field in zip(matches, rows[-1], strict=True)]
    return names, [match[2].strip() if match else "" for match in matches]


def _time_columns(layout: Layout) -> list[int]:
    """Return the column that gives the time, or the two that give date and time of day."""
    names = [name.strip().lower() for name in layout.names]
    if names[:2] == ["date", "time"]:
        return [0, 1]
    first = split(layout.rows[0], layout.delimiter)
    dated = [index for index, field in enumerate(first) if ISO_8601.fullmatch(field)]
    named = [index for index, name in enumerate(names) if TIME_NAME.fullmatch(name)]
    return (dated or named)[:1]


def _numbers(layout: Layout, log: RepairLog) -> FloatArray:
    """Return the table as numbers, NaN where a field is none; shape (rows, columns)."""
    width = len(layout.names)
    try:
        return np.loadtxt(layout.rows, delimiter=layout.delimiter, comments=None, ndmin=2)
    except ValueError:
        numbers, short = forgiving_numbers(layout.rows, width, layout.delimiter)
    if short:
        log.add(f"{len(short)} rows with too few fields", "the table", "the missing fields left out (NaN)", SURE)
    return numbers


def _times(layout: Layout, columns: list[int], log: RepairLog) -> Times:
    """Return the time of each row.

    Raises
    ------
    RecordError
        A row has no readable time.
    """
    texts = [_time_text(split(row, layout.delimiter), columns) for row in layout.rows]
    if ISO_8601.fullmatch(texts[0]):
        return _calendar_times(texts)
    unit = layout.units[columns[0]]
    if unit and unit not in UNIT_NS:
        raise RecordError(f"the time column is in {unit!r}; known are {' '.join(UNIT_NS)}")
    return _counted_times(texts, UNIT_NS.get(unit), log)


def _time_text(fields: list[str], columns: list[int]) -> str:
    return " ".join(fields[column] if column < len(fields) else "" for column in columns)


def _calendar_times(texts: list[str]) -> Times:
    moments = [_moment(text, row) for row, text in enumerate(texts, start=1)]
    digits = max(moment.digits for moment in moments)
    ns = np.array([moment.ns for moment in moments], dtype=np.int64)
    stated = moments[0].offset_s is not None
    return Times((ns - ns[0]) * 1e-9, int(ns[0]), resolution_ns(digits), stated)


def _moment(text: str, row: int) -> Moment:
    try:
        return iso_moment(text)
    except ValueError as error:
        raise RecordError(f"row {row}: {error}") from None


def _counted_times(texts: list[str], unit_ns: int | None, log: RepairLog) -> Times:
    """Return times given as numbers: from the record's start, or from 1970-01-01 when that large."""
    epoch_unit = _epoch_unit_ns(texts[0], unit_ns)
    if unit_ns is None and epoch_unit is None:
        log.add("no unit of time", "time column", "seconds", LIKELY)
    scale = epoch_unit or unit_ns or SECOND_NS
    picos = [_decimal(text, scale * 1000, row) for row, text in enumerate(texts, start=1)]
    zero = picos[0] if epoch_unit else 0
    seconds = np.array([value - zero for value in picos], dtype=np.float64) * 1e-12
    tick_ns = scale * 10.0 ** -max(_decimals(text) for text in texts[:1000])
    return Times(seconds, zero // 1000 if epoch_unit else None, tick_ns)


def _epoch_unit_ns(text: str, unit_ns: int | None) -> int | None:
    """Return the nanoseconds a time counts in when it counts from 1970-01-01; None when it is relative."""
    size = abs(float(text)) if NUMBER.fullmatch(text) else 0.0
    if unit_ns is not None:
        return unit_ns if size * unit_ns >= 10**8 * SECOND_NS else None
    return next((unit for least, unit in EPOCH_UNITS if size >= least), None)


def _decimal(text: str, scale: int, row: int) -> int:
    try:
        return exact_decimal(text, scale)
    except ValueError as error:
        raise RecordError(f"row {row}: the time {error}") from None


def _decimals(text: str) -> int:
    """Return the place of the last digit of a decimal number: 3 for 0.125 and for 125e-3."""
    mantissa, _, exponent = text.lower().partition("e")
    return len(mantissa.partition(".")[2]) - int(exponent or 0)


def _rate_hz(layout: Layout) -> float | None:
    text = layout.settings.get("rate")
    if text is None:
        return None
    try:
        rate = parse_quantity(text if not NUMBER.fullmatch(text) else f"{text} Hz", "Hz").value
    except ValueError as error:
        raise RecordError(f"rate {error}") from None
    if not 0.0 < rate < 1e12:
        raise RecordError(f"rate {text!r} is not a positive sampling rate")
    return rate


def _stretches(
    times: Times | None, rate_hz: float | None, count: int, log: RepairLog
) -> tuple[tuple[Stretch, ...], list[str]]:
    if rate_hz is not None and (times is None or count == 1):
        return (Stretch(0, count, 0.0 if times is None else float(times.seconds[0]), rate_hz),), []
    if times is None:
        raise RecordError("no column is called time and no line such as '# rate: 500 Hz' gives the sampling rate")
    stretches, doubts = stretches_by_stamps(times.seconds, times.tick_ns * 1e-9, "the time column", log)
    measured = stretches[0].rate_hz
    if rate_hz is not None and abs(measured / rate_hz - 1.0) > 1e-3:
        what = f"rate {rate_hz:g} Hz stated, {measured:.6g} Hz by the time column"
        log.add(what, "comment line 'rate'", "the time column rules", LIKELY)
        doubts.append(what)
    return stretches, doubts


def _start(layout: Layout, times: Times | None) -> tuple[int | None, int | None, list[str]]:
    """Return the record's zero in UTC nanoseconds, its resolution, and notes on the clock."""
    text = layout.settings.get("start")
    if times is not None and times.zero_ns is not None:
        notes = [] if times.offset_stated else ["offset from UTC not stated: times taken as UTC"]
        return times.zero_ns, max(1, round(times.tick_ns)), notes
    if text is None:
        return None, None, []
    try:
        moment = iso_moment(text)
    except ValueError as error:
        raise RecordError(f"start {error}") from None
    notes = [] if moment.offset_s is not None else ["offset from UTC not stated: times taken as UTC"]
    return moment.ns, moment.resolution_ns, notes


def _clock(layout: Layout, start_ns: int | None, doubts: list[str], notes: list[str]) -> Clock:
    text = layout.settings.get("clock")
    if start_ns is None:
        return Clock(None, False, ("no absolute time", *doubts))
    if text is not None and text.strip().lower() == "free":
        return Clock(None, False, ("declared free in the file", *notes, *doubts))
    if text is None:
        return Clock(None, not doubts, ("accuracy not stated in the file", *notes, *doubts))
    try:
        return Clock(parse_quantity(text, "s").u, not doubts, (*notes, *doubts))
    except ValueError as error:
        raise RecordError(f"clock {error}") from None


def _channels(layout: Layout, numbers: FloatArray, time_columns: list[int], log: RepairLog) -> tuple[Channel, ...]:
    chosen = [index for index in range(len(layout.names)) if index not in time_columns]
    channels = tuple(
        Channel(layout.names[index], layout.units[index], np.ascontiguousarray(numbers[:, index])) for index in chosen
    )
    if not channels:
        raise RecordError("there is a time column but no column of readings")
    for channel in channels:
        if channel.missing:
            log.add(f"{channel.missing} readings missing", f"column {channel.name!r}", "left out (NaN)", SURE)
    return channels
