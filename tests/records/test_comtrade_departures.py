"""Each departure from the standard met in the wild: read all the same, and written down."""

import dataclasses
from dataclasses import dataclass

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from twlocate.errors import RecordError
from twlocate.records import read

START_NS = 1772424667_250000000  # 2026-03-02T04:11:07.25Z


@dataclass(frozen=True)
class Written:
    """A small pair of files, every line open to change."""

    head: str = "north,recorder,1999"
    counts: str = "3,2A,1D"
    analog: tuple[str, ...] = (
        "1,U L1,A,line,kV,0.5,1,0,-32767,32767,1000,1,P", "2,I L1,A,line,A,2,0,0,-32767,32767,200,1,S",
    )  # fmt: skip
    status: tuple[str, ...] = ("1,trip,,,0",)
    frequency: str = "50"
    rates: tuple[str, ...] = ("1", "1000,8")
    start: str = "02/03/2026,04:11:07.250000"
    trigger: str = "02/03/2026,04:11:07.252000"
    tail: tuple[str, ...] = ("ASCII", "1")
    rows: tuple[str, ...] = tuple(f"{k},{1000 * (k - 1)},{10 * k},{-k},{k % 2}" for k in range(1, 9))
    line_end: str = "\r\n"
    encoding: str = "utf-8"

    def to(self, folder, *, data=None, name="e", suffixes=(".cfg", ".dat")):
        lines = [self.head, self.counts, *self.analog, *self.status, self.frequency, *self.rates]
        lines += [self.start, self.trigger, *self.tail]
        (folder / f"{name}{suffixes[0]}").write_bytes(self.line_end.join([*lines, ""]).encode(self.encoding))
        rows = self.line_end.join([*self.rows, ""]).encode() if data is None else data
        (folder / f"{name}{suffixes[1]}").write_bytes(rows)
        return folder / f"{name}{suffixes[0]}"


def whats(record):
    return [repair.what for repair in record.repairs]


def test_a_file_to_the_letter_needs_no_repair(tmp_path):
    record = read(Written().to(tmp_path))
    assert not record.repairs
    assert record.start_ns == START_NS
    assert record.trigger_s == pytest.approx(0.002)
    assert record.channel("U L1").samples.tolist() == [10 * k * 0.5 + 1 for k in range(1, 9)]
    assert (record.channel("U L1").side, record.channel("U L1").ratio) == ("primary", 1000.0)
    assert (record.channel("I L1").side, record.channel("I L1").ratio) == ("secondary", 200.0)
    assert record.channel("U L1").high == 32767 * 0.5 + 1
    assert record.status[0].states.tolist() == [1, 0] * 4


@pytest.mark.parametrize(
    ("change", "what", "start_ns"),
    [
        ({"start": "02/03/26,04:11:07.250000", "trigger": "02/03/26,04:11:07.25200"}, "year of two digits", START_NS),
        ({"start": "02/03/2026,04:11:07"}, "0 digits of a second", START_NS - 250_000_000),
        ({"start": "02/03/2026,04:11:07.25000"}, "5 digits of a second", START_NS),
        ({"start": "02/03/2026,04:11:07.25000000012"}, "11 digits of a second", START_NS),
        ({"start": "2026-03-02,04:11:07.250000"}, "date starts with the year", START_NS),
        ({"start": "02/03/2026,04:10:60.250000"}, "time of day 04:10:60", START_NS - 7 * 10**9),
        ({"start": "01/03/2026,24:00:00.000000"}, "time of day 24:00:00", START_NS - 15067_250_000_000),
        ({"start": "03/22/2026,04:11:07.250000"}, "month 22", START_NS + 20 * 86400 * 10**9),
        ({"start": "02/03/2026 04:11:07,250000"}, None, START_NS),
        ({"start": "2/3/2026,4:11:07.250000000"}, None, START_NS),
        ({"start": "00/00/0000,00:00:00.000000"}, "no date and time", None),
        ({"start": ""}, "no date and time in ''", None),
        ({"start": "31/02/2026,04:11:07.250000"}, "no date and time", None),
    ],
)
def test_dates(tmp_path, change, what, start_ns):
    record = read(Written(**change).to(tmp_path))
    assert record.start_ns == start_ns
    assert record.clock.usable == (start_ns is not None)
    assert what is None or any(text.startswith(what) for text in whats(record))


