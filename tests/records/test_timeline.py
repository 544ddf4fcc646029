"""Time axes: built from a truth, stamped as a recorder would, and recovered."""

import numpy as np
import pytest
from hypothesis import assume, given
from hypothesis import strategies as st

from twlocate.errors import RecordError
from twlocate.records.comtrade.configuration import RateLine
from twlocate.records.comtrade.timeline import NO_STAMP, timeline
from twlocate.records.repairs import RepairLog
from twlocate.records.spacing import counted, listed, stretches_by_stamps


class Rows:
    """Rows that hold stamps and nothing else."""

    def __init__(self, stamps, numbers=None):
        self.stamps = np.asarray(stamps, dtype=np.int64)
        self.numbers = np.arange(1, len(self.stamps) + 1) if numbers is None else np.asarray(numbers, dtype=np.int64)

    def __len__(self):
        return len(self.stamps)

    def stamp_blocks(self):
        return ((slice(i, i + 7), self.stamps[i : i + 7]) for i in range(0, len(self), 7))

    def stamps_at(self, rows):
        return [int(self.stamps[row]) for row in rows]

    def sample_numbers(self):
        return self.numbers


def times_of(result):
    return np.concatenate([stretch.times_s() for stretch in result.stretches])


def of(stamps, rates=(), tick_s=1e-6, numbers=None, **how):
    log = RepairLog()
    return timeline(Rows(stamps, numbers), tick_s, [RateLine(*rate) for rate in rates], log, **how), log


@given(
    lengths=st.lists(st.integers(3, 40), min_size=1, max_size=5),
    gaps_ms=st.lists(st.integers(5, 10_000), min_size=4, max_size=4),
    rate_hz=st.floats(2_000, 50_000), first=st.integers(-100_000, 100_000), cut=st.booleans(),
)  # fmt: skip
def test_stretches_and_gaps_come_back(lengths, gaps_ms, rate_hz, first, cut):
    """Rounded or cut to whole microseconds, with gaps anywhere: the same stretches, each sample within two ticks."""
    pieces, start = [], 0.0
    for length, gap_ms in zip(lengths, [*gaps_ms, 0], strict=False):
        pieces.append(start + np.arange(length) / rate_hz)
        start = pieces[-1][-1] + 1.0 / rate_hz + gap_ms * 1e-3
    truth = np.concatenate(pieces)
    ticks = (np.floor if cut else np.rint)(truth * 1e6).astype(np.int64) + first
    result, log = of(ticks, [(rate_hz, len(truth))])
    assert [stretch.count for stretch in result.stretches] == lengths
    assert all(stretch.rate_hz == rate_hz for stretch in result.stretches)
    np.testing.assert_allclose(times_of(result), truth, atol=2.1e-6)
    assert bool(log.repairs) == (len(lengths) > 1)
    assert result.first_stamp_s == pytest.approx(first * 1e-6)
    assert not result.doubts


@given(
    seed=st.integers(0, 2**32 - 1), shift=st.integers(0, 2**31), wrap=st.sampled_from([2**16, 2**32, 10**6, 10**9]),
)  # fmt: skip
def test_wrapping_changes_nothing(seed, shift, wrap):
    steps = np.random.default_rng(seed).integers(900, 1100, 300)
    stamps = np.concatenate([[0], np.cumsum(steps)])
    wrapped = (stamps + shift) % wrap
    assume(np.any(np.diff(wrapped) < 0))
    plain, _ = of(stamps)
    result, log = of(wrapped)
    np.testing.assert_allclose(times_of(result), times_of(plain), atol=1e-12)
    assert log.repairs[0].what.startswith("stamps wrap")


@given(scale=st.sampled_from([1e-9, 1e-6, 1e-3]), shift=st.integers(-(10**6), 10**6))
def test_tick_size_scales_and_shift_cancels(scale, shift):
    stamps = np.cumsum(np.random.default_rng(5).integers(900, 1100, 50))
    base, _ = of(stamps, tick_s=1e-6)
    moved, _ = of(stamps + shift, tick_s=scale)
    np.testing.assert_allclose(times_of(moved), times_of(base) * (scale / 1e-6), rtol=1e-12)


def test_several_near_rates_follow_the_stamps_and_far_rates_are_cut():
    near = np.concatenate([np.arange(10) / 2400, 10 / 2400 + np.arange(10) / 2405])
    result, log = of(np.rint(near * 1e6), [(2400, 10), (2405, 20)])
    assert len(result.stretches) == 1
    np.testing.assert_allclose(times_of(result), near, atol=1e-6)
    assert not log.repairs
    far = np.concatenate([np.arange(10) / 1000, 10 / 1000 + np.arange(10) / 4000])
    result, _ = of(np.rint(far * 1e6), [(1000, 10), (4000, 20)])
    assert [(s.first, s.rate_hz) for s in result.stretches] == [(0, 1000.0), (10, 4000.0)]
    np.testing.assert_allclose(times_of(result), far, atol=1e-6)


def test_rates_without_stamps_add_up():
    result, _ = of([NO_STAMP] * 20, [(1000, 10), (4000, 20)])
    np.testing.assert_allclose(times_of(result), [*np.arange(10) / 1000, *(10 / 1000 + np.arange(10) / 4000)])


