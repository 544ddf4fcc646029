"""A CFG text built from random facts gives the facts back; and the single parts of one."""

import dataclasses
import datetime
import time

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from twlocate.errors import RecordError
from twlocate.records.comtrade.clock import QUALITY_BOUND_S, quality_u_s, stated_clock
from twlocate.records.comtrade.configuration import AnalogLine, RateLine, StatusLine, parse_configuration
from twlocate.records.comtrade.container import find_parts
from twlocate.records.comtrade.dates import read_moment, read_time_code, utc_ns
from twlocate.records.comtrade.scaling import MISSING, scale_block, scaling_of
from twlocate.records.moments import day_ns
from twlocate.records.repairs import RepairLog
from twlocate.records.text import decode

NAMES = st.text(
    st.characters(codec="utf-8", exclude_characters=",\r\n\x1a\0", exclude_categories=("C", "Z")), max_size=12
)
NUMBERS = st.floats(-1e9, 1e9, allow_nan=False).map(lambda number: float(f"{number:.9g}"))
ANALOG = st.builds(
    AnalogLine, name=NAMES, phase=st.sampled_from(["", "A", "N"]), unit=st.sampled_from(["kV", "A", "°"]),
    a=NUMBERS.filter(bool), b=NUMBERS, skew_us=NUMBERS, low=NUMBERS, high=NUMBERS, primary=st.just(1000.0),
    secondary=st.just(1.0), side=st.sampled_from(["P", "S"]),
)  # fmt: skip
STATUS = st.builds(StatusLine, name=NAMES, normal=st.integers(0, 1))


def text_of(analog, status, rates, line_end):
    lines = ["north,recorder,2013", f"{len(analog) + len(status)},{len(analog)}A,{len(status)}D"]
    for index, c in enumerate(analog, 1):
        numbers = [c.a, c.b, c.skew_us, c.low, c.high, c.primary, c.secondary]
        lines.append(f"{index},{c.name},{c.phase},,{c.unit},{','.join(map(repr, numbers))},{c.side}")
    lines += [f"{index},{c.name},,,{c.normal}" for index, c in enumerate(status, 1)]
    lines += ["50", str(len(rates)), *(f"{rate.rate_hz!r},{rate.last}" for rate in rates)]
    lines += ["02/03/2026,04:11:07.250000000"] * 2 + ["binary32", "1", "0,0", "4,0"]
    return line_end.join(lines)


@given(
    analog=st.lists(ANALOG, min_size=1, max_size=4), status=st.lists(STATUS, max_size=3),
    lasts=st.lists(st.integers(1, 10**9), min_size=1, max_size=4, unique=True).map(sorted),
    line_end=st.sampled_from(["\n", "\r\n", "\r"]),
)  # fmt: skip
@settings(max_examples=80)
def test_facts_come_back(analog, status, lasts, line_end):
    rates = tuple(RateLine(1000.0 * (k + 1), last) for k, last in enumerate(lasts))
    log = RepairLog()
    configuration = parse_configuration(text_of(analog, status, rates, line_end), log)
    assert configuration.analog == tuple(analog)
    assert configuration.status == tuple(status)
    assert configuration.rates == rates
    assert configuration.declared_rows == lasts[-1]
    assert (configuration.file_type, configuration.edition, configuration.tick_s) == ("BINARY32", 2013, 1e-9)
    assert (configuration.time_offset_s, configuration.time_quality, configuration.leap_second) == (0, "4", "0")
    assert not log.repairs


CHANNEL = AnalogLine("U", "A", "kV", 1.0, 0.0, 0.0, -9.0, 9.0, 1.0, 1.0, "P")
PLAIN = text_of([CHANNEL], [], [RateLine(1000.0, 8)], "\n").split("\n")


@given(cut=st.integers(0, len(PLAIN) - 1), spoilt=st.text(max_size=20))
def test_any_line_spoilt_is_repaired_or_refused(cut, spoilt):
    lines = [*PLAIN[:cut], spoilt, *PLAIN[cut + 1 :]]
    try:
        configuration = parse_configuration("\n".join(lines), RepairLog())
    except RecordError:
        return
    assert configuration.analog or configuration.status


