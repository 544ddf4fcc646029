"""Measured lines of known length (50 mm, scikit-rf examples): the band must hold the truth and be narrow."""

import pytest
import real_cable

from twlocate.case import load_case
from twlocate.locating import locate

TRUE_LENGTH_M = 0.050
WIDEST_BAND_M = 0.004


@pytest.mark.parametrize(("name", "polarity"), [("open-50mm.s1p", 1), ("short-50mm.s1p", -1)])
def test_true_length_lies_in_a_narrow_band(tmp_path, name, polarity):
    case = load_case(real_cable.write_case(tmp_path, name, real_cable.calibrate()))
    finding = locate(case)
    found = finding.estimate
    assert found is not None
    (piece,) = found.band
    assert case.route.sections[piece.section].name == "line–board edge"
    assert piece.from_m <= TRUE_LENGTH_M <= piece.to_m
    assert piece.to_m - piece.from_m < WIDEST_BAND_M
    launch, echo = finding.observations[0].picks.arrivals[:2]
    assert (launch.polarity, echo.polarity) == (1, polarity)


def test_calibrated_speed_is_that_of_the_readme_of_the_sweeps():
    """1.625e8 m/s is given with the sweeps."""
    calibration = real_cable.calibrate()
    assert calibration.speed == pytest.approx(1.625e8, abs=2 * calibration.u_speed)
