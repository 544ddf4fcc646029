"""One signal written in every format by outside writers and our own: the same record through the one door."""

import datetime

import h5py
import numpy as np
import pytest
import scipy.io
import soundfile
from nptdms import ChannelObject, TdmsWriter

from twlocate.records import Channel, Clock, Record, Stretch, read, write_comtrade

RATE_HZ = 8000.0
COUNT = 4000
START_NS = 1772424667_250000000  # 2026-03-02T04:11:07.25Z
START = "2026-03-02T04:11:07.25Z"
SIGNAL = np.round(2**14 * np.sin(2 * np.pi * 50 * np.arange(COUNT) / RATE_HZ)) / 2**15


def comtrade(path, file_type):
    channel = Channel("p", "kPa", SIGNAL, step=2.0**-15)
    clock = Clock(None, True, (), 0)
    record = Record(path, "", (channel,), (Stretch(0, COUNT, 0.0, RATE_HZ),), start_ns=START_NS, clock=clock)
    write_comtrade(record, path, file_type)


def table(path):
    rows = "".join(f"{value!r}\n" for value in SIGNAL.tolist())
    path.write_text(f"# rate: {RATE_HZ} Hz\n# start: {START}\np [kPa]\n{rows}")


def stamped_table(path):
    zero = np.datetime64(START_NS, "ns")
    moments = (zero + np.timedelta64(125_000 * k, "ns") for k in range(COUNT))
    rows = "".join(f"{moment}Z;{str(value).replace('.', ',')}\n" for moment, value in zip(moments, SIGNAL, strict=True))
    path.write_text(f"time;p (kPa)\n{rows}")


def hdf5(path):
    with h5py.File(path, "w") as file:
        file.attrs.update({"fs": RATE_HZ, "start": START})
        file.create_dataset("p", data=SIGNAL).attrs["unit"] = "kPa"


def tdms(path):
    start = datetime.datetime(2026, 3, 2, 4, 11, 7, 250_000)
    properties = {"wf_increment": 1 / RATE_HZ, "wf_start_time": start, "unit_string": "kPa"}
    with TdmsWriter(path) as writer:
        writer.write_segment([ChannelObject("g", "p", SIGNAL, properties)])


WRITERS = {
    "ascii.cfg": lambda path: comtrade(path, "ASCII"),
    "binary.cfg": lambda path: comtrade(path, "BINARY"),
    "binary32.cff": lambda path: comtrade(path, "BINARY32"),
    "float32.cff": lambda path: comtrade(path, "FLOAT32"),
    "plain.csv": table,
    "stamped.txt": stamped_table,
    "pcm.wav": lambda path: soundfile.write(path, SIGNAL, int(RATE_HZ), "PCM_16"),
    "float.wav": lambda path: soundfile.write(path, SIGNAL, int(RATE_HZ), "FLOAT"),
    "pcm.flac": lambda path: soundfile.write(path, SIGNAL, int(RATE_HZ), "PCM_16"),
    "five.mat": lambda path: scipy.io.savemat(path, {"p": SIGNAL, "fs": RATE_HZ, "start": START}),
    "a.h5": hdf5,
    "a.tdms": tdms,
}


@pytest.fixture(params=WRITERS)
def path(request, tmp_path):
    WRITERS[request.param](tmp_path / request.param)
    return tmp_path / request.param


def test_samples_and_time_axis(path):
    record = read(path)
    assert len(record.channels) == 1
    np.testing.assert_array_equal(record.channels[0].samples, SIGNAL)
    (stretch,) = record.stretches
    assert stretch.stamps_s is None
    assert (stretch.first, stretch.count, stretch.start_s) == (0, COUNT, 0.0)
    assert stretch.rate_hz == pytest.approx(RATE_HZ, rel=1e-12)
    assert not record.repairs
    assert path in record.files


def test_start_and_unit_where_the_format_has_them(path):
    record = read(path)
    sound = path.suffix in (".wav", ".flac")
    assert record.start_ns == (None if sound else START_NS)
    assert record.clock.usable == (not sound)
    assert record.channels[0].unit == ("" if sound or path.suffix == ".mat" else "kPa")
    assert record.channels[0].name == ("channel 1" if sound else "p")


@pytest.mark.parametrize("span", [(0.1, 0.2), (-1.0, 0.05), (0.45, 9.0), (0.25, 0.2501)])
def test_a_window_is_the_same_cut(path, span):
    part = read(path, span)
    inside = (np.arange(COUNT) / RATE_HZ >= span[0] - 1e-9) & (np.arange(COUNT) / RATE_HZ <= span[1] + 1e-9)
    np.testing.assert_array_equal(part.channels[0].samples, SIGNAL[inside])
    assert part.start_ns == read(path).start_ns
    np.testing.assert_allclose(part.stretches[0].times_s(), np.flatnonzero(inside) / RATE_HZ, atol=1e-9)
