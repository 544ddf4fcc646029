"""Which wave is which: ways to attribute the readings to wave paths, each with its prior probability.

An explanation is kept as data, not as a program: the first fronts at several ends, their echoes, a pulse and its
echo, a clock that is wrong or a pick that is not a front are all rows of the same list. Each station on its own
has a few dozen ways to take its readings; :mod:`~twlocate.position.shortlist` picks the joint ones worth weighing.
"""

import itertools
import math
from collections.abc import Iterator, Sequence
from dataclasses import dataclass

from twlocate.position.evidence import Reading, Station
from twlocate.routes import (
    Route,
    WavePath,
    again_path,
    direct_path,
    echo_path,
    mirror_path,
    node_echo_path,
    repeated_echo_path,
    transit_s,
)

CLOCK_WRONG = 1e-3
"""Prior probability that a clock is off by far more than it states (common practice, no source)."""

SMALLEST_OUTLIER = 1e-3
"""No station's picks are trusted more than this, however clean they look (common practice, no source)."""

NEGLIGIBLE = 1e-12
"""Ways of taking a station's readings with a smaller prior are left out."""

LATER_READINGS = 4
"""How many later readings of a station, the least doubtful ones, are weighed as echoes."""

FIRST_READINGS = 3
"""How many readings a station may offer as its first front."""

OTHER_WAVE = 0.5
"""Prior probability that a front behind the first is neither of the echoes that are looked for: a wave of another
mode, of a neighbouring line, of a second event (common practice, no source)."""

PRIOR_OF_ECHO = {"node": 0.3, "repeat": 0.2}
"""Prior probability that a front behind a launched pulse is this kind of echo (common practice, no source)."""

ECHO_UNSEEN = 0.02
"""Prior probability that an event gives no echo of a launched pulse that stands out (common practice, no source)."""

SIGN_TRUSTED = 0.95
"""Probability that a front has the sign that its path predicts (common practice, no source)."""


MIRROR_SIGMAS = 8.0
"""A reading further than this from when a node's echo is due is not weighed as that echo: exp(−8²/2) is nothing."""


@dataclass(frozen=True)
class Cause:
    """What a reading is taken for, whatever section the event is in.

    ``kind`` is ``direct``, ``again`` or ``mirror`` at a station that listens, ``launch``, ``echo``, ``repeat`` or
    ``node`` at one that launches; ``node`` names the mirror of the kinds that have one.
    """

    kind: str
    node: str = ""


ECHOES = ("again", "mirror")
"""Kinds of cause that are echoes at a station that listens."""


@dataclass(frozen=True)
class Part:
    """One station's share of an explanation: causes of some of its readings, the others being strays."""

    causes: tuple[tuple[int, Cause], ...]
    """(index of the reading, its cause); the first is the one that the others are echoes of."""
    prior: float


@dataclass(frozen=True)
class Explanation:
    """An attribution of the readings of all stations, and which clocks are wrong in it."""

    causes: tuple[tuple[int, Cause], ...]
    wrong_clocks: frozenset[int]
    prior: float


def path_of(cause: Cause, route: Route, section: int, node: str) -> WavePath | None:
    """Return the wave path of a cause for an event in `section`, recorded at `node`; None if there is none."""
    if cause.kind == "node":
        return node_echo_path(route, node, cause.node)
    if cause.kind == "mirror":
        return mirror_path(route, section, node, cause.node)
    return _PATHS[cause.kind](route, section, node)


_PATHS = {
    "direct": direct_path,
    "again": again_path,
    "launch": lambda _route, _section, _node: WavePath("launched pulse", ()),
    "echo": echo_path,
    "repeat": repeated_echo_path,
}


def parts_of(
    route: Route, stations: Sequence[Station], station: int, readings: Sequence[Reading], again: float
) -> tuple[Part, ...]:
    """List the ways to take one station's readings.

    `again` is the prior probability that an echo at a station that listens is the event's own.
    """
    own = [index for index, reading in enumerate(readings) if reading.station == station]
    if stations[station].launches:
        found = _of_launch(route, stations, station, own, readings)
    else:
        found = _of_first_front(route, stations, station, own, readings, again)
    return tuple(part for part in found if part.prior > NEGLIGIBLE)


def clock_states(stations: Sequence[Station]) -> tuple[tuple[frozenset[int], float], ...]:
    """Return (wrong clocks, prior): all clocks right, or one of the stated ones wrong.

    Of two clocks none can tell which is wrong, only that they differ: the second stands for both.
    """
    stated = [s for s, station in enumerate(stations) if station.clock is not None]
    wrong = {1: [], 2: stated[1:]}.get(len(stated), stated)
    share = CLOCK_WRONG * len(stated) / max(len(wrong), 1)
    right = (frozenset[int](), 1.0 - share * len(wrong))
    return (right, *((frozenset({station}), share) for station in wrong))


