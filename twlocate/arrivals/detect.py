"""Where fronts are: maxima of the wavelet modulus above what the noise before the event can reach."""

from dataclasses import dataclass
from statistics import NormalDist

import numpy as np

from twlocate.arrays import FloatArray
from twlocate.arrivals.modulus import Modulus, dyadic_scales, haar_coefficients, modulus, without_trend

LOOKS = (0.1, 0.6)
"""The noise is first measured on this share of the record, then on everything before the first front; where nothing
is found, on the next share, for a weak front in a short record: fronts are rare enough not to disturb the measure."""

FEWEST_QUIET = 48
"""Samples; on fewer the noise cannot be measured."""

WINDOWS_A_SCALE = 16
"""A scale is used if the quiet part holds this many windows of it."""

GROWTH = 1.15
"""A front is no longer than the scale from which doubling the scale raises the modulus by less than this."""

LEAST_TELLING = 0.2
"""A first front below this share of the strongest tells nothing of how the later ones rise."""

MOST_WEIGHED = 100
"""No more later fronts than this are looked at; what follows is ringing."""

SMALLEST_LATER = 0.03
"""Later fronts below this share of the first one are not listed."""


@dataclass(frozen=True)
class Candidate:
    """A front to be timed."""

    sample: int
    """Where its modulus is largest, about half way up."""
    scale: int
    """About its rise time, samples."""
    polarity: int
    height: float
    """Modulus where it stops growing: about the height of the front, in the trace's unit."""
    margin: float
    """By how many standard deviations its modulus is above the threshold."""


def threshold(false_alarm: float, n: int, n_scales: int) -> float:
    """Return how many standard deviations noise exceeds anywhere with probability `false_alarm`.

    The bound of Bonferroni over all samples and scales, for normal noise.
    """
    return -NormalDist().inv_cdf(false_alarm / (2 * n * n_scales))


@dataclass(frozen=True)
class FirstFront:
    """The first front, what precedes it, and how long the strongest front is."""

    front: Candidate | None
    quiet: int
    """Samples before the first front."""
    scale: int
    """About the rise time by which later fronts are told apart, samples: that of the first, if it is high enough to be
    like them, or else of the strongest."""


def first_front(samples: FloatArray, step: float, false_alarm: float) -> FirstFront:
    """Find the first front; each look has its share of the probability of a false alarm."""
    found = FirstFront(None, samples.size, 2)
    for share in LOOKS:
        quiet = max(int(share * samples.size), FEWEST_QUIET)
        found = _look(samples, step, false_alarm / len(LOOKS), quiet)
        if found.front is not None:
            break
    return found


def _look(samples: FloatArray, step: float, false_alarm: float, quiet: int) -> FirstFront:
    """Look for a front against the noise in the first `quiet` samples, then against all that precedes it."""
    front: Candidate | None = None
    scale = 2
    for _ in range(2):
        scales = dyadic_scales(2, max(quiet // (2 * WINDOWS_A_SCALE), 2))
        field = modulus(samples, scales, quiet, step)
        limit = threshold(false_alarm, samples.size, len(scales))
        front = _earliest(samples, field, limit)
        if front is None:
            return FirstFront(None, samples.size, scale)
        strongest = _grown(samples, field, limit, 0, int(field.largest.argmax()))
        scale = front.scale if front.height > LEAST_TELLING * strongest.height else strongest.scale
        quiet = max(front.sample - 2 * front.scale, 0)
        if quiet < FEWEST_QUIET:
            break
    return FirstFront(front, quiet, scale)


def _earliest(samples: FloatArray, field: Modulus, limit: float) -> Candidate | None:
    """Return the earliest front, followed from the finest scale that shows it."""
    above = np.flatnonzero(field.largest > limit)
    return None if above.size == 0 else _grown(samples, field, limit, *_finest(samples, field, limit, int(above[0])))


def _grown(samples: FloatArray, field: Modulus, limit: float, index: int, start: int) -> Candidate:
    """Follow a front from sample `start` at the scale `index` to the scale at which it stops growing."""
    heights = np.abs(haar_coefficients(samples, field.scales[index]))
    peak = _uphill(heights, start, field.scales[index])
    margin = heights[peak] / field.sigmas[index] - limit
    height = float(heights[peak])
    while index + 1 < len(field.scales):
        coarser = np.abs(haar_coefficients(samples, field.scales[index + 1]))
        summit = _uphill(coarser, peak, field.scales[index + 1])
        if coarser[summit] < GROWTH * heights[peak]:
            height = max(height, float(coarser[summit]))
            break
        index, heights, peak = index + 1, coarser, summit
        margin, height = max(margin, heights[peak] / field.sigmas[index] - limit), float(heights[peak])
    polarity = 1 if haar_coefficients(samples, field.scales[index])[peak] > 0 else -1
    return Candidate(peak, field.scales[index], polarity, height, float(margin))


def _finest(samples: FloatArray, field: Modulus, limit: float, start: int) -> tuple[int, int]:
    """Return (index of the finest scale that shows the front, where it first does so).

    A coarse scale sees a front from its own length ahead, so the front lies within two lengths of `start`.
    """
    coarse = int(field.strongest[start])
    stop = start + 2 * field.scales[coarse]
    for index in range(coarse):
        scale = field.scales[index]
        heights = np.abs(without_trend(haar_coefficients(samples, scale), scale)[start:stop])
        above = np.flatnonzero(heights > limit * field.sigmas[index])
        if above.size:
            return index, start + int(above[0])
    return coarse, start


def _uphill(heights: FloatArray, start: int, reach: int) -> int:
    """Return the maximum that is reached from `start` by steps of up to `reach` samples that lead up."""
    here = start
    while True:
        low = max(here - reach, 0)
        there = low + int(heights[low : here + reach + 1].argmax())
        if heights[there] <= heights[here]:
            return here
        here = there


def later_fronts(
    denoised: FloatArray, first: Candidate, scale: int, field_sigma: float, limit: float, most: int
) -> list[Candidate]:
    """Return the `most` strongest fronts behind the first one, in time order.

    They are maxima of the denoised trace's modulus at one scale.
    """
    coefficients = haar_coefficients(denoised, scale)
    height = np.abs(coefficients)
    start = first.sample + 2 * max(scale, first.scale)
    least = max(limit * field_sigma, SMALLEST_LATER * float(height[first.sample]))
    found: list[Candidate] = []
    while len(found) < MOST_WEIGHED:
        above = np.flatnonzero(height[start:] > least)
        if above.size == 0:
            break
        region = slice(start + int(above[0]), start + int(above[0]) + 2 * scale)
        peak = region.start + int(height[region].argmax())
        margin = float(height[peak]) / field_sigma - limit
        polarity = 1 if coefficients[peak] > 0 else -1
        found.append(Candidate(peak, scale, polarity, float(height[peak]), margin))
        start = peak + 2 * scale
    strongest = sorted(found, key=lambda candidate: -candidate.margin)[:most]
    return sorted(strongest, key=lambda candidate: candidate.sample)
