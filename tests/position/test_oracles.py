"""The textbook formulas as oracles for the estimator.

P1, P2: negative-pressure-wave location with flow, as widely printed; numbers derived (D), not published.
E1-E8: time-of-flight cases of the two-ended, one-ended, mixed-line and three-terminal methods; numbers derived
from the published formulas (IEEE Std C37.114-2014 and L. V. Bewley, Traveling Waves on Transmission Systems,
1951; both from memory).
"""

import numpy as np
import pytest

from twlocate.position import Reading, Station, estimate
from twlocate.quantity import Quantity
from twlocate.routes import Route, Section

MICRO = 1e-6
MILLIMETRE = 1e-3


def line(length=200e3, speed=2.94e8, u_length=0.0, u_speed=0.0):
    return Route((Section("A", "B", Quantity(length, u_length), Quantity(speed, u_speed)),))


def two_ended(route, t_a, t_b, u=1e-7, clock=Quantity(0.0)):
    stations = [Station("A"), Station("B", clock=clock)]
    return estimate(route, stations, [Reading(0, t_a, u), Reading(1, t_b, u)])


def test_e1_two_ended():
    found = two_ended(line(), 250.000 * MICRO, 430.2721088 * MICRO)
    assert found.point.distance_m == pytest.approx(73_500.0, abs=0.02)  # the arrivals are given to 0.1 ns = 15 mm


def test_e1_exactly():
    found = two_ended(line(), 73_500.0 / 2.94e8, 126_500.0 / 2.94e8)
    assert found.point.distance_m == pytest.approx(73_500.0, abs=MILLIMETRE)


def test_e2_e3_one_ended_pulse_and_far_end():
    t2, t3 = 2 * 73_500.0 / 2.94e8, 2 * 200e3 / 2.94e8
    readings = [Reading(0, 0.0, 1e-8), Reading(0, t2, 1e-8), Reading(0, t3, 1e-8)]
    found = estimate(line(), [Station("A", None, launches=True)], readings)
    assert found.point.distance_m == pytest.approx(73_500.0, abs=MILLIMETRE)
    assert found.fits[1].path == "echo of the event"
    assert found.fits[2].path == "echo of B"


def test_e4_far_end_echo_calibrates_the_speed():
    """With a poorly known speed the echoes of event and far end give x = L·t2/t3, whatever the speed."""
    t2, t3 = 2 * 73_500.0 / 2.94e8, 2 * 200e3 / 2.94e8
    route = line(speed=2.90e8, u_speed=4e6)
    readings = [Reading(0, 0.0, 1e-9), Reading(0, t2, 1e-9), Reading(0, t3, 1e-9)]
    found = estimate(route, [Station("A", None, launches=True)], readings)
    assert found.point.distance_m == pytest.approx(200e3 * t2 / t3, abs=1.0)  # slowness is taken as linear in speed
    assert found.point.u_m < 1.0


LOW = {"reflects": -1}
"""A low-impedance bus: the event's echo has the sign of the first front, the far end's the other."""


def test_e3_e4_one_end_that_only_listens():
    """The event's own echo behind the first front at 2x/v, the far end's at 2(L − x)/v: x = L·d1/(d1 + d2)."""
    x, v = 73_500.0, 2.94e8
    again, far = 2 * x / v, 2 * (200e3 - x) / v
    route = line(speed=2.90e8, u_speed=4e6)
    readings = [Reading(0, 0.0, 1e-8, 0.0, 1), Reading(0, again, 1e-8, 0.0, 1), Reading(0, far, 1e-8, 0.0, -1)]
    found = estimate(route, [Station("A", None, **LOW), Station("B", None, **LOW)], readings)
    assert found.point.distance_m == pytest.approx(200e3 * again / (again + far), abs=2.0)
    assert {fit.path for fit in found.fits.values()} == {"direct", "direct, and again by the event", "by B"}


