"""Writing a record as COMTRADE 2013 (IEEE C37.111-2013, IEC 60255-24:2013) with nanosecond stamps."""

import contextlib
import math
import os
import tempfile
from dataclasses import dataclass
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from twlocate.arrays import FloatArray
from twlocate.errors import RecordError
from twlocate.records.comtrade.binary import ANALOG_TYPES, row_type
from twlocate.records.comtrade.clock import QUALITY_BOUND_S
from twlocate.records.comtrade.configuration import FILE_TYPES
from twlocate.records.comtrade.scaling import MISSING
from twlocate.records.moments import DAY_NS, SECOND_NS
from twlocate.records.record import Channel, Clock, Record, StatusChannel

COUNT_LIMIT = {"ASCII": 99_998, "BINARY": 32_767, "BINARY32": 2**31 - 1, "FLOAT32": float(np.finfo(np.float32).max)}
"""Largest count of each file type; the missing-value codes lie outside ±limit."""
LAST_STAMP = 0xFFFFFFFE
"""FFFFFFFF means a missing stamp."""


@dataclass(frozen=True)
class Counts:
    """A channel as the file stores it: ``a * counts + b`` in its unit, NaN where missing."""

    a: float
    b: float
    counts: FloatArray


def write_comtrade(record: Record, path: str | Path, file_type: str = "BINARY32") -> None:
    """Write `record` as a CFG/DAT pair, or as one CFF where `path` ends in ``.cff``.

    Readings on the channel's own steps (``offset + step * whole number``) come back bit for bit, and so does any
    single-precision reading through FLOAT32. A channel without such a step is scaled to the full range of the file
    type and so rounded to it. Stamps are whole nanoseconds, or the multiple of ten of them that fits 32 bits.
    The clock goes into the time-quality code: the smallest bound that contains ``u_s * sqrt(3)``.

    Parameters
    ----------
    record
        What to write; it needs a start.
    path
        The ``.cfg`` or the ``.cff`` file. Files are complete or absent: they are put in place when done.
    file_type
        ``"ASCII"``, ``"BINARY"``, ``"BINARY32"`` or ``"FLOAT32"``.

    Raises
    ------
    RecordError
        The record does not fit the format; nothing is written.
    """
    path = Path(path)
    _check_writable(record, path, file_type)
    channels = [counts_of(channel, file_type, path) for channel in record.channels]
    ticks, tick_ns = stamp_ticks(record)
    cfg = cfg_text(record, channels, file_type, tick_ns).encode()
    pack = _ascii_rows if file_type == "ASCII" else _binary_rows
    data = pack(channels, record.status, ticks, file_type)
    if path.suffix.lower() == ".cff":
        size = "" if file_type == "ASCII" else f": {len(data)}"
        heads = "--- file type: INF ---\r\n--- file type: HDR ---\r\n" + f"--- file type: DAT {file_type}{size} ---\r\n"
        _put({path: b"--- file type: CFG ---\r\n" + cfg + heads.encode() + data})
    else:
        _put({path.with_suffix(".dat"): data, path: cfg})


def _check_writable(record: Record, path: Path, file_type: str) -> None:
    if file_type not in FILE_TYPES:
        raise RecordError(f"file type {file_type!r} is unknown; choose {', '.join(FILE_TYPES)}")
    if path.suffix.lower() not in (".cfg", ".cff"):
        raise RecordError(f"{path}: a COMTRADE record is written to a .cfg or a .cff file")
    if record.start_ns is None:
        raise RecordError(f"{path}: the record has no absolute start, which COMTRADE needs")
    if not record.channels and not record.status:
        raise RecordError(f"{path}: the record has no channel")
    texts = [record.station, record.device]
    texts += [text for channel in record.channels for text in (channel.name, channel.unit, channel.phase)]
    texts += [channel.name for channel in record.status]
    wrong = next((text for text in texts if any(character in text for character in ",\r\n\x1a")), None)
    if wrong is not None:
        raise RecordError(f"{path}: the name {wrong!r} holds a comma or a line end, which COMTRADE cannot carry")


