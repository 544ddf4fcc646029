"""The case file: read in SI, and every fault listed at once with its place."""

import re

import pytest

from twlocate.case import load_case
from twlocate.errors import CaseError

GOOD = """\
title = "Two sections (invented)"
kind = "line"

[[section]]
from = "A"
to = "J"
length = "62.31 km ± 40 m"
speed = "294.6 m/µs ± 0.5 m/µs"
impedance = "385 ohm"

[[section]]
from = "J"
to = "B"
length = "8 km"
speed = "0.57 c"

[[terminal]]
node = "A"
recording = "a.csv"
channels = { v = "U" }
clock = "± 0.1 µs"
delay = "0.9 µs ± 0.05 µs"

[[terminal]]
node = "B"
recording = "b.csv"
channels = { v = "U" }
clock = "free"
"""

PLACES = "name,section,chainage,lat,lon\nT1,A-J,340 m,54.1,-2.2\nT2,J–B,1.5 km,,\n"


@pytest.fixture
def folder(tmp_path):
    for name in ("a.csv", "b.csv"):
        (tmp_path / name).write_text("U [V]\n1\n")
    (tmp_path / "places.csv").write_text(PLACES, encoding="utf-8")
    return tmp_path


def load(folder, text):
    path = folder / "case.toml"
    path.write_text(text, encoding="utf-8")
    return load_case(path)


def faults(folder, text):
    with pytest.raises(CaseError) as error:
        load(folder, text)
    head, *rows = str(error.value).split("\n  ")
    assert re.search(r"case.toml: \d+ faults? in the case file", head)
    return rows


def test_reads_everything_in_si(folder):
    case = load(folder, GOOD + '\n[places]\nfile = "places.csv"\n')
    first, second = case.route.sections
    assert (first.name, first.length.value, first.length.u) == ("A–J", 62_310.0, 40.0)
    assert first.speed.value == pytest.approx(294.6e6)
    assert first.impedance == 385.0
    assert second.speed.value == pytest.approx(0.57 * 299_792_458)
    a, b = case.terminals
    assert (a.clock.u, a.delay.value, a.clock_free) == (pytest.approx(1e-7), pytest.approx(0.9e-6), False)
    assert (b.clock, b.clock_free, b.launches) == (None, True, None)
    assert a.recording == folder / "a.csv"
    assert [(p.name, p.section, p.distance_m) for p in case.places] == [("T1", 0, 340.0), ("T2", 1, 1500.0)]
    assert (case.places[0].lat, case.places[1].lat) == (54.1, None)


def test_lists_all_faults_at_once(folder):
    text = (
        GOOD.replace('length = "8 km"', 'length = "-8 km"')
        .replace('length = "62.31 km ± 40 m"', 'lenght = "62.31 km"')
        .replace('speed = "0.57 c"', 'speed = "0.57 kg"')
        .replace('recording = "b.csv"', 'recording = "gone.csv"')
        .replace('node = "A"', 'node = "Z"')
    )
    rows = faults(folder, text)
    for words in (
        "section 1, length: missing",
        "section 1, lenght: unknown key; did you mean 'length'?",
        "section 2, length: -8000 (SI) is not positive",
        "section 2, speed: '0.57 kg' cannot be read in 'm/s'",
        "terminal 2, recording: no file 'gone.csv'",
        "terminal 1, node: 'Z' is not a node of any section; nodes are A, B, J",
    ):
        assert any(row.startswith(words) for row in rows), (words, rows)
    assert len(rows) == 6


