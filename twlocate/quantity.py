"""Values with a standard uncertainty, in SI, read from text such as ``118.4 km ± 60 m``."""

import functools
import math
import re
from dataclasses import dataclass
from typing import Any

_NUMBER = r"[+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?"
_TERM = re.compile(rf"^\s*(?P<number>{_NUMBER})\s*(?P<unit>.*?)\s*$")
_PLUS_MINUS = re.compile(r"±|\+/-")


@dataclass(frozen=True)
class Quantity:
    """A value and its standard uncertainty (k = 1, as in the GUM), both in the same SI unit."""

    value: float
    u: float = 0.0


def parse_quantity(text: str, unit: str) -> Quantity:
    """Read a quantity and express it in ``unit``.

    Parameters
    ----------
    text : str
        ``"118.4 km ± 60 m"``, ``"294.6 ± 0.5 m/us"``, ``"1180 m/s +/- 2 %"``, ``"± 0.1 µs"`` (value zero)
        or a value alone (uncertainty zero). The figure behind ± is the standard uncertainty.
    unit : str
        The SI unit wanted, for example ``"m"`` or ``"m/s"``.

    Raises
    ------
    ValueError
        The text is not a quantity, or its unit cannot be turned into `unit`.
    """
    value_text, *u_texts = _PLUS_MINUS.split(text)
    if len(u_texts) > 1:
        raise ValueError(f"{text!r} has more than one ±; write one value and one standard uncertainty")
    if not u_texts:
        return Quantity(_in_unit(value_text, unit, text))
    number_only = _TERM.match(value_text)
    if number_only and not number_only["unit"]:
        value_text += " " + _unit_of(u_texts[0], text)  # "294.6 ± 0.5 m/us": one unit for both
    value = _in_unit(value_text, unit, text) if value_text.strip() else 0.0
    u = _uncertainty(u_texts[0], value, unit, text)
    if u < 0:
        raise ValueError(
            f"{text!r} has a negative uncertainty; the figure behind ± is a standard uncertainty, 0 or more"
        )
    return Quantity(value, u)


def unit_scale(unit: str, target: str) -> float:
    """Return the factor that takes a reading in `unit` to `target` (no offset units).

    Raises
    ------
    ValueError
        `unit` is unknown or measures something else than `target`.
    """
    return float(_convert(1.0, unit, target, unit, delta=True))


def _uncertainty(text: str, value: float, unit: str, whole: str) -> float:
    term = _TERM.match(text)
    if term and term["unit"] == "%":
        return abs(value) * float(term["number"]) / 100
    return _in_unit(text, unit, whole, delta=True)


def _unit_of(text: str, whole: str) -> str:
    term = _TERM.match(text)
    if term is None or term["unit"] == "%":
        raise ValueError(f"{whole!r} has no unit; write it like '118.4 km ± 60 m'")
    return term["unit"]


def _in_unit(text: str, unit: str, whole: str, *, delta: bool = False) -> float:
    term = _TERM.match(text)
    if term is None:
        raise ValueError(f"{whole!r} is not a number with a unit; write it like '118.4 km ± 60 m'")
    if not term["unit"] and unit:
        raise ValueError(f"{whole!r} has no unit; a unit of the kind '{unit}' is needed")
    number = float(term["number"])
    if not math.isfinite(number):
        raise ValueError(f"{whole!r} is not a finite number")
    return _convert(number, term["unit"], unit, whole, delta=delta)


def _convert(number: float, unit: str, target: str, whole: str, *, delta: bool) -> float:
    """Convert, taking a temperature *difference* where `delta` asks for one."""
    registry = _registry()
    try:
        reading = registry.Quantity(number, unit)
        if delta and not reading._is_multiplicative:
            reading = registry.Quantity(number, "delta_" + unit)
        return float(reading.to(target).magnitude)
    except Exception as error:  # pint raises a dozen unrelated types for a text it cannot read
        raise ValueError(f"{whole!r} cannot be read in '{target}'; check the unit {unit!r}") from error


@functools.cache
def _registry() -> Any:
    import pint

    return pint.UnitRegistry()
