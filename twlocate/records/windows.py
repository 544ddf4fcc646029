"""A time span of a record."""

from dataclasses import replace

import numpy as np

from twlocate.errors import RecordError
from twlocate.records.record import Channel, Record, Stretch


def sample_range(stretch: Stretch, from_s: float, to_s: float) -> tuple[int, int]:
    """Return the first sample of `stretch` at or after `from_s` and the one past the last at or before `to_s`."""
    if stretch.stamps_s is not None:
        first = int(np.searchsorted(stretch.stamps_s, from_s, "left"))
        stop = int(np.searchsorted(stretch.stamps_s, to_s, "right"))
    else:
        first = int(np.ceil((from_s - stretch.start_s) * stretch.rate_hz - 1e-6))
        last = np.floor((min(to_s, stretch.start_s + stretch.span_s) - stretch.start_s) * stretch.rate_hz + 1e-6)
        stop = int(last) + 1
    return max(0, min(first, stretch.count)), max(0, min(stop, stretch.count))


def shortened(stretch: Stretch, first: int, stop: int, new_first: int) -> Stretch:
    """Return samples `first` to `stop` of a stretch as a stretch whose first sample has index `new_first`."""
    start_s = (
        float(stretch.times_s()[first]) if stretch.stamps_s is not None else stretch.start_s + first / stretch.rate_hz
    )
    stamps = None if stretch.stamps_s is None else stretch.stamps_s[first:stop]
    return Stretch(new_first, stop - first, start_s, stretch.rate_hz, stamps)


def windowed_stretches(
    stretches: tuple[Stretch, ...], span: tuple[float, float]
) -> tuple[tuple[Stretch, ...], list[tuple[int, int]]]:
    """Return the stretches inside `span` and, for each, its range of samples in the whole record.

    Raises
    ------
    RecordError
        No sample lies in the span.
    """
    kept: list[Stretch] = []
    ranges: list[tuple[int, int]] = []
    for stretch in stretches:
        first, stop = sample_range(stretch, *span)
        if stop > first:
            kept.append(shortened(stretch, first, stop, sum(piece.count for piece in kept)))
            ranges.append((stretch.first + first, stretch.first + stop))
    if not kept:
        ends = max(stretch.start_s + stretch.span_s for stretch in stretches)
        raise RecordError(f"no sample from {span[0]:g} to {span[1]:g} s; the record runs to {ends:.6g} s")
    return tuple(kept), ranges


def cut(record: Record, span: tuple[float, float] | None) -> Record:
    """Return the part of a record inside `span`, seconds from its start; the time axis stays; None keeps all."""
    if span is None:
        return record
    stretches, ranges = windowed_stretches(record.stretches, span)
    index = np.concatenate([np.arange(first, stop) for first, stop in ranges])
    channels = tuple(_cut_channel(channel, index) for channel in record.channels)
    status = tuple(replace(channel, states=channel.states[index]) for channel in record.status)
    return replace(record, stretches=stretches, channels=channels, status=status)


def _cut_channel(channel: Channel, index: np.ndarray) -> Channel:
    return replace(channel, samples=channel.samples[index])
