"""MAT files: version 5 by `mat5`, version 7.3, which is HDF5 inside, by h5py."""

from pathlib import Path

from twlocate.records.hdf5 import read_hdf5
from twlocate.records.mat5 import variables
from twlocate.records.named_arrays import NamedArrays, record_of_arrays, setting_of
from twlocate.records.record import Record
from twlocate.records.repairs import RepairLog
from twlocate.records.windows import cut

HDF5_MARK = b"MATLAB 7.3"
UNIT_ENDING = ".unit"


def read_matlab(path: Path, span: tuple[float, float] | None) -> Record:
    """Read the numeric variables of a MAT file, those in structures included.

    A variable ``fs`` or ``rate`` gives the sampling rate, ``t`` or ``time`` the times, ``start`` the start as text.

    Raises
    ------
    RecordError
        The file is damaged, or nothing gives its numbers a time.
    """
    with path.open("rb") as file:
        if file.read(len(HDF5_MARK)) == HDF5_MARK:
            return read_hdf5(path, span, "MAT 7.3")
    found = NamedArrays({})
    for name, value in variables(path.read_bytes()):
        setting = setting_of(name, value)
        if setting is not None:
            found.settings.setdefault(*setting)
        elif isinstance(value, str):
            found.units[name.removesuffix(UNIT_ENDING)] = value
        else:
            found.arrays[name] = value
    return cut(record_of_arrays(path, "MAT 5", found, RepairLog()), span)
