"""``twlocate locate`` as a user meets it: answers, exit status, one-line errors, nothing half written."""

import json
import re
import shutil
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from click.testing import CliRunner

from twlocate.__main__ import main
from twlocate.records import read, write_comtrade

RECORDINGS = Path(__file__).parents[1] / "recordings"
EVENTS = ["line-fault", "main-burst", "cable-echo"]


def run(*arguments):
    return CliRunner().invoke(main, ["locate", *map(str, arguments)])


def located(case):
    result = run(case, "--json")
    assert result.exit_code == 0, result.stderr
    return json.loads(result.stdout)


@pytest.fixture
def event(tmp_path):
    """Return a function that copies a demo event and gives its case file."""

    def copy(name):
        return shutil.copytree(RECORDINGS / name, tmp_path / name) / "case.toml"

    return copy


@pytest.mark.parametrize("name", EVENTS)
def test_the_band_of_each_demo_event_holds_the_truth(name):
    document = located(RECORDINGS / name / "case.toml")
    truth = json.loads((RECORDINGS / name / "truth.json").read_text(encoding="utf-8"))
    assert document["status"] == "located"
    assert any(
        piece["section"] == truth["section"] and piece["from_m"] <= truth["distance_m"] <= piece["to_m"]
        for piece in document["band"]
    )


def test_the_document_has_the_keys_that_the_readme_promises():
    document = located(RECORDINGS / "line-fault" / "case.toml")
    for key in [
        "status",
        "reason",
        "position",
        "coverage",
        "band",
        "alternatives",
        "arrivals",
        "time_zero",
        "budget",
        "places",
        "checks",
        "repairs",
        "cautions",
        "inputs",
        "version",
    ]:
        assert key in document
    assert set(document["position"]) == {"section", "from_node", "distance_m", "u_m"}
    assert {file["file"] for file in document["inputs"]} == {
        "case.toml",
        "hollin-fell.cfg",
        "hollin-fell.dat",
        "marsh-end.cfg",
        "marsh-end.dat",
        "towers.csv",
    }
    first = document["arrivals"][0]
    assert first["terminal"] == "Hollin Fell"
    assert first["path"] == "direct"
    assert document["time_zero"]["utc"] == "2026-03-02T04:31:07.250000000Z"
    shares = [place["probability"] for place in document["places"]]
    assert sum(shares) == pytest.approx(1, abs=1e-6)
    assert shares == sorted(shares, reverse=True)


def test_the_same_inputs_give_the_same_bytes():
    case = RECORDINGS / "line-fault" / "case.toml"
    assert run(case, "--json").stdout == run(case, "--json").stdout


@pytest.mark.parametrize("name", EVENTS)
def test_text_gives_place_band_and_cautions(name):
    result = run(RECORDINGS / name / "case.toml")
    assert result.exit_code == 0
    for words in ("Look at ", "95% band", "What the uncertainty is made of", "Checks", "Cautions"):
        assert words in result.stdout
    assert not {"safe", "clear", "no leak"} & set(result.stdout.lower().replace(".", " ").split())


def test_a_wider_coverage_gives_a_wider_band():
    def width(coverage):
        document = json.loads(run(RECORDINGS / "line-fault" / "case.toml", "--json", "--coverage", coverage).stdout)
        return document["band"][0]["to_m"] - document["band"][0]["from_m"]

    assert width(0.5) < width(0.68) < width(0.95) < width(0.99)


def test_out_writes_everything_and_never_over_another(event, tmp_path):
    case, out = event("line-fault"), tmp_path / "finding"
    result = run(case, "--out", out)
    assert result.exit_code == 0, result.output
    assert {file.name for file in out.iterdir()} == {
        "finding.json",
        "finding.txt",
        "density.png",
        "arrivals-hollin-fell.png",
        "arrivals-marsh-end.png",
    }
    assert json.loads((out / "finding.json").read_text(encoding="utf-8"))["status"] == "located"
    again = run(case, "--out", out)
    assert (again.exit_code, again.stderr.count("\n")) == (2, 1)
    assert "exists already" in again.stderr


# ---------------------------------------------------------------- what goes wrong