def test_1991_writes_the_month_first(tmp_path):
    short = tuple(",".join(line.split(",")[:10]) for line in Written().analog)
    written = Written(
        head="north,recorder", analog=short, status=("1,trip,0",), start="03/02/26,04:11:07.250000",
        trigger="03/02/26,04:11:07.252000", tail=("ASCII",),
    )  # fmt: skip
    record = read(written.to(tmp_path))
    assert record.format == "COMTRADE 1991 ASCII"
    assert record.start_ns == START_NS
    assert not record.repairs


@pytest.mark.parametrize(
    ("change", "what"),
    [
        ({"head": "north,recorder"}, "no revision year"),
        ({"head": "north,recorder,2000"}, "revision year '2000'"),
        ({"head": "north,recorder,1997"}, "revision year '1997'"),
        ({"head": "north,recorder,edition"}, "revision year 'edition'"),
        ({"counts": "9,2A,1D"}, "total of 9 channels"),
        ({"counts": "3,2a,1d"}, None),
        ({"analog": ("1,U,a,,kV,0.5,1,,-32767,32767,1,1,P", Written().analog[1])}, "blank skew"),
        ({"analog": ("1,U,a,,kV,0.5,,0,-32767,32767,1,1,P", Written().analog[1])}, "blank offset"),
        ({"analog": ("1,U,a,,kV,0.5,1,0,,32767,1,1,P", Written().analog[1])}, "blank minimum"),
        ({"analog": ("1,U, L1,A,line,kV,0.5,1,0,-1,1,1,1,P", Written().analog[1])}, "1 fields too many"),
        ({"analog": (Written().analog[0].replace("-32767,32767", "-9,9"), Written().analog[1])}, "samples beyond"),
        ({"status": ("1,trip",)}, "status channel of 2 fields"),
        ({"status": ("1,trip,,,",)}, "status channel of 5 fields"),
        ({"frequency": "mains"}, "line frequency 'mains'"),
        ({"frequency": "50.0"}, None),
        ({"tail": ("ascii", "1.0")}, None),
        ({"tail": ("ASCII", "")}, "blank time multiplier"),
        ({"tail": ("ASCII", "0")}, "time multiplier 0"),
        ({"tail": ("BINARY", "1")}, "file type BINARY"),
        ({"tail": ()}, "file type ''"),
        ({"tail": ("ASCII", "1", "\x1a\x1a")}, "Ctrl-Z"),
        ({"rates": ("0",)}, "no line for the last sample"),
        ({"rates": ("1", "1000,5")}, "8 rows, 5 declared"),
        ({"rates": ("1", "1000,45600")}, "8 rows, 45600 declared"),
        ({"rates": ("2", "1000,8", "1000,8")}, "last samples of the rates do not rise"),
        ({"trigger": "01/01/1970,00:00:00.000000"}, "trigger -1.77242e+09 s after the start"),
        ({"line_end": "\n"}, None),
        ({"line_end": "\r"}, None),
    ],
)
def test_departures_of_the_cfg(tmp_path, change, what):
    record = read(Written(**change).to(tmp_path))
    assert record.n_samples == 8
    assert whats(record) == [] if what is None else any(text.startswith(what) for text in whats(record))
    assert record.channels[0].samples[0] in (6.0, 5.0)


@pytest.mark.parametrize(
    ("change", "message"),
    [
        ({"counts": "many"}, "CFG line 2 is 'many'"),
        ({"counts": "0,0A,0D"}, "declares no channel"),
        ({"counts": "90,80A,10D"}, "declares 90 channels, but only 10 lines follow"),
        ({"analog": ("1,U", Written().analog[1])}, "CFG line 3 has 2 fields; an analog channel needs 10"),
        ({"analog": ("1,U,a,,kV,x,1,0,-1,1,1,1,P", Written().analog[1])}, "CFG line 3: the multiplier 'x'"),
        ({"rates": ("one", "1000,8")}, "the number of sampling rates belongs there"),
        ({"rates": ("900", "1000,8")}, "declares 900 sampling rates, but only"),
        ({"rates": ("1", "fast")}, "a rate and its last sample belong there"),
        ({"rates": ("1", "-5,8")}, "-5 Hz up to sample 8 is no sampling rate"),
        ({"rates": ("0", "0,8"), "rows": ("1,,1,1,0", "2,,2,2,0")}, "neither a sampling rate nor a usable stamp"),
        ({"rows": ("1,0,5",)}, "no row of 5 fields"),
        ({"rows": ("",)}, "holds no samples"),
    ],
)
def test_what_cannot_be_read_is_refused_by_line(tmp_path, change, message):
    with pytest.raises(RecordError, match=rf"e\.cfg: .*{message}"):
        read(Written(**change).to(tmp_path))


