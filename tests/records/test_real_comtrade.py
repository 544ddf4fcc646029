"""Real recordings nobody here made, against the `comtrade` package where it reads them, else against the DAT itself.

`comtrade` 0.2.0 keeps microseconds and goes by the rate alone, so times are compared with it only where the stamps
agree with the rate; the files with gaps, without a rate and with many rates are checked against their own stamps.
"""

import shutil
import struct
from dataclasses import dataclass
from pathlib import Path

import comtrade
import numpy as np
import pytest

from twlocate.errors import RecordError
from twlocate.records import read

FOLDER = Path(__file__).parents[3] / "shared" / "recordings" / "comtrade"
pytestmark = pytest.mark.skipif(not FOLDER.is_dir(), reason="the shared recordings are not beside the project")


@dataclass(frozen=True)
class Expected:
    """What must be read of one file; span and rows are those of its DAT."""

    form: str
    rows: int
    span_s: float
    start: str
    stretches: int = 1
    usable: bool = True
    repairs: tuple[str, ...] = ()
    encoding: str = "utf-8"
    compared: bool = True
    """Whether the comtrade package reads it."""
    same_times: bool = True


EXPECTED = {
    "dos-cyrillic-1991.cfg": Expected(
        "1991 ASCII", 6000, 5.999, "2007-01-01T00:45:13.457", repairs=("text is not UTF-8",), encoding="cp866"
    ),
    "earth-fault-30khz-1999-ascii.CFG": Expected(
        "1999 ASCII", 2048, 2047 / 30707.244140625, "2015-11-18T05:33:03.765333",
        repairs=("blank skew", "Ctrl-Z at the end of the data", "stamps missing"),
    ),
    "line-fault-1991-ascii.cfg": Expected(
        "1991 ASCII", 480, 479 / 960, "2011-02-12T11:41:11.081315", repairs=("multiplier 0",)
    ),
    "mixed-1.cfg": Expected(
        "1999 ASCII", 5316, 2.209084, "2017-05-25T08:13:16.587", usable=False, compared=False,
        repairs=("text is not UTF-8", "revision year '2000'", "stamps drift"),
    ),
    "mixed-2.cfg": Expected(
        "1999 BINARY", 19680, 19679 / 1200, "2016-08-22T16:04:22", encoding="cp1251",
        repairs=("text is not UTF-8", "status channel of 4 fields", "19680 rows, 19679 declared", "stamps drift"),
    ),
    "mixed-3.cfg": Expected("1999 BINARY", 1360, 1.698295, "2012-04-06T06:42:59.391076"),
    "mixed-4.CFG": Expected(
        "1999 BINARY", 2400, 2399 / 600, "2014-12-04T07:01:48.813",
        repairs=("revision year '1997'", "2400 rows, 2399 declared", "stamps missing"),
    ),
    "mixed-5.cfg": Expected(
        "2013 BINARY32", 202, 0.1005, "2010-02-22T21:41:29.659551", repairs=("trigger",)
    ),
    "negative-stamps-1999-ascii.cfg": Expected(
        "1999 ASCII", 3584, 3583 / 7678.4833984375, "2012-07-11T08:44:21.051022", usable=False,
        repairs=("samples beyond the stated range", "first stamp is -0.041663 s"),
    ),
    "no-rate-1999-binary.cfg": Expected(
        "1999 BINARY", 8000, 4.995215, "2021-02-17T22:27:49.159106", same_times=False
    ),
    "nonstandard-2013.cff": Expected(
        "2013 ASCII", 186, 0.0185, "2023-05-12T19:45:25.6", compared=False,
        repairs=("section headers", "time codes or time quality missing", "186 rows, 45600 declared", "trigger"),
    ),
    "segments-with-gaps-a.cfg": Expected(
        "1999 ASCII", 950, 17.291, "2012-12-24T17:30:48.384", stretches=5, usable=False, encoding="gb18030",
        repairs=("text is not UTF-8", "last samples of the rates", "1 gap", "times step back", "samples beyond"),
        same_times=False,
    ),
    "segments-with-gaps-b.cfg": Expected(
        "1991 ASCII", 2131, 17.258333 + 0.0775, "2015-09-17T10:52:52.987545", stretches=6, compared=False,
        repairs=("text is not UTF-8", "5 gaps", "first stamp is -0.0775 s"),
    ),
    "unit-sample_ascii.cff": Expected(
        "2013 ASCII", 40, 0.0325, "2011-01-12T11:25:30.075011", usable=False, repairs=("first stamp is 0.0725 s",)
    ),
    "unit-sample_ascii.cfg": Expected(
        "2013 ASCII", 40, 0.0325, "2011-01-12T11:25:30.075011", usable=False, repairs=("first stamp is 0.0725 s",)
    ),
    "unit-sample_bin.cfg": Expected(
        "1999 BINARY", 5, 4 / 15360, "2017-01-07T15:35:41.958268", repairs=("all stamps equal",)
    ),
    "unit-sample_float32.cff": Expected(
        "2013 FLOAT32", 301, 3.0, "2021-02-17T17:37:12.422969065", repairs=("stamps count in a unit 1e+06",)
    ),
    "unit-sample_iso8859-1.cfg": Expected(
        "2013 ASCII", 40, 0.0325, "2011-01-12T11:25:30.075011", usable=False, encoding="latin-1",
        repairs=("text is not UTF-8", "first stamp is 0.0725 s"),
    ),
    "unit-sample_iso8859-1_bin.cfg": Expected(
        "2013 BINARY", 40, 0.0325, "2011-01-12T11:25:30.75011", encoding="latin-1", repairs=("text is not UTF-8",)
    ),
    "variable-step-1999-binary.cfg": Expected(
        "1999 BINARY", 20700, 689.7858, "2016-04-08T04:39:50.5981",
        repairs=("Ctrl-Z at the end of the text", "8 bytes after the last whole row"),
    ),
}  # fmt: skip


