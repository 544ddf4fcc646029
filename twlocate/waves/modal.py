"""Modes of a three-phase line that is balanced (transposed, or close to it).

The amplitude-invariant Clarke transform takes phases a, b, c to one ground mode (slow, dispersive) and two
aerial modes (close to the speed of light, little dispersion). With each phase in turn as the reference it
gives six aerial combinations, of which any fault excites at least one strongly.
"""

import numpy as np
from numpy.typing import ArrayLike

from twlocate.arrays import FloatArray

CLARKE: FloatArray = np.array(
    [
        [1 / 3, 1 / 3, 1 / 3],
        [2 / 3, -1 / 3, -1 / 3],
        [0.0, 1 / np.sqrt(3), -1 / np.sqrt(3)],
    ]
)
"""Rows: ground (0), alpha, beta; columns: phases a, b, c (E. Clarke, Circuit Analysis of A-C Power Systems, 1943)."""

KARRENBAUER: FloatArray = np.array([[1 / 3, 1 / 3, 1 / 3], [1 / 3, -1 / 3, 0.0], [1 / 3, 0.0, -1 / 3]])
"""Rows: ground, a against b, a against c (H. Karrenbauer, dissertation, TU München, 1967, from memory)."""

AERIAL_MODES: dict[str, tuple[float, float, float]] = {
    f"{mode} ({'abc'[turn]})": (float(row[0]), float(row[1]), float(row[2]))
    for turn in range(3)
    for mode, row in (("alpha", np.roll(CLARKE[1], turn)), ("beta", np.roll(CLARKE[2], turn)))
}
"""The six aerial combinations by name, as weights of phases a, b, c; the reference phase is in brackets."""


def aerial_mode(phases: ArrayLike, mode: str) -> FloatArray:
    """Return one aerial combination of three phase signals.

    Parameters
    ----------
    phases : array_like, shape (3, n)
        Phases a, b, c.
    mode : str
        A key of :data:`AERIAL_MODES`.
    """
    return np.asarray(AERIAL_MODES[mode]) @ np.asarray(phases, dtype=np.float64)


def ground_mode(phases: ArrayLike) -> FloatArray:
    """Return the ground mode (a + b + c)/3 of three phase signals, shape (3, n) → (n,)."""
    return np.asarray(CLARKE[0] @ np.asarray(phases, dtype=np.float64), dtype=np.float64)
