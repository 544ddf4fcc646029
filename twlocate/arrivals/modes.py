"""Which aerial mode shows the event best."""

import numpy as np

from twlocate.arrays import FloatArray
from twlocate.arrivals.modulus import dyadic_scales, modulus
from twlocate.waves import AERIAL_MODES

SCALES = dyadic_scales(2, 16)
QUIET_SHARE = 0.1
FRONT_SAMPLES = 32
"""The first front of every mode is looked for over this many samples behind the earliest one."""


def strongest_mode(phases: FloatArray, *, false_alarm_sigmas: float = 8.0) -> str:
    """Return the key of :data:`~twlocate.waves.AERIAL_MODES` whose first front stands highest above its noise.

    Parameters
    ----------
    phases : ndarray, shape (3, n)
        Phases a, b, c.
    false_alarm_sigmas : float
        From this height on a modulus is taken for the event.
    """
    modes = {mode: np.asarray(weights) @ phases for mode, weights in AERIAL_MODES.items()}
    quiet = max(int(QUIET_SHARE * phases.shape[1]), 4 * SCALES[-1])
    start = _first_above(_heights(modes, quiet), false_alarm_sigmas)
    heights = _heights(modes, max(start - SCALES[-1], quiet))
    return max(heights, key=lambda mode: float(heights[mode][start : start + FRONT_SAMPLES].max()))


def _heights(modes: dict[str, FloatArray], quiet: int) -> dict[str, FloatArray]:
    return {mode: modulus(samples, SCALES, quiet, 0.0).largest for mode, samples in modes.items()}


def _first_above(heights: dict[str, FloatArray], sigmas: float) -> int:
    """Return the first sample at which any mode stands above `sigmas`, or where the highest does at all."""
    highest = np.max(list(heights.values()), axis=0)
    above = np.flatnonzero(highest > sigmas)
    return int(above[0]) if above.size else int(highest.argmax())
