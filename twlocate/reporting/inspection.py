"""What is in recordings, as facts: the common ground of the tables and of the JSON."""

import json
from collections.abc import Sequence
from dataclasses import asdict
from typing import Any

import numpy as np
from numpy.typing import NDArray

from twlocate.records import Channel, Record, StatusChannel, Stretch

CAUTION = (
    "A record tells when a wave passed a recorder, and no more. Check channel names, polarity, ratios and clock "
    "against the station's own papers before anyone acts on it."
)
NS = 1e-9
DIGITS = ((10**9, 0), (10**6, 3), (10**3, 6), (1, 9))
"""Resolution in nanoseconds, and the digits of a second that it needs."""


def utc_text(ns: int | None, resolution_ns: int | None = None) -> str | None:
    """Return UTC nanoseconds since 1970-01-01 in ISO 8601, to the digits that `resolution_ns` supports."""
    if ns is None:
        return None
    digits = next(digits for size, digits in DIGITS if size <= max(1, resolution_ns or 1))
    whole, _, fraction = str(np.datetime64(ns, "ns")).partition(".")
    return f"{whole}.{fraction[:digits]}Z" if digits else f"{whole}Z"


def channel_facts(channel: Channel) -> dict[str, Any]:
    """Return the facts of one analog channel."""
    missing = channel.missing
    known = channel.samples[~np.isnan(channel.samples)] if missing else channel.samples
    return {
        "name": channel.name,
        "phase": channel.phase,
        "unit": channel.unit,
        "least": float(known.min()) if known.size else None,
        "greatest": float(known.max()) if known.size else None,
        "low": channel.low,
        "high": channel.high,
        "at_limit": at_limit(channel, known),
        "step": channel.step,
        "side": channel.side,
        "ratio": channel.ratio,
        "skew_s": channel.skew_s,
        "missing": missing,
    }


def at_limit(channel: Channel, known: NDArray[np.float64]) -> int | None:
    """Return how many samples stand at an end of the converter's range, half a step allowed; None where not known."""
    if channel.low is None or channel.high is None:
        return None
    margin = 0.5 * (channel.step or 0.0)
    return int(np.count_nonzero((known <= channel.low + margin) | (known >= channel.high - margin)))


def status_facts(channel: StatusChannel, record: Record) -> dict[str, Any]:
    """Return the facts of one status channel: its changes as (seconds from the start, new state)."""
    index = np.flatnonzero(np.diff(channel.states)) + 1
    changes = [[time_of(record, int(i)), int(channel.states[i])] for i in index]
    return {"name": channel.name, "normal": channel.normal, "changes": changes}


def time_of(record: Record, sample: int) -> float:
    """Return when a sample was taken, in seconds from the record's start."""
    stretch = next(stretch for stretch in record.stretches if sample < stretch.stop)
    within = sample - stretch.first
    return float(stretch.start_s + within / stretch.rate_hz if stretch.stamps_s is None else stretch.stamps_s[within])


def stretch_facts(stretch: Stretch) -> dict[str, Any]:
    """Return the facts of one stretch."""
    return {
        "first": stretch.first,
        "count": stretch.count,
        "start_s": stretch.start_s,
        "span_s": stretch.span_s,
        "rate_hz": stretch.rate_hz,
        "even": stretch.stamps_s is None,
    }


def record_facts(record: Record) -> dict[str, Any]:
    """Return the facts of one record, ready for JSON."""
    return {
        "file": str(record.path),
        "format": record.format,
        "station": record.station,
        "device": record.device,
        "start": utc_text(record.start_ns, record.resolution_ns),
        "start_ns": record.start_ns,
        "resolution_ns": record.resolution_ns,
        "end_s": end_s(record),
        "trigger_s": record.trigger_s,
        "line_frequency_hz": record.line_frequency_hz,
        "samples": record.n_samples,
        "clock": asdict(record.clock),
        "stretches": [stretch_facts(stretch) for stretch in record.stretches],
        "channels": [channel_facts(channel) for channel in record.channels],
        "status": [status_facts(channel, record) for channel in record.status],
        "repairs": [asdict(repair) for repair in record.repairs],
    }


def end_s(record: Record) -> float:
    """Return the time of the last sample, in seconds from the record's start."""
    return max(stretch.start_s + stretch.span_s for stretch in record.stretches)


def overlap_facts(facts: Sequence[dict[str, Any]]) -> dict[str, Any] | None:
    """Return the span that all records with an absolute time share, or None where fewer than two have one.

    ``span_s`` is negative where they miss one another: by so much.
    """
    spans = [
        (f["start_ns"] + round(f["stretches"][0]["start_s"] / NS), f["start_ns"] + round(f["end_s"] / NS))
        for f in facts
        if f["start_ns"] is not None
    ]
    if len(spans) < 2:
        return None
    from_ns, to_ns = max(start for start, _ in spans), min(end for _, end in spans)
    return {"from_ns": from_ns, "to_ns": to_ns, "span_s": (to_ns - from_ns) * NS, "records": len(spans)}


def inspection_facts(records: Sequence[Record], faults: Sequence[str]) -> dict[str, Any]:
    """Return everything about `records`, and the `faults` of files that could not be read."""
    facts = [record_facts(record) for record in records]
    return {"records": facts, "overlap": overlap_facts(facts), "errors": list(faults), "cautions": [CAUTION]}


def inspection_json(facts: dict[str, Any]) -> str:
    """Return the facts as JSON."""
    return json.dumps(facts, indent=2, ensure_ascii=False, allow_nan=False)
