"""Sound, MAT, HDF5 and TDMS: each written by its general library, read back through the one door."""

import datetime
import struct

import h5py
import numpy as np
import pytest
import scipy.io
import soundfile
from nptdms import ChannelObject, RootObject, TdmsWriter

import twlocate.records.extras
from twlocate.errors import RecordError
from twlocate.records import read

RATE_HZ = 48_000
SAMPLES = np.round(np.random.default_rng(5).uniform(-0.9, 0.9, (1000, 2)) * 2**15) / 2**15
START_NS = 1772424667_250000000  # 2026-03-02T04:11:07.25Z


@pytest.mark.parametrize(
    ("name", "subtype", "bits"),
    [("s.wav", "PCM_16", 16), ("s.wav", "PCM_24", 24), ("s.wav", "PCM_32", 32), ("s.wav", "FLOAT", None),
     ("s.wav", "DOUBLE", None), ("s.flac", "PCM_16", 16), ("s.flac", "PCM_24", 24)],
)  # fmt: skip
def test_sound_comes_back_exactly(tmp_path, name, subtype, bits):
    soundfile.write(tmp_path / name, SAMPLES, RATE_HZ, subtype)
    record = read(tmp_path / name)
    np.testing.assert_array_equal(np.stack([c.samples for c in record.channels], axis=1), SAMPLES)
    assert record.stretches[0].rate_hz == RATE_HZ
    assert record.channels[0].step == (None if bits is None else 2.0 ** (1 - bits))
    assert record.start_ns is None
    assert not record.clock.usable
    part = read(tmp_path / name, (0.01, 0.011))
    np.testing.assert_array_equal(part.channels[1].samples, SAMPLES[480:529, 1])
    assert part.stretches[0].start_s == pytest.approx(0.01)


def with_bext(path, date, time, reference):
    """Insert a broadcast chunk, laid out as EBU Tech 3285 (2011), table of section 2.3, says."""
    chunk = bytes(256 + 32 + 32) + date.encode() + time.encode() + struct.pack("<QH", reference, 1) + bytes(254)
    content = path.read_bytes()
    body = content[12:] + b"bext" + struct.pack("<I", len(chunk)) + chunk
    path.write_bytes(b"RIFF" + struct.pack("<I", len(body) + 4) + b"WAVE" + body)


