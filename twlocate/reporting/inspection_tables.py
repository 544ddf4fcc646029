"""Tables of what is in recordings, for a terminal."""

from collections.abc import Sequence
from typing import Any, Literal

from rich.box import SIMPLE_HEAD
from rich.console import Console, Group, RenderableType
from rich.table import Table
from rich.text import Text

SHOWN_STATUS = 12
SHOWN_STRETCHES = 12
TIME_UNITS = ((86400.0, "days"), (3600.0, "h"), (1.0, "s"), (1e-3, "ms"), (1e-6, "µs"), (1e-9, "ns"))
CLOCK_STYLES = {"free": "bold red", "unstated": "yellow", "usable": "green"}


def print_inspection(facts: dict[str, Any]) -> None:
    """Print a table a record, what several have in common, and the cautions."""
    console = Console(highlight=False)
    for record in facts["records"]:
        console.print(record_block(record))
    if len(facts["records"]) > 1:
        console.print(comparison_block(facts["records"], facts["overlap"]))
    if facts["records"]:
        console.print(Text("\n".join(facts["cautions"]), style="italic"))


def duration(seconds: float | None, digits: int = 4) -> str:
    """Return a time with the unit that suits its size."""
    if seconds is None:
        return "-"
    size, unit = next(((size, unit) for size, unit in TIME_UNITS if abs(seconds) >= size), TIME_UNITS[-1])
    return f"{seconds / size:.{digits}g} {unit}" if seconds else "0 s"


def clock_state(clock: dict[str, Any]) -> str:
    """Return the state of a clock in a word: usable, unstated (usable once its accuracy is known) or free."""
    if not clock["usable"]:
        return "free"
    return "unstated" if clock["u_s"] is None else "usable"


def clock_text(clock: dict[str, Any]) -> Text:
    """Return what may be concluded from the clock."""
    state = clock_state(clock)
    text = {
        "free": "free: its absolute time must not be compared with another record's",
        "unstated": "usable once its accuracy is stated in the case",
        "usable": f"standard uncertainty {duration(clock['u_s'], 3)}",
    }[state]
    return Text(text, style=CLOCK_STYLES[state])


def record_block(facts: dict[str, Any]) -> Group:
    """Return what is shown of one record."""
    blank = Text("")
    parts: list[RenderableType] = [Text(facts["file"], style="bold"), _head(facts), blank]
    parts += [_channel_table(facts["channels"]), blank] if facts["channels"] else []
    parts += [_status_lines(facts["status"]), blank] if facts["status"] else []
    parts += [_repair_table(facts["repairs"]) if facts["repairs"] else Text("  read without repairs"), blank]
    return Group(*parts)


def _head(facts: dict[str, Any]) -> Table:
    grid = Table.grid(padding=(0, 2))
    grid.add_column(style="dim", min_width=10)
    rows: list[tuple[str, str | Text]] = [
        ("  format", facts["format"]),
        ("  station", "  ".join(text for text in (facts["station"], facts["device"]) if text)),
        ("  start", _start_text(facts)),
        ("  trigger", "" if facts["trigger_s"] is None else f"{facts['trigger_s']:.9g} s after the start"),
        ("  clock", clock_text(facts["clock"])),
        *(("", note) for note in facts["clock"]["notes"]),
        *(("  samples", text) for text in _stretch_texts(facts["stretches"])),
        ("  line", "" if facts["line_frequency_hz"] is None else f"{facts['line_frequency_hz']:g} Hz"),
    ]
    shown_label = ""
    for label, value in rows:
        if value:
            grid.add_row(label if label != shown_label else "", value if isinstance(value, Text) else Text(value))
            shown_label = label or shown_label
    return grid


def _start_text(facts: dict[str, Any]) -> str:
    if facts["start"] is None:
        return "no absolute time"
    offset_s = facts["clock"]["utc_offset_s"]
    local = f", file stamped {offset_s / 3600:+g} h from UTC" if offset_s else ""
    return f"{facts['start']} (to {duration(facts['resolution_ns'] * 1e-9)}{local})"


def _stretch_texts(stretches: Sequence[dict[str, Any]]) -> list[str]:
    texts = [_stretch_text(stretch, len(stretches) > 1) for stretch in stretches[:SHOWN_STRETCHES]]
    return texts + _more(len(stretches) - SHOWN_STRETCHES, "stretches")


def _more(hidden: int, what: str) -> list[str]:
    return [f"and {hidden} more {what}: --json lists all"] if hidden > 0 else []


