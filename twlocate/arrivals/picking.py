"""A trace in, its arrivals out: hum off, noise measured, fronts found and timed."""

from dataclasses import replace

import numpy as np

from twlocate.arrays import FloatArray, as_signal
from twlocate.arrivals.arrival import Arrival, Gate, Picks, Trace
from twlocate.arrivals.denoise import shrink
from twlocate.arrivals.detect import FEWEST_QUIET, Candidate, first_front, later_fronts, threshold
from twlocate.arrivals.modulus import haar_coefficients, robust_sigma
from twlocate.arrivals.noise import Noise, measure_noise, without_hum
from twlocate.arrivals.refine import Front, refine

SMALLEST_REACH = 8
LARGEST_REACH = 32
"""Samples; a front that rises more slowly is timed on averages of several samples."""

WINDOW = 3
"""Samples used before and behind a front, in units of its reach."""

TRUSTED_OUTLIER = 1e-6
DOUBTFUL_OUTLIER = 0.1
"""Outlier probability of a front far above, and just at, the threshold (common practice, no source)."""


def pick(trace: Trace, *, false_alarm: float = 1e-3, most: int = 8) -> Picks:
    """Find and time the fronts in a trace.

    Parameters
    ----------
    trace : Trace
        Evenly sampled, with at least a few dozen samples before the event.
    false_alarm : float
        Probability that noise alone gives a first front somewhere in the trace.
    most : int
        No more fronts than this are listed: the first and the strongest behind it.

    Returns
    -------
    Picks
        In time order; empty where nothing stands out of the noise.

    Raises
    ------
    ValueError
        The samples are not a row of finite numbers.
    """
    samples = as_signal(trace.samples, trace.name or "trace")
    trace = replace(trace, step=max(trace.step, _finest_step(samples)))
    samples = _hum_off(samples, trace, false_alarm)
    look = first_front(samples, trace.step, false_alarm)
    first, quiet = look.front, look.quiet
    gates = [_quiet_gate(first, quiet)]
    if first is None or quiet < FEWEST_QUIET:
        return Picks(trace, samples, samples, 0.0, (), tuple(gates))
    noise = measure_noise(samples[:quiet], trace.step)
    denoised = shrink(samples, quiet)
    sigma = robust_sigma(haar_coefficients(samples, look.scale)[look.scale : quiet], trace.step / np.sqrt(12))
    limit = threshold(false_alarm, samples.size, 1)
    candidates = [first, *later_fronts(denoised, first, look.scale, sigma, limit, most - 1)]
    fronts = [_time(samples, candidates, index, quiet, noise, trace.step) for index in range(len(candidates))]
    arrivals = tuple(
        _arrival(trace, front, candidate, noise) for front, candidate in zip(fronts, candidates, strict=True)
    )
    return Picks(trace, samples, denoised, noise.spread, arrivals, tuple(gates), tuple(fronts))


def _finest_step(samples: FloatArray) -> float:
    """Return the smallest difference between two readings: what a silent record cannot be better than."""
    differences = np.diff(np.unique(samples))
    return float(differences.min()) if differences.size else 1.0


def _hum_off(samples: FloatArray, trace: Trace, false_alarm: float) -> FloatArray:
    """Subtract the power frequency, as far as a first look at the fine scales tells what precedes the event."""
    if trace.line_frequency_hz is None:
        return samples
    look = first_front(samples, trace.step, false_alarm)
    before = look.quiet if look.front is None else max(look.front.sample - 4 * look.front.scale, 0)
    return without_hum(samples, trace.rate_hz, trace.line_frequency_hz, before)


def _quiet_gate(first: Candidate | None, quiet: int) -> Gate:
    name = "the noise before the event can be measured"
    if first is not None and quiet < FEWEST_QUIET:
        detail = f"only {quiet} samples precede the first front; a record that starts earlier is needed"
        return Gate(name, False, detail, fatal=True)
    return Gate(name, True, f"{quiet} samples")


def _time(samples: FloatArray, candidates: list[Candidate], index: int, quiet: int, noise: Noise, step: float) -> Front:
    """Time one candidate within the room its neighbours leave, on averages if it rises slowly."""
    here = candidates[index]
    reach = max(SMALLEST_REACH, 2 * here.scale)
    block = max(reach // LARGEST_REACH, 1)
    behind = candidates[index - 1].sample + here.scale if index else 0
    ahead = candidates[index + 1].sample - here.scale if index + 1 < len(candidates) else samples.size
    low = max(behind, here.sample - WINDOW * reach, 0)
    high = min(max(ahead, here.sample + here.scale), here.sample + WINDOW * reach, samples.size)
    if block == 1:
        return refine(samples, here.sample, reach, here.height, (low, high), noise)
    averaged = samples[: samples.size // block * block].reshape(-1, block).mean(axis=1)
    noise = measure_noise(averaged[: quiet // block], step / float(np.sqrt(block)))
    front = refine(averaged, here.sample / block, reach / block, here.height, (low // block, high // block), noise)
    middle = (block - 1) / 2
    return replace(
        front,
        onset=front.onset * block + middle,
        u=front.u * block,
        rise=front.rise * block,
        window=(front.window[0] * block, front.window[0] * block + front.fitted.size * block),
        fitted=np.repeat(front.fitted, block),
    )


def _arrival(trace: Trace, front: Front, candidate: Candidate, noise: Noise) -> Arrival:
    return Arrival(
        time_s=trace.start_s + front.onset / trace.rate_hz,
        u_s=front.u / trace.rate_hz,
        polarity=candidate.polarity,
        amplitude=candidate.height,
        snr_db=20 * float(np.log10(candidate.height / noise.spread)),
        outlier=TRUSTED_OUTLIER + DOUBTFUL_OUTLIER * float(np.exp(-max(candidate.margin, 0.0))),
        rise_s=front.rise / trace.rate_hz,
        shape=front.shape,
    )
