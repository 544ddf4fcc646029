"""Wave speed and impedance of one section from what it is built of, with their uncertainty."""

from collections.abc import Callable, Mapping
from dataclasses import dataclass, replace

import numpy as np

from twlocate.arrays import ComplexArray
from twlocate.errors import TwlocateError
from twlocate.media import cable, liquid, overhead
from twlocate.media.cable import Coaxial
from twlocate.media.fluids import fluid_state
from twlocate.media.overhead import Conductor
from twlocate.media.propagation import Propagated, propagate
from twlocate.quantity import Quantity

Inputs = Mapping[str, Quantity]
_Numbers = Mapping[str, float]


@dataclass(frozen=True)
class SectionSpeed:
    """Speed and impedance of one wave in a section."""

    wave: str
    """Which wave where a section carries several: ``aerial``, ``ground``; else empty."""
    speed: Propagated
    """m/s"""
    impedance: Propagated
    """Ω, or Pa·s/m³ for a pipe."""


def pipe_speed(inputs: Inputs, *, anchorage: str, fluid: str | None) -> SectionSpeed:
    """Return speed and impedance of a liquid-filled pipe.

    Parameters
    ----------
    inputs : mapping of Quantity
        ``bore``, ``wall`` (m), ``young`` (Pa), ``poisson``, ``pressure`` (Pa, absolute), ``gas_fraction`` and either
        ``temperature`` (K, with `fluid`) or ``density`` and ``bulk_modulus`` (kg/m³, Pa; `fluid` None).
    anchorage : str
        A key of :data:`twlocate.media.liquid.ANCHORAGE`.
    fluid : str or None
        See :func:`twlocate.media.fluids.fluid_state`.
    """
    _check_positive(inputs, ("bore", "wall", "young", "pressure", "density", "bulk_modulus", "temperature"))
    if not 0 <= inputs["gas_fraction"].value < 0.5:
        raise TwlocateError(f"gas fraction {inputs['gas_fraction'].value:g} is not in 0 to 0.5; bubbly liquid only")

    def mixture(q: _Numbers) -> tuple[float, float]:
        if fluid is None:
            density, modulus = q["density"], q["bulk_modulus"]
        else:
            state = fluid_state(fluid, q["temperature"], q["pressure"])
            if state.is_gas:
                raise TwlocateError(
                    f"{fluid} is a gas at {q['temperature']:g} K and {q['pressure']:g} Pa; use speed gas"
                )
            density, modulus = state.density, state.bulk_modulus
        return liquid.with_free_gas(density, modulus, max(q["gas_fraction"], 0.0), q["pressure"])

    def speed_of(q: _Numbers, density: float, modulus: float) -> float:
        factor = liquid.wall_factor(q["bore"], q["wall"], q["poisson"], anchorage)
        return liquid.wave_speed(density, modulus, q["bore"], q["wall"], q["young"], factor)

    def impedance_of(q: _Numbers) -> float:
        density, modulus = mixture(q)
        return liquid.impedance(density, speed_of(q, density, modulus), q["bore"])

    return SectionSpeed("", propagate(lambda q: speed_of(q, *mixture(q)), inputs), propagate(impedance_of, inputs))


def gas_speed(inputs: Inputs, *, fluid: str) -> SectionSpeed:
    """Return speed and impedance of a gas in a stiff pipe.

    Parameters
    ----------
    inputs : mapping of Quantity
        ``bore`` (m), ``temperature`` (K) and ``pressure`` (Pa, absolute).
    fluid : str
        Substance or mixture; see :func:`twlocate.media.fluids.fluid_state`.
    """
    _check_positive(inputs, ("bore", "temperature", "pressure"))

    def impedance_of(q: _Numbers) -> float:
        state = fluid_state(fluid, q["temperature"], q["pressure"])
        return liquid.impedance(state.density, state.sound_speed, q["bore"])

    def speed_of(q: _Numbers) -> float:
        return fluid_state(fluid, q["temperature"], q["pressure"]).sound_speed

    return SectionSpeed("", propagate(speed_of, inputs), propagate(impedance_of, inputs))