HARMLESS = {
    "head": ["north,recorder", "north,recorder,1999", "north,recorder,2000", "north,recorder,1997"],
    "counts": ["3,2A,1D", "9,2A,1D", "3, 2a, 1d", "003,002A,001D,"],
    "status": [("1,trip,,,0",), ("1,trip",), ("1,trip,x,y,z,0",)],
    "frequency": ["50", "50.0", "mains", ""],
    "rates": [
        ("1", "1000,8"),
        ("1", "1000.000,45600"),
        ("0", "0,8"),
        ("0",),
        ("2", "1000,8", "1000,8"),
        ("1", "1000,3"),
    ],
    "start": ["02/03/2026,04:11:07.250000", "02/03/26,04:11:07.25", "2026/03/02,04:11:07.250000000"],
    "trigger": ["02/03/2026,04:11:07.252000", "01/01/1970,00:00:00.000000", ""],
    "tail": [("ASCII", "1"), ("ascii", ""), ("BINARY", "1"), (), ("ASCII", "1", "\x1a" * 40)],
    "line_end": ["\r\n", "\n", "\r"],
    "encoding": ["utf-8", "utf-8-sig", "utf-16"],
}
"""Variants of each part that leave samples and times as they are."""


@given(st.fixed_dictionaries({part: st.sampled_from(variants) for part, variants in HARMLESS.items()}))
@settings(max_examples=150, suppress_health_check=[HealthCheck.function_scoped_fixture], deadline=None)
def test_departures_add_up(tmp_path, changes):
    record = read(Written(**changes).to(tmp_path))
    assert record.start_ns == START_NS
    assert record.channel("U L1").samples.tolist() == [10 * k * 0.5 + 1 for k in range(1, 9)]
    assert record.channel("I L1").samples.tolist() == [-2 * k for k in range(1, 9)]
    assert record.status[0].states.tolist() == [1, 0] * 4
    assert len(record.stretches) == 1
    np.testing.assert_allclose(record.stretches[0].times_s(), np.arange(8) / 1000, atol=1e-12)
    assert record.clock.usable


def test_any_letter_case_and_either_file(tmp_path):
    Written().to(tmp_path, suffixes=(".CFG", ".Dat"))
    for name in ("e.CFG", "e.Dat"):
        assert read(tmp_path / name).n_samples == 8
    (tmp_path / "e.Dat").unlink()
    with pytest.raises(RecordError, match=r"no e\.dat beside it"):
        read(tmp_path / "e.CFG")


@pytest.mark.parametrize(
    ("encoding", "name"),
    [
        ("utf-8-sig", "Überstrom µ"), ("utf-16", "Überstrom µ"), ("cp1251", "терминал версия защиты"),
        ("cp866", "Пуск осциллографа защиты"), ("gb18030", "南自线路保护装置"), ("cp1252", "Oscilógrafo de Medição"),
        ("shift_jis", "変電所の記録装置です"),
    ],
)  # fmt: skip
def test_encodings(tmp_path, encoding, name):
    record = read(Written(head=f"{name},recorder,1999", encoding=encoding).to(tmp_path))
    assert record.station == name
    assert bool(record.repairs) == (not encoding.startswith("utf"))


def stamped(stamps):
    return tuple(f"{k},{stamp},{10 * k},{-k},0" for k, stamp in enumerate(stamps, 1))


def starts(record):
    return [(s.first, s.count, round(s.start_s, 9)) for s in record.stretches]


def test_gaps_from_the_stamps_are_kept(tmp_path):
    record = read(Written(rows=stamped([0, 1000, 2000, 3000, 903000, 904000, 905000, 906000])).to(tmp_path))
    assert starts(record) == [(0, 4, 0.0), (4, 4, 0.903)]
    assert whats(record) == ["1 gap in the times"]
    assert record.clock.usable


