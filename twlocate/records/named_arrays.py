"""A record from arrays that only have names, as MAT, HDF5 and the like hold them."""

import re
from collections import Counter
from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from twlocate.errors import RecordError
from twlocate.records.assembling import UNIT_NS, Times, as_readings, assemble, epoch_unit_ns
from twlocate.records.moments import SECOND_NS, exact_decimal
from twlocate.records.record import Channel, Record
from twlocate.records.repairs import GUESS, LIKELY, SURE, RepairLog

TIME_NAME = re.compile(r"(.*[/.])?(t|time|timestamps?|times)(_?s)?", re.IGNORECASE)
SETTING_NAMES = {
    "rate": "rate", "fs": "rate", "sample_rate": "rate", "samplerate": "rate", "sampling_rate": "rate",
    "sampling_frequency": "rate", "rate_hz": "rate", "start": "start", "start_time": "start", "starttime": "start",
    "clock": "clock", "station": "station",
}  # fmt: skip
"""What a scalar or text of this name (in small letters) says."""
MAX_COLUMNS = 4096


@dataclass(frozen=True)
class NamedArrays:
    """What was found in the file."""

    arrays: dict[str, NDArray[np.generic]]
    units: dict[str, str] = field(default_factory=dict)
    settings: dict[str, str] = field(default_factory=dict)


def setting_of(name: str, value: object) -> tuple[str, str] | None:
    """Return (setting, text) when a scalar or text is one, else None."""
    key = SETTING_NAMES.get(re.split(r"[/.]", name)[-1].lower())
    if isinstance(value, bytes):
        value = value.decode("utf-8", errors="replace")
    if key is None or (isinstance(value, np.ndarray) and value.size != 1):
        return None
    if isinstance(value, np.ndarray | np.generic):
        value = value.item()
    return (key, value if isinstance(value, str) else repr(value)) if isinstance(value, str | int | float) else None


def record_of_arrays(path: Path, format_name: str, found: NamedArrays, log: RepairLog) -> Record:
    """Return the record of the arrays that share the most common length.

    Raises
    ------
    RecordError
        There is no array of numbers, or nothing gives the samples a time.
    """
    columns = dict(_columns(found.arrays))
    if not columns:
        raise RecordError("no array of numbers")
    length = _record_length(columns, log)
    kept = {name: column for name, column in columns.items() if column.size == length}
    time_name = next((name for name in kept if TIME_NAME.fullmatch(name)), None)
    times = None if time_name is None else _times(kept.pop(time_name), found.units.get(time_name), log)
    channels = tuple(Channel(name, _unit(name, found.units), as_readings(column)) for name, column in kept.items())
    return assemble(path, format_name, channels, times, found.settings, log)


def _columns(arrays: Mapping[str, NDArray[np.generic]]) -> list[tuple[str, NDArray[np.generic]]]:
    """Return one-dimensional columns; a two-dimensional array is one a channel along its longer side."""
    columns: list[tuple[str, NDArray[np.generic]]] = []
    for name, values in arrays.items():
        squeezed = np.squeeze(values)
        if squeezed.dtype.kind not in "iufb" or squeezed.ndim not in (1, 2) or squeezed.size < 2:
            continue
        if squeezed.ndim == 1:
            columns.append((name, squeezed))
        elif min(squeezed.shape) <= MAX_COLUMNS:
            tall = squeezed if squeezed.shape[0] >= squeezed.shape[1] else squeezed.T
            columns += [(f"{name}[{index + 1}]", tall[:, index]) for index in range(tall.shape[1])]
    return columns


def _record_length(columns: Mapping[str, NDArray[np.generic]], log: RepairLog) -> int:
    """Return the number of samples that most columns have; the others are written down as left out."""
    counts = Counter(column.size for column in columns.values())
    length = max(counts, key=lambda size: (counts[size], size))
    for name, column in columns.items():
        if column.size != length:
            log.add(f"{column.size} values, not {length}", f"array {name!r}", "left out", SURE)
    return length


def _unit(name: str, units: Mapping[str, str]) -> str:
    return units.get(name, units.get(name.rpartition("[")[0], ""))


def _times(values: NDArray[np.generic], unit: str | None, log: RepairLog) -> Times:
    """Return times given as numbers: seconds unless a unit, or their size, says otherwise.

    Raises
    ------
    RecordError
        A time is missing, or its unit is unknown.
    """
    if unit and unit not in UNIT_NS:
        raise RecordError(f"the time is in {unit!r}; known are {' '.join(UNIT_NS)}")
    numbers = np.asarray(values)
    if not np.all(np.isfinite(numbers.astype(np.float64))):
        raise RecordError("a time is missing or infinite")
    epoch_ns = epoch_unit_ns(float(numbers[0]), UNIT_NS.get(unit or ""))
    if not unit and epoch_ns is None:
        log.add("no unit of time", "time array", "seconds", LIKELY)
    scale = epoch_ns or UNIT_NS.get(unit or "", SECOND_NS)
    if epoch_ns is None:
        return Times(numbers.astype(np.float64) * (scale * 1e-9), None, _float_tick_ns(numbers, scale))
    zero = int(numbers[0]) * scale if numbers.dtype.kind in "iu" else exact_decimal(repr(float(numbers[0])), scale)
    if numbers.dtype.kind == "f":
        grain = float(np.spacing(np.abs(numbers[0]).astype(numbers.dtype))) * scale
        log.add(f"absolute time as a float, {grain:.3g} ns apart", "time array", "taken as it is", GUESS)
    seconds = (numbers - numbers[0]).astype(np.float64) * (scale * 1e-9)
    return Times(seconds, zero, _float_tick_ns(numbers, scale))


def _float_tick_ns(numbers: NDArray[np.generic], scale: int) -> float:
    """Return the spacing of neighbouring numbers at the largest time, in nanoseconds."""
    if numbers.dtype.kind in "iu":
        return float(scale)
    largest = np.max(np.abs(numbers)).astype(numbers.dtype)
    return 4.0 * float(np.spacing(largest)) * scale
