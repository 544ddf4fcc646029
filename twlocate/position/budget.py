"""What the uncertainty of a position is made of: sensitivity × u of every input (GUM, JCGM 100:2008, 5.1)."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from twlocate.position.inputs import Input
from twlocate.position.linear import LinearModel


@dataclass(frozen=True)
class Contribution:
    """How much one input adds to the standard uncertainty of the position."""

    input: str
    unit: str
    u: float
    sensitivity: float
    """Change of the position a unit of the input, m per `unit`."""

    @property
    def metres(self) -> float:
        """The input's share of the standard uncertainty, m."""
        return abs(self.sensitivity) * self.u


def budget(
    model: LinearModel, x: float, inputs: Sequence[Input], reading_names: Sequence[str]
) -> tuple[Contribution, ...]:
    """Return the contributions at `x`, largest first; their root sum of squares is the standard uncertainty.

    The position is the weighted least squares solution x̂ = x + mᵀW·r / (mᵀW·m). An input that is larger
    than stated shifts the predictions by its column of J, hence the position by −mᵀW·J / (mᵀW·m).
    Where the times do not depend on x there is no such solution, and no contribution.
    """
    pull, curvature = model.pull(x)
    if curvature <= 0:
        return ()
    gain = pull @ model.differences / curvature
    of_inputs = -gain @ model.jacobian(np.array([x]))[0]
    rows = [
        Contribution(source.name, source.unit, source.u, float(sensitivity))
        for source, sensitivity in zip(inputs, of_inputs, strict=True)
        if source.u > 0 and sensitivity != 0
    ]
    u_readings = np.sqrt(model.variance)
    rows += [
        Contribution(name, "s", float(u), float(g)) for name, u, g in zip(reading_names, u_readings, gain, strict=True)
    ]
    return tuple(sorted(rows, key=lambda row: row.metres, reverse=True))


def standard_uncertainty(contributions: Sequence[Contribution]) -> float:
    """Return the root sum of squares of the contributions, m."""
    return float(np.sqrt(sum(row.metres**2 for row in contributions)))
