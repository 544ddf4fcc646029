"""Delimited text tables: a header with units, or comment lines that give rate and start."""

import re
from dataclasses import dataclass, replace
from pathlib import Path

import numpy as np

from twlocate.arrays import FloatArray
from twlocate.errors import RecordError
from twlocate.records.assembling import as_readings, assemble
from twlocate.records.delimited import forgiving_numbers
from twlocate.records.moments import ISO_8601, NUMBER, SLASHED
from twlocate.records.record import Channel, Record
from twlocate.records.repairs import SURE, RepairLog
from twlocate.records.spacing import counted
from twlocate.records.text import decode
from twlocate.records.time_columns import parse_times, time_pattern
from twlocate.records.windows import cut

Span = tuple[float, float]

SETTING = re.compile(r"#+\s*([A-Za-z][\w ]*?)\s*[:=]\s*(.*\S)\s*")
COLUMN = re.compile(r"(.*?)\s*[\[(]([^\[\]()]*)[\])]\s*")
UNIT_ALONE = re.compile(r"(?:[\[(][^\[\]()]*[\])])?")
SPACED_TITLE = re.compile(r"\S+(?:\s*[\[(][^\[\]()]*[\])])?")
TIME_NAME = re.compile(r"(t|time|timestamp|date|datetime|date time|utc|elapsed)(\s.*)?", re.IGNORECASE)
TIME_FIELD = re.compile(
    rf"{ISO_8601.pattern}|{SLASHED.pattern}|\d\d?[/.]\d\d?[/.]\d{{4}}|\d\d?:\d\d(:\d\d([.,]\d+)?)?", re.IGNORECASE
)
"""A date, a time of day, or both."""
BLANK = ("", "nan", "NaN", "NAN", "null", "-", "—", "N/A")
MOST = 0.7
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
    text = decode(path.read_bytes(), "the text", log)
    layout = lay_out(text)
    time_columns = _time_columns(layout)
    if not time_columns:
        _check_blank_lines(text, len(layout.rows))
    times = None
    if time_columns:
        layout, texts = _timed_rows(layout, time_columns, log)
        times = parse_times(texts, layout.units[time_columns[0]], log)
    channels = _channels(layout, _numbers(layout, time_columns, log), time_columns)
    return cut(assemble(path, "text table", channels, times, layout.settings, log), span)


def _check_blank_lines(text: str, n_rows: int) -> None:
    """Refuse a table without times that has blank lines among its rows, unless every row is followed by one.

    Raises
    ------
    RecordError
        It would be a guess whether a blank line stands for a sample that is missing.
    """
    lines = text.replace("\0", "").strip().splitlines()[-n_rows:]
    blank = sum(not line.strip() for line in lines)
    if 0 < blank < n_rows // 2 - 1:
        raise RecordError(
            f"{blank} blank lines among the rows and no time column: it is open whether samples are missing there; "
            "add a time column, or delete the blank lines"
        )


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
    """Return the delimiter that most of the last lines use; None for white space."""
    tail = body[-20:]
    uses = {delimiter: sum(delimiter in line for line in tail) for delimiter in DELIMITERS}
    return next((delimiter for delimiter in DELIMITERS if uses[delimiter] >= MOST * len(tail) > 0), None)


def _has_decimal_comma(body: list[str], delimiter: str | None) -> bool:
    if delimiter == ",":
        return False
    fields = [field for line in body[-20:] for field in split(line, delimiter)]
    return any(re.fullmatch(r"[+-]?\d+,\d+(?:[eE][+-]?\d+)?", field) for field in fields)


def _is_data(fields: list[str]) -> bool:
    numeric = [bool(NUMBER.fullmatch(field)) for field in fields]
    others = [field for field, number in zip(fields, numeric, strict=True) if not number]
    return any(numeric) and all(field in BLANK or TIME_FIELD.fullmatch(field) for field in others)


def _header(lines: list[list[str]], width: int) -> tuple[list[str], list[str]]:
    """Return column names and units; units in brackets, or on a line of their own."""
    rows = [row for row in lines if len(row) == width]
    if not rows:
        return [f"column {index + 1}" for index in range(width)], [""] * width
    if len(rows) == 2 and all(UNIT_ALONE.fullmatch(field) for field in rows[1]):
        return rows[0], [field.strip("()[] ") for field in rows[1]]
    pairs = [_name_and_unit(title) for title in rows[-1]]
    return [name for name, _ in pairs], [unit for _, unit in pairs]


def _name_and_unit(title: str) -> tuple[str, str]:
    match = COLUMN.fullmatch(title)
    return (match[1], match[2].strip()) if match else (title, "")


def _time_columns(layout: Layout) -> list[int]:
    """Return the column that gives the time, or the two that give date and time of day."""
    names = [name.strip().lower() for name in layout.names]
    if names[:2] == ["date", "time"]:
        return [0, 1]
    first = split(layout.rows[0], layout.delimiter)
    dated = [index for index, field in enumerate(first) if ISO_8601.fullmatch(field) or SLASHED.fullmatch(field)]
    named = [index for index, name in enumerate(names) if TIME_NAME.fullmatch(name)]
    return (dated or named)[:1]


def _numbers(layout: Layout, time_columns: list[int], log: RepairLog) -> FloatArray:
    """Return the table as numbers, NaN where a field is none; shape (rows, columns)."""
    width = len(layout.names)
    chosen = [column for column in range(width) if column not in time_columns]
    try:
        numbers = np.full((len(layout.rows), width), np.nan)
        rows = np.loadtxt(layout.rows, delimiter=layout.delimiter, comments=None, ndmin=2, usecols=chosen)
        numbers[:, chosen] = rows
        return numbers
    except ValueError:
        numbers, short = forgiving_numbers(layout.rows, width, layout.delimiter)
    if lacking := int(np.count_nonzero(short)):
        log.add(f"{counted(lacking, 'row')} with too few fields", "the table", "missing fields left out (NaN)", SURE)
    return numbers


def _timed_rows(layout: Layout, columns: list[int], log: RepairLog) -> tuple[Layout, list[str]]:
    """Return the layout without the rows that have no readable time, and the times of the others as text.

    Raises
    ------
    RecordError
        Most rows have none.
    """
    texts = [_time_text(split(row, layout.delimiter), columns) for row in layout.rows]
    pattern = time_pattern(texts[0])
    timed = [index for index, text in enumerate(texts) if pattern.fullmatch(text)]
    lost = len(texts) - len(timed)
    if lost and 2 * lost >= len(texts):
        row, text = next((row, text) for row, text in enumerate(texts, start=1) if not pattern.fullmatch(text))
        raise RecordError(f"row {row}: the time {text[:40]!r} is neither a number nor an ISO 8601 time")
    if lost:
        log.add(f"{counted(lost, 'row')} without a readable time", "the table", "left out", SURE)
        layout = replace(layout, rows=[layout.rows[index] for index in timed])
    return layout, [texts[index] for index in timed]


def _time_text(fields: list[str], columns: list[int]) -> str:
    return " ".join(fields[column] if column < len(fields) else "" for column in columns)


def _channels(layout: Layout, numbers: FloatArray, time_columns: list[int]) -> tuple[Channel, ...]:
    chosen = [index for index in range(len(layout.names)) if index not in time_columns]
    columns = ((layout.names[index], layout.units[index], numbers[:, index]) for index in chosen)
    return tuple(Channel(name, unit, as_readings(column)) for name, unit, column in columns)
