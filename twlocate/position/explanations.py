"""Which wave is which: every way to attribute the readings to wave paths, with its prior probability.

An explanation is kept as data, not as a program: the first fronts at several ends, a pulse and its echo, a
clock that is wrong or a pick that is not a front are all rows of the same list.
"""

import itertools
import math
from collections.abc import Iterator, Sequence
from dataclasses import dataclass

from twlocate.position.evidence import Reading, Station
from twlocate.routes import Route, WavePath, direct_path, echo_path, node_echo_path, repeated_echo_path, transit_s

CLOCK_WRONG = 1e-3
"""Prior probability that a clock is off by far more than it states (common practice, no source)."""

SMALLEST_OUTLIER = 1e-3
"""No pick is trusted more than this, however clean it looks (common practice, no source)."""

NEGLIGIBLE = 1e-9
"""Explanations with a smaller prior are left out."""

LATER_READINGS = 4
"""How many echoes behind a launched pulse, the least doubtful ones, are weighed against each other."""

EARLIER_READINGS = 3
"""How many readings a station may offer as its first front."""


MIRROR_SIGMAS = 8.0
"""A reading further than this from when a node's echo is due is not weighed as that echo: exp(−8²/2) is nothing."""


@dataclass(frozen=True)
class Cause:
    """What a reading is taken for, whatever section the event is in.

    ``kind`` is one of ``direct``, ``launch``, ``echo``, ``repeat`` and ``node``; ``node`` names the mirror
    of a node echo.
    """

    kind: str
    node: str = ""


@dataclass(frozen=True)
class Explanation:
    """An attribution of the readings, and which clocks are wrong in it.

    Readings that are not in `causes` are strays: noise, or waves that are not needed.
    """

    causes: tuple[tuple[int, Cause], ...]
    """(index of the reading, its cause)."""
    wrong_clocks: frozenset[int]
    prior: float


def path_of(cause: Cause, route: Route, section: int, node: str) -> WavePath:
    """Return the wave path of a cause for an event in `section`, recorded at `node`."""
    if cause.kind == "node":
        return node_echo_path(route, node, cause.node)
    return _PATHS[cause.kind](route, section, node)


_PATHS = {
    "direct": direct_path,
    "launch": lambda _route, _section, _node: WavePath("launched pulse", ()),
    "echo": echo_path,
    "repeat": repeated_echo_path,
}


def explain(route: Route, stations: Sequence[Station], readings: Sequence[Reading]) -> tuple[Explanation, ...]:
    """List every explanation of the readings whose prior is not negligible; the priors add up to one."""
    by_station = [[i for i, reading in enumerate(readings) if reading.station == s] for s in range(len(stations))]
    choices = [
        list(_of_pulse(route, station, own, readings) if station.launches else _of_first_front(own, readings))
        for station, own in zip(stations, by_station, strict=True)
    ]
    found = []
    for parts in itertools.product(*choices):
        for wrong, clock_prior in _clock_states(stations):
            prior = clock_prior * math.prod(part.prior for part in parts)
            if prior > NEGLIGIBLE:
                causes = tuple(itertools.chain.from_iterable(part.causes for part in parts))
                found.append(Explanation(causes, wrong, prior))
    total = sum(explanation.prior for explanation in found)
    return tuple(Explanation(e.causes, e.wrong_clocks, e.prior / total) for e in found)


@dataclass(frozen=True)
class _Part:
    """One station's share of an explanation."""

    causes: tuple[tuple[int, Cause], ...]
    prior: float


def _clock_states(stations: Sequence[Station]) -> Iterator[tuple[frozenset[int], float]]:
    """All clocks right, or one of the stated ones wrong; a launch and its echoes need none."""
    stated = [s for s, station in enumerate(stations) if station.clock is not None and not station.launches]
    wrongable = stated if len(stated) > 1 else []
    yield frozenset(), 1.0 - CLOCK_WRONG * len(wrongable)
    for station in wrongable:
        yield frozenset({station}), CLOCK_WRONG


def _outlier(reading: Reading) -> float:
    return max(reading.outlier, SMALLEST_OUTLIER)


def _of_first_front(own: Sequence[int], readings: Sequence[Reading]) -> Iterator[_Part]:
    """The first front is the n-th reading, those before it are strays; or all are strays."""
    earlier_wrong = 1.0
    for index in own[:EARLIER_READINGS]:
        wrong = _outlier(readings[index])
        yield _Part(((index, Cause("direct")),), earlier_wrong * (1 - wrong))
        earlier_wrong *= wrong
    yield _Part((), earlier_wrong)


ECHO_UNSEEN = 0.02
"""Prior probability that the event gives no echo that stands out (common practice, no source)."""

_PRIOR_OF_ECHO = {"node": 0.3, "repeat": 0.2}
"""Prior probability that a given later front is this kind of echo (common practice, no source)."""


def _of_pulse(route: Route, station: Station, own: Sequence[int], readings: Sequence[Reading]) -> Iterator[_Part]:
    """The first reading is the pulse; one of the later ones, or none, is the event's echo; the others are not."""
    if not own:
        yield _Part((), 1.0)
        return
    launch = (own[0], Cause("launch"))
    likeliest = sorted(own[1:], key=lambda index: readings[index].outlier)[:LATER_READINGS]
    later = sorted(likeliest)
    mirrors = {
        index: [
            node for node in route.nodes if _may_be_echo_of(node, route, station, readings[own[0]], readings[index])
        ]
        for index in later
    }
    for echo in (*later, None):
        others = [index for index in later if index != echo]
        options = [list(_other_causes(index, echo, mirrors[index], len(route.nodes) - 1, readings)) for index in others]
        event = () if echo is None else ((echo, Cause("echo")),)
        seen = ECHO_UNSEEN if echo is None else (1 - ECHO_UNSEEN) * (1 - _outlier(readings[echo])) / len(later)
        for picked in itertools.product(*options):
            causes = tuple((index, cause) for index, cause, _ in picked if cause is not None)
            if _once_each(causes):
                yield _Part((launch, *event, *causes), seen * math.prod(weight for _, _, weight in picked))


def _may_be_echo_of(node: str, route: Route, station: Station, launch: Reading, reading: Reading) -> bool:
    """Whether a reading comes about when the echo of a node is due, which does not depend on where the event is."""
    if node == station.node:
        return False
    there, back = transit_s(route, station.node, node), transit_s(route, node, station.node)
    u = ((there.u + back.u) ** 2 + launch.u_s**2 + reading.u_s**2) ** 0.5
    return bool(abs(reading.time_s - launch.time_s - there.value - back.value) <= MIRROR_SIGMAS * u)


def _other_causes(
    index: int, echo: int | None, mirrors: Sequence[str], n_mirrors: int, readings: Sequence[Reading]
) -> Iterator[tuple[int, Cause | None, float]]:
    wrong = _outlier(readings[index])
    for mirror in mirrors:
        yield index, Cause("node", mirror), (1 - wrong) * _PRIOR_OF_ECHO["node"] / n_mirrors
    if echo is not None and index > echo:
        yield index, Cause("repeat"), (1 - wrong) * _PRIOR_OF_ECHO["repeat"]
    yield index, None, wrong


def _once_each(causes: tuple[tuple[int, Cause], ...]) -> bool:
    """A mirror gives one first echo, and the event one repeat."""
    kinds = [cause for _, cause in causes]
    return len(set(kinds)) == len(kinds)
