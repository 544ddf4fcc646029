"""The facts of a record, its channels by name and its time axis."""

from pathlib import Path

import numpy as np
import pytest

from twlocate.errors import RecordError
from twlocate.records import Channel, Record, Stretch, read
from twlocate.records.windows import cut, windowed_stretches

EVEN = (Stretch(0, 5, 0.0, 10.0),)


def record(*names, stretches=EVEN):
    count = stretches[-1].stop
    return Record(Path("r.cfg"), "", tuple(Channel(name, "V", np.arange(count) * 1.0) for name in names), stretches)


def test_a_channel_by_name_or_an_error_that_lists_them():
    assert record("ua", "ub").channel("ub").name == "ub"
    with pytest.raises(RecordError, match=r"r\.cfg: no channel is called 'uc'; it has 'ua', 'ub'"):
        record("ua", "ub").channel("uc")
    with pytest.raises(RecordError, match="2 channels are called 'ua'"):
        record("ua", "ua").channel("ua")


def test_missing_samples_are_counted():
    assert Channel("u", "V", np.array([1.0, np.nan, np.nan])).missing == 2


def test_pieces_carry_the_skew_and_never_the_gap():
    gapped = record("u", stretches=(Stretch(0, 3, 0.0, 10.0), Stretch(3, 2, 7.0, 10.0)))
    channel = Channel("v", "V", gapped.channels[0].samples, skew_s=0.001)
    pieces = list(gapped.pieces(channel))
    assert [samples.tolist() for _, samples in pieces] == [[0.0, 1.0, 2.0], [3.0, 4.0]]
    np.testing.assert_allclose(pieces[1][0], [7.001, 7.101])


@pytest.mark.parametrize(
    ("span", "kept"),
    [
        ((0.0, 0.2), [(0, 3)]),
        ((0.15, 7.05), [(2, 3), (3, 4)]),
        ((-5.0, 99.0), [(0, 3), (3, 5)]),
        ((7.1, 7.1001), [(4, 5)]),
    ],
)
def test_spans_over_gaps(span, kept):
    stretches = (Stretch(0, 3, 0.0, 10.0), Stretch(3, 2, 7.0, 10.0))
    windowed, ranges = windowed_stretches(stretches, span)
    assert ranges == kept
    assert [stretch.count for stretch in windowed] == [stop - first for first, stop in kept]
    assert windowed[0].first == 0


def test_a_span_of_uneven_stamps_and_none_at_all():
    stamps = np.array([0.0, 0.1, 0.5, 0.6])
    uneven = record("u", stretches=(Stretch(0, 4, 0.0, 5.0, stamps),))
    part = cut(uneven, (0.1, 0.5))
    assert part.stretches[0].times_s().tolist() == [0.1, 0.5]
    assert part.channels[0].samples.tolist() == [1.0, 2.0]
    assert cut(uneven, None) is uneven
    with pytest.raises(RecordError, match=r"no sample from 0\.2 to 0\.4 s; the record runs to 0\.6 s"):
        cut(uneven, (0.2, 0.4))


def test_the_door(tmp_path):
    with pytest.raises(RecordError, match=r"absent\.cfg: there is no such file"):
        read(tmp_path / "absent.cfg")
    with pytest.raises(RecordError, match="there is no such file"):
        read(tmp_path)
    with pytest.raises(RecordError, match="must run forward"):
        read(tmp_path / "a.cfg", (1.0, float("nan")))
    (tmp_path / "plain").write_bytes(b"")
    with pytest.raises(RecordError, match="a name without ending is no known format"):
        read(tmp_path / "plain")
    (tmp_path / "e.hdr").write_bytes(b"")
    with pytest.raises(RecordError, match=r"give the \.cfg file"):
        read(tmp_path / "e.hdr")
