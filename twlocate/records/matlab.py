"""MAT files: version 5 by scipy, version 7.3, which is HDF5 inside, by h5py."""

from collections.abc import Iterator
from pathlib import Path

import numpy as np

from twlocate.errors import RecordError
from twlocate.records.extras import needed
from twlocate.records.hdf5 import read_hdf5
from twlocate.records.named_arrays import NamedArrays, record_of_arrays, setting_of
from twlocate.records.record import Record
from twlocate.records.repairs import RepairLog
from twlocate.records.windows import cut

HDF5_MARK = b"MATLAB 7.3"
MAX_DEPTH = 8


def read_matlab(path: Path, span: tuple[float, float] | None) -> Record:
    """Read the numeric variables of a MAT file, those in structures included.

    A variable ``fs`` or ``rate`` gives the sampling rate, ``t`` or ``time`` the times, ``start`` the start as text.

    Raises
    ------
    RecordError
        The file is damaged, or nothing gives its numbers a time.
    """
    with path.open("rb") as file:
        head = file.read(len(HDF5_MARK))
    if head == HDF5_MARK:
        return read_hdf5(path, span, "MAT 7.3")
    try:
        variables = needed("scipy.io").loadmat(path, simplify_cells=True, verify_compressed_data_integrity=True)
    except (RecordError, OSError):
        raise
    except Exception as error:  # scipy raises a dozen unrelated types for a damaged file
        raise RecordError(f"not a readable MAT file ({one_line(error)})") from None
    log = RepairLog()
    found = NamedArrays({})
    for name, value in _leaves("", variables):
        setting = setting_of(name, value)
        if setting is not None:
            found.settings.setdefault(*setting)
        elif name.lower().endswith(".unit") and isinstance(value, str):
            found.units[name[: -len(".unit")]] = value
        elif isinstance(value, np.ndarray):
            found.arrays[name] = value
    return cut(record_of_arrays(path, "MAT 5", found, log), span)


def _leaves(prefix: str, value: object, depth: int = 0) -> Iterator[tuple[str, object]]:
    """Yield the variables of a structure under dotted names."""
    if not isinstance(value, dict):
        yield prefix, value
    elif depth < MAX_DEPTH:
        for name, inner in value.items():
            if not str(name).startswith("__"):
                yield from _leaves(f"{prefix}.{name}" if prefix else str(name), inner, depth + 1)


def one_line(error: BaseException) -> str:
    """Return what an error says, on one short line."""
    text = " ".join(str(error).split()) or type(error).__name__
    return text if len(text) <= 120 else text[:117] + "..."
