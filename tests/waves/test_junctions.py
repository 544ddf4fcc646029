"""Reflection and transmission against textbook examples."""

import numpy as np
import pytest

from twlocate.waves import reflection, scattering, split


def test_line_into_a_load():
    # T. Gönen, Electric Power Transmission System Engineering, Ex 7.4 (as worked in the FOSSEE companion)
    rho = reflection(400.0, 500.0).real
    assert rho == pytest.approx(0.1111, abs=5e-5)
    assert 5000 * rho == pytest.approx(555.556, abs=5e-4)
    outgoing, incoming = split([5555.556], [11.1111], 400.0)
    assert (outgoing[0], incoming[0]) == (pytest.approx(5000, abs=0.01), pytest.approx(555.556, abs=0.01))


def test_overhead_line_into_a_cable():
    # Gönen, Ex 7.5 (FOSSEE companion): 200 kV on 400 ohm meets 40 ohm
    s = scattering([400.0, 40.0]).real
    assert s[0, 0] == pytest.approx(-0.8182, abs=5e-5)
    assert 200 * s[1, 0] == pytest.approx(36.36, abs=5e-3)
    assert 200 * s[0, 0] == pytest.approx(-163.64, abs=5e-3)
    assert 200e3 * s[1, 0] / 40 == pytest.approx(909, abs=0.5)


@pytest.mark.parametrize(
    ("l_line", "c_line", "l_cable", "c_cable", "volts", "expected"),
    [
        # FOSSEE companion of Gönen, Ex 8.5: cable to line, then line to cable (kV)
        (1.26e-3, 0.009e-6, 0.189e-3, 0.3e-6, 200.0, (25.15, -174.85, 374.85, 174.85)),
        # FOSSEE companion, second example: 100 kV (kV)
        (2e-3, 0.01e-6, 0.25e-3, 0.102e-6, 100.0, (19.93, -80.07, 180.07, 80.07)),
    ],
)
def test_line_and_cable_both_ways(l_line, c_line, l_cable, c_cable, volts, expected):
    s = volts * scattering([np.sqrt(l_line / c_line), np.sqrt(l_cable / c_cable)]).real
    assert (s[1, 0], s[0, 0], s[0, 1], s[1, 1]) == pytest.approx(expected, abs=0.006)


def test_power_into_a_load():
    # C. L. Wadhwa, Electrical Power Systems, Ex 12.1: 11 kV on 294 ohm meets 1000 ohm; recomputed without rounding
    z = np.sqrt(2e-7 * np.log(100 / 0.75) * 18 * np.log(100 / 0.75) / 1e-9)
    rho = reflection(z, 1000.0).real
    incident = 11e3**2 / z
    assert z == pytest.approx(293.571, abs=5e-4)
    assert incident * rho**2 == pytest.approx(122_922, abs=1)
    assert incident * (1 - rho**2) == pytest.approx(289_244, abs=1)


@pytest.mark.parametrize("branches", [1, 2, 3, 7])
def test_lossless_junction_keeps_the_energy(branches):
    rng = np.random.default_rng(branches)
    z = rng.uniform(20.0, 800.0, branches)
    arriving = rng.normal(size=branches)
    leaving = scattering(z).real @ arriving
    assert np.sum(leaving**2 / z) == pytest.approx(np.sum(arriving**2 / z), rel=1e-12)


def test_shunt_takes_what_the_waves_lose():
    z, resistance = np.array([385.0, 385.0, 120.0]), 15.0
    arriving = np.array([1.0, 0.0, 0.0])
    leaving = scattering(z, 1 / resistance).real @ arriving
    drawn = (arriving + leaving)[0] ** 2 / resistance
    assert np.sum(leaving**2 / z) + drawn == pytest.approx(np.sum(arriving**2 / z), rel=1e-12)


def test_junction_over_frequency_is_reciprocal():
    s = 2j * np.pi * np.logspace(1, 6, 20)
    z = np.array([np.sqrt((1e-3 + s * 1e-6) / (s * 1e-11)), np.full(20, 50.0), np.full(20, 300.0)])
    current = scattering(z, shunt=1e-9 * s) / z[:, None, :]  # sent into branch i by a unit voltage on branch j
    assert np.allclose(current, current.swapaxes(0, 1))


def test_open_end_doubles_and_zero_impedance_is_refused():
    assert reflection(400.0, np.inf) == 1.0
    with pytest.raises(ValueError, match=r"wave impedance 0.*shunt"):
        scattering([50.0, 0.0])


def test_three_way_junction():
    # Wadhwa, Ex 12.3: 100 kV on 600 ohm meets 800 and 200 ohm in parallel; amperes beyond the junction
    s = scattering([600.0, 800.0, 200.0]).real
    assert 100 * s[1, 0] == pytest.approx(42.11, abs=0.006)
    assert (1e5 * s[1, 0] / 800, 1e5 * s[2, 0] / 200) == pytest.approx((52.63, 210.5), abs=0.03)


def test_cable_into_line():
    # Wadhwa, Ex 12.2; the book rounds the impedances to 353 and 27 ohm, hence 0.3 %
    s = scattering([np.sqrt(0.3e-3 / 0.4e-6), np.sqrt(1.5e-3 / 0.012e-6)]).real
    assert 15 * s[1, 0] == pytest.approx(27.91, rel=3e-3)
