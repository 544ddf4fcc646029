"""State of a named liquid or gas at its temperature and pressure, by equation of state (CoolProp)."""

from dataclasses import dataclass
from typing import Any

from twlocate.errors import TwlocateError


@dataclass(frozen=True)
class FluidState:
    """What a wave needs to know of a fluid."""

    density: float
    """kg/m³"""
    sound_speed: float
    """m/s, isentropic"""
    is_gas: bool

    @property
    def bulk_modulus(self) -> float:
        """Isentropic bulk modulus ρ·c², Pa: the one a wave compresses the fluid with, not the isothermal one."""
        return self.density * self.sound_speed**2


def fluid_state(fluid: str, temperature_k: float, pressure_pa: float) -> FluidState:
    """Return the state of a fluid in one phase.

    Parameters
    ----------
    fluid : str
        A substance such as ``"Water"``, or a mixture by mole fractions such as ``"Methane=0.96 & Ethane=0.04"``
        (normalised to a sum of 1).
    temperature_k, pressure_pa : float
        Absolute temperature, K, and absolute pressure, Pa.

    Raises
    ------
    TwlocateError
        CoolProp is not installed, does not know the fluid, or has no single phase there.

    References
    ----------
    I. H. Bell et al., Pure and pseudo-pure fluid thermophysical property evaluation and the open-source library
    CoolProp, Ind. Eng. Chem. Res. 53, 2014; for mixtures O. Kunz and W. Wagner, The GERG-2008 wide-range equation
    of state, J. Chem. Eng. Data 57, 2012; for water W. Wagner and A. Pruß, IAPWS-95, J. Phys. Chem. Ref. Data 31, 2002.
    """
    coolprop = _coolprop()
    names, fractions = _composition(fluid)
    try:
        state = coolprop.AbstractState("HEOS", "&".join(names))
        if len(names) > 1:
            state.set_mole_fractions(fractions)
        state.update(coolprop.PT_INPUTS, pressure_pa, temperature_k)
        is_gas = state.phase() in (coolprop.iphase_gas, coolprop.iphase_supercritical_gas)
        return FluidState(state.rhomass(), state.speed_sound(), is_gas)
    except ValueError as error:
        reason = str(error).splitlines()[0].rstrip(". ")
        raise TwlocateError(
            f"fluid {fluid!r} at {temperature_k:g} K and {pressure_pa:g} Pa: {reason}; "
            "check the name, the fractions, and that temperature and pressure (absolute) give one phase"
        ) from error


def _coolprop() -> Any:
    try:
        import CoolProp
    except ImportError as error:
        raise TwlocateError("fluid properties need CoolProp: pip install twlocate[fluids]") from error
    return CoolProp


def _composition(fluid: str) -> tuple[list[str], list[float]]:
    parts = [part.partition("=") for part in fluid.split("&")]
    names = [name.strip() for name, _, _ in parts]
    if len(parts) == 1:
        return names, [1.0]
    try:
        fractions = [float(share) for _, _, share in parts]
    except ValueError as error:
        raise TwlocateError(
            f"mixture {fluid!r} has a part without a number; write it like 'Methane=0.96 & Ethane=0.04'"
        ) from error
    if min(fractions) < 0 or sum(fractions) <= 0:
        raise TwlocateError(f"mixture {fluid!r} has a negative fraction or none at all; give mole fractions above 0")
    return names, [fraction / sum(fractions) for fraction in fractions]
