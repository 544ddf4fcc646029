"""What is known about the event: which stations recorded it, and when fronts arrived there."""

from dataclasses import dataclass

from twlocate.quantity import Quantity

ZERO = Quantity(0.0)


@dataclass(frozen=True)
class Station:
    """A node with a recorder, as the estimator sees it."""

    node: str
    clock: Quantity | None = ZERO
    """By how much its clock is ahead of the common time, s; None where its clock is free."""
    delay: Quantity = ZERO
    """How much later than the wave its recorder sees it, s."""
    reflects: int = 0
    """Sign of what its bus makes of an across wave: −1 low, +1 high impedance, 0 not known."""
    launches: bool = False
    """Whether its first reading is a signal it sent into the route itself."""


@dataclass(frozen=True)
class Reading:
    """One arrival time at a station."""

    station: int
    time_s: float
    """As stamped by the station's clock, seconds from any common zero."""
    u_s: float
    outlier: float = 0.0
    """Probability that this is not a front of the event, so that its time says nothing."""
    polarity: int = 0
    """Sign of the front; 0 where it is not to be used."""
    blur_s: float = 0.0
    """Standard uncertainty to be added where the reading is taken for an echo of the first front."""