def test_one_end_that_only_listens_cannot_tell_the_mirror_image_without_signs():
    again, far = 2 * 73_500.0 / 2.94e8, 2 * 126_500.0 / 2.94e8
    readings = [Reading(0, 0.0, 1e-8), Reading(0, again, 1e-8), Reading(0, far, 1e-8)]
    found = estimate(line(), [Station("A", None)], readings)
    places = sorted(row.point.distance_m for row in found.alternatives[:2])
    assert places == pytest.approx([73_500.0, 126_500.0], abs=5.0)
    assert [row.probability for row in found.alternatives[:2]] == pytest.approx([0.5, 0.5], abs=0.02)
    assert not found.in_one_run


@pytest.mark.parametrize("offset", [0.0, 20e-6, 1.0])
def test_e5_two_ends_without_a_common_clock(offset):
    """x = L·dA/(dA + dB) from the event's own echoes, whatever the clocks and the speed."""
    d_a, d_b = 500.000 * MICRO, 860.5442177 * MICRO
    route = line(speed=2.90e8, u_speed=4e6)
    times = [(0, 0.0), (0, d_a), (1, offset), (1, offset + d_b)]
    readings = [Reading(station, time, 1e-8, 0.0, 1) for station, time in times]
    found = estimate(route, [Station("A", None, **LOW), Station("B", None, **LOW)], readings)
    assert found.point.distance_m == pytest.approx(73_500.0, abs=2.0)  # slowness is taken as linear in speed


@pytest.mark.parametrize(("change", "shift"), [(1e-3, -26.5), (1e-2, -265.0)])
def test_e6_speed_sensitivity(change, shift):
    t_a, t_b = 73_500.0 / 2.94e8, 126_500.0 / 2.94e8
    found = two_ended(line(speed=2.94e8 * (1 + change)), t_a, t_b)
    assert found.point.distance_m - 73_500.0 == pytest.approx(shift, abs=0.05)


def test_e6_clock_sensitivity():
    t_a, t_b = 73_500.0 / 2.94e8, 126_500.0 / 2.94e8
    late = two_ended(line(), t_a, t_b, clock=Quantity(1e-6))
    assert late.point.distance_m - 73_500.0 == pytest.approx(147.0, abs=MILLIMETRE)


@pytest.mark.parametrize(
    ("dt_us", "section", "distance"), [(-148.5524442, 0, 30e3), (84.5989559, 1, 2.5e3), (230.1850973, 2, 12e3)]
)
def test_e7_mixed_line(dt_us, section, distance):
    route = Route(
        (
            Section("A", "J", Quantity(60e3), Quantity(2.94e8)),
            Section("J", "K", Quantity(8e3), Quantity(1.72e8)),
            Section("K", "B", Quantity(30e3), Quantity(2.94e8)),
        )
    )
    found = two_ended(route, dt_us * MICRO, 0.0, u=1e-9)
    assert found.point.section == section
    assert found.point.distance_m == pytest.approx(distance, abs=0.02)  # dt is given to 0.1 ns


def test_e8_three_terminals():
    route = Route(
        (
            Section("A", "T", Quantity(80e3), Quantity(2.94e8)),
            Section("B", "T", Quantity(50e3), Quantity(2.94e8)),
            Section("C", "T", Quantity(30e3), Quantity(2.94e8)),
        )
    )
    stations = [Station("A"), Station("B"), Station("C")]
    times = (374.1496599, 68.0272109, 204.0816327)
    found = estimate(route, stations, [Reading(i, t * MICRO, 1e-8) for i, t in enumerate(times)])
    assert (found.point.section, found.point.distance_m) == (1, pytest.approx(20e3, abs=0.05))
    pair = estimate(
        route, [stations[0], stations[2]], [Reading(0, times[0] * MICRO, 1e-8), Reading(1, times[2] * MICRO, 1e-8)]
    )
    # A and C alone point to the tee, which is to say: anywhere beyond it (a uniform density: mean L/2, u = L/√12)
    assert (pair.point.section, pair.point.distance_m) == (1, pytest.approx(25e3, rel=1e-3))
    assert pair.point.u_m == pytest.approx(50e3 / 12**0.5, rel=1e-3)
    assert pair.in_one_run


