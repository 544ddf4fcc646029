"""Speeds from events of known origin: closed forms, simulated events, refusals."""

import json
import re

import numpy as np
import pytest
from click.testing import CliRunner

from tests.simulation.test_scenarios import LINE, MAIN
from twlocate.__main__ import main
from twlocate.calibrating import Calibrated, calibrated_speeds, origin_at
from twlocate.errors import CaseError
from twlocate.position import Reading, Station
from twlocate.quantity import Quantity
from twlocate.reporting.speeds import format_calibrated
from twlocate.routes import Route, Section

LENGTH, SPEED = Quantity(100e3, 40.0), Quantity(2.94e8, 1.5e6)
ROUTE = Route((Section("A", "B", LENGTH, SPEED),))
CLOCK = Quantity(0.0, 1e-7)


def stations(*nodes, clock=CLOCK):
    return [Station(node, clock) for node in nodes]


@pytest.mark.parametrize("node", ["A", "B"])
def test_transit_of_the_whole_section_is_length_over_time(node):
    # v = L/t with the law of propagation (JCGM 100, 5.1.2), joined with the stated speed by inverse variances
    true = 2.955e8
    times = [0.0, LENGTH.value / true] if node == "A" else [LENGTH.value / true, 0.0]
    readings = [Reading(index, 5.0 + t, 2e-8) for index, t in enumerate(times)]
    (found,) = calibrated_speeds(ROUTE, origin_at(ROUTE, node), stations("A", "B"), readings)
    u_time = (2 * (1e-7**2 + 2e-8**2)) ** 0.5
    u_speed = true * ((LENGTH.u / LENGTH.value) ** 2 + (u_time * true / LENGTH.value) ** 2) ** 0.5
    weights = np.array([u_speed**-2, SPEED.u**-2])
    assert found.speed.u == pytest.approx(weights.sum() ** -0.5, rel=0.01)
    assert found.speed.value == pytest.approx(weights @ [true, SPEED.value] / weights.sum(), abs=0.02 * u_speed)


def test_origin_in_the_middle_says_nothing():
    readings = [Reading(0, 1.0, 1e-8), Reading(1, 1.0, 1e-8)]
    (found,) = calibrated_speeds(ROUTE, origin_at(ROUTE, Quantity(50e3, 0.0)), stations("A", "B"), readings)
    assert not found.moved
    assert found.speed.u == pytest.approx(SPEED.u, rel=1e-4)


def test_shift_of_all_times_changes_nothing():
    origin = origin_at(ROUTE, Quantity(20e3, 10.0))
    at = [
        calibrated_speeds(ROUTE, origin, stations("A", "B"), [Reading(0, t0, 1e-8), Reading(1, t0 + 2.02e-4, 1e-8)])
        for t0 in (0.0, 3.0)
    ]
    assert at[0][0].speed.value == pytest.approx(at[1][0].speed.value, rel=1e-9)


def test_section_that_no_difference_touches_keeps_its_statement():
    spur = Route((*ROUTE.sections, Section("B", "C", Quantity(9e3, 5.0), Quantity(1.7e8, 2e6))))
    readings = [Reading(0, 0.0, 1e-8), Reading(1, 3.39e-4, 1e-8)]
    first, second = calibrated_speeds(spur, origin_at(spur, "A"), stations("A", "B"), readings)
    assert first.moved
    assert not second.moved


def test_contradiction_is_measured():
    readings = [Reading(0, 0.0, 1e-8), Reading(1, LENGTH.value / 2.70e8, 1e-8)]
    (found,) = calibrated_speeds(ROUTE, origin_at(ROUTE, "A"), stations("A", "B"), readings)
    assert found.pull < -10


def test_text_says_when_a_move_is_odd():
    texts = [
        format_calibrated(Calibrated("A–B", Quantity(1000.0, 10.0), Quantity(value, 6.0))) for value in (1003.0, 1032.0)
    ]
    assert 'speed = "1003 m/s ± 6 m/s"' in texts[0]
    assert "standard uncertainties" not in texts[0]
    assert "4.0 of its standard uncertainties: check the place" in texts[1]


def simulate(tmp_path, text, seed):
    scenario = tmp_path / "scenario.toml"
    scenario.write_text(text, encoding="utf-8")
    folder = tmp_path / "out"
    run = CliRunner().invoke(main, ["simulate", str(scenario), "--out", str(folder), "--seed", str(seed)])
    assert run.exit_code == 0
    return folder / "case.toml", json.loads((folder / "truth.json").read_text(encoding="utf-8"))


@pytest.mark.parametrize("seed", range(4))
@pytest.mark.parametrize(("text", "at"), [(LINE, "31.4 km"), (MAIN, "1.6 km")], ids=["fault", "burst"])
def test_found_fault_gives_the_speed_back(tmp_path, text, at, seed):
    wide = text.replace("± 0.5 m/us", "± 3 m/us").replace("± 8 m/s", "± 30 m/s")
    case, truth = simulate(tmp_path, wide, seed)
    result = CliRunner().invoke(main, ["speed", "calibrate", str(case), "--at", at])
    assert result.exit_code == 0
    value, u = map(float, re.search(r'^speed = "(\S+) m/s ± (\S+) m/s"', result.output, re.M).groups())
    stated = re.search(r"stated (\S+) m/s ± (\S+)", result.output)
    assert abs(value - truth["speeds_m_per_s"][0]) < 3 * u
    assert u < 0.5 * float(stated[2])


@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        (["--at", "Nowhere"], "no node 'Nowhere'; nodes are Works, Tank"),
        (["--at", "9 km"], "9000 m is not on the section Works-Tank, which is 4200 m long"),
        (["--at", "1 km", "--section", "X-Y"], "section 'X-Y' is not on the route"),
        (["--at", "1 kg"], "cannot be read in 'm'"),
    ],
)
def test_refusals(tmp_path, arguments, message):
    case, _ = simulate(tmp_path, MAIN, 0)
    result = CliRunner().invoke(main, ["speed", "calibrate", str(case), *arguments])
    assert result.exit_code == 2
    assert re.search(message, result.stderr)


def test_two_known_clocks_are_needed(tmp_path):
    case, _ = simulate(tmp_path, MAIN, 0)
    case.write_text(case.read_text(encoding="utf-8").replace('"± 1 ms"', '"free"', 1), encoding="utf-8")
    result = CliRunner().invoke(main, ["speed", "calibrate", str(case), "--at", "Works"])
    assert result.exit_code == 3
    assert "1 terminals with a known clock" in result.stderr


def test_place_that_cannot_be_is_refused(tmp_path):
    case, _ = simulate(tmp_path, MAIN, 0)
    result = CliRunner().invoke(main, ["speed", "calibrate", str(case), "--at", "4 km"])
    assert result.exit_code == 3
    assert re.search(r"\d+ standard uncertainties; the place, a clock, a length or the stated speed", result.stderr)


def test_distance_needs_a_section_where_there_are_several():
    spur = Route((*ROUTE.sections, Section("B", "C", Quantity(9e3), Quantity(1.7e8))))
    with pytest.raises(CaseError, match="needs one of A-B, B-C"):
        origin_at(spur, Quantity(3.0))