def cable_speed(inputs: Inputs, *, frequency_hz: float) -> SectionSpeed:
    """Return phase speed and surge impedance of a single-core cable at one frequency.

    Parameters
    ----------
    inputs : mapping of Quantity
        One an attribute of :class:`twlocate.media.cable.Coaxial`, by its name.
    frequency_hz : float
        Where most of the wave's energy is.
    """
    _check_positive(inputs, tuple(inputs))
    if inputs["permittivity"].value < 1:
        raise TwlocateError(f"permittivity {inputs['permittivity'].value:g} is below 1, that of a vacuum")
    radii = [inputs[name].value for name in ("core_radius_m", "insulation_inner_m", "insulation_outer_m")]
    radii.append(inputs["sheath_inner_m"].value)
    if not (radii[0] <= radii[1] < radii[2] <= radii[3]):
        listed = ", ".join(f"{radius * 1e3:g}" for radius in radii)
        raise TwlocateError(f"radii {listed} mm do not grow outwards; give core, insulation in and out, sheath")
    s = np.array([2j * np.pi * frequency_hz])

    def speed_of(q: _Numbers) -> float:
        return float(s.imag[0] / cable.gamma(Coaxial(**q), s).imag[0])

    def impedance_of(q: _Numbers) -> float:
        return float(cable.surge_impedance(Coaxial(**q), s).real[0])

    return SectionSpeed("", propagate(speed_of, inputs), propagate(impedance_of, inputs))


def line_speeds(
    phases: tuple[Conductor, ...], ground_wires: tuple[Conductor, ...], inputs: Inputs, *, frequency_hz: float
) -> tuple[SectionSpeed, ...]:
    """Return phase speed and surge impedance of the aerial and the ground mode of a line taken as transposed.

    Parameters
    ----------
    phases, ground_wires : tuple of Conductor
        At their nominal places.
    inputs : mapping of Quantity
        ``earth_resistivity`` (Ω·m), ``height_shift`` (m, all conductors; value 0) and ``phase_radius`` (m).
    frequency_hz : float
        Where most of the wave's energy is.

    Raises
    ------
    TwlocateError
        A conductor is not above the ground, or two are in one place.
    """
    _check_positive(inputs, ("earth_resistivity", "phase_radius"))
    places = [(c.x_m, c.height_m) for c in (*phases, *ground_wires)]
    if len(set(places)) < len(places):
        raise TwlocateError("two conductors are in one place; give each its own x and height")
    for name in ("radius_m", "resistance", "bundle_spacing_m"):
        if any(getattr(c, name) <= 0 for c in (*phases, *ground_wires) if name != "bundle_spacing_m" or c.bundle > 1):
            raise TwlocateError(f"{name.removesuffix('_m').replace('_', ' ')} of a conductor is not above 0")
    lowest = min(c.mean_height_m for c in (*phases, *ground_wires)) - inputs["height_shift"].u
    if lowest <= 0:
        raise TwlocateError(f"a conductor's mean height less its u is {lowest:g} m; it must be above the ground")
    s = np.array([2j * np.pi * frequency_hz])

    def balanced(q: _Numbers, sign: float) -> tuple[complex, complex]:
        moved = [replace(c, height_m=c.height_m + q["height_shift"]) for c in (*phases, *ground_wires)]
        moved[: len(phases)] = [replace(c, radius_m=q["phase_radius"]) for c in moved[: len(phases)]]
        z, y = overhead.phase_matrices(tuple(moved), s, q["earth_resistivity"], len(phases))
        return _mode(z[0], sign), _mode(y[0], sign)

    waves = {"aerial": -1.0, "ground": len(phases) - 1.0} if len(phases) > 1 else {"ground": 0.0}
    return tuple(
        SectionSpeed(wave, propagate(_speed(balanced, sign, s), inputs), propagate(_surge(balanced, sign), inputs))
        for wave, sign in waves.items()
    )


_Balanced = Callable[[_Numbers, float], tuple[complex, complex]]


def _speed(balanced: _Balanced, sign: float, s: ComplexArray) -> Callable[[_Numbers], float]:
    def speed(q: _Numbers) -> float:
        z, y = balanced(q, sign)
        return float(s.imag[0] / np.sqrt(z * y).imag)

    return speed


def _surge(balanced: _Balanced, sign: float) -> Callable[[_Numbers], float]:
    def surge(q: _Numbers) -> float:
        z, y = balanced(q, sign)
        return float(np.sqrt(z / y).real)

    return surge


def _mode(matrix: ComplexArray, sign: float) -> complex:
    """Eigenvalue of the transposed line's matrix: mean own value + `sign` times mean mutual value."""
    n = len(matrix)
    own = np.trace(matrix) / n
    mutual = (matrix.sum() - np.trace(matrix)) / max(n * (n - 1), 1)
    return complex(own + sign * mutual)


def _check_positive(inputs: Inputs, names: tuple[str, ...]) -> None:
    for name in names:
        if name in inputs and not inputs[name].value - inputs[name].u > 0:
            quantity = inputs[name]
            raise TwlocateError(
                f"{name.replace('_', ' ')} {quantity.value:g} ± {quantity.u:g} (SI) is not positive; "
                "value less standard uncertainty must be above 0"
            )
