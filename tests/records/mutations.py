"""Files of every format, mutated: whatever the bytes, `read` gives a record or raises RecordError, soon.

The short run is a test; the long one is ``python tests/records/mutations.py 20000``.
"""

import struct
import sys
import time
import tracemalloc
from collections import Counter
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from pathlib import Path

import h5py
import numpy as np
import scipy.io
import soundfile
from nptdms import ChannelObject, RootObject, TdmsWriter

from twlocate.errors import RecordError
from twlocate.records import Channel, Clock, Record, StatusChannel, Stretch, read, write_comtrade

SLACK_BYTES = 1_500_000
"""Memory that libraries take for themselves, whatever the file."""
AWKWARD = (b"", b"0", b"-1", b"999999", b"1000000000", b"1e999", b"nan", b"\x1a", b"\xff", b",,,,", b"\r\r\n")


@dataclass(frozen=True)
class Outcome:
    """What became of one mutated file."""

    verdict: str
    seconds: float
    peak_bytes: int
    size: int


def sample_files(folder: Path) -> dict[str, list[Path]]:
    """Write one small file (or pair) of each kind; the first of each list is the one to read."""
    rng = np.random.default_rng(11)
    counts = rng.integers(-999, 999, (3, 120)).astype(float)
    channels = tuple(Channel(f"U{k}", "V", row * 0.5, step=0.5) for k, row in enumerate(counts))
    status = (StatusChannel("trip", (counts[0] > 0).astype(np.uint8)),)
    gap = (Stretch(0, 60, 0.0, 1e4), Stretch(60, 60, 1.0, 1e4))
    record = Record(Path("x"), "", channels, gap, start_ns=10**18, status=status, clock=Clock(1e-6, True, (), 3600))
    files = {}
    for file_type in ("ASCII", "BINARY", "BINARY32", "FLOAT32"):
        for suffix in (".cfg", ".cff"):
            path = folder / f"{file_type}{suffix}"
            write_comtrade(record, path, file_type)
            files[path.name] = [path, path.with_suffix(".dat")] if suffix == ".cfg" else [path]
    rows = "".join(f"2026-03-02T04:11:07.{k:03d}Z,{value}\n" for k, value in enumerate(counts[0]))
    files["t.csv"] = [_text(folder / "t.csv", "# clock: ± 1 ms\ntime,p [kPa]\n" + rows)]
    files["u.csv"] = [_text(folder / "u.csv", "# rate: 500 Hz\np [kPa];q (m³/s)\n" + "1,5;2,5\n-3,25;\n" * 60)]
    for name, subtype in (("s.wav", "PCM_24"), ("f.wav", "FLOAT"), ("s.flac", "PCM_16")):
        soundfile.write(folder / name, counts.T / 1000, 48_000, subtype)
        files[name] = [folder / name]
    scipy.io.savemat(folder / "m.mat", {"fs": 500.0, "p": counts[0], "s": {"q": counts[1]}})
    with h5py.File(folder / "h.h5", "w") as file:
        file.attrs["rate"] = 500.0
        file.create_dataset("g/p", data=counts[0], compression="gzip").attrs["unit"] = "kPa"
    with TdmsWriter(folder / "n.tdms") as writer:
        writer.write_segment([RootObject({}), ChannelObject("g", "p", counts[0], {"wf_increment": 0.002})])
    return files | {name: [folder / name] for name in ("m.mat", "h.h5", "n.tdms")}


def _text(path: Path, text: str) -> Path:
    path.write_text(text, encoding="utf-8")
    return path


def mutated(content: bytes, rng: np.random.Generator) -> bytes:
    """Return `content` with one to four random changes."""
    for _ in range(int(rng.integers(1, 5))):
        content = MUTATIONS[int(rng.integers(len(MUTATIONS)))](content, rng)
    return content


def _place(content: bytes, rng: np.random.Generator) -> int:
    return int(rng.integers(len(content) + 1))


def _change_bytes(content: bytes, rng: np.random.Generator) -> bytes:
    changed = bytearray(content)
    for _ in range(int(rng.integers(1, 9)) if content else 0):
        changed[int(rng.integers(len(content)))] = int(rng.integers(256))
    return bytes(changed)


