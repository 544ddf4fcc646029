"""Carry the standard uncertainty of every input through to a result, whatever computes it."""

from collections.abc import Callable, Mapping
from dataclasses import dataclass

from twlocate.quantity import Quantity


@dataclass(frozen=True)
class Contribution:
    """How one input bears on a result."""

    name: str
    u: float
    """Standard uncertainty of the input, in its SI unit."""
    sensitivity: float
    """d result / d input."""
    share: float
    """Part of the result's variance, 0 … 1."""

    @property
    def size(self) -> float:
        """Standard uncertainty of the result that stems from this input alone."""
        return abs(self.sensitivity) * self.u


@dataclass(frozen=True)
class Propagated:
    """A result with its standard uncertainty and the inputs that matter, the largest first."""

    quantity: Quantity
    contributions: tuple[Contribution, ...]


def propagate(compute: Callable[[Mapping[str, float]], float], inputs: Mapping[str, Quantity]) -> Propagated:
    """Evaluate `compute` at the inputs' values and propagate their uncertainties, taken as independent.

    Parameters
    ----------
    compute : callable
        Takes one number an input, by name, and returns the result.
    inputs : mapping
        Input quantities in SI; those with u = 0 are held.

    Notes
    -----
    Law of propagation with numerical derivatives: the sensitivity is the central difference over ± u
    (JCGM 100:2008, 5.1.2 and 5.1.3 note 2).
    """
    values = {name: quantity.value for name, quantity in inputs.items()}

    def sensitivity(name: str, u: float) -> float:
        above, below = (compute({**values, name: values[name] + step}) for step in (u, -u))
        return (above - below) / (2 * u)

    slopes = {name: sensitivity(name, quantity.u) for name, quantity in inputs.items() if quantity.u > 0}
    variances = {name: (slope * inputs[name].u) ** 2 for name, slope in slopes.items()}
    total = sum(variances.values())
    rows = [
        Contribution(name, inputs[name].u, slope, variances[name] / total if total else 0.0)
        for name, slope in slopes.items()
    ]
    return Propagated(
        Quantity(compute(values), total**0.5), tuple(sorted(rows, key=lambda row: row.share, reverse=True))
    )
