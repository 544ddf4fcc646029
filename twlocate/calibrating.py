"""Section speeds from an event whose origin is known: an energisation, a valve, an external or a found fault."""

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from twlocate.arrays import FloatArray
from twlocate.case import Case
from twlocate.errors import CaseError, NoPosition
from twlocate.locating import locate, station_of
from twlocate.position import Reading, Station
from twlocate.position.inputs import columns, list_inputs
from twlocate.quantity import Quantity
from twlocate.routes import Route, direct_path, travel_time
from twlocate.routes.travel import N_INPUTS

CONTRADICTION = 6.0
"""A move beyond this many standard uncertainties is a mistake, not a calibration (common practice, no source)."""

ROUNDS = 4
"""Arrival times are all but linear in the speeds; each round brings the remaining error to its square."""


@dataclass(frozen=True)
class Origin:
    """Where the event is known to have happened."""

    section: int
    distance: Quantity
    """m from the section's from-node."""
    at_end: bool = False
    """At the to-node, wherever that is: the distance is the section's length."""


@dataclass(frozen=True)
class Calibrated:
    """A section's speed before and after."""

    section: str
    prior: Quantity
    speed: Quantity

    @property
    def moved(self) -> bool:
        """Whether the event narrowed the stated speed by a ten-thousandth or more of its uncertainty."""
        return self.speed.u < 0.9999 * self.prior.u

    @property
    def pull(self) -> float:
        """The move over its own standard uncertainty; beyond ± 3 the statement and the event contradict each other."""
        return (self.speed.value - self.prior.value) / (self.prior.u**2 - self.speed.u**2) ** 0.5 if self.moved else 0.0


def origin_at(route: Route, place: str | Quantity, section: str | None = None) -> Origin:
    """Return the origin for a node's name, or for a distance in a section.

    Raises
    ------
    CaseError
        There is no such node or section, or the distance is not in the section.
    """
    if isinstance(place, str):
        for index, candidate in enumerate(route.sections):
            if place in (candidate.from_node, candidate.to_node):
                at_end = place == candidate.to_node
                return Origin(index, candidate.length if at_end else Quantity(0.0), at_end)
        raise CaseError(f"no node {place!r}; nodes are {', '.join(route.nodes)}, or give a distance such as '62.3 km'")
    names = [candidate.name.replace("–", "-") for candidate in route.sections]
    wanted = names[0] if section is None and len(names) == 1 else (section or "").replace("–", "-")
    if wanted not in names:
        raise CaseError(f"section {section!r} is not on the route; a distance needs one of {', '.join(names)}")
    index = names.index(wanted)
    length = route.sections[index].length.value
    if not 0 <= place.value <= length:
        raise CaseError(f"{place.value:g} m is not on the section {wanted}, which is {length:g} m long")
    return Origin(index, place)


def calibrate(case: Case, origin: Origin) -> tuple[Calibrated, ...]:
    """Estimate the speed of every section from the first arrivals at terminals with known clocks.

    Raises
    ------
    NoPosition
        Fewer than two terminals with a known clock saw the event, or it contradicts what the case file states.
    RecordError
        A recording cannot be read or used.
    """
    finding = locate(case)
    stations = [station_of(observation, finding.zero_ns) for observation in finding.observations]
    usable = {
        reading.station: reading
        for reading in reversed(finding.readings)
        if stations[reading.station].clock is not None and not stations[reading.station].launches
    }
    if len(usable) < 2:
        raise NoPosition(
            f"{len(usable)} terminals with a known clock saw a front; a calibration needs two that listen to the event"
        )
    fatal = [f"{gate.name}: {gate.detail}" for gate in finding.checks if gate.fatal and not gate.passed]
    if fatal:
        raise NoPosition("; ".join(fatal))
    found = calibrated_speeds(case.route, origin, stations, [usable[index] for index in sorted(usable)])
    worst = max(found, key=lambda one: abs(one.pull))
    if abs(worst.pull) > CONTRADICTION:
        raise NoPosition(
            f"the event would move the speed of {worst.section} from {worst.prior.value:g} to {worst.speed.value:g} "
            f"m/s, {abs(worst.pull):.0f} standard uncertainties; the place, a clock, a length or the stated speed "
            "is wrong"
        )
    return found


