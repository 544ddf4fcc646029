"""Waves on a line or a pipe: the notation every other room uses.

==============  ====================================  ==========================  =====================
symbol          name in code                          line, cable                 pipe
==============  ====================================  ==========================  =====================
u, p            ``across``                            voltage, V                  pressure, Pa
i, q            ``through`` (positive into the route  current, A                  volumetric flow, m³/s
                at a terminal)
Z               ``impedance``                         surge impedance, Ω          ρa/A, Pa·s/m³
f               ``outgoing`` = (across + Z·through)/2  leaves the terminal        leaves the terminal
b               ``incoming`` = (across − Z·through)/2  arrives from the route     arrives from the route
==============  ====================================  ==========================  =====================

The two waves are d'Alembert's solution of the wave equation at the terminal; they add to the across
variable and their difference over Z is the through variable.
"""

from twlocate.waves.eigenmodes import Modes, eigenmodes
from twlocate.waves.junctions import reflection, scattering
from twlocate.waves.modal import AERIAL_MODES, CLARKE, KARRENBAUER, aerial_mode, ground_mode
from twlocate.waves.splitting import join, split, split_dispersive
from twlocate.waves.two_sensors import SpacingLimits, spacing_limits, split_two_sensors, split_two_traces

__all__ = [
    "AERIAL_MODES",
    "CLARKE",
    "KARRENBAUER",
    "Modes",
    "SpacingLimits",
    "aerial_mode",
    "eigenmodes",
    "ground_mode",
    "join",
    "reflection",
    "scattering",
    "spacing_limits",
    "split",
    "split_dispersive",
    "split_two_sensors",
    "split_two_traces",
]