def counts_of(channel: Channel, file_type: str, path: Path) -> Counts:
    """Return the channel in counts of `file_type`: exactly where its own steps allow it, else over the full range."""
    if not np.all(np.isfinite(channel.samples) | np.isnan(channel.samples)):
        raise RecordError(f"{path}: channel {channel.name!r} has infinite samples")
    limit = COUNT_LIMIT[file_type]
    if file_type == "FLOAT32":
        options = [(channel.step or 1.0, channel.offset), (1.0, 0.0)]
    else:
        largest = float(np.nanmax(np.abs(channel.samples), initial=0.0))
        options = [(largest / limit if largest > 0.0 else 1.0, 0.0)]
        if channel.step is not None:
            options.insert(0, (channel.step, channel.offset))
    trials = (_rounded(channel.samples, a, b, file_type) for a, b in options)
    fitting = [trial for trial in trials if np.nanmax(np.abs(trial.counts), initial=0.0) <= limit]
    exact = [
        trial for trial in fitting if np.array_equal(trial.a * trial.counts + trial.b, channel.samples, equal_nan=True)
    ]
    if not fitting:
        raise RecordError(f"{path}: channel {channel.name!r} has readings beyond the range of {file_type}")
    return (exact or fitting)[0]


def _rounded(samples: FloatArray, a: float, b: float, file_type: str) -> Counts:
    with np.errstate(over="ignore", invalid="ignore"):
        counts = (samples - b) / a
        rounded = counts.astype(np.float32).astype(np.float64) if file_type == "FLOAT32" else np.rint(counts)
    return Counts(a, b, rounded)


def stamp_ticks(record: Record) -> tuple[NDArray[np.int64], int]:
    """Return each sample's stamp in ticks from the first sample, and the tick in nanoseconds."""
    origin_s = record.stretches[0].times_s()[0]
    times_s = np.concatenate([stretch.times_s() for stretch in record.stretches]) - origin_s
    if np.min(times_s) < 0.0:
        raise RecordError("the record's stretches go back in time; COMTRADE stamps cannot")
    tick_ns = 1
    while float(times_s[-1]) / (tick_ns * 1e-9) > LAST_STAMP:
        tick_ns *= 10
    return np.rint(times_s / (tick_ns * 1e-9)).astype(np.int64), tick_ns


def cfg_text(record: Record, channels: list[Counts], file_type: str, tick_ns: int) -> str:
    """Return the CFG."""
    pairs = zip(record.channels, channels, strict=True)
    lines = [
        f"{record.station},{record.device},2013",
        f"{len(record.channels) + len(record.status)},{len(record.channels)}A,{len(record.status)}D",
        *(_analog_line(index, *pair, file_type) for index, pair in enumerate(pairs, start=1)),
        *(f"{index},{channel.name},,,{channel.normal}" for index, channel in enumerate(record.status, start=1)),
        _plain(record.line_frequency_hz or 0.0),
        *_rate_lines(record),
        *_date_lines(record),
        file_type,
        str(tick_ns),
        f"{_time_code(record.clock.utc_offset_s)},{_time_code(record.clock.utc_offset_s)}",
        f"{quality_code(record.clock)},0",
    ]
    return "\r\n".join(lines) + "\r\n"


def _plain(number: float) -> str:
    """Return the shortest decimal that reads back as the same double."""
    return repr(float(number)).removesuffix(".0")


def _analog_line(index: int, channel: Channel, counts: Counts, file_type: str) -> str:
    limit = COUNT_LIMIT[file_type]
    low, high = -limit, limit
    if channel.low is not None and channel.high is not None and file_type != "FLOAT32":
        low = max(-limit, round((channel.low - counts.b) / counts.a))
        high = min(limit, round((channel.high - counts.b) / counts.a))
    fields = [
        str(index), channel.name, channel.phase, "", channel.unit, _plain(counts.a), _plain(counts.b),
        _plain(channel.skew_s * 1e6), _plain(low), _plain(high), _plain(channel.ratio or 1.0), "1",
        "S" if channel.side == "secondary" else "P",
    ]  # fmt: skip
    return ",".join(fields)


