"""The same networks through ngspice's lossless and lossy lines (T and LTRA elements)."""

import shutil
import subprocess

import numpy as np
import pytest

from twlocate.simulation import Network, Span, laplace_grid, ramp, solve, uniform_line

pytestmark = pytest.mark.skipif(
    shutil.which("ngspice") is None, reason="ngspice is not installed (apt install ngspice)"
)

RATE = 2e6
DURATION = 1.5e-3
L_PER_M, C_PER_M = 1.3e-6, 9e-12
RISE = 20e-6
R_SOURCE, R_END, C_END, L_END = 100.0, 700.0, 20e-9, 30e-3


def ngspice(tmp_path, line, end):
    """Return times and the end's voltage for a ramp of 1 V behind R_SOURCE."""
    deck = tmp_path / "line.cir"
    deck.write_text(
        f"""* line and its end
v1 src 0 pwl(0 0 {RISE} 1 1 1)
rs src a {R_SOURCE}
{line}
{end}
.tran 0.5u {DURATION} 0 0.25u
.control
set numdgt=10
run
wrdata {tmp_path / "out.txt"} v(b)
quit
.endc
.end
""",
        encoding="utf-8",
    )
    subprocess.run(["ngspice", "-b", str(deck)], check=True, capture_output=True, timeout=120)
    return np.loadtxt(tmp_path / "out.txt").T


ENDS = {
    "resistance": (f"rb b 0 {R_END}", lambda s: 1 / R_END + 0 * s),
    "capacitance": (f"rb b 0 {R_END}\ncb b 0 {C_END}", lambda s: 1 / R_END + s * C_END),
    "inductance": (f"rb b 0 {R_END}\nlb b 0 {L_END}", lambda s: 1 / R_END + 1 / (s * L_END)),
}


@pytest.mark.parametrize("end", ENDS)
@pytest.mark.parametrize(("r_per_m", "length"), [(0.0, 60e3), (0.2e-3, 60e3)], ids=["T", "LTRA"])
def test_line_with_an_end(tmp_path, end, r_per_m, length):
    z0, delay = np.sqrt(L_PER_M / C_PER_M), length * np.sqrt(L_PER_M * C_PER_M)
    lines = {
        True: f"t1 a 0 b 0 z0={z0} td={delay}",
        False: f"o1 a 0 b 0 lossy\n.model lossy ltra r={r_per_m} l={L_PER_M} g=0 c={C_PER_M} len={length} rel=0.2",
    }
    text, admittance = ENDS[end]
    t, theirs = ngspice(tmp_path, lines[r_per_m == 0], text)
    grid = laplace_grid(DURATION, RATE)
    network = Network(
        (Span("a", "b", length, uniform_line(r_per_m, L_PER_M, C_PER_M)),),
        {
            "a": lambda s: np.full((s.size, 1, 1), 1 / R_SOURCE, dtype=complex),
            "b": lambda s: admittance(s)[:, None, None],
        },
    )
    ours = grid.to_time(solve(network, grid.s, {"a": ramp(grid.s, RISE)[:, None] / R_SOURCE})["b"])[:, 0]
    theirs = np.interp(grid.time_s, t, theirs)
    since = (grid.time_s - delay) % (2 * delay)  # a corner of the ramp arrives each 2T, the other one RISE later
    away = np.minimum(np.abs(since - RISE), np.minimum(since, 2 * delay - since)) * RATE > 8
    assert np.sqrt(np.mean((ours - theirs)[away] ** 2)) / np.sqrt(np.mean(theirs**2)) < 2e-3
    front = slice(0, round((delay + RISE) * RATE))
    level = theirs[front].max() / 2
    arrivals = [np.interp(level, volts[front], grid.time_s[front]) for volts in (ours, theirs)]
    assert abs(arrivals[0] - arrivals[1]) * RATE < 0.2
