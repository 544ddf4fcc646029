"""Section speeds: sensitivities in closed form, and what each input does."""

import numpy as np
import pytest

from twlocate.errors import TwlocateError
from twlocate.media.overhead import Conductor
from twlocate.media.speeds import cable_speed, line_speeds, pipe_speed
from twlocate.quantity import Quantity

WATER = {"density": Quantity(1000.0), "bulk_modulus": Quantity(2.1e9)}
STEEL = {
    "bore": Quantity(0.6),
    "wall": Quantity(0.012, 0.0004),
    "young": Quantity(200e9, 4e9),
    "poisson": Quantity(0.3),
    "pressure": Quantity(6e5),
    "gas_fraction": Quantity(0.0),
}


def pipe(**changed):
    return pipe_speed({**WATER, **STEEL, **changed}, anchorage="throughout", fluid=None)


def test_young_and_bulk_modulus_share_what_theory_says():
    # a² = (K/ρ)/(1 + φ), φ = K·D·c₁/(E·e): ∂ln a/∂ln E = φ/(2(1 + φ)), ∂ln a/∂ln K = 1/(2(1 + φ))
    found = pipe(wall=Quantity(0.012), bulk_modulus=Quantity(2.1e9, 0.02e9))
    phi = 2.1e6 / found.speed.quantity.value**2 - 1
    sizes = {row.name: row.size / found.speed.quantity.value for row in found.speed.contributions}
    assert sizes["young"] == pytest.approx(phi / (2 * (1 + phi)) * 4 / 200, rel=1e-3)
    assert sizes["bulk_modulus"] == pytest.approx(1 / (2 * (1 + phi)) * 0.02 / 2.1, rel=1e-3)


def test_impedance_is_density_times_speed_over_area():
    found = pipe()
    area = np.pi * 0.3**2
    assert found.impedance.quantity.value == pytest.approx(1000.0 * found.speed.quantity.value / area)
    assert found.impedance.quantity.u / found.impedance.quantity.value == pytest.approx(
        found.speed.quantity.u / found.speed.quantity.value, rel=1e-6
    )


def test_a_little_gas_slows_the_wave_a_lot():
    # A. B. Wood: compliances add; one part in a thousand at 6 bar adds 1/6e8 to 1/K
    without, with_gas = pipe(), pipe(gas_fraction=Quantity(1e-3))
    before, after = (one.speed.quantity.value for one in (without, with_gas))
    assert 1 / after**2 - 1 / before**2 == pytest.approx(1000.0 * 1e-3 / 6e5, rel=2e-3)


def test_thicker_walls_and_smaller_bores_are_faster():
    assert pipe(wall=Quantity(0.02)).speed.quantity.value > pipe().speed.quantity.value
    assert pipe(bore=Quantity(0.3)).speed.quantity.value > pipe().speed.quantity.value


def test_line_of_one_conductor_has_a_ground_mode_alone():
    wire = (Conductor(0.0, 12.0, 0.01, 1e-4),)
    inputs = {
        "earth_resistivity": Quantity(100.0),
        "height_shift": Quantity(0.0, 0.5),
        "phase_radius": Quantity(0.01),
    }
    (found,) = line_speeds(wire, (), inputs, frequency_hz=1e5)
    assert found.wave == "ground"
    # a thin wire over ground: 60·ln(2h/r) without loss (60 = µ₀c/2π)
    assert found.impedance.quantity.value == pytest.approx(59.96 * np.log(2 * 12 / 0.01), rel=0.05)


def test_bundles_lower_the_impedance():
    def aerial(bundle):
        phases = tuple(Conductor(x, 20.0, 0.014, 5e-5, 0.0, None, bundle, 0.4) for x in (-8.0, 0.0, 8.0))
        inputs = {
            "earth_resistivity": Quantity(100.0),
            "height_shift": Quantity(0.0),
            "phase_radius": Quantity(0.014),
        }
        return line_speeds(phases, (), inputs, frequency_hz=1e5)[0].impedance.quantity.value

    assert aerial(1) > aerial(2) > aerial(4)


def test_cable_speed_goes_as_the_root_of_permittivity():
    def speed(permittivity):
        inputs = {
            "core_radius_m": Quantity(0.010),
            "insulation_inner_m": Quantity(0.011),
            "insulation_outer_m": Quantity(0.018),
            "sheath_inner_m": Quantity(0.019),
            "permittivity": Quantity(permittivity),
            "core_resistance": Quantity(5e-5),
            "sheath_resistivity": Quantity(2e-8),
        }
        return cable_speed(inputs, frequency_hz=1e6).speed.quantity.value

    assert speed(2.3) / speed(4 * 2.3) == pytest.approx(2.0, rel=1e-9)


def test_uncertainty_that_reaches_zero_is_refused():
    with pytest.raises(TwlocateError, match=r"wall 0.012 ± 0.02 .* must be above 0"):
        pipe(wall=Quantity(0.012, 0.02))
