"""Overhead lines: series impedance and shunt admittance from the conductors' places, and the waves they carry."""

from collections.abc import Callable, Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from twlocate.arrays import ComplexArray, FloatArray
from twlocate.waves import Modes, eigenmodes

MU_0 = 4e-7 * np.pi
"""H/m; within 1e-9 of the CODATA value."""
EPSILON_0 = 8.8541878128e-12
"""F/m (CODATA 2018)."""


@dataclass(frozen=True)
class Conductor:
    """One conductor, or a bundle that stands for one; phases come first, ground wires last in a line."""

    x_m: float
    height_m: float
    """At the tower."""
    radius_m: float
    resistance: float
    """Ω/m at direct current."""
    sag_m: float = 0.0
    gmr_m: float | None = None
    """Geometric mean radius: given, resistance and inside inductance are constant; None: skin effect."""
    bundle: int = 1
    bundle_spacing_m: float = 0.0
    """Between neighbours."""

    @property
    def mean_height_m(self) -> float:
        """Height less two thirds of the sag (a parabola's mean)."""
        return self.height_m - 2 * self.sag_m / 3

    def bundled(self, radius_m: float) -> float:
        """Return the radius of one conductor that replaces the bundle, (n·r·R^(n−1))^(1/n)."""
        if self.bundle == 1:
            return radius_m
        circle = self.bundle_spacing_m / (2 * np.sin(np.pi / self.bundle))
        return float((self.bundle * radius_m * circle ** (self.bundle - 1)) ** (1 / self.bundle))


def conductor_length(span_m: float, sag_m: float) -> float:
    """Return the length of a parabola of given span and sag, m: span·(1 + 8/3·(sag/span)²), to the second order.

    Equal end heights (the next term, −32/5·(sag/span)⁴, is below 5e-6 of the span for sags up to 3 % of it).
    """
    return span_m * (1 + 8 / 3 * (sag_m / span_m) ** 2)


def series_impedance(
    conductors: tuple[Conductor, ...], s: ComplexArray, earth_resistivity: float, *, earth: str = "complex depth"
) -> ComplexArray:
    """Return Z(s) of all conductors, Ω/m, shape (frequencies, n, n).

    Parameters
    ----------
    conductors : tuple of Conductor
        n of them.
    s : ndarray, shape (frequencies,)
        Laplace variable, 1/s.
    earth_resistivity : float
        Ω·m.
    earth : str
        A key of :data:`EARTHS`: ``"complex depth"`` (any frequency) or ``"carson"`` (first terms: power frequency).

    Raises
    ------
    ValueError
        Unknown earth, or a conductor whose mean height is not above the ground.
    """
    if earth not in EARTHS:
        raise ValueError(f"earth {earth!r} is unknown; choose one of {', '.join(EARTHS)}")
    z = EARTHS[earth](conductors, s, earth_resistivity)
    internal = np.stack([_internal(conductor, s) for conductor in conductors], axis=-1)
    total: ComplexArray = z + internal[:, :, None] * np.eye(len(conductors))
    return total


def shunt_admittance(conductors: tuple[Conductor, ...], s: ComplexArray) -> ComplexArray:
    """Return Y(s) = s·2πε₀·P⁻¹ of all conductors over a perfect image plane, S/m, shape (frequencies, n, n)."""
    direct, image = _distances(conductors, 0.0)
    capacitance = 2 * np.pi * EPSILON_0 * np.linalg.inv(np.log(image / direct).real)
    y: ComplexArray = s[:, None, None] * capacitance
    return y


def without_ground_wires(z: ComplexArray, y: ComplexArray, phases: int) -> tuple[ComplexArray, ComplexArray]:
    """Take out the conductors from `phases` on, held at zero volts throughout: Kron's reduction of Z, part of Y."""
    a, b, c, d = z[:, :phases, :phases], z[:, :phases, phases:], z[:, phases:, :phases], z[:, phases:, phases:]
    return a - b @ np.linalg.solve(d, c), y[:, :phases, :phases]


def line_modes(
    conductors: tuple[Conductor, ...], frequencies_hz: ArrayLike, earth_resistivity: float, phases: int
) -> Modes:
    """Return the modes of a line at each frequency, ground wires taken out (see :class:`twlocate.waves.Modes`)."""
    s = np.asarray(2j * np.pi * np.atleast_1d(frequencies_hz), dtype=np.complex128)
    z, y = phase_matrices(conductors, s, earth_resistivity, phases)
    return eigenmodes(z, y)