def companion(path: Path) -> Path:
    return next(other for other in path.parent.iterdir() if other.stem == path.stem and other.suffix.lower() == ".dat")


def all_times_s(record) -> np.ndarray:
    return np.concatenate([stretch.times_s() for stretch in record.stretches])


@pytest.mark.parametrize("name", EXPECTED)
def test_rows_time_axis_and_repairs(name):
    expected, record = EXPECTED[name], read(FOLDER / name)
    assert record.format == f"COMTRADE {expected.form}"
    assert record.n_samples == expected.rows
    times = all_times_s(record)
    assert np.max(times) - np.min(times) == pytest.approx(expected.span_s, abs=1.1e-6)
    assert record.start_ns == np.datetime64(expected.start, "ns").astype(np.int64)
    assert len(record.stretches) == expected.stretches
    assert record.clock.usable == expected.usable
    whats = [repair.what for repair in record.repairs]
    assert len(whats) == len(expected.repairs)
    assert all(what.startswith(start) for what, start in zip(whats, expected.repairs, strict=True))


@pytest.mark.parametrize("name", [name for name, expected in EXPECTED.items() if expected.compared])
@pytest.mark.filterwarnings("ignore")
def test_samples_are_those_of_an_independent_reader(name):
    expected, path = EXPECTED[name], FOLDER / name
    other = comtrade.Comtrade(use_numpy_arrays=True, use_double_precision=True, ignore_warnings=True)
    files = [str(path)] if path.suffix == ".cff" else [str(path), str(companion(path))]
    other.load(*files, encoding=expected.encoding)
    record = read(path)
    rows = len(other.time)
    assert rows in (expected.rows, expected.rows - 1)
    for channel, samples in zip(record.channels, other.analog, strict=True):
        np.testing.assert_array_equal(channel.samples[:rows], samples)
    for channel, states in zip(record.status, other.status, strict=True):
        np.testing.assert_array_equal(channel.states[:rows], states)
    if expected.same_times:
        np.testing.assert_allclose(all_times_s(record)[:rows], np.asarray(other.time) - other.time[0], atol=1e-12)


def dat_fields(path: Path, skip: bytes = b"") -> list[list[bytes]]:
    """Split an ASCII DAT by hand."""
    content = path.read_bytes().partition(skip)[2] if skip else path.read_bytes()
    return [row.split(b",") for row in content.replace(b"\r", b"").split(b"\n") if row.count(b",") > 2]


@pytest.mark.parametrize(
    ("name", "dat", "skip", "scales"),
    [
        ("mixed-1.cfg", "mixed-1.dat", b"", (0.016552, 0.0)),
        ("segments-with-gaps-b.cfg", "segments-with-gaps-b.dat", b"", (0.001, 0.0)),
        ("nonstandard-2013.cff", "nonstandard-2013.cff", b"-- file type  DAT ---", (0.007854353, 0.0)),
    ],
)
def test_samples_split_by_hand_where_no_other_reader_does(name, dat, skip, scales):
    record = read(FOLDER / name)
    rows = [row for row in dat_fields(FOLDER / dat, skip) if len(row) == 2 + len(record.channels) + len(record.status)]
    assert len(rows) == record.n_samples
    a, b = scales
    np.testing.assert_allclose(record.channels[0].samples, [a * int(row[2]) + b for row in rows], rtol=1e-15)
    last = [int(row[-1]) for row in rows]
    np.testing.assert_array_equal(record.status[-1].states, last)


