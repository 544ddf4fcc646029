"""Which joint explanations are worth weighing exactly.

Each station has a few dozen ways to take its readings, and together they have far too many. What a station's echoes
say depends on the place alone: the intervals behind its first front. So every way is scored at once on a coarse grid
of places, blurred by the grid's own step, the scores of the stations and of their clock differences are added, and
the joint ways with the best score anywhere are kept.
"""

import itertools
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from twlocate.arrays import FloatArray
from twlocate.position.evidence import Reading, Station
from twlocate.position.explanations import Cause, Explanation, Part, clock_states, parts_of, path_of
from twlocate.position.inputs import input_variances
from twlocate.position.linear import linear_model, time_variance
from twlocate.routes import Route, TravelTime, travel_time

PLACES_A_SECTION = 193

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
    again: float
    grids: tuple[_Places, ...]


@dataclass(frozen=True)
class _Ways:
    """The ways to take one station's readings that have the same first front, with their log scores (W, G)."""

    parts: tuple[Part, ...]
    scores: FloatArray
    ranks: NDArray[np.intp]
    """(2, G) the best and the second best of them at every place."""

    @property
    def first(self) -> tuple[tuple[int, Cause], ...]:
        """The first front, or nothing where all readings are strays."""
        return self.parts[0].causes[:1]

    @property
    def best(self) -> FloatArray:
        """The score of the best of them at every place, (G,)."""
        return np.asarray(np.take_along_axis(self.scores, self.ranks[:1], axis=0)[0], dtype=np.float64)


def explain(
    route: Route, stations: Sequence[Station], readings: Sequence[Reading], window_s: float, again: float
) -> tuple[Explanation, ...]:
    """Return the explanations worth weighing, best first.

    `window_s` is the span over which a stray reading may lie, `again` the prior probability that an echo is the
    event's own.
    """
    grids = tuple(_places(index, section.length.value) for index, section in enumerate(route.sections))
    scoring = _Scoring(route, stations, readings, window_s, again, grids)
    choices = [_ways_by_first(scoring, station) for station in range(len(stations))]
    found: dict[tuple[Part, ...], dict[frozenset[int], float]] = {}
    scored = sorted(_states(scoring, choices), key=lambda state: -float(state[2].max()))
    top = float(scored[0][2].max())
    for (wrong, _), ways, score in scored:
        for parts, value in _joint_ways(ways, score, top - BEHIND):
            of_clocks = found.setdefault(parts, {})
            of_clocks[wrong] = max(value, of_clocks.get(wrong, -np.inf))
    priors = dict(clock_states(stations))
    ranked = sorted(
        ((value, parts, wrong) for parts, of_clocks in found.items() for wrong, value in of_clocks.items()),
        key=lambda row: -row[0],
    )
    return tuple(_joined(parts, wrong, priors[wrong]) for _, parts, wrong in ranked[:MOST])


_State = tuple[tuple[frozenset[int], float], tuple[_Ways, ...], FloatArray]
"""(wrong clocks, prior), each station's ways with a given first front, and the best joint score at every place."""


def _states(scoring: _Scoring, choices: Sequence[Sequence[_Ways]]) -> Iterator[_State]:
    for state in clock_states(scoring.stations):
        for ways in itertools.product(*choices):
            firsts = tuple(itertools.chain.from_iterable(way.first for way in ways))
            clocks = np.log(state[1]) + _clock_score(scoring, firsts, state[0])
            yield state, ways, np.asarray(clocks + np.sum([way.best for way in ways], axis=0), dtype=np.float64)


def _joint_ways(ways: Sequence[_Ways], score: FloatArray, least: float) -> Iterator[tuple[tuple[Part, ...], float]]:
    """Yield the best joint way at every place, and those with one station's second best, that score above `least`.

    At a given place the stations do not depend on each other, so the best joint way is that of the best ways.
    """
    for place in np.flatnonzero(score > least).tolist():
        best = [int(way.ranks[0, place]) for way in ways]
        yield tuple(way.parts[index] for way, index in zip(ways, best, strict=True)), float(score[place])
        for station, way in enumerate(ways):
            second = int(way.ranks[1, place])
            loss = float(way.scores[best[station], place] - way.scores[second, place])
            if second != best[station] and score[place] - loss > least:
                other = [*best[:station], second, *best[station + 1 :]]
                yield tuple(w.parts[i] for w, i in zip(ways, other, strict=True)), float(score[place]) - loss


def _places(section: int, length_m: float) -> _Places:
    x = np.linspace(0.0, length_m, PLACES_A_SECTION)
    return _Places(section, x, length_m / (PLACES_A_SECTION - 1) / 2)


def _joined(parts: Sequence[Part], wrong: frozenset[int], clock_prior: float) -> Explanation:
    causes = tuple(itertools.chain.from_iterable(part.causes for part in parts))
    return Explanation(causes, wrong, clock_prior * float(np.prod([part.prior for part in parts])))


def _ways_by_first(scoring: _Scoring, station: int) -> list[_Ways]:
    """Score every way to take a station's readings at every place, and group them by their first front."""
    total = sum(reading.station == station for reading in scoring.readings)
    intervals: dict[tuple[int, int, Cause], FloatArray] = {}
    groups: dict[tuple[tuple[int, Cause], ...], list[tuple[Part, FloatArray]]] = {}
    for part in parts_of(scoring.route, scoring.stations, station, scoring.readings, scoring.again):
        strays = total - len(part.causes)
        level = float(np.log(part.prior)) - strays * float(np.log(scoring.window_s))
        score = np.full(sum(grid.x.size for grid in scoring.grids), level)
        for index, cause in part.causes[1:]:
            key = (part.causes[0][0], index, cause)
            if key not in intervals:
                intervals[key] = _interval_score(scoring, part.causes[0], (index, cause))
            score += intervals[key]
        groups.setdefault(part.causes[:1], []).append((part, score))
    return [_ranked(rows) for rows in groups.values()]


def _ranked(rows: Sequence[tuple[Part, FloatArray]]) -> _Ways:
    scores = np.array([score for _, score in rows])
    order = np.argsort(-scores, axis=0)
    return _Ways(tuple(part for part, _ in rows), scores, order[[0, min(1, len(rows) - 1)]])


def _interval_score(scoring: _Scoring, first: tuple[int, Cause], echo: tuple[int, Cause]) -> FloatArray:
    """Return the log density of the time between a first front and its echo at every place, blurred by the grid."""
    one, other = scoring.readings[first[0]], scoring.readings[echo[0]]
    measured = other.time_s - one.time_s
    u_readings = one.u_s**2 + time_variance(other, echo[1])
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