def calibrated_speeds(
    route: Route, origin: Origin, stations: Sequence[Station], readings: Sequence[Reading]
) -> tuple[Calibrated, ...]:
    """Update the section speeds by one first arrival a station; the event's time is unknown.

    Notes
    -----
    Least squares with priors (Gauss–Newton): time = t₀ + travel + delay + clock + error, each input with its stated
    value and standard uncertainty, the event's time free, the place with its own u (JCGM 102:2011 treats the linear
    algebra). A speed that the differences of arrival do not touch keeps its prior.
    """
    prior = _stated(route, origin, stations)
    covariance = _covariance(route, origin, stations)
    estimate = prior.copy()
    for _ in range(ROUNDS):
        predicted, slopes = _model(route, origin.section, estimate, stations, readings)
        measured = np.array([reading.time_s for reading in readings]) - predicted - slopes @ (prior - estimate)
        noise = np.diag([reading.u_s**2 for reading in readings])
        spread = slopes @ covariance @ slopes.T + noise
        weights = np.linalg.inv(spread)
        weights -= np.outer(weights.sum(axis=1), weights.sum(axis=0)) / weights.sum()  # t₀ is free
        gain = covariance @ slopes.T @ weights
        estimate = prior + gain @ measured
    left = np.diag(covariance - gain @ slopes @ covariance)
    return tuple(
        Calibrated(s.name, s.speed, Quantity(float(estimate[k]), float(max(left[k], 0.0)) ** 0.5))
        for k, s in zip(range(1, N_INPUTS * len(route.sections), N_INPUTS), route.sections, strict=True)
    )


def _stated(route: Route, origin: Origin, stations: Sequence[Station]) -> FloatArray:
    """Values of all inputs in the order of :func:`list_inputs`, then the place."""
    of_sections = [q.value for s in route.sections for q in (s.length, s.speed, s.flow)]
    delays = [station.delay.value for station in stations]
    clocks = [(station.clock or Quantity(0.0)).value for station in stations]
    return np.array([*of_sections, *delays, *clocks, origin.distance.value])


def _covariance(route: Route, origin: Origin, stations: Sequence[Station]) -> FloatArray:
    """Covariance in the same order; a place at the far end of its section moves with the section's length."""
    u = np.array([*(row.u for row in list_inputs(route, stations)), origin.distance.u])
    covariance = np.diag(u**2)
    if origin.at_end:
        length = N_INPUTS * origin.section
        covariance[-1, length] = covariance[length, -1] = u[length] ** 2
    return covariance


def _moved(route: Route, estimate: FloatArray) -> Route:
    sections = [
        replace(
            section,
            length=Quantity(float(estimate[k])),
            speed=Quantity(float(estimate[k + 1])),
            flow=Quantity(float(estimate[k + 2])),
        )
        for k, section in zip(range(0, N_INPUTS * len(route.sections), N_INPUTS), route.sections, strict=True)
    ]
    return Route(tuple(sections))


def _model(
    stated: Route, section: int, estimate: FloatArray, stations: Sequence[Station], readings: Sequence[Reading]
) -> tuple[FloatArray, FloatArray]:
    """Return predicted times without t₀, and their derivatives by every input and the place."""
    route, x, n = _moved(stated, estimate), float(estimate[-1]), len(stations)
    late_s = estimate[-1 - 2 * n : -1 - n] + estimate[-1 - n : -1]  # delay and clock of each station
    predicted, slopes = [], []
    for reading in readings:
        station = stations[reading.station]
        travel = travel_time(route, direct_path(route, section, station.node))
        at_zero, slope = columns(travel, reading.station, n)
        predicted.append(travel.constant_s + travel.per_metre * x + late_s[reading.station])
        slopes.append([*(at_zero + slope * x), travel.per_metre])
    return np.array(predicted), np.array(slopes)
