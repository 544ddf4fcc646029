"""From readings to a place: the posterior over the whole route, its band, its alternatives and its budget."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from twlocate.arrays import FloatArray
from twlocate.errors import NoPosition
from twlocate.position.band import Piece, SectionDensity, band_length, highest_density, in_one_run
from twlocate.position.budget import Contribution, budget
from twlocate.position.evidence import Reading, Station
from twlocate.position.explanations import Explanation, explain, path_of
from twlocate.position.inputs import list_inputs
from twlocate.position.linear import LinearModel, linear_model
from twlocate.routes import Route

COARSE_POINTS = 129
"""Grid points a section before it is refined."""

FINEST_GRID = 1e-9
"""Closest grid, as a share of the section, so that neighbouring points differ in their last digits."""

FINE_STEPS = np.linspace(-8.0, 8.0, 129)
"""Where the grid is refined around each peak, in standard uncertainties."""

WIDEST_BAND = 0.8
"""A band over more than this share of the route is no place."""


@dataclass(frozen=True)
class Point:
    """A point on the route and its standard uncertainty along it."""

    section: int
    distance_m: float
    u_m: float


@dataclass(frozen=True)
class Fit:
    """What an explanation makes of one reading: the path it took and what is left over."""

    path: str
    residual_s: float


@dataclass(frozen=True)
class Alternative:
    """One explanation's place, the region it points to and how probable it is."""

    point: Point
    band: tuple[Piece, ...]
    probability: float
    attribution: str


@dataclass(frozen=True)
class Estimate:
    """The answer: place, band, density and everything it rests on."""

    point: Point
    coverage: float
    band: tuple[Piece, ...]
    densities: tuple[SectionDensity, ...]
    """One a section; together they add up to one."""
    alternatives: tuple[Alternative, ...]
    budget: tuple[Contribution, ...]
    fits: dict[int, Fit]
    """Index of a reading → what the best explanation makes of it."""
    in_one_run: bool
    """Whether the band is one stretch that a crew can search end to end."""


def estimate(
    route: Route,
    stations: Sequence[Station],
    readings: Sequence[Reading],
    *,
    coverage: float = 0.95,
) -> Estimate:
    """Locate the event.

    Parameters
    ----------
    route : Route
        Sections with lengths (m), wave and flow speeds (m/s), each with its standard uncertainty.
    stations : sequence of Station
        Where it was recorded, with clock and delay.
    readings : sequence of Reading
        Arrival times (s), those of a station in time order.
    coverage : float
        Probability that the band is to hold.

    Raises
    ------
    NoPosition
        The readings do not single out a part of the route.
    ValueError
        A reading's time or uncertainty is not a finite number, or the uncertainty is not positive.
    """
    _check(readings)
    explanations = explain(route, stations, readings)
    models = [
        [linear_model(route, section, stations, readings, explanation) for section in range(len(route.sections))]
        for explanation in explanations
    ]
    if not any(row[0].informative for row in models):
        raise NoPosition(_too_little(stations, readings))
    grids = [_grid(route, section, [row[section] for row in models]) for section in range(len(route.sections))]
    shares = _share_out(route, explanations, models, grids)
    densities = tuple(SectionDensity(x, share.sum(axis=0)) for x, share in zip(grids, shares, strict=True))
    band = highest_density(densities, coverage)
    groups = _alternatives(route, stations, explanations, models, grids, shares, coverage)
    if band_length(band) > WIDEST_BAND * route.length_m or not groups:
        raise NoPosition(_only_nodes(stations, explanations, groups, coverage) or _too_wide(coverage))
    leading, alternative = groups[0]
    model = models[leading][alternative.point.section]
    names = [_reading_name(stations, readings, index) for index, _ in explanations[leading].causes]
    return Estimate(
        point=alternative.point,
        coverage=coverage,
        band=band,
        densities=densities,
        alternatives=tuple(row for _, row in groups),
        budget=budget(model, alternative.point.distance_m, list_inputs(route, stations), names),
        fits=_fits(route, stations, readings, explanations[leading], model, alternative.point),
        in_one_run=in_one_run(band, route),
    )


def _check(readings: Sequence[Reading]) -> None:
    for index, reading in enumerate(readings):
        if not (np.isfinite(reading.time_s) and 0 < reading.u_s < np.inf):
            raise ValueError(
                f"reading {index}: {reading.time_s:g} s with the standard uncertainty {reading.u_s:g} s is no arrival "
                "time; give a finite time and an uncertainty above 0"
            )


# ---------------------------------------------------------------- the grid and the density on it


def _window_s(route: Route) -> float:
    """Span over which a flat unknown may lie: a wave's way over the whole route, there and back."""
    return 2 * sum(s.length.value / (s.speed.value - abs(s.flow.value)) for s in route.sections)


def _grid(route: Route, section: int, models: Sequence[LinearModel]) -> FloatArray:
    """Even points over the section, and close ones wherever an explanation has its peak."""
    length = route.sections[section].length.value
    points = [np.linspace(0.0, length, COARSE_POINTS)]
    for model in models:
        if model.informative:
            peak, u = model.best_x(length)
            points.append(peak + max(u, FINEST_GRID * length) * FINE_STEPS)
    grid = np.unique(np.concatenate(points))
    return grid[(grid >= 0.0) & (grid <= length)]