def pipe(length, speed, flow):
    return Route((Section("up", "down", Quantity(length), Quantity(speed), Quantity(flow)),))


@pytest.mark.parametrize(
    ("length", "speed", "flow", "x", "ignored"),
    [(50e3, 1000.0, 2.0, 18e3, 18_049.972), (80e3, 380.0, 12.0, 30e3, 31_254.437)],
    ids=["P1 liquid", "P2 gas"],
)
def test_p1_p2_flow(length, speed, flow, x, ignored):
    t1, t2 = x / (speed - flow), (length - x) / (speed + flow)
    stations = [Station("up"), Station("down")]
    readings = [Reading(0, t1, 1e-4), Reading(1, t2, 1e-4)]
    found = estimate(pipe(length, speed, flow), stations, readings)
    assert found.point.distance_m == pytest.approx(x, abs=MILLIMETRE)
    closed_form = (length * (speed - flow) + (speed**2 - flow**2) * (t1 - t2)) / (2 * speed)
    assert found.point.distance_m == pytest.approx(closed_form, abs=MILLIMETRE)
    without = estimate(pipe(length, speed, 0.0), stations, readings)
    assert without.point.distance_m == pytest.approx(ignored, abs=0.001)


def test_p1_printed_arrival_times():
    readings = [Reading(0, 18.036072144, 1e-4), Reading(1, 31.936127745, 1e-4)]
    found = estimate(pipe(50e3, 1000.0, 2.0), [Station("up"), Station("down")], readings)
    assert found.point.distance_m == pytest.approx(18_000.0, abs=MILLIMETRE)


def test_swapping_the_ends_and_the_flow_mirrors_the_answer():
    readings = [Reading(0, 18.036072144, 1e-3), Reading(1, 31.936127745, 1e-3)]
    there = estimate(pipe(50e3, 1000.0, 2.0), [Station("up"), Station("down")], readings)
    mirrored = Route((Section("down", "up", Quantity(50e3), Quantity(1000.0), Quantity(-2.0)),))
    back = estimate(mirrored, [Station("up"), Station("down")], readings)
    assert back.point.distance_m == pytest.approx(50e3 - there.point.distance_m, abs=MILLIMETRE)
    assert back.band[0].from_m == pytest.approx(50e3 - there.band[0].to_m, abs=1e-2)


def test_a_common_shift_of_both_clocks_changes_nothing():
    one = two_ended(line(), 1e-3, 1.1e-3)
    other = two_ended(line(), 5e-3, 5.1e-3)
    assert other.point.distance_m == pytest.approx(one.point.distance_m, abs=MILLIMETRE)


def test_budget_is_the_root_sum_of_squares_of_the_two_ended_formula():
    """dx = sqrt((v/2)²·Σu_t² + (|2x−L|/2·u_v/v)² + (u_L/2)²), the GUM sum for x = (L + v·dt)/2."""
    route = line(length=100e3, speed=2.94e8, u_length=150.0, u_speed=0.003 * 2.94e8)
    x, u = 10e3, 0.3e-6
    stations = [Station("A", Quantity(0.0, 0.1e-6)), Station("B", Quantity(0.0, 0.1e-6))]
    found = estimate(route, stations, [Reading(0, x / 2.94e8, u), Reading(1, 90e3 / 2.94e8, u)])
    of_times = 2.94e8 / 2 * np.sqrt(2 * u**2 + 2 * 0.1e-6**2)
    expected = np.sqrt(of_times**2 + (80e3 / 2 * 0.003) ** 2 + 75.0**2)
    assert found.point.u_m == pytest.approx(expected, rel=1e-3)
    assert np.sqrt(sum(row.metres**2 for row in found.budget)) == pytest.approx(found.point.u_m, rel=1e-6)
    assert found.budget[0].input == "wave speed of A–B"
