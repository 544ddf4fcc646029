"""Where the parts of a COMTRADE record are: a CFG beside a DAT in any letter case, or both in one CFF."""

import re
from dataclasses import dataclass
from pathlib import Path

from twlocate.errors import RecordError
from twlocate.records.repairs import LIKELY, SURE, RepairLog

SECTION = re.compile(
    rb"^-{2,3}[ \t]*file[ \t]+type[ \t]*:?[ \t]*(CFG|INF|HDR|DAT)[ \t]*"
    rb"(ASCII|BINARY32|BINARY|FLOAT32)?[ \t]*:?[ \t]*(\d{1,18})?[ \t]*-{2,3}[ \t]*\r?\n",
    re.IGNORECASE | re.MULTILINE,
)
STANDARD_SECTION = re.compile(rb"^--- file type: ", re.IGNORECASE)
HEAD_BYTES = 1 << 20
LONGEST_HEADER = 200
COMPANIONS = (".hdr", ".inf")


@dataclass(frozen=True)
class Parts:
    """The CFG text as bytes, and where in which file the samples are."""

    cfg_path: Path
    cfg: bytes
    data_path: Path
    offset: int
    length: int
    file_type: str = ""
    """As a CFF's section header names it."""


def find_parts(path: Path, log: RepairLog) -> Parts:
    """Return the parts of the record of which `path` is one.

    Raises
    ------
    RecordError
        A part is missing, or the CFF has no sections.
    """
    if path.suffix.lower() == ".cff":
        return _cff_parts(path, log)
    cfg_path = _sibling(path, ".cfg")
    data_path = _sibling(path, ".dat")
    return Parts(cfg_path, cfg_path.read_bytes(), data_path, 0, data_path.stat().st_size)


def _sibling(path: Path, suffix: str) -> Path:
    """Return the file of the same name with `suffix` in any letter case."""
    if path.suffix.lower() == suffix:
        return path
    name = path.stem.lower() + suffix
    found = sorted(other for other in path.parent.iterdir() if other.name.lower() == name)
    exact = [other for other in found if other.stem == path.stem]
    if not found:
        raise RecordError(f"no {path.stem}{suffix} beside it: a record needs both its CFG and its DAT file")
    return (exact or found)[0]


def _cff_parts(path: Path, log: RepairLog) -> Parts:
    head = _head_to_data(path)
    sections = list(SECTION.finditer(head))
    starts = {match[1].upper(): match for match in reversed(sections)}
    if b"CFG" not in starts or b"DAT" not in starts or starts[b"DAT"].start() < starts[b"CFG"].start():
        raise RecordError("no CFG and then DAT section header such as '--- file type: CFG ---'")
    cfg, data = starts[b"CFG"], starts[b"DAT"]
    before_data = [match for match in sections if match.start() <= data.start()]
    if not all(STANDARD_SECTION.match(match[0]) for match in before_data):
        log.add("section headers not as the standard writes them", "CFF", "read as section headers", SURE)
    end = min(match.start() for match in sections if match.start() > cfg.start())
    length = path.stat().st_size - data.end()
    stated = int(data[3]) if data[3] else length
    if stated != length:
        log.add(f"DAT section of {length} bytes, {stated} stated", "CFF", "what is there is read", LIKELY)
    return Parts(path, head[cfg.end() : end], path, data.end(), min(length, stated), (data[2] or b"").decode().upper())


def _head_to_data(path: Path) -> bytes:
    """Return the file up to its DAT section header, or all of it where there is none."""
    head = bytearray()
    with path.open("rb") as file:
        while block := file.read(HEAD_BYTES):
            searched = max(0, len(head) - LONGEST_HEADER)
            head += block
            if any(match[1].upper() == b"DAT" for match in SECTION.finditer(head, searched)):
                break
    return bytes(head)