def _rate_lines(record: Record) -> list[str]:
    """Return the rate lines: one a rate where the spacing is even, else none, so that the stamps rule."""
    if any(stretch.stamps_s is not None for stretch in record.stretches):
        return ["0", f"0,{record.n_samples}"]
    rates: list[tuple[float, int]] = []
    for stretch in record.stretches:
        if rates and rates[-1][0] == stretch.rate_hz:
            rates.pop()
        rates.append((stretch.rate_hz, stretch.stop))
    return [str(len(rates)), *(f"{_plain(rate)},{last}" for rate, last in rates)]


def _date_lines(record: Record) -> list[str]:
    zero_ns = record.start_ns or 0
    offset_ns = (record.clock.utc_offset_s or 0) * SECOND_NS
    start_ns = zero_ns + round(float(record.stretches[0].start_s) * 1e9) + offset_ns
    trigger_ns = start_ns if record.trigger_s is None else zero_ns + round(record.trigger_s * 1e9) + offset_ns
    return [_date_line(start_ns), _date_line(trigger_ns)]


def _date_line(ns: int) -> str:
    days, in_day = divmod(ns, DAY_NS)
    seconds, fraction = divmod(in_day, SECOND_NS)
    year, month, day = str(np.datetime64(days, "D")).split("-")
    return f"{day}/{month}/{year},{seconds // 3600:02d}:{seconds // 60 % 60:02d}:{seconds % 60:02d}.{fraction:09d}"


def _time_code(offset_s: int | None) -> str:
    if offset_s is None:
        return "x"
    hours, minutes = divmod(abs(offset_s) // 60, 60)
    sign = "-" if offset_s < 0 else "+" if offset_s else ""
    return f"{sign}{hours}" + (f"h{minutes:02d}" if minutes else "")


def quality_code(clock: Clock) -> str:
    """Return the time-quality code: F unusable, 0 without a figure, else the smallest bound that holds the clock."""
    if not clock.usable:
        return "F"
    if clock.u_s is None:
        return "0"
    bound_s = clock.u_s * math.sqrt(3.0) * (1.0 - 1e-9)
    return next((code for code, limit in QUALITY_BOUND_S.items() if limit >= bound_s), "F")


def _binary_rows(
    channels: list[Counts], status: tuple[StatusChannel, ...], ticks: NDArray[np.int64], file_type: str
) -> bytes:
    rows = np.zeros(len(ticks), row_type(file_type, len(channels), len(status)))
    rows["number"] = np.arange(1, len(ticks) + 1)
    rows["stamp"] = ticks
    for index, channel in enumerate(channels):
        stored = np.where(np.isnan(channel.counts), MISSING[file_type], channel.counts)
        rows["analog"][:, index] = stored.astype(ANALOG_TYPES[file_type])
    if status:
        bits = np.zeros((len(ticks), 16 * rows["status"].shape[1]), np.uint8)
        bits[:, : len(status)] = np.stack([channel.states for channel in status], axis=1)
        rows["status"] = np.packbits(bits, axis=1, bitorder="little").view("<u2")
    return rows.tobytes()


def _ascii_rows(channels: list[Counts], status: tuple[StatusChannel, ...], ticks: NDArray[np.int64], _: str) -> bytes:
    columns = [np.arange(1, len(ticks) + 1), ticks]
    columns += [np.where(np.isnan(c.counts), MISSING["ASCII"], c.counts).astype(np.int64) for c in channels]
    columns += [channel.states for channel in status]
    rows = np.stack(columns, axis=1).astype(np.int64).tolist()
    return "".join(",".join(map(str, row)) + "\r\n" for row in rows).encode()


def _put(files: dict[Path, bytes]) -> None:
    """Write every file under a passing name, then put all in place: a fault leaves nothing half written."""
    written: list[tuple[str, Path]] = []
    try:
        for path, content in files.items():
            handle, passing = tempfile.mkstemp(dir=path.parent, prefix=f".{path.name}.")
            written.append((passing, path))
            with os.fdopen(handle, "wb") as file:
                file.write(content)
            Path(passing).chmod(0o644)
        for passing, path in written:
            Path(passing).replace(path)
    except OSError as error:
        for passing, _ in written:
            with contextlib.suppress(OSError):
                Path(passing).unlink()
        name = next(iter(files))
        raise RecordError(f"{name}: cannot be written ({error.strerror or error})") from None
