"""The ASCII DAT form: rows of comma-delimited numbers (IEEE C37.111-2013)."""

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from typing import BinaryIO

import numpy as np
from numpy.typing import NDArray

from twlocate.arrays import FloatArray
from twlocate.errors import RecordError
from twlocate.records.comtrade.scaling import Scaling, scale_block
from twlocate.records.comtrade.timeline import NO_STAMP
from twlocate.records.delimited import forgiving_numbers, regular_numbers
from twlocate.records.repairs import GUESS, SURE, RepairLog

BLOCK_BYTES = 1 << 18
"""Text is parsed in blocks of about this size, so that a block and its numbers stay in the processor's cache."""
BLOCK_ROWS = 1 << 15
MAX_INTEGER = 2.0**53
FILLING = b"\x1a\r\n \t\0"


@dataclass(frozen=True)
class AsciiRows:
    """Rows of an ASCII DAT, parsed and scaled."""

    numbers: NDArray[np.int64]
    """Sample numbers, shape (rows,), `NO_STAMP` where blank."""
    ticks: NDArray[np.int64]
    """Stamps, likewise."""
    readings: FloatArray
    """Shape (channels, rows)."""
    states: NDArray[np.uint8]
    """Shape (channels, rows)."""
    file_type: str = "ASCII"

    def __len__(self) -> int:
        """Return the number of rows."""
        return len(self.numbers)

    def stamp_blocks(self) -> Iterator[tuple[slice, NDArray[np.int64]]]:
        """Yield all stamps in ticks in blocks, `NO_STAMP` where blank."""
        places = (slice(start, start + BLOCK_ROWS) for start in range(0, len(self), BLOCK_ROWS))
        return ((place, self.ticks[place]) for place in places)

    def stamps_at(self, rows: Sequence[int]) -> list[int]:
        """Return the stamps of a few rows in ticks, `NO_STAMP` where blank."""
        return [int(self.ticks[row]) for row in rows]

    def sample_numbers(self) -> NDArray[np.int64]:
        """Return the sample numbers, `NO_STAMP` where blank."""
        return self.numbers

    def samples(self, first: int, stop: int, _: Scaling, __: int) -> tuple[FloatArray, NDArray[np.uint8]]:
        """Return readings and states of rows `first` to `stop`, each of shape (channels, stop - first)."""
        return self.readings[:, first:stop], self.states[:, first:stop]


def parse_ascii(file: BinaryIO, length: int, scaling: Scaling, n_status: int, log: RepairLog) -> AsciiRows:
    """Read and scale the rows in the next `length` bytes of `file`.

    Raises
    ------
    RecordError
        No row has the number of fields that the channels need.
    """
    n_analog = len(scaling.a)
    columns = 2 + n_analog + n_status
    most = length // columns + 1  # a row has a byte a field at least
    numbers, ticks = np.empty(most, np.int64), np.empty(most, np.int64)
    readings, states = np.empty((n_analog, most)), np.empty((n_status, most), np.uint8)
    count = 0
    for text in text_blocks(file, length):
        block = _block(text, columns, log)
        place = slice(count, count + len(block))
        numbers[place] = as_integers(block[:, 0])
        ticks[place] = as_integers(block[:, 1])
        scale_block(block[:, 2 : 2 + n_analog].T, scaling, readings[:, place])
        fields = block[:, 2 + n_analog :].T
        states[:, place] = fields == 1
        if np.any((fields != 0) & (fields != 1)):
            log.add("status fields that are neither 0 nor 1", "DAT", "taken as 0", GUESS)
        count += len(block)
    if count == 0:
        raise RecordError(f"the DAT has no row of {columns} fields, as {n_analog} analog and {n_status} status need")
    return AsciiRows(numbers[:count], ticks[:count], readings[:, :count], states[:, :count])


def text_blocks(file: BinaryIO, length: int) -> Iterator[bytes]:
    """Yield the next `length` bytes of `file` in blocks that end at a line end."""
    rest = b""
    while length > 0 and (block := file.read(min(BLOCK_BYTES, length))):
        length -= len(block)
        head, end, tail = (rest + block).rpartition(b"\n")
        if end:
            yield head
        rest = tail
    yield rest


def _block(text: bytes, columns: int, log: RepairLog) -> NDArray[np.number]:
    """Return the rows of one block, shape (rows, columns), NaN where a field is blank."""
    body = text.strip(FILLING)
    if b"\x1a" in text[-(len(text) - len(body)) :] and len(body) < len(text):
        log.add("Ctrl-Z at the end of the data", "DAT", "ignored", SURE)
    if not body:
        return np.empty((0, columns))
    numbers = regular_numbers(body, columns)
    if numbers is not None and bool(np.all(np.diff(numbers[:, 0]) == 1)):
        return numbers  # numbered one after another: no field slipped from row to row
    lines = [line for line in body.decode("latin-1").splitlines() if line.strip()]
    rows, short = forgiving_numbers(lines, columns)
    if short.any():
        log.add("rows with too few fields", "DAT", "left out", SURE)
    return rows[~short]


def as_integers(column: NDArray[np.number]) -> NDArray[np.int64]:
    """Return whole numbers, `NO_STAMP` where there is none."""
    if column.dtype.kind == "i":
        return column.astype(np.int64)
    whole = np.isfinite(column) & (np.abs(column) < MAX_INTEGER)
    return np.where(whole, np.rint(np.where(whole, column, 0.0)).astype(np.int64), NO_STAMP)
