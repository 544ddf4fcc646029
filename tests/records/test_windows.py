"""A span of a record equals the same span cut out of the whole, in every format."""

import numpy as np
import pytest

from twlocate.errors import RecordError
from twlocate.records import read, write_comtrade

from .built import record_of


@pytest.mark.parametrize("file_type", ["ASCII", "BINARY", "BINARY32", "FLOAT32"])
def test_a_window_is_the_whole_cut_down(tmp_path, file_type):
    counts = np.random.default_rng(4).integers(-999, 999, (2, 5000)).astype(float)
    write_comtrade(record_of(counts), tmp_path / "e.cfg", file_type)
    whole, part = read(tmp_path / "e.cfg"), read(tmp_path / "e.cfg", (0.001, 0.0015))
    assert (part.stretches[0].first, part.stretches[0].count) == (0, 501)
    assert part.stretches[0].start_s == pytest.approx(0.001, abs=1e-12)
    assert part.start_ns == whole.start_ns
    for one, other in zip(whole.channels, part.channels, strict=True):
        np.testing.assert_array_equal(one.samples[1000:1501], other.samples)
    for one, other in zip(whole.status, part.status, strict=True):
        np.testing.assert_array_equal(one.states[1000:1501], other.states)


def test_an_empty_window_says_how_long_the_record_is(tmp_path):
    write_comtrade(record_of(np.zeros((1, 100))), tmp_path / "e.cfg")
    with pytest.raises(RecordError, match=r"no sample from 5 to 6 s; the record runs to 9\.9e-05 s"):
        read(tmp_path / "e.cfg", (5.0, 6.0))
    with pytest.raises(RecordError, match="must run forward"):
        read(tmp_path / "e.cfg", (6.0, 5.0))
