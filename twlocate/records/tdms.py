"""TDMS files by nptdms: waveform properties give increment and start."""

from pathlib import Path
from typing import Any

import numpy as np

from twlocate.errors import RecordError
from twlocate.records.extras import needed
from twlocate.records.moments import SECOND_NS
from twlocate.records.named_arrays import NamedArrays, record_of_arrays
from twlocate.records.record import Record
from twlocate.records.repairs import SURE, RepairLog
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
    try:
        file = nptdms.TdmsFile.read(path, raw_timestamps=True)
        channels = [channel for group in file.groups() for channel in group.channels()]
        found, log = _gathered([channel for channel in channels if len(channel)])
    except (RecordError, MemoryError):
        raise
    except Exception as error:  # the library raises a dozen unrelated types for a damaged file
        raise RecordError(f"not a readable TDMS file ({' '.join(str(error).split())[:120]})") from None
    return cut(record_of_arrays(path, "TDMS", found, log), span)


def _gathered(channels: list[Any]) -> tuple[NamedArrays, RepairLog]:
    log = RepairLog()
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
    return found, log


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
