"""Where fronts are: maxima of the wavelet modulus above what the noise before the event can reach."""

from dataclasses import dataclass
from statistics import NormalDist

import numpy as np

from twlocate.arrays import FloatArray
from twlocate.arrivals.modulus import Modulus, dyadic_scales, haar_coefficients, modulus

FIRST_LOOK = 0.1
"""The noise is first measured on this share of the record, then on everything before the first front."""

FEWEST_QUIET = 48
"""Samples; on fewer the noise cannot be measured."""

WINDOWS_A_SCALE = 16
"""A scale is used if the quiet part holds this many windows of it."""

GROWTH = 1.3
"""A front is no longer than the scale from which doubling the scale raises the modulus by less than this."""

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
    margin: float
    """By how many standard deviations its modulus is above the threshold."""


def threshold(false_alarm: float, n: int, n_scales: int) -> float:
    """Return how many standard deviations noise exceeds anywhere with probability `false_alarm`.

    The bound of Bonferroni over all samples and scales, for normal noise.
    """
    return -NormalDist().inv_cdf(false_alarm / (2 * n * n_scales))


def first_front(samples: FloatArray, step: float, false_alarm: float) -> tuple[Candidate | None, int]:
    """Return the first front, or None, and the number of samples before it."""
    quiet = max(int(FIRST_LOOK * samples.size), FEWEST_QUIET)
    found: Candidate | None = None
    for _ in range(2):
        scales = dyadic_scales(2, max(quiet // (2 * WINDOWS_A_SCALE), 2))
        field = modulus(samples, scales, quiet, step)
        limit = threshold(false_alarm, samples.size, len(scales))
        found = _earliest(samples, field, limit)
        quiet = samples.size if found is None else max(found.sample - 2 * found.scale, 0)
        if quiet < FEWEST_QUIET:
            break
    return found, quiet


def _earliest(samples: FloatArray, field: Modulus, limit: float) -> Candidate | None:
    above = np.flatnonzero(field.largest > limit)
    if above.size == 0:
        return None
    start = int(above[0])
    scale = field.scales[int(field.strongest[start])]
    region = slice(max(start - scale, 0), start + 2 * scale)
    return _candidate(samples, field, region, limit)


def _candidate(samples: FloatArray, field: Modulus, region: slice, limit: float) -> Candidate:
    """Find the front in `region`: its scale, and at that scale its place."""
    heights = [float(np.abs(haar_coefficients(samples, scale)[region]).max()) for scale in field.scales]
    seen = [h > limit * sigma for h, sigma in zip(heights, field.sigmas, strict=True)]
    index = seen.index(True) if any(seen) else len(heights) - 1
    while index + 1 < len(heights) and heights[index + 1] > GROWTH * heights[index]:
        index += 1
    scale = field.scales[index]
    coefficients = haar_coefficients(samples, scale)[region]
    peak = int(np.abs(coefficients).argmax())
    margin = max(h / sigma for h, sigma in zip(heights, field.sigmas, strict=True)) - limit
    return Candidate(region.start + peak, scale, 1 if coefficients[peak] > 0 else -1, margin)


def later_fronts(
    denoised: FloatArray, first: Candidate, field_sigma: float, limit: float, most: int
) -> list[Candidate]:
    """Return fronts behind the first one, in time order: maxima of the denoised trace's modulus at its scale."""
    coefficients = haar_coefficients(denoised, first.scale)
    height = np.abs(coefficients)
    start = first.sample + 2 * first.scale
    least = max(limit * field_sigma, SMALLEST_LATER * float(height[first.sample]))
    found: list[Candidate] = []
    while len(found) < most:
        above = np.flatnonzero(height[start:] > least)
        if above.size == 0:
            break
        region = slice(start + int(above[0]), start + int(above[0]) + 2 * first.scale)
        peak = region.start + int(height[region].argmax())
        margin = float(height[peak]) / field_sigma - limit
        found.append(Candidate(peak, first.scale, 1 if coefficients[peak] > 0 else -1, margin))
        start = peak + 2 * first.scale
    return found