def test_a_window_finds_the_gap_too(tmp_path):
    record = read(Written(rows=stamped([0, 1000, 2000, 3000, 903000, 904000, 905000, 906000])).to(tmp_path), (0.9, 1.0))
    assert starts(record) == [(0, 4, 0.903)]
    assert record.channels[0].samples[0] == 26.0


@pytest.mark.parametrize("wrap", [2**16, 2**32, 10**6])
def test_stamps_that_wrap_are_counted_on(tmp_path, wrap):
    stamps = [(wrap - 4000 + 1000 * k) % wrap for k in range(8)]
    record = read(Written(rows=stamped(stamps), rates=("0", "0,8")).to(tmp_path))
    assert starts(record) == [(0, 8, 0.0)]
    assert record.stretches[0].rate_hz == pytest.approx(1000.0)
    assert f"stamps wrap 1 time at {wrap}" in whats(record)


def test_steps_back_that_are_no_wrap_free_the_clock(tmp_path):
    record = read(Written(rows=stamped([0, 1000, 2000, 3000, 500, 1500, 2500, 3500])).to(tmp_path))
    assert starts(record) == [(0, 4, 0.0), (4, 4, 0.0005)]
    assert not record.clock.usable


def test_no_rate_uneven_stamps_rule(tmp_path):
    stamps = [0, 1000, 2100, 2900, 4000, 5500, 6000, 7000]
    record = read(Written(rows=stamped(stamps), rates=("0", "0,8")).to(tmp_path))
    np.testing.assert_allclose(record.stretches[0].times_s(), np.array(stamps) * 1e-6)


def test_missing_stamps_are_counted_on_by_the_rate(tmp_path):
    record = read(Written(rows=stamped([0, "", 2000, "", "", 905000, 906000, 907000])).to(tmp_path))
    assert "3 stamps missing" in whats(record)
    assert starts(record) == [(0, 5, 0.0), (5, 3, 0.905)]
    with pytest.raises(RecordError, match="3 samples have no stamp and there is no sampling rate"):
        read(Written(rows=stamped([0, "", 2000, "", "", 5000, 6000, 7000]), rates=("0", "0,8")).to(tmp_path))


def test_jumps_of_the_sample_number_are_gaps_where_no_stamp_tells(tmp_path):
    rows = tuple(f"{k},,{k},0,0" for k in (1, 2, 3, 4, 8, 9, 10, 11))
    record = read(Written(rows=rows).to(tmp_path))
    assert starts(record) == [(0, 4, 0.0), (4, 4, 0.007)]
    assert "sample numbers jump" in whats(record)


def test_several_rates_are_several_stretches(tmp_path):
    stamps = [0, 1000, 2000, 3000, 4000, 14000, 24000, 34000]
    record = read(Written(rates=("2", "1000,4", "100,8"), rows=stamped(stamps)).to(tmp_path))
    assert [(s.first, s.count, s.start_s, s.rate_hz) for s in record.stretches] == [
        (0, 4, 0.0, 1000.0), (4, 4, 0.004, 100.0),
    ]  # fmt: skip
    assert not record.repairs


def test_stamps_at_odds_with_the_rate_win_and_free_the_clock(tmp_path):
    record = read(Written(rows=stamped([1250 * k for k in range(8)])).to(tmp_path))
    np.testing.assert_allclose(record.stretches[0].times_s(), 1.25e-3 * np.arange(8))
    assert not record.clock.usable
    assert "stamps advance 1.25 times as fast as the sampling rate says" in whats(record)


def test_a_first_sample_number_of_0_is_nothing_special(tmp_path):
    record = read(Written(rows=tuple(f"{k},{1000 * k},1,1,0" for k in range(8))).to(tmp_path))
    assert not record.repairs


def test_first_stamp_other_than_0(tmp_path):
    from_trigger = read(Written(rows=stamped([1000 * k - 2000 for k in range(8)])).to(tmp_path))
    assert from_trigger.clock.usable
    assert starts(from_trigger) == [(0, 8, 0.0)]
    unexplained = read(Written(rows=stamped([1000 * k + 7000 for k in range(8)])).to(tmp_path))
    assert not unexplained.clock.usable
    assert "0.007 s away" in unexplained.clock.notes[-1]


def test_skew_moves_the_channel_and_not_the_record(tmp_path):
    analog = (Written().analog[0].replace(",1,0,", ",1,125,"), Written().analog[1])
    record = read(Written(analog=analog).to(tmp_path))
    (first, _), (second, _) = next(record.pieces(record.channels[0])), next(record.pieces(record.channels[1]))
    np.testing.assert_allclose(first - second, 125e-6)


