"""``twlocate speed``: the wave speed and impedance of a section from what it is built of."""

from collections.abc import Callable
from pathlib import Path
from typing import Any, TypeVar

import click

from twlocate.commands.failing import failing_in_one_line

F = TypeVar("F", bound=Callable[..., Any])


def _quantity(unit: str) -> Callable[[str], Any]:
    """Return the reader of an option that is a number with its unit, and ± a standard uncertainty."""

    def quantity(text: str) -> Any:
        from twlocate.quantity import parse_quantity

        try:
            return parse_quantity(text, unit)
        except ValueError as error:
            raise click.BadParameter(str(error)) from error

    return quantity


def place(text: str) -> tuple[float, ...]:
    """Read a conductor's ``"x, height"``, m."""
    parts = text.split(",")
    if len(parts) != 2:
        raise click.BadParameter(f"{text!r} is not a place; write x and height like '-7.5 m, 24 m'")
    return tuple(_quantity("m")(part).value for part in parts)


def _option(name: str, unit: str, text: str, **more: Any) -> Callable[[F], F]:
    more.setdefault("required", "default" not in more)
    return click.option(name, type=_quantity(unit), help=text, show_default="default" in more, **more)


@click.group()
def speed() -> None:
    """Compute a section's wave speed and impedance, with their uncertainty.

    Every figure is a quantity with its unit, such as "600 mm" or "600 mm ± 2 mm"; the figure behind ± is a standard
    uncertainty. The output is lines to paste into a section of a case file. A speed calibrated on the route itself is
    better than any computed one.
    """


@speed.command()
@_option("--bore", "m", "Inner diameter.")
@_option("--wall", "m", "Wall thickness.")
@_option("--young", "Pa", "Young's modulus of the wall.")
@_option("--poisson", "", "Poisson's ratio of the wall.")
@click.option(
    "--anchorage",
    type=click.Choice(["upstream", "throughout", "joints"]),
    default="throughout",
    show_default=True,
    help="How the pipe is held: at its upstream end, against axial movement throughout, or expansion joints.",
)
@click.option("--fluid", default="Water", show_default=True, help="A liquid by name; its properties need CoolProp.")
@_option("--temperature", "K", "Of the liquid.", default="12 degC ± 3 K")
@_option("--pressure", "Pa", "Absolute.", default="6 bar")
@_option("--density", "kg/m**3", "With --bulk-modulus: in place of --fluid.", required=False)
@_option("--bulk-modulus", "Pa", "Isentropic, of the liquid.", required=False)
@_option("--gas-fraction", "", "Volume share of free gas at the pressure.", default="0")
def pipe(anchorage: str, fluid: str, density: Any, bulk_modulus: Any, temperature: Any, **sizes: Any) -> None:
    """Pressure waves in a liquid-filled pipe."""
    from twlocate.media.speeds import pipe_speed

    if (density is None) != (bulk_modulus is None):
        raise click.UsageError("--density and --bulk-modulus go together; give both, or a --fluid by name")
    given = density is not None
    state = {"density": density, "bulk_modulus": bulk_modulus} if given else {"temperature": temperature}
    with failing_in_one_line():
        found = pipe_speed({**sizes, **state}, anchorage=anchorage, fluid=None if given else fluid)
    _show([found], "Pa*s/m**3")


@speed.command()
@_option("--bore", "m", "Inner diameter.")
@click.option("--mixture", required=True, help='Mole fractions, such as "Methane=0.96 & Ethane=0.04", or one gas.')
@_option("--temperature", "K", "Of the gas.")
@_option("--pressure", "Pa", "Absolute.")
def gas(mixture: str, **inputs: Any) -> None:
    """Pressure waves in a gas pipe (properties need CoolProp)."""
    from twlocate.media.speeds import gas_speed

    with failing_in_one_line():
        found = gas_speed(inputs, fluid=mixture)
    _show([found], "Pa*s/m**3")


