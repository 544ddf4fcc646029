"""From a recording to arrivals: gaps, sides of the transducer, skews, absurd figures, missing starts."""

import shutil
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from twlocate.case import load_case
from twlocate.errors import RecordError
from twlocate.locating import locate
from twlocate.observing import observe
from twlocate.records import read, write_comtrade

RECORDINGS = Path(__file__).parents[1] / "recordings"
RATIOS = {"V": 2000.0, "A": 1000.0}


@pytest.fixture
def line(tmp_path):
    return shutil.copytree(RECORDINGS / "line-fault", tmp_path / "line") / "case.toml"


@pytest.fixture
def main(tmp_path):
    return shutil.copytree(RECORDINGS / "main-burst", tmp_path / "main") / "case.toml"


def rewrite(case, stem, change):
    """Write a recording of the line again with its channels changed."""
    path = case.parent / f"{stem}.cfg"
    record = read(path)
    channels = tuple(change(channel) for channel in record.channels)
    write_comtrade(replace(record, channels=channels), path, "FLOAT32")


def position(case):
    found = locate(load_case(case)).estimate
    assert found is not None
    return found.point.distance_m


# ---------------------------------------------------------------- gaps


def with_gap(first, stop):
    def change(channel):
        samples = channel.samples.copy()
        samples[first:stop] = np.nan
        return replace(channel, samples=samples)

    return change


def test_a_gap_long_before_the_front_changes_nothing(line):
    before = position(line)
    rewrite(line, "hollin-fell", with_gap(1000, 1010))
    assert position(line) == pytest.approx(before, abs=1.0)


@pytest.mark.parametrize("gap", [(9300, 9800), (9000, 9900)], ids=["front behind it", "front nearer"])
def test_a_gap_that_may_hold_the_front_is_no_ground_for_a_position(line, gap):
    """A wave needs 0.8 ms there and back, 1005 samples: within that, what comes first may be an echo."""
    rewrite(line, "hollin-fell", with_gap(*gap))
    finding = locate(load_case(line))
    assert finding.estimate is None
    assert "Hollin Fell: no samples are missing just before the front" in finding.reason
    assert "use a record without this gap" in finding.reason


# ---------------------------------------------------------------- the side of the transducer


def on_secondary(ratio):
    def change(channel):
        k = RATIOS[channel.unit]
        return replace(
            channel,
            samples=channel.samples / k,
            step=(channel.step or 0.0) / k,
            side="secondary",
            ratio=k if ratio else None,
        )

    return change


def test_secondary_values_give_the_wave_that_primary_ones_give(line):
    terminal = load_case(line).terminals[0]
    primary = observe(load_case(line), terminal).picks
    rewrite(line, "hollin-fell", on_secondary(ratio=True))
    secondary = observe(load_case(line), terminal).picks
    assert secondary.arrivals[0].amplitude == pytest.approx(primary.arrivals[0].amplitude, rel=1e-3)
    assert secondary.arrivals[0].time_s == pytest.approx(primary.arrivals[0].time_s, abs=1e-8)


def test_waves_are_not_split_where_the_ratio_is_unknown(line):
    terminal = load_case(line).terminals[0]
    assert observe(load_case(line), terminal).wave.name.startswith("incoming wave")
    rewrite(line, "hollin-fell", on_secondary(ratio=False))
    assert not observe(load_case(line), terminal).wave.name.startswith("incoming wave")


# ---------------------------------------------------------------- skews, figures


def test_a_skewed_channel_is_brought_back_to_the_others(line):
    """Sample a channel 1.6 µs (two samples) late, say so, and nothing changes."""
    before = position(line)

    def change(channel):
        late = channel.name.startswith("I")
        return replace(channel, samples=np.roll(channel.samples, -2), skew_s=1.6e-6) if late else channel

    rewrite(line, "hollin-fell", change)
    assert position(line) == pytest.approx(before, abs=1.0)


def test_a_skew_longer_than_the_record_leaves_nothing(line):
    rewrite(line, "hollin-fell", lambda channel: replace(channel, skew_s=float(channel.name == "I L1")))
    with pytest.raises(RecordError, match=r"hollin-fell.cfg: 0 unbroken samples in the channels named"):
        locate(load_case(line))


@pytest.mark.parametrize("factor", [1e60, 1e150, 1e300])
def test_figures_that_no_recorder_reads(main, factor):
    path = main.parent / "pump-house.csv"
    head, rows = path.read_text(encoding="utf-8").split("[kPa]\n")
    values = np.array(rows.split(), dtype=float) * factor
    path.write_text(head + "[kPa]\n" + "\n".join(f"{value:.6g}" for value in values), encoding="utf-8")
    with pytest.raises(RecordError, match=r"'pressure' reads up to .* Pa; no recorder reads more than 1e\+30"):
        locate(load_case(main))


# ---------------------------------------------------------------- recordings that do not say when they start


def without_start(path):
    text = path.read_text(encoding="utf-8")
    path.write_text("".join(row for row in text.splitlines(keepends=True) if "start" not in row), encoding="utf-8")


def test_a_start_at_one_end_only_leaves_the_other_clock_free(main):
    without_start(main.parent / "ridge-chamber.csv")
    finding = locate(load_case(main))
    gate = next(gate for gate in finding.checks if gate.name == "Ridge chamber: clock")
    assert (gate.passed, gate.detail) == (
        False,
        "free: the recording does not state when it starts, as another one does",
    )


def test_recordings_without_starts_and_with_stated_clocks_are_told_to_be_taken_as_simultaneous(main):
    before = position(main)
    for name in ("pump-house.csv", "ridge-chamber.csv"):
        without_start(main.parent / name)
    assert position(main) == pytest.approx(before, abs=1e-6)
    gates = [gate for gate in locate(load_case(main)).checks if gate.name.endswith(": clock")]
    assert all("taken as started together" in gate.detail for gate in gates)


# ---------------------------------------------------------------- a pulse whose echo is hidden


def test_edges_of_the_far_ends_echo_are_not_taken_for_the_event(tmp_path):
    """Noise of 0.8 V hides the fault's echo but not the open end's, whose two edges then looked like two echoes."""
    case = shutil.copytree(RECORDINGS / "cable-echo", tmp_path / "cable") / "case.toml"
    path = case.parent / "pulse-echo.csv"
    head, rows = path.read_text(encoding="utf-8").split("[V]\n")
    volts = np.array(rows.split(), dtype=float)
    for seed in (0, 10, 14, 17, 18, 19):  # six draws that were placed at the far end, 437 m off, with a u of 3 to 4 m
        noise = np.random.default_rng(seed).normal(0, 0.8, volts.size)
        text = "\n".join(f"{value:.7g}" for value in volts + noise)
        path.write_text(head + "[V]\n" + text + "\n", encoding="utf-8")
        finding = locate(load_case(case))
        assert finding.estimate is None
        assert "no echo of the event" in finding.reason or "would cover more" in finding.reason
