"""When each sample was taken: sampling rates and sample stamps, weighed against each other.

The standard prefers the rates for precise timing (C37.111-1999 §6, note on the time stamp) and makes the stamps
compulsory where there is no rate. In files as met, stamps alone tell of gaps; rates alone resolve fractions of a
tick. So: inside a stretch the rate spaces the samples wherever the stamps agree with it to within a tick; where a
stretch starts is the stamps' word; where the two contradict each other, the stamps win and the repair says so.
"""

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field
from itertools import pairwise
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from twlocate.arrays import FloatArray
from twlocate.errors import RecordError
from twlocate.records.comtrade.configuration import RateLine
from twlocate.records.record import Stretch
from twlocate.records.repairs import GUESS, LIKELY, SURE, RepairLog
from twlocate.records.spacing import break_doubts, counted, listed, stretches_by_stamps

NO_STAMP = np.iinfo(np.int64).min
WRAPS = (2**16, 10**6, 2**31, 2**32, 10**9, 10**10)
"""Counts at which stamps have been seen to start again: word sizes, whole seconds, and ten ASCII digits."""
NEAR_RATE = 0.02
"""Neighbouring rates within this ratio follow one clock (a recorder locked to the line frequency): one stretch."""
MAX_BREAKS = 0.25
"""More breaks than this share of the samples are noise of the stamps, not gaps."""
AGREEMENT_TICKS = 1.5
"""Stamps this near to those of the rate agree with it: rounded or cut to a whole tick, by either clock."""
PROBES = 65
"""Stamps looked at, the last among them, before a window is read by the rate: a gap anywhere moves the last."""
CONTRADICTION = "the sample stamps contradict the sampling rate"


class StampedRows(Protocol):
    """Rows of any DAT form, as far as their time goes."""

    def __len__(self) -> int:
        """Return the number of rows."""
        ...

    def stamp_blocks(self) -> Iterator[tuple[slice, NDArray[np.int64]]]:
        """Yield all stamps in ticks in blocks with their place, `NO_STAMP` where missing."""
        ...

    def stamps_at(self, rows: Sequence[int]) -> list[int]:
        """Return the stamps of a few rows in ticks, `NO_STAMP` where missing."""
        ...

    def sample_numbers(self) -> NDArray[np.int64]:
        """Return the sample numbers, `NO_STAMP` where missing."""
        ...


@dataclass
class Timeline:
    """The stretches of a record and what makes its absolute time doubtful."""

    stretches: tuple[Stretch, ...]
    first_stamp_s: float = 0.0
    """The stamp of the first sample; 0 in a file that follows the standard."""
    doubts: list[str] = field(default_factory=list)


def timeline(
    rows: StampedRows, tick_s: float, rates: Sequence[RateLine], log: RepairLog, *, probe_only: bool = False
) -> Timeline:
    """Return when each sample was taken, time zero at the first.

    Parameters
    ----------
    rows
        The rows with their stamps.
    tick_s
        Seconds a tick of the stamps.
    rates
        Sampling rates with the number of the last sample of each; empty where the stamps rule.
    log
        Gets a repair for each contradiction.
    probe_only
        Take `PROBES` stamps in line with a single rate as proof for all: for a window of a long file.

    Raises
    ------
    RecordError
        Neither stamps nor rates give the samples a time.
    """
    if len(rates) == 1 and runs_evenly(rows, rates[0].rate_hz, tick_s, probe_only=probe_only):
        first_s = rows.stamps_at([0])[0] * tick_s
        return Timeline((Stretch(0, len(rows), 0.0, rates[0].rate_hz),), first_s)
    rates_hz = nominal_rates_hz(rates, len(rows), log)
    ticks = usable_stamps(np.concatenate([stamps for _, stamps in rows.stamp_blocks()]), rates_hz, tick_s, log)
    if ticks is None:
        return _by_rate_alone(rows, rates_hz, log)
    first_s = float(ticks[0]) * tick_s
    times_s = (ticks - ticks[0]) * tick_s
    if rates_hz is None:
        stretches, doubts = stretches_by_stamps(times_s, tick_s, "DAT", log)
        return Timeline(stretches, first_s, doubts)
    return _weighed(times_s, rates_hz, tick_s, first_s, log)


