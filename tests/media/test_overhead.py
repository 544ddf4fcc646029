"""Line constants against published matrices, modes against the speed of light."""

import dataclasses

import numpy as np
import pytest

from twlocate.media import overhead
from twlocate.media.overhead import Conductor
from twlocate.waves import eigenmodes

FOOT, MILE = 0.3048, 1609.344
OMEGA_60 = 2 * np.pi * 60


def feet(x, height, radius, gmr, ohm_per_mile):
    return Conductor(x * FOOT, height * FOOT, radius * FOOT, ohm_per_mile / MILE, gmr_m=gmr * FOOT)


def kersting(height, neutral_height):
    phases = [feet(x, height, 0.721 / 24, 0.0244, 0.306) for x in (0.0, 2.5, 7.0)]
    return (*phases, feet(4.0, neutral_height, 0.563 / 24, 0.00814, 0.592))


def reduced(conductors, omega=OMEGA_60):
    s = np.array([1j * omega])
    z = overhead.series_impedance(conductors, s, 100.0, earth="carson")
    return overhead.without_ground_wires(z, overhead.shunt_admittance(conductors, s), 3)


def test_kersting_example_4_1():
    # W. H. Kersting, Distribution System Modeling and Analysis, 3rd ed., Ex 4.1, ohm/mile
    z = reduced(kersting(29.0, 25.0))[0][0] * MILE
    printed = [
        [0.4576 + 1.0780j, 0.1560 + 0.5017j, 0.1535 + 0.3849j],
        [0.1560 + 0.5017j, 0.4666 + 1.0482j, 0.1580 + 0.4236j],
        [0.1535 + 0.3849j, 0.1580 + 0.4236j, 0.4615 + 1.0651j],
    ]
    assert np.abs(z - printed).max() < 2e-4


def test_primitive_matrix_of_kersting():
    # the same, before the neutral is taken out
    z = overhead.series_impedance(kersting(29.0, 25.0), np.array([1j * OMEGA_60]), 100.0, earth="carson")[0] * MILE
    assert z[0, 0] == pytest.approx(0.4013 + 1.4133j, abs=2e-4)
    assert z[3, 3] == pytest.approx(0.6873 + 1.5465j, abs=2e-4)
    assert z[[0, 0, 1, 0, 1, 2], [1, 2, 2, 3, 3, 3]].imag == pytest.approx(
        [0.8515, 0.7266, 0.7802, 0.7524, 0.7865, 0.7674], abs=2e-4
    )


@pytest.mark.parametrize(
    ("heights", "printed"),
    [
        # IEEE 123-node test feeder, configuration 1, B in µS/mile; and the same conductors at the heights of Ex 4.1
        ((28.0, 24.0), (5.6765, 5.9809, 5.3971, -1.8319, -0.6982, -1.1645)),
        ((29.0, 25.0), (5.6711, 5.9774, 5.3910, None, None, None)),
    ],
)
def test_susceptance_of_the_123_node_feeder(heights, printed):
    # the feeder's constant of 11.17689 mile/µF stands for 1/(2πε₀) = 11.16922 mile/µF
    b = 11.16922 / 11.17689 * 1e6 * reduced(kersting(*heights))[1][0].imag * MILE
    found = [*np.diag(b), b[0, 1], b[0, 2], b[1, 2]]
    for value, expected in zip(found, printed, strict=True):
        assert expected is None or value == pytest.approx(expected, rel=1e-4)


def test_configuration_601_of_the_13_node_feeder():
    # IEEE 13-node test feeder, 601: phases b, a, c at 0, 2.5 and 7 ft; ohm/mile
    phases = [feet(x, 29.0, 0.927 / 24, 0.0313, 0.1859) for x in (2.5, 0.0, 7.0)]
    z = reduced((*phases, feet(4.0, 25.0, 0.563 / 24, 0.00814, 0.592)))[0][0] * MILE
    assert [z[0, 0], z[0, 1], z[0, 2], z[1, 1], z[1, 2], z[2, 2]] == pytest.approx(
        [0.3465 + 1.0179j, 0.1560 + 0.5017j, 0.1580 + 0.4236j, 0.3375 + 1.0478j, 0.1535 + 0.3849j, 0.3414 + 1.0348j],
        abs=2e-4,
    )


def test_sequence_impedances_of_kersting_example_4_1():
    # the same book: Z012 of the line of Ex 4.1, ohm/mile
    a = np.exp(2j * np.pi / 3)
    sequence = np.array([[1, 1, 1], [1, a**2, a], [1, a, a**2]])
    z012 = np.linalg.inv(sequence) @ (reduced(kersting(29.0, 25.0))[0][0] * MILE) @ sequence
    assert z012[0, 0] == pytest.approx(0.7735 + 1.9373j, abs=2e-4)
    assert z012[1, 1] == pytest.approx(0.3061 + 0.6270j, abs=2e-4)
    assert z012[2, 1] == pytest.approx(0.0723 - 0.0059j, abs=2e-4)


def test_complex_depth_beside_carson():
    # Deri et al., IEEE PAS-100, 1981, against modified Carson: 1.7 % in the resistance, 0.8 % in the reactance
    wire = (feet(0.0, 28.0, 0.0313, 0.0313, 0.0),)
    s = np.array([1j * OMEGA_60])
    deri, carson = (
        overhead.series_impedance(wire, s, 100.0, earth=earth)[0, 0, 0] * MILE for earth in ("complex depth", "carson")
    )
    assert deri == pytest.approx(0.09373 + 1.39404j, abs=1e-4)
    assert carson == pytest.approx(0.0953 + 1.38305j, abs=1e-4)


