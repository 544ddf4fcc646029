"""What COMTRADE can carry beside the samples: gaps, uneven stamps, skew, ratios, the clock; and what it cannot."""

import dataclasses
from pathlib import Path

import comtrade
import numpy as np
import pytest

import twlocate.records.comtrade.writing as writing
from twlocate.errors import RecordError
from twlocate.records import Channel, Clock, Record, Stretch, read, write_comtrade

from .built import STEP, record_of

COUNTS = np.random.default_rng(6).integers(-3000, 3000, (2, 90)).astype(float)


def changed(record, **channel):
    channels = tuple(dataclasses.replace(old, **channel) for old in record.channels)
    return dataclasses.replace(record, channels=channels)


def test_gaps_come_back(tmp_path):
    gaps = (Stretch(0, 40, 0.0, 1e6), Stretch(40, 50, 0.123456789, 1e6))
    write_comtrade(dataclasses.replace(record_of(COUNTS), stretches=gaps), tmp_path / "e.cfg")
    back = read(tmp_path / "e.cfg")
    assert [(s.first, s.count, s.rate_hz) for s in back.stretches] == [(0, 40, 1e6), (40, 50, 1e6)]
    assert back.stretches[1].start_s == pytest.approx(0.123456789, abs=1e-9)


def test_uneven_stamps_come_back_to_the_nanosecond(tmp_path):
    stamps = np.cumsum(np.random.default_rng(7).uniform(1e-6, 3e-6, 90))
    stamps -= stamps[0]
    uneven = (Stretch(0, 90, 0.0, 89 / stamps[-1], stamps),)
    write_comtrade(dataclasses.replace(record_of(COUNTS), stretches=uneven), tmp_path / "e.cfg")
    np.testing.assert_allclose(read(tmp_path / "e.cfg").stretches[0].times_s(), stamps, atol=0.51e-9)


def test_two_rates_come_back(tmp_path):
    rates = (Stretch(0, 40, 0.0, 1e5), Stretch(40, 50, 40e-5, 1e6))
    write_comtrade(dataclasses.replace(record_of(COUNTS), stretches=rates), tmp_path / "e.cfg")
    back = read(tmp_path / "e.cfg")
    assert [(s.first, s.count, s.rate_hz) for s in back.stretches] == [(0, 40, 1e5), (40, 50, 1e6)]


def test_a_long_record_gets_coarser_stamps_and_keeps_its_rate(tmp_path):
    slow = (Stretch(0, 90, 0.0, 0.7),)
    write_comtrade(dataclasses.replace(record_of(COUNTS), stretches=slow), tmp_path / "e.cfg")
    assert read(tmp_path / "e.cfg").stretches == slow


def test_skew_ratio_side_and_range_come_back(tmp_path):
    facts = {
        "skew_s": 2.5e-6,
        "ratio": 400.0,
        "side": "secondary",
        "low": -4095 * STEP + 0.25,
        "high": 4095 * STEP + 0.25,
    }
    write_comtrade(changed(record_of(COUNTS), **facts), tmp_path / "e.cfg", "BINARY")
    channel = read(tmp_path / "e.cfg").channels[1]
    assert (channel.ratio, channel.side) == (400.0, "secondary")
    assert channel.skew_s == pytest.approx(2.5e-6)
    assert (channel.low, channel.high) == (facts["low"], facts["high"])


@pytest.mark.parametrize(
    ("clock", "code"),
    [
        (Clock(1e-6 / np.sqrt(3)), "4"), (Clock(1.1e-6 / np.sqrt(3)), "5"), (Clock(0.0), "1"), (Clock(None), "0"),
        (Clock(100.0), "F"), (Clock(1e-9, usable=False), "F"), (Clock(10 / np.sqrt(3)), "B"),
    ],
)  # fmt: skip
def test_the_clock_becomes_the_smallest_bound_that_holds_it(tmp_path, clock, code):
    assert writing.quality_code(clock) == code
    write_comtrade(dataclasses.replace(record_of(COUNTS), clock=clock), tmp_path / "e.cfg")
    back = read(tmp_path / "e.cfg").clock
    assert back.usable == (code != "F")
    assert back.u_s is None if code in "0F" else back.u_s >= clock.u_s * (1 - 1e-9)


@pytest.mark.parametrize("offset_s", [0, 3600, -19800, None])
def test_local_time_is_written_and_taken_off_again(tmp_path, offset_s):
    record = dataclasses.replace(record_of(COUNTS), clock=Clock(None, True, (), offset_s))
    write_comtrade(record, tmp_path / "e.cfg")
    back = read(tmp_path / "e.cfg")
    assert (back.start_ns, back.clock.utc_offset_s) == (record.start_ns, offset_s)


