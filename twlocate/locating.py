"""The main job in one piece: a case in, a finding out."""

import hashlib
import itertools
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

from twlocate import __version__
from twlocate.arrivals import Arrival, Gate
from twlocate.case import Case
from twlocate.errors import NoPosition
from twlocate.observing import Observation, observe
from twlocate.position import Estimate, Reading, Station, estimate
from twlocate.quantity import Quantity
from twlocate.routes import transit_s
from twlocate.scales import time_scale, time_text

TRANSIT_SIGMAS = 4.0
"""A difference of first arrivals may exceed the transit time by this many standard uncertainties."""

EVENT_REFLECTS = {"line": 0.5, "pipe": 0.05}
"""Prior probability that an echo is the event's own: a fault throws back much of a wave, a leak little (common
practice, no source)."""

ECHO_BLUR = 0.1
"""Standard uncertainty of an echo's onset, as a share of its rise, for what terminals and other waves do to its shape
(common practice, no source)."""

FAINT_ECHO = 0.05
"""An echo of this share of the launched pulse is as likely the event's as not (common practice, no source)."""

TRANSIT_CHECK = "arrival difference within the transit time"

NS = 1e-9


@dataclass(frozen=True)
class PlaceShare:
    """A named place and how probable it is that the event is nearer to it than to any other on its section."""

    name: str
    section: int
    distance_m: float
    probability: float
    lat: float | None
    lon: float | None


@dataclass(frozen=True)
class InputFile:
    """A file the finding rests on."""

    file: str
    sha256: str


@dataclass(frozen=True)
class Finding:
    """Everything there is to say about an event."""

    case: Case
    estimate: Estimate | None
    reason: str
    """Why there is no position; empty where there is one."""
    observations: tuple[Observation, ...]
    readings: tuple[Reading, ...]
    zero_ns: int | None
    """Zero of the readings, integer nanoseconds UTC since 1970-01-01; None where no record has an absolute time."""
    checks: tuple[Gate, ...]
    places: tuple[PlaceShare, ...]
    inputs: tuple[InputFile, ...]
    version: str = __version__

    @property
    def status(self) -> str:
        """``located``, ``ambiguous`` (the band falls into separate pieces) or ``no position``."""
        if self.estimate is None:
            return "no position"
        return "located" if self.estimate.in_one_run else "ambiguous"


def locate(case: Case, *, coverage: float = 0.95) -> Finding:
    """Locate the event of a case.

    Raises
    ------
    RecordError
        A recording cannot be read or used.
    """
    observations = tuple(observe(case, terminal) for terminal in case.terminals)
    zero_ns = min((o.record.start_ns for o in observations if o.record.start_ns is not None), default=None)
    stations = [station_of(observation, zero_ns) for observation in observations]
    readings = [r for index, observation in enumerate(observations) for r in _readings(index, observation, zero_ns)]
    checks = [*_gates(observations, zero_ns), *_transit_checks(case, stations, readings)]
    found, reason = _estimate(case, stations, readings, checks, coverage)
    return Finding(
        case=case,
        estimate=found,
        reason=reason,
        observations=observations,
        readings=tuple(readings),
        zero_ns=zero_ns,
        checks=tuple(checks),
        places=_places(case, found) if found else (),
        inputs=_inputs(case, observations),
    )


# ---------------------------------------------------------------- observations to evidence


def station_of(observation: Observation, zero_ns: int | None) -> Station:
    """Return what the arithmetic needs to know of a terminal; `zero_ns` as in :class:`Finding`."""
    terminal = observation.terminal
    return Station(
        terminal.node,
        _clock(observation, zero_ns),
        terminal.delay,
        reflects=terminal.reflects,
        launches=terminal.launches is not None,
    )


def _clock(observation: Observation, zero_ns: int | None) -> Quantity | None:
    """By how much the terminal's clock is ahead: as the case file says, or else as the recording does.

    A recording without an absolute start has no clock to speak of beside one that has; where none has, a clock stated
    in the case file means that they were started together.
    """
    terminal, record = observation.terminal, observation.record
    if terminal.clock_free or (record.start_ns is None and zero_ns is not None):
        return None
    if terminal.clock is not None:
        return terminal.clock
    if record.start_ns is None or not record.clock.usable or record.clock.u_s is None:
        return None
    rounding = (record.resolution_ns or 0) * NS / 12**0.5  # the last digit of the start: rectangular, GUM 4.3.7
    return Quantity(0.0, (record.clock.u_s**2 + rounding**2) ** 0.5)


def _readings(index: int, observation: Observation, zero_ns: int | None) -> list[Reading]:
    start_ns = observation.record.start_ns
    offset_s = 0.0 if start_ns is None or zero_ns is None else (start_ns - zero_ns) * NS
    arrivals = observation.picks.arrivals
    if observation.terminal.launches and arrivals:
        return [_reading(index, 0.0, arrivals[0]), *(_echo_reading(index, a, arrivals[0]) for a in arrivals[1:])]
    return [_reading(index, offset_s, arrival) for arrival in arrivals]


def _reading(index: int, offset_s: float, arrival: Arrival) -> Reading:
    blur_s = ECHO_BLUR * arrival.rise_s
    return Reading(index, offset_s + arrival.time_s, arrival.u_s, arrival.outlier, arrival.polarity, blur_s)


