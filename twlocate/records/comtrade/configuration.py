"""The CFG part: what the file says it holds. C37.111-1991 §5.3, -1999 §5.3, -2013 (IEC 60255-24:2013) clause 7."""

import re
from dataclasses import dataclass

from twlocate.errors import RecordError
from twlocate.records.comtrade.dates import DATE_AND_TIME, read_moment, read_time_code
from twlocate.records.moments import NUMBER, Moment
from twlocate.records.repairs import GUESS, LIKELY, SURE, RepairLog

CTRL_Z = "\x1a"
EDITIONS = (1991, 1999, 2013)
FILE_TYPES = ("ASCII", "BINARY", "BINARY32", "FLOAT32")
FULL_ANALOG_FIELDS = 13
SHORT_ANALOG_FIELDS = 10
MAX_SCALE = 1e30
LARGEST = 1e40
"""No field of a CFG is larger: beyond the range of single precision."""
MIN_RATE_HZ, MAX_RATE_HZ = 1e-9, 1e12
MAX_LAST = 1e18


@dataclass(frozen=True)
class AnalogLine:
    """One analog channel: a reading is ``a * count + b`` in `unit`."""

    name: str
    phase: str
    unit: str
    a: float
    b: float
    skew_us: float
    low: float
    high: float
    primary: float | None = None
    secondary: float | None = None
    side: str = ""
    """``"P"`` or ``"S"``: the side of the transducer the reading is on."""


@dataclass(frozen=True)
class StatusLine:
    """One status channel and its state in normal service."""

    name: str
    normal: int


@dataclass(frozen=True)
class RateLine:
    """Samples a second, up to and including sample `last` (counted from the first sample of the file)."""

    rate_hz: float
    last: int


@dataclass(frozen=True)
class Configuration:
    """A CFG as written, its departures from the standard already in the log."""

    station: str
    device: str
    edition: int
    analog: tuple[AnalogLine, ...]
    status: tuple[StatusLine, ...]
    line_frequency_hz: float | None
    rates: tuple[RateLine, ...]
    """Empty where the file declares none: the stamps then rule."""
    declared_rows: int | None
    start: Moment | None
    trigger: Moment | None
    file_type: str
    time_multiplier: float
    time_offset_s: int | None = None
    """Offset from UTC of the clock the stamps are written by; None where not stated."""
    time_quality: str | None = None
    leap_second: str | None = None

    @property
    def tick_s(self) -> float:
        """Seconds a stamp counts: nanoseconds where the dates have nine digits (2013), else microseconds."""
        fine = any(moment is not None and moment.digits > 6 for moment in (self.start, self.trigger))
        return (1e-9 if fine and self.edition >= 2013 else 1e-6) * self.time_multiplier


class Lines:
    """The lines of a CFG, taken one after another."""

    def __init__(self, text: str, log: RepairLog) -> None:
        body = text.rstrip(CTRL_Z + "\r\n \t\0")
        if CTRL_Z in text:
            log.add("Ctrl-Z at the end of the text", "CFG", "ignored", SURE)
        self.lines = re.split(r"\r\n|\n|\r", body)
        self.taken = 0

    @property
    def left(self) -> int:
        """How many lines have not been taken."""
        return len(self.lines) - self.taken

    @property
    def where(self) -> str:
        """The place of the line taken last."""
        return f"CFG line {self.taken}"

    def take(self, holds: str) -> str:
        """Return the next line; `holds` says in the error what was wanted."""
        if not self.left:
            raise RecordError(f"the CFG ends after line {self.taken}; {holds} should follow")
        self.taken += 1
        return self.lines[self.taken - 1]

    @property
    def next_is_a_date(self) -> bool:
        """Whether the line to come is a date and time."""
        return bool(self.left) and DATE_AND_TIME.fullmatch(self.lines[self.taken]) is not None

    def take_or(self, default: str) -> str:
        """Return the next line, or `default` past the end."""
        return self.take("") if self.left else default


def parse_configuration(text: str, log: RepairLog) -> Configuration:
    """Read a CFG text.

    Raises
    ------
    RecordError
        It cannot be read even with repairs; names the line and what should stand there.
    """
    lines = Lines(text, log)
    station, device, written_edition = _head(lines)
    n_analog, n_status = _channel_counts(lines, log)
    analog = tuple(_analog_line(lines, log) for _ in range(n_analog))
    status = tuple(_status_line(lines, log) for _ in range(n_status))
    edition = _edition(written_edition, analog, log)
    line_frequency = _optional_number(lines.take("the line frequency"), lines.where, log)
    rates, declared_rows = _rates(lines, log)
    month_first = edition == 1991
    start = read_moment(lines.take("the start time"), lines.where, month_first, log)
    trigger = read_moment(lines.take_or(""), lines.where, month_first, log)
    file_type = _file_type(lines, log)
    multiplier = _time_multiplier(lines, edition, log)
    offset, quality, leap = _time_codes(lines, edition, log)
    return Configuration(
        station, device, edition, analog, status, line_frequency, rates, declared_rows,
        start, trigger, file_type, multiplier, offset, quality, leap,
    )  # fmt: skip