@pytest.mark.parametrize("file_type", ["ASCII", "BINARY", "BINARY32", "FLOAT32"])
@pytest.mark.filterwarnings("ignore")
def test_an_independent_reader_sees_the_same(tmp_path, file_type):
    record = record_of(COUNTS)
    write_comtrade(record, tmp_path / "e.cfg", file_type)
    other = comtrade.Comtrade(use_numpy_arrays=True, use_double_precision=True)
    other.load(str(tmp_path / "e.cfg"), str(tmp_path / "e.dat"))
    assert (other.station_name, other.rec_dev_id, other.frequency) == ("North end", "recorder 7", 50.0)
    for channel, samples in zip(record.channels, other.analog, strict=True):
        np.testing.assert_array_equal(channel.samples, samples)
    for channel, states in zip(record.status, other.status, strict=True):
        np.testing.assert_array_equal(channel.states, states)
    np.testing.assert_allclose(other.time, np.arange(90) / 1e6, atol=1e-12)


@pytest.mark.parametrize("code", "123456789AB0F")
def test_writing_twice_gives_the_same_bytes(tmp_path, code):
    write_comtrade(record_of(COUNTS), tmp_path / "a.cfg")
    text = (tmp_path / "a.cfg").read_text()
    (tmp_path / "a.cfg").write_bytes(text.replace("\n3,0\n", f"\n{code},0\n").replace("\n", "\r\n").encode())
    write_comtrade(read(tmp_path / "a.cfg"), tmp_path / "b.cfg")
    for suffix in (".cfg", ".dat"):
        assert (tmp_path / f"a{suffix}").read_bytes() == (tmp_path / f"b{suffix}").read_bytes()


def test_a_window_is_written_with_its_own_start(tmp_path):
    write_comtrade(record_of(COUNTS), tmp_path / "a.cfg")
    part = read(tmp_path / "a.cfg", (20e-6, 50e-6))
    write_comtrade(part, tmp_path / "b.cfg")
    back = read(tmp_path / "b.cfg")
    assert back.start_ns == record_of(COUNTS).start_ns + 20_000
    np.testing.assert_array_equal(back.channels[0].samples, part.channels[0].samples)


def test_single_precision_readings_pass_through_float32(tmp_path):
    samples = np.random.default_rng(8).normal(size=90).astype(np.float32).astype(float)
    record = dataclasses.replace(record_of(COUNTS), channels=(Channel("p", "kPa", samples),))
    write_comtrade(record, tmp_path / "e.cff", "FLOAT32")
    back = read(tmp_path / "e.cff").channels[0]
    np.testing.assert_array_equal(back.samples, samples)
    assert (back.step, back.low, back.high) == (None, None, None)  # computed readings show no converter


def with_samples(samples, **facts):
    stretches = (Stretch(0, len(samples), 0.0, 1e6),)
    return Record(Path("x"), "", (Channel("u", "V", np.asarray(samples), **facts),), stretches, start_ns=0)


@pytest.mark.parametrize(
    ("record", "file_type", "message"),
    [
        (with_samples([1.0, np.inf]), "BINARY", "'u' has infinite samples"),
        (with_samples([1.0, 1e39]), "FLOAT32", "beyond the range of FLOAT32"),
        (Record(Path("x"), "", (), (Stretch(0, 2, 0.0, 1.0),), start_ns=0), "ASCII", "has no channel"),
        (dataclasses.replace(record_of(COUNTS), stretches=(Stretch(0, 40, 1.0, 1e6), Stretch(40, 50, 0.0, 1e6))),
         "BINARY", "go back in time"),
    ],
)  # fmt: skip
def test_what_does_not_fit_is_refused_before_anything_is_written(tmp_path, record, file_type, message):
    with pytest.raises(RecordError, match=message):
        write_comtrade(record, tmp_path / "e.cfg", file_type)
    assert not list(tmp_path.iterdir())


def test_a_step_too_fine_for_the_type_falls_back_to_the_full_range(tmp_path):
    write_comtrade(with_samples([0.0, 0.5, 1.0], step=1e-9), tmp_path / "e.cfg", "BINARY")
    channel = read(tmp_path / "e.cfg").channels[0]
    np.testing.assert_allclose(channel.samples, [0.0, 0.5, 1.0], atol=0.51 / 32767)
    assert channel.step == pytest.approx(1 / 32767)


def test_a_fault_half_way_leaves_neither_file(tmp_path, monkeypatch):
    calls = []

    def failing(_, target):
        calls.append(target)
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(Path, "replace", failing)
    with pytest.raises(RecordError, match=r"cannot be written \(No space left on device\)"):
        write_comtrade(record_of(COUNTS), tmp_path / "e.cfg")
    assert len(calls) == 1
    assert not list(tmp_path.iterdir())


def test_other_endings_and_absent_folders_are_refused(tmp_path):
    with pytest.raises(RecordError, match=r"to a \.cfg or a \.cff file"):
        write_comtrade(record_of(COUNTS), tmp_path / "e.dat")
    with pytest.raises(RecordError, match=r"absent/e\.dat: cannot be written"):
        write_comtrade(record_of(COUNTS), tmp_path / "absent" / "e.cfg")