def _echo_reading(index: int, echo: Arrival, launched: Arrival) -> Reading:
    """Return the reading of an echo in the light of what was launched.

    Faint echoes are splices and ringing more often than the event. An echo that rises more slowly than the launched
    signal was dispersed: its onset is the earliest time that the stated speed can refer to, the middle of its front
    the latest, and what lies between is as likely anywhere (rectangular, GUM 4.3.7).
    """
    faint = 1 / (1 + (echo.amplitude / (FAINT_ECHO * launched.amplitude)) ** 2)
    latest_s = max(echo.rise_s - launched.rise_s, 0.0) / 2
    return Reading(
        station=index,
        time_s=echo.time_s + latest_s / 2,
        u_s=(echo.u_s**2 + latest_s**2 / 12) ** 0.5,
        outlier=1 - (1 - echo.outlier) * (1 - faint),
    )


# ---------------------------------------------------------------- checks


def _gates(observations: Sequence[Observation], zero_ns: int | None) -> list[Gate]:
    return [
        Gate(f"{observation.terminal.node}: {gate.name}", gate.passed, gate.detail, gate.fatal)
        for observation in observations
        for gate in (_front_gate(observation), *observation.gates, _clock_gate(observation, zero_ns))
    ]


def _front_gate(observation: Observation) -> Gate:
    arrivals = observation.picks.arrivals
    detail = f"{len(arrivals)}, the first {arrivals[0].snr_db:.0f} dB above it" if arrivals else "none does"
    return Gate("a front stands out of the noise", bool(arrivals), detail)


def _clock_gate(observation: Observation, zero_ns: int | None) -> Gate:
    clock = _clock(observation, zero_ns)
    if observation.terminal.launches:
        return Gate("clock", True, "not needed: pulse and echo are timed by the same clock")
    if clock is not None:
        together = "" if zero_ns is not None else ", the recordings taken as started together: none states when"
        return Gate("clock", True, f"standard uncertainty {time_text(clock.u)}{together}")
    if observation.record.start_ns is None and zero_ns is not None:
        return Gate("clock", False, "free: the recording does not state when it starts, as another one does")
    return Gate("clock", False, "free: neither the case file nor the recording states an uncertainty for it")


def _transit_checks(case: Case, stations: Sequence[Station], readings: Sequence[Reading]) -> list[Gate]:
    """First arrivals at two ends cannot differ by more than the time a wave takes between them."""
    first = {r.station: r for r in reversed(readings) if stations[r.station].clock and not stations[r.station].launches}
    return [_transit_check(case, stations, first[a], first[b]) for a, b in itertools.combinations(sorted(first), 2)]


def _transit_check(case: Case, stations: Sequence[Station], one: Reading, other: Reading) -> Gate:
    early, late = sorted((one, other), key=lambda reading: _true_time(stations, reading).value)
    start, end = stations[early.station].node, stations[late.station].node
    transit = transit_s(case.route, start, end)
    difference = _true_time(stations, late).value - _true_time(stations, early).value
    u = sum(q.u**2 for q in (transit, _true_time(stations, late), _true_time(stations, early))) ** 0.5
    scale = time_scale(max(difference, transit.value), u)
    detail = (
        f"the first front reaches {end} {scale(difference)} after {start}; "
        f"a wave needs {scale(transit.value)} from one to the other (u {time_text(u)})"
    )
    passed = bool(difference <= transit.value + TRANSIT_SIGMAS * u)
    way_out = "" if passed else "; a clock is off, or a first front is missing: check the clocks, or set one to 'free'"
    return Gate(f"{start} and {end}: {TRANSIT_CHECK}", passed, detail + way_out)


def _true_time(stations: Sequence[Station], reading: Reading) -> Quantity:
    station = stations[reading.station]
    clock = station.clock or Quantity(0.0)
    u = (reading.u_s**2 + station.delay.u**2 + clock.u**2) ** 0.5
    return Quantity(reading.time_s - station.delay.value - clock.value, u)


# ---------------------------------------------------------------- the finding's parts


def _estimate(
    case: Case, stations: Sequence[Station], readings: Sequence[Reading], checks: Sequence[Gate], coverage: float
) -> tuple[Estimate | None, str]:
    """Return the estimate, or None and the reason."""
    fatal = [f"{gate.name}: {gate.detail}" for gate in checks if gate.fatal and not gate.passed]
    if fatal:
        return None, "; ".join(fatal)
    contradictions = [gate.detail for gate in checks if TRANSIT_CHECK in gate.name and not gate.passed]
    try:
        return estimate(case.route, stations, readings, coverage=coverage, again=EVENT_REFLECTS[case.kind]), ""
    except NoPosition as error:
        return None, "; ".join(contradictions) or str(error)


def _places(case: Case, found: Estimate) -> tuple[PlaceShare, ...]:
    shares = []
    for index, section in enumerate(case.route.sections):
        places = sorted((p for p in case.places if p.section == index), key=lambda place: place.distance_m)
        middles = [(a.distance_m + b.distance_m) / 2 for a, b in itertools.pairwise(places)]
        edges = [0.0, *middles, section.length.value]
        for place, (low, high) in zip(places, itertools.pairwise(edges), strict=False):
            probability = found.densities[index].between(low, high)
            shares.append(PlaceShare(place.name, index, place.distance_m, probability, place.lat, place.lon))
    return tuple(sorted(shares, key=lambda share: -share.probability))


def _inputs(case: Case, observations: Sequence[Observation]) -> tuple[InputFile, ...]:
    files = [case.path, *(file for o in observations for file in o.record.files)]
    if case.places_file:
        files.append(case.places_file)
    return tuple(InputFile(file.name, _sha256(file)) for file in files)


def _sha256(path: Path) -> str:
    with path.open("rb") as file:
        return hashlib.file_digest(file, "sha256").hexdigest()
