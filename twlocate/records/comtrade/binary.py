"""The binary DAT forms: rows of number, stamp, analog words and packed status bits, little-endian (C37.111-2013)."""

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from twlocate.arrays import FloatArray
from twlocate.errors import RecordError
from twlocate.records.comtrade.container import Parts
from twlocate.records.comtrade.scaling import Scaling, scale_block
from twlocate.records.comtrade.timeline import NO_STAMP

BLOCK_BYTES = 1 << 19
"""Rows are scaled in blocks of about this size, so that a block stays in the processor's cache."""

STAMP_OFFSET = 4
"""Of the stamp in its row: the sample number comes first."""
MISSING_STAMP = 0xFFFFFFFF
ANALOG_TYPES = {"BINARY": "<i2", "BINARY32": "<i4", "FLOAT32": "<f4"}


def row_type(file_type: str, n_analog: int, n_status: int) -> np.dtype[np.void]:
    """Return the layout of one row: 8 bytes, the analog words, and a 16-bit word for every 16 status channels."""
    words = -(-n_status // 16)
    return np.dtype(
        [
            ("number", "<u4"),
            ("stamp", "<u4"),
            ("analog", ANALOG_TYPES[file_type], (n_analog,)),
            ("status", "<u2", (words,)),
        ]
    )


@dataclass(frozen=True)
class BinaryRows:
    """Rows of a binary DAT, read block by block when asked for; a file cut short meanwhile is an error, not a crash."""

    parts: Parts
    layout: np.dtype[np.void]
    file_type: str

    def __len__(self) -> int:
        """Return the number of whole rows."""
        return self.parts.length // self.layout.itemsize

    def tail(self) -> bytes:
        """Return what follows the last whole row."""
        size = self.parts.length % self.layout.itemsize
        with self.parts.data_path.open("rb") as file:
            file.seek(self.parts.offset + self.parts.length - size)
            return file.read(size)

    def blocks(self, first: int, stop: int) -> Iterator[tuple[slice, NDArray[np.void]]]:
        """Yield the rows `first` to `stop` in blocks, each with its place counted from `first`."""
        most = max(1, BLOCK_BYTES // self.layout.itemsize)
        with self.parts.data_path.open("rb") as file:
            file.seek(self.parts.offset + first * self.layout.itemsize)
            for start in range(0, stop - first, most):
                wanted = min(most, stop - first - start)
                rows = np.fromfile(file, self.layout, wanted)
                if len(rows) < wanted:
                    raise RecordError(f"the DAT became shorter while read: row {first + start + len(rows)} is gone")
                yield slice(start, start + wanted), rows

    def stamp_blocks(self) -> Iterator[tuple[slice, NDArray[np.int64]]]:
        """Yield all stamps in ticks in blocks, `NO_STAMP` where missing."""
        return ((place, _ticks(rows)) for place, rows in self.blocks(0, len(self)))

    def stamps_at(self, rows: Sequence[int]) -> list[int]:
        """Return the stamps of a few rows in ticks, `NO_STAMP` where missing."""
        stamps = []
        with self.parts.data_path.open("rb", buffering=0) as file:
            for row in rows:
                file.seek(self.parts.offset + row * self.layout.itemsize + STAMP_OFFSET)
                stamps.append(int.from_bytes(file.read(4), "little"))
        return [NO_STAMP if stamp == MISSING_STAMP else stamp for stamp in stamps]

    def sample_numbers(self) -> NDArray[np.int64]:
        """Return the sample numbers."""
        return np.concatenate([rows["number"].astype(np.int64) for _, rows in self.blocks(0, len(self))])

    def samples(self, first: int, stop: int, scaling: Scaling, n_status: int) -> tuple[FloatArray, NDArray[np.uint8]]:
        """Return readings and states of rows `first` to `stop`, each of shape (channels, stop - first).

        Bit 0 of the first status word is channel 1.
        """
        readings = np.empty((len(scaling.a), stop - first))
        states = np.empty((n_status, stop - first), np.uint8)
        for place, rows in self.blocks(first, stop):
            scale_block(np.ascontiguousarray(rows["analog"].T), scaling, readings[:, place])
            words = np.ascontiguousarray(rows["status"])
            states[:, place] = np.unpackbits(words.view(np.uint8), axis=1, count=n_status, bitorder="little").T
        return readings, states


def _ticks(rows: NDArray[np.void]) -> NDArray[np.int64]:
    ticks = rows["stamp"].astype(np.int64)
    ticks[ticks == MISSING_STAMP] = NO_STAMP
    return ticks


def open_binary(parts: Parts, file_type: str, n_analog: int, n_status: int) -> BinaryRows:
    """Return the samples of a record as binary rows; nothing is read yet."""
    return BinaryRows(parts, row_type(file_type, n_analog, n_status), file_type)
