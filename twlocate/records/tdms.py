"""TDMS files by nptdms: waveform properties give increment and start."""

import contextlib
import io
import logging
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import numpy as np

from twlocate.errors import RecordError
from twlocate.records.extras import needed
from twlocate.records.moments import SECOND_NS
from twlocate.records.named_arrays import NamedArrays, record_of_arrays
from twlocate.records.record import Record
from twlocate.records.repairs import LIKELY, SURE, RepairLog
from twlocate.records.windows import cut

UNIT_PROPERTIES = ("unit_string", "NI_UnitDescription", "unit", "units")
TDMS_EPOCH = -2_082_844_800
"""1904-01-01, the zero of TDMS time stamps, in seconds from 1970-01-01."""


def read_tdms(path: Path, span: tuple[float, float] | None) -> Record:
    """Read the channels of a TDMS file that share one increment and one start.

    Raises
    ------
    RecordError
        The file is damaged, or its channels have no time.
    """
    nptdms = needed("nptdms")
    log = RepairLog()
    try:
        with _complaints() as complaints:
            # from memory: a damaged length then asks for no more than the file has
            file = nptdms.TdmsFile.read(io.BytesIO(path.read_bytes()), raw_timestamps=True)
        channels = [channel for group in file.groups() for channel in group.channels()]
        found = _gathered([channel for channel in channels if len(channel)], log)
    except (RecordError, MemoryError):
        raise
    except Exception as error:  # the library raises a dozen unrelated types for a damaged file
        raise RecordError(f"not a readable TDMS file ({' '.join(str(error).split())[:120]})") from None
    for complaint in complaints:
        log.add(complaint, "TDMS segments", "what is there is read", LIKELY)
    return cut(record_of_arrays(path, "TDMS", found, log), span)


@contextlib.contextmanager
def _complaints() -> Iterator[list[str]]:
    """Collect what the library would print about a departure from the format."""
    from nptdms.log import log_manager

    collected: list[str] = []

    def collect(record: logging.LogRecord) -> bool:
        collected.append(" ".join(record.getMessage().split())[:160])
        return False

    log_manager.console_handler.addFilter(collect)
    try:
        yield collected
    finally:
        log_manager.console_handler.removeFilter(collect)


def _gathered(channels: list[Any], log: RepairLog) -> NamedArrays:
    timed = [channel for channel in channels if "wf_increment" in channel.properties]
    found = NamedArrays({})
    if timed:
        found.settings["rate"] = repr(1.0 / float(timed[0].properties["wf_increment"]))
        found.settings.update(_start(timed[0].properties))
    for channel in channels:
        if timed and _timing(channel.properties) != _timing(timed[0].properties):
            log.add("another increment or start", f"channel {channel.name!r}", "left out", SURE)
            continue
        found.arrays[channel.name] = np.asarray(channel[:])
        unit = next((channel.properties[key] for key in UNIT_PROPERTIES if key in channel.properties), "")
        found.units[channel.name] = str(unit)
    return found


def _timing(properties: dict[str, Any]) -> tuple[Any, ...]:
    return tuple(str(properties.get(key)) for key in ("wf_increment", "wf_start_time", "wf_start_offset"))


def _start(properties: dict[str, Any]) -> dict[str, str]:
    """Return the setting ``start``, exact from the stamp's 2^-64 s fraction, the waveform's offset added."""
    stamp = properties.get("wf_start_time")
    if stamp is None:
        return {}
    fraction_ns = (int(stamp.second_fractions) * SECOND_NS + 2**63) // 2**64
    offset_ns = round(float(properties.get("wf_start_offset", 0.0)) * SECOND_NS)
    ns = (int(stamp.seconds) + TDMS_EPOCH) * SECOND_NS + fraction_ns + offset_ns
    return {"start": f"{np.datetime64(ns, 'ns')}Z"}