def _fields(line: str) -> list[str]:
    return [field.strip() for field in line.split(",")]


def _head(lines: Lines) -> tuple[str, str, str]:
    fields = _fields(lines.take("station and device"))
    fields += [""] * (3 - len(fields))
    return fields[0], ",".join(fields[1:-1]), fields[-1]


def _edition(written: str, analog: tuple[AnalogLine, ...], log: RepairLog) -> int:
    """Return the edition that rules: the one named, else the newest not after the year named."""
    if written.isdecimal() and int(written) in EDITIONS:
        return int(written)
    full = any(line.primary is not None for line in analog)
    edition = 1999 if full else 1991
    if not written:
        if full:
            log.add("no revision year, but ratios of 1999", "CFG line 1", "read as 1999", LIKELY)
        return edition
    if written.isdecimal() and int(written) > 1999:
        edition = max(year for year in EDITIONS if year <= int(written))
    log.add(f"revision year {written[:12]!r}", "CFG line 1", f"read as {edition}", LIKELY)
    return edition


def _channel_counts(lines: Lines, log: RepairLog) -> tuple[int, int]:
    line = lines.take("the channel counts")
    match = re.fullmatch(r"\s*(\d{1,9})\s*,\s*(\d{1,9})\s*A?\s*,\s*(\d{1,9})\s*D?\s*,?\s*", line, re.IGNORECASE)
    if match is None:
        raise RecordError(
            f"CFG line 2 is {line.strip()[:40]!r}; total, analog and status counts such as '8,4A,4D' belong"
        )
    total, analog, status = int(match[1]), int(match[2]), int(match[3])
    if analog + status > lines.left:
        raise RecordError(f"CFG line 2 declares {analog + status} channels, but only {lines.left} lines follow")
    if analog + status == 0:
        raise RecordError("CFG line 2 declares no channel at all")
    if total != analog + status:
        log.add(f"total of {total} channels", "CFG line 2", f"{analog} + {status} taken", LIKELY)
    return analog, status


def _analog_line(lines: Lines, log: RepairLog) -> AnalogLine:
    fields = _fields(lines.take("an analog channel"))
    where = lines.where
    if len(fields) < SHORT_ANALOG_FIELDS - 3:
        raise RecordError(f"{where} has {len(fields)} fields; an analog channel needs 10 (1991) or 13")
    full = len(fields) > SHORT_ANALOG_FIELDS and fields[-1].upper() in ("P", "S")
    wanted = FULL_ANALOG_FIELDS if full else SHORT_ANALOG_FIELDS
    if len(fields) > wanted and len(fields) != FULL_ANALOG_FIELDS:
        surplus = len(fields) - wanted
        log.add(f"{surplus} fields too many", where, "commas taken as part of the name", GUESS)
        fields = [fields[0], ",".join(fields[1 : 2 + surplus]), *fields[2 + surplus :]]
    fields += [""] * (FULL_ANALOG_FIELDS - len(fields))
    a, b = _scale(fields, where, log)
    return AnalogLine(
        name=fields[1], phase=fields[2], unit=fields[4], a=a, b=b,
        skew_us=_number_or(fields[7], 0.0, "skew", where, log),
        low=_number_or(fields[8], float("nan"), "minimum", where, log),
        high=_number_or(fields[9], float("nan"), "maximum", where, log),
        primary=_ratio(fields[10]), secondary=_ratio(fields[11]),
        side=fields[12].upper() if fields[12].upper() in ("P", "S") else "",
    )  # fmt: skip


def _scale(fields: list[str], where: str, log: RepairLog) -> tuple[float, float]:
    if not NUMBER.fullmatch(fields[5]) or abs(float(fields[5])) > MAX_SCALE:
        raise RecordError(f"{where}: the multiplier {fields[5][:20]!r} is no number up to {MAX_SCALE:g}")
    a = float(fields[5])
    if a == 0.0:
        log.add("multiplier 0", where, "kept: the channel is constant", SURE)
    return a, _number_or(fields[6], 0.0, "offset", where, log)


