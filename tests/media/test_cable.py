"""Coaxial cables: published speeds, and the limits of the formulas."""

import numpy as np
import pytest

from twlocate.media import cable
from twlocate.media.cable import Coaxial

C = 299_792_458.0


def coaxial(permittivity, screen_m=0.0):
    return Coaxial(0.010, 0.010 + screen_m, 0.018, 0.018 + screen_m, permittivity, 5e-5, 1.7e-8)


@pytest.mark.parametrize(("permittivity", "metres_per_us"), [(2.21, 200.9), (2.88, 175.9)])
def test_speed_of_polymer_cables(permittivity, metres_per_us):
    # W. A. Thue (ed.), Electrical Power Cable Engineering, §20.7: TR-XLPE 200.9, EPR 175.9 m/µs at 1/√ε of 0.670 and
    # 0.587; the permittivities follow from these (1/0.670² = 2.23, 1/0.587² = 2.90) less the skin effect's part
    s = np.array([2j * np.pi * 1e6])
    speed = s.imag / cable.gamma(coaxial(permittivity), s).imag
    assert speed[0] / 1e6 == pytest.approx(metres_per_us, rel=0.01)


def test_perfect_conductors_leave_the_speed_of_light_in_the_insulation():
    ideal = Coaxial(0.010, 0.010, 0.018, 0.018, 2.3, 1e-16, 1e-20)
    s = np.array([2j * np.pi * 1e7])
    assert s.imag[0] / cable.gamma(ideal, s).imag[0] == pytest.approx(C / np.sqrt(2.3), rel=1e-4)
    assert cable.surge_impedance(ideal, s).real[0] == pytest.approx(59.96 / np.sqrt(2.3) * np.log(1.8), rel=1e-3)


def test_semiconducting_screens_slow_the_wave_by_the_ratio_of_logarithms():
    ideal = Coaxial(0.010, 0.011, 0.018, 0.019, 2.3, 1e-16, 1e-20)
    s = np.array([2j * np.pi * 1e7])
    slowed = C / np.sqrt(2.3 * np.log(1.9) / np.log(18 / 11))
    assert s.imag[0] / cable.gamma(ideal, s).imag[0] == pytest.approx(slowed, rel=1e-4)


def test_skin_effect_grows_with_the_square_root_of_frequency():
    s = 2j * np.pi * np.array([1e6, 4e6])
    loss = cable.gamma(coaxial(2.3), s).real
    assert loss[1] / loss[0] == pytest.approx(2.0, rel=0.02)
