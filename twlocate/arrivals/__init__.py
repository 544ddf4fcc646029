"""From a trace to the fronts that arrive in it, each with a standard uncertainty that can be believed."""

from twlocate.arrivals.arrival import Arrival, Gate, Picks, Trace
from twlocate.arrivals.modes import strongest_mode
from twlocate.arrivals.picking import pick

__all__ = ["Arrival", "Gate", "Picks", "Trace", "pick", "strongest_mode"]