@pytest.mark.parametrize("name", ["segments-with-gaps-a", "segments-with-gaps-b", "mixed-1"])
def test_times_are_the_stamps_of_the_dat(name):
    stamps = np.array([int(row[1]) for row in dat_fields(FOLDER / f"{name}.dat")])
    np.testing.assert_allclose(all_times_s(read(FOLDER / f"{name}.cfg")), (stamps - stamps[0]) * 1e-6, atol=1.1e-6)


@pytest.mark.parametrize(("name", "size"), [("no-rate-1999-binary", 64), ("variable-step-1999-binary", 50)])
def test_times_of_binary_files_without_a_rate_are_their_stamps(name, size):
    content = (FOLDER / f"{name}.dat").read_bytes()
    stamps = np.array([struct.unpack_from("<I", content, size * k + 4)[0] for k in range(len(content) // size)])
    record = read(FOLDER / f"{name}.cfg")
    np.testing.assert_allclose(all_times_s(record), (stamps - stamps[0]) * 1e-6, atol=1.001e-6)


def test_the_fault_of_the_line_record_is_where_its_source_says():
    """Onset 0.052 s after the start in IC and IG, by the collection's own description."""
    record = read(FOLDER / "line-fault-1991-ascii.cfg")
    times = all_times_s(record)
    for name in ("IC", "IG"):
        samples = record.channel(name).samples
        before = np.max(np.abs(samples[times < 0.03]))
        onset_s = times[np.flatnonzero(np.abs(samples) > 2.0 * before)[0]]
        assert onset_s == pytest.approx(0.052, abs=0.004)


@pytest.mark.parametrize("kind", ["ascii", "bin"])
def test_missing_codes_become_nan_with_a_count(tmp_path, kind):
    """Sample k + 1 of channel k carries the code in the ASCII file, sample k in the binary one."""
    shutil.copy(FOLDER / f"unit-sample_{kind}.cfg", tmp_path / "m.cfg")
    shutil.copy(FOLDER / f"unit-sample_{kind}_missing.dat", tmp_path / "m.dat")
    record = read(tmp_path / "m.cfg")
    gone = [np.flatnonzero(np.isnan(channel.samples)).tolist() for channel in record.channels]
    assert gone == [[k + (kind == "ascii")] for k in range(4)]
    assert sum(repair.what == "1 sample missing" for repair in record.repairs) == 1
    assert all(channel.missing == 1 for channel in record.channels)


OTHERS = sorted(path.name for path in FOLDER.iterdir() if path.name not in EXPECTED) if FOLDER.is_dir() else []


@pytest.mark.parametrize("name", [name for name in OTHERS if not name.lower().endswith(".dat")])
def test_every_other_file_is_refused_in_one_line(name):
    with pytest.raises(RecordError, match=rf"^[^\n]*{name}: [^\n]+$"):
        read(FOLDER / name)


@pytest.mark.parametrize("name", [name for name in OTHERS if name.lower().endswith(".dat")])
def test_the_dat_leads_to_the_same_record_as_its_cfg(name):
    if "missing" in name:
        with pytest.raises(RecordError, match=r"no unit-sample_\w+_missing\.cfg beside it"):
            read(FOLDER / name)
    else:
        cfg = next(path for path in FOLDER.iterdir() if path.stem == Path(name).stem and path.suffix.lower() == ".cfg")
        assert read(FOLDER / name).start_ns == read(cfg).start_ns


@pytest.mark.parametrize("name", ["unit-sample_ascii_utf-8.cfg", "unit-sample_sub_char.cfg"])
def test_configurations_without_a_dat_read_with_a_borrowed_one(tmp_path, name):
    with pytest.raises(RecordError, match=r"no .*\.dat beside it"):
        read(FOLDER / name)
    shutil.copy(FOLDER / name, tmp_path / "b.cfg")
    shutil.copy(FOLDER / "unit-sample_ascii.dat", tmp_path / "b.dat")
    record = read(tmp_path / "b.cfg")
    assert record.n_samples == 40
    assert ("Ctrl-Z at the end of the text" in [repair.what for repair in record.repairs]) == ("sub_char" in name)