def runs_evenly(rows: StampedRows, rate_hz: float, tick_s: float, *, probe_only: bool) -> bool:
    """Tell whether every stamp (or every probed one) is where the rate puts it, without a gap or a wrap."""
    count, first = len(rows), rows.stamps_at([0])[0]
    if first == NO_STAMP:
        return False
    ticks_a_sample = 1.0 / (rate_hz * tick_s)
    if probe_only:
        probes = [round(part * (count - 1) / (PROBES - 1)) for part in range(PROBES)]
        late = (stamp - first - ticks_a_sample * row for stamp, row in zip(rows.stamps_at(probes), probes, strict=True))
        return all(abs(ticks) <= AGREEMENT_TICKS for ticks in late)
    places = ((stamps, np.arange(place.start, place.start + len(stamps))) for place, stamps in rows.stamp_blocks())
    return all(np.all(np.abs(s - (first + ticks_a_sample * index)) <= AGREEMENT_TICKS) for s, index in places)


def _by_rate_alone(rows: StampedRows, rates_hz: FloatArray | None, log: RepairLog) -> Timeline:
    """Return the stretches of a record without stamps; jumps of the sample number are gaps."""
    if rates_hz is None:
        raise RecordError("there is neither a sampling rate nor a usable stamp: the samples have no time")
    jumps = np.diff(rows.sample_numbers()) - 1
    breaks = np.flatnonzero(jumps > 0) + 1
    if not len(breaks) or len(breaks) > MAX_BREAKS * len(rates_hz) or np.any(jumps < 0) or np.ptp(rates_hz) > 0.0:
        return Timeline(tuple(_rate_stretches(rates_hz, np.array([0]), np.zeros(1))))
    numbers = [int(index) + 1 for index in breaks]
    log.add("sample numbers jump", f"DAT, before row {listed(numbers)}", "samples missing there: kept as gaps", LIKELY)
    starts = np.concatenate([[0], breaks]).astype(np.int64)
    lost = np.concatenate([[0], np.cumsum(jumps[breaks - 1])])
    return Timeline(tuple(_rate_stretches(rates_hz, starts, (starts + lost) / rates_hz[0])))


def nominal_rates_hz(rates: Sequence[RateLine], count: int, log: RepairLog) -> FloatArray | None:
    """Return the rate at which each sample is followed by the next, shape (count,); None without a rate."""
    if not rates:
        return None
    lasts = [rate.last for rate in rates]
    if any(later <= earlier for earlier, later in pairwise(lasts)):
        log.add("last samples of the rates do not rise", "CFG", "rates that add no sample passed over", LIKELY)
    rates_hz = np.full(count, rates[-1].rate_hz)
    start = 0
    for rate in rates:
        rates_hz[start : max(start, rate.last)] = rate.rate_hz
        start = max(start, rate.last)
    return rates_hz


def usable_stamps(
    stamps: NDArray[np.int64], rates_hz: FloatArray | None, tick_s: float, log: RepairLog
) -> NDArray[np.int64] | None:
    """Return the stamps without wraps and with holes bridged, or None where they say nothing."""
    known = stamps != NO_STAMP
    if not known.any() or (len(stamps) > 1 and np.ptp(stamps[known]) == 0):
        log.add(
            "stamps missing" if not known.any() else "all stamps equal", "DAT", "the sampling rate gives the time", SURE
        )
        return None
    if not known.all():
        stamps = _bridged(stamps, known, rates_hz, tick_s, log)
    return _unwrapped(stamps, log)


def _bridged(
    stamps: NDArray[np.int64], known: NDArray[np.bool_], rates_hz: FloatArray | None, tick_s: float, log: RepairLog
) -> NDArray[np.int64]:
    """Return the stamps with the missing ones counted on from the last one known, by the rate.

    Raises
    ------
    RecordError
        There is no rate to count by.
    """
    missing = int(np.count_nonzero(~known))
    if rates_hz is None:
        raise RecordError(f"{missing} samples have no stamp and there is no sampling rate: they have no time")
    log.add(f"{counted(missing, 'stamp')} missing", "DAT", "counted on from the last one by the sampling rate", LIKELY)
    first = int(np.argmax(known))
    last_known = np.maximum(np.maximum.accumulate(np.where(known, np.arange(len(stamps)), 0)), first)
    elapsed = elapsed_s(rates_hz) / tick_s
    counted_on = stamps[last_known] + np.rint(elapsed - elapsed[last_known]).astype(np.int64)
    return np.where(known, stamps, counted_on)


