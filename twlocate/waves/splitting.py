"""Split what a terminal measures into the wave that leaves and the wave that arrives (d'Alembert)."""

from collections.abc import Callable

import numpy as np
from numpy.typing import ArrayLike

from twlocate.arrays import ComplexArray, FloatArray


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


def split_dispersive(
    across: ArrayLike,
    through: ArrayLike,
    rate_hz: float,
    impedance: Callable[[ComplexArray], ComplexArray],
) -> tuple[FloatArray, FloatArray]:
    """Split as :func:`split` does, with an impedance that depends on frequency.

    Parameters
    ----------
    across, through : array_like, shape (n,)
        Departures from the state of rest.
    rate_hz : float
        Sampling rate.
    impedance : callable
        Takes s = j·2πf, shape (frequencies,), first entry 0 replaced by half of the next, to Z(s).

    Notes
    -----
    The record is padded to twice its length, so that the response of Z(s) does not wrap around.
    """
    u, i = np.asarray(across, dtype=np.float64), np.asarray(through, dtype=np.float64)
    n = u.size
    s = np.asarray(2j * np.pi * np.fft.rfftfreq(2 * n, 1 / rate_hz), dtype=np.complex128)
    s[0] = s[1] / 2  # a lossy line has no Z at zero frequency; the padded record has next to nothing there
    z_i = np.fft.irfft(impedance(s) * np.fft.rfft(i, 2 * n), 2 * n)[:n]
    return (u + z_i) / 2, (u - z_i) / 2
