"""MAT files of version 5, numbers and text only.

A reader of our own, for cause: scipy's ends the whole process with a bus error on a damaged file (5 of 600 mutated
ones did), and a recording cut short by a full disk is an everyday thing.

Source: MathWorks, MAT-File Format (R2024a), chapter "MAT-File Data Elements of Level 5".
"""

import struct
import zlib
from collections.abc import Iterator
from dataclasses import dataclass
from math import prod

import numpy as np
from numpy.typing import NDArray

from twlocate.errors import RecordError

HEADER_BYTES = 128
MI_MATRIX, MI_COMPRESSED = 14, 15
NUMBER_TYPES = {1: "i1", 2: "u1", 3: "i2", 4: "u2", 5: "i4", 6: "u4", 7: "f4", 9: "f8", 12: "i8", 13: "u8"}
TEXT_TYPES = {2: "utf-8", 4: "utf-16", 16: "utf-8", 17: "utf-16", 18: "utf-32"}
MX_STRUCT, MX_CHAR = 2, 4
MX_NUMBERS = range(6, 16)
COMPLEX_FLAG = 0x800
MAX_DEPTH = 8
MAX_DIMENSIONS = 32

Value = NDArray[np.generic] | str


@dataclass(frozen=True)
class Element:
    """One data element: its type code and content."""

    kind: int
    content: bytes


def variables(content: bytes) -> Iterator[tuple[str, Value]]:
    """Yield the numeric and text variables of a MAT file, those in structures under dotted names.

    Raises
    ------
    RecordError
        The file is not of version 5, or damaged.
    """
    order = {b"IM": "<", b"MI": ">"}.get(content[126:128])
    if order is None:
        raise RecordError("not a MAT file of version 5 or 7.3; save it as one of these")
    for element in _elements(content[HEADER_BYTES:], order):
        yield from _top(element, order)


def _top(element: Element, order: str) -> Iterator[tuple[str, Value]]:
    if element.kind == MI_COMPRESSED:
        try:
            unpacked = zlib.decompress(element.content)
        except zlib.error as error:
            raise RecordError(f"a compressed variable is damaged ({error})") from None
        for inner in _elements(unpacked, order):
            yield from _matrix(inner, order)
    else:
        yield from _matrix(element, order)


def _elements(content: bytes, order: str) -> Iterator[Element]:
    """Yield the elements that follow one another in `content`.

    Raises
    ------
    RecordError
        One claims more bytes than there are.
    """
    at = 0
    while at + 8 <= len(content):
        kind, size = struct.unpack_from(order + "II", content, at)
        if kind >> 16:  # the short form: size and type in one word, the content in the next
            kind, size = kind & 0xFFFF, kind >> 16
            yield Element(kind, content[at + 4 : at + 4 + min(size, 4)])
            at += 8
            continue
        at += 8
        if size > len(content) - at:
            raise RecordError(f"a data element of {size} bytes where {len(content) - at} are left: the file is cut")
        yield Element(kind, content[at : at + size])
        at += size if kind == MI_COMPRESSED else size + -size % 8


def _matrix(element: Element, order: str, depth: int = 0) -> Iterator[tuple[str, Value]]:
    """Yield what one array holds: itself, or the fields of a structure of one element."""
    if element.kind != MI_MATRIX or not element.content or depth > MAX_DEPTH:
        return
    parts = _elements(element.content, order)
    flags, shape_part, name_part = (next(parts, Element(0, b"")) for _ in range(3))
    if len(flags.content) < 4:
        raise RecordError("an array without its flags: the file is damaged")
    word = struct.unpack_from(order + "I", flags.content)[0]
    kind, name = word & 0xFF, name_part.content.decode("ascii", "replace").rstrip("\0")
    if kind == MX_STRUCT:
        yield from _fields(parts, order, name, depth)
        return
    data = next(parts, None)
    if data is None:
        return
    if kind == MX_CHAR:
        yield name, data.content.decode(_encoding(data.kind, order), "replace").rstrip("\0")
    elif kind in MX_NUMBERS and not word & COMPLEX_FLAG:
        yield name, _numbers(data, _shape(shape_part, order), order, name)


def _encoding(kind: int, order: str) -> str:
    name = TEXT_TYPES.get(kind, "utf-8")
    return name if name == "utf-8" else name + ("-le" if order == "<" else "-be")


def _shape(element: Element, order: str) -> tuple[int, ...]:
    count = min(len(element.content) // 4, MAX_DIMENSIONS)
    return tuple(max(0, size) for size in struct.unpack_from(f"{order}{count}i", element.content))


def _numbers(data: Element, shape: tuple[int, ...], order: str, name: str) -> NDArray[np.generic]:
    if data.kind not in NUMBER_TYPES:
        raise RecordError(f"variable {name[:40]!r} has the unknown data type {data.kind}: the file is damaged")
    dtype = np.dtype(order + NUMBER_TYPES[data.kind])
    numbers = np.frombuffer(data.content, dtype, len(data.content) // dtype.itemsize)
    if prod(shape) != numbers.size:
        raise RecordError(f"variable {name[:40]!r} holds {numbers.size} numbers, not the {prod(shape)} of its shape")
    return numbers.reshape(shape, order="F")


def _fields(parts: Iterator[Element], order: str, name: str, depth: int) -> Iterator[tuple[str, Value]]:
    """Yield the fields of a structure; of an array of structures the first element's."""
    length_part, names_part = (next(parts, Element(0, b"")) for _ in range(2))
    if len(length_part.content) < 4:
        raise RecordError(f"structure {name[:40]!r} has no field names: the file is damaged")
    length = struct.unpack_from(order + "i", length_part.content)[0]
    if length < 1:
        return
    starts = range(0, len(names_part.content) - length + 1, length)
    names = [names_part.content[i : i + length].split(b"\0")[0].decode("ascii", "replace") for i in starts]
    for field, element in zip(names, parts, strict=False):
        for inner, value in _matrix(element, order, depth + 1):  # arrays in a structure have no name of their own
            yield f"{name}.{field}{inner}", value
