"""The estimator where digits run short, where a branch cannot be seen, and where there is much to attribute."""

import dataclasses
import time

import numpy as np
import pytest

from twlocate.errors import NoPosition
from twlocate.position import Reading, Station, estimate
from twlocate.position.band import band_length
from twlocate.quantity import Quantity
from twlocate.routes import Route, Section, direct_path, echo_path, node_echo_path, travel_time

V = 2.94e8
TEE = (("A", "T", 80e3), ("B", "T", 50e3), ("C", "T", 30e3))


def line(length=Quantity(100e3), speed=Quantity(V)):
    return Route((Section("A", "B", length, speed),))


def two_ends(route, x, u, zero_s=0.0):
    length, speed = route.length_m, route.sections[0].speed.value
    times = (zero_s + x / speed, zero_s + (length - x) / speed)
    return estimate(route, [Station("A"), Station("B")], [Reading(i, t, u) for i, t in enumerate(times)])


def tee(sections=TEE, speed=Quantity(V, 1e6)):
    return Route(tuple(Section(a, b, Quantity(m, 1e-3 * m), speed) for a, b, m in sections))


def run_s(route, path, x=0.0):
    run = travel_time(route, path)
    return run.constant_s + run.per_metre * x


def at_nodes(route, nodes, section, x, u=3e-7):
    readings = [Reading(i, run_s(route, direct_path(route, section, n), x), u) for i, n in enumerate(nodes)]
    return estimate(route, [Station(node) for node in nodes], readings)


# ---------------------------------------------------------------- digits


@pytest.mark.parametrize("zero_s", [1.0, 1e3, 1e6, 1e9])
def test_the_zero_of_the_times_does_not_matter(zero_s):
    """What is left is the last digit of the stamps: ε·t·v/2 at each end."""
    found, later = two_ends(line(), 30e3, 3e-7), two_ends(line(), 30e3, 3e-7, zero_s)
    digit_m = np.spacing(zero_s) * V
    assert later.point.distance_m == pytest.approx(30e3, abs=digit_m + 1e-6)
    assert later.point.u_m == pytest.approx(found.point.u_m, rel=1e-12)
    assert band_length(later.band) == pytest.approx(band_length(found.band), rel=1e-6)


@pytest.mark.parametrize("u", [1e-9, 1e-12, 1e-15, 1e-20])
def test_readings_that_are_all_but_exact(u):
    found = two_ends(line(), 30e3, u)
    assert found.point.distance_m == pytest.approx(30e3, abs=1e-3)
    assert len(found.band) == 1
    assert band_length(found.band) < max(4 * found.point.u_m, 1e-3)


@pytest.mark.parametrize("speed", [V, 1e3, 1.0, 1e-3])
def test_a_length_known_far_worse_than_the_times(speed):
    """u(x) = u(L)/2 for x = (L + v·Δt)/2, whatever the ratio of the uncertainties."""
    found = two_ends(line(length=Quantity(100e3, 1e3), speed=Quantity(speed)), 30e3, 1e-9)
    assert found.point.distance_m == pytest.approx(30e3, abs=1e-3)
    assert found.point.u_m == pytest.approx(500.0, rel=1e-3)


@pytest.mark.parametrize("scale", [1e-6, 1e-3, 1e3])
def test_a_route_in_another_scale_gives_the_same_answer_in_that_scale(scale):
    base = two_ends(line(length=Quantity(100e3, 50.0)), 30e3, 3e-7)
    scaled = two_ends(line(length=Quantity(100e3 * scale, 50.0 * scale)), 30e3 * scale, 3e-7 * scale)
    assert scaled.point.distance_m / scale == pytest.approx(base.point.distance_m, rel=1e-9)
    assert band_length(scaled.band) / scale == pytest.approx(band_length(base.band), rel=1e-6)


@pytest.mark.parametrize(("t", "u"), [(0.0, 0.0), (0.0, -1e-9), (np.nan, 1e-9), (np.inf, 1e-9), (0.0, np.nan)])
def test_refuses_a_reading_that_is_no_time(t, u):
    with pytest.raises(ValueError, match=r"reading 0: .* is no arrival time; give a finite time and an uncertainty"):
        estimate(line(), [Station("A"), Station("B")], [Reading(0, t, u), Reading(1, 0.0, 1e-9)])


# ---------------------------------------------------------------- tees