def test_broadcast_time_reference_counts_samples_from_midnight(tmp_path):
    soundfile.write(tmp_path / "s.wav", SAMPLES, RATE_HZ, "PCM_16")
    seconds = 4 * 3600 + 11 * 60 + 7
    with_bext(tmp_path / "s.wav", "2026-03-02", "04:11:07", seconds * RATE_HZ + RATE_HZ // 4)
    record = read(tmp_path / "s.wav")
    assert record.start_ns == START_NS
    assert record.clock.usable
    assert not record.repairs


def test_a_time_reference_is_rounded_to_the_nearest_nanosecond(tmp_path):
    soundfile.write(tmp_path / "s.wav", SAMPLES, 44_100, "PCM_16")
    with_bext(tmp_path / "s.wav", "1970-01-01", "00:00:00", 7)  # 158730.16 ns
    assert read(tmp_path / "s.wav").start_ns == 158_730
    soundfile.write(tmp_path / "t.wav", SAMPLES, 44_100, "PCM_16")
    with_bext(tmp_path / "t.wav", "1970-01-01", "00:00:00", 11)  # 249433.11 ns
    assert read(tmp_path / "t.wav").start_ns == 249_433
    soundfile.write(tmp_path / "u.wav", SAMPLES, 44_100, "PCM_16")
    with_bext(tmp_path / "u.wav", "1970-01-01", "00:00:00", 17)  # 385487.53 ns
    assert read(tmp_path / "u.wav").start_ns == 385_488


def test_a_broadcast_chunk_at_odds_with_itself_is_written_down(tmp_path):
    soundfile.write(tmp_path / "s.wav", SAMPLES, RATE_HZ, "PCM_16")
    with_bext(tmp_path / "s.wav", "2026-03-02", "09:00:00", RATE_HZ)
    assert "another time reference" in read(tmp_path / "s.wav").repairs[0].what
    soundfile.write(tmp_path / "t.wav", SAMPLES, RATE_HZ, "PCM_16")
    with_bext(tmp_path / "t.wav", "2026-13-02", "09:00:00", RATE_HZ)
    assert read(tmp_path / "t.wav").start_ns is None


def test_mat_5_and_its_structures(tmp_path):
    inner = {"p": SAMPLES[:, 0], "rate": 500.0, "start": "2026-03-02T04:11:07.25Z"}
    scipy.io.savemat(tmp_path / "m.mat", {"log": inner, "q": SAMPLES[:, 1], "gain": 3.0})
    record = read(tmp_path / "m.mat")
    assert [c.name for c in record.channels] == ["log.p", "q"]
    np.testing.assert_array_equal(record.channel("log.p").samples, SAMPLES[:, 0])
    assert (record.start_ns, record.stretches[0].rate_hz) == (START_NS, 500.0)
    assert read(tmp_path / "m.mat", (0.1, 0.2)).n_samples == 51


def test_mat_with_times_and_a_matrix_of_channels(tmp_path):
    scipy.io.savemat(tmp_path / "m.mat", {"t": np.arange(1000) / 500.0, "p": SAMPLES.T, "short": np.zeros(7)})
    record = read(tmp_path / "m.mat")
    assert [c.name for c in record.channels] == ["p[1]", "p[2]"]
    assert record.stretches[0].rate_hz == pytest.approx(500.0)
    assert record.stretches[0].stamps_s is None
    assert "7 values, not 1000" in [repair.what for repair in record.repairs]


def test_mat_7_3_is_read_as_hdf5(tmp_path):
    with h5py.File(tmp_path / "m.mat", "w", userblock_size=512) as file:
        file["p"] = SAMPLES[:, :1].T
        file["fs"] = np.array([[500.0]])
        file["start"] = np.array([[ord(letter)] for letter in "2026-03-02T04:11:07.25Z"], dtype=np.uint16)
        file["start"].attrs["MATLAB_class"] = np.bytes_(b"char")
    with (tmp_path / "m.mat").open("r+b") as file:
        file.write(b"MATLAB 7.3 MAT-file")
    record = read(tmp_path / "m.mat")
    assert (record.format, record.start_ns) == ("MAT 7.3", START_NS)
    np.testing.assert_array_equal(record.channel("p").samples, SAMPLES[:, 0])


def test_hdf5_attributes_and_groups(tmp_path):
    with h5py.File(tmp_path / "h.h5", "w") as file:
        file.attrs.update({"sample_rate": 500, "start_time": "2026-03-02T04:11:07.25Z", "clock": "± 2 ms"})
        data = file.create_dataset("north/pressure", data=SAMPLES[:, 0], compression="gzip")
        data.attrs["units"] = "kPa"
    record = read(tmp_path / "h.h5")
    channel = record.channel("north/pressure")
    assert channel.unit == "kPa"
    np.testing.assert_array_equal(channel.samples, SAMPLES[:, 0])
    assert (record.start_ns, record.clock.u_s, record.stretches[0].rate_hz) == (START_NS, 0.002, 500.0)


def test_hdf5_integer_epoch_times_stay_exact(tmp_path):
    with h5py.File(tmp_path / "h.h5", "w") as file:
        file["time"] = START_NS + 1 + np.arange(100) * 1000
        file["u"] = np.arange(100.0)
    record = read(tmp_path / "h.h5")
    assert record.start_ns == START_NS + 1
    assert record.stretches[0].rate_hz == pytest.approx(1e6)


def test_hdf5_declared_but_never_stored_is_not_invented(tmp_path):
    with h5py.File(tmp_path / "h.h5", "w") as file:
        file.attrs["rate"] = 1.0
        file.create_dataset("ghost", shape=(10**9,), dtype="f8", chunks=(10**6,))
    with pytest.raises(RecordError, match="no array of numbers"):
        read(tmp_path / "h.h5")


def test_tdms_waveform_properties(tmp_path):
    start = datetime.datetime(2026, 3, 2, 4, 11, 7, 250000)
    properties = {"wf_increment": 1 / 500, "wf_start_time": start, "wf_start_offset": 0.0, "unit_string": "bar"}
    with TdmsWriter(tmp_path / "t.tdms") as writer:
        channels = [ChannelObject("g", f"p{k}", SAMPLES[:, k], properties) for k in range(2)]
        writer.write_segment([RootObject({}), *channels])
    record = read(tmp_path / "t.tdms")
    assert record.start_ns == START_NS
    assert [(c.name, c.unit) for c in record.channels] == [("p0", "bar"), ("p1", "bar")]
    np.testing.assert_array_equal(record.channels[1].samples, SAMPLES[:, 1])
    assert record.stretches[0].rate_hz == pytest.approx(500.0)


@pytest.mark.parametrize("name", ["d.wav", "d.flac", "d.h5", "d.tdms"])
def test_damage_is_one_line_that_names_the_file(tmp_path, name):
    (tmp_path / name).write_bytes(b"this is no recording at all" * 40)
    with pytest.raises(RecordError, match=rf"{name}: not a readable \w+ file \(.+\)$"):
        read(tmp_path / name)


def test_a_missing_package_is_named_with_its_cure(tmp_path, monkeypatch):
    def absent(name):
        raise ImportError(name)

    (tmp_path / "a.tdms").write_bytes(b"TDSm")
    monkeypatch.setattr(twlocate.records.extras.importlib, "import_module", absent)
    with pytest.raises(RecordError, match=r"a\.tdms: .*package nptdms: pip install twlocate\[formats\]"):
        read(tmp_path / "a.tdms")


def test_an_unknown_ending_lists_the_known_ones(tmp_path):
    (tmp_path / "a.docx").write_bytes(b"x")
    with pytest.raises(RecordError, match=r"\.docx is no known format; known are .*\.cfg .*\.wav"):
        read(tmp_path / "a.docx")
