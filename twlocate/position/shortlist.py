"""Which joint explanations are worth weighing exactly.

Each station has a few dozen ways to take its readings, and together they have far too many. What a station's echoes
say depends on the place alone: the intervals behind its first front. So every way is scored at once on a coarse grid
of places, blurred by the grid's own step, the scores of the stations and of their clock differences are added, and
the joint ways with the best score anywhere are kept.
"""

import itertools
from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from twlocate.arrays import FloatArray
from twlocate.position.evidence import Reading, Station
from twlocate.position.explanations import Cause, Explanation, Part, clock_states, parts_of, path_of
from twlocate.position.inputs import input_variances
from twlocate.position.linear import linear_model
from twlocate.routes import Route, TravelTime, travel_time

PLACES_A_SECTION = 97
MOST_JOINT = 256
"""About how many ways of all stations together are scored."""

MOST = 48
"""Explanations kept."""

BEHIND = 25.0
"""Explanations whose log score is further than this behind the best are left out; a broad one makes up for some ten
of it when it is integrated over the places."""

IMPOSSIBLE = -1e9
"""Log score of a way that has no wave path."""


@dataclass(frozen=True)
class _Places:
    """A coarse grid over one section, with half its step."""

    section: int
    x: FloatArray
    half_step_m: float


@dataclass(frozen=True)
class _Scoring:
    """What every score is made from."""

    route: Route
    stations: Sequence[Station]
    readings: Sequence[Reading]
    window_s: float
    grids: tuple[_Places, ...]


def explain(
    route: Route, stations: Sequence[Station], readings: Sequence[Reading], window_s: float
) -> tuple[Explanation, ...]:
    """Return the explanations worth weighing, best first.

    `window_s` is the span over which a stray reading may lie.
    """
    grids = tuple(_places(index, section.length.value) for index, section in enumerate(route.sections))
    scoring = _Scoring(route, stations, readings, window_s, grids)
    count = max(round(MOST_JOINT ** (1 / len(stations))), 3)
    choices = [_best_ways(scoring, station, count) for station in range(len(stations))]
    found = []
    for wrong, clock_prior in clock_states(stations):
        of_clocks: dict[tuple[int, ...], FloatArray] = {}
        for ways in itertools.product(*choices):
            firsts = tuple(part.causes[0][0] for part, _ in ways if part.causes)
            if firsts not in of_clocks:
                of_clocks[firsts] = _clock_score(scoring, [part.causes[0] for part, _ in ways if part.causes], wrong)
            score = float(np.max(sum((score for _, score in ways), start=of_clocks[firsts])))
            found.append((score + float(np.log(clock_prior)), _joined([part for part, _ in ways], wrong, clock_prior)))
    found.sort(key=lambda item: -item[0])
    return tuple(explanation for score, explanation in found[:MOST] if score > found[0][0] - BEHIND)


def _places(section: int, length_m: float) -> _Places:
    x = np.linspace(0.0, length_m, PLACES_A_SECTION)
    return _Places(section, x, length_m / (PLACES_A_SECTION - 1) / 2)


def _joined(parts: Sequence[Part], wrong: frozenset[int], clock_prior: float) -> Explanation:
    causes = tuple(itertools.chain.from_iterable(part.causes for part in parts))
    return Explanation(causes, wrong, clock_prior * float(np.prod([part.prior for part in parts])))


def _best_ways(scoring: _Scoring, station: int, count: int) -> list[tuple[Part, FloatArray]]:
    """Return the best ways to take a station's readings, each with its log score at every place."""
    parts = parts_of(scoring.route, scoring.stations, station, scoring.readings)
    total = sum(reading.station == station for reading in scoring.readings)
    intervals: dict[tuple[int, int, Cause], FloatArray] = {}
    ways = []
    for part in parts:
        strays = total - len(part.causes)
        score = np.full(
            sum(grid.x.size for grid in scoring.grids), np.log(part.prior) - strays * np.log(scoring.window_s)
        )
        for index, cause in part.causes[1:]:
            key = (part.causes[0][0], index, cause)
            if key not in intervals:
                intervals[key] = _interval_score(scoring, part.causes[0], (index, cause))
            score = score + intervals[key]
        ways.append((part, score))
    ways.sort(key=lambda way: -float(way[1].max()))
    return ways[:count]


def _interval_score(scoring: _Scoring, first: tuple[int, Cause], echo: tuple[int, Cause]) -> FloatArray:
    """Return the log density of the time between a first front and its echo at every place, blurred by the grid."""
    one, other = scoring.readings[first[0]], scoring.readings[echo[0]]
    measured = other.time_s - one.time_s
    u_readings = one.u_s**2 + other.u_s**2
    variances = input_variances(scoring.route, scoring.stations)[: 3 * len(scoring.route.sections)]
    pieces = []
    for grid in scoring.grids:
        ways = [_travel(scoring, one.station, grid.section, cause) for cause in (first[1], echo[1])]
        if ways[0] is None or ways[1] is None:
            pieces.append(np.full(grid.x.size, IMPOSSIBLE))
            continue
        slope = ways[1].per_metre - ways[0].per_metre
        predicted = ways[1].constant_s - ways[0].constant_s + slope * grid.x
        partial = (ways[1].at_zero - ways[0].at_zero).ravel() + np.multiply.outer(
            grid.x, (ways[1].slope - ways[0].slope).ravel()
        )
        variance = u_readings + partial**2 @ variances + (slope * grid.half_step_m) ** 2
        pieces.append(-0.5 * (measured - predicted) ** 2 / variance - 0.5 * np.log(2 * np.pi * variance))
    return np.concatenate(pieces)


def _travel(scoring: _Scoring, station: int, section: int, cause: Cause) -> TravelTime | None:
    path = path_of(cause, scoring.route, section, scoring.stations[station].node)
    return None if path is None else travel_time(scoring.route, path)


def _clock_score(scoring: _Scoring, firsts: Sequence[tuple[int, Cause]], wrong: frozenset[int]) -> FloatArray:
    """Return the log likelihood of the first fronts of all stations together at every place, blurred by the grid."""
    explanation = Explanation(tuple(firsts), wrong, 1.0)
    pieces = []
    for grid in scoring.grids:
        model = linear_model(scoring.route, grid.section, scoring.stations, scoring.readings, explanation)
        assert model is not None  # first fronts have a path from anywhere
        blurred = model.variance + (model.per_metre * grid.half_step_m) ** 2
        pieces.append(replace(model, variance=blurred, n_strays=0).log_likelihood(grid.x, scoring.window_s))
    return np.concatenate(pieces)
