"""From the Laplace domain back to time, at the accuracy that is asked for."""

from dataclasses import dataclass

import numpy as np

from twlocate.arrays import ComplexArray, FloatArray

MARGIN = 1.1
"""The period is this much longer than the wanted stretch; what the smoothing spreads to before t = 0 wraps there."""


@dataclass(frozen=True)
class LaplaceGrid:
    """Where a transform is to be evaluated, and how it returns to time."""

    s: ComplexArray
    """shape (frequencies,), on the line Re s = damping, 1/s."""
    samples: int
    """Wanted samples, the first at t = 0."""
    period_samples: int
    rate_hz: float
    smoothing: ComplexArray
    """Transform of the Gaussian that every result is convolved with, shape (frequencies,)."""

    @property
    def time_s(self) -> FloatArray:
        """Times of the samples."""
        return np.arange(self.samples) / self.rate_hz

    def to_time(self, transform: ComplexArray) -> FloatArray:
        """Return the signal whose transform is given on the grid, shape (frequencies, ...) → (samples, ...)."""
        shape = (-1,) + (1,) * (transform.ndim - 1)
        periodic = np.fft.irfft(transform * self.smoothing.reshape(shape), self.period_samples, axis=0)
        rise = np.exp(self.s[0].real * self.time_s) * self.rate_hz
        signal: FloatArray = periodic[: self.samples] * rise.reshape(shape)
        return signal


def laplace_grid(duration_s: float, rate_hz: float, accuracy: float = 1e-4) -> LaplaceGrid:
    """Choose damping, period and smoothing for a wanted accuracy.

    Parameters
    ----------
    duration_s, rate_hz : float
        Stretch wanted from t = 0, and its sampling rate.
    accuracy : float
        Relative, between 1e-6 and 1e-2. What the period aliases is damped to it; the highest frequency is smoothed
        to its square, because the return to time raises late samples by as much as the damping lowered them.

    Raises
    ------
    ValueError
        `accuracy` is outside its range, or the stretch has fewer than 16 samples.

    Notes
    -----
    The inverse integral is sampled at s = c + j·2πk/T, which repeats the signal with the period T: sample t also
    holds f(t + mT)·exp(−c·m·T), so c = ln(2/accuracy)/T (D. J. Wilcox, Numerical Laplace transformation and
    inversion, Int. J. Elect. Eng. Educ. 15, 1978; F. A. Uribe, J. L. Naredo, P. Moreno, L. Guardado,
    Electromagnetic transients in underground transmission systems through the numerical Laplace transform, Int. J.
    Electr. Power Energy Syst. 24, 2002; both from memory). Cutting the spectrum off would ring (Gibbs); here every
    result is the exact signal convolved with a Gaussian of σ = 2·√ln(1/accuracy)/(π·rate), about 1.9 samples,
    which has no overshoot and no delay.
    """
    samples = round(duration_s * rate_hz)
    if not 1e-6 <= accuracy <= 1e-2:
        raise ValueError(f"accuracy {accuracy:g} is outside 1e-6 to 1e-2; double precision carries no more")
    if samples < 16:
        raise ValueError(f"{duration_s:g} s at {rate_hz:g} Hz is {samples} samples; at least 16 are needed")
    period = _fast_length(int(samples * MARGIN) + 32)
    damping = np.log(2 / accuracy) * rate_hz / period
    s = np.asarray(damping + 2j * np.pi * np.fft.rfftfreq(period, 1 / rate_hz), dtype=np.complex128)
    sigma = 2 * np.sqrt(np.log(1 / accuracy)) / (np.pi * rate_hz)
    return LaplaceGrid(s, samples, period, rate_hz, np.exp((s * sigma) ** 2 / 2))


def _fast_length(n: int) -> int:
    """Smallest even number not below `n` without a prime factor above 5."""
    while n % 2 or _without_small_factors(n) > 1:
        n += 1
    return n


def _without_small_factors(n: int) -> int:
    for factor in (2, 3, 5):
        while n % factor == 0:
            n //= factor
    return n
