"""``twlocate inspect`` as a user meets it."""

import io
import json
import struct
import subprocess
import sys
import time
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from click.testing import CliRunner
from rich.console import Console

from twlocate.commands.inspect import inspect
from twlocate.errors import RecordError
from twlocate.records import Channel, Clock, Record, StatusChannel, Stretch, write_comtrade
from twlocate.reporting.inspection import inspection_facts, utc_text
from twlocate.reporting.inspection_figure import BINS, envelope, inspection_figure, write_inspection_figure
from twlocate.reporting.inspection_tables import duration, overlap_text, record_block

START_NS = 1772424667_250000000  # 2026-03-02T04:11:07.25Z
TABLE = "# rate: 500 Hz\n# start: 2026-03-02T04:11:07.25Z\npressure [kPa]\n" + "1\n2\n" * 20
REAL = Path(__file__).parents[2] / "shared" / "recordings" / "comtrade"


def record_of(samples, *, rate_hz=500.0, start_ns=START_NS, clock=None, stretches=None, name="a.cfg", **channel):
    samples = np.asarray(samples, dtype=float)
    status = (StatusChannel("trip", (np.arange(samples.size) > samples.size // 2).astype(np.uint8)),)
    return Record(
        Path(name), "built", (Channel("U", "kV", samples, **channel),),
        stretches or (Stretch(0, samples.size, 0.0, rate_hz),), station="North", start_ns=start_ns, resolution_ns=1,
        clock=clock or Clock(1e-6, True, (), 0), trigger_s=0.01, status=status,
    )  # fmt: skip


@pytest.fixture
def run(tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    monkeypatch.setenv("COLUMNS", "80")
    (tmp_path / "a.csv").write_text(TABLE)
    return lambda *arguments: CliRunner().invoke(inspect, arguments)


def test_table_shows_what_a_practitioner_looks_for(run):
    result = run("a.csv")
    assert result.exit_code == 0
    for text in ("a.csv", "pressure", "kPa", "500 Hz", "2026-03-02T04:11:07.250Z (to 10 ms)", "read without repairs"):
        assert text in result.stdout
    assert max(map(len, result.stdout.splitlines())) <= 80


def test_json_is_complete(run):
    facts = json.loads(run("a.csv", "--json").stdout)
    record = facts["records"][0]
    assert record["start_ns"] == START_NS
    assert record["channels"][0]["greatest"] == 2.0
    assert record["stretches"] == [
        {"first": 0, "count": 40, "start_s": 0.0, "span_s": 0.078, "rate_hz": 500.0, "even": True}
    ]
    assert facts["errors"] == []
    assert facts["cautions"]


def test_one_bad_file_does_not_hide_the_good_one(run, tmp_path):
    (tmp_path / "bad.csv").write_text("hello\n")
    result = run("bad.csv", "a.csv", "absent.cfg")
    assert result.exit_code == 2
    assert "pressure" in result.stdout
    assert "error: bad.csv: no line of numbers" in result.stderr
    assert "error: absent.cfg: there is no such file" in result.stderr
    assert json.loads(run("bad.csv", "a.csv", "--json").stdout)["errors"] == ["bad.csv: no line of numbers"]


def test_a_clipped_channel_and_a_changing_status_stand_out(run, tmp_path):
    samples = np.clip(np.round(100 * np.sin(np.arange(400) / 20)), -80, 80)
    write_comtrade(record_of(samples, step=1.0, low=-80.0, high=80.0), tmp_path / "c.cfg")
    facts = json.loads(run("c.cfg", "--json").stdout)["records"][0]
    assert facts["channels"][0]["at_limit"] == np.count_nonzero(np.abs(samples) == 80)
    assert facts["status"] == [{"name": "trip", "normal": 0, "changes": [[201 / 500, 1]]}]
    text = run("c.cfg").stdout
    assert "at limit" in text
    assert "trip: 1 at 0.402 s" in text


def test_several_files_side_by_side(run, tmp_path):
    write_comtrade(record_of(np.arange(100.0), step=1.0), tmp_path / "north.cfg")
    late = record_of(np.arange(100.0), step=1.0, start_ns=START_NS + 100_000_000, clock=Clock(None, False))
    write_comtrade(late, tmp_path / "south.cfg")
    result = run("north.cfg", "south.cfg")
    assert "all overlap for 98 ms" in result.stdout
    lines = [line.split() for line in result.stdout.splitlines()]
    assert ["north.cfg", "2026-03-02T04:11:07.250000000Z", "0.198", "usable", "5.77", "µs"] in lines
    assert ["south.cfg", "2026-03-02T04:11:07.350000000Z", "0.198", "free", "-"] in lines


def test_overlap_in_words():
    records = [record_of(np.zeros(100)), record_of(np.zeros(100), start_ns=START_NS + 10**9)]
    overlap = inspection_facts(records, [])["overlap"]
    assert overlap["span_s"] == pytest.approx(-0.802)
    assert "share no moment: 802 ms between" in overlap_text(overlap, 2)
    assert "unknown" in overlap_text(
        inspection_facts([*records[:1], record_of([1, 2], start_ns=None)], [])["overlap"], 2
    )


@pytest.mark.parametrize(
    ("seconds", "text"),
    [
        (0.0, "0 s"),
        (1.5e-7, "150 ns"),
        (2.5e-4, "250 µs"),
        (90.0, "90 s"),
        (7200.0, "2 h"),
        (172800.0, "2 days"),
        (None, "-"),
    ],
)
def test_durations(seconds, text):
    assert duration(seconds) == text


@pytest.mark.parametrize(("resolution", "digits"), [(10**9, 0), (10**7, 3), (10**6, 3), (1000, 6), (10, 9), (1, 9)])
def test_no_more_digits_than_are_known(resolution, digits):
    assert (
        utc_text(START_NS, resolution) == "2026-03-02T04:11:07" + (".250000000"[: digits + 1] if digits else "") + "Z"
    )


def test_the_figure_has_a_panel_a_channel_and_its_units(tmp_path):
    write_inspection_figure([record_of(np.sin(np.arange(5000.0)))], tmp_path / "f.png")
    content = (tmp_path / "f.png").read_bytes()
    assert content.startswith(b"\x89PNG")
    assert struct.unpack(">II", content[16:24])[0] == 1210
    figure = inspection_figure([record_of(np.sin(np.arange(5000.0))), record_of(np.zeros(9))], 4)
    assert [axes.get_ylabel() for axes in figure.axes] == ["U\nkV", "", "U\nkV", ""]
    assert [path.name for path in tmp_path.iterdir()] == ["f.png"]


def test_a_single_sample_is_drawn(tmp_path):
    write_inspection_figure([record_of([3.0], stretches=(Stretch(0, 1, 5.0, 10.0),))], tmp_path / "f.png")
    assert (tmp_path / "f.png").stat().st_size > 0


def test_names_are_drawn_as_they_are(tmp_path):
    """A dollar sign opens a formula in matplotlib, a square bracket a style in rich."""
    record = record_of(np.arange(40.0))
    odd = replace(record, channels=(Channel("U$_{x", "[red]V$", np.arange(40.0)),), station="$a^", path=Path("$f.cfg"))
    odd = replace(odd, status=(StatusChannel("t$\\q$", record.status[0].states),))
    write_inspection_figure([odd], tmp_path / "f.png")
    facts = inspection_facts([odd], [])
    console = Console(file=io.StringIO(), width=80)
    console.print(record_block(facts["records"][0]))
    assert "U$_{x" in console.file.getvalue()
    assert "[red]V$" in console.file.getvalue()


@pytest.mark.parametrize("field", ["1e999", "nan", "-1e999", "inf"])
def test_json_never_meets_an_infinite_number(run, tmp_path, field):
    write_comtrade(record_of(np.arange(20.0), step=1.0), tmp_path / "c.cfg", "ASCII")
    lines = (tmp_path / "c.cfg").read_text().split("\n")
    for index in (2, 4):
        fields = lines[index].split(",")
        for place in range(len(fields)):
            spoilt = [*fields[:place], field, *fields[place + 1 :]]
            (tmp_path / "c.cfg").write_text("\n".join([*lines[:index], ",".join(spoilt), *lines[index + 1 :]]))
            result = run("c.cfg", "--json")
            assert result.exit_code in (0, 2)
            assert result.exception is None or isinstance(result.exception, SystemExit)


def test_a_single_spike_survives_thinning():
    samples = np.zeros(1_000_003)
    samples[777_777], samples[123] = 5.0, np.nan
    times, values = envelope(Stretch(0, samples.size, 2.0, 1e6), samples, BINS)
    assert times.size == values.size == 2 * BINS
    assert times[np.nanargmax(values)] == pytest.approx(2.777777, abs=1e-3)
    assert np.nanmax(values) == 5.0
    assert np.all(np.diff(times) >= 0)


def test_few_samples_are_drawn_as_they_are():
    stamps = np.array([0.0, 0.1, 0.5])
    times, values = envelope(Stretch(0, 3, 0.0, 4.0, stamps), np.array([1.0, 2.0, 3.0]), BINS)
    np.testing.assert_array_equal(times, stamps)
    assert values.tolist() == [1.0, 2.0, 3.0]


def test_ten_million_samples_draw_at_once(tmp_path):
    record = record_of(np.random.default_rng(1).normal(size=10_000_000), rate_hz=1e6)
    started = time.process_time()
    write_inspection_figure([record], tmp_path / "f.png")
    assert time.process_time() - started < 5.0


def test_figure_faults_leave_nothing(run, tmp_path):
    result = run("a.csv", "--figure", "f.docx")
    assert (result.exit_code, result.stderr) == (2, "error: f.docx: a figure is written to one of .png .pdf .svg\n")
    assert run("a.csv", "--figure", "nowhere/f.png").exit_code == 2
    many = Record(
        Path("m"), "", tuple(Channel(f"c{k}", "", np.zeros(2)) for k in range(201)), (Stretch(0, 2, 0.0, 1.0),)
    )
    with pytest.raises(RecordError, match="201 channels do not fit one figure of 200"):
        write_inspection_figure([many], tmp_path / "f.png")
    assert [path.name for path in tmp_path.iterdir()] == ["a.csv"]


@pytest.mark.skipif(not REAL.is_dir(), reason="the shared recordings are not beside the project")
@pytest.mark.parametrize("width", ["80", "120"])
def test_every_real_file_is_shown_or_refused(run, monkeypatch, width):
    monkeypatch.setenv("COLUMNS", width)
    result = run(*(str(path) for path in sorted(REAL.iterdir())))
    assert result.exit_code == 2
    assert result.exception is None or isinstance(result.exception, SystemExit)
    assert "Traceback" not in result.output
    assert all(line.startswith("error: ") for line in result.stderr.splitlines())
    assert len(result.stderr.splitlines()) == 8  # 4 HDR, 2 DAT and 2 CFG without their other half


def test_help_loads_no_numpy():
    code = "import sys, twlocate.commands.inspect; sys.exit('numpy' in sys.modules or 'rich' in sys.modules)"
    assert subprocess.run([sys.executable, "-c", code], check=False).returncode == 0
