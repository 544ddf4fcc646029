"""From a terminal's recording to the arrivals in it: channels to waves, waves to picks."""

import math
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, replace

import numpy as np

from twlocate.arrays import FloatArray
from twlocate.arrivals import Arrival, Gate, Picks, Trace, pick, strongest_mode
from twlocate.case import Case, Terminal
from twlocate.errors import RecordError
from twlocate.quantity import unit_scale
from twlocate.records import Channel, Record, Stretch, read
from twlocate.routes import Route, transit_s
from twlocate.scales import time_text
from twlocate.waves import AERIAL_MODES

VARIABLES = {"v": ("voltage", "V"), "i": ("current", "A"), "p": ("pressure", "Pa"), "q": ("flow", "m**3/s")}
"""Name and SI unit of what a role measures, by the role's first letter."""

ACROSS_AND_THROUGH = (("v", "i"), ("p", "q"))

PHASES = "abc"

FRONTS_LISTENING, FRONTS_LAUNCHING = 6, 16
"""Most fronts to time at a terminal; where a pulse was launched every echo has two."""

FEWEST_SAMPLES = 64
"""Fewer samples than this hold no noise to measure a front against."""

LARGEST_READING = 1e30
"""No recorder reads more in SI units; a larger figure is a broken scale, and its square would overflow."""

LEAST_LAUNCH = 0.2
"""A launched signal is at least this share of the highest front: an open or short end echoes no more than all of it."""

PULSE_STAYS_UP = 0.4
"""Between its edges a pulse stays above this share of its height."""

STILL_WITHOUT_CLIPPING = 0.5
"""Where more than this share of readings repeat the one before, equal readings tell nothing."""

CLIPPING_REACH = 24
"""Samples either side of the first front in which clipping is looked for, at least."""

FLAT_TOP = 6
"""This many equal readings at the limit of a channel are taken for clipping."""


@dataclass(frozen=True)
class Wave:
    """A weighted sum of a terminal's channels: a variable, a mode of three phases, an incoming wave."""

    name: str
    weights: Mapping[str, float]
    """Role → weight."""


@dataclass(frozen=True)
class Observation:
    """What was seen at one terminal."""

    terminal: Terminal
    record: Record
    wave: Wave
    picks: Picks
    gates: tuple[Gate, ...]


@dataclass(frozen=True)
class _Signals:
    """Simultaneous SI samples of a terminal's roles over one unbroken run."""

    by_role: Mapping[str, FloatArray]
    steps: Mapping[str, float]
    rate_hz: float
    start_s: float
    line_frequency_hz: float | None
    after_gap: bool
    """Whether samples of the recording precede this run, with some missing in between."""


def observe(case: Case, terminal: Terminal) -> Observation:
    """Read a terminal's recording and pick the arrivals in the wave that shows them best.

    Raises
    ------
    RecordError
        The recording cannot be read, or lacks a channel, a unit or an even time axis.
    """
    record = read(terminal.recording)
    channels = {role: record.channel(name) for role, name in terminal.channels.items()}
    signals = _signals(record, channels)
    waves = _waves(signals, _impedance_at(case, terminal.node) if _on_one_side(channels) else None)
    most = FRONTS_LAUNCHING if terminal.launches else FRONTS_LISTENING
    candidates = [(wave, pick(_trace(signals, wave), most=most)) for wave in waves]
    wave, picks = max(candidates, key=lambda candidate: _strength(candidate[1]))
    if terminal.launches:
        picks = from_the_launch(picks)
    if terminal.launches == "pulse":
        picks = without_trailing_edges(picks)
    gates = (*picks.gates, _clipping(signals, wave, picks), _gap(case.route, terminal.node, signals, picks))
    return Observation(terminal, record, wave, picks, gates)


def _strength(picks: Picks) -> float:
    return picks.arrivals[0].snr_db if picks.arrivals else -np.inf


# ---------------------------------------------------------------- channels to simultaneous signals


