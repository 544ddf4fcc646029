"""Validation: events drawn as stated, judged rightly, runs that can be gone on with, jobs that change nothing."""

import json
from pathlib import Path

import numpy as np
import pytest
from click.testing import CliRunner
from scipy import stats

from twlocate.__main__ import main
from twlocate.errors import CaseError, TwlocateError
from twlocate.reporting.validation import summary_rows, validation_figure
from twlocate.simulation.scenario import load_scenario
from twlocate.validating import Ledger, Trial, _binomial_interval, draw_event, summarise

MAIN = """
title = "Coppice main (invented)"
kind = "pipe"

[[section]]
from = "Works"
to = "Weir"
length = "3.0 km ± 4 m"
speed = "1150 m/s ± 8 m/s"
impedance = "4.1e6 Pa*s/m^3"

[[section]]
from = "Weir"
to = "Tank"
length = "1.0 km ± 2 m"
speed = "900 m/s ± 8 m/s"
impedance = "4.1e6 Pa*s/m^3"

[[terminal]]
node = "Works"
recording = "works.csv"
channels = { p = "p" }
clock = "± 2 ms"

[[terminal]]
node = "Tank"
recording = "tank.csv"
channels = { p = "p" }
clock = "± 2 ms"

[[end]]
node = "Tank"
impedance = "9e6 Pa*s/m^3"

[event]
kind = "burst"
section = "Works-Weir"
distance = "900 m"
onset = "6 s"
outflow = "0.02 m^3/s ± 0.005 m^3/s"
opening = "40 ms ± 10 ms"

[recorder]
rate = "250 Hz"
duration = "16 s"
across_noise = 300.0
"""


@pytest.fixture
def scenario(tmp_path):
    path = tmp_path / "scenario.toml"
    path.write_text(MAIN, encoding="utf-8")
    return path


def run(*arguments):
    return CliRunner().invoke(main, ["validate", *map(str, arguments)])


def trial(number, error, u=10.0, held=True, named=True, status="located"):
    return Trial(number, status, "", "A–B", 100.0, error, u if status != "no position" else None, held, named, 1)


def test_events_are_drawn_as_the_scenario_states(scenario):
    stated = load_scenario(scenario)
    rng = np.random.default_rng(1)
    events = [draw_event(stated, rng=rng).event for _ in range(800)]
    share = np.mean([event.section == "Works–Weir" for event in events])
    assert share == pytest.approx(0.75, abs=3 * np.sqrt(0.75 * 0.25 / 800))
    inside = [e.distance.value for e in events if e.section == "Works–Weir"]
    assert stats.kstest(np.array(inside) / 3000.0, "uniform", args=(0.01, 0.98)).pvalue > 0.001
    opening = np.array([e.opening.value for e in events])
    assert opening.mean() == pytest.approx(0.04, abs=0.0015)
    assert opening.std() == pytest.approx(0.01, rel=0.1)
    assert opening.min() >= 0.004
    onsets = np.array([e.onset.value for e in events])
    assert onsets.min() >= 6.0
    assert onsets.max() < 6.004


def test_the_same_seed_gives_the_same_events_on_any_number_of_jobs(scenario):
    one = run(scenario, "--events", 6, "--json")
    two = run(scenario, "--events", 6, "--json", "--jobs", 2)
    assert one.exit_code == 0, one.output
    assert json.loads(one.stdout) == json.loads(two.stdout)
    other = run(scenario, "--events", 6, "--json", "--seed", 1)
    assert json.loads(other.stdout) != json.loads(one.stdout)


def test_bands_of_simulated_bursts_hold_the_truth(scenario):
    summary = json.loads(run(scenario, "--events", 25, "--json").stdout)
    assert summary["refused"] == 0
    assert summary["held"] >= 20
    assert summary["wrong_place"] <= 1
    assert summary["error_median_m"] < 15


def test_a_run_is_gone_on_with(scenario, tmp_path):
    record, figure = tmp_path / "trials.jsonl", tmp_path / "figure.png"
    first = run(scenario, "--events", 3, "--record", record, "--json")
    assert first.exit_code == 0
    kept = record.read_text(encoding="utf-8").splitlines()
    assert len(kept) == 4
    both = run(scenario, "--events", 5, "--record", record, "--figure", figure, "--json")
    assert record.read_text(encoding="utf-8").splitlines()[:4] == kept
    assert json.loads(both.stdout) == json.loads(run(scenario, "--events", 5, "--json").stdout)
    assert figure.read_bytes().startswith(b"\x89PNG")
    other = run(scenario, "--events", 5, "--record", record, "--seed", 9)
    assert (other.exit_code, "another scenario, seed, coverage or version" in other.stderr) == (2, True)


def test_a_file_that_is_no_record_is_refused(tmp_path):
    path = tmp_path / "notes.txt"
    path.write_text("remember the milk\n", encoding="utf-8")
    with pytest.raises(CaseError, match="no record of this validation to go on from"):
        Ledger(path, {"seed": 0})
    assert path.read_text(encoding="utf-8") == "remember the milk\n"


def test_summary_counts_and_quantiles():
    done = [
        trial(0, 5.0),
        trial(1, -20.0),
        trial(2, None, held=False, named=False),
        trial(3, 1.0, status="ambiguous"),
        trial(4, None, held=False, named=False, status="no position"),
    ]
    summary = summarise(done, 0.95)
    assert (summary.events, summary.located, summary.ambiguous, summary.refused) == (5, 3, 1, 1)
    assert (summary.held, summary.wrong_place) == (3, 1)
    assert summary.error_median_m == pytest.approx(12.5)
    assert summary.error_95_m == np.inf  # a wrong section is no distance
    assert summary.rms_error_over_u == pytest.approx(np.sqrt((0.25 + 4 + 0.01) / 3))
    rows = dict(summary_rows(summary))
    assert rows["95% bands that hold the truth"].startswith("3 of 4, 75.0%")


def test_no_position_at_all_is_said():
    with pytest.raises(TwlocateError, match="none of 1 events gave a position"):
        summarise([trial(0, None, status="no position")], 0.95)


@pytest.mark.parametrize(("k", "n"), [(0, 20), (7, 20), (190, 200), (20, 20)])
def test_binomial_interval_is_that_of_clopper_and_pearson(k, n):
    expected = stats.binomtest(k, n).proportion_ci(method="exact")
    assert _binomial_interval(k, n) == pytest.approx((expected.low, expected.high), abs=1e-9)


def test_figure_draws_what_was_placed():
    figure = validation_figure([trial(0, 5.0), trial(1, -8.0), trial(2, None, held=False)], "three events")
    assert figure.axes[0].get_xlabel() == "distance from the truth, m"


def test_a_missing_scenario(tmp_path):
    result = run(Path(tmp_path) / "none.toml")
    assert result.exit_code == 2
    assert "give the path of a scenario file" in result.stderr
