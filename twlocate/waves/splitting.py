"""Split what a terminal measures into the wave that leaves and the wave that arrives (d'Alembert)."""

import numpy as np
from numpy.typing import ArrayLike

from twlocate.arrays import FloatArray


def split(across: ArrayLike, through: ArrayLike, impedance: float) -> tuple[FloatArray, FloatArray]:
    """Split an across and a through variable into the outgoing and the incoming wave.

    Parameters
    ----------
    across : array_like, shape (n,)
        Voltage (V) or pressure (Pa).
    through : array_like, shape (n,)
        Current (A) or volumetric flow (m³/s), positive into the route.
    impedance : float
        Surge impedance (Ω) or ρa/A (Pa·s/m³) of the route at the terminal.

    Returns
    -------
    outgoing, incoming : ndarray, shape (n,)
        In the unit of `across`; their sum is `across`.

    References
    ----------
    L. V. Bewley, Traveling Waves on Transmission Systems, 1951, ch. 3 (from memory).
    """
    u = np.asarray(across, dtype=np.float64)
    z_i = impedance * np.asarray(through, dtype=np.float64)
    return (u + z_i) / 2, (u - z_i) / 2


def join(outgoing: ArrayLike, incoming: ArrayLike, impedance: float) -> tuple[FloatArray, FloatArray]:
    """Return the across and through variables of two waves; the inverse of :func:`split`."""
    f = np.asarray(outgoing, dtype=np.float64)
    b = np.asarray(incoming, dtype=np.float64)
    return f + b, (f - b) / impedance