def _cut(content: bytes, rng: np.random.Generator) -> bytes:
    return content[: _place(content, rng)]


def _drop(content: bytes, rng: np.random.Generator) -> bytes:
    start = _place(content, rng)
    return content[:start] + content[start + int(rng.integers(1, 200)) :]


def _double(content: bytes, rng: np.random.Generator) -> bytes:
    start = _place(content, rng)
    return content[:start] + content[max(0, start - int(rng.integers(1, 400))) :]


def _insert(content: bytes, rng: np.random.Generator) -> bytes:
    start = _place(content, rng)
    return content[:start] + AWKWARD[int(rng.integers(len(AWKWARD)))] + content[start:]


def _replace_field(content: bytes, rng: np.random.Generator) -> bytes:
    fields = content.split(b",")
    fields[int(rng.integers(len(fields)))] = AWKWARD[int(rng.integers(len(AWKWARD)))]
    return b",".join(fields)


def _big_integer(content: bytes, rng: np.random.Generator) -> bytes:
    start = _place(content, rng)
    return content[:start] + struct.pack("<I", int(rng.integers(2**31, 2**32))) + content[start + 4 :]


MUTATIONS: tuple[Callable[[bytes, np.random.Generator], bytes], ...] = (
    _change_bytes, _cut, _drop, _double, _insert, _replace_field, _big_integer,
)  # fmt: skip


def outcomes(folder: Path, count: int, seed: int, *, memory: bool) -> Iterator[tuple[str, Outcome]]:
    """Mutate the sample files `count` times in turn and read each, whole or through a window."""
    rng = np.random.default_rng(seed)
    files = sample_files(folder)
    originals = {path: path.read_bytes() for paths in files.values() for path in paths}
    assert all(read(paths[0]).n_samples for paths in files.values())
    names = sorted(files)
    for index in range(count):
        paths = files[names[index % len(names)]]
        victim = paths[int(rng.integers(len(paths)))]
        victim.write_bytes(mutated(originals[victim], rng))
        span = None if rng.integers(2) else (0.0, 0.01)
        yield names[index % len(names)], outcome(paths, span, memory=memory)
        victim.write_bytes(originals[victim])


def outcome(paths: list[Path], span: tuple[float, float] | None, *, memory: bool) -> Outcome:
    """Read one file; anything but a record or a RecordError escapes."""
    size = sum(path.stat().st_size for path in paths)
    if memory:
        tracemalloc.start()
    started = time.perf_counter()
    try:
        record = read(paths[0], span)
        assert {len(channel.samples) for channel in record.channels} <= {record.n_samples}, paths[0]
        verdict = "read with repairs" if record.repairs else "read"
    except RecordError as error:
        verdict = "refused" if "\n" not in str(error) else "refused in several lines"
    seconds = time.perf_counter() - started
    peak = tracemalloc.get_traced_memory()[1] if memory else 0
    if memory:
        tracemalloc.stop()
    return Outcome(verdict, seconds, peak, size)


def main(folder: Path, count: int) -> None:
    """Run long and print what became of the files, the slowest and the hungriest."""
    verdicts: Counter[tuple[str, str]] = Counter()
    slowest: dict[str, float] = {}
    hungriest: dict[str, int] = {}
    for name, result in outcomes(folder, count, seed=2026, memory=True):
        kind = name.rpartition(".")[2]
        verdicts[kind, result.verdict] += 1
        slowest[kind] = max(slowest.get(kind, 0.0), result.seconds)
        hungriest[kind] = max(hungriest.get(kind, 0), result.peak_bytes - 3 * result.size)
    for kind in sorted(slowest):
        told = {verdict: number for (of, verdict), number in sorted(verdicts.items()) if of == kind}
        print(f"{kind:5} {told} slowest {slowest[kind]:.3f} s, {hungriest[kind] / 1024:.0f} KiB beyond 3 x file")


if __name__ == "__main__":
    import tempfile

    with tempfile.TemporaryDirectory() as scratch:
        main(Path(scratch), int(sys.argv[1]) if len(sys.argv) > 1 else 20_000)
