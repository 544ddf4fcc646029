"""Text tables: the time axis to the nanosecond, units, decimal commas, gaps, and what is refused."""

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

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
    ],
)
def test_refusals_name_the_file_and_the_way_out(tmp_path, text, message):
    with pytest.raises(RecordError, match=r"t\.csv: .*" + message):
        read(table(tmp_path, text))


@pytest.mark.parametrize(
    ("line", "what"),
    [
        ("# start: yesterday", "start 'yesterday' is not an ISO 8601 time"),
        ("# start: 2026-03-02T04:11:07Z\n# clock: good", "clock 'good' is not a number"),
        ("# start: 2026-03-02T04:11:07Z\n# clock: ± -1 ms", "clock '± -1 ms' has a negative uncertainty"),
    ],
)
def test_an_unreadable_start_or_clock_frees_the_clock_and_keeps_the_record(tmp_path, line, what):
    record = read(table(tmp_path, f"# rate: 5 Hz\n{line}\np\n1\n2\n"))
    assert record.n_samples == 2
    assert not record.clock.usable
    assert record.repairs[0].what.startswith(what)


def test_a_declared_free_clock_and_one_without_an_offset(tmp_path):
    start = "# rate: 5 Hz\n# start: 2026-03-02T04:11:07\n"
    free = read(table(tmp_path, f"{start}# clock: free\np\n1\n"))
    assert (free.clock.usable, free.clock.notes[0]) == (False, "declared free in the file")
    unstated = read(table(tmp_path, f"{start}p\n1\n"))
    assert (unstated.clock.usable, unstated.clock.u_s, unstated.clock.utc_offset_s) == (True, None, None)
    assert unstated.clock.notes[-1] == "offset from UTC not stated: times taken as UTC"


@pytest.mark.parametrize("delimiter", ["\t", ";", ",", "|", "  "])
def test_delimiters(tmp_path, delimiter):
    rows = [["time [s]", "north p [kPa]", "q"], ["0.0", "1.5", "-2"], ["0.5", "2.5", "-3e1"], ["1.0", "3.5", "4"]]
    if not delimiter.strip() and delimiter != "\t":
        rows[0][1] = "p [kPa]"
    record = read(table(tmp_path, "\n".join(delimiter.join(row) for row in rows), name="t.txt"))
    assert [(c.name, c.unit) for c in record.channels][1] == ("q", "")
    assert record.channels[0].samples.tolist() == [1.5, 2.5, 3.5]
    assert record.channel("q").samples.tolist() == [-2.0, -30.0, 4.0]
    assert record.stretches[0].rate_hz == pytest.approx(2.0)


def test_units_on_a_line_of_their_own_and_a_preamble(tmp_path):
    text = "Logger 12;site B\nserial;0042\n\nTime;Channel A;Channel B\n(ms);(mV);(V)\n0,0;1,5;2\n0,5;1,6;3\n"
    record = read(table(tmp_path, text))
    assert [(c.name, c.unit) for c in record.channels] == [("Channel A", "mV"), ("Channel B", "V")]
    assert record.stretches[0].rate_hz == pytest.approx(2000.0)


def test_date_and_time_in_two_columns(tmp_path):
    text = "Date,Time,p [kPa]\n2026-03-02,04:11:07.250,1\n2026-03-02,04:11:07.260,2\n"
    record = read(table(tmp_path, text))
    assert record.start_ns == START_NS
    assert record.stretches[0].rate_hz == pytest.approx(100.0)
    assert [c.name for c in record.channels] == ["p"]


def test_blank_and_odd_fields_are_missing_and_counted(tmp_path):
    text = "time [s],p [kPa],q [kPa]\n0,1,2\n1,,3\n2,n/a,4\n3,5\n4,6,inf\n"
    record = read(table(tmp_path, text))
    assert np.isnan(record.channel("p").samples).tolist() == [False, True, True, False, False]
    assert record.channel("q").missing == 2
    assert [repair.what for repair in record.repairs] == ["1 row with too few fields", "2 samples missing"]


def test_rows_without_a_time_are_left_out_not_invented(tmp_path):
    record = read(table(tmp_path, "time [s],p [kPa]\n0,1\n1,2\n,3\n3,4\nend of file\n"))
    assert record.stretches[0].times_s().tolist() == [0.0, 1.0, 3.0]
    assert record.channel("p").samples.tolist() == [1.0, 2.0, 4.0]
    assert record.repairs[0].what == "2 rows without a readable time"


def test_rate_and_time_at_odds(tmp_path):
    record = read(table(tmp_path, "# rate: 5 Hz\ntime [s],p\n0,1\n0.1,2\n0.2,3\n"))
    assert record.stretches[0].rate_hz == pytest.approx(10.0)
    assert record.repairs[0].what == "rate 5 Hz stated, 10 Hz by the time column"


def test_relative_times_count_from_the_stated_start(tmp_path):
    record = read(table(tmp_path, "# start: 2026-03-02T04:11:07.25Z\ntime [ms],u [V]\n-10,1\n-5,2\n0,3\n"))
    assert record.start_ns == START_NS
    assert record.stretches[0].start_s == pytest.approx(-0.010)


