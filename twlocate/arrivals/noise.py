"""The noise before the event: its colour, and the hum that can be foretold and taken away."""

from dataclasses import dataclass

import numpy as np

from twlocate.arrays import FloatArray

LARGEST_ORDER = 4
"""Coefficients of the autoregressive model; enough for the first few lags, which a short front window sees."""

SAMPLES_A_COEFFICIENT = 50
"""Fewer quiet samples than this for each coefficient do not support it."""

HARMONICS = (1, 2, 3, 5, 7)
"""Of the power frequency; the even ones beyond the second and those above the seventh are small."""

LEAST_CYCLES = 0.1
"""Less of a power-frequency cycle than this before the event does not tell the hum from a drift."""


@dataclass(frozen=True)
class Noise:
    """Noise as an autoregressive process: x[k] = Σ coefficients[i]·x[k − 1 − i] + innovation."""

    coefficients: FloatArray
    sigma: float
    """Standard deviation of the innovations, in the trace's unit."""
    spread: float
    """Standard deviation of the noise itself."""
    count: int
    """Samples it was measured on."""

    def whiten(self, rows: FloatArray) -> FloatArray:
        """Return `rows` (…, n) with the predictable part taken off, shape (…, n − order)."""
        order = self.coefficients.size
        whitened = rows[..., order:].copy()
        for lag, coefficient in enumerate(self.coefficients, 1):
            whitened -= coefficient * rows[..., order - lag : -lag]
        return whitened


def measure_noise(quiet: FloatArray, step: float) -> Noise:
    """Fit an autoregressive model to the samples before the event, straight trend removed (Yule–Walker).

    `step` is the converter's: rounding alone has the standard deviation step/√12, and no less is believed.
    """
    n = quiet.size
    t = np.arange(n) - (n - 1) / 2
    centred = quiet - quiet.mean()
    centred = centred - t * (t @ centred) / max(t @ t, 1.0)
    least = max(step / np.sqrt(12), float(np.finfo(np.float64).tiny) ** 0.5)
    spread = max(float(np.sqrt(centred @ centred / max(n - 2, 1))), least)
    order = min(LARGEST_ORDER, n // SAMPLES_A_COEFFICIENT)
    if order == 0 or spread == least:
        return Noise(np.zeros(0), spread, spread, n)
    lags = np.array([centred[: n - lag] @ centred[lag:] for lag in range(order + 1)]) / n
    toeplitz = lags[np.abs(np.subtract.outer(np.arange(order), np.arange(order)))]
    coefficients = np.linalg.solve(toeplitz + np.eye(order) * 1e-9 * lags[0], lags[1:])
    sigma = max(float(np.sqrt(max(lags[0] - coefficients @ lags[1:], 0.0))), least)
    return Noise(coefficients, sigma, spread, n)


def without_hum(samples: FloatArray, rate_hz: float, line_frequency_hz: float, quiet: int) -> FloatArray:
    """Subtract the power frequency and its harmonics, fitted to the first `quiet` samples.

    The fit is extrapolated over the whole record, so the event does not enter it and no front is moved or
    rounded. With less than a cycle before the event only the fundamental is fitted.
    """
    cycles = quiet * line_frequency_hz / rate_hz
    if cycles < LEAST_CYCLES:
        return samples
    harmonics = [h for h in HARMONICS if h <= max(cycles, 1.0) and h * line_frequency_hz < rate_hz / 4]
    t = np.arange(samples.size) / rate_hz
    columns = [np.ones_like(t)]
    for harmonic in harmonics:
        turn = 2 * np.pi * harmonic * line_frequency_hz * t
        columns += [np.cos(turn), np.sin(turn)]
    design = np.array(columns).T
    weights = np.linalg.lstsq(design[:quiet], samples[:quiet], rcond=None)[0]
    return np.asarray(samples - design @ weights, dtype=np.float64)
