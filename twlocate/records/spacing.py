"""Stretches from the time of each sample alone: where it breaks off, and whether it is even."""

from collections.abc import Sequence
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from twlocate.arrays import FloatArray
from twlocate.errors import RecordError
from twlocate.records.record import Stretch
from twlocate.records.repairs import GUESS, SURE, RepairLog

FINE_TICK = 0.25
"""Times rounded to more than this part of a step cannot tell an even spacing from a missing sample: they are kept."""
GAP_STEPS = 10.0
"""Without a rate, a step longer than this many usual steps is a gap."""


def stretches_by_stamps(
    times_s: FloatArray, tick_s: float, where: str, log: RepairLog
) -> tuple[tuple[Stretch, ...], list[str]]:
    """Return the stretches of samples whose times alone are known, and doubts about the clock.

    Parameters
    ----------
    times_s
        Time of each sample, shape (samples,).
    tick_s
        Size of the last digit of the times: spacing is even when it is so to within a tick.
    where
        What to call the place in a repair.
    log
        Gets gaps and steps back.

    Raises
    ------
    RecordError
        The times do not advance.
    """
    steps = np.diff(times_s)
    if np.any(steps == 0.0) and _even_below_a_tick(times_s, tick_s):
        log.add("times coarser than the sampling", where, "samples spaced evenly between first and last", GUESS)
        rate_hz = (len(times_s) - 1) / float(times_s[-1] - times_s[0])
        return (Stretch(0, len(times_s), float(times_s[0]), rate_hz),), []
    usual = float(np.median(steps)) if len(steps) else 0.0
    if usual <= 0.0:
        raise RecordError(
            f"the times of {where} do not advance and no sampling rate is given: the samples have no time"
        )
    breaks = np.flatnonzero((steps <= 0.0) | (steps > GAP_STEPS * usual)) + 1
    doubts = break_doubts(steps, breaks, where, log)
    bounds = [0, *breaks.tolist(), len(times_s)]
    pieces = (_evened(times_s, i, j, tick_s, usual) for i, j in pairwise(bounds))
    return tuple(pieces), doubts


def _even_below_a_tick(times_s: FloatArray, tick_s: float) -> bool:
    """Tell whether even spacing, rounded to ticks longer than its step, explains the times."""
    even = np.linspace(times_s[0], times_s[-1], len(times_s))
    advances = times_s[-1] - times_s[0] >= tick_s
    return bool(advances and np.all(np.abs(times_s - even) <= 1.001 * tick_s))


def _evened(times_s: FloatArray, first: int, stop: int, tick_s: float, usual: float) -> Stretch:
    times = times_s[first:stop]
    count = stop - first
    mean = float(times[-1] - times[0]) / (count - 1) if count > 1 else usual
    even = times[0] + mean * np.arange(count)
    allowed = 1.001 * tick_s if tick_s <= FINE_TICK * mean else 1e-6 * mean
    is_even = bool(np.all(np.abs(times - even) <= allowed))
    return Stretch(first, count, float(times[0]), 1.0 / mean, None if is_even else times)


def break_doubts(steps: FloatArray, breaks: NDArray[np.int64], where: str, log: RepairLog) -> list[str]:
    """Write gaps and steps back to the log; steps back also make the clock doubtful.

    Parameters
    ----------
    steps
        Step from each sample to the next, shape (samples - 1,).
    breaks
        Indices of the samples before which the record breaks off.
    where
        What to call the place in a repair.
    log
        Gets one entry for gaps and one for steps back.
    """
    back = [int(index) + 1 for index in breaks if steps[index - 1] <= 0.0]
    gaps = [int(index) + 1 for index in breaks if steps[index - 1] > 0.0]
    if gaps:
        log.add(
            f"{counted(len(gaps), 'gap')} in the times", f"{where}, before sample {listed(gaps)}", "kept as gaps", SURE
        )
    if not back:
        return []
    log.add(
        "times step back", f"{where}, before sample {listed(back)}", "kept as stretches that overlap in time", GUESS
    )
    return [f"times step back before sample {listed(back)}: the order of events is uncertain"]


def counted(number: int, thing: str) -> str:
    """Return ``1 gap``, ``2 gaps``."""
    return f"{number} {thing}" if number == 1 else f"{number} {thing}s"


def listed(numbers: Sequence[int]) -> str:
    """Return the first few of `numbers` as text."""
    shown = ", ".join(str(number) for number in numbers[:6])
    return shown + (" ..." if len(numbers) > 6 else "")
