"""Fluid properties against reference tables; needs CoolProp."""

import builtins

import pytest

from twlocate.errors import TwlocateError
from twlocate.media.fluids import fluid_state

CoolProp = pytest.importorskip("CoolProp", reason="CoolProp is not installed (pip install twlocate[fluids])")


@pytest.mark.parametrize(
    ("temperature", "pressure", "density", "speed"),
    # IAPWS Release R6-95, Table 7 (water; K, Pa, kg/m³, m/s)
    [
        (300.0, 0.0992418352e6, 996.556, 1501.51914),
        (300.0, 20.0022515e6, 1005.308, 1534.92501),
        (300.0, 700.004704e6, 1188.202, 2443.57992),
    ],
)
def test_water_of_iapws_95(temperature, pressure, density, speed):
    state = fluid_state("Water", temperature, pressure)
    assert state.density == pytest.approx(density, abs=1e-5)
    assert state.sound_speed == pytest.approx(speed, abs=1e-4)


@pytest.mark.parametrize(("celsius", "speed"), [(5, 1426.170), (20, 1482.380), (40, 1528.894), (80, 1554.486)])
def test_water_against_marczak(celsius, speed):
    # W. Marczak, J. Acoust. Soc. Am. 102, 1997, 2776 (recomputed); the formulations agree within 0.06 m/s
    assert fluid_state("Water", 273.15 + celsius, 101_325.0).sound_speed == pytest.approx(speed, abs=0.06)


@pytest.mark.parametrize(
    ("celsius", "compressibility"), [(10, 0.4776), (20, 0.4559), (50, 0.4253), (80, 0.4258), (99, 0.437)]
)
def test_modulus_is_the_isentropic_one(celsius, compressibility):
    # M. Chaplin, Water Structure and Science, data table: kappa_S, 1/GPa (the handbooks' modulus is isothermal)
    assert 1e9 / fluid_state("Water", 273.15 + celsius, 101_325.0).bulk_modulus == pytest.approx(
        compressibility, abs=6e-4
    )


GULF_COAST = (
    "Methane=.965222&Nitrogen=.002595&CarbonDioxide=.005956&Ethane=.018186&Propane=.004596"
    "&IsoButane=.000977&n-Butane=.001007&Isopentane=.000473&n-Pentane=.000324&n-Hexane=.000664"
)
PSI, FOOT, ATMOSPHERE = 6894.757, 0.3048, 101_325.0


@pytest.mark.parametrize(
    ("psig", "fahrenheit", "feet_per_s"),
    [(200, 30, 1351.1), (200, 60, 1394.4), (200, 120, 1473.4), (500, 30, 1321.6), (500, 120, 1461.9)],
)
def test_natural_gas_of_aga_report_10(psig, fahrenheit, feet_per_s):
    # AGA Report No. 10 (2003), sample table for Gulf Coast gas (composition from memory; reproduces it to 0.03 %)
    state = fluid_state(GULF_COAST, (fahrenheit - 32) / 1.8 + 273.15, psig * PSI + ATMOSPHERE)
    assert state.sound_speed / FOOT == pytest.approx(feet_per_s, rel=4e-4)


def test_gerg_2008_check_mixture():
    # NIST reference code for AGA Report No. 8, GERG-2008, 400 K, 50 MPa: 714.4248840596024 m/s
    names = (
        "Methane=.77824&Nitrogen=.02&CarbonDioxide=.06&Ethane=.08&Propane=.03&IsoButane=.0015&n-Butane=.003"
        "&Isopentane=.0005&n-Pentane=.00165&n-Hexane=.00215&n-Heptane=.00088&n-Octane=.00024&n-Nonane=.00015"
        "&n-Decane=.00009&Hydrogen=.004&Oxygen=.005&CarbonMonoxide=.002&Water=.0001&HydrogenSulfide=.0025"
        "&Helium=.007&Argon=.001"
    )
    assert fluid_state(names, 400.0, 50e6).sound_speed == pytest.approx(714.42488, rel=2e-4)


def test_air_at_20_degrees():
    # ISO 9613-1, A.5: 343.2 m/s
    assert fluid_state("Air", 293.15, 101_325.0).sound_speed == pytest.approx(343.2, abs=0.2)


@pytest.mark.parametrize(
    ("fluid", "message"),
    [
        ("Watter", "'Watter'.*check the name"),
        ("Methane&Ethane", "without a number"),
        ("Methane=-1&Ethane=2", "negative"),
    ],
)
def test_fluids_that_cannot_be_are_refused(fluid, message):
    with pytest.raises(TwlocateError, match=message):
        fluid_state(fluid, 300.0, 1e5)


def test_missing_library_is_named(monkeypatch):
    real = builtins.__import__

    def without(name, *args, **kwargs):
        if name == "CoolProp":
            raise ImportError(name)
        return real(name, *args, **kwargs)

    monkeypatch.setattr(builtins, "__import__", without)
    with pytest.raises(TwlocateError, match=r"pip install twlocate\[fluids\]"):
        fluid_state("Water", 300.0, 1e5)
