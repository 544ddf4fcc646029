"""The facts about a trace and about one wave front that arrived in it."""

from dataclasses import dataclass
from typing import TYPE_CHECKING

from twlocate.arrays import FloatArray

if TYPE_CHECKING:
    from twlocate.arrivals.refine import Front


@dataclass(frozen=True)
class Trace:
    """Evenly sampled values of one wave or one measured variable, ready to be picked."""

    samples: FloatArray
    rate_hz: float
    start_s: float = 0.0
    """Time of the first sample, seconds from the record's start."""
    name: str = ""
    unit: str = ""
    step: float = 0.0
    """Converter step in `unit`; 0 where unknown."""
    line_frequency_hz: float | None = None


@dataclass(frozen=True)
class Arrival:
    """One front: when its onset arrived and how far that time may be trusted."""

    time_s: float
    """Onset, seconds from the record's start."""
    u_s: float
    """Standard uncertainty of `time_s`, seconds."""
    polarity: int
    """+1 or −1."""
    amplitude: float
    """Height of the front in the trace's unit, without sign."""
    snr_db: float
    """Amplitude over the standard deviation of the noise before the event, dB."""
    outlier: float
    """Probability that this is not the front it is taken for, so that its time says nothing."""
    rise_s: float = 0.0
    """Fitted rise time of the front."""
    shape: str = ""
    """The front model that fits best."""


@dataclass(frozen=True)
class Gate:
    """A quality check carried to the result."""

    name: str
    passed: bool
    detail: str
    """What was seen, in a plain sentence with figures."""
    fatal: bool = False
    """Whether no position can be given when it does not pass."""


@dataclass(frozen=True)
class Picks:
    """What was found in a trace."""

    trace: Trace
    level: FloatArray
    """(n,) the trace without the power frequency; what was timed."""
    denoised: FloatArray
    """(n,) the same, shrunk."""
    noise: float
    """Standard deviation of the noise before the event, in the trace's unit."""
    arrivals: tuple[Arrival, ...]
    """In time order."""
    gates: tuple[Gate, ...]
    fronts: tuple["Front", ...] = ()
    """The fitted front behind each arrival."""