def _signals(record: Record, channels: Mapping[str, Channel]) -> _Signals:
    stretch = _stretch_of_event(record)
    if stretch.stamps_s is not None:
        raise RecordError(f"{record.path}: its samples are unevenly spaced; waves need an even sampling rate")
    skew_s = min(channel.skew_s for channel in channels.values())
    rows = {
        role: _aligned(_in_si(record, channel, role)[stretch.first : stretch.stop], channel, skew_s, stretch.rate_hz)
        for role, channel in channels.items()
    }
    aligned_from = math.ceil((max(channel.skew_s for channel in channels.values()) - skew_s) * stretch.rate_hz)
    first, stop = _longest_complete_run(np.array(list(rows.values())))
    if stop - first < FEWEST_SAMPLES:
        raise RecordError(
            f"{record.path}: {stop - first} unbroken samples in the channels named; {FEWEST_SAMPLES} or more are needed"
        )
    by_role = {role: row[first:stop] for role, row in rows.items()}
    _check_size(record, channels, by_role)
    return _Signals(
        by_role=by_role,
        steps={role: (channel.step or 0.0) * _si_scale(record, channel, role) for role, channel in channels.items()},
        rate_hz=stretch.rate_hz,
        start_s=stretch.start_s + first / stretch.rate_hz + skew_s,
        line_frequency_hz=record.line_frequency_hz,
        after_gap=first > aligned_from or stretch is not record.stretches[0],
    )


def _check_size(record: Record, channels: Mapping[str, Channel], by_role: Mapping[str, FloatArray]) -> None:
    for role, row in by_role.items():
        largest = float(np.abs(row).max())
        if largest > LARGEST_READING:
            raise RecordError(
                f"{record.path}: channel {channels[role].name!r} reads up to {largest:.3g} {VARIABLES[role[0]][1]}; "
                f"no recorder reads more than {LARGEST_READING:g}: check its unit and scale"
            )


def _stretch_of_event(record: Record) -> Stretch:
    """The stretch with the trigger in it, or else the longest."""

    def holds_trigger(stretch: Stretch) -> bool:
        return record.trigger_s is not None and 0 < record.trigger_s - stretch.start_s <= stretch.span_s

    return max(record.stretches, key=lambda stretch: (holds_trigger(stretch), stretch.count))


def _si_scale(record: Record, channel: Channel, role: str) -> float:
    """Return the factor from a channel's readings to SI on the primary side."""
    name, unit = VARIABLES[role[0]]
    to_primary = channel.ratio if channel.side == "secondary" and channel.ratio else 1.0
    try:
        return unit_scale(channel.unit, unit) * to_primary
    except ValueError as error:
        raise RecordError(
            f"{record.path}: channel {channel.name!r} is in {channel.unit!r}, which is no unit of {name} "
            f"as its role {role!r} needs; name another channel"
        ) from error


def _in_si(record: Record, channel: Channel, role: str) -> FloatArray:
    return channel.samples * _si_scale(record, channel, role)


def _aligned(samples: FloatArray, channel: Channel, skew_s: float, rate_hz: float) -> FloatArray:
    """Interpolate a channel that is sampled later than the others to their instants."""
    late = (channel.skew_s - skew_s) * rate_hz
    if late == 0:
        return samples
    index = np.arange(samples.size, dtype=np.float64)
    # what the channel had not yet sampled at an instant is missing, not equal to its first reading
    return np.interp(index, index + late, samples, left=np.nan)


def _longest_complete_run(rows: FloatArray) -> tuple[int, int]:
    """Return first and stop of the longest run of columns without a missing sample."""
    complete = np.isfinite(rows).all(axis=0)
    edges = np.diff(np.concatenate([[False], complete, [False]]).astype(np.int8))
    starts, stops = np.flatnonzero(edges == 1), np.flatnonzero(edges == -1)
    if starts.size == 0:
        return 0, 0
    longest = int(np.argmax(stops - starts))
    return int(starts[longest]), int(stops[longest])


