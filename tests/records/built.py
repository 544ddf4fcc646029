"""Records built from known counts, for tests that want them back."""

from pathlib import Path

import numpy as np

from twlocate.records import Channel, Clock, Record, StatusChannel, Stretch

STEP = 0.1138916015625


def record_of(
    counts: np.ndarray, *, rate_hz: float = 1e6, start_ns: int = 1772424667250000001, n_status: int = 3
) -> Record:
    channels = tuple(
        Channel(f"U L{k}", "kV", STEP * row + 0.25, step=STEP, offset=0.25) for k, row in enumerate(counts, 1)
    )
    n = counts.shape[1]
    status = tuple(StatusChannel(f"trip {k}", ((np.arange(n) >> k) & 1).astype(np.uint8)) for k in range(n_status))
    return Record(
        Path("x"), "built", channels, (Stretch(0, n, 0.0, rate_hz),), station="North end", device="recorder 7",
        start_ns=start_ns, resolution_ns=1, trigger_s=3e-6, line_frequency_hz=50.0, status=status,
        clock=Clock(1e-7 / np.sqrt(3.0), True, (), 0),
    )  # fmt: skip
