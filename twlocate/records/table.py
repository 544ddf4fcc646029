"""Delimited text tables: a header with units, or comment lines that give rate and start."""

import re
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from twlocate.arrays import FloatArray
from twlocate.errors import RecordError
from twlocate.records.assembling import UNIT_NS, Times, assemble, epoch_unit_ns
from twlocate.records.delimited import forgiving_numbers
from twlocate.records.moments import ISO_8601, NUMBER, SECOND_NS, Moment, exact_decimal, iso_moment, resolution_ns
from twlocate.records.record import Channel, Record
from twlocate.records.repairs import LIKELY, SURE, RepairLog
from twlocate.records.text import decode
from twlocate.records.windows import cut

Span = tuple[float, float]

SETTING = re.compile(r"#+\s*([A-Za-z][\w ]*?)\s*[:=]\s*(.*\S)\s*")
COLUMN = re.compile(r"(.*?)\s*[\[(]([^\[\]()]*)[\])]\s*")
SPACED_TITLE = re.compile(r"\S+(?:\s*[\[(][^\[\]()]*[\])])?")
TIME_NAME = re.compile(r"(t|time|timestamp|date|datetime|date time|utc|elapsed)(\s.*)?", re.IGNORECASE)
BLANK = ("", "nan", "NaN", "NAN", "null", "-", "—", "N/A")
DELIMITERS = ("\t", ";", ",", "|")


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
    channels = _channels(layout, numbers, time_columns)
    return cut(assemble(path, "text table", channels, times, layout.settings, log), span)


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
    epoch_unit = epoch_unit_ns(float(texts[0]) if NUMBER.fullmatch(texts[0]) else 0.0, unit_ns)
    if unit_ns is None and epoch_unit is None:
        log.add("no unit of time", "time column", "seconds", LIKELY)
    scale = epoch_unit or unit_ns or SECOND_NS
    picos = [_decimal(text, scale * 1000, row) for row, text in enumerate(texts, start=1)]
    zero = picos[0] if epoch_unit else 0
    seconds = np.array([value - zero for value in picos], dtype=np.float64) * 1e-12
    tick_ns = scale * 10.0 ** -max(_decimals(text) for text in texts[:1000])
    return Times(seconds, zero // 1000 if epoch_unit else None, tick_ns)


def _decimal(text: str, scale: int, row: int) -> int:
    try:
        return exact_decimal(text, scale)
    except ValueError as error:
        raise RecordError(f"row {row}: the time {error}") from None


def _decimals(text: str) -> int:
    """Return the place of the last digit of a decimal number: 3 for 0.125 and for 125e-3."""
    mantissa, _, exponent = text.lower().partition("e")
    return len(mantissa.partition(".")[2]) - int(exponent or 0)


def _channels(layout: Layout, numbers: FloatArray, time_columns: list[int]) -> tuple[Channel, ...]:
    chosen = [index for index in range(len(layout.names)) if index not in time_columns]
    columns = ((layout.names[index], layout.units[index], numbers[:, index]) for index in chosen)
    return tuple(Channel(name, unit, np.ascontiguousarray(column)) for name, unit, column in columns)
