"""The uncertain inputs of a location, in one fixed order, by name.

Order: length, wave speed and flow speed of each section; delay of each station; clock of each station.
Arrival times are inputs too, but each explanation uses others of them, so they are kept apart.
"""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from twlocate.arrays import FloatArray
from twlocate.position.evidence import Station
from twlocate.quantity import Quantity
from twlocate.routes import Route, TravelTime


@dataclass(frozen=True)
class Input:
    """One uncertain input: its name, SI unit and standard uncertainty."""

    name: str
    unit: str
    u: float


def list_inputs(route: Route, stations: Sequence[Station]) -> tuple[Input, ...]:
    """Return every input in the order of the columns of :func:`columns`."""
    sections = [
        Input(f"{word} of {section.name}", unit, quantity.u)
        for section in route.sections
        for word, unit, quantity in (
            ("length", "m", section.length),
            ("wave speed", "m/s", section.speed),
            ("flow speed", "m/s", section.flow),
        )
    ]
    delays = [Input(f"delay at {station.node}", "s", station.delay.u) for station in stations]
    clocks = [Input(f"clock of {station.node}", "s", (station.clock or Quantity(0.0)).u) for station in stations]
    return (*sections, *delays, *clocks)


def columns(travel: TravelTime, station: int, n_stations: int) -> tuple[FloatArray, FloatArray]:
    """Return d t / d input of one reading as (value at x = 0, slope a metre of x), one entry an input."""
    own = np.zeros(n_stations)
    own[station] = 1.0
    at_zero = np.concatenate([travel.at_zero.ravel(), own, own])
    slope = np.concatenate([travel.slope.ravel(), np.zeros(2 * n_stations)])
    return at_zero, slope


def input_variances(route: Route, stations: Sequence[Station]) -> FloatArray:
    """Return the variance of every input, shape (P,)."""
    of_sections = [q.u**2 for section in route.sections for q in (section.length, section.speed, section.flow)]
    of_delays = [station.delay.u**2 for station in stations]
    of_clocks = [0.0 if station.clock is None else station.clock.u**2 for station in stations]
    return np.array([*of_sections, *of_delays, *of_clocks])