def test_skin_effect_limits():
    radius, resistance = 0.014, 6e-5
    low = overhead.skin_impedance(np.array([1e-3j]), radius, resistance)[0]
    assert low.real == pytest.approx(resistance, rel=1e-9)
    assert low.imag / 1e-3 == pytest.approx(overhead.MU_0 / (8 * np.pi), rel=1e-6)  # the inside of a solid wire
    s = np.array([2j * np.pi * 1e6])
    depth = np.sqrt(2 * resistance * np.pi * radius**2 / (2 * np.pi * 1e6 * overhead.MU_0))
    high = overhead.skin_impedance(s, radius, resistance)[0]
    assert high.real == pytest.approx(resistance * radius / (2 * depth), rel=0.02)


TOWER = (
    *(Conductor(x, 24.0, 0.0143, 5.5e-5, sag_m=9.0) for x in (-7.5, 0.0, 7.5)),
    Conductor(-5.0, 31.0, 0.0075, 2.5e-4, sag_m=7.0),
    Conductor(5.0, 31.0, 0.0075, 2.5e-4, sag_m=7.0),
)


def test_one_slow_ground_mode_and_two_aerial_modes_near_c():
    f = np.array([1e4, 1e5, 1e6])
    speeds = np.sort(overhead.modal_speeds(overhead.line_modes(TOWER, f, 100.0, 3), f), axis=1) / 299_792_458.0
    assert (speeds[:, 1:] > 0.985).all()
    assert (speeds < 1).all()
    assert (speeds[:, 0] < speeds[:, 1] - 0.005).all()
    assert (np.diff(speeds[:, 0]) > 0).all()  # the earth's part shrinks as frequency rises


def test_shape_does_not_depend_on_scale():
    # lossless limit: P depends on ratios of lengths alone
    bigger = tuple(
        dataclasses.replace(c, x_m=2 * c.x_m, height_m=2 * c.height_m, sag_m=2 * c.sag_m, radius_m=2 * c.radius_m)
        for c in TOWER
    )
    s = np.array([1j])
    assert np.allclose(overhead.shunt_admittance(bigger, s), overhead.shunt_admittance(TOWER, s), rtol=1e-12)


def test_bundle_of_two_is_the_geometric_mean():
    c = Conductor(0.0, 20.0, 0.0143, 5.5e-5, bundle=2, bundle_spacing_m=0.4)
    assert c.bundled(c.radius_m) == pytest.approx(np.sqrt(0.0143 * 0.4))


def test_conductor_is_longer_than_the_map():
    # exact catenary of parameter w: length 2w·sinh(span/2w), sag w(cosh(span/2w) − 1)
    w, span = 1500.0, 350.0
    sag = w * (np.cosh(span / 2 / w) - 1)
    assert overhead.conductor_length(span, sag) == pytest.approx(2 * w * np.sinh(span / 2 / w), rel=5e-6)


def test_impossible_lines_are_refused():
    s = np.array([1j])
    with pytest.raises(ValueError, match="above the ground"):
        overhead.series_impedance((Conductor(0.0, 5.0, 0.01, 1e-4, sag_m=9.0),), s, 100.0)
    with pytest.raises(ValueError, match="'flat' is unknown; choose one of complex depth, carson"):
        overhead.series_impedance(TOWER, s, 100.0, earth="flat")


def test_concentric_neutral_cables_of_the_13_node_feeder():
    # IEEE 13-node test feeder, 606: three cables 6 in apart; the neutral strands of each stand for one conductor at the
    # radius R = 0.05108 ft around its core (GMR 0.04864 ft, 1.1440 ohm/mile); ohm/mile
    cores = [feet(x, 20.0, 0.0171, 0.0171, 0.4100) for x in (0.0, 0.5, 1.0)]
    neutrals = [feet(x, 20.0 + 0.05108, 0.04864, 0.04864, 1.1440) for x in (0.0, 0.5, 1.0)]
    z = reduced((*cores, *neutrals))[0][0] * MILE
    assert [z[0, 0], z[0, 1], z[0, 2], z[1, 1]] == pytest.approx(
        [0.7982 + 0.4463j, 0.3192 + 0.0328j, 0.2849 - 0.0143j, 0.7891 + 0.4041j], abs=3e-3
    )


def test_modal_speeds_of_a_distribution_line():
    # from Z of Kersting's Ex 4.1 and B of the 123-node feeder at 60 Hz: 0.796, 0.944 and 0.959 of the speed of light
    # (recomputed; the heights of the two differ by one foot, as published)
    z, y = reduced(kersting(29.0, 25.0))[0], reduced(kersting(28.0, 24.0))[1]
    speeds = np.sort(OMEGA_60 / eigenmodes(z, y).gamma.imag[0]) / 299_792_458.0
    assert speeds == pytest.approx([0.796, 0.944, 0.959], abs=2e-3)


def test_impedance_matrices_are_symmetric_and_passive():
    s = np.array([1e3 + 2j * np.pi * f for f in (50.0, 1e4, 1e6)])
    z, y = overhead.phase_matrices(TOWER, s, 100.0, 3)
    for matrix in (z, y):
        assert np.allclose(matrix, matrix.swapaxes(1, 2), rtol=1e-9)
        assert (np.linalg.eigvalsh(matrix.real) > 0).all()


@pytest.mark.parametrize("resistivity", [10.0, 1000.0])
def test_poor_earth_slows_the_ground_mode_more(resistivity):
    f = np.array([1e5])
    speeds, reference = (
        np.sort(overhead.modal_speeds(overhead.line_modes(TOWER, f, rho, 3), f)[0]) for rho in (resistivity, 100.0)
    )
    assert (speeds[0] < reference[0]) == (resistivity > 100.0)
    assert abs(speeds[2] / reference[2] - 1) < 0.005
