"""What a recording holds, whatever its format: channels, a true time axis, a clock, and what was repaired."""

from collections.abc import Iterator
from dataclasses import dataclass, field
from pathlib import Path

import numpy as np

from twlocate.arrays import FloatArray
from twlocate.errors import RecordError

NS = 1e-9


@dataclass(frozen=True)
class Repair:
    """One departure from the format's standard and what was done about it."""

    what: str
    where: str
    assumed: str
    confidence: str
    """``"sure"`` (nothing else is possible), ``"likely"`` or ``"guess"``."""


@dataclass(frozen=True)
class Clock:
    """How far the record's absolute time may be trusted.

    ``u_s`` is the standard uncertainty of the record's time against UTC in seconds; ``None`` where the
    recording does not state it. A clock that is not ``usable`` must be treated as free.
    """

    u_s: float | None = None
    usable: bool = True
    notes: tuple[str, ...] = ()
    utc_offset_s: int | None = None
    """Offset from UTC of the clock the file is stamped by, already taken off; None where the file does not state it."""


@dataclass(frozen=True)
class Channel:
    """An analog channel, scaled to `unit`; missing samples are NaN."""

    name: str
    unit: str
    samples: FloatArray
    phase: str = ""
    skew_s: float = 0.0
    """The channel was sampled this much later than the record's stamps say."""
    step: float | None = None
    """Size of one converter step in `unit`, where the format tells."""
    offset: float = 0.0
    """The reading at count 0 of the converter, in `unit`."""
    low: float | None = None
    """Smallest and largest reading the converter can give, in `unit`, where the format tells."""
    high: float | None = None
    side: str = ""
    """``"primary"`` or ``"secondary"``: the side of the transducer the readings are on, where the format tells."""
    ratio: float | None = None
    """Primary over secondary, where the format tells."""

    @property
    def missing(self) -> int:
        """How many samples are missing."""
        return int(np.count_nonzero(np.isnan(self.samples)))


@dataclass(frozen=True)
class StatusChannel:
    """A two-state channel."""

    name: str
    states: np.ndarray
    """uint8, 0 or 1, one a sample."""
    normal: int = 0


@dataclass(frozen=True)
class Stretch:
    """An unbroken run of samples; gaps lie between stretches and are never filled.

    Evenly spaced samples have ``stamps_s is None``; otherwise ``stamps_s`` holds each sample's time.
    """

    first: int
    count: int
    start_s: float
    """Time of the first sample, seconds from the record's start."""
    rate_hz: float
    """Samples a second (the mean where the spacing is uneven)."""
    stamps_s: FloatArray | None = None

    def times_s(self) -> FloatArray:
        """Return the time of each sample in seconds from the record's start."""
        if self.stamps_s is not None:
            return self.stamps_s
        return self.start_s + np.arange(self.count) / self.rate_hz

    @property
    def stop(self) -> int:
        """Index one past the last sample."""
        return self.first + self.count

    @property
    def span_s(self) -> float:
        """From the first to the last sample, seconds."""
        if self.stamps_s is not None:
            return float(self.stamps_s[-1] - self.stamps_s[0])
        return (self.count - 1) / self.rate_hz


@dataclass(frozen=True)
class Record:
    """A recording as read: nothing invented, every departure from the format written down in `repairs`."""

    path: Path
    format: str
    channels: tuple[Channel, ...]
    stretches: tuple[Stretch, ...]
    station: str = ""
    device: str = ""
    start_ns: int | None = None
    """Zero of the record's time axis, integer nanoseconds UTC since 1970-01-01; None without absolute time."""
    resolution_ns: int | None = None
    """Size of the last digit in which the start is given."""
    trigger_s: float | None = None
    """Trigger, seconds from the record's start."""
    line_frequency_hz: float | None = None
    status: tuple[StatusChannel, ...] = ()
    clock: Clock = field(default_factory=Clock)
    repairs: tuple[Repair, ...] = ()
    files: tuple[Path, ...] = ()
    """Every file the record was read from."""

    @property
    def n_samples(self) -> int:
        """Samples a channel, over all stretches."""
        return sum(stretch.count for stretch in self.stretches)

    def channel(self, name: str) -> Channel:
        """Return the channel called `name`.

        Raises
        ------
        RecordError
            There is none, or more than one, of that name.
        """
        found = [channel for channel in self.channels if channel.name == name]
        if len(found) == 1:
            return found[0]
        names = ", ".join(repr(channel.name) for channel in self.channels[:24])
        fault = f"{len(found)} channels are" if found else "no channel is"
        raise RecordError(f"{self.path}: {fault} called {name!r}; it has {names}")

    def pieces(self, channel: Channel) -> Iterator[tuple[FloatArray, FloatArray]]:
        """Yield (times in seconds from the record's start, samples) of each stretch, the channel's skew applied."""
        for stretch in self.stretches:
            yield stretch.times_s() + channel.skew_s, channel.samples[stretch.first : stretch.stop]
