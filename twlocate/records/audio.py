"""WAV, FLAC and their kin by soundfile; the broadcast-wave time reference (EBU Tech 3285) gives the start."""

import math
import struct
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np

from twlocate.arrays import FloatArray
from twlocate.errors import RecordError
from twlocate.records.assembling import as_readings, assemble
from twlocate.records.extras import needed
from twlocate.records.moments import SECOND_NS, iso_moment
from twlocate.records.record import Channel, Record, Stretch
from twlocate.records.repairs import LIKELY, SURE, RepairLog
from twlocate.records.windows import windowed_stretches

BITS = {"PCM_S8": 8, "PCM_U8": 8, "PCM_16": 16, "PCM_24": 24, "PCM_32": 32}
DATE_OFFSET, DATE_LENGTH, TIME_LENGTH = 320, 10, 8
"""Of the bext chunk: description 256, originator 32, reference 32, then date, time and the 64-bit time reference."""
BLOCK_FRAMES = 4096
UNSTATED = 0xFFFFFFFF
MAX_CHUNKS = 1000
MAX_CHUNK_BYTES = 1 << 16


def read_audio(path: Path, span: tuple[float, float] | None) -> Record:
    """Read sound: readings are fractions of full scale, as no such file states a unit.

    Raises
    ------
    RecordError
        The file is damaged or of no sound format.
    """
    soundfile = needed("soundfile")
    log = RepairLog()
    try:
        with soundfile.SoundFile(path) as file:
            return _read(path, file, span, log)
    except soundfile.SoundFileError as error:
        raise RecordError(f"not a readable sound file ({' '.join(str(error).split())[:120]})") from None


def _read(path: Path, file: Any, span: tuple[float, float] | None, log: RepairLog) -> Record:
    whole = Stretch(0, int(file.frames), 0.0, float(file.samplerate))
    (stretch,), ((first, stop),) = windowed_stretches((whole,), span or (0.0, math.inf))
    file.seek(first)
    samples = _frames(file, stop - first)
    if len(samples) < stop - first:
        what = f"{len(samples)} samples where the header promises {stop - first}"
        log.add(what, "sound data", "what can be decoded is read", SURE)
    channels = tuple(_channel(index, column, file.subtype) for index, column in enumerate(samples.T, start=1))
    note_cut(path, log)
    settings = {"rate": repr(file.samplerate)} | broadcast_start(path, file.samplerate, log)
    record = assemble(path, f"{file.format} {file.subtype}", channels, None, settings, log)
    return replace(record, stretches=(replace(stretch, count=len(samples)),), repairs=log.repairs)


def _frames(file: Any, count: int) -> FloatArray:
    """Return up to `count` frames, shape (frames, channels): those before the first that cannot be decoded."""
    blocks = []
    while count > 0:
        try:
            block = file.read(min(count, BLOCK_FRAMES), dtype="float64", always_2d=True)
        except RuntimeError:  # what soundfile raises for a damaged frame
            break
        if not len(block):
            break
        blocks.append(block)
        count -= len(block)
    if not blocks:
        raise RecordError("no sample of it can be decoded")
    return np.concatenate(blocks)


def _channel(number: int, samples: FloatArray, subtype: str) -> Channel:
    bits = BITS.get(subtype)
    step = None if bits is None else 2.0 ** (1 - bits)
    limits = (None, None) if step is None else (-1.0, 1.0 - step)
    return Channel(f"channel {number}", "", as_readings(samples), step=step, low=limits[0], high=limits[1])


def broadcast_start(path: Path, rate_hz: int, log: RepairLog) -> dict[str, str]:
    """Return the setting ``start`` from a broadcast-wave chunk: its date, and the samples since that midnight.

    Source: EBU Tech 3285, Specification of the Broadcast Wave Format, version 2 (2011), section 2.3.
    """
    chunk = riff_chunk(path, b"bext")
    if chunk is None or len(chunk) < DATE_OFFSET + DATE_LENGTH + TIME_LENGTH + 8:
        return {}
    date = chunk[DATE_OFFSET : DATE_OFFSET + DATE_LENGTH].decode("ascii", "replace")
    time = chunk[DATE_OFFSET + DATE_LENGTH :][:TIME_LENGTH].decode("ascii", "replace").replace("-", ":")
    (reference,) = struct.unpack_from("<Q", chunk, DATE_OFFSET + DATE_LENGTH + TIME_LENGTH)
    try:
        midnight = iso_moment(f"{date[:4]}-{date[5:7]}-{date[8:]}").ns
        written = iso_moment(f"{date[:4]}-{date[5:7]}-{date[8:]}T{time}").ns
    except ValueError:
        log.add(f"broadcast date {date!r} {time!r}", "bext chunk", "no absolute time", SURE)
        return {}
    ns = midnight + (reference * SECOND_NS + rate_hz // 2) // rate_hz
    if reference == 0 and written != midnight:
        log.add("time reference 0", "bext chunk", "the time of day written beside it taken", LIKELY)
        return {"start": str(np.datetime64(written, "s"))}
    if abs(ns - written) > 2 * SECOND_NS:
        log.add(f"time of day {time} beside another time reference", "bext chunk", "the time reference taken", LIKELY)
    return {"start": str(np.datetime64(ns, "ns"))}


def riff_chunk(path: Path, name: bytes) -> bytes | None:
    """Return the first `MAX_CHUNK_BYTES` of a chunk of a RIFF or RF64 file; None where there is none."""
    place = riff_place(path, name)
    if place is None:
        return None
    with path.open("rb") as file:
        file.seek(place[0])
        return file.read(min(place[1], MAX_CHUNK_BYTES))


def riff_place(path: Path, name: bytes) -> tuple[int, int] | None:
    """Return where the content of a chunk starts and the size it states; None where there is none."""
    with path.open("rb") as file:
        head = file.read(12)
        if head[:4] not in (b"RIFF", b"RF64") or head[8:] != b"WAVE":
            return None
        for _ in range(MAX_CHUNKS):
            header = file.read(8)
            if len(header) < 8:
                return None
            size = struct.unpack_from("<I", header, 4)[0]
            if header[:4] == name:
                return file.tell(), size
            file.seek(size + size % 2, 1)
    return None


def note_cut(path: Path, log: RepairLog) -> None:
    """Write down a data chunk that states more bytes than there are (the size FFFFFFFF means not stated)."""
    place = riff_place(path, b"data")
    if place is None or place[1] == UNSTATED:
        return
    there = path.stat().st_size - place[0]
    if there < place[1]:
        log.add(f"{there} bytes of sound, {place[1]} stated", "data chunk", "what is there is read", SURE)