# ---------------------------------------------------------------- signals to waves


def _impedance_at(case: Case, node: str) -> float | None:
    """Impedance of the section that ends at a terminal; None at a tee, where there is no single one."""
    links = case.route.neighbours[node]
    return case.route.sections[links[0][0]].impedance if len(links) == 1 else None


def _on_one_side(channels: Mapping[str, Channel]) -> bool:
    """Whether every reading can be had on the primary side, where the impedance holds.

    Secondary values with a ratio of 1:1 are those of a recorder that was not told the ratio.
    """
    return all(channel.side != "secondary" or channel.ratio not in (None, 1.0) for channel in channels.values())


def _waves(signals: _Signals, impedance: float | None) -> list[Wave]:
    """Return the waves worth picking: the incoming one where it can be split off, else each variable."""
    letters = list(dict.fromkeys(role[0] for role in signals.by_role))
    for across, through in ACROSS_AND_THROUGH:
        if impedance is not None and _phases(signals, across) == _phases(signals, through) != ():
            return [_in_modes(signals, "incoming wave", {across: 0.5, through: -0.5 * impedance})]
    return [_in_modes(signals, VARIABLES[letter][0], {letter: 1.0}) for letter in letters]


def _phases(signals: _Signals, letter: str) -> tuple[str, ...]:
    """Which suffixes a variable is recorded with: the three phases, none (one conductor), or () if not at all."""
    return tuple(phase for phase in ("", *PHASES) if letter + phase in signals.by_role)


def _in_modes(signals: _Signals, name: str, weights: dict[str, float]) -> Wave:
    """Return the wave `weights` makes of the variables, in the strongest aerial mode if it has three phases."""
    if _phases(signals, next(iter(weights))) != tuple(PHASES):
        return Wave(name, weights)
    in_phases = [_sum(signals, {letter + phase: w for letter, w in weights.items()}) for phase in PHASES]
    mode = strongest_mode(np.array(in_phases))
    shares = zip(PHASES, AERIAL_MODES[mode], strict=True)
    of_roles = {letter + phase: w * share for phase, share in shares for letter, w in weights.items() if share}
    return Wave(f"{name}, {mode}", of_roles)


def _sum(signals: _Signals, weights: Mapping[str, float]) -> FloatArray:
    total = np.zeros_like(next(iter(signals.by_role.values())))
    for role, weight in weights.items():
        total += weight * signals.by_role[role]
    return total


def _trace(signals: _Signals, wave: Wave) -> Trace:
    steps = [weight * signals.steps[role] for role, weight in wave.weights.items()]
    first_letter = next(iter(wave.weights))[0]
    return Trace(
        samples=_sum(signals, wave.weights),
        rate_hz=signals.rate_hz,
        start_s=signals.start_s,
        name=wave.name,
        unit=VARIABLES[first_letter][1],
        step=float(np.hypot.reduce(steps)),
        line_frequency_hz=signals.line_frequency_hz,
    )


# ---------------------------------------------------------------- pulses


def from_the_launch(picks: Picks) -> Picks:
    """Leave out what precedes the launched signal: it is no echo, and no echo is much higher than the launch."""
    heights = [arrival.amplitude for arrival in picks.arrivals]
    launch = next((i for i, height in enumerate(heights) if height >= LEAST_LAUNCH * max(heights)), 0)
    return _only(picks, range(launch, len(heights)))


def _only(picks: Picks, kept: Iterable[int]) -> Picks:
    indices = list(kept)
    return replace(
        picks,
        arrivals=tuple(picks.arrivals[index] for index in indices),
        fronts=tuple(picks.fronts[index] for index in indices),
    )


