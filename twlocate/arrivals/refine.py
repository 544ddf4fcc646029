"""The onset of a front to a fraction of a sample, with an uncertainty that can be believed.

Around the front the samples are modelled as a base line with a slope, a front of some shape and rise time, and
a change of slope behind it, in noise whose colour was measured before the event. Level, slopes and height are
integrated out in closed form, and so is the size of the misfit (with the noise before the event as its prior),
which leaves the posterior of the onset on a grid for each shape and rise time; their sum is the answer (G. L.
Bretthorst, Bayesian Spectrum Analysis and Parameter Estimation, 1988, ch. 3; J. J. K. Ó Ruanaidh and W. J.
Fitzgerald, Numerical Bayesian Methods Applied to Signal Processing, 1996, ch. 5; both from memory). That the
true shape and rise time are not known is thereby part of the standard uncertainty.
"""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from twlocate.arrays import FloatArray
from twlocate.arrivals.noise import Noise
from twlocate.arrivals.shapes import SHAPES

ONSETS = 41
RISES = 9
SHORTEST_RISE = 0.25
"""Samples; a shorter rise looks the same."""

IN_PLAY = (8.0, 2.0, 0.5, 0.1, 0.0, 0.0, 0.0, 0.0)
"""While a grid closes in, points with a misfit above the least by up to these shares stay in play."""

LEAST_IN_PLAY = 12.0
"""Points with a log posterior this close to the largest stay in play in any case."""

RESOLVED = 0.3
"""A grid on which this share of the onsets is in play resolves the posterior."""

LOG_RISE_SPAN = 4.0
"""Width of the prior of the log rise, which a step, having no rise, does not have to share its chance over."""

FILTER_U = 0.1
"""Samples; standard deviation of the onset that an anti-alias filter of none of the shapes leaves in the best fit,
measured on fronts behind a four-pole Bessel filter at a third of the sampling rate."""

HEIGHTS = 3.0
"""Standard deviation of the prior of the height, in units of the modulus there."""

LIKENESS = 0.005
"""No real front is like any of the shapes to better than this share of the signal (common practice, no source)."""

LARGEST_PRIOR_COUNT = 50.0
"""The noise before the event counts for no more samples than this against the misfit at the front."""

Shape = Callable[[FloatArray], FloatArray]


@dataclass(frozen=True)
class Front:
    """A fitted front, in samples of the record."""

    onset: float
    u: float
    rise: float
    shape: str
    window: tuple[int, int]
    """First and stop sample of the window it was fitted in."""
    fitted: FloatArray
    """(n,) the most probable model over the window."""


@dataclass(frozen=True)
class _Window:
    """The whitened samples around a front with the base line taken off."""

    samples: FloatArray
    data: FloatArray
    base: FloatArray
    """(2, n) orthonormal rows: level and slope."""
    height: float
    noise: Noise


@dataclass(frozen=True)
class _Posterior:
    """Log posterior of one shape on a grid of onsets (T,) and log rises (K,), shape (T, K)."""

    onsets: FloatArray
    log_rises: FloatArray
    log_density: FloatArray

    @property
    def highest(self) -> float:
        """The largest log density."""
        return float(self.log_density.max())

    @property
    def cell(self) -> float:
        """Size of a grid cell."""
        width = self.log_rises[1] - self.log_rises[0] if self.log_rises.size > 1 else 1.0
        return float((self.onsets[1] - self.onsets[0]) * width)


def refine(
    samples: FloatArray, guess: float, reach: float, height: float, window: tuple[int, int], noise: Noise
) -> Front:
    """Fit the front near sample `guess`.

    Parameters
    ----------
    samples : ndarray, shape (n,)
        Hum removed, not denoised: the noise must be what `noise` describes.
    guess : float
        Where the front is, sample.
    reach : float
        How far from there its onset may be, samples; the rise may be twice as long.
    height : float
        About the height of the front; fits of many times that, which level and slope all but cancel, are no fronts.
    window : (int, int)
        First and stop sample that may be used: beyond it are other fronts.
    noise : Noise
        Measured before the event.
    """
    first, stop = window
    view = _window(samples[first:stop], height, noise)
    onsets = np.linspace(guess - 1.5 * reach, guess + reach, ONSETS) - first
    log_rises = np.log(np.geomspace(SHORTEST_RISE, max(2 * reach, 2.0), RISES))
    posteriors = _closed_in(view, onsets, log_rises)
    onset, u = _moments(list(posteriors.values()))
    best = max(posteriors, key=lambda name: posteriors[name].highest)
    peak = posteriors[best]
    t, k = np.unravel_index(int(peak.log_density.argmax()), peak.log_density.shape)
    rise = float(np.exp(peak.log_rises[k]))
    fitted = _best_fit(view, float(peak.onsets[t]), SHAPES[best], rise)
    u = float(np.hypot(u, FILTER_U))
    return Front(first + onset, u, rise, best, window, fitted)


def _window(samples: FloatArray, height: float, noise: Noise) -> _Window:
    level_and_slope = np.array([np.ones(samples.size), np.arange(samples.size)], dtype=np.float64)
    base = np.asarray(np.linalg.qr(noise.whiten(level_and_slope).T)[0].T, dtype=np.float64)
    return _Window(samples, _off(noise.whiten(samples), base), base, height, noise)


