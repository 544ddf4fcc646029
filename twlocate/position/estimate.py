"""From readings to a place: the posterior over the whole route, its band, its alternatives and its budget."""

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from twlocate.arrays import FloatArray
from twlocate.errors import NoPosition
from twlocate.position.band import Piece, SectionDensity, band_length, highest_density, in_one_run
from twlocate.position.budget import Contribution, budget
from twlocate.position.evidence import Reading, Station
from twlocate.position.explanations import Cause, Explanation, path_of
from twlocate.position.inputs import list_inputs
from twlocate.position.linear import LinearModel, linear_model
from twlocate.position.shortlist import explain
from twlocate.routes import Route
from twlocate.scales import time_scale, time_text

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
    again: float = 0.5,
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
    again : float
        Prior probability that an echo at a station that listens is the event's own: a fault throws back much of a
        wave, a leak little.

    Raises
    ------
    NoPosition
        The readings do not single out a part of the route.
    ValueError
        A reading's time or uncertainty is not a finite number, or the uncertainty is not positive.
    """
    _check(readings)
    window_s = _window_s(route)
    explanations = explain(route, stations, readings, window_s, again)
    models = [
        [linear_model(route, section, stations, readings, explanation) for section in range(len(route.sections))]
        for explanation in explanations
    ]
    if not any(_informative(row) for row in models):
        raise NoPosition(_too_little(stations, readings) or _too_wide(coverage))
    grids, shares = _share_out(route, explanations, models, window_s)
    densities = tuple(SectionDensity(x, share.sum(axis=0)) for x, share in zip(grids, shares, strict=True))
    band = highest_density(densities, coverage)
    groups = _alternatives(route, stations, readings, explanations, models, grids, shares, coverage)
    if band_length(band) > WIDEST_BAND * route.length_m or not groups:
        raise NoPosition(_only_nodes(stations, explanations, groups, coverage) or _too_wide(coverage))
    leading, alternative = groups[0]
    model = _possible(models[leading][alternative.point.section])
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


def _informative(models: Sequence[LinearModel | None]) -> bool:
    """Whether an explanation says anything about the place."""
    return any(model is not None and model.informative for model in models)


def _possible(model: LinearModel | None) -> LinearModel:
    """Return a model that is known to exist, because its explanation has its peak in that section."""
    if model is None:
        raise AssertionError("an explanation without a path has no density")
    return model


def _own_grid(model: LinearModel, length_m: float) -> FloatArray:
    """Return even points over a section, and close ones where the explanation has its peak."""
    points = np.linspace(0.0, length_m, COARSE_POINTS)
    if not model.informative:
        return points
    peak, u = model.best_x(length_m)
    fine = peak + max(u, FINEST_GRID * length_m) * FINE_STEPS
    return np.unique(np.concatenate([points, fine[(fine >= 0.0) & (fine <= length_m)]]))


def _share_out(
    route: Route,
    explanations: Sequence[Explanation],
    models: Sequence[Sequence[LinearModel | None]],
    window_s: float,
) -> tuple[list[FloatArray], list[FloatArray]]:
    """Return for each section the grid (G,) and each explanation's density on it (E, G), all adding up to one.

    Every explanation is evaluated on a grid of its own; its log density is interpolated to the union of them.
    """
    grids, logs = [], []
    for section, length in enumerate(s.length.value for s in route.sections):
        own = [
            None if row[section] is None else _own_log(row[section], e, length, window_s)
            for row, e in zip(models, explanations, strict=True)
        ]
        grid = np.unique(np.concatenate([np.array([0.0, length]), *(x for x, _ in filter(None, own))]))
        grids.append(grid)
        logs.append(np.array([np.full(grid.size, -np.inf) if o is None else np.interp(grid, *o) for o in own]))
    top = max(float(log.max()) for log in logs)
    raw = [np.exp(log - top) for log in logs]
    total = sum(float(np.trapezoid(share, x, axis=1).sum()) for share, x in zip(raw, grids, strict=True))
    return grids, [share / total for share in raw]


def _own_log(
    model: LinearModel | None, explanation: Explanation, length_m: float, window_s: float
) -> tuple[FloatArray, FloatArray]:
    x = _own_grid(_possible(model), length_m)
    return x, np.log(explanation.prior) + _possible(model).log_likelihood(x, window_s)


# ---------------------------------------------------------------- alternatives


def _alternatives(
    route: Route,
    stations: Sequence[Station],
    readings: Sequence[Reading],
    explanations: Sequence[Explanation],
    models: Sequence[Sequence[LinearModel | None]],
    grids: list[FloatArray],
    shares: list[FloatArray],
    coverage: float,
) -> list[tuple[int, Alternative]]:
    """Return (index of its explanation, alternative), most probable first; vanishing ones are left out."""
    found = []
    for index, explanation in enumerate(explanations):
        own = [SectionDensity(x, share[index]) for x, share in zip(grids, shares, strict=True)]
        probability = sum(section.mass for section in own)
        if _informative(models[index]) and probability > (1 - coverage) / 50:
            point = _peak(own, models[index])
            words = _attribution(route, stations, readings, explanation, point.section)
            words += _clock_words(stations, readings, explanation, _possible(models[index][point.section]), point)
            found.append((index, Alternative(point, highest_density(own, coverage), probability, words)))
    return _by_place(sorted(found, key=lambda item: -item[1].probability))


def _by_place(found: Sequence[tuple[int, Alternative]]) -> list[tuple[int, Alternative]]:
    """Leave one alternative for each place, that of its best explanation; the others add to its probability."""
    kept: list[tuple[int, Alternative]] = []
    for index, row in found:
        twin = next((n for n, (_, other) in enumerate(kept) if _inside(row.point, other.band)), None)
        if twin is None:
            kept.append((index, row))
        else:
            first, better = kept[twin]
            kept[twin] = (first, replace(better, probability=better.probability + row.probability))
    return sorted(kept, key=lambda item: -item[1].probability)


def _inside(point: Point, band: Sequence[Piece]) -> bool:
    return any(p.section == point.section and p.from_m <= point.distance_m <= p.to_m for p in band)


def _peak(densities: Sequence[SectionDensity], models: Sequence[LinearModel | None]) -> Point:
    """Return the highest point of the density; where most of it lies on a plateau, the middle of that."""
    likeliest = max(range(len(densities)), key=lambda index: densities[index].mass)
    if _u_of_peak(densities[likeliest], models[likeliest]) is None:
        return Point(likeliest, *densities[likeliest].moments())
    peaks = {s: u for s, row in enumerate(densities) if (u := _u_of_peak(row, models[s])) is not None}
    section = max(peaks, key=lambda index: densities[index].density.max())
    return Point(section, densities[section].mode, peaks[section])


def _u_of_peak(density: SectionDensity, model: LinearModel | None) -> float | None:
    """Return the standard uncertainty of a section's peak, m; None where it would be wider than the section."""
    if model is None or density.mass == 0:
        return None
    curvature = model.pull(density.mode)[1]
    length = float(density.x[-1])
    return curvature**-0.5 if curvature * length**2 > 1 else None


