"""The modulus of an undecimated wavelet transform, and what noise makes of it.

The wavelet is the Haar wavelet: at scale s the coefficient at k is the mean of the s samples from k on less
the mean of the s samples before. It is the derivative of a smoothing function, so a front is a maximum of the
modulus that lines up over the scales (S. Mallat and W. L. Hwang, Singularity detection and processing with
wavelets, IEEE Trans. Inf. Theory 38, 1992); cumulative sums make it linear in the number of samples at every
scale, and no shift changes it but by the same shift.
"""

from dataclasses import dataclass

import numpy as np

from twlocate.arrays import FloatArray

TINY = 1e-300

SILENT_SHARE = 0.5
"""Of the converter step, where the noise is too small to spread the rounding: one step up and back is then no front."""

STANDS_OUT = 4.0

MEDIAN_OF_NORMAL = 0.6744897501960817
"""The median of |z| for a standard normal z."""


def dyadic_scales(smallest: int, largest: int) -> tuple[int, ...]:
    """Return the powers of two from `smallest` to `largest`, in samples."""
    return tuple(2**power for power in range(smallest.bit_length() - 1, max(largest, smallest).bit_length()))


def haar_coefficients(samples: FloatArray, scale: int) -> FloatArray:
    """Return mean(samples[k : k + scale]) − mean(samples[k − scale : k]) for every k, shape (n,).

    Where the window reaches over an end of the record the coefficient is zero.
    """
    n = samples.size
    coefficients = np.zeros(n)
    if n < 2 * scale:
        return coefficients
    sums = np.concatenate([[0.0], np.cumsum(samples - samples[0])])
    window = sums[scale:] - sums[:-scale]
    coefficients[scale : n - scale + 1] = (window[scale:] - window[:-scale]) / scale
    return coefficients


def robust_sigma(values: FloatArray, least: float = 0.0) -> float:
    """Return the standard deviation of the values less those that stand out of normal noise, at least `least`.

    What stands out is more than `STANDS_OUT` times what the median modulus tells; the median alone is coarse where
    readings are few converter steps high.
    """
    if values.size == 0:
        return least
    size = np.abs(values)
    rough = float(np.median(size)) / MEDIAN_OF_NORMAL
    inside = size[size <= STANDS_OUT * rough]
    return max(float(np.sqrt(np.mean(inside**2))), least)


def without_trend(coefficients: FloatArray, scale: int) -> FloatArray:
    """Subtract the coefficient two scales earlier: a steady slope, as of the power frequency, is then no front.

    Looking back only, it puts nothing before a front; what it puts behind one is of no concern to the first.
    """
    free = np.zeros_like(coefficients)
    free[3 * scale :] = coefficients[3 * scale :] - coefficients[scale : max(free.size - 2 * scale, scale)]
    return free


@dataclass(frozen=True)
class Modulus:
    """Haar coefficients, free of trend, at several scales in units of the noise before the event."""

    scales: tuple[int, ...]
    sigmas: tuple[float, ...]
    """Standard deviation of the noise at each scale, in the trace's unit."""
    largest: FloatArray
    """(n,) the largest |coefficient|/sigma over the scales at each sample."""
    strongest: FloatArray
    """(n,) index of the scale where that is."""


def modulus(samples: FloatArray, scales: tuple[int, ...], quiet: int, step: float) -> Modulus:
    """Measure every scale against the noise in the first `quiet` samples.

    `step` is the converter's; noise below its rounding error is not believed.
    """
    rounding = 1e-12 * float(np.abs(samples).max())
    largest = np.zeros(samples.size)
    strongest = np.zeros(samples.size)
    sigmas: list[float] = []
    silent = robust_sigma(np.diff(samples[:quiet])) < step
    for index, scale in enumerate(scales):
        coefficients = without_trend(haar_coefficients(samples, scale), scale)
        rounded = step * SILENT_SHARE if silent else step / np.sqrt(3 * scale)  # four means of `scale` rounded values
        least = max(rounded, rounding, TINY)
        sigma = robust_sigma(coefficients[3 * scale : max(quiet - scale, 3 * scale)], float(least))
        sigmas.append(sigma)
        relative = np.abs(coefficients) / sigma
        higher = relative > largest
        strongest[higher] = index
        np.maximum(largest, relative, out=largest)
    return Modulus(scales, tuple(sigmas), largest, strongest)