@pytest.mark.parametrize(
    ("old", "new", "words"),
    [
        ('kind = "line"', 'kind = "tube"', "kind: Input should be 'line' or 'pipe'"),
        ('length = "8 km"', "length = 8", "section 2, length: 8 is not text; write a number with its unit in quotes"),
        ('length = "8 km"', 'length = "8"', "section 2, length: '8' has no unit"),
        ('speed = "0.57 c"', 'speed = "1.2 c"', "section 2, speed: 3.59751e\\+08 m/s is above the speed of light"),
        ('speed = "0.57 c"', 'speed = "0.57 c"\nflow_speed = "1 m/s"', "section 2, flow_speed: only a pipe has a flow"),
        ('impedance = "385 ohm"', 'impedance = "385 bar"', "section 1, impedance: '385 bar' cannot be read in 'ohm'"),
        ('node = "B"', 'node = "A"', "terminal 2, node: 'A' has a terminal already"),
        ('clock = "free"', 'clock = "good"', "terminal 2, clock: 'good' is not a number with a unit"),
        ('channels = { v = "U" }', 'channels = { p = "U" }', "terminal 1, channels: 'p' is not a role on a line"),
        ('channels = { v = "U" }', 'channels = { va = "U" }', "terminal 1, channels: va without vb, vc"),
        ('to = "B"', 'to = "A"', "section 2: J–A closes a loop"),
        ('from = "J"\nto = "B"', 'from = "K"\nto = "B"', "section: the sections do not join up"),
        (
            'speed = "0.57 c"',
            'speed = "170 km/s"',
            "section 2, speed: 170000 m/s is outside 2.99792e\\+07 to 2.99792e\\+08 m/s",
        ),
        ('speed = "0.57 c"', 'speed = "0.57 c ± 40 %"', "section 2, speed: .* may as well be 0; state it to a third"),
        ('length = "8 km"', 'length = "8 km ± 8 km"', "section 2, length: 8000 m with .* of 8000 m may as well be 0"),
        ('length = "8 km"', 'length = "8e9 km"', "section 2, length: 8e\\+12 m is longer than the equator"),
        ('length = "8 km"', 'length = "1e400 km"', "section 2, length: '1e400 km' is not a finite number"),
        (
            'impedance = "385 ohm"',
            'impedance = "1e300 ohm"',
            "section 1, impedance: 1e\\+300 ohm is outside 0.1 to 100000",
        ),
        ('impedance = "385 ohm"', "impedance = 385", "section 1, impedance: not text; write it in quotes"),
        (
            'recording = "b.csv"',
            'recording = "a.csv"',
            "terminal 2, channels: v is 'U' of 'a.csv', which is v of terminal 1",
        ),
        ('recording = "b.csv"', 'recording = "b\\u0000.csv"', "terminal 2, recording: no file 'b.x00.csv'"),
        ('recording = "b.csv"', f'recording = "{"b" * 5000}"', "terminal 2, recording: no file 'b{120}…'"),
        ('channels = { v = "U" }', "channels = {}", "terminal 1, channels: empty; at least one entry is needed"),
        (
            'channels = { v = "U" }',
            'channels = { v = "U", va = "1", vb = "2", vc = "3" }',
            "terminal 1, channels: v beside va, vb, vc; give three phases or one v",
        ),
        (
            'from = "A"',
            'from = "A\\u001b[2J"',
            r"section 1, from: 'A.x1b\[2J' holds a character that cannot be printed",
        ),
        ('from = "A"', 'from = ""', "section 1, from: empty; give it a name"),
        ("title", "titel", "titel: unknown key; did you mean 'title'\\?"),
    ],
)
def test_says_where_and_what(folder, old, new, words):
    assert re.search(words, "\n".join(faults(folder, GOOD.replace(old, new))))


@pytest.mark.parametrize(
    ("row", "words"),
    [
        ("T3,A-Q,1 km,,", "line 4: no section 'A-Q'; sections are A-J, J-B"),
        ("T3,A-J,99 km,,", "line 4: chainage 99 km is not on the section, which is 62310 m long"),
        ("T3,A-J,,,", "line 4: no chainage"),
        ("T3,A-J,1 km,nan,2", "line 4: lat nan is not within ±90 degrees"),
        ("T3,A-J,1 km,54,181", "line 4: lon 181 is not within ±180 degrees"),
        ("T\x1b[31m,A-J,1 km,,", "line 4: 'T\\x1b[31m' holds a character that cannot be printed"),
        ("T" * 200_000 + ",A-J,1 km,,", "places.csv is no comma-separated table: field larger than field limit"),
        ("T3,A-J,1 km,north,2", "line 4: could not convert string to float: 'north'"),
    ],
)
def test_faults_of_the_places_file(folder, row, words):
    (folder / "places.csv").write_text(PLACES + row + "\n", encoding="utf-8")
    assert words in "\n".join(faults(folder, GOOD + '\n[places]\nfile = "places.csv"\n'))


