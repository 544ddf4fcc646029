"""What happens to waves where branches meet."""

import numpy as np
from numpy.typing import ArrayLike

from twlocate.arrays import ComplexArray


def reflection(impedance: ArrayLike, load: ArrayLike) -> ComplexArray:
    """Return the reflection factor of the across variable, (load − Z)/(load + Z), where a route ends in `load`.

    Both are Ω (or Pa·s/m³), real or complex, and broadcast; the through variable reflects with the opposite sign
    and the transmitted across wave is 1 + reflection (L. V. Bewley, Traveling Waves on Transmission Systems, 1951,
    from memory). A `load` of infinity is an open or closed end.
    """
    z, load = np.asarray(impedance, dtype=np.complex128), np.asarray(load, dtype=np.complex128)
    open_end = np.isinf(load)
    finite = np.where(open_end, 0.0, load)
    return np.where(open_end, 1.0 + 0.0j, (finite - z) / (finite + z))


def scattering(impedances: ArrayLike, shunt: ArrayLike = 0.0) -> ComplexArray:
    """Return how a node of n branches hands waves on.

    Parameters
    ----------
    impedances : array_like, shape (n, ...)
        Wave impedance of each branch, Ω or Pa·s/m³; further axes are frequencies.
    shunt : array_like, shape (...)
        Admittance from the node to the reference (a fault, a leak, a capacitor), 1/Ω.

    Returns
    -------
    ndarray, shape (n, n, ...)
        Entry (i, j): the across wave sent into branch i by a unit across wave that arrives on branch j,
        2·Yⱼ/(ΣY + shunt) − δᵢⱼ. All branches share the node's across value, and the through variables add to
        what the shunt draws.

    Raises
    ------
    ValueError
        A branch impedance is zero.
    """
    z = np.asarray(impedances, dtype=np.complex128)
    if (z == 0).any():
        raise ValueError("a branch has the wave impedance 0; leave a short circuit to the shunt admittance")
    y = 1 / z
    to_node: ComplexArray = 2 * y / (y.sum(axis=0) + np.asarray(shunt))
    identity = np.eye(len(z)).reshape(len(z), len(z), *[1] * (z.ndim - 1))
    waves: ComplexArray = to_node[None, ...] - identity
    return waves