def in_one_line(result, status, words):
    assert result.exit_code == status, result.output
    assert words in result.stderr
    assert result.stderr.count("\n") == 1
    assert "Traceback" not in result.output


def edit(case, old, new):
    text = case.read_text(encoding="utf-8")
    assert old in text
    case.write_text(text.replace(old, new), encoding="utf-8")


@pytest.mark.parametrize(
    ("old", "new", "words"),
    [
        ('"hollin-fell.cfg"', '"gone.cfg"', "terminal 1, recording: no file 'gone.cfg'"),
        ('"118.42 km ± 60 m"', '"118.42 kg ± 60 m"', "section 1, length: '118.42 kg ± 60 m' cannot be read in 'm'"),
        ('"118.42 km ± 60 m"', '"-118.42 km"', "section 1, length: -118420 (SI) is not positive"),
        ("impedance =", "impedence =", "section 1, impedence: unknown key; did you mean 'impedance'?"),
    ],
    ids=["missing file", "wrong unit", "negative length", "misspelt key"],
)
def test_a_wrong_case_file(event, tmp_path, old, new, words):
    case = event("line-fault")
    edit(case, old, new)
    result = run(case, "--out", tmp_path / "finding")
    assert result.exit_code == 2
    assert result.stderr.splitlines()[1].strip().startswith(words)
    assert not (tmp_path / "finding").exists()


def test_a_wrong_channel_name(event):
    case = event("line-fault")
    edit(case, '"I L1"', '"I L9"')
    in_one_line(run(case), 2, "no channel is called 'I L9'; it has 'U L1', 'U L2'")


def test_a_channel_of_the_wrong_kind(event):
    case = event("line-fault")
    edit(case, 'va = "U L1", vb = "U L2", vc = "U L3", ia = "I L1", ib = "I L2", ic = "I L3"', 'v = "I L1"')
    in_one_line(run(case), 2, "channel 'I L1' is in 'A', which is no unit of voltage")


def test_a_recording_cut_off_in_its_header(event):
    case = event("line-fault")
    (case.parent / "hollin-fell.cfg").write_text("Hollin Fell,wave recorder,2013\n6,6A")
    in_one_line(run(case), 2, "hollin-fell.cfg")