def test_a_file_that_is_no_case(folder):
    with pytest.raises(CaseError, match="No such file or directory; give the path of a case file"):
        load_case(folder / "none.toml")
    with pytest.raises(CaseError, match=r"not TOML: .*line 1"):
        load(folder, "title = = 3")
    (folder / "case.toml").write_bytes(b'title = "\xff\xfe"')
    with pytest.raises(CaseError, match="not UTF-8 text at byte 9"):
        load_case(folder / "case.toml")
    with pytest.raises(CaseError, match="Is a directory"):
        load_case(folder)


def test_pipe_needs_flow_below_the_wave_speed(folder):
    text = GOOD.replace('"line"', '"pipe"').replace('{ v = "U" }', '{ p = "U" }').replace('impedance = "385 ohm"\n', "")
    text = text.replace('speed = "0.57 c"', 'speed = "1000 m/s"\nflow_speed = "-1200 m/s"')
    assert "section 2, flow_speed: -1200 m/s is not below the wave speed" in faults(folder, text)


def as_pipe(text):
    text = text.replace('"line"', '"pipe"').replace('{ v = "U" }', '{ p = "U" }').replace('impedance = "385 ohm"\n', "")
    return text.replace('speed = "294.6 m/µs ± 0.5 m/µs"', 'speed = "1148 m/s ± 9 m/s"')


@pytest.mark.parametrize(
    ("speeds", "words"),
    [
        ('speed = "294 m/µs"', "section 2, speed: 2.94e+08 m/s is outside 10 to 10000 m/s, what a pipe can have"),
        (
            'speed = "400 m/s ± 10 m/s"\nflow_speed = "375 m/s ± 1 m/s"',
            "section 2, flow_speed: the wave speed against the flow: 25 m/s with a standard uncertainty of 10.0499 m/s",
        ),
    ],
    ids=["unit of a line", "flow near the wave speed"],
)
def test_speeds_that_no_pipe_has(folder, speeds, words):
    assert words in "\n".join(faults(folder, as_pipe(GOOD).replace('speed = "0.57 c"', speeds)))


def test_terminals_may_share_a_file_with_channels_of_their_own(folder):
    text = GOOD.replace('recording = "b.csv"\nchannels = { v = "U" }', 'recording = "a.csv"\nchannels = { v = "U2" }')
    assert [terminal.channels["v"] for terminal in load(folder, text).terminals] == ["U", "U2"]


def test_a_byte_order_mark_and_a_capital_are_no_faults(folder):
    case = load(folder, "\ufeff" + GOOD.replace('"free"', '" Free "'))
    assert case.terminals[1].clock_free


def test_one_wrong_length_does_not_bury_itself_under_its_places(folder):
    rows = [f"T{i},J-B,{9000 + i} m,," for i in range(300)]
    (folder / "places.csv").write_text(PLACES + "\n".join(rows), encoding="utf-8")
    found = faults(folder, GOOD + '\n[places]\nfile = "places.csv"\n')
    assert found[-1] == "places, file: 295 more lines like these"
    assert len(found) == 6


def test_brackets_without_end(folder):
    with pytest.raises(CaseError, match=r"case.toml: brackets are nested too deep"):
        load(folder, "a = " + "[" * 5000 + "]" * 5000)


@pytest.mark.parametrize("text", ["", "T1;A-J;340 m\n", "station,km\nT1,3\n"], ids=["empty", "semicolons", "others"])
def test_a_places_file_without_its_columns(folder, text):
    (folder / "places.csv").write_text(text, encoding="utf-8")
    (fault,) = faults(folder, GOOD + '\n[places]\nfile = "places.csv"\n')
    assert fault.startswith("places, file: places.csv has no column name, section, chainage in its first line")


def test_titles_of_the_places_file_may_have_capitals_and_blanks(folder):
    (folder / "places.csv").write_text("Name, Section, Chainage\nT1, A-J, 340 m\n", encoding="utf-8")
    assert load(folder, GOOD + '\n[places]\nfile = "places.csv"\n').places[0].name == "T1"