@speed.command()
@_option("--core", "m", "Radius of the core.")
@_option("--insulation-in", "m", "Inner radius of the insulation.")
@_option("--insulation-out", "m", "Outer radius of the insulation.")
@_option("--sheath", "m", "Inner radius of the sheath.")
@_option("--permittivity", "", "Relative, of the insulation.")
@_option("--resistance", "ohm/m", "Of the core, direct current.")
@_option("--sheath-resistivity", "ohm*m", "Of the sheath.", default="2.1e-8 ohm*m")
@_option("--frequency", "Hz", "Where most of the wave's energy is.", default="1 MHz")
def cable(frequency: Any, **inputs: Any) -> None:
    """Waves in a single-core cable, sheath bonded at both ends."""
    from twlocate.media.speeds import cable_speed

    names = {
        "core": "core_radius_m",
        "insulation_in": "insulation_inner_m",
        "insulation_out": "insulation_outer_m",
        "sheath": "sheath_inner_m",
        "permittivity": "permittivity",
        "resistance": "core_resistance",
        "sheath_resistivity": "sheath_resistivity",
    }
    with failing_in_one_line():
        found = cable_speed({names[key]: value for key, value in inputs.items()}, frequency_hz=_hertz(frequency))
    _show([found], "ohm")


@speed.command()
@click.option("--phase", "phases", type=place, multiple=True, required=True, help="At the tower; one a phase.")
@click.option("--ground-wire", "wires", type=place, multiple=True, help="At the tower; one a wire.")
@_option("--radius", "m", "Of a phase conductor.")
@_option("--resistance", "ohm/m", "Of a phase conductor, direct current.")
@click.option("--bundle", type=click.IntRange(1, 12), default=1, show_default=True, help="Conductors a phase.")
@_option("--bundle-spacing", "m", "Between neighbours in a bundle.", default="0.4 m")
@_option("--wire-radius", "m", "Of a ground wire.", default="7 mm")
@_option("--wire-resistance", "ohm/m", "Of a ground wire, direct current.", default="0.3 ohm/km")
@_option("--sag", "m", "Of all conductors; its u stands for their height.", default="0 m")
@_option("--earth", "ohm*m", "Resistivity of the ground.", default="100 ohm*m ± 50 ohm*m")
@_option("--frequency", "Hz", "Where most of the wave's energy is.", default="100 kHz")
def line(phases: Any, wires: Any, bundle: int, **q: Any) -> None:
    """Aerial and ground waves on an overhead line, taken as transposed."""
    from twlocate.media.overhead import Conductor
    from twlocate.media.speeds import line_speeds
    from twlocate.quantity import Quantity

    sag, spacing = q["sag"].value, q["bundle_spacing"].value
    radius, resistance = q["radius"].value, q["resistance"].value
    conductors = tuple(Conductor(x, h, radius, resistance, sag, None, bundle, spacing) for x, h in phases)
    ground = tuple(Conductor(x, h, q["wire_radius"].value, q["wire_resistance"].value, sag) for x, h in wires)
    inputs = {
        "earth_resistivity": q["earth"],
        "height_shift": Quantity(0.0, 2 * q["sag"].u / 3),
        "phase_radius": q["radius"],
    }
    with failing_in_one_line():
        found = line_speeds(conductors, ground, inputs, frequency_hz=_hertz(q["frequency"]))
    _show(list(found), "ohm")


@speed.command()
@click.argument("case", type=click.Path(path_type=Path))
@click.option("--at", "place", required=True, help="A node's name, or a distance such as '62.3 km ± 20 m'.")
@click.option("--section", help="Section of the distance, as 'A-B'; needless where there is only one.")
def calibrate(case: Path, place: str, section: str | None) -> None:
    """Estimate section speeds from an event of known origin recorded at two or more ends.

    The recordings of CASE hold the event: an energisation, a valve operation, an external fault, a fault that was
    found. Its clocks must be known.
    """
    from twlocate.calibrating import calibrate as estimate
    from twlocate.calibrating import origin_at
    from twlocate.case import load_case
    from twlocate.quantity import parse_quantity
    from twlocate.reporting.speeds import format_calibrated

    with failing_in_one_line():
        loaded = load_case(case)
        at: Any = place
        if place not in loaded.route.nodes and place[:1].isdigit():
            try:
                at = parse_quantity(place, "m")
            except ValueError as error:
                raise click.BadParameter(str(error), param_hint="--at") from error
        found = estimate(loaded, origin_at(loaded.route, at, section))
    click.echo("\n\n".join(format_calibrated(one) for one in found))


def _hertz(frequency: Any) -> float:
    from twlocate.errors import TwlocateError

    if frequency.value <= 0:
        raise TwlocateError(f"frequency {frequency.value:g} Hz is not positive; say where the wave's energy is")
    return float(frequency.value)


def _show(found: list[Any], impedance_unit: str) -> None:
    from twlocate.reporting.speeds import format_speed

    click.echo("\n\n".join(format_speed(one, impedance_unit) for one in found))