def _least_doubtful(indices: Sequence[int], readings: Sequence[Reading]) -> list[int]:
    return sorted(sorted(indices, key=lambda index: readings[index].outlier)[:LATER_READINGS])


def _of_first_front(
    route: Route,
    stations: Sequence[Station],
    station: int,
    own: Sequence[int],
    readings: Sequence[Reading],
    again: float,
) -> Iterator[Part]:
    """The first front is the n-th reading, those before it are strays, some behind it echoes; or all are strays."""
    earlier_wrong = 1.0
    for rank, index in enumerate(own[:FIRST_READINGS]):
        wrong = readings[index].outlier
        later = _least_doubtful(own[rank + 1 :], readings)
        for echoes, prior in _echoes(route, stations, station, index, later, readings, again):
            yield Part(((index, Cause("direct")), *echoes), earlier_wrong * (1 - wrong) * prior)
        earlier_wrong *= wrong
    yield Part((), max(earlier_wrong, SMALLEST_OUTLIER))


def _echoes(
    route: Route,
    stations: Sequence[Station],
    station: int,
    first: int,
    later: Sequence[int],
    readings: Sequence[Reading],
    again: float,
) -> Iterator[tuple[tuple[tuple[int, Cause], ...], float]]:
    """Yield (echoes, prior) for every way to take the readings behind the first front `first`."""
    mirrors = [node for node in route.nodes if node != stations[station].node]
    signs = {s.node: s.reflects for s in stations}
    causes = [(Cause("again"), again, -signs[stations[station].node])]
    causes += [(Cause("mirror", mirror), (1 - again) / len(mirrors), signs.get(mirror, 0)) for mirror in mirrors]
    options = []
    for index in later:
        other = max(readings[index].outlier, OTHER_WAVE)
        turn = readings[index].polarity * readings[first].polarity
        weighed = [(index, cause, (1 - other) * share * _sign_weight(turn, sign)) for cause, share, sign in causes]
        options.append([(index, None, other), *weighed])
    for picked in itertools.product(*options):
        echoes = tuple((index, cause) for index, cause, _ in picked if cause is not None)
        if _once_each(echoes):
            yield echoes, math.prod(weight for _, _, weight in picked)


def _sign_weight(turn: int, predicted: int) -> float:
    """Weigh whether an echo has the sign, relative to the first front, that its path predicts; 1 if not known."""
    if turn * predicted == 0:
        return 1.0
    return 2 * (SIGN_TRUSTED if turn == predicted else 1 - SIGN_TRUSTED)


def _of_launch(
    route: Route, stations: Sequence[Station], station: int, own: Sequence[int], readings: Sequence[Reading]
) -> Iterator[Part]:
    """The first reading is the pulse; one of the later ones, or none, is the event's echo; the others are not."""
    if not own:
        yield Part((), 1.0)
        return
    launch = (own[0], Cause("launch"))
    later = _least_doubtful(own[1:], readings)
    home = stations[station]
    mirrors = {
        index: [node for node in route.nodes if _may_be_echo_of(node, route, home, readings[own[0]], readings[index])]
        for index in later
    }
    for echo in (*later, None):
        others = [index for index in later if index != echo]
        options = [list(_other_causes(index, echo, mirrors[index], len(route.nodes) - 1, readings)) for index in others]
        event = () if echo is None else ((echo, Cause("echo")),)
        seen = ECHO_UNSEEN if echo is None else (1 - ECHO_UNSEEN) * _trust(readings[echo]) / len(later)
        for picked in itertools.product(*options):
            causes = tuple((index, cause) for index, cause, _ in picked if cause is not None)
            if _once_each(causes):
                yield Part((launch, *event, *causes), seen * math.prod(weight for _, _, weight in picked))


def _trust(reading: Reading) -> float:
    return 1 - max(reading.outlier, SMALLEST_OUTLIER)


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
    wrong = max(readings[index].outlier, SMALLEST_OUTLIER)
    for mirror in mirrors:
        yield index, Cause("node", mirror), (1 - wrong) * PRIOR_OF_ECHO["node"] / n_mirrors
    if echo is not None and index > echo:
        yield index, Cause("repeat"), (1 - wrong) * PRIOR_OF_ECHO["repeat"]
    yield index, None, wrong


def _once_each(causes: tuple[tuple[int, Cause], ...]) -> bool:
    """A mirror gives one first echo, and the event one of each kind."""
    kinds = [cause for _, cause in causes]
    return len(set(kinds)) == len(kinds)