def _unwrapped(stamps: NDArray[np.int64], log: RepairLog) -> NDArray[np.int64]:
    """Return the stamps with every return to zero of a full counter undone."""
    steps = np.diff(stamps)
    usual = int(np.median(steps)) if len(steps) else 0
    back = np.flatnonzero(steps < 0)
    wrap = next((wrap for wrap in WRAPS if len(back) and _all_wraps(steps[back], wrap, usual)), None)
    if wrap is None:
        return stamps
    log.add(f"stamps wrap {counted(len(back), 'time')} at {wrap}", "DAT", "counted on", SURE)
    steps[back] += wrap
    first = int(stamps[0])
    if wrap == 2**32 and first >= 2**31:
        first -= wrap  # a stamp before zero, written as an unsigned word
    unwrapped: NDArray[np.int64] = np.cumsum(np.concatenate([[first], steps]))
    return unwrapped


def _all_wraps(back: NDArray[np.int64], wrap: int, usual: int) -> bool:
    return bool(np.all(np.abs(back + wrap - usual) <= max(2, usual // 2)))


def _weighed(times_s: FloatArray, rates_hz: FloatArray, tick_s: float, first_s: float, log: RepairLog) -> Timeline:
    """Return the stretches of a record that has both a rate and stamps."""
    steps, steps_s = np.diff(times_s), 1.0 / rates_hz
    ratio = _stamp_ratio(steps, steps_s, tick_s)
    if not 0.5 < ratio < 2.0:
        return _misscaled(times_s, rates_hz, ratio, tick_s, first_s, log)
    # where the rate changes, the step may belong to either side
    off = np.minimum(np.abs(steps - steps_s[:-1]), np.abs(steps - steps_s[1:]))
    breaks = np.flatnonzero(off > np.maximum(0.5 * steps_s[:-1], 2.5 * tick_s)) + 1
    if len(breaks) > MAX_BREAKS * len(steps_s):
        log.add("stamps jump about", "DAT", "passed over: the sampling rate gives the time", GUESS)
        return Timeline(tuple(_rate_stretches(rates_hz, np.array([0]), np.zeros(1))), first_s, [CONTRADICTION])
    doubts = break_doubts(steps, breaks, "DAT", log)
    starts = np.concatenate([[0], breaks]).astype(np.int64)
    if abs(ratio - 1.0) > 1e-3 and abs(ratio - 1.0) * float(np.median(steps_s)) > 1.001 * tick_s:
        what = f"stamps advance {ratio:.5g} times as fast as the sampling rate says"
        log.add(what, "DAT", "the stamps give the time", GUESS)
        return Timeline(tuple(_split(times_s, starts)), first_s, [*doubts, what])
    doubts += _drift_doubts(times_s, rates_hz, starts, tick_s, log)
    return Timeline(tuple(_rate_stretches(rates_hz, starts, times_s[starts], times_s)), first_s, doubts)


def _stamp_ratio(steps: FloatArray, steps_s: FloatArray, tick_s: float) -> float:
    """Return how many times faster the stamps advance than the rate says, gaps left out."""
    if not len(steps):
        return 1.0
    ratios = steps / steps_s[:-1]
    usual = float(np.median(ratios))
    near = np.abs(ratios - usual) <= max(0.5 * abs(usual), 2.5 * tick_s / float(np.median(steps_s)))
    return float(np.mean(ratios[near])) if near.any() else usual


def _misscaled(
    times_s: FloatArray, rates_hz: FloatArray, ratio: float, tick_s: float, first_s: float, log: RepairLog
) -> Timeline:
    """Return the stretches where stamps and rate differ by more than a factor of two: another unit, or nonsense."""
    power = round(np.log10(ratio)) if ratio > 0.0 else 0
    if power and abs(ratio / 10.0**power - 1.0) < 1e-3:
        log.add(
            f"stamps count in a unit {10.0**-power:g} times that of the standard", "DAT", "rescaled to the rate", LIKELY
        )
        unit = 10.0**power
        return _weighed(times_s / unit, rates_hz, tick_s / unit, first_s / unit, log)
    log.add(f"stamps advance {ratio:.4g} times as fast as the rate", "DAT", "the sampling rate gives the time", GUESS)
    return Timeline(tuple(_rate_stretches(rates_hz, np.array([0]), np.zeros(1))), first_s, [CONTRADICTION])


def _drift_doubts(
    times_s: FloatArray, rates_hz: FloatArray, starts: NDArray[np.int64], tick_s: float, log: RepairLog
) -> list[str]:
    """Tell of stamps that agree with the rate step by step but drift away from it over a stretch."""
    elapsed = elapsed_s(rates_hz)
    lasts = np.concatenate([starts[1:], [len(times_s)]]) - 1
    drift = (times_s[lasts] - times_s[starts]) - (elapsed[lasts] - elapsed[starts])
    worst = float(drift[np.argmax(np.abs(drift))])
    if abs(worst) <= 2.0 * tick_s:
        return []
    kept = "the rate kept" if np.ptp(rates_hz) == 0.0 else "the stamps kept"
    what = f"stamps drift {worst:+.3g} s from the rate over a stretch"
    if _cut_to_ticks(times_s, rates_hz, tick_s):
        log.add(what, "DAT", "every step was cut to whole ticks: the rate kept", LIKELY)
        return []
    log.add(what, "DAT", kept, GUESS)
    if abs(worst) <= 1.0 / float(np.min(rates_hz)):
        return []
    return [f"stamps and sampling rate disagree by up to {abs(worst):.3g} s within the record"]


def _cut_to_ticks(times_s: FloatArray, rates_hz: FloatArray, tick_s: float) -> bool:
    """Tell whether all steps are the one whole number of ticks below the rate's own step."""
    steps = np.rint(np.diff(times_s) / tick_s)
    return bool(np.ptp(steps) == 0.0 and np.ptp(rates_hz) == 0.0 and steps[0] == np.floor(1.0 / (rates_hz[0] * tick_s)))


def _split(times_s: FloatArray, starts: NDArray[np.int64]) -> list[Stretch]:
    """Return stretches that keep each sample's stamp."""
    bounds = [*starts.tolist(), len(times_s)]
    usual = float(np.median(np.diff(times_s)))
    return [_kept(times_s[i:j], i, usual) for i, j in pairwise(bounds)]


def _kept(times: FloatArray, first: int, usual: float) -> Stretch:
    span = float(times[-1] - times[0])
    rate = (len(times) - 1) / span if span > 0.0 else 1.0 / usual
    return Stretch(first, len(times), float(times[0]), rate, times)


def _rate_stretches(
    rates_hz: FloatArray, starts: NDArray[np.int64], start_times_s: FloatArray, times_s: FloatArray | None = None
) -> list[Stretch]:
    """Return stretches spaced by the rate, cut at `starts` and where the rate changes by more than `NEAR_RATE`."""
    bounds = [*starts.tolist(), len(rates_hz)]
    pieces = []
    for start, stop, time_s in zip(bounds, bounds[1:], start_times_s.tolist(), strict=False):
        pieces += _cut_by_rate(rates_hz[start:stop], start, time_s, None if times_s is None else times_s[start:stop])
    return pieces


def _cut_by_rate(rates_hz: FloatArray, first: int, time_s: float, times_s: FloatArray | None) -> list[Stretch]:
    """Return the stretches of an unbroken run of samples of one or several rates."""
    if np.ptp(rates_hz) == 0.0:
        return [Stretch(first, len(rates_hz), time_s, float(rates_hz[0]))]
    times = elapsed_s(rates_hz) + time_s if times_s is None else times_s
    cuts = [0, *(np.flatnonzero(np.abs(np.diff(rates_hz)) > NEAR_RATE * rates_hz[1:]) + 1).tolist(), len(rates_hz)]
    return [_of_near_rates(rates_hz[i:j], times[i:j], first + i) for i, j in pairwise(cuts)]


def _of_near_rates(rates_hz: FloatArray, times_s: FloatArray, first: int) -> Stretch:
    if np.ptp(rates_hz) == 0.0:
        return Stretch(first, len(rates_hz), float(times_s[0]), float(rates_hz[0]))
    return _kept(times_s, first, 1.0 / float(np.median(rates_hz)))


def elapsed_s(rates_hz: FloatArray) -> FloatArray:
    """Return the time of each sample from the first, by the rates."""
    return np.concatenate([[0.0], np.cumsum(1.0 / rates_hz[:-1])])
