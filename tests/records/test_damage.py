"""Recordings cut short or odd inside, format by format: what is there is read, the rest is written down."""

import datetime
from pathlib import Path

import h5py
import numpy as np
import pytest
import soundfile
from nptdms import ChannelObject, TdmsWriter

import twlocate.records.reading as reading
from twlocate.errors import RecordError
from twlocate.records import read, write_comtrade
from twlocate.records.audio import riff_chunk
from twlocate.records.comtrade.binary import BinaryRows
from twlocate.records.named_arrays import NamedArrays, record_of_arrays, setting_of
from twlocate.records.repairs import RepairLog

from .built import record_of

NOISE = np.random.default_rng(12).uniform(-0.5, 0.5, (60_000, 1))


@pytest.mark.parametrize(("name", "subtype"), [("s.wav", "PCM_16"), ("s.flac", "PCM_16")])
def test_sound_cut_short_gives_what_is_there(tmp_path, name, subtype):
    path = tmp_path / name
    soundfile.write(path, NOISE, 48_000, subtype)
    whole = read(path).channels[0].samples
    content = path.read_bytes()
    path.write_bytes(content[: 2 * len(content) // 3])
    part = read(path)
    # at most the frame that the cut falls into and the block read with it are lost, 4096 samples each
    assert 2 * whole.size / 3 - 2 * 4096 < part.n_samples < 2 * whole.size / 3 + 100
    np.testing.assert_array_equal(part.channels[0].samples, whole[: part.n_samples])
    assert part.repairs


def test_sound_without_a_sample(tmp_path):
    soundfile.write(tmp_path / "s.wav", np.empty((0, 1)), 48_000)
    with pytest.raises(RecordError, match=r"s\.wav: "):
        read(tmp_path / "s.wav")


def test_chunks_of_what_is_no_wave_file(tmp_path):
    (tmp_path / "a").write_bytes(b"OggS" + bytes(40))
    (tmp_path / "b").write_bytes(b"RIFF\0\0\0\0WAVEdata\xff\xff\xff\x7f")
    assert riff_chunk(tmp_path / "a", b"bext") is None
    assert riff_chunk(tmp_path / "b", b"bext") is None


def test_a_dat_that_shrinks_while_it_is_read(tmp_path):
    write_comtrade(record_of(np.zeros((1, 50))), tmp_path / "e.cfg")
    record_path = tmp_path / "e.dat"
    size = record_path.stat().st_size

    class Shrinking(BinaryRows):
        def __len__(self):
            return 50

    rows = Shrinking(parts_of(tmp_path / "e.cfg"), np.dtype("V14"), "BINARY32")
    record_path.write_bytes(record_path.read_bytes()[: size // 2])
    with pytest.raises(RecordError, match="became shorter while read: row 25 is gone"):
        list(rows.blocks(0, 50))


def parts_of(cfg):
    from twlocate.records.comtrade.container import find_parts

    return find_parts(cfg, RepairLog())


@pytest.mark.parametrize(
    ("error", "message"),
    [(MemoryError(), "too large for this machine's memory; read a span"), (PermissionError(13, "Permission denied"),
      r"cannot be read \(Permission denied\)")],
)  # fmt: skip
def test_what_the_machine_refuses_is_one_line_too(tmp_path, monkeypatch, error, message):
    def failing(_, __):
        raise error

    (tmp_path / "a.csv").write_text("x")
    monkeypatch.setitem(reading.READERS, ".csv", failing)
    with pytest.raises(RecordError, match=rf"a\.csv: {message}"):
        read(tmp_path / "a.csv")


def test_hdf5_with_odd_contents(tmp_path):
    with h5py.File(tmp_path / "h.h5", "w") as file:
        file["p"] = np.arange(50.0)
        file["sub/rate"] = 25.0
        file["note"] = "free text"
        file["table"] = np.zeros(3, dtype=[("a", "f8"), ("b", "i4")])
        file["#refs#/hidden"] = np.arange(50.0)
        file["station"] = "North"
    record = read(tmp_path / "h.h5")
    assert [channel.name for channel in record.channels] == ["p"]
    assert (record.stretches[0].rate_hz, record.station) == (25.0, "North")


def test_hdf5_declared_beyond_what_is_stored_is_written_down(tmp_path):
    with h5py.File(tmp_path / "h.h5", "w") as file:
        file.attrs["rate"] = 25.0
        file["p"] = np.arange(50.0)
        file.create_dataset("ghost", shape=(10**8,), dtype="f8", chunks=(10**5,))
    record = read(tmp_path / "h.h5")
    assert record.n_samples == 50
    assert record.repairs[0].what == "100000000 values declared, none stored"


def waveform(name, samples, **properties):
    return ChannelObject("g", name, samples, {"wf_increment": 0.5, **properties})


def test_tdms_channels_of_another_timing_are_left_out_and_named(tmp_path):
    with TdmsWriter(tmp_path / "t.tdms") as writer:
        channels = [waveform("p", np.arange(9.0)), waveform("q", np.arange(9.0), wf_increment=0.1)]
        writer.write_segment([*channels, ChannelObject("g", "none", np.empty(0))])
    record = read(tmp_path / "t.tdms")
    assert [channel.name for channel in record.channels] == ["p"]
    assert record.repairs[0].what == "another increment or start"
    assert not record.clock.usable


def test_tdms_cut_short_says_so(tmp_path):
    start = datetime.datetime(2026, 3, 2, 4, 11, 7)
    with TdmsWriter(tmp_path / "t.tdms") as writer:
        writer.write_segment([waveform("p", np.arange(400.0), wf_start_time=start, wf_start_offset=0.25)])
    content = (tmp_path / "t.tdms").read_bytes()
    (tmp_path / "t.tdms").write_bytes(content[:-1600])
    record = read(tmp_path / "t.tdms")
    assert record.channels[0].samples.tolist() == list(np.arange(200.0))
    assert record.start_ns == 1772424667_250000000
    assert record.repairs[0].where == "TDMS segments"


def arrays(settings=None, **found):
    log = RepairLog()
    named = NamedArrays({name: np.asarray(values) for name, values in found.items()}, {"t": "ms"}, settings or {})
    return record_of_arrays(Path("a.mat"), "MAT 5", named, log)


def test_arrays_with_a_time_in_milliseconds_and_a_matrix():
    record = arrays(t=np.arange(4) * 2.0, p=np.arange(8.0).reshape(2, 4))
    assert [channel.name for channel in record.channels] == ["p[1]", "p[2]"]
    assert record.channels[1].samples.tolist() == [4.0, 5.0, 6.0, 7.0]
    assert record.stretches[0].rate_hz == pytest.approx(500.0)


def test_the_length_that_most_arrays_share_wins_over_a_longer_one():
    record = arrays({"rate": "10"}, p=np.arange(5.0), q=np.arange(5.0), long=np.arange(50.0))
    assert [channel.name for channel in record.channels] == ["p", "q"]
    assert record.repairs[0].where == "array 'long'"


def test_arrays_with_absolute_times_as_floats_say_how_coarse_they_are():
    log = RepairLog()
    named = NamedArrays({"time": 1772424667.25 + np.arange(50) / 100, "p": np.arange(50.0)})
    record = record_of_arrays(Path("a.mat"), "MAT 5", named, log)
    assert record.start_ns == 1772424667_250000000
    assert record.repairs[0].what == "absolute time as a float, 238 ns apart"
    assert record.stretches[0].rate_hz == pytest.approx(100.0)


def test_arrays_that_make_no_record():
    with pytest.raises(RecordError, match="no array of numbers"):
        arrays(note=np.array(["a", "b"]))
    with pytest.raises(RecordError, match="nothing is called time and no setting such as 'rate: 500 Hz'"):
        arrays(p=np.arange(5.0))
    with pytest.raises(RecordError, match="a time is missing or infinite"):
        arrays(t=[0.0, np.nan, 2.0], p=np.arange(3.0))
    with pytest.raises(RecordError, match="rate '0' is no sampling rate; it lies above 0"):
        arrays({"rate": "0"}, p=np.arange(5.0))
    with pytest.raises(RecordError, match="there is no column of readings"):
        arrays({"rate": "5"}, t=np.arange(5.0))
    weeks = NamedArrays({"t": np.arange(5.0), "p": np.arange(5.0)}, {"t": "weeks"})
    with pytest.raises(RecordError, match="the time is in 'weeks'; known are s sec ms"):
        record_of_arrays(Path("a.mat"), "MAT 5", weeks, RepairLog())


@pytest.mark.parametrize(
    ("name", "value", "setting"),
    [
        ("fs", np.float64(500.0), ("rate", "500.0")), ("g/Sample_Rate", np.array([[25]]), ("rate", "25")),
        ("start", b"2026-03-02", ("start", "2026-03-02")), ("fs", np.arange(3), None), ("gain", 3.0, None),
        ("a.station", "North", ("station", "North")), ("rate", [1, 2], None),
    ],
)  # fmt: skip
def test_settings_by_name(name, value, setting):
    assert setting_of(name, value) == setting