def test_recordings_cut_off_before_the_event(event):
    case = event("line-fault")
    for data in case.parent.glob("*.dat"):
        data.write_bytes(data.read_bytes()[: data.stat().st_size // 5])
    in_one_line(run(case, "--json"), 3, "no arrival stands out of the noise at Hollin Fell, Marsh End")


def rewrite(path, change):
    """Write a demo recording again with its samples changed."""
    record = read(path)
    channels = tuple(replace(channel, samples=change(channel)) for channel in record.channels)
    write_comtrade(replace(record, channels=channels), path, "BINARY32")


def test_pure_noise(event, tmp_path):
    case = event("line-fault")
    rng = np.random.default_rng(5)
    for recording in case.parent.glob("*.cfg"):
        rewrite(recording, lambda channel: rng.normal(0, 20 * channel.step, channel.samples.size))
    result = run(case, "--json", "--out", tmp_path / "finding")
    in_one_line(result, 3, "no position: no arrival stands out of the noise at Hollin Fell, Marsh End")
    document = json.loads(result.stdout)
    assert (document["status"], document["position"], document["band"]) == ("no position", None, [])
    assert document["cautions"]
    assert not (tmp_path / "finding").exists()


def test_a_clipped_front(event):
    """The pressure drops by some 30 kPa; a converter that ends 3 kPa below the pressure before shows a flat floor."""
    case = event("main-burst")
    recording = case.parent / "pump-house.csv"
    head, rows = recording.read_text(encoding="utf-8").split("[kPa]\n")
    pressure = np.array(rows.split(), dtype=float)
    clipped = np.maximum(pressure, pressure[:4000].min() - 3.0)
    recording.write_text(head + "[kPa]\n" + "\n".join(f"{value:.2f}" for value in clipped), encoding="utf-8")
    in_one_line(run(case), 3, "Pump house: no channel is clipped at the front: p at the end of its range")


def shift_clock(case, ahead_ns):
    record = read(case.parent / "marsh-end.cfg")
    write_comtrade(replace(record, start_ns=record.start_ns + ahead_ns), record.path, "BINARY32")


def keep_first_fronts(case):
    """Cut the recordings off right behind the first fronts, before any echo."""
    for stem, rows in (("hollin-fell", 9_860), ("marsh-end", 10_150)):
        data = case.parent / f"{stem}.dat"
        data.write_bytes(data.read_bytes()[: rows * 32])


def test_clocks_that_cannot_both_be_right(event):
    case = event("line-fault")
    shift_clock(case, 1_000_000)
    keep_first_fronts(case)
    result = run(case)
    in_one_line(result, 3, "the first front reaches Marsh End 1.24901 ms after Hollin Fell; a wave needs 0.40197 ms")
    assert "Look at" not in result.stdout


@pytest.mark.parametrize("ahead_us", [20.0, 1000.0, 1e6])
def test_echoes_name_the_wrong_clock_and_by_how_much(event, ahead_us):
    case = event("line-fault")
    shift_clock(case, round(ahead_us * 1000))
    edit(case, 'clock = "± 0.1 µs"', 'clock = "± 0.1 µs"\nbus = "low impedance"')
    document = located(case)
    assert held(document)
    words = [row["attribution"] for row in document["alternatives"] if row["probability"] > 0.3]
    of_marsh_end = next(word for word in words if "clock of Marsh End taken as wrong" in word)
    number, unit = re.search(r"wrong: ([\d.]+) (\S+) ahead", of_marsh_end).groups()
    found = float(number) * {"µs": 1.0, "ms": 1e3, "s": 1e6}[unit]
    assert found == pytest.approx(ahead_us, abs=1.0)


def held(document):
    truth = json.loads((RECORDINGS / "line-fault" / "truth.json").read_text(encoding="utf-8"))
    return any(piece["from_m"] <= truth["distance_m"] <= piece["to_m"] for piece in document["band"])


def test_a_free_clock_leaves_the_echoes_and_their_mirror_image(event):
    case = event("line-fault")
    edit(case, 'clock = "± 0.1 µs"', 'clock = "free"')
    document = located(case)
    assert document["status"] == "ambiguous"
    assert held(document)
    assert document["alternatives"][0]["probability"] < 0.6


def test_what_the_buses_are_tells_an_event_from_its_mirror_image(event):
    case = event("line-fault")
    edit(case, 'clock = "± 0.1 µs"', 'clock = "free"\nbus = "low impedance"')
    document = located(case)
    assert document["status"] == "located"
    assert held(document)


def test_a_free_clock_without_echoes(event):
    """With the recording ending right behind the first front nothing but the clocks could tell."""
    case = event("line-fault")
    edit(case, 'clock = "± 0.1 µs"', 'clock = "free"')
    keep_first_fronts(case)
    in_one_line(run(case), 3, "the clock of Hollin Fell, Marsh End is free")


def test_the_recordings_own_time_quality_is_used_where_the_case_gives_no_clock(event):
    case = event("line-fault")
    edit(case, 'clock = "± 0.1 µs"\n', "")
    rows = {row["input"]: row for row in located(case)["budget"]}
    # time quality 3 bounds the error at 0.1 µs (IEEE C37.111-2013): rectangular, u = bound/√3; plus 1 ns steps
    assert rows["clock of Marsh End"]["u"] == pytest.approx(np.hypot(0.1e-6 / np.sqrt(3), 1e-9 / np.sqrt(12)), rel=1e-6)


def test_an_option_out_of_range():
    result = run(RECORDINGS / "line-fault" / "case.toml", "--coverage", "1.2")
    assert result.exit_code == 2
    assert "0.5<=x<=0.999" in result.stderr


@pytest.mark.parametrize("name", ["[/b]", "[bold red]x[/]", "a/b"])
def test_names_are_printed_as_they_are(event, tmp_path, name):
    case = event("line-fault")
    edit(case, '"Marsh End"', f'"{name}"')
    edit(case, '[places]\nfile = "towers.csv"\n', "")
    result = run(case, "--out", tmp_path / "finding")
    assert result.exit_code == 0, result.output
    assert f"Arrivals at {name} in" in (tmp_path / "finding" / "finding.txt").read_text(encoding="utf-8")