def binary_rows(count, analog=(7, -5), status=1, first=1):
    rows = [(k + first, 1000 * k) for k in range(count)]
    return b"".join(
        number.to_bytes(4, "little") + stamp.to_bytes(4, "little")
        + b"".join(value.to_bytes(2, "little", signed=True) for value in analog) + status.to_bytes(2, "little")
        for number, stamp in rows
    )  # fmt: skip


def test_stray_and_cut_tails_of_binary_data(tmp_path):
    written = Written(tail=("BINARY", "1"))
    stray = read(written.to(tmp_path, data=binary_rows(8) + b"\x1a" * 9))
    assert (stray.n_samples, whats(stray)) == (8, ["9 bytes after the last whole row"])
    assert stray.repairs[0].assumed == "stray bytes, ignored"
    cut = read(written.to(tmp_path, data=binary_rows(8)[:-3]))
    assert (cut.n_samples, cut.repairs[0].assumed) == (7, "a row cut short, left out")


def test_a_wrong_binary_type_is_told_by_the_sample_numbers(tmp_path):
    record = read(Written(tail=("BINARY32", "1")).to(tmp_path, data=binary_rows(8)))
    assert record.format == "COMTRADE 1999 BINARY"
    assert record.channels[0].samples.tolist() == [4.5] * 8
    assert whats(record) == ["file type BINARY32"]


def test_missing_code_of_1991_only_where_minus_one_is_out_of_range(tmp_path):
    short = ("1,U,A,,kV,1,0,0,0,4095", "2,I,A,,A,1,0,0,-2047,2047")
    written = Written(head="n,r", analog=short, status=("1,trip,0",), tail=("BINARY",))
    record = read(written.to(tmp_path, data=binary_rows(8, analog=(-1, -1))))
    assert [channel.missing for channel in record.channels] == [8, 0]


U_4 = 1e-6 / np.sqrt(3)
"""Code 4 bounds the clock to 1 µs: rectangular, GUM 4.3.7."""


@pytest.mark.parametrize(
    ("codes", "u_s", "usable", "offset_s"),
    [
        (("0,0", "4,0"), U_4, True, 0),
        (("-5h30,-5h30", "9,0"), 0.1 / np.sqrt(3), True, -19800),
        (("+1,+1", "0,0"), None, True, 3600),
        (("x,x", "F,0"), None, False, None),
        (("0,0", "4,1"), U_4, False, 0),
        (("0,0", "4,3"), U_4, True, 0),
        (("0,0", "D,0"), None, False, 0),
        (("late,0", "4,0"), U_4, True, None),
        ((), None, True, None),
    ],
)
def test_time_codes_become_the_clock(tmp_path, codes, u_s, usable, offset_s):
    record = read(Written(head="n,r,2013", tail=("ASCII", "1", *codes)).to(tmp_path))
    assert record.clock.u_s == (None if u_s is None else pytest.approx(u_s))
    assert (record.clock.usable, record.clock.utc_offset_s) == (usable, offset_s)
    assert record.start_ns == START_NS - (offset_s or 0) * 10**9


def test_nine_digits_make_the_stamps_nanoseconds(tmp_path):
    written = Written(
        head="n,r,2013", start="02/03/2026,04:11:07.250000001", trigger="02/03/2026,04:11:07.250000001",
        rates=("0", "0,8"), rows=stamped([400 * k for k in range(8)]), tail=("ASCII", "1", "0,0", "4,0"),
    )  # fmt: skip
    record = read(written.to(tmp_path))
    assert (record.start_ns, record.resolution_ns) == (START_NS + 1, 1)
    assert record.stretches[0].rate_hz == pytest.approx(2.5e6)


def test_cff_with_a_wrong_length_and_loose_headers(tmp_path):
    pair = Written(tail=("BINARY", "1")).to(tmp_path, data=binary_rows(8))
    cfg, data = pair.read_bytes(), pair.with_suffix(".dat").read_bytes()
    cff = tmp_path / "e.cff"
    cff.write_bytes(b"-- file type CFG ---\r\n" + cfg + b"--- FILE TYPE: DAT BINARY: 999 ---\r\n" + data)
    record = read(cff)
    assert record.n_samples == 8
    assert whats(record) == ["section headers not as the standard writes them", "DAT section of 112 bytes, 999 stated"]
    cff.write_bytes(cfg)
    with pytest.raises(RecordError, match="no CFG and then DAT section header"):
        read(cff)


