"""The onset of a front to a fraction of a sample, with an uncertainty that can be believed.

Around the front the samples are modelled as a base line with a slope, a front of some shape and rise time, and
a change of slope behind it, in noise whose colour was measured before the event. Level, slopes and height are
integrated out in closed form, and so is the size of the misfit (with the noise before the event as its prior),
which leaves the posterior of the onset on a grid for each shape and rise time; their sum is the answer (G. L.
Bretthorst, Bayesian Spectrum Analysis and Parameter Estimation, 1988, ch. 3; J. J. K. Ó Ruanaidh and W. J.
Fitzgerald, Numerical Bayesian Methods Applied to Signal Processing, 1996, ch. 5; both from memory). That the
true shape and rise time are not known is thereby part of the standard uncertainty.
"""

from dataclasses import dataclass

import numpy as np

from twlocate.arrays import FloatArray
from twlocate.arrivals.noise import Noise
from twlocate.arrivals.shapes import SHAPES

ONSETS = 49
RISES = 9
TOLERANCES = (0.1, 0.03, 0.01, 0.005)
"""While the grid is coarse, misfits below these shares of the signal are not held against a point."""

LIKENESS = 0.005
"""No real front is like any of the shapes to better than this share of the signal (common practice, no source)."""

SHORTEST_RISE = 0.5
"""Samples; a shorter rise looks the same."""

LARGEST_PRIOR_COUNT = 50.0
"""The noise before the event counts for no more samples than this against the misfit at the front."""


@dataclass(frozen=True)
class Front:
    """A fitted front, in samples of the window it was fitted to."""

    onset: float
    u: float
    height: float
    """With its sign."""
    rise: float
    shape: str
    window: tuple[int, int]
    """First and stop sample of the window."""
    fitted: FloatArray
    """(n,) the most probable model over the window."""


@dataclass(frozen=True)
class _Grid:
    """Onsets (T,) and the (shape, rise) pairs (K,) to try at each."""

    onsets: FloatArray
    shapes: tuple[str, ...]
    rises: FloatArray


def refine(samples: FloatArray, guess: float, reach: float, window: tuple[int, int], noise: Noise) -> Front:
    """Fit the front near sample `guess`.

    Parameters
    ----------
    samples : ndarray, shape (n,)
        Hum removed, not denoised: the noise must be what `noise` describes.
    guess : float
        Where the front is, sample.
    reach : float
        How far from there its onset may be and how long its rise at most, samples.
    window : (int, int)
        First and stop sample that may be used: beyond it are other fronts.
    noise : Noise
        Measured before the event.
    """
    first, stop = window
    y = samples[first:stop]
    onsets = np.linspace(guess - 1.5 * reach, guess + reach, ONSETS) - first
    rises = np.geomspace(SHORTEST_RISE, max(2 * reach, 2.0), RISES)
    grid = _every_pair(onsets, dict.fromkeys(SHAPES, rises))
    for tolerance in TOLERANCES:
        log_posterior = _log_posterior(y, grid, noise, tolerance)
        grid = _zoomed(grid, log_posterior, float(rises[-1]))
    log_posterior = _log_posterior(y, grid, noise, LIKENESS)
    weights = np.exp(log_posterior - log_posterior.max()) * _measure(grid)
    of_onset = weights.sum(axis=1) / weights.sum()
    onset = float(of_onset @ grid.onsets)
    u = float(np.sqrt(of_onset @ (grid.onsets - onset) ** 2))
    t, k = np.unravel_index(int(log_posterior.argmax()), log_posterior.shape)
    fitted, height = _best_fit(y, float(grid.onsets[t]), grid.shapes[k], float(grid.rises[k]), noise)
    return Front(onset + first, u, height, float(grid.rises[k]), grid.shapes[k], window, fitted)


def _every_pair(onsets: FloatArray, rises: dict[str, FloatArray]) -> _Grid:
    shapes = tuple(shape for shape, values in rises.items() for _ in values)
    return _Grid(onsets, shapes, np.concatenate(list(rises.values())))


