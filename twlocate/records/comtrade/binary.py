"""The binary DAT forms: rows of number, stamp, analog words and packed status bits, little-endian (C37.111-2013)."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from twlocate.arrays import FloatArray
from twlocate.records.comtrade.container import Parts
from twlocate.records.comtrade.scaling import Scaling, scale_block
from twlocate.records.comtrade.timeline import NO_STAMP

BLOCK_BYTES = 1 << 19
"""Rows are scaled in blocks of about this size, so that a block stays in the processor's cache."""

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
    """Rows of a binary DAT, seen through a memory map: nothing is read before it is asked for."""

    rows: NDArray[np.void]
    file_type: str
    tail: bytes
    """What follows the last whole row."""

    def __len__(self) -> int:
        """Return the number of whole rows."""
        return len(self.rows)

    def stamps(self, index: slice | NDArray[np.int64]) -> NDArray[np.int64]:
        """Return the stamps of some rows in ticks, `NO_STAMP` where missing."""
        stamps = self.rows["stamp"][index].astype(np.int64)
        stamps[stamps == MISSING_STAMP] = NO_STAMP
        return stamps

    def sample_numbers(self) -> NDArray[np.int64]:
        """Return the sample numbers."""
        return self.rows["number"].astype(np.int64)

    def analog(self, first: int, stop: int, scaling: Scaling) -> FloatArray:
        """Return the readings of rows `first` to `stop`, shape (channels, stop - first)."""
        out = np.empty((len(scaling.a), stop - first))
        block = max(1, BLOCK_BYTES // self.rows.dtype.itemsize)
        for start in range(first, stop, block):
            counts = np.ascontiguousarray(self.rows["analog"][start : min(start + block, stop)].T)
            scale_block(counts, scaling, out[:, start - first : start - first + counts.shape[1]])
        return out

    def status(self, first: int, stop: int, n_status: int) -> NDArray[np.uint8]:
        """Return the states of rows `first` to `stop`, shape (channels, rows); bit 0 of word 1 is channel 1."""
        out = np.empty((n_status, stop - first), np.uint8)
        block = max(1, BLOCK_BYTES // self.rows.dtype.itemsize)
        for start in range(first, stop, block):
            words = np.ascontiguousarray(self.rows["status"][start : min(start + block, stop)])
            bits = np.unpackbits(words.view(np.uint8), axis=1, count=n_status, bitorder="little")
            out[:, start - first : start - first + len(words)] = bits.T
        return out


def open_binary(parts: Parts, file_type: str, n_analog: int, n_status: int) -> BinaryRows:
    """Map the samples of a record as binary rows."""
    layout = row_type(file_type, n_analog, n_status)
    count = parts.length // layout.itemsize
    if count == 0:
        return BinaryRows(np.empty(0, layout), file_type, b"")
    rows = np.memmap(parts.data_path, layout, mode="r", offset=parts.offset, shape=(count,))
    with parts.data_path.open("rb") as file:
        file.seek(parts.offset + count * layout.itemsize)
        tail = file.read(parts.length - count * layout.itemsize)
    return BinaryRows(rows, file_type, tail)
