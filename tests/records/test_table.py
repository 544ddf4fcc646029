"""Text tables: the time axis to the nanosecond, units, decimal commas, gaps, and what is refused."""

import numpy as np
import pytest

from twlocate.errors import RecordError
from twlocate.records import read

START_NS = 1772424667_250000000  # 2026-03-02T04:11:07.25Z: 20514 days, 4 h 11 min 7.25 s after 1970-01-01


def table(tmp_path, text, name="t.csv", encoding="utf-8"):
    path = tmp_path / name
    path.write_bytes(text.encode(encoding))
    return path


def test_rate_start_and_clock_from_comment_lines(tmp_path):
    comments = "# rate: 500 Hz\n# start: 2026-03-02T04:11:07.250000001Z\n# clock: ± 1 ms\n"
    text = comments + "pressure [kPa],flow (m³/s)\n1.5,2\n2.5,\n"
    record = read(table(tmp_path, text))
    assert record.start_ns == START_NS + 1
    assert record.resolution_ns == 1
    assert record.clock.u_s == pytest.approx(1e-3)
    assert record.clock.usable
    assert (record.stretches[0].rate_hz, record.stretches[0].count) == (500.0, 2)
    assert [(c.name, c.unit) for c in record.channels] == [("pressure", "kPa"), ("flow", "m³/s")]
    assert record.channels[0].samples.tolist() == [1.5, 2.5]
    assert record.channel("flow").missing == 1
    assert record.repairs[-1].what == "1 sample missing"


@pytest.mark.parametrize(
    ("column", "times"),
    [
        ("time [s]", ["0.000", "0.002", "0.004"]),
        ("time (ms)", ["0", "2", "4"]),
        ("t [µs]", ["0", "2e3", "4e3"]),
        ("timestamp", ["2026-03-02T04:11:07.250Z", "2026-03-02T04:11:07.252Z", "2026-03-02T04:11:07.254Z"]),
        ("time", ["2026-03-02 05:11:07.250+01:00", "2026-03-02 05:11:07.252+01:00", "2026-03-02 05:11:07.254+01:00"]),
        ("time [s]", ["1772424667.250000000", "1772424667.252000000", "1772424667.254000000"]),
        ("time", ["1772424667250000000", "1772424667252000000", "1772424667254000000"]),
        ("time [ms]", ["1772424667250", "1772424667252", "1772424667254"]),
    ],
)
def test_every_form_of_time_gives_the_same_axis(tmp_path, column, times):
    rows = "".join(f"{time},{value}\n" for time, value in zip(times, (1.0, -2.0, 3.0), strict=True))
    record = read(table(tmp_path, f"# start: 2026-03-02T04:11:07.25Z\n{column},p [kPa]\n{rows}"))
    assert record.start_ns == START_NS
    stretch = record.stretches[0]
    assert stretch.rate_hz == pytest.approx(500.0, rel=1e-9)
    assert stretch.stamps_s is None
    assert stretch.start_s == 0.0
    assert record.channel("p").samples.tolist() == [1.0, -2.0, 3.0]


def test_decimal_comma_and_legacy_code_page(tmp_path):
    text = "Zeit [s];Überdruck [kPa]\n0,0;1,25\n0,1;1,50\n0,2;-3,75\n"
    record = read(table(tmp_path, text.replace("Zeit", "time"), encoding="cp1252"))
    assert record.channel("Überdruck").samples.tolist() == [1.25, 1.5, -3.75]
    assert record.stretches[0].rate_hz == pytest.approx(10.0)
    assert not record.clock.usable


def test_gaps_stay_gaps_and_uneven_times_are_kept(tmp_path):
    times = np.concatenate([np.arange(50) * 0.01, 3.0 + np.arange(50) * 0.01])
    record = read(table(tmp_path, "time [s],p [kPa]\n" + "".join(f"{t:.2f},1\n" for t in times)))
    assert [(s.first, s.count, s.start_s) for s in record.stretches] == [(0, 50, 0.0), (50, 50, 3.0)]
    uneven = np.cumsum(np.random.default_rng(3).uniform(0.01, 0.03, 100))
    record = read(table(tmp_path, "time [s],p [kPa]\n" + "".join(f"{t:.6f},1\n" for t in uneven)))
    np.testing.assert_allclose(record.stretches[0].stamps_s, uneven, atol=6e-7)


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ("p [kPa]\n1\n2\n", r"nothing is called time .* 'rate: 500 Hz'"),
        ("hello\nworld\n", "no line of numbers"),
        ("# rate: fast\np\n1\n", "rate 'fast' is not a number"),
        ("# rate: 5 kg\np\n1\n", "cannot be read in 'Hz'"),
        ("time [weeks],p\n1,2\n2,3\n", "time column is in 'weeks'"),
        ("time [s],p\n1,2\nx,3\n", "row 2: the time 'x'"),
        ("time [s],p\n1,2\n1,3\n", "do not advance"),
        ("# rate: 5 Hz\n# start: yesterday\np\n1\n", "start 'yesterday' is not an ISO 8601 time"),
        ("# rate: 5 Hz\n# start: 2026-03-02T04:11:07Z\n# clock: good\np\n1\n", "clock 'good'"),
    ],
)
def test_refusals_name_the_file_and_the_way_out(tmp_path, text, message):
    with pytest.raises(RecordError, match=r"t\.csv: .*" + message):
        read(table(tmp_path, text))
