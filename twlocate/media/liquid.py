"""Pressure waves in a liquid-filled pipe: speed, impedance, pressure rise, and loss by friction."""

from collections.abc import Callable, Mapping

import numpy as np

from twlocate.arrays import ComplexArray

ANCHORAGE: Mapping[str, Callable[[float], float]] = {
    "upstream": lambda poisson: 1 - poisson / 2,
    "throughout": lambda poisson: 1 - poisson**2,
    "joints": lambda _: 1.0,
}
"""Thin-wall factor c₁: anchored at the upstream end only; against axial movement throughout; expansion joints
throughout (E. B. Wylie and V. L. Streeter, Fluid Transients in Systems, 1993, ch. 1, from memory)."""


def wall_factor(bore: float, wall: float, poisson: float, anchorage: str, *, thick: bool = True) -> float:
    """Return c₁ in the wave speed's K·D·c₁/(E·e).

    With `thick` the stress across the wall is accounted for: c₁ = 2(e/D)(1 + ν) + D/(D + e)·c₁(thin), which tends
    to the thin-wall value as e/D goes to 0 (Wylie and Streeter 1993, ch. 1, from memory).

    Raises
    ------
    ValueError
        The anchorage is not a key of :data:`ANCHORAGE`.
    """
    if anchorage not in ANCHORAGE:
        raise ValueError(f"anchorage {anchorage!r} is unknown; choose one of {', '.join(ANCHORAGE)}")
    thin = ANCHORAGE[anchorage](poisson)
    return 2 * wall / bore * (1 + poisson) + bore / (bore + wall) * thin if thick else thin


def wave_speed(density: float, bulk_modulus: float, bore: float, wall: float, young: float, factor: float) -> float:
    """Return the Korteweg–Joukowsky speed √(K/ρ)/√(1 + K·D·c₁/(E·e)), m/s; SI units, `factor` is c₁.

    D. J. Korteweg, Annalen der Physik 241, 1878; N. Joukowsky, 1898 (both from memory).
    """
    return float(np.sqrt(bulk_modulus / density / (1 + bulk_modulus * bore * factor / (young * wall))))


def with_free_gas(
    density: float, bulk_modulus: float, gas_fraction: float, pressure_pa: float, gas_density: float = 1.2
) -> tuple[float, float]:
    """Return density and bulk modulus of a liquid that carries free gas as small bubbles.

    Parameters
    ----------
    density, bulk_modulus : float
        Of the liquid, kg/m³ and Pa.
    gas_fraction : float
        Volume share of the gas at `pressure_pa`.
    pressure_pa : float
        Absolute pressure; the gas is taken as isothermal, its modulus is the pressure.
    gas_density : float
        At `pressure_pa`, kg/m³.

    References
    ----------
    A. B. Wood, A Textbook of Sound, 1930 (from memory): volumes, hence compliances and masses, add.
    """
    mixture = density * (1 - gas_fraction) + gas_density * gas_fraction
    return mixture, 1 / ((1 - gas_fraction) / bulk_modulus + gas_fraction / pressure_pa)


def impedance(density: float, speed: float, bore: float) -> float:
    """Return ρ·a/A, Pa·s/m³."""
    return density * speed / (np.pi * bore**2 / 4)


def pressure_rise(density: float, speed: float, velocity_change: float) -> float:
    """Return Joukowsky's rise ρ·a·Δv, Pa, of a flow brought to rest faster than the pipe's return time 2L/a."""
    return density * speed * velocity_change


def slow_closure_head(length: float, velocity: float, static_head: float, closure_s: float, gravity: float) -> float:
    """Return Allievi's largest head rise (m) for a closure longer than 2L/a: H₀/2·(K₁ + √(K₁² + 4)) with K₁ as below.

    K₁ = L·v/(g·H₀·t) (Land Improvement Design Standard "Pipeline", MAFF Japan, 2021, ch. 8).
    """
    k1 = length * velocity / (gravity * static_head * closure_s)
    return float(static_head / 2 * (k1 + np.sqrt(k1**2 + 4)))


def turbulent_resistance(friction_factor: float, velocity: float, bore: float) -> float:
    """Return the loss rate r (1/s) of small changes about a steady flow: r = f·|v|/D.

    Darcy–Weisbach's f·v|v|/(2D), linearised at the steady velocity; for :func:`gamma`.
    """
    return friction_factor * abs(velocity) / bore


def gamma(s: ComplexArray, speed: float, resistance: float = 0.0) -> ComplexArray:
    """Return γ(s) = (s/a)·√(1 + r/s), 1/m, with the loss rate `resistance` r (1/s)."""
    propagation: ComplexArray = s / speed * np.sqrt(1 + resistance / s)
    return propagation


def laminar_gamma(s: ComplexArray, speed: float, bore: float, viscosity: float) -> ComplexArray:
    """Return γ(s) of laminar flow with its unsteady wall shear, 1/m.

    Parameters
    ----------
    s : ndarray
        Laplace variable, 1/s, not zero.
    speed, bore, viscosity : float
        m/s; m; kinematic viscosity, m²/s.

    Notes
    -----
    γ = (s/a)/√(1 − 2 I₁(x)/(x I₀(x))), x = (D/2)·√(s/ν) (W. Zielke, Frequency-dependent friction in transient pipe
    flow, J. Basic Eng. 90, 1968; F. T. Brown, J. Basic Eng. 84, 1962; both from memory).
    """
    from scipy import special

    x = bore / 2 * np.sqrt(s / viscosity)
    ratio = special.ive(1, x) / special.ive(0, x)
    propagation: ComplexArray = s / speed / np.sqrt(1 - 2 * ratio / x)
    return propagation