def _share_out(
    route: Route, explanations: Sequence[Explanation], models: Sequence[Sequence[LinearModel]], grids: list[FloatArray]
) -> list[FloatArray]:
    """Return the density of each explanation on each section's grid, (E, G) a section, all adding up to one."""
    window = _window_s(route)
    logs = [
        np.array(
            [
                np.log(explanation.prior) + row[section].log_likelihood(x, window)
                for explanation, row in zip(explanations, models, strict=True)
            ]
        )
        for section, x in enumerate(grids)
    ]
    top = max(float(log.max()) for log in logs)
    raw = [np.exp(log - top) for log in logs]
    total = sum(float(np.trapezoid(share, x, axis=1).sum()) for share, x in zip(raw, grids, strict=True))
    return [share / total for share in raw]


# ---------------------------------------------------------------- alternatives


def _alternatives(
    route: Route,
    stations: Sequence[Station],
    explanations: Sequence[Explanation],
    models: Sequence[Sequence[LinearModel]],
    grids: list[FloatArray],
    shares: list[FloatArray],
    coverage: float,
) -> list[tuple[int, Alternative]]:
    """Return (index of its explanation, alternative), most probable first; vanishing ones are left out."""
    found = []
    for index, explanation in enumerate(explanations):
        own = [SectionDensity(x, share[index]) for x, share in zip(grids, shares, strict=True)]
        probability = sum(section.mass for section in own)
        if models[index][0].informative and probability > (1 - coverage) / 50:
            point = _peak(own, models[index])
            words = _attribution(route, stations, explanation, point.section)
            found.append((index, Alternative(point, highest_density(own, coverage), probability, words)))
    return sorted(found, key=lambda item: -item[1].probability)


def _peak(densities: Sequence[SectionDensity], models: Sequence[LinearModel]) -> Point:
    """Return the highest point of the density; where most of it lies on a plateau, the middle of that."""
    likeliest = max(range(len(densities)), key=lambda index: densities[index].mass)
    if _u_of_peak(densities[likeliest], models[likeliest]) is None:
        return Point(likeliest, *densities[likeliest].moments())
    peaks = {s: u for s, row in enumerate(densities) if (u := _u_of_peak(row, models[s])) is not None}
    section = max(peaks, key=lambda index: densities[index].density.max())
    return Point(section, densities[section].mode, peaks[section])


def _u_of_peak(density: SectionDensity, model: LinearModel) -> float | None:
    """Return the standard uncertainty of a section's peak, m; None where it would be wider than the section."""
    curvature = model.pull(density.mode)[1]
    length = float(density.x[-1])
    return curvature**-0.5 if curvature * length**2 > 1 else None


def _attribution(route: Route, stations: Sequence[Station], explanation: Explanation, section: int) -> str:
    words = [path_of(cause, route, section, stations[0].node).name for _, cause in explanation.causes]
    counted = [f"{words.count(word)} × {word}" if words.count(word) > 1 else word for word in dict.fromkeys(words)]
    wrong = [f"clock of {stations[s].node} taken as wrong" for s in sorted(explanation.wrong_clocks)]
    return ", ".join(counted + wrong)


def _fits(
    route: Route,
    stations: Sequence[Station],
    readings: Sequence[Reading],
    explanation: Explanation,
    model: LinearModel,
    point: Point,
) -> dict[int, Fit]:
    """Return path and residual of each attributed reading at the best place and event time."""
    left = model.left_over(point.distance_m)
    return {
        index: Fit(path_of(cause, route, point.section, stations[readings[index].station].node).name, float(rest))
        for (index, cause), rest in zip(explanation.causes, left, strict=True)
    }


# ---------------------------------------------------------------- words


def _reading_name(stations: Sequence[Station], readings: Sequence[Reading], index: int) -> str:
    station = readings[index].station
    rank = [i for i, reading in enumerate(readings) if reading.station == station].index(index) + 1
    return f"arrival {rank} at {stations[station].node}"


def _too_little(stations: Sequence[Station], readings: Sequence[Reading]) -> str:
    seen = {reading.station for reading in readings}
    silent = [station.node for s, station in enumerate(stations) if s not in seen]
    if silent:
        return f"no arrival stands out of the noise at {', '.join(silent)}; add another record or another terminal"
    if any(station.launches for station in stations):
        return "no echo stands out of the noise behind the launched pulse; raise the gain or the pulse width"
    free = [station.node for station in stations if station.clock is None]
    if free:
        return (
            f"the clock of {', '.join(free)} is free and first arrivals alone do not place the event without it; "
            "give its clock an uncertainty, or another terminal"
        )
    return "one terminal's first arrival does not place the event; add a second terminal or a launched pulse"


def _only_nodes(
    stations: Sequence[Station],
    explanations: Sequence[Explanation],
    groups: Sequence[tuple[int, Alternative]],
    coverage: float,
) -> str:
    """Return the words for a launched pulse whose echoes may well all be the nodes'; none where that is not so."""
    if not any(station.launches for station in stations):
        return ""
    for index, alternative in groups:
        event_seen = any(cause.kind in ("echo", "direct") for _, cause in explanations[index].causes)
        if not event_seen and alternative.probability > 1 - coverage:
            return (
                "what stands out behind the launched pulse may well be no echo of the event "
                f"({alternative.attribution}); compare with a trace of a sound conductor, raise the gain, or launch "
                "from the other end"
            )
    return ""


def _too_wide(coverage: float) -> str:
    return (
        f"the {coverage:.0%} band would cover more than {WIDEST_BAND:.0%} of the route; the readings contradict the "
        "stated clocks, lengths and speeds, or are too uncertain: check them, or add a terminal"
    )
