"""The ASCII DAT form: rows of comma-delimited numbers (C37.111-2013 §8.4)."""

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from twlocate.arrays import FloatArray
from twlocate.errors import RecordError
from twlocate.records.comtrade.timeline import NO_STAMP
from twlocate.records.delimited import forgiving_numbers, line_blocks, regular_numbers
from twlocate.records.repairs import SURE, RepairLog

MISSING_ASCII = 99999.0
"""The missing-value code, where the channel's stated range leaves it out."""
MAX_INTEGER = 2.0**53


@dataclass(frozen=True)
class AsciiRows:
    """Rows of an ASCII DAT: number, stamp, analog counts, states; NaN where a field is blank."""

    blocks: tuple[NDArray[np.number], ...]
    """Blocks of rows, each of shape (rows, columns); whole numbers where the text has only such."""
    n_analog: int
    file_type: str = "ASCII"

    def __len__(self) -> int:
        """Return the number of rows."""
        return sum(len(block) for block in self.blocks)

    def numbers(self) -> NDArray[np.int64]:
        """Return the sample numbers, -1 where blank."""
        return self._integers(0, -1)

    def stamps(self) -> NDArray[np.int64]:
        """Return the stamps in ticks, `NO_STAMP` where blank."""
        return self._integers(1, NO_STAMP)

    def _integers(self, column: int, blank: int) -> NDArray[np.int64]:
        return np.concatenate([_as_integers(block[:, column], blank) for block in self.blocks])

    def analog(self, first: int, stop: int, a: FloatArray, b: FloatArray, high: FloatArray) -> FloatArray:
        """Return ``a * count + b`` of rows `first` to `stop`, NaN where missing.

        Parameters
        ----------
        first, stop
            Range of rows.
        a, b
            Scale and offset, shape (channels,).
        high
            Greatest count of each channel: the code 99999 means missing only above it.

        Returns
        -------
        ndarray, shape (channels, stop - first)
        """
        out = np.empty((self.n_analog, stop - first))
        for block, place in self._pieces(first, stop):
            counts = block[:, 2 : 2 + self.n_analog].T
            view = out[:, place]
            np.multiply(counts, a[:, None], out=view)
            view += b[:, None]
            gone = (counts == MISSING_ASCII) & ~(high >= MISSING_ASCII)[:, None]
            if gone.any():
                view[gone] = np.nan
        return out

    def status(self, first: int, stop: int, n_status: int) -> NDArray[np.uint8]:
        """Return the states of rows `first` to `stop`, shape (channels, stop - first)."""
        out = np.empty((n_status, stop - first), np.uint8)
        for block, place in self._pieces(first, stop):
            states = block[:, 2 + self.n_analog : 2 + self.n_analog + n_status].T
            np.equal(states, 1, out=out[:, place].view(np.bool_))
        return out

    def _pieces(self, first: int, stop: int) -> Iterator[tuple[NDArray[np.number], slice]]:
        """Yield the part of each block inside rows `first` to `stop`, and its place counted from `first`."""
        start = 0
        for block in self.blocks:
            piece = block[max(0, first - start) : max(0, stop - start)]
            place = max(0, start - first)
            if len(piece):
                yield piece, slice(place, place + len(piece))
            start += len(block)


def _as_integers(column: NDArray[np.number], blank: int) -> NDArray[np.int64]:
    if column.dtype.kind == "i":
        return column.astype(np.int64)
    whole = np.isfinite(column) & (np.abs(column) < MAX_INTEGER)
    return np.where(whole, np.rint(np.where(whole, column, 0.0)), float(blank)).astype(np.int64)


def parse_ascii(data: bytes, n_analog: int, n_status: int, log: RepairLog) -> AsciiRows:
    """Read the rows of an ASCII DAT.

    Raises
    ------
    RecordError
        No row has the number of fields that the channels need.
    """
    columns = 2 + n_analog + n_status
    body = data.rstrip(b"\x1a\r\n \t\0")
    if b"\x1a" in data[len(body) :]:
        log.add("Ctrl-Z at the end of the data", "DAT", "ignored", SURE)
    blocks = [_block(block, columns, log) for block in line_blocks(body)]
    kept = tuple(block for block in blocks if len(block))
    if not kept:
        raise RecordError(
            f"the DAT has no row of {columns} fields, as {n_analog} analog + {n_status} status channels need"
        )
    return AsciiRows(kept, n_analog)


def _block(data: bytes, columns: int, log: RepairLog) -> NDArray[np.number]:
    numbers = regular_numbers(data, columns)
    if numbers is not None and _counts_up(numbers[:, 0]):
        return numbers
    lines = [line for line in data.decode("latin-1").splitlines() if line.strip()]
    rows, short = forgiving_numbers(lines, columns)
    if short:
        log.add(f"{len(short)} rows with too few fields", "DAT", "left out", SURE)
    return rows


def _counts_up(numbers: NDArray[np.number]) -> bool:
    """Tell whether rows are numbered one after another, as they are when no field slipped from row to row."""
    return bool(np.all(np.diff(numbers) == 1))