@pytest.mark.parametrize("count", range(2, len(PLAIN) - 4))
def test_a_text_that_ends_early_says_what_should_follow(count):
    with pytest.raises(RecordError, match=r"should follow|only \d+ lines? follow"):
        parse_configuration("\n".join(PLAIN[: count - 1]), RepairLog())


def test_a_rate_of_zero_leaves_the_time_to_the_stamps():
    log = RepairLog()
    lines = [line.replace("1000.0,8", "0,8") for line in PLAIN]
    assert parse_configuration("\n".join(lines), log).rates == ()
    assert log.repairs[0].what == "sampling rate of 0"


@given(st.dates(datetime.date(1980, 1, 1), datetime.date(2069, 12, 31)))
def test_both_orders_of_day_and_month(day):
    midnight = day_ns(day.year, day.month, day.day)
    for text, month_first in ((f"{day:%d/%m/%Y},00:00:00.000000", False), (f"{day:%m/%d/%y},00:00:00.000000", True)):
        log = RepairLog()
        assert read_moment(text, "CFG", month_first, log).ns == midnight
        assert not log.repairs
    if day.day > 12:
        log = RepairLog()
        assert read_moment(f"{day:%m/%d/%Y},00:00:00.000000", "CFG", False, log).ns == midnight
        assert log.repairs[0].assumed == "read as mm/dd"


@pytest.mark.parametrize(
    ("code", "offset_s"),
    [
        ("0", 0),
        ("-4", -14400),
        ("+10h30", 37800),
        ("-5H30", -19800),
        ("5h45", 20700),
        ("x", None),
        ("X", None),
        ("", None),
    ],
)
def test_time_codes_of_the_standard(code, offset_s):
    log = RepairLog()
    assert read_time_code(code, "CFG", log) == offset_s
    assert not log.repairs


@pytest.mark.parametrize("code", ["15", "4h75", "UTC", "1.5"])
def test_what_is_no_time_code_is_written_down(code):
    log = RepairLog()
    assert read_time_code(code, "CFG", log) is None
    assert log.repairs[0].assumed == "offset from UTC unknown"


def test_utc_is_local_time_less_its_offset():
    moment = read_moment("02/03/2026,04:11:07.250000", "CFG", False, RepairLog())
    assert utc_ns(moment, None) == utc_ns(moment, 0) == moment.ns
    assert utc_ns(moment, -19800) == moment.ns + 19800 * 10**9


def test_time_quality_is_a_bound_and_the_uncertainty_a_rectangle():
    """Codes 1 to B step by ten from 1 ns to 10 s (IEEE Std 1344-1995); GUM 4.3.7: u = bound / sqrt(3)."""
    assert [QUALITY_BOUND_S[code] for code in "123456789AB"] == pytest.approx([10.0**k for k in range(-9, 2)])
    for code, bound in QUALITY_BOUND_S.items():
        sampled = np.random.default_rng(9).uniform(-bound, bound, 200_000)
        assert quality_u_s(code) == pytest.approx(np.std(sampled), rel=0.01)


@pytest.mark.parametrize(
    ("quality", "leap", "doubts", "usable", "note"),
    [
        ("4", "0", [], True, "time quality 4"),
        ("4", "2", [], False, "leap second"),
        ("4", "3", [], True, "cannot tell of leap seconds"),
        ("4", "0", ["stamps step back"], False, "stamps step back"),
        ("C", "0", [], False, "not one of the standard's"),
        (None, None, [], True, "accuracy not stated"),
        ("F", "0", [], False, "clock fault"),
    ],
)
def test_every_doubt_is_a_note_and_frees_the_clock(quality, leap, doubts, usable, note):
    clock = stated_clock(quality, leap, 0, 1e-9, doubts)
    assert clock.usable == usable
    assert any(note in text for text in clock.notes)


