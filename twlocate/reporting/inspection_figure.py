"""A figure of all channels, one panel each, thinned to extremes so that 10⁷ samples draw at once."""

import os
import tempfile
import warnings
from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np

from twlocate.arrays import FloatArray
from twlocate.errors import RecordError
from twlocate.records import Channel, Record, StatusChannel, Stretch

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

BINS = 1500
"""Columns of extremes across a panel: about the pixels it has."""
ENDINGS = (".png", ".pdf", ".svg")
WIDTH_IN, PANEL_IN, MARGIN_IN = 11.0, 0.85, 1.1
MAX_PANELS = 200
MAX_STATUS = 40
INK, STATUS_INK, TRIGGER_INK = "#1f3a5f", "#8a4b08", "#b00020"


def write_inspection_figure(records: Sequence[Record], path: Path) -> None:
    """Draw every channel of `records` into a file, complete or not at all.

    Raises
    ------
    RecordError
        The ending is of no drawing format, there are too many channels, or the file cannot be written.
    """
    if path.suffix.lower() not in ENDINGS:
        raise RecordError(f"{path}: a figure is written to one of {' '.join(ENDINGS)}")
    panels = sum(len(record.channels) + bool(changing(record)) for record in records)
    if panels > MAX_PANELS:
        raise RecordError(f"{path}: {panels} channels do not fit one figure of {MAX_PANELS}; give fewer files")
    try:
        handle, passing = tempfile.mkstemp(dir=path.parent, prefix=f".{path.name}.", suffix=path.suffix)
    except OSError as error:
        raise RecordError(f"{path}: cannot be written ({error.strerror})") from None
    os.close(handle)
    try:
        with warnings.catch_warnings():
            warnings.filterwarnings("ignore", "Glyph .* missing")  # a name in letters the font lacks shows as boxes
            inspection_figure(records, panels).savefig(passing, dpi=110)
        Path(passing).chmod(0o644)
        Path(passing).replace(path)
    finally:
        Path(passing).unlink(missing_ok=True)


def inspection_figure(records: Sequence[Record], panels: int) -> "Figure":
    """Return the figure: the panels of each record under its name, one time axis a record."""
    from matplotlib.figure import Figure

    figure = Figure(figsize=(WIDTH_IN, MARGIN_IN + PANEL_IN * panels), layout="constrained")
    axes = iter(figure.subplots(panels, 1, squeeze=False)[:, 0])
    for record in records:
        _draw_record(record, axes)
    figure.align_ylabels()
    return figure


def changing(record: Record) -> list[StatusChannel]:
    """Return the status channels that change, at most `MAX_STATUS` of them."""
    return [channel for channel in record.status if np.any(channel.states != channel.states[0])][:MAX_STATUS]


def _draw_record(record: Record, axes: "Sequence[Axes] | object") -> None:
    status = changing(record)
    own = [next(axes) for _ in range(len(record.channels) + bool(status))]  # type: ignore[call-overload]
    for panel, channel in zip(own, record.channels, strict=False):
        _draw_channel(panel, record, channel)
    if status:
        _draw_status(own[-1], record, status)
    ends = [(s.start_s, s.start_s + s.span_s) for s in record.stretches]
    for panel in own:
        panel.sharex(own[0])
        panel.tick_params(labelsize=7, labelbottom=panel is own[-1])
        panel.grid(axis="x", color="0.9", linewidth=0.6)
        panel.spines[["top", "right"]].set_visible(False)
        if record.trigger_s is not None:
            panel.axvline(record.trigger_s, color=TRIGGER_INK, linewidth=0.9, linestyle=":", zorder=3)
    left, right = min(start for start, _ in ends), max(end for _, end in ends)
    own[0].set_xlim(left, right if right > left else left + 1.0 / record.stretches[0].rate_hz)
    title = f"{record.path.name}   {record.station}"
    own[0].set_title(title, loc="left", fontsize=9, fontweight="bold", parse_math=False)
    dotted = " (dotted: trigger)" if record.trigger_s is not None else ""
    own[-1].set_xlabel(f"time from the record's start, s{dotted}", fontsize=8)


def _draw_channel(panel: "Axes", record: Record, channel: Channel) -> None:
    for stretch in record.stretches:
        times, samples = envelope(stretch, channel.samples, BINS)
        panel.plot(times + channel.skew_s, samples, color=INK, linewidth=0.7)
    label = f"{channel.name}\n{channel.unit}" if channel.unit else channel.name
    panel.set_ylabel(label, rotation=0, ha="right", va="center", fontsize=8, parse_math=False)


def envelope(stretch: Stretch, samples: FloatArray, bins: int) -> tuple[FloatArray, FloatArray]:
    """Return a line through the least and greatest sample of each bin; all samples where there are few.

    Parameters
    ----------
    stretch
        The stretch to draw.
    samples
        All samples of the record, NaN where missing.
    bins
        Number of bins.

    Returns
    -------
    times, values
        Shape (2 * bins,), or the stretch's own samples where it has no more than that.
    """
    inside = samples[stretch.first : stretch.stop]
    if stretch.count <= 2 * bins:
        return stretch.times_s(), inside
    edges = np.linspace(0, stretch.count, bins, endpoint=False).astype(np.int64)
    if stretch.stamps_s is None:
        starts = stretch.start_s + edges / stretch.rate_hz
    else:
        starts = stretch.stamps_s[edges]
    extremes = np.stack([np.fmin.reduceat(inside, edges), np.fmax.reduceat(inside, edges)], axis=1)
    return np.repeat(starts, 2), extremes.ravel()


def _draw_status(panel: "Axes", record: Record, status: Sequence[StatusChannel]) -> None:
    """Draw a bar for each time a changing status channel is 1."""
    for row, channel in enumerate(status):
        for stretch in record.stretches:
            panel.broken_barh(_ones(stretch, channel), (row - 0.35, 0.7), color=STATUS_INK)
    names = [channel.name for channel in status]
    panel.set_yticks(range(len(names)), names, fontsize=min(7.0, 60.0 / len(names)), parse_math=False)
    panel.set_ylim(len(status) - 0.5, -0.5)


def _ones(stretch: Stretch, channel: StatusChannel) -> list[tuple[float, float]]:
    """Return (start, duration) of each run of ones."""
    edges = np.flatnonzero(np.diff(channel.states[stretch.first : stretch.stop], prepend=0, append=0))
    step = 1.0 / stretch.rate_hz
    times = stretch.start_s + edges * step if stretch.stamps_s is None else np.append(
        stretch.stamps_s, stretch.stamps_s[-1] + step
    )[edges]  # fmt: skip
    return [(float(start), float(stop - start)) for start, stop in zip(times[::2], times[1::2], strict=True)]