def _off(rows: FloatArray, base: FloatArray) -> FloatArray:
    """Take off what the orthonormal rows of `base` explain."""
    return np.asarray(rows - (rows @ base.T) @ base, dtype=np.float64)


def _closed_in(view: _Window, onsets: FloatArray, log_rises: FloatArray) -> dict[str, _Posterior]:
    """Evaluate each shape on ever smaller grids around what its misfit leaves in play.

    A shape that falls behind the best once the grids have closed in is left out.
    """
    posteriors = {
        name: _posterior(view, shape, onsets, log_rises if name != "step" else np.zeros(1))
        for name, shape in SHAPES.items()
    }
    for share in IN_PLAY:
        drop = LEAST_IN_PLAY + 0.5 * view.data.size * np.log1p(share)
        top = max(posterior.highest for posterior in posteriors.values())
        posteriors = {
            name: _narrowed(view, SHAPES[name], posterior, drop)
            for name, posterior in posteriors.items()
            if share > 0 or posterior.highest > top - drop
        }
    return posteriors


def _narrowed(view: _Window, shape: Shape, posterior: _Posterior, drop: float) -> _Posterior:
    """Evaluate a shape on a grid around its points within `drop` of its best, unless the present one resolves them."""
    kept = np.asarray(posterior.log_density > posterior.highest - drop)
    if drop == LEAST_IN_PLAY and kept.any(axis=1).mean() > RESOLVED:
        return posterior
    onsets = _around(posterior.onsets, np.asarray(kept.any(axis=1)), ONSETS)
    log_rises = _around(posterior.log_rises, np.asarray(kept.any(axis=0)), RISES)
    low, high = np.maximum(log_rises[[0, -1]], np.log(SHORTEST_RISE))
    return _posterior(view, shape, onsets, np.linspace(low, high + 1e-9, log_rises.size))


def _around(points: FloatArray, kept: NDArray[np.bool_], count: int) -> FloatArray:
    """Return `count` even points from one before the first kept point to one behind the last."""
    if points.size == 1:
        return points
    inside = np.flatnonzero(kept)
    step = points[1] - points[0]
    return np.linspace(points[inside[0]] - step, points[inside[-1]] + step, count)


def _posterior(view: _Window, shape: Shape, onsets: FloatArray, log_rises: FloatArray) -> _Posterior:
    """Integrate level, slopes, height and the size of the misfit out at every onset and rise."""
    since = np.arange(view.samples.size) - onsets[:, None]
    bend = _off(view.noise.whiten(np.maximum(since, 0.0)), view.base)
    bend_norm = np.sqrt(np.maximum(np.einsum("tn,tn->t", bend, bend), 1e-12))
    bend = bend / bend_norm[:, None]
    front = _off(view.noise.whiten(shape(since[:, None, :] / np.exp(log_rises)[:, None])), view.base)
    overlap = np.einsum("tkn,tn->tk", front, bend)
    front_norm = np.sqrt(np.maximum(np.einsum("tkn,tkn->tk", front, front) - overlap**2, 1e-9))
    on_bend = bend @ view.data
    on_front = (front @ view.data - overlap * on_bend[:, None]) / front_norm
    energy = float(view.data @ view.data)
    misfit = np.maximum(energy - on_bend[:, None] ** 2 - on_front**2, 0.0)
    prior_count = min(float(view.noise.count), LARGEST_PRIOR_COUNT)
    expected = prior_count * view.noise.sigma**2 + LIKENESS**2 * energy
    freedom = prior_count + view.data.size - 4
    log_density = -np.log(front_norm) - np.log(bend_norm)[:, None] - 0.5 * freedom * np.log(expected + misfit)
    log_density -= 0.5 * (on_front / front_norm / (HEIGHTS * view.height)) ** 2
    return _Posterior(onsets, log_rises, np.asarray(log_density, dtype=np.float64))


def _moments(posteriors: list[_Posterior]) -> tuple[float, float]:
    """Return mean and standard deviation of the onset over all shapes, each as likely beforehand."""
    top = max(p.highest for p in posteriors)
    onsets = np.concatenate([p.onsets for p in posteriors])
    spans = [1.0 if p.log_rises.size == 1 else 1.0 / LOG_RISE_SPAN for p in posteriors]
    weights = np.concatenate(
        [span * p.cell * np.exp(p.log_density - top).sum(axis=1) for p, span in zip(posteriors, spans, strict=True)]
    )
    mean = float(weights @ onsets / weights.sum())
    return mean, float(np.sqrt(weights @ (onsets - mean) ** 2 / weights.sum()))


def _best_fit(view: _Window, onset: float, shape: Shape, rise: float) -> FloatArray:
    """Return the model of one onset and rise over the window."""
    since = np.arange(view.samples.size) - onset
    columns = np.array(
        [
            np.ones(since.size),
            np.arange(since.size),
            np.maximum(since, 0.0),
            shape(np.asarray(since / rise, dtype=np.float64)),
        ],
        dtype=np.float64,
    )
    weights = np.linalg.lstsq(view.noise.whiten(columns).T, view.noise.whiten(view.samples), rcond=None)[0]
    return np.asarray(weights @ columns, dtype=np.float64)
