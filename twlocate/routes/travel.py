"""How long a wave takes along a path, and how that depends on each length, speed and flow.

For an event at x in a section, the time along any path is linear in x, and so are its derivatives with
respect to the section lengths, wave speeds and flow speeds; they are therefore kept as two coefficients.
"""

from dataclasses import dataclass

import numpy as np

from twlocate.arrays import FloatArray
from twlocate.quantity import Quantity
from twlocate.routes.paths import Extent, WavePath
from twlocate.routes.route import Route

N_INPUTS = 3
"""Inputs a section: length, wave speed, flow speed, in this order."""


@dataclass(frozen=True)
class TravelTime:
    """Time t(x) = constant_s + per_metre·x, and d t/d input = at_zero + slope·x for every section input."""

    constant_s: float
    per_metre: float
    at_zero: FloatArray
    """shape (sections, 3): length (s/m), wave speed and flow speed (s per m/s)."""
    slope: FloatArray
    """shape (sections, 3): the same, per metre of x."""


def travel_time(route: Route, path: WavePath) -> TravelTime:
    """Add up the legs of `path`.

    A leg of length ℓ takes ℓ·s with the slowness s = 1/(a + w) along the flow w and 1/(a − w) against it.
    """
    constant = per_metre = 0.0
    at_zero = np.zeros((len(route.sections), N_INPUTS))
    slope = np.zeros_like(at_zero)
    for leg in path.legs:
        section = route.sections[leg.section]
        sign = 1.0 if leg.along else -1.0
        slowness = 1.0 / (section.speed.value + sign * section.flow.value)
        whole, share_of_x = _EXTENTS[leg.extent]  # ℓ = whole·L + share·x
        by_length = np.array([0.0, -(slowness**2), -sign * slowness**2])  # d t / d (speed, flow) per metre
        constant += whole * section.length.value * slowness
        per_metre += share_of_x * slowness
        at_zero[leg.section] += whole * section.length.value * by_length
        at_zero[leg.section, 0] += whole * slowness
        slope[leg.section] += share_of_x * by_length
    return TravelTime(constant, per_metre, at_zero, slope)


_EXTENTS = {Extent.WHOLE: (1.0, 0.0), Extent.UP_TO_X: (0.0, 1.0), Extent.BEYOND_X: (1.0, -1.0)}


def transit_s(route: Route, start: str, end: str) -> Quantity:
    """Return how long a wave takes from node to node, s, with its standard uncertainty."""
    time = variance = 0.0
    for index, along in route.hops(start, end):
        section = route.sections[index]
        speed = section.speed.value + (section.flow.value if along else -section.flow.value)
        hop = section.length.value / speed
        speed_variance = section.speed.u**2 + section.flow.u**2
        time += hop
        variance += (section.length.u / speed) ** 2 + (hop / speed) ** 2 * speed_variance
    return Quantity(time, variance**0.5)