def without_trailing_edges(picks: Picks) -> Picks:
    """Leave out the falling edge of a launched pulse and those of its echoes.

    The pulse lasts from the first front to the second if that has the other sign and the trace stays up in
    between. A pulse too short for that is one arrival, and nothing is left out.
    """
    width_s = _pulse_width_s(picks)
    kept: list[int] = []
    for index, arrival in enumerate(picks.arrivals):
        if not any(_is_pulse(picks.arrivals[start], arrival, width_s) for start in kept):
            kept.append(index)
    return _only(picks, kept)


def _is_pulse(start: Arrival, end: Arrival, width_s: float) -> bool:
    """Whether two fronts belong to one pulse of the launched width.

    Its other edge has the other sign and comes late where the pulse was smeared; within the width itself noise makes
    fronts of either sign, and no second echo could be told apart.
    """
    apart_s = abs(end.time_s - start.time_s)
    return apart_s < width_s or (start.polarity != end.polarity and apart_s < 1.5 * width_s)


def _pulse_width_s(picks: Picks) -> float:
    """Return how long the launched pulse lasts; 0 where its two edges are not told apart."""
    if len(picks.arrivals) < 2 or picks.arrivals[0].polarity == picks.arrivals[1].polarity:
        return 0.0
    rising, falling = picks.arrivals[:2]
    start, end = (round(front.onset) for front in picks.fronts[:2])
    third = (end - start) // 3
    middle, before = picks.level[start + third : end - third], picks.level[: max(start - third, 1)]
    if middle.size == 0:
        return 0.0
    stays_up = rising.polarity * (np.median(middle) - np.median(before)) > PULSE_STAYS_UP * rising.amplitude
    return falling.time_s - rising.time_s if stays_up else 0.0


# ---------------------------------------------------------------- clipping


def _clipping(signals: _Signals, wave: Wave, picks: Picks) -> Gate:
    """Whether any channel of the wave stands at its limit where the first front is."""
    name = "no channel is clipped at the front"
    if not picks.arrivals:
        return Gate(name, True, "there is no front")
    front = picks.arrivals[0]
    at = round((front.time_s - signals.start_s) * signals.rate_hz)
    reach = max(CLIPPING_REACH, round(2 * front.rise_s * signals.rate_hz))
    window = slice(max(at - reach, 0), at + reach)
    clipped = [role for role in wave.weights if _flat_at_limit(signals.by_role[role], window)]
    detail = f"{', '.join(clipped)} at the end of its range" if clipped else "all within their range"
    return Gate(name, not clipped, detail, fatal=True)


def _flat_at_limit(samples: FloatArray, window: slice) -> bool:
    """Whether readings that should show noise stand still at the channel's largest or smallest value."""
    before = np.abs(np.diff(samples[: max(window.start, 2)]))
    if np.mean(before == 0) > STILL_WITHOUT_CLIPPING:
        return False  # the noise is below the converter step: readings stand still anyway
    for limit in (samples.max(), samples.min()):
        at_limit = samples[window] == limit
        runs = np.convolve(at_limit, np.ones(FLAT_TOP), "valid") if at_limit.size >= FLAT_TOP else np.zeros(0)
        if (runs >= FLAT_TOP).any():
            return True
    return False


# ---------------------------------------------------------------- gaps


def _gap(route: Route, node: str, signals: _Signals, picks: Picks) -> Gate:
    """Whether the first front can have been lost: its echo would then come first, a round trip later at most."""
    name = "no samples are missing just before the front"
    if not (signals.after_gap and picks.arrivals):
        return Gate(name, True, "the front is in an unbroken run" if picks.arrivals else "there is no front")
    lead_s = picks.arrivals[0].time_s - signals.start_s
    round_trip_s = max(transit_s(route, node, far).value + transit_s(route, far, node).value for far in route.nodes)
    detail = (
        f"the unbroken run begins {time_text(lead_s)} before the front; an echo takes up to {time_text(round_trip_s)}"
    )
    way_out = "" if lead_s > round_trip_s else ", so the front itself may be among them: use a record without this gap"
    return Gate(name, lead_s > round_trip_s, detail + way_out, fatal=True)
