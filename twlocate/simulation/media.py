"""What a section is to the simulator: γ(s) and Z(s) of its modes."""

from collections.abc import Callable
from dataclasses import dataclass, field

import numpy as np

from twlocate.arrays import ComplexArray, FloatArray
from twlocate.media import liquid, overhead
from twlocate.media.overhead import Conductor
from twlocate.waves import CLARKE


@dataclass(frozen=True)
class Medium:
    """Waves of a section; one mode a conductor."""

    modes: Callable[[ComplexArray], tuple[ComplexArray, ComplexArray]]
    """s, shape (frequencies,) → γ (1/m) and Z (Ω or Pa·s/m³) of each mode, shape (frequencies, n)."""
    transform: FloatArray = field(default_factory=lambda: np.eye(1))
    """Conductors from modes, shape (n, n), for across and through alike: a balanced section."""


def uniform_line(resistance: float, inductance: float, capacitance: float, conductance: float = 0.0) -> Medium:
    """Return a line of one conductor with constant Ω/m, H/m, F/m and S/m."""

    def modes(s: ComplexArray) -> tuple[ComplexArray, ComplexArray]:
        z, y = resistance + s * inductance, conductance + s * capacitance
        return np.sqrt(z * y)[:, None], np.sqrt(z / y)[:, None]

    return Medium(modes)


def constant_line(speeds: FloatArray, impedances: FloatArray, loss_rate: float = 0.0) -> Medium:
    """Return a section of one mode, or of three phases with (ground, aerial, aerial) modes.

    Parameters
    ----------
    speeds, impedances : ndarray, shape (n,)
        m/s, and Ω or Pa·s/m³, of each mode without loss; n is 1 or 3.
    loss_rate : float
        R/L of a line, or f·|v|/D of a pipe, 1/s: γ = (s/v)·√(1 + r/s), and Z rises by the same root.
    """
    transform = np.eye(1) if len(speeds) == 1 else np.asarray(np.linalg.inv(CLARKE), dtype=np.float64)

    def modes(s: ComplexArray) -> tuple[ComplexArray, ComplexArray]:
        root: ComplexArray = np.sqrt(1 + loss_rate / s)[:, None]
        gamma, z = s[:, None] * root / speeds, root * impedances
        return gamma, z

    return Medium(modes, transform)


def pipe(density: float, speed: float, bore: float, *, resistance: float = 0.0, viscosity: float = 0.0) -> Medium:
    """Return a pipe of liquid.

    Parameters
    ----------
    density, speed, bore : float
        kg/m³, wave speed in m/s, inner diameter in m.
    resistance : float
        Loss rate of a turbulent flow, 1/s (:func:`twlocate.media.liquid.turbulent_resistance`).
    viscosity : float
        Kinematic, m²/s: laminar flow with unsteady wall shear; 0 leaves it out.

    Raises
    ------
    ValueError
        Both a turbulent and a laminar friction are given.
    """
    if resistance and viscosity:
        raise ValueError("give either a loss rate (turbulent flow) or a viscosity (laminar flow), not both")
    lossless = liquid.impedance(density, speed, bore)

    def modes(s: ComplexArray) -> tuple[ComplexArray, ComplexArray]:
        propagation = (
            liquid.laminar_gamma(s, speed, bore, viscosity) if viscosity else liquid.gamma(s, speed, resistance)
        )
        return propagation[:, None], (lossless * propagation * speed / s)[:, None]

    return Medium(modes)


def balanced_line(conductors: tuple[Conductor, ...], earth_resistivity: float) -> Medium:
    """Return a transposed three-phase line; ground wires follow the three phases in `conductors`.

    γ and Z follow the frequency; the modes are Clarke's at every frequency, which transposition makes exact.

    Raises
    ------
    ValueError
        Fewer than three conductors.
    """
    if len(conductors) < 3:
        raise ValueError(f"{len(conductors)} conductors; a three-phase line has at least 3")

    def modes(s: ComplexArray) -> tuple[ComplexArray, ComplexArray]:
        z, y = overhead.phase_matrices(conductors, s, earth_resistivity, 3)
        own_z, mutual_z = _means(z)
        own_y, mutual_y = _means(y)
        z_modes = np.stack([own_z + 2 * mutual_z, *2 * [own_z - mutual_z]], axis=1)
        y_modes = np.stack([own_y + 2 * mutual_y, *2 * [own_y - mutual_y]], axis=1)
        return np.sqrt(z_modes * y_modes), np.sqrt(z_modes / y_modes)

    return Medium(modes, np.asarray(np.linalg.inv(CLARKE), dtype=np.float64))


def _means(matrix: ComplexArray) -> tuple[ComplexArray, ComplexArray]:
    """Mean of the diagonal and mean of the rest, for each frequency."""
    diagonal = np.trace(matrix, axis1=1, axis2=2)
    return diagonal / 3, (matrix.sum(axis=(1, 2)) - diagonal) / 6
