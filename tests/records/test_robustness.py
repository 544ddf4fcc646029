"""Hostile and damaged files: only RecordError escapes, soon, and memory follows the file, not what it declares."""

import time
import tracemalloc

import pytest

from twlocate.errors import RecordError
from twlocate.records import read

from .mutations import SLACK_BYTES, outcomes


def test_mutated_files_are_read_or_refused(tmp_path):
    verdicts = {result.verdict for _, result in outcomes(tmp_path, 600, seed=7, memory=False)}
    assert verdicts >= {"read with repairs", "refused"}


CFG = "north,recorder,1999\n{counts}\n1,U,,,V,1,0,0,-32767,32767,1,1,P\n50\n1\n1000,{rows}\n"
DATES = "02/03/2026,04:11:07.250000\n02/03/2026,04:11:07.250000\nBINARY\n1\n"


@pytest.mark.parametrize(
    ("counts", "rows"),
    [("1,1A,0D", 10**9), ("999999,999999A,0D", 10), ("999999,1A,999998D", 10), ("1,1A,0D", 10**17)],
)
def test_a_declaration_costs_nothing(tmp_path, counts, rows):
    (tmp_path / "e.cfg").write_text(CFG.format(counts=counts, rows=rows) + DATES)
    (tmp_path / "e.dat").write_bytes(bytes(4000))
    read_quietly(tmp_path / "e.cfg")
    tracemalloc.start()
    started = time.perf_counter()
    read_quietly(tmp_path / "e.cfg")
    seconds = time.perf_counter() - started
    peak = tracemalloc.get_traced_memory()[1]
    tracemalloc.stop()
    assert seconds <= 0.1
    assert peak <= SLACK_BYTES


def read_quietly(path):
    try:
        return read(path)
    except RecordError:
        return None


def test_999_999_channels_are_refused_by_the_count_of_lines(tmp_path):
    (tmp_path / "e.cfg").write_text(CFG.format(counts="999999,999999A,0D", rows=10) + DATES)
    (tmp_path / "e.dat").write_bytes(bytes(4000))
    with pytest.raises(RecordError, match="declares 999999 channels, but only 8 lines follow"):
        read(tmp_path / "e.cfg")


def test_rows_declared_and_absent_are_not_padded(tmp_path):
    (tmp_path / "e.cfg").write_text(CFG.format(counts="1,1A,0D", rows=10**9) + DATES)
    rows = b"".join(k.to_bytes(4, "little") + (1000 * k).to_bytes(4, "little") + b"\1\0" for k in range(1, 31))
    (tmp_path / "e.dat").write_bytes(rows)
    record = read(tmp_path / "e.cfg")
    assert record.n_samples == 30
    assert "30 rows, 1000000000 declared" in [repair.what for repair in record.repairs]