def test_what_follows_the_stated_length_of_a_cff_is_no_data(tmp_path):
    pair = Written(tail=("BINARY", "1")).to(tmp_path, data=binary_rows(8))
    data = pair.with_suffix(".dat").read_bytes()
    head = f"--- file type: DAT BINARY: {len(data)} ---\r\n".encode()
    (tmp_path / "e.cff").write_bytes(b"--- file type: CFG ---\r\n" + pair.read_bytes() + head + data + data[:28])
    record = read(tmp_path / "e.cff")
    assert record.n_samples == 8
    assert whats(record) == ["DAT section of 140 bytes, 112 stated"]


def test_the_repairs_say_where_what_and_how_sure(tmp_path):
    analog = tuple(line.replace(",0,-32767", ",,-32767") for line in Written().analog)
    (repair,) = read(Written(analog=analog).to(tmp_path)).repairs
    assert dataclasses.astuple(repair) == ("blank skew", "CFG line 3, 4", "taken as 0", "likely")


@pytest.mark.parametrize("field", ["", "  ", "2", "x", "-1"])
def test_a_state_that_is_none_is_written_down(tmp_path, field):
    rows = (f"1,0,10,-1,{field}", *Written().rows[1:])
    record = read(Written(rows=rows).to(tmp_path))
    assert record.status[0].states.tolist() == [0, 0, 1, 0, 1, 0, 1, 0]
    assert whats(record) == ["status fields that are neither 0 nor 1"]


def test_rows_out_of_shape_are_left_out_and_their_neighbours_kept(tmp_path):
    rows = [*Written().rows[:3], "4,3000,40", "free text", "", *Written().rows[4:]]
    record = read(Written(rows=tuple(rows)).to(tmp_path))
    assert record.n_samples == 7
    assert starts(record) == [(0, 3, 0.0), (3, 4, 0.004)]
    assert "rows with too few fields" in whats(record)


def test_a_cut_last_row_is_no_sample(tmp_path):
    record = read(Written(rows=(*Written().rows[:-1], "8,7000,8")).to(tmp_path))
    assert record.n_samples == 7
    assert whats(record) == ["rows with too few fields", "7 rows, 8 declared"]


def test_a_line_end_in_the_middle_of_a_row_moves_no_field(tmp_path):
    rows = list(Written().rows)
    rows[2], rows[3] = "3,2000,30,-3", "1,4,3000,40,-4,0"
    record = read(Written(rows=tuple(rows)).to(tmp_path))
    assert record.channel("U L1").samples.tolist() == [10 * k * 0.5 + 1 for k in range(1, 9)]
    assert record.status[0].states.tolist() == [1, 0] * 4


@pytest.mark.parametrize("blank", ["", " ", "   ", "\t"])
@pytest.mark.parametrize("place", range(2, 4))
def test_a_blank_reading_is_never_invented(tmp_path, blank, place):
    rows = [row.split(",") for row in Written().rows]
    rows[4][place] = blank
    record = read(Written(rows=tuple(",".join(row) for row in rows)).to(tmp_path))
    channel = record.channels[place - 2]
    assert np.flatnonzero(np.isnan(channel.samples)).tolist() == [4]
    assert whats(record) == ["1 sample missing"]


def test_signs_and_leading_zeros_of_counts(tmp_path):
    rows = tuple(f"{k:04d},{1000 * (k - 1):06d},+{k:06d},-{k:06d},0" for k in range(1, 9))
    record = read(Written(rows=rows).to(tmp_path))
    assert record.channel("U L1").samples.tolist() == [0.5 * k + 1 for k in range(1, 9)]
    assert not record.repairs


def test_decimals_in_an_ascii_file_are_counts_too(tmp_path):
    rows = tuple(f"{k},{1000 * (k - 1)},{k + 0.25},{-k * 1e-3:e},1" for k in range(1, 9))
    record = read(Written(rows=rows).to(tmp_path))
    assert record.channel("U L1").samples.tolist() == [0.5 * (k + 0.25) + 1 for k in range(1, 9)]
    assert not record.repairs
