"""Modes of a line that is not balanced: eigenvectors of Z·Y, followed over frequency."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from twlocate.arrays import ComplexArray


@dataclass(frozen=True)
class Modes:
    """Voltage modes at each frequency: V = T·V_modal, and a wave of mode k goes as exp(−γₖ·x)."""

    gamma: ComplexArray
    """shape (frequencies, n), 1/m, real part not negative."""
    transform: ComplexArray
    """T, shape (frequencies, n, n), columns of unit length."""


def eigenmodes(z: ArrayLike, y: ArrayLike) -> Modes:
    """Return the voltage modes of a line at each frequency, in one order throughout.

    Parameters
    ----------
    z, y : array_like, shape (frequencies, n, n)
        Series impedance (Ω/m) and shunt admittance (S/m), frequencies ascending.

    Notes
    -----
    γ² are the eigenvalues of Z·Y (L. M. Wedepohl, Application of matrix methods to the solution of
    travelling-wave phenomena in polyphase systems, Proc. IEE 110, 1963, from memory). Eigenvalues cross as
    frequency rises, so each mode is carried on to the eigenvector most nearly parallel to its last one.
    """
    squared, vectors = np.linalg.eig(np.asarray(z, dtype=np.complex128) @ np.asarray(y, dtype=np.complex128))
    for step in range(1, len(vectors)):
        order = _most_parallel(vectors[step - 1], vectors[step])
        squared[step], vectors[step] = squared[step, order], vectors[step][:, order]
    gamma = np.sqrt(squared)
    return Modes(np.where(gamma.real < 0, -gamma, gamma), vectors)


def _most_parallel(before: ComplexArray, after: ComplexArray) -> list[int]:
    """For each column of `before`, the column of `after` that continues it; each is used once, best pairs first."""
    likeness = np.abs(before.conj().T @ after)
    order = [0] * len(likeness)
    for _ in order:
        row, column = np.unravel_index(np.argmax(likeness), likeness.shape)
        order[int(row)] = int(column)
        likeness[row, :] = likeness[:, column] = -1.0
    return order
