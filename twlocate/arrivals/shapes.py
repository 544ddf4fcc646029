"""Shapes of a front that rises from 0 at u = 0; u is the time since the onset over the rise time.

The rise time is what a crew would read off a plot: from the onset to the top, or to 90 % where the top is
reached only in the limit.
"""

from collections.abc import Callable

import numpy as np

from twlocate.arrays import FloatArray


def _step(u: FloatArray) -> FloatArray:
    return np.asarray(u >= 0.0, dtype=np.float64)


def _ramp(u: FloatArray) -> FloatArray:
    return np.clip(u, 0.0, 1.0)


def _smooth(u: FloatArray) -> FloatArray:
    """A raised cosine: what a smooth pulse edge or a linear-phase filter makes of a step."""
    return 0.5 - 0.5 * np.cos(np.pi * np.clip(u, 0.0, 1.0))


def _exponential(u: FloatArray) -> FloatArray:
    """A first-order lag; 90 % at u = 1."""
    return np.asarray(-np.expm1(-np.log(10.0) * np.maximum(u, 0.0)), dtype=np.float64)


def _cascade(u: FloatArray) -> FloatArray:
    """Four equal lags in a row, as of an anti-alias filter; 90 % at u = 1."""
    v = 6.680783 * np.maximum(u, 0.0)
    return np.asarray(1.0 - np.exp(-v) * (1.0 + v * (1.0 + v * (0.5 + v / 6.0))), dtype=np.float64)


def _diffusion(u: FloatArray) -> FloatArray:
    """erfc(a/√u): a step after skin effect; 90 % at u = 1 (a = 0.0889)."""
    out = np.zeros_like(u)
    after = u > 0
    out[after] = _erfc(0.088856 / np.sqrt(u[after]))
    return out


def _erfc(z: FloatArray) -> FloatArray:
    """Complementary error function for z ≥ 0, to 1.5e-7 (Abramowitz and Stegun 1964, 7.1.26)."""
    t = 1.0 / (1.0 + 0.3275911 * z)
    series = t * (0.254829592 + t * (-0.284496736 + t * (1.421413741 + t * (-1.453152027 + t * 1.061405429))))
    return np.asarray(series * np.exp(-z * z), dtype=np.float64)


SHAPES: dict[str, Callable[[FloatArray], FloatArray]] = {
    "step": _step,
    "ramp": _ramp,
    "smooth": _smooth,
    "exponential": _exponential,
    "cascade": _cascade,
    "diffusion": _diffusion,
}
"""Front shapes by name; a step is a ramp of no more than a sample."""
