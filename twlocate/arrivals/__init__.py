"""From a trace to the fronts that arrive in it, each with a standard uncertainty that can be believed."""

from twlocate.arrivals.arrival import Arrival, Gate, Picks, Trace
from twlocate.arrivals.modes import strongest_mode
from twlocate.arrivals.picking import pick
from twlocate.arrivals.refine import Front

__all__ = ["Arrival", "Front", "Gate", "Picks", "Trace", "pick", "strongest_mode"]
