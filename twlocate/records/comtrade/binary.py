"""The binary DAT forms: rows of number, stamp, analog words and packed status bits, little-endian (C37.111-2013)."""

from dataclasses import dataclass
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from twlocate.arrays import FloatArray
from twlocate.records.comtrade.timeline import NO_STAMP

BLOCK_BYTES = 1 << 20
"""Rows are scaled in blocks of about this size, so that a block stays in the processor's cache."""

MISSING_STAMP = 0xFFFFFFFF
ANALOG_TYPES = {"BINARY": "<i2", "BINARY32": "<i4", "FLOAT32": "<f4"}
MISSING = {"BINARY": -(2**15), "BINARY32": -(2**31), "FLOAT32": float(np.finfo(np.float32).min)}
"""Missing-value codes: 8000 hex, 80000000 hex, and the most negative single-precision number."""


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

    def numbers(self) -> NDArray[np.int64]:
        """Return the sample numbers."""
        return self.rows["number"].astype(np.int64)

    def stamps(self) -> NDArray[np.int64]:
        """Return the stamps in ticks, `NO_STAMP` where missing."""
        stamps = self.rows["stamp"].astype(np.int64)
        stamps[stamps == MISSING_STAMP] = NO_STAMP
        return stamps

    def analog(self, first: int, stop: int, a: FloatArray, b: FloatArray, _: FloatArray) -> FloatArray:
        """Return ``a * count + b`` of rows `first` to `stop`, NaN where missing.

        Parameters
        ----------
        first, stop
            Range of rows.
        a, b
            Scale and offset, shape (channels,).

        Returns
        -------
        ndarray, shape (channels, stop - first)
        """
        out = np.empty((len(a), stop - first))
        block = max(1, BLOCK_BYTES // self.rows.dtype.itemsize)
        for start in range(first, stop, block):
            counts = self.rows["analog"][start : min(start + block, stop)].T
            view = out[:, start - first : start - first + counts.shape[1]]
            scale_block(counts, a, b, MISSING[self.file_type], view)
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


def scale_block(counts: NDArray[np.generic], a: FloatArray, b: FloatArray, missing: float, out: FloatArray) -> None:
    """Write ``a * counts + b`` into `out`, NaN where a count equals `missing`; all of shape (channels, rows)."""
    np.multiply(counts, a[:, None], out=out, dtype=np.float64, casting="unsafe")
    out += b[:, None]
    gone = counts == missing
    if gone.any():
        out[gone] = np.nan


def open_binary(path: Path, offset: int, length: int, file_type: str, n_analog: int, n_status: int) -> BinaryRows:
    """Map `length` bytes from `offset` of a file as binary rows."""
    layout = row_type(file_type, n_analog, n_status)
    count = length // layout.itemsize
    if count == 0:
        return BinaryRows(np.empty(0, layout), file_type, b"")
    rows = np.memmap(path, layout, mode="r", offset=offset, shape=(count,))
    with path.open("rb") as file:
        file.seek(offset + count * layout.itemsize)
        tail = file.read(min(length - count * layout.itemsize, 4096))
    return BinaryRows(rows, file_type, tail)
