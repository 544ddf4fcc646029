"""What is written is read back bit for bit, in every file type, across the properties that matter."""

from pathlib import Path

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from twlocate.errors import RecordError
from twlocate.records import Channel, Record, Stretch, read, write_comtrade

from .built import STEP, record_of

FILE_TYPES = ("ASCII", "BINARY", "BINARY32", "FLOAT32")


@pytest.mark.parametrize("file_type", FILE_TYPES)
@pytest.mark.parametrize("name", ["event.cfg", "event.cff"])
def test_round_trip_is_exact(tmp_path, file_type, name):
    counts = np.random.default_rng(1).integers(-32767, 32768, (3, 400)).astype(float)
    counts[1, 7] = np.nan
    written = record_of(counts)
    write_comtrade(written, tmp_path / name, file_type)
    back = read(tmp_path / name)
    assert back.format == f"COMTRADE 2013 {file_type}"
    assert (back.station, back.device, back.line_frequency_hz) == ("North end", "recorder 7", 50.0)
    assert back.start_ns == written.start_ns
    assert back.resolution_ns == 1
    assert back.trigger_s == pytest.approx(3e-6, abs=1e-12)
    assert back.clock.u_s == pytest.approx(1e-7 / np.sqrt(3.0))
    assert back.stretches == (Stretch(0, 400, 0.0, 1e6),)
    for before, after in zip(written.channels, back.channels, strict=True):
        np.testing.assert_array_equal(after.samples, before.samples)
        assert (after.name, after.unit, after.step, after.offset) == (before.name, before.unit, STEP, 0.25)
    for before, after in zip(written.status, back.status, strict=True):
        np.testing.assert_array_equal(after.states, before.states)
    assert [repair.what for repair in back.repairs] == ["1 sample missing"]


@given(
    start_ns=st.integers(0, 2**62), rate_hz=st.floats(1e-2, 1e9), n_status=st.integers(0, 40),
    seed=st.integers(0, 2**32 - 1), file_type=st.sampled_from(FILE_TYPES), n=st.integers(1, 60),
)  # fmt: skip
@settings(max_examples=60, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
def test_any_record_comes_back(tmp_path, start_ns, rate_hz, n_status, seed, file_type, n):
    counts = np.random.default_rng(seed).integers(-32767, 32768, (2, n)).astype(float)
    written = record_of(counts, rate_hz=rate_hz, start_ns=start_ns, n_status=n_status)
    write_comtrade(written, tmp_path / "e.cfg", file_type)
    back = read(tmp_path / "e.cfg")
    assert back.start_ns == start_ns
    assert back.stretches == (Stretch(0, n, 0.0, rate_hz),)
    for before, after in zip(written.channels, back.channels, strict=True):
        np.testing.assert_array_equal(after.samples, before.samples)
    for before, after in zip(written.status, back.status, strict=True):
        np.testing.assert_array_equal(after.states, before.states)


def test_a_channel_without_steps_is_rounded_to_the_full_range(tmp_path):
    samples = np.random.default_rng(2).normal(size=500)
    record = Record(Path("x"), "built", (Channel("p", "kPa", samples),), (Stretch(0, 500, 0.0, 1e3),), start_ns=0)
    write_comtrade(record, tmp_path / "e.cfg")
    back = read(tmp_path / "e.cfg").channel("p")
    np.testing.assert_allclose(back.samples, samples, rtol=0, atol=0.51 * np.abs(samples).max() / (2**31 - 1))


def test_nothing_is_written_when_the_record_does_not_fit(tmp_path):
    record = record_of(np.zeros((1, 4)))
    with pytest.raises(RecordError, match="choose ASCII, BINARY, BINARY32, FLOAT32"):
        write_comtrade(record, tmp_path / "e.cfg", "BINARY64")
    with pytest.raises(RecordError, match="no absolute start"):
        write_comtrade(Record(Path("x"), "", record.channels, record.stretches), tmp_path / "e.cfg")
    comma = Record(Path("x"), "", (Channel("a,b", "V", np.zeros(4)),), record.stretches, start_ns=0)
    with pytest.raises(RecordError, match="'a,b' holds a comma"):
        write_comtrade(comma, tmp_path / "e.cfg")
    assert not list(tmp_path.iterdir())
