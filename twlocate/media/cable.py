"""Single-core coaxial cables: the wave between the core and a screen that is bonded at both ends."""

from dataclasses import dataclass

import numpy as np

from twlocate.arrays import ComplexArray
from twlocate.media.overhead import EPSILON_0, MU_0, skin_impedance


@dataclass(frozen=True)
class Coaxial:
    """Radii from the inside out, m; the semiconducting screens lie between them."""

    core_radius_m: float
    insulation_inner_m: float
    """Outside of the conductor screen."""
    insulation_outer_m: float
    """Inside of the insulation screen."""
    sheath_inner_m: float
    permittivity: float
    """Relative, of the insulation at the wave's frequencies."""
    core_resistance: float
    """Ω/m at direct current."""
    sheath_resistivity: float
    """Ω·m; the sheath is taken as thick against its skin depth, as it is above some 10 kHz."""


def series_impedance(cable: Coaxial, s: ComplexArray) -> ComplexArray:
    """Return the loop impedance of core and sheath, Ω/m: field between them, skin effect of either.

    A bonded sheath carries the return current at the frequencies of a wave, so the loop is coaxial
    (S. A. Schelkunoff, Bell Syst. Tech. J. 13, 1934, from memory).
    """
    outside = s * MU_0 / (2 * np.pi) * np.log(cable.sheath_inner_m / cable.core_radius_m)
    sheath = np.sqrt(s * MU_0 * cable.sheath_resistivity) / (2 * np.pi * cable.sheath_inner_m)
    total: ComplexArray = outside + sheath + skin_impedance(s, cable.core_radius_m, cable.core_resistance)
    return total


def shunt_admittance(cable: Coaxial, s: ComplexArray) -> ComplexArray:
    """Return s·C, S/m; the semiconducting screens conduct the field away and only the insulation stores it."""
    ratio = cable.insulation_outer_m / cable.insulation_inner_m
    capacitance = 2 * np.pi * EPSILON_0 * cable.permittivity / np.log(ratio)
    y: ComplexArray = s * capacitance
    return y


def gamma(cable: Coaxial, s: ComplexArray) -> ComplexArray:
    """Return γ(s) = √(Z·Y), 1/m."""
    root: ComplexArray = np.sqrt(series_impedance(cable, s) * shunt_admittance(cable, s))
    return root


def surge_impedance(cable: Coaxial, s: ComplexArray) -> ComplexArray:
    """Return √(Z/Y), Ω."""
    root: ComplexArray = np.sqrt(series_impedance(cable, s) / shunt_admittance(cable, s))
    return root