def _log_posterior(y: FloatArray, grid: _Grid, noise: Noise, tolerance: float) -> FloatArray:
    """Return log p(onset, shape, rise | y) up to a constant, shape (T, K)."""
    t = np.arange(y.size, dtype=np.float64)
    base = np.linalg.qr(noise.whiten(np.array([np.ones_like(t), t])).T)[0].T
    data = _off(noise.whiten(y), base)
    since = t - grid.onsets[:, None]
    bend = _off(noise.whiten(np.maximum(since, 0.0)), base)
    bend_norm = np.maximum(np.einsum("tn,tn->t", bend, bend), 1e-12)
    on_bend = bend @ data / np.sqrt(bend_norm)
    front = _off(noise.whiten(_fronts(since, grid)), base)
    overlap = np.einsum("tkn,tn->tk", front, bend) / np.sqrt(bend_norm)[:, None]
    front_norm = np.maximum(np.einsum("tkn,tkn->tk", front, front) - overlap**2, 1e-9)
    on_front = (front @ data - overlap * on_bend[:, None]) / np.sqrt(front_norm)
    misfit = np.maximum(data @ data - on_bend[:, None] ** 2 - on_front**2, 0.0)
    prior_count = min(float(noise.count), LARGEST_PRIOR_COUNT)
    freedom = prior_count + data.size - 4
    log_volume = -0.5 * (np.log(front_norm) + np.log(bend_norm)[:, None])
    expected = prior_count * noise.sigma**2 + tolerance**2 * float(data @ data)
    return np.asarray(log_volume - 0.5 * freedom * np.log(expected + misfit))


def _fronts(since: FloatArray, grid: _Grid) -> FloatArray:
    """Return the front of every onset and pair, shape (T, K, n)."""
    fronts = np.empty((since.shape[0], len(grid.shapes), since.shape[1]))
    for shape in dict.fromkeys(grid.shapes):
        own = np.array([name == shape for name in grid.shapes])
        fronts[:, own] = SHAPES[shape](since[:, None, :] / grid.rises[own][:, None])
    return fronts


def _off(rows: FloatArray, base: FloatArray) -> FloatArray:
    """Take off what the orthonormal rows of `base` explain."""
    return np.asarray(rows - (rows @ base.T) @ base, dtype=np.float64)


def _measure(grid: _Grid) -> FloatArray:
    """Return the width each pair stands for in log rise (a shape is as likely as another), shape (K,)."""
    widths = np.empty(grid.rises.size)
    for shape in dict.fromkeys(grid.shapes):
        own = np.array([name == shape for name in grid.shapes])
        widths[own] = np.gradient(np.log(grid.rises[own]))
    return widths


def _zoomed(grid: _Grid, log_posterior: FloatArray, longest: float) -> _Grid:
    """Return a grid that covers what is left in play, with as many points: onsets for all, rises for each shape."""
    weights = np.exp(log_posterior - log_posterior.max()) * _measure(grid)
    of_onset = weights.sum(axis=1)
    low, high = _in_play(grid.onsets, of_onset)
    rises = {}
    for shape in dict.fromkeys(grid.shapes):
        own = np.array([name == shape for name in grid.shapes])
        of_rise = np.exp(log_posterior[:, own] - log_posterior[:, own].max()).sum(axis=0)
        least, most = _in_play(np.log(grid.rises[own]), of_rise)
        rises[shape] = np.exp(np.linspace(max(least, np.log(SHORTEST_RISE / 4)), min(most, np.log(longest)), RISES))
    return _every_pair(np.linspace(low, high, ONSETS), rises)


def _in_play(points: FloatArray, weights: FloatArray) -> tuple[float, float]:
    """Return the ends of where the weight is more than a thousandth of its largest, and a point more either side."""
    inside = np.flatnonzero(weights > 1e-4 * weights.max())
    step = points[1] - points[0]
    return float(points[inside[0]] - step), float(points[inside[-1]] + step)


def _best_fit(y: FloatArray, onset: float, shape: str, rise: float, noise: Noise) -> tuple[FloatArray, float]:
    """Return the model of one onset, shape and rise over the window, and its height."""
    since = np.arange(y.size) - onset
    front = SHAPES[shape](since / rise)
    columns = np.array([np.ones(y.size), np.arange(y.size), np.maximum(since, 0.0), front], dtype=np.float64)
    weights = np.linalg.lstsq(noise.whiten(columns).T, noise.whiten(y), rcond=None)[0]
    return np.asarray(weights @ columns, dtype=np.float64), float(weights[3])