def _stretch_text(stretch: dict[str, Any], several: bool) -> str:
    start = f"from {stretch['start_s']:.9g} s " if several or stretch["start_s"] else ""
    spacing = "at" if stretch["even"] else "uneven, by their stamps, on average at"
    return f"{stretch['count']} {start}over {stretch['span_s']:.6g} s, {spacing} {stretch['rate_hz']:.9g} Hz"


COLUMNS = ("channel", "unit", "least", "greatest", "step", "at limit", "missing", "skew", "side")
NUMERIC_COLUMNS = COLUMNS[2:8]


def _table(title: str | None = None) -> Table:
    return Table(box=SIMPLE_HEAD, show_edge=False, title=title, title_justify="left", title_style="bold")


def _channel_table(channels: Sequence[dict[str, Any]]) -> Table:
    """Return the table of analog channels, without the columns that would say nothing."""
    rows = [_channel_row(channel) for channel in channels]
    telling = [any(row[index] not in ("", "0", "-") for row in rows) for index in range(len(COLUMNS))]
    shown = [index for index, tells in enumerate(telling) if tells or index == 0]
    table = _table()
    for index in shown:
        numeric = COLUMNS[index] in NUMERIC_COLUMNS
        table.add_column(COLUMNS[index], justify="right" if numeric else "left", overflow="fold", no_wrap=numeric)
    for row in rows:
        table.add_row(*(Text(row[index]) for index in shown))
    return table


def _channel_row(channel: dict[str, Any]) -> list[str]:
    side = channel["side"]
    return [
        channel["name"],
        channel["unit"],
        *("-" if channel[key] is None else f"{channel[key]:.5g}" for key in ("least", "greatest", "step")),
        str(channel["at_limit"] or 0),
        str(channel["missing"]),
        duration(channel["skew_s"]) if channel["skew_s"] else "0",
        f"{side[:3]} {channel['ratio']:.5g}:1" if side and channel["ratio"] not in (None, 1.0) else side,
    ]


def _status_lines(status: Sequence[dict[str, Any]]) -> Text:
    changing = [channel for channel in status if channel["changes"]]
    lines = [f"  {len(status)} status channels, {len(changing)} of which change"]
    for channel in sorted(changing, key=lambda channel: channel["changes"][0][0])[:SHOWN_STATUS]:
        when, state = channel["changes"][0]
        times = len(channel["changes"])
        again = f", {times} changes in all" if times > 1 else ""
        lines.append(f"    {channel['name'] or '(no name)'}: {state} at {when:.6g} s{again}")
    lines += [f"    {text}" for text in _more(len(changing) - SHOWN_STATUS, "that change")]
    return Text("\n".join(lines))


def _repair_table(repairs: Sequence[dict[str, Any]]) -> Table:
    table = _table("repairs made in reading")
    for title in ("departure", "where", "assumed", "how sure"):
        table.add_column(title, overflow="fold")
    for repair in repairs:
        table.add_row(*(Text(repair[key]) for key in ("what", "where", "assumed", "confidence")))
    return table


def comparison_block(records: Sequence[dict[str, Any]], overlap: dict[str, Any] | None) -> Group:
    """Return clocks and spans of several records side by side."""
    table = _table("side by side")
    for title in ("file", "start", "seconds", "clock", "u (k = 1)"):
        justify: Literal["left", "right"] = "right" if title == "seconds" else "left"
        table.add_column(title, overflow="fold", justify=justify, no_wrap=title != "file")
    for facts in records:
        state = clock_state(facts["clock"])
        name = Text(facts["file"].replace("\\", "/").rpartition("/")[2])
        cells = (facts["start"] or "-", f"{facts['end_s']:.6g}", Text(state, style=CLOCK_STYLES[state]))
        table.add_row(name, *cells, duration(facts["clock"]["u_s"], 3))
    return Group(table, Text(""), Text(overlap_text(overlap, len(records))), Text(""))


def overlap_text(overlap: dict[str, Any] | None, count: int) -> str:
    """Return in a sentence how the records lie in time."""
    if overlap is None:
        return "  fewer than two records have an absolute time: how they lie in time is unknown"
    which = "all" if overlap["records"] == count else f"the {overlap['records']} with an absolute time"
    if overlap["span_s"] < 0.0:
        return f"  {which} share no moment: {duration(-overlap['span_s'])} between one's end and another's start"
    return f"  {which} overlap for {duration(overlap['span_s'], 6)}"
