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
    quiet = max(int(QUIET_SHARE * phases.shape[1]), 4 * SCALES[-1])
    heights = {
        mode: modulus(np.asarray(weights) @ phases, SCALES, quiet, 0.0).largest
        for mode, weights in AERIAL_MODES.items()
    }
    above = np.flatnonzero(np.max(list(heights.values()), axis=0) > false_alarm_sigmas)
    start = int(above[0]) if above.size else 0
    stop = start + FRONT_SAMPLES if above.size else phases.shape[1]
    return max(heights, key=lambda mode: float(heights[mode][start:stop].max()))
