"""The one door to recordings of every format."""

import math
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

from twlocate.errors import RecordError
from twlocate.records.audio import read_audio
from twlocate.records.comtrade.reading import read_comtrade
from twlocate.records.hdf5 import read_hdf5
from twlocate.records.matlab import read_matlab
from twlocate.records.record import Record
from twlocate.records.table import read_table
from twlocate.records.tdms import read_tdms

Span = tuple[float, float]
Reader = Callable[[Path, Span | None], Record]

READERS: dict[str, Reader] = {
    ".cfg": read_comtrade,
    ".dat": read_comtrade,
    ".cff": read_comtrade,
    ".hdr": read_comtrade,
    ".inf": read_comtrade,
    ".wav": read_audio,
    ".bwf": read_audio,
    ".flac": read_audio,
    ".mat": read_matlab,
    ".h5": read_hdf5,
    ".hdf5": read_hdf5,
    ".tdms": read_tdms,
    ".csv": read_table,
    ".txt": read_table,
    ".tsv": read_table,
}
"""Reader by file name ending; a new format is one function here."""


def read(path: str | Path, span: Span | None = None) -> Record:
    """Read a recording of any known format.

    Parameters
    ----------
    path
        The file; for a COMTRADE pair either of the two.
    span
        Only samples from ``span[0]`` to ``span[1]`` seconds from the record's start; None for all.

    Returns
    -------
    Record
        Its time axis always counts from the start of the whole recording, with `span` or without.

    Raises
    ------
    RecordError
        The file is missing, of no known format, or cannot be read even with repairs; one line that names it.
    """
    path = Path(path)
    reader = READERS.get(path.suffix.lower())
    if span is not None and not (math.isfinite(span[0]) and math.isfinite(span[1]) and span[0] < span[1]):
        raise RecordError(f"{path}: span {span[0]:g} to {span[1]:g} s is empty; it must run forward")
    if not path.is_file():
        raise RecordError(f"{path}: there is no such file")
    if reader is None:
        known = " ".join(sorted(READERS))
        raise RecordError(f"{path}: {path.suffix or 'a name without ending'} is no known format; known are {known}")
    try:
        record = reader(path, span)
    except RecordError as error:
        raise RecordError(f"{path}: {error}") from None
    except MemoryError:
        raise RecordError(f"{path}: too large for this machine's memory; read a span of it") from None
    except OSError as error:
        raise RecordError(f"{path}: cannot be read ({error.strerror or error})") from None
    return record if record.files else replace(record, files=(path,))