def test_a_hundred_megahertz_keeps_its_picoseconds(tmp_path):
    rows = "".join(f"{k * 1e-8:.10f},{k % 7}\n" for k in range(4000))
    record = read(table(tmp_path, "time [s],u [V]\n" + rows))
    assert record.stretches[0].rate_hz == pytest.approx(1e8, rel=1e-9)
    assert record.stretches[0].stamps_s is None


def test_a_window_of_a_table(tmp_path):
    rows = "".join(f"{k / 10},{k}\n" for k in range(100))
    record = read(table(tmp_path, "time [s],u [V]\n" + rows), (2.0, 3.05))
    assert record.channel("u").samples.tolist() == list(range(20, 31))
    assert record.stretches[0].start_s == pytest.approx(2.0)


def test_damaged_bytes_do_not_turn_the_whole_text_into_another_language(tmp_path):
    text = "# station: Überlandwerk Süd ß\n# rate: 5 Hz\nDruck [µbar]\n1\n2\n".encode()
    (tmp_path / "t.csv").write_bytes(text.replace("ß".encode(), b"\xc3"))
    record = read(tmp_path / "t.csv")
    assert record.station.startswith("Überlandwerk Süd")
    assert record.channels[0].unit == "µbar"
    assert record.repairs[0].what == "bytes that are not UTF-8 in a text that else is"


@given(
    columns=st.lists(st.lists(st.floats(allow_nan=False, allow_infinity=False, width=64), min_size=3, max_size=3),
                     min_size=1, max_size=4),
    start=st.integers(0, 2**61), step_us=st.integers(1, 10**6), delimiter=st.sampled_from([",", ";", "\t"]),
    comma=st.booleans(), line_end=st.sampled_from(["\n", "\r\n"]), trailing=st.booleans(),
)  # fmt: skip
@settings(max_examples=120, suppress_health_check=[HealthCheck.function_scoped_fixture], deadline=None)
def test_whatever_is_written_comes_back(tmp_path, columns, start, step_us, delimiter, comma, line_end, trailing):
    """Shortest decimals of any doubles, nanosecond times, any delimiter: the same numbers to the last bit."""
    times = [np.datetime64(start + 1000 * step_us * row, "ns") for row in range(3)]
    header = ["time", *(f"c{k} [V]" for k in range(len(columns)))]
    rows = [[f"{time}Z", *(repr(column[row]) for column in columns)] for row, time in enumerate(times)]
    if comma and delimiter != ",":
        rows = [[row[0], *(field.replace(".", ",") for field in row[1:])] for row in rows]
    text = line_end.join(delimiter.join(row) for row in [header, *rows]) + (line_end if trailing else "")
    record = read(table(tmp_path, text))
    assert record.start_ns == start
    assert [channel.samples.tolist() for channel in record.channels] == columns
    np.testing.assert_allclose(record.stretches[0].times_s(), np.arange(3) * step_us * 1e-6, rtol=1e-12)
    assert not record.repairs


@pytest.mark.parametrize(
    ("rows", "assumed", "sure", "start"),
    [
        (["13/03/2026 04:11:07.250", "13/03/2026 04:11:07.260"], "dd/mm", True, "2026-03-13T04:11:07.25"),
        (["03/13/2026 4:11:07.250", "03/13/2026 4:11:07.260"], "mm/dd", True, "2026-03-13T04:11:07.25"),
        (["02.03.2026 04:11:07.250", "02.03.2026 04:11:07.260"], "dd/mm", False, "2026-03-02T04:11:07.25"),
    ],
)
def test_dates_of_spreadsheets(tmp_path, rows, assumed, sure, start):
    record = read(table(tmp_path, "time;p [kPa]\n" + "".join(f"{row};{k}\n" for k, row in enumerate(rows))))
    assert record.start_ns == np.datetime64(start, "ns").astype(np.int64)
    assert record.repairs[0].assumed == f"read as {assumed}"
    assert record.repairs[0].confidence == ("sure" if sure else "guess")
    assert record.clock.usable == sure
    assert record.stretches[0].rate_hz == pytest.approx(100.0)


def test_dates_of_spreadsheets_in_two_columns(tmp_path):
    text = "Date,Time,p [kPa]\n31/12/2025,23:59:59.5,1\n01/01/2026,00:00:00.0,2\n01/01/2026,00:00:00.5,3\n"
    record = read(table(tmp_path, text))
    assert record.start_ns == np.datetime64("2025-12-31T23:59:59.5", "ns").astype(np.int64)
    assert record.stretches[0].rate_hz == pytest.approx(2.0)


def test_blank_lines_among_rows_without_times_are_refused(tmp_path):
    rows = [f"{value}" for value in range(100)]
    path = tmp_path / "gappy.csv"
    path.write_text("\n".join(["# rate: 250 Hz", "p [kPa]", *rows[:40], "", "", *rows[40:], "", ""]), encoding="utf-8")
    with pytest.raises(RecordError, match="2 blank lines among the rows and no time column"):
        read(path)
    path.write_text("\n\n".join(["# rate: 250 Hz", "p [kPa]", *rows]), encoding="utf-8")  # double-spaced throughout
    assert read(path).channels[0].samples.tolist() == list(map(float, range(100)))
    path.write_text("\n".join(["# rate: 250 Hz", "p [kPa]", *rows, "", ""]), encoding="utf-8")
    assert read(path).n_samples == 100
