"""From converter counts to readings."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from twlocate.arrays import FloatArray
from twlocate.records.comtrade.configuration import AnalogLine

MISSING: dict[str, float] = {
    "ASCII": 99999, "BINARY": -(2**15), "BINARY32": -(2**31), "FLOAT32": float(np.finfo(np.float32).min),
}  # fmt: skip
"""Missing-value codes: 99999, 8000 hex, 80000000 hex, and the most negative single-precision number."""
MISSING_1991 = -1.0
"""FFFF hex, the binary code of the first edition."""


@dataclass(frozen=True)
class Scaling:
    """How analog channels are read: ``a * count + b``, NaN where ``count == missing``; all of shape (channels, 1)."""

    a: FloatArray
    b: FloatArray
    missing: FloatArray
    """NaN where the channel has no missing-value code."""


def scaling_of(lines: Sequence[AnalogLine], file_type: str, edition: int) -> Scaling:
    """Return the scaling of the channels.

    The ASCII code 99999 means missing only in a channel whose stated greatest count is less; the code FFFF hex of
    binary files of 1991 is also the count -1, and means missing only in a channel whose stated least count is more.
    """
    missing = np.full(len(lines), MISSING[file_type], dtype=np.float64)
    if file_type == "ASCII":
        missing[[line.high >= MISSING["ASCII"] for line in lines]] = np.nan
    elif edition == 1991:
        missing[[line.low > MISSING_1991 for line in lines]] = MISSING_1991
    a, b = np.array([line.a for line in lines]), np.array([line.b for line in lines])
    return Scaling(a[:, None], b[:, None], missing[:, None])


def scale_block(counts: NDArray[np.generic], scaling: Scaling, out: FloatArray) -> None:
    """Write the readings of `counts` into `out`, both of shape (channels, rows); infinite ones count as missing."""
    with np.errstate(over="ignore", invalid="ignore"):
        np.multiply(counts, scaling.a, out=out, dtype=np.float64, casting="unsafe")
        out += scaling.b
    gone = counts == scaling.missing
    if counts.dtype.kind == "f":
        gone |= ~np.isfinite(out)
    if gone.any():
        out[gone] = np.nan
