"""Turn the network-analyser sweeps in ../shared/recordings/cable/ into what a step generator would have recorded.

The sweeps are of microstrip lines (scikit-rf examples, BSD-3): open and short 50 mm, through 100 mm and 200 mm, each
behind the same pair of coaxial launches. scikit-rf reads and extrapolates them; the step seen at the port is the
launched step plus its reflection.
"""

from dataclasses import dataclass
from pathlib import Path

import numpy as np
import pytest

FOLDER = Path(__file__).resolve().parents[1] / ".." / "shared" / "recordings" / "cable"
ZERO_PADDING = 4
LEAD_SAMPLES = 400
SAMPLES = 1200
REPEATABILITY_S = 3e-12
"""From one soldered launch to another, 0.5 mm of line (common practice, no source)."""
BAND_HZ = 2e9
KAISER_BETA = 8.0
"""Side lobes of the band edge below the converter step."""
CONVERTER_STEP = 2.5 / 4096
"""Of a twelve-bit sampling head: what would have been recorded has no finer detail."""


@dataclass(frozen=True)
class Calibration:
    """Speed on the microstrip and delay of one launch, each with a standard uncertainty."""

    speed: float
    u_speed: float
    launch_s: float
    u_launch_s: float


def network(name):
    skrf = pytest.importorskip("skrf")
    if not FOLDER.is_dir():
        pytest.skip(f"no real sweeps at {FOLDER.resolve()}")
    return skrf.Network(FOLDER / name)


def group_delay_s(net, low_hz, high_hz):
    """Slope of the unwrapped transmission phase over a band."""
    inside = (net.f >= low_hz) & (net.f <= high_hz)
    phase = np.unwrap(np.angle(net.s[inside, 1, 0]))
    return -np.polyfit(net.f[inside], phase, 1)[0] / (2 * np.pi)


def window(f):
    """The spectrum of the step's edge: a Kaiser window over the sweep, one at zero frequency."""
    return np.kaiser(2 * f.size - 1, KAISER_BETA)[f.size - 1 :]


def calibrate():
    """Through-200 less through-100 is 100 mm of line; through-100 less that is two launches.

    The line is dispersive: the delay grows by 7 % over the sweep, and which part of the spectrum the onset of a step
    goes by is not known. So the speed is the mean over bands of 2 GHz, weighted with the spectrum of the edge, and
    its standard uncertainty is the weighted standard deviation over them; likewise the delay of a launch.
    """
    short, long = network("thru-100mm.s2p"), network("thru-200mm.s2p")
    starts = np.arange(0.1e9, 8e9, 0.5e9)
    whole = np.array([group_delay_s(short, start, start + BAND_HZ) for start in starts])
    line = np.array([group_delay_s(long, start, start + BAND_HZ) for start in starts]) - whole
    weights = np.interp(starts + BAND_HZ / 2, short.f, window(short.f))
    speed, launch = 0.1 / line, (whole - line) / 2
    launch_s, u_launch_s = mean_and_deviation(launch, weights)
    return Calibration(*mean_and_deviation(speed, weights), launch_s, float(np.hypot(u_launch_s, REPEATABILITY_S)))


def mean_and_deviation(values, weights):
    mean = np.average(values, weights=weights)
    return float(mean), float(np.sqrt(np.average((values - mean) ** 2, weights=weights)))


def step_record(name):
    """Return (samples, rate_hz) of the step at the port: launched at sample LEAD_SAMPLES, then its echoes."""
    net = network(name).extrapolate_to_dc(kind="linear")
    n = 2 * ZERO_PADDING * (net.f.size - 1)
    impulse = np.fft.irfft((1 + net.s[:, 0, 0]) * window(net.f), n)
    step = np.cumsum(np.roll(impulse, LEAD_SAMPLES))
    return np.rint((step[:SAMPLES] - step[0]) / CONVERTER_STEP) * CONVERTER_STEP, float(n * (net.f[1] - net.f[0]))


def write_case(folder, name, calibration):
    """Write the record as CSV and a case file around it; return the case file's path."""
    samples, rate_hz = step_record(name)
    rows = "\n".join(f"{value:.9f}" for value in samples)
    (folder / "step.csv").write_text(f"# rate: {rate_hz!r} Hz\nvoltage [V]\n{rows}\n", encoding="utf-8")
    c = calibration
    text = f"""
title = "{name}"
kind = "line"

[[section]]
from = "port"
to = "line"
length = "{c.launch_s * c.speed * 1e3} mm ± {c.u_launch_s * c.speed * 1e3} mm"
speed = "{c.speed} m/s"

[[section]]
from = "line"
to = "board edge"
length = "70 mm ± 1 mm"
speed = "{c.speed} m/s ± {c.u_speed} m/s"

[[terminal]]
node = "port"
recording = "step.csv"
channels = {{ v = "voltage" }}
launches = "step"
"""
    path = folder / "case.toml"
    path.write_text(text, encoding="utf-8")
    return path