def phase_matrices(
    conductors: tuple[Conductor, ...], s: ComplexArray, earth_resistivity: float, phases: int
) -> tuple[ComplexArray, ComplexArray]:
    """Return Z(s) and Y(s) of the phases, shape (frequencies, phases, phases)."""
    z = series_impedance(conductors, s, earth_resistivity)
    return without_ground_wires(z, shunt_admittance(conductors, s), phases)


def modal_speeds(modes: Modes, frequencies_hz: ArrayLike) -> FloatArray:
    """Return the phase speed ω/Im γ of each mode, m/s, shape (frequencies, n)."""
    omega = 2 * np.pi * np.atleast_1d(np.asarray(frequencies_hz, dtype=np.float64))
    speeds: FloatArray = omega[:, None] / modes.gamma.imag
    return speeds


def _internal(conductor: Conductor, s: ComplexArray) -> ComplexArray:
    if conductor.gmr_m is not None:
        inside = MU_0 / (2 * np.pi) * np.log(conductor.radius_m / conductor.gmr_m)
        own = conductor.resistance + s * inside
    else:
        own = skin_impedance(s, conductor.radius_m, conductor.resistance)
    shared: ComplexArray = own / conductor.bundle
    return shared


def skin_impedance(s: ComplexArray, radius_m: float, resistance: float) -> ComplexArray:
    """Return the internal impedance of a round wire, Ω/m: m·ρ/(2πr)·I₀(mr)/I₁(mr), m = √(s·µ₀/ρ).

    ρ is what gives a solid wire of this radius the direct-current `resistance` (S. A. Schelkunoff, The
    electromagnetic theory of coaxial transmission lines and cylindrical shields, Bell Syst. Tech. J. 13, 1934,
    from memory). A stranded conductor is taken as solid.
    """
    from scipy import special

    resistivity = resistance * np.pi * radius_m**2
    m = np.sqrt(s * MU_0 / resistivity)
    ratio = special.ive(0, m * radius_m) / special.ive(1, m * radius_m)
    inside: ComplexArray = m * resistivity / (2 * np.pi * radius_m) * ratio
    return inside


def _distances(conductors: tuple[Conductor, ...], depth: ComplexArray | float) -> tuple[FloatArray, ComplexArray]:
    """Return distances between conductors (own radius on the diagonal) and to images `depth` below the surface.

    `depth` may have the shape (frequencies, 1, 1).
    """
    x = np.array([c.x_m for c in conductors])
    h = np.array([c.mean_height_m for c in conductors])
    if (h <= 0).any():
        raise ValueError(f"a conductor's mean height is {h.min():g} m; it must be above the ground (height − ⅔·sag)")
    across, up = x[:, None] - x[None, :], h[:, None] - h[None, :]
    direct = np.hypot(across, up)
    np.fill_diagonal(direct, [c.bundled(c.radius_m) for c in conductors])
    image = np.sqrt(across**2 + (h[:, None] + h[None, :] + 2 * np.asarray(depth, dtype=np.complex128)) ** 2)
    return direct, image


def _complex_depth(conductors: tuple[Conductor, ...], s: ComplexArray, resistivity: float) -> ComplexArray:
    """A. Deri, G. Tevan, A. Semlyen, A. Castanheira, IEEE Trans. PAS-100, 1981: images at the depth √(ρ/(s·µ₀))."""
    depth = np.sqrt(resistivity / (s * MU_0))[:, None, None]
    direct, image = _distances(conductors, depth)
    z: ComplexArray = s[:, None, None] * MU_0 / (2 * np.pi) * np.log(image / direct)
    return z


def _carson(conductors: tuple[Conductor, ...], s: ComplexArray, resistivity: float) -> ComplexArray:
    """First terms of J. R. Carson's series: ω·µ₀/8 and the return depth 658.5·√(ρ/f) (W. H. Kersting, Distribution
    System Modeling and Analysis, 3rd ed., ch. 4)."""
    omega = s.imag[:, None, None]
    direct, _ = _distances(conductors, 0.0)
    return_depth = 658.5 * np.sqrt(resistivity / (omega / (2 * np.pi)))
    z: ComplexArray = omega * MU_0 / 8 + 1j * omega * MU_0 / (2 * np.pi) * np.log(return_depth / direct)
    return z


EARTHS: Mapping[str, Callable[[tuple[Conductor, ...], ComplexArray, float], ComplexArray]] = {
    "complex depth": _complex_depth,
    "carson": _carson,
}
