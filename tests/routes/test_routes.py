"""Routes and travel times. The expected times follow by arithmetic from lengths and speeds."""

import numpy as np
import pytest

from twlocate.quantity import Quantity
from twlocate.routes import Route, Section, direct_path, echo_path, node_echo_path, transit_s, travel_time

TEE = Route(
    (
        Section("A", "T", Quantity(80e3), Quantity(2.94e8)),
        Section("B", "T", Quantity(50e3), Quantity(2.94e8)),
        Section("T", "C", Quantity(30e3), Quantity(2.0e8)),
    )
)
PIPE = Route((Section("up", "down", Quantity(50e3), Quantity(1000.0), Quantity(2.0)),))


def at(route, path, x):
    travel = travel_time(route, path)
    return travel.constant_s + travel.per_metre * x


def test_direct_time_to_each_end_of_a_tee():
    x = 30e3  # metres from B on the leg B–T
    assert at(TEE, direct_path(TEE, 1, "B"), x) == pytest.approx(30e3 / 2.94e8)
    assert at(TEE, direct_path(TEE, 1, "A"), x) == pytest.approx((20e3 + 80e3) / 2.94e8)
    assert at(TEE, direct_path(TEE, 1, "C"), x) == pytest.approx(20e3 / 2.94e8 + 30e3 / 2.0e8)


def test_flow_speeds_the_wave_up_downstream_and_slows_it_upstream():
    x = 18e3
    assert at(PIPE, direct_path(PIPE, 0, "up"), x) == pytest.approx(x / 998.0)
    assert at(PIPE, direct_path(PIPE, 0, "down"), x) == pytest.approx(32e3 / 1002.0)


def test_an_echo_goes_there_and_back_with_the_flow_reversed():
    assert at(PIPE, echo_path(PIPE, 0, "up"), 18e3) == pytest.approx(18e3 / 1002 + 18e3 / 998)
    assert at(PIPE, node_echo_path(PIPE, "up", "down"), 18e3) == pytest.approx(50e3 / 1002 + 50e3 / 998)


@pytest.mark.parametrize("node", ["A", "B", "C"])
@pytest.mark.parametrize("section", [0, 1, 2])
def test_times_agree_where_sections_meet(section, node):
    """An event at a joint is the same event seen from either section."""
    ends = {TEE.sections[section].from_node: 0.0, TEE.sections[section].to_node: TEE.sections[section].length.value}
    for joint, x in ends.items():
        expected = transit_s(TEE, joint, node).value
        assert at(TEE, direct_path(TEE, section, node), x) == pytest.approx(expected, abs=1e-15)


def test_derivatives_are_those_of_the_times():
    def shifted(field, step):
        section = PIPE.sections[0]
        changed = {name: getattr(section, name) for name in ("length", "speed", "flow")}
        changed[field] = Quantity(changed[field].value + step)
        return Route((Section("up", "down", *changed.values()),))

    x = 18e3
    for column, (field, step) in enumerate((("length", 1.0), ("speed", 1e-3), ("flow", 1e-3))):
        for node in ("up", "down"):
            times = [at(shifted(field, s), direct_path(PIPE, 0, node), x) for s in (-step, step)]
            travel = travel_time(PIPE, direct_path(PIPE, 0, node))
            stated = travel.at_zero[0, column] + travel.slope[0, column] * x
            assert stated == pytest.approx((times[1] - times[0]) / (2 * step), rel=1e-5, abs=1e-12)


def test_transit_uncertainty_adds_length_and_speed():
    route = Route((Section("A", "B", Quantity(100e3, 100.0), Quantity(2.0e8, 2e5)),))
    transit = transit_s(route, "A", "B")
    assert transit.value == pytest.approx(500e-6)
    assert transit.u == pytest.approx(np.hypot(100 / 2e8, 500e-6 * 1e-3))


def test_route_facts():
    assert TEE.nodes == ("A", "T", "B", "C")
    assert TEE.length_m == pytest.approx(160e3)
    assert TEE.hops("A", "C") == ((0, True), (2, True))
    assert TEE.hops("C", "B") == ((2, False), (1, False))
    assert TEE.hops("A", "A") == ()
