"""Bytes to text, whatever the code page of the machine that wrote them."""

import codecs

from twlocate.records.repairs import GUESS, LIKELY, RepairLog

CODE_PAGES = ("cp1251", "cp866", "gb18030", "cp1252", "cp850", "shift_jis", "euc_kr", "big5")
"""The legacy code pages of relays and analysts' machines; fewer candidates make short texts easier to tell."""

UNREADABLE = "\ufffd"
DETECTION_BYTES = 8192
"""Enough text to tell a code page by; detection costs by the byte."""

BYTE_ORDER_MARKS = {
    codecs.BOM_UTF8: "utf-8-sig",
    codecs.BOM_UTF16_LE: "utf-16",
    codecs.BOM_UTF16_BE: "utf-16",
}


def decode(data: bytes, where: str, log: RepairLog) -> str:
    """Return `data` as text; an encoding other than UTF-8 is written to `log`.

    Parameters
    ----------
    data
        A whole text file, or the text part of one.
    where
        What to call the place in a repair.
    log
        Gets one entry where the encoding had to be inferred.
    """
    for mark, encoding in BYTE_ORDER_MARKS.items():
        if data.startswith(mark):
            return data.decode(encoding, errors="replace")
    try:
        return data.decode("utf-8")
    except UnicodeDecodeError:
        pass
    damaged = data.decode("utf-8", errors="replace")
    if 0 < damaged.count(UNREADABLE) <= sum(not letter.isascii() for letter in damaged) // 2:
        log.add("bytes that are not UTF-8 in a text that else is", where, "shown as unreadable", LIKELY)
        return damaged
    encoding, confidence = detected_code_page(data)
    log.add("text is not UTF-8", where, f"read as {encoding}", confidence)
    return data.decode(encoding, errors="replace")


def detected_code_page(data: bytes) -> tuple[str, str]:
    """Return the likeliest code page of `data` and how sure that is."""
    from charset_normalizer import from_bytes

    telling = b"\n".join(line for line in data.splitlines() if not line.isascii())[:DETECTION_BYTES]
    best = from_bytes(telling, cp_isolation=list(CODE_PAGES)).best()
    return (best.encoding, LIKELY) if best is not None else ("cp1252", GUESS)