def _attribution(
    route: Route, stations: Sequence[Station], readings: Sequence[Reading], explanation: Explanation, section: int
) -> str:
    words = [_path_name(route, stations, readings[index], cause, section) for index, cause in explanation.causes]
    counted = [f"{words.count(word)} × {word}" if words.count(word) > 1 else word for word in dict.fromkeys(words)]
    return ", ".join(counted)


def _clock_words(
    stations: Sequence[Station],
    readings: Sequence[Reading],
    explanation: Explanation,
    model: LinearModel,
    point: Point,
) -> str:
    """Say by how much the clocks that an explanation takes as wrong must be off."""
    words = ""
    owners = [readings[index].station for index, _ in explanation.causes]
    for station in sorted(explanation.wrong_clocks & set(owners)):
        trusted = [row for row, owner in enumerate(owners) if owner not in explanation.wrong_clocks]
        if trusted:
            off = model.difference_left(owners.index(station), trusted[0], point.distance_m, point.u_m)
            ahead = "ahead" if off.value > 0 else "behind"
            size = f"{time_scale(abs(off.value), off.u)(abs(off.value))} {ahead}, u {time_text(off.u)}"
            words += f"; clock of {stations[station].node} taken as wrong: {size}"
            if sum(other.clock is not None for other in stations) == 2:
                words += f", or that of {stations[owners[trusted[0]]].node} as much the other way"
    return words


def _path_name(route: Route, stations: Sequence[Station], reading: Reading, cause: Cause, section: int) -> str:
    path = path_of(cause, route, section, stations[reading.station].node)
    return path.name if path else "no path"


def _fits(
    route: Route,
    stations: Sequence[Station],
    readings: Sequence[Reading],
    explanation: Explanation,
    model: LinearModel,
    point: Point,
) -> dict[int, Fit]:
    """Return the path of each attributed reading, and the error of its time that the best place leaves to it.

    The residual is shared out between the inputs and the reading in proportion to their variances.
    """
    left = model.left_over(point.distance_m)
    return {
        index: Fit(_path_name(route, stations, readings[index], cause, point.section), float(rest))
        for (index, cause), rest in zip(explanation.causes, left, strict=True)
    }


# ---------------------------------------------------------------- words


def _reading_name(stations: Sequence[Station], readings: Sequence[Reading], index: int) -> str:
    station = readings[index].station
    rank = [i for i, reading in enumerate(readings) if reading.station == station].index(index) + 1
    return f"arrival {rank} at {stations[station].node}"


def _too_little(stations: Sequence[Station], readings: Sequence[Reading]) -> str:
    """Say what is lacking; empty where there is enough and it contradicts itself."""
    seen = {reading.station for reading in readings}
    silent = [station.node for s, station in enumerate(stations) if s not in seen]
    if silent:
        return f"no arrival stands out of the noise at {', '.join(silent)}; add another record or another terminal"
    if any(station.launches for station in stations):
        return "no echo stands out of the noise behind the launched pulse; raise the gain or the pulse width"
    free = [station.node for station in stations if station.clock is None]
    if free:
        return (
            f"the clock of {', '.join(free)} is free, and without it and without echoes the first arrivals do not "
            "place the event; give its clock an uncertainty, or add another terminal"
        )
    if len(stations) == 1:
        return "one terminal's first arrival does not place the event; add a second terminal or a launched pulse"
    return ""


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
