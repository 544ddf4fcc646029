"""What is in recordings: facts, then tables or JSON."""

import json
from dataclasses import asdict
from typing import Any

import numpy as np
from rich.console import Console, Group, RenderableType
from rich.table import Table
from rich.text import Text

from twlocate.records import Channel, Record, Repair, Stretch

CAUTION = (
    "A record tells when waves passed a recorder, no more: check channel names, polarity and clock against the "
    "station's own papers before you rely on it."
)


def utc_text(ns: int | None) -> str:
    """Return UTC nanoseconds since 1970-01-01 as ISO 8601 with nine digits, or a dash."""
    return "-" if ns is None else f"{np.datetime64(ns, 'ns')}Z"


def channel_facts(channel: Channel) -> dict[str, Any]:
    """Return the facts of one channel, ready for JSON."""
    known = channel.samples[~np.isnan(channel.samples)]
    return {
        "name": channel.name,
        "phase": channel.phase,
        "unit": channel.unit,
        "least": float(known.min()) if known.size else None,
        "greatest": float(known.max()) if known.size else None,
        "low": channel.low,
        "high": channel.high,
        "step": channel.step,
        "side": channel.side,
        "ratio": channel.ratio,
        "skew_s": channel.skew_s,
        "missing": channel.missing,
    }


def stretch_facts(stretch: Stretch) -> dict[str, Any]:
    """Return the facts of one stretch, ready for JSON."""
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
        "start": None if record.start_ns is None else utc_text(record.start_ns),
        "start_ns": record.start_ns,
        "resolution_ns": record.resolution_ns,
        "trigger_s": record.trigger_s,
        "line_frequency_hz": record.line_frequency_hz,
        "samples": record.n_samples,
        "clock": asdict(record.clock),
        "stretches": [stretch_facts(stretch) for stretch in record.stretches],
        "channels": [channel_facts(channel) for channel in record.channels],
        "status": [{"name": c.name, "normal": c.normal, "changes": changes(c.states)} for c in record.status],
        "repairs": [asdict(repair) for repair in record.repairs],
    }


def changes(states: np.ndarray) -> int:
    """Return how often a status channel changes."""
    return int(np.count_nonzero(np.diff(states)))


def inspection_json(records: list[Record], faults: list[str]) -> str:
    """Return everything about `records`, and the `faults` of files that could not be read, as JSON."""
    facts = {"records": [record_facts(record) for record in records], "errors": faults, "cautions": [CAUTION]}
    return json.dumps(facts, indent=2, ensure_ascii=False, allow_nan=False)


def print_inspection(records: list[Record]) -> None:
    """Print a table for each record."""
    console = Console(highlight=False)
    for record in records:
        console.print(record_panel(record_facts(record)))
    if records:
        console.print(Text(CAUTION, style="italic"))


def record_panel(facts: dict[str, Any]) -> Group:
    """Return what is shown of one record."""
    head = Table.grid(padding=(0, 2))
    for label, value in _head_rows(facts):
        head.add_row(label, Text(value))
    parts: list[RenderableType] = [Text(facts["file"], style="bold"), head, _channel_table(facts["channels"])]
    parts += [_repair_table([Repair(**repair) for repair in facts["repairs"]])] if facts["repairs"] else []
    return Group(*parts, Text(""))


def _head_rows(facts: dict[str, Any]) -> list[tuple[str, str]]:
    clock = facts["clock"]
    u_text = "not stated" if clock["u_s"] is None else f"{clock['u_s']:.3g} s standard uncertainty"
    return [
        ("format", facts["format"]),
        ("station", f"{facts['station']}  {facts['device']}"),
        ("start", f"{utc_text(facts['start_ns'])}  in steps of {facts['resolution_ns']} ns"),
        ("clock", f"{'usable' if clock['usable'] else 'NOT usable'}, {u_text}"),
        *(("", note) for note in clock["notes"]),
        *(("stretch", _stretch_text(stretch)) for stretch in facts["stretches"]),
        ("status", f"{len(facts['status'])} channels, {sum(1 for c in facts['status'] if c['changes'])} change"),
    ]


def _stretch_text(stretch: dict[str, Any]) -> str:
    even = "" if stretch["even"] else " (uneven, by the stamps)"
    place = f"{stretch['count']} samples from {stretch['start_s']:.9g} s over {stretch['span_s']:.9g} s"
    return f"{place} at {stretch['rate_hz']:.9g} Hz{even}"


def _channel_table(channels: list[dict[str, Any]]) -> Table:
    table = Table("channel", "unit", "least", "greatest", "step", "missing", "side")
    for c in channels:
        numbers = ["-" if c[key] is None else f"{c[key]:.6g}" for key in ("least", "greatest", "step")]
        table.add_row(Text(c["name"]), Text(c["unit"]), *numbers, str(c["missing"]), c["side"])
    return table


def _repair_table(repairs: list[Repair]) -> Table:
    table = Table("departure from the format", "where", "assumed", "how sure")
    for repair in repairs:
        table.add_row(Text(repair.what), Text(repair.where), Text(repair.assumed), repair.confidence)
    return table
