"""HDF5 files: every numeric dataset is a channel, its attributes give unit, rate and start."""

from pathlib import Path
from typing import Any

import numpy as np

from twlocate.errors import RecordError
from twlocate.records.extras import needed
from twlocate.records.named_arrays import NamedArrays, record_of_arrays, setting_of
from twlocate.records.record import Record
from twlocate.records.repairs import SURE, RepairLog
from twlocate.records.windows import cut

INTERNAL = "#"
"""Names that start so are MATLAB's own bookkeeping."""
UNIT_ATTRIBUTES = ("unit", "units")
MAX_COMPRESSION = 1100
"""A dataset may hold this many times the bytes it stores (deflate reaches 1032); beyond, it was never filled."""


def read_hdf5(path: Path, span: tuple[float, float] | None, format_name: str = "HDF5") -> Record:
    """Read the numeric datasets of an HDF5 file, those in groups included.

    Attributes ``rate`` or ``fs``, ``start`` and ``clock`` on the file, a group or a dataset are the settings,
    ``unit`` or ``units`` on a dataset its unit; a dataset ``t`` or ``time`` gives the times.

    Raises
    ------
    RecordError
        The file is damaged, or nothing gives its numbers a time.
    """
    h5py = needed("h5py")
    log = RepairLog()
    found = NamedArrays({})
    try:
        with h5py.File(path, "r") as file:
            _gather_settings(file, "", found)
            file.visititems(lambda name, item: _gather(name, item, found, log, h5py))
    except (RecordError, MemoryError):
        raise
    except Exception as error:  # the library raises a dozen unrelated types for a damaged file
        raise RecordError(f"not a readable HDF5 file ({' '.join(str(error).split())[:120]})") from None
    return cut(record_of_arrays(path, format_name, found, log), span)


def _gather(name: str, item: Any, found: NamedArrays, log: RepairLog, h5py: Any) -> None:
    """Add one group or dataset to what was found."""
    if name.startswith(INTERNAL):
        return
    _gather_settings(item, name, found)
    if not isinstance(item, h5py.Dataset) or item.dtype.kind not in "iufbSO":
        return
    if item.attrs.get("MATLAB_class") in (b"char", "char"):
        _add_setting(name, "".join(map(chr, np.ravel(item[()]).tolist())), found)
        return
    if item.size == 1:
        _add_setting(name, item[()], found)
        return
    if item.size * item.dtype.itemsize > MAX_COMPRESSION * max(item.id.get_storage_size(), 1):
        log.add(f"{item.size} values declared, none stored", f"dataset {name!r}", "left out", SURE)
        return
    if item.dtype.kind in "iufb":
        found.arrays[name] = item[()]


def _gather_settings(item: Any, name: str, found: NamedArrays) -> None:
    for key, value in item.attrs.items():
        if key.lower() in UNIT_ATTRIBUTES:
            found.units[name] = value.decode("utf-8", "replace") if isinstance(value, bytes) else str(value)
        else:
            _add_setting(key, value, found)


def _add_setting(name: str, value: object, found: NamedArrays) -> None:
    setting = setting_of(name, value)
    if setting is not None:
        found.settings.setdefault(*setting)