def _ratio(text: str) -> float | None:
    return float(text) if NUMBER.fullmatch(text) and abs(float(text)) <= LARGEST else None


def _number_or(text: str, default: float, name: str, where: str, log: RepairLog) -> float:
    """Return a number; a blank or unreadable one is `default`, with a repair."""
    if NUMBER.fullmatch(text) and abs(float(text)) <= LARGEST:
        return float(text)
    fault = f"{name} {text[:20]!r}" if text else f"blank {name}"
    log.add(fault, where, "unknown" if default != default else f"taken as {default:g}", LIKELY)
    return default


def _status_line(lines: Lines, log: RepairLog) -> StatusLine:
    fields = _fields(lines.take("a status channel"))
    name = fields[1] if len(fields) > 1 else ""
    if len(fields) in (3, 5) and fields[-1] in ("0", "1"):
        return StatusLine(name, int(fields[-1]))
    normal = next((field for field in fields[2:] if field in ("0", "1")), "")
    log.add(f"status channel of {len(fields)} fields", lines.where, f"normal state {normal or 0}", LIKELY)
    return StatusLine(name, int(normal or 0))


def _optional_number(line: str, where: str, log: RepairLog) -> float | None:
    text = line.strip().rstrip(",")
    if NUMBER.fullmatch(text) and 0.0 <= float(text) <= LARGEST:
        return float(text) or None
    log.add(f"line frequency {text[:20]!r}", where, "unknown", SURE)
    return None


def _rates(lines: Lines, log: RepairLog) -> tuple[tuple[RateLine, ...], int | None]:
    """Return the rate lines (none where the stamps rule) and the declared number of rows."""
    text = lines.take("the number of rates").strip().rstrip(",")
    if not text.isdecimal() or len(text) > 6:
        raise RecordError(f"{lines.where} is {text[:40]!r}; the number of sampling rates belongs there")
    count = int(text)
    if count > lines.left:
        raise RecordError(f"{lines.where} declares {count} sampling rates, but only {lines.left} lines follow")
    if count == 0 and lines.next_is_a_date:
        log.add("no line for the last sample", lines.where, "all rows are read", SURE)
        return (), None
    read = [_rate_line(lines) for _ in range(max(count, 1))]
    rates = tuple(rate for rate in read if rate.rate_hz > 0.0)
    if len(rates) < count:
        log.add("sampling rate of 0", lines.where, "the stamps give the time", LIKELY)
        rates = ()
    return (rates if count else ()), max(rate.last for rate in read)


def _rate_line(lines: Lines) -> RateLine:
    fields = _fields(lines.take("a sampling rate"))
    if len(fields) < 2 or not NUMBER.fullmatch(fields[0]) or not NUMBER.fullmatch(fields[1]):
        raise RecordError(f"{lines.where} is {','.join(fields)[:40]!r}; a rate and its last sample belong there")
    rate_hz, last = float(fields[0]), float(fields[1])
    if (rate_hz and not MIN_RATE_HZ <= rate_hz <= MAX_RATE_HZ) or not 0.0 <= last <= MAX_LAST:
        raise RecordError(f"{lines.where}: {rate_hz:g} Hz up to sample {last:g} is no sampling rate")
    return RateLine(rate_hz, int(last))


def _file_type(lines: Lines, log: RepairLog) -> str:
    text = lines.take_or("").strip().upper()
    if text in FILE_TYPES:
        return text
    log.add(f"file type {text[:20]!r}", lines.where, "told from the data", LIKELY)
    return ""


def _time_multiplier(lines: Lines, edition: int, log: RepairLog) -> float:
    if edition == 1991:
        return 1.0
    value = _number_or(lines.take_or("").strip(), 1.0, "time multiplier", lines.where, log)
    if value > 0.0:
        return value
    log.add(f"time multiplier {value:g}", lines.where, "taken as 1", LIKELY)
    return 1.0


def _time_codes(lines: Lines, edition: int, log: RepairLog) -> tuple[int | None, str | None, str | None]:
    """Return offset from UTC, time quality and leap-second indicator; None each where not stated (before 2013)."""
    if edition < 2013:
        return None, None, None
    codes, quality = _fields(lines.take_or("")), _fields(lines.take_or(""))
    if len(codes) < 2 or len(quality) < 2:
        log.add("time codes or time quality missing", lines.where, "clock not stated", SURE)
    offset = read_time_code(codes[0], lines.where, log)
    return offset, quality[0].upper() or None, (quality[1] if len(quality) > 1 else "") or None
