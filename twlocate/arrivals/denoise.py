"""Translation-invariant wavelet shrinkage: less noise, and no front moved."""

import numpy as np
import pywt

from twlocate.arrays import FloatArray
from twlocate.arrivals.modulus import robust_sigma

WAVELET = "sym4"
DEEPEST = 7
"""Levels; coarser detail holds the event and the drift, not the noise."""


def shrink(samples: FloatArray, quiet: int) -> FloatArray:
    """Shrink the wavelet detail that the noise before the event explains.

    Soft thresholds σ·√(2 ln n), with σ measured at each level on the first `quiet` samples (D. L. Donoho and I. M.
    Johnstone, Ideal spatial adaptation by wavelet shrinkage, Biometrika 81, 1994), in the stationary transform, which
    is the average over all shifts (R. R. Coifman and D. L. Donoho, Translation-invariant de-noising, 1995).

    Parameters
    ----------
    samples : ndarray, shape (n,)
        Hum removed.
    quiet : int
        Samples before the event.

    Returns
    -------
    ndarray, shape (n,)
    """
    n = samples.size
    level = min(DEEPEST, max(int(np.log2(max(quiet, 2))) - 4, 1))
    block = 2**level
    extended = np.pad(samples, (block, block + -n % block), mode="symmetric")
    bands = pywt.swt(extended, WAVELET, level=level, trim_approx=True, norm=True)
    reach = np.sqrt(2 * np.log(n))
    details = [_soft(band, reach * robust_sigma(band[block : block + quiet])) for band in bands[1:]]
    return np.asarray(pywt.iswt([bands[0], *details], WAVELET, norm=True)[block : block + n], dtype=np.float64)


def _soft(band: FloatArray, threshold: float) -> FloatArray:
    """Move every coefficient towards zero by the threshold (pywt.threshold gives NaN at 0 for threshold 0)."""
    return np.sign(band) * np.maximum(np.abs(band) - threshold, 0.0)
