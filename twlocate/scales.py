"""Lengths and times as people read them: one unit for values that belong together, digits to match the uncertainty."""

import math
from dataclasses import dataclass

LENGTH_UNITS = ((20_000.0, 1_000.0, "km"), (2.0, 1.0, "m"), (0.0, 0.001, "mm"))
SMALL_LENGTH_UNITS = ((1_000.0, 1_000.0, "km"), (0.1, 1.0, "m"), (0.0, 0.001, "mm"))
TIME_UNITS = ((1.0, 1.0, "s"), (1e-3, 1e-3, "ms"), (1e-6, 1e-6, "µs"), (0.0, 1e-9, "ns"))


@dataclass(frozen=True)
class Scale:
    """A unit and the number of decimals to print in it."""

    size: float
    unit: str
    decimals: int

    def number(self, value: float) -> str:
        """Write a value without its unit."""
        text = f"{value / self.size:.{self.decimals}f}"
        return text.removeprefix("-") if float(text) == 0 else text

    def __call__(self, value: float) -> str:
        """Write a value with its unit."""
        return f"{self.number(value)} {self.unit}"


def length_scale(extent_m: float, u_m: float) -> Scale:
    """Return how to write positions on a route of `extent_m`, known to `u_m`."""
    return _scale(LENGTH_UNITS, extent_m, u_m)


def time_scale(extent_s: float, u_s: float) -> Scale:
    """Return how to write times up to `extent_s`, known to `u_s`."""
    return _scale(TIME_UNITS, extent_s, u_s)


def length_text(value_m: float) -> str:
    """Write a length that is itself an uncertainty or a distance to go, to two digits."""
    size, unit = next((size, unit) for least, size, unit in SMALL_LENGTH_UNITS if abs(value_m) >= least)
    return f"{two_digits(value_m / size)} {unit}"


def time_text(value_s: float) -> str:
    """Write a time that is itself an uncertainty or a difference, to two digits."""
    size, unit = next((size, unit) for least, size, unit in TIME_UNITS if abs(value_s) >= least)
    return f"{two_digits(value_s / size)} {unit}"


def _scale(units: tuple[tuple[float, float, str], ...], extent: float, u: float) -> Scale:
    """Choose the unit by the extent, and decimals so that the uncertainty keeps two significant digits."""
    _, size, unit = next(row for row in units if abs(extent) >= row[0])
    decimals = 1 - math.floor(math.log10(u / size)) if u > 0 else 3
    return Scale(size, unit, min(max(decimals, 0), 6))


def two_digits(value: float) -> str:
    """Write a value to two significant digits without an exponent where that stays short."""
    if value == 0 or not 1e-4 <= abs(value) < 1e6:
        return f"{value:.2g}"
    return f"{value:.{max(1 - math.floor(math.log10(abs(value))), 0)}f}"