def test_a_probe_sees_a_gap_anywhere_and_reads_few_stamps():
    even = np.arange(10_000) * 100
    result, _ = of(even, [(10_000, 10_000)], probe_only=True)
    assert len(result.stretches) == 1
    for place in (1, 4_999, 9_999):
        gapped = even + 50_000 * (np.arange(10_000) >= place)
        result, _ = of(gapped, [(10_000, 10_000)], probe_only=True)
        assert [stretch.count for stretch in result.stretches] == [place, 10_000 - place]


@pytest.mark.parametrize(
    ("stamps", "rates", "what", "doubt"),
    [
        (np.arange(50) * 1000, [(1_000_000, 50)], "stamps count in a unit 0.001 times", False),
        (np.arange(50) * 1250, [(1000, 50)], "stamps advance 1.25 times", True),
        (np.arange(50) * 7000, [(1000, 50)], "stamps advance 7 times", True),
        (np.random.default_rng(1).permutation(50) * 1000, [(1000, 50)], "stamps", True),
        (np.arange(50) * 833, [(1200, 50)], "stamps drift -0.0163 ms", False),
    ],
)
def test_contradictions_are_written_down(stamps, rates, what, doubt):
    result, log = of(stamps, rates)
    assert log.repairs[0].what.startswith(what.replace("-0.0163 ms", "-1.63e-05 s"))
    assert bool(result.doubts) == doubt
    assert sum(stretch.count for stretch in result.stretches) == 50


def test_no_time_at_all_is_refused():
    with pytest.raises(RecordError, match="neither a sampling rate nor a usable stamp"):
        of([NO_STAMP] * 5)
    with pytest.raises(RecordError, match="neither a sampling rate nor a usable stamp"):
        of([7] * 5)


def test_spacing_by_stamps_alone():
    log = RepairLog()
    stretches, doubts = stretches_by_stamps(np.array([0.0, 0.1, 0.2, 9.0, 9.1, 9.2]), 1e-6, "there", log)
    assert [(s.first, s.count, s.rate_hz) for s in stretches] == [
        (0, 3, pytest.approx(10.0)),
        (3, 3, pytest.approx(10.0)),
    ]
    assert log.repairs[0].where == "there, before sample 4"
    assert not doubts
    with pytest.raises(RecordError, match="the times of there do not advance"):
        stretches_by_stamps(np.array([1.0, 1.0, 1.0]), 1e-6, "there", log)


def test_times_coarser_than_the_sampling_are_spaced_evenly():
    truth = np.arange(1000) / 2500.0
    log = RepairLog()
    (stretch,), _ = stretches_by_stamps(np.floor(truth * 1000) / 1000, 1e-3, "there", log)
    np.testing.assert_allclose(stretch.times_s(), truth, atol=1e-3)
    assert log.repairs[0].confidence == "guess"


def test_a_sample_missing_from_coarse_times_is_not_smoothed_away():
    (stretch,), _ = stretches_by_stamps(np.array([0.0, 1.0, 3.0, 4.0]), 1.0, "there", RepairLog())
    assert stretch.times_s().tolist() == [0.0, 1.0, 3.0, 4.0]


def test_words_of_the_log():
    assert (counted(1, "gap"), counted(3, "gap")) == ("1 gap", "3 gaps")
    assert listed(list(range(9))) == "0, 1, 2, 3, 4, 5 ..."
    log = RepairLog()
    for line in (3, 4, 4, 5):
        log.add("blank skew", f"CFG line {line}", "taken as 0", "likely")
    log.add("other", "channel 'a'", "x", "sure")
    log.add("other", "channel 'b'", "x", "sure")
    log.add("mixed", "DAT", "x", "sure")
    log.add("mixed", "CFG line 1", "x", "sure")
    assert [repair.where for repair in log.repairs] == ["CFG line 3, 4, 5", "channel 'a', 'b'", "DAT; CFG line 1"]


def test_unsigned_stamps_before_the_trigger_are_negative():
    result, log = of((np.arange(100) * 100 - 4100) % 2**32, [(10_000, 100)])
    assert result.first_stamp_s == pytest.approx(-0.0041)
    assert result.stretches[0].start_s == 0.0
    assert log.repairs[0].what == "stamps wrap 1 time at 4294967296"


def test_the_step_at_a_change_of_rate_may_belong_to_either_side():
    slow, fast = np.arange(10) * 10_000, np.arange(10) * 100
    for step in (10_000, 100):
        stamps = np.concatenate([slow, slow[-1] + step + fast])
        result, log = of(stamps, [(100, 10), (10_000, 20)])
        assert [(s.first, s.rate_hz) for s in result.stretches] == [(0, 100.0), (10, 10_000.0)]
        assert "gap" not in "".join(repair.what for repair in log.repairs)
        np.testing.assert_allclose(times_of(result), (stamps - stamps[0]) * 1e-6, atol=1e-9)


def test_stamps_in_another_unit_still_show_their_gaps():
    stamps = np.concatenate([np.arange(10) * 10, 5000 + np.arange(10) * 10])
    result, log = of(stamps, [(100, 20)], tick_s=1e-9)
    assert [(s.first, round(s.start_s, 9)) for s in result.stretches] == [(0, 0.0), (10, 5.0)]
    assert [repair.what for repair in log.repairs][1] == "1 gap in the times"
