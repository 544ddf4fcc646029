"""Reading speed and memory beside the `comtrade` package in its best mode, in one run.

``python -m pytest tests/benchmarks/bench_records.py --benchmark-group-by=group`` (not part of the default tests).
8 analog and 16 status channels; ``ROWS`` samples; the assertions compare the best rounds of both readers.
"""

import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest

from twlocate.records import read
from twlocate.records.comtrade.binary import row_type

ROWS = 1_000_000
FILE_TYPES = ("BINARY", "BINARY32", "FLOAT32", "ASCII")
WINDOW_S = (0.49, 0.51)
READERS = {
    "twlocate": "from twlocate.records import read\ndef load(path): return read(path + '.cfg')",
    "comtrade": "import comtrade\ndef load(path):\n"
    " record = comtrade.Comtrade(use_numpy_arrays=True, use_double_precision=True)\n"
    " record.load(path + '.cfg', path + '.dat')\n return record",
}
PEAK = """
def high_water(): return next(int(l.split()[1]) for l in open('/proc/self/status') if l.startswith('VmHWM'))
import sys; before = high_water(); kept = load(sys.argv[1]); print(high_water() - before)
"""


@pytest.fixture(scope="module")
def folder(tmp_path_factory):
    folder = tmp_path_factory.mktemp("bench")
    rng = np.random.default_rng(1)
    counts, words = rng.integers(-9999, 9999, (ROWS, 8)), rng.integers(0, 2**16, (ROWS, 1), dtype=np.uint16)
    for file_type in FILE_TYPES:
        (folder / f"{file_type}.cfg").write_text(configuration(file_type))
        with (folder / f"{file_type}.dat").open("wb") as file:
            write_rows(file, file_type, counts, words)
    return folder


def configuration(file_type):
    analog = [f"{k},a{k},,,V,0.1,0.5,0,-32767,32767,1,1,P" for k in range(1, 9)]
    status = [f"{k},d{k},,,0" for k in range(1, 17)]
    date = "02/03/2026,04:11:07.250000"
    tail = ["50", "1", f"1000000,{ROWS}", date, date, file_type, "1", "0,0", "4,0"]
    return "\r\n".join(["s,i,2013", "24,8A,16D", *analog, *status, *tail, ""])


def write_rows(file, file_type, counts, words):
    if file_type != "ASCII":
        rows = np.zeros(ROWS, row_type(file_type, 8, 16))
        rows["number"], rows["stamp"] = np.arange(1, ROWS + 1), np.arange(ROWS)
        rows["analog"], rows["status"] = counts, words
        rows.tofile(file)
        return
    states = np.unpackbits(words.view(np.uint8), axis=1, bitorder="little")
    table = np.column_stack([np.arange(1, ROWS + 1), np.arange(ROWS), counts, states])
    for start in range(0, ROWS, 50_000):
        file.write("".join(",".join(map(str, row)) + "\r\n" for row in table[start : start + 50_000].tolist()).encode())


def load_by_comtrade(path):
    import comtrade

    record = comtrade.Comtrade(use_numpy_arrays=True, use_double_precision=True)
    record.load(f"{path}.cfg", f"{path}.dat")
    return record


@pytest.mark.parametrize("file_type", FILE_TYPES)
@pytest.mark.parametrize("reader", ["twlocate", "window", "comtrade"])
@pytest.mark.filterwarnings("ignore")
def test_speed(benchmark, folder, file_type, reader):
    benchmark.group = file_type
    path = folder / file_type
    load = {
        "twlocate": lambda: read(f"{path}.cfg"),
        "window": lambda: read(f"{path}.cfg", WINDOW_S),
        "comtrade": lambda: load_by_comtrade(path),
    }[reader]
    record = benchmark.pedantic(load, rounds=3 if reader == "comtrade" else 7, warmup_rounds=1)
    SECONDS[file_type, reader] = benchmark.stats.stats.min
    assert record is not None


SECONDS: dict[tuple[str, str], float] = {}
LIMITS = {"BINARY": (5.0, 100.0), "BINARY32": (5.0, 100.0), "FLOAT32": (5.0, 100.0), "ASCII": (6.0, 6.0)}
"""Times as fast as comtrade: the whole file, and a 2 % window (which in ASCII costs the whole file)."""


@pytest.mark.parametrize("file_type", FILE_TYPES)
def test_times_as_fast(file_type, capsys):
    whole = SECONDS[file_type, "comtrade"] / SECONDS[file_type, "twlocate"]
    window = SECONDS[file_type, "comtrade"] / SECONDS[file_type, "window"]
    with capsys.disabled():
        print(f"\n{file_type}: {whole:.1f} times as fast as comtrade, a 2 % window {window:.0f} times")
    assert whole >= LIMITS[file_type][0]
    assert window >= LIMITS[file_type][1]


@pytest.mark.parametrize("file_type", FILE_TYPES)
def test_peak_memory(folder, file_type, capsys):
    peaks = {name: peak_kib(code, folder / file_type) for name, code in READERS.items()}
    ratio = peaks["twlocate"] / peaks["comtrade"]
    with capsys.disabled():
        print(f"\n{file_type}: peak {peaks['twlocate'] / 1024:.0f} MiB, {ratio:.2f} of comtrade's")
    assert ratio <= (1.0 if file_type == "ASCII" else 0.5)


def peak_kib(code: str, path: Path) -> int:
    ran = subprocess.run([sys.executable, "-c", code + PEAK, str(path)], capture_output=True, text=True, check=True)
    return int(ran.stdout)
