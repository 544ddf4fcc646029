"""The array types and the one gatekeeper that numeric functions use at their public door."""

import numpy as np
from numpy.typing import ArrayLike, NDArray

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]


def as_signal(values: ArrayLike, name: str) -> FloatArray:
    """Return `values` as a contiguous one-dimensional float64 array of finite numbers.

    Raises
    ------
    ValueError
        Not one-dimensional, empty, or not finite; the message names the signal by `name`.
    """
    signal = np.ascontiguousarray(values, dtype=np.float64)
    if signal.ndim != 1 or signal.size == 0:
        raise ValueError(f"{name} has shape {signal.shape}; one row of samples is needed")
    if not np.isfinite(signal).all():
        bad = int(np.count_nonzero(~np.isfinite(signal)))
        raise ValueError(
            f"{name} has {bad} missing or infinite samples of {signal.size}; cut to a stretch without them"
        )
    return signal
