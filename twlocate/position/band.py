"""Highest-density regions of a density that is piecewise linear over the sections of a route."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from twlocate.arrays import FloatArray
from twlocate.routes import Route

END_TOLERANCE = 1e-6
"""Share of a section's length within which a piece counts as reaching its end."""


@dataclass(frozen=True)
class SectionDensity:
    """Density over one section: probability a metre at increasing distances from its from-node."""

    x: FloatArray
    density: FloatArray

    @property
    def mass(self) -> float:
        """Probability that the event is in this section."""
        return float(np.trapezoid(self.density, self.x))

    @property
    def mode(self) -> float:
        """Where the density is highest, m."""
        return float(self.x[self.density.argmax()])

    def moments(self) -> tuple[float, float]:
        """Return mean and standard deviation of the density within this section, m."""
        mean = float(np.trapezoid(self.density * self.x, self.x)) / self.mass
        return mean, (float(np.trapezoid(self.density * (self.x - mean) ** 2, self.x)) / self.mass) ** 0.5

    def between(self, low_m: float, high_m: float) -> float:
        """Probability that the event is between two distances on this section."""
        steps = np.diff(self.x) * (self.density[:-1] + self.density[1:]) / 2
        cumulative = np.concatenate([[0.0], np.cumsum(steps)])
        below_low, below_high = np.interp([low_m, high_m], self.x, cumulative)
        return float(below_high - below_low)


@dataclass(frozen=True)
class Piece:
    """A connected part of a band within one section, metres from its from-node."""

    section: int
    from_m: float
    to_m: float


def highest_density(densities: Sequence[SectionDensity], coverage: float) -> tuple[Piece, ...]:
    """Return the smallest region that holds `coverage` of the probability, in pieces.

    The level that bounds it is found by bisection; between grid points the density is taken as linear, so
    the ends of the pieces do not jump with the grid.
    """
    total = sum(section.mass for section in densities)
    low, high = 0.0, max(float(section.density.max()) for section in densities)
    for _ in range(60):
        level = (low + high) / 2
        if sum(_mass_above(section, level) for section in densities) >= coverage * total:
            low = level
        else:
            high = level
    return tuple(piece for index, section in enumerate(densities) for piece in _pieces(index, section, low))


def _mass_above(section: SectionDensity, level: float) -> float:
    """Integrate the density where it exceeds `level`, exactly for a piecewise linear density."""
    d0, d1 = section.density[:-1], section.density[1:]
    lower, upper = np.minimum(d0, d1), np.maximum(d0, d1)
    crossed = (lower < level) & (level < upper)
    share = np.divide(upper - level, upper - lower, out=(lower >= level).astype(np.float64), where=crossed)
    return float(np.sum(np.diff(section.x) * share * (np.maximum(lower, level) + upper) / 2))


def _pieces(index: int, section: SectionDensity, level: float) -> list[Piece]:
    inside = section.density >= level
    edges = np.diff(np.concatenate([[False], inside, [False]]).astype(np.int8))
    starts, stops = np.flatnonzero(edges == 1), np.flatnonzero(edges == -1) - 1
    return [
        Piece(index, _crossing(section, start - 1, start, level), _crossing(section, stop + 1, stop, level))
        for start, stop in zip(starts.tolist(), stops.tolist(), strict=True)
    ]


def _crossing(section: SectionDensity, outside: int, inside: int, level: float) -> float:
    """Return where the density passes `level` between two neighbouring grid points, or the section's end."""
    if outside < 0 or outside >= section.x.size:
        return float(section.x[inside])
    rise = section.density[inside] - section.density[outside]
    share = (level - section.density[outside]) / rise
    return float(section.x[outside] + share * (section.x[inside] - section.x[outside]))


def band_length(pieces: Sequence[Piece]) -> float:
    """Sum of the pieces' lengths, m."""
    return sum(piece.to_m - piece.from_m for piece in pieces)


def in_one_run(pieces: Sequence[Piece], route: Route) -> bool:
    """Whether the pieces join up over the nodes between their sections, so that a crew can search them in one go."""
    group = list(range(len(pieces)))
    touching: dict[str, int] = {}
    for number, piece in enumerate(pieces):
        for node in _nodes_reached(piece, route):
            first = touching.setdefault(node, number)
            old, new = group[number], group[first]
            group = [new if label == old else label for label in group]
    return len(set(group)) <= 1


def _nodes_reached(piece: Piece, route: Route) -> list[str]:
    section = route.sections[piece.section]
    slack = END_TOLERANCE * section.length.value
    reached = [section.from_node] if piece.from_m <= slack else []
    return reached + ([section.to_node] if piece.to_m >= section.length.value - slack else [])