@pytest.mark.parametrize(
    ("nodes", "section", "length"), [("AT", 1, 50e3), ("AC", 1, 50e3), ("ACT", 1, 50e3), ("TB", 0, 80e3)]
)
def test_a_branch_without_a_terminal_is_one_plateau(nodes, section, length):
    """Nothing says where on it: the position is its middle, its uncertainty that of a uniform density, L/√12."""
    found = at_nodes(tee(), nodes, section, 0.4 * length)
    assert found.point.section == section
    assert found.point.distance_m == pytest.approx(length / 2, rel=2e-3)
    assert isinstance(found.point.u_m, float)
    assert found.point.u_m == pytest.approx(length / 12**0.5, rel=2e-3)
    whole = [piece for piece in found.band if piece.section == section]
    assert [(piece.from_m, piece.to_m) for piece in whole] == [(0.0, length)]
    assert found.budget == ()


@pytest.mark.parametrize("order", [(0, 1, 2), (2, 0, 1), (1, 2, 0)])
@pytest.mark.parametrize("turned", [(), (1,), (0, 1, 2)])
def test_the_order_and_direction_of_sections_do_not_matter(order, turned):
    rng = np.random.default_rng(3)
    base = tee()
    errors = rng.normal(0, 1e-6, 3)
    times = [run_s(base, direct_path(base, 1, n), 20e3) + e for n, e in zip("ABC", errors, strict=True)]
    readings = [Reading(i, t, 3e-7) for i, t in enumerate(times)]
    stations = [Station(node) for node in "ABC"]
    there = estimate(base, stations, readings)
    rows = [(b, a, m) if i in turned else (a, b, m) for i, (a, b, m) in enumerate(TEE)]
    here = estimate(tee([rows[i] for i in order]), stations, readings)
    assert order[here.point.section] == there.point.section == 1
    mirrored = 50e3 - here.point.distance_m if 1 in turned else here.point.distance_m
    assert mirrored == pytest.approx(there.point.distance_m, abs=1e-6)
    assert band_length(here.band) == pytest.approx(band_length(there.band), rel=1e-6)


# ---------------------------------------------------------------- much to attribute


def all_echoes(route, node, section, x, u=5e-9):
    """Return readings of the launch and of every echo that there is, without errors."""
    due = [run_s(route, echo_path(route, section, node), x)]
    due += [run_s(route, node_echo_path(route, node, other)) for other in route.nodes if other != node]
    return [Reading(0, 0.0, u), *(Reading(0, t, u, 0.02) for t in sorted(due))]


def cable(n):
    speed = Quantity(170e6, 1e6)
    return Route(tuple(Section(f"n{i}", f"n{i + 1}", Quantity(300.0 + 50 * i, 2.0), speed) for i in range(n)))


def test_many_joints_do_not_multiply_the_work():
    """Every joint is a mirror for every echo, but only one that is due then; six joints took minutes otherwise."""

    def cpu_s(n):
        began = time.process_time()
        route = cable(n)
        found = estimate(route, [Station("n0", None, launches=True)], all_echoes(route, "n0", 1, 100.0))
        assert (found.point.section, found.point.distance_m) == (1, pytest.approx(100.0, abs=0.5))
        return time.process_time() - began

    assert cpu_s(6) < 60 * cpu_s(2)


def test_echoes_of_the_joints_are_named():
    route = cable(3)
    found = estimate(route, [Station("n0", None, launches=True)], all_echoes(route, "n0", 1, 100.0))
    paths = {fit.path for fit in found.fits.values()}
    assert paths == {"launched pulse", "echo of the event", "echo of n1", "echo of n2", "echo of n3"}


# ---------------------------------------------------------------- coverage, truths drawn from what is stated


def drawn(route, rng):
    def draw(q):
        return Quantity(float(rng.normal(q.value, q.u)))

    rows = route.sections
    return Route(
        tuple(dataclasses.replace(s, length=draw(s.length), speed=draw(s.speed), flow=draw(s.flow)) for s in rows)
    )


def drawn_place(route, rng, margin=0.0):
    lengths = np.array([s.length.value for s in route.sections])
    section = int(rng.choice(lengths.size, p=lengths / lengths.sum()))
    return section, float(rng.uniform(margin, 1 - margin) * lengths[section])


def holds(found, route, section, x):
    x = min(x, route.sections[section].length.value)  # the true section may be longer than the stated one
    return any(p.section == section and p.from_m <= x <= p.to_m for p in found.band)


def binomial_margin(p, n):
    """Three standard deviations of the share of n trials."""
    return 3 * (p * (1 - p) / n) ** 0.5