def test_a_start_coarser_than_its_clock_is_noted():
    assert len(stated_clock("3", "0", 0, 1e-9, []).notes) == 1
    coarse = stated_clock("3", "0", 0, 1e-6, [])
    assert coarse.u_s == pytest.approx(1e-7 / np.sqrt(3))
    assert coarse.notes[-1] == "the start is given to 1e-06 s, coarser than the clock"


@pytest.mark.parametrize("file_type", MISSING)
def test_missing_codes_become_nan_and_nothing_else_does(file_type):
    lines = [CHANNEL, dataclasses.replace(CHANNEL, a=2.0, b=-1.0)]
    scaling = scaling_of(lines, file_type, 2013)
    code = MISSING[file_type]
    neighbour = (
        np.nextafter(np.float32(code), np.float32(0)) if file_type == "FLOAT32" else code + (1 if code < 0 else -1)
    )
    counts = np.array([[code, neighbour, 3.0], [5.0, code, 0.0]])
    out = np.empty((2, 3))
    scale_block(counts, scaling, out)
    assert np.isnan(out).tolist() == [[True, False, False], [False, True, False]]
    assert out[1, [0, 2]].tolist() == [9.0, -1.0]


def test_infinite_single_precision_readings_are_missing():
    out = np.empty((1, 3))
    scale_block(np.array([[np.inf, np.nan, 1.0]], dtype=np.float32), scaling_of([CHANNEL], "FLOAT32", 2013), out)
    assert np.isnan(out[0]).tolist() == [True, True, False]


def test_99999_is_a_count_where_the_range_allows_it():
    wide = dataclasses.replace(CHANNEL, high=999_999.0)
    out = np.empty((2, 1))
    scale_block(np.array([[99_999.0], [99_999.0]]), scaling_of([wide, CHANNEL], "ASCII", 2013), out)
    assert (out[0, 0], np.isnan(out[1, 0])) == (99_999.0, True)


def test_parts_of_a_single_file_longer_than_one_reading_of_it(tmp_path):
    cff = tmp_path / "e.cff"
    head = b"--- file type: CFG ---\r\n" + "\r\n".join(PLAIN).encode() + b"\r\n--- file type: HDR ---\r\n"
    filler = b"free text\r\n" * 120_000
    cff.write_bytes(head + filler + b"--- file type: DAT BINARY32: 12 ---\r\n" + bytes(12))
    log = RepairLog()
    parts = find_parts(cff, log)
    assert (parts.length, parts.file_type, parts.data_path) == (12, "BINARY32", cff)
    assert parts.cfg.decode().split() == "\r\n".join(PLAIN).split()
    assert not log.repairs


def test_a_long_single_file_without_data_is_refused_in_one_pass(tmp_path):
    cff = tmp_path / "e.cff"
    cff.write_bytes(b"--- file type: CFG ---\r\n" + b"x" * 20_000_000)
    started = time.process_time()
    with pytest.raises(RecordError, match="no CFG and then DAT section header"):
        find_parts(cff, RepairLog())
    assert time.process_time() - started < 1.0


def test_several_spellings_prefer_the_one_of_the_same_case(tmp_path):
    for name in ("E.DAT", "e.dat", "e.cfg"):
        (tmp_path / name).write_bytes(name.encode())
    assert find_parts(tmp_path / "e.cfg", RepairLog()).data_path.name == "e.dat"


@pytest.mark.parametrize("encoding", ["utf-8", "utf-8-sig", "utf-16"])
@given(text=st.text(st.characters(codec="utf-8", exclude_characters="\ufeff"), max_size=60))
@settings(max_examples=25)
def test_unicode_text_comes_back_whatever_it_says(encoding, text):
    log = RepairLog()
    assert decode(text.encode(encoding), "CFG", log) == text
    assert not log.repairs


def test_text_of_no_known_page_is_shown_somehow_and_written_down():
    log = RepairLog()
    assert decode(b"\xff\x81\x8d\x00\x01", "CFG", log)
    assert log.repairs[0].what == "text is not UTF-8"
