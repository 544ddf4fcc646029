"""What happens: sources in the Laplace domain, faults, and the steady state before them."""

from collections.abc import Mapping

import numpy as np
from numpy.typing import ArrayLike

from twlocate.arrays import ComplexArray, FloatArray
from twlocate.simulation.network import Network, solve

FAULTS: Mapping[str, tuple[tuple[int, int | None], ...]] = {
    "ag": ((0, None),),
    "bg": ((1, None),),
    "cg": ((2, None),),
    "ab": ((0, 1),),
    "bc": ((1, 2),),
    "ca": ((2, 0),),
    "abg": ((0, None), (1, None)),
    "bcg": ((1, None), (2, None)),
    "cag": ((2, None), (0, None)),
    "abc": ((0, 1), (1, 2), (2, 0)),
    "abcg": ((0, None), (1, None), (2, None)),
}
"""Kind of fault to its bridges: from a phase to another, or to ground (None)."""


def step(s: ComplexArray, onset_s: float = 0.0) -> ComplexArray:
    """Return the transform of a unit step at `onset_s`."""
    transform: ComplexArray = np.exp(-s * onset_s) / s
    return transform


def ramp(s: ComplexArray, duration_s: float, onset_s: float = 0.0) -> ComplexArray:
    """Return the transform of a rise from 0 to 1 that starts at `onset_s` and takes `duration_s`."""
    transform: ComplexArray = np.exp(-s * onset_s) * (1 - np.exp(-s * duration_s)) / (duration_s * s**2)
    return transform


def sinusoid(s: ComplexArray, phasors: ArrayLike, omega: float, onset_s: float = 0.0) -> ComplexArray:
    """Return the transform of Re(P·e^{jωt}) from `onset_s` on, shape (frequencies, n), for phasors of shape (n,)."""
    p = np.asarray(phasors, dtype=np.complex128) * np.exp(1j * omega * onset_s)
    column = s[:, None]
    transform: ComplexArray = (
        np.exp(-column * onset_s) * (p / (column - 1j * omega) + p.conj() / (column + 1j * omega)) / 2
    )
    return transform


def fault_admittance(kind: str, resistance: float) -> FloatArray:
    """Return the admittance that a fault puts on a three-phase node, S, shape (3, 3); each bridge has `resistance` Ω.

    Raises
    ------
    ValueError
        The kind is not a key of :data:`FAULTS`, or the resistance is not positive.
    """
    if kind not in FAULTS:
        raise ValueError(f"fault {kind!r} is unknown; choose one of {', '.join(FAULTS)}")
    if resistance <= 0:
        raise ValueError(f"fault resistance {resistance:g} ohm is not positive; a solid fault has some 0.01 ohm")
    total = np.zeros((3, 3))
    for phase, other in FAULTS[kind]:
        bridge = np.zeros(3)
        bridge[phase] = 1.0
        if other is not None:
            bridge[other] = -1.0
        total += np.outer(bridge, bridge) / resistance
    return total


def steady_state(network: Network, omega: float, injected: Mapping[str, ArrayLike]) -> dict[str, ComplexArray]:
    """Return the phasors (peak values) of every node's across value before the event, shape (n,).

    Parameters
    ----------
    network : Network
        Without the fault.
    omega : float
        Of the sources, rad/s.
    injected : mapping
        Phasor of the through value put into a node, shape (n,): source voltage times own admittance.
    """
    s = np.array([1j * omega])
    phasors = {name: np.asarray(value, dtype=np.complex128)[None, :] for name, value in injected.items()}
    return {name: across[0] for name, across in solve(network, s, phasors).items()}