ROUTES = {
    "tee": (tee(), "ABC", 3e-7, 1e-7),
    "hybrid": (
        Route(
            (
                Section("A", "J", Quantity(60e3, 60.0), Quantity(V, 6e5)),
                Section("J", "K", Quantity(8e3, 20.0), Quantity(1.72e8, 8e5)),
                Section("K", "B", Quantity(30e3, 30.0), Quantity(2.9e8, 1e6)),
            )
        ),
        "AB",
        3e-7,
        1e-7,
    ),
    "flow": (
        Route((Section("A", "B", Quantity(80e3, 40.0), Quantity(380.0, 4.0), Quantity(12.0, 1.0)),)),
        "AB",
        5e-3,
        2e-3,
    ),
    "a fifth of the route": (line(Quantity(1e3, 0.5), Quantity(V, 1e6)), "AB", 5e-7, 1e-7),
}


@pytest.mark.parametrize("name", ROUTES)
def test_coverage_with_terminals_at_the_ends(name):
    route, nodes, u, u_clock = ROUTES[name]
    rng = np.random.default_rng(21)
    n, held = 150, 0
    for _ in range(n):
        true = drawn(route, rng)
        section, x = drawn_place(true, rng)
        errors = rng.normal(0, np.hypot(u, u_clock), len(nodes))
        runs = [run_s(true, direct_path(true, section, node), x) for node in nodes]
        stations = [Station(node, Quantity(0.0, u_clock)) for node in nodes]
        readings = [Reading(i, run + e, u) for i, (run, e) in enumerate(zip(runs, errors, strict=True))]
        held += holds(estimate(route, stations, readings), route, section, x)
    assert abs(held / n - 0.95) < binomial_margin(0.95, n)


def test_coverage_of_a_pulse_echo_among_joints():
    u, rng = 5e-9, np.random.default_rng(22)
    route = Route(
        (
            Section("S", "J", Quantity(412.0, 1.5), Quantity(171.5e6, 0.8e6)),
            Section("J", "M", Quantity(1386.0, 3.0), Quantity(166e6, 0.8e6)),
        )
    )
    n, held = 150, 0
    for _ in range(n):
        true = drawn(route, rng)
        section, x = drawn_place(true, rng, margin=0.02)
        readings = sorted(
            (dataclasses.replace(r, time_s=r.time_s + rng.normal(0, u)) for r in all_echoes(true, "S", section, x)),
            key=lambda reading: reading.time_s,
        )
        held += holds(estimate(route, [Station("S", None, launches=True)], readings), route, section, x)
    assert abs(held / n - 0.95) < binomial_margin(0.95, n)


# ---------------------------------------------------------------- launches, clocks and echoes that are not the event's


def test_pulses_from_both_ends_have_zeros_of_their_own():
    """Each set times its echo against its own launch, so the two need not be launched together."""
    route = line(Quantity(2e3), Quantity(170e6, 1e6))
    stations = [Station("A", None, launches=True), Station("B", None, launches=True)]
    readings = [
        Reading(0, 5.0, 5e-9),
        Reading(0, 5.0 + 2 * 600 / 170e6, 5e-9),
        Reading(1, 0.0, 5e-9),
        Reading(1, 2 * 1400 / 170e6, 5e-9),
    ]
    both = estimate(route, stations, readings)
    one = estimate(route, stations[:1], readings[:2])
    assert both.point.distance_m == pytest.approx(600.0, abs=1e-3)
    assert both.point.u_m < one.point.u_m


def test_a_wrong_clock_of_three_is_overruled_and_named():
    """B's clock is 1 ms off and says 0.1 µs; A and C agree with a place on their line, and B's branch with none."""
    route = tee()
    readings = [Reading(i, run_s(route, direct_path(route, 0, n), 40e3), 3e-7) for i, n in enumerate("ABC")]
    readings[1] = dataclasses.replace(readings[1], time_s=readings[1].time_s + 1e-3)
    found = estimate(route, [Station(n, Quantity(0.0, 1e-7)) for n in "ABC"], readings)
    assert "clock of B taken as wrong: 1.0000 ms ahead" in found.alternatives[0].attribution
    assert (found.point.section, found.point.distance_m) == (0, pytest.approx(40e3, abs=1.0))


def test_the_far_end_alone_is_not_taken_for_the_event():
    route = cable(2)
    far = run_s(route, node_echo_path(route, "n0", "n2"))
    readings = [Reading(0, 0.0, 5e-9), Reading(0, far, 5e-9, 0.02)]
    with pytest.raises(NoPosition, match=r"may well be no echo of the event \(launched pulse, echo of n2\)"):
        estimate(route, [Station("n0", None, launches=True)], readings)
