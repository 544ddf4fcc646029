"""Events whose truth is known: any tree or mesh of sections, solved in the Laplace domain.

A section of n conductors is described by the γ(s) and Z(s) of its modes and by the matrix that joins modes and
conductors. Sections become two-port admittances, nodes add them up, and the answer returns to time by the numerical
inverse Laplace transform, so that dispersion and loss are exact and no step in time or length is made.
"""

from twlocate.simulation.events import fault_admittance, ramp, sinusoid, steady_state, step
from twlocate.simulation.laplace import LaplaceGrid, laplace_grid
from twlocate.simulation.media import Medium, balanced_line, pipe, uniform_line
from twlocate.simulation.network import Network, Span, solve, through_into

__all__ = [
    "LaplaceGrid",
    "Medium",
    "Network",
    "Span",
    "balanced_line",
    "fault_admittance",
    "laplace_grid",
    "pipe",
    "ramp",
    "sinusoid",
    "solve",
    "steady_state",
    "step",
    "through_into",
    "uniform_line",
]
