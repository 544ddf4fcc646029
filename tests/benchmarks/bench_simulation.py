"""Speed of the simulator: a line and a pipe in process, and one line beside ngspice's in the same run.

``python -m pytest tests/benchmarks/bench_simulation.py`` (not part of the default tests).
"""

import shutil
import subprocess
import time

import numpy as np
import pytest

from twlocate.media.overhead import Conductor
from twlocate.simulation import (
    Network,
    Span,
    balanced_line,
    fault_admittance,
    laplace_grid,
    pipe,
    sinusoid,
    solve,
    steady_state,
    step,
    uniform_line,
)

OMEGA = 2 * np.pi * 50
TOWER = (
    *(Conductor(x, 24.0, 0.0143, 5.5e-5, sag_m=9.0) for x in (-7.5, 0.0, 7.5)),
    Conductor(0.0, 31.0, 0.0075, 2.5e-4, sag_m=7.0),
)
L_PER_M, C_PER_M, R_PER_M = 1.3e-6, 9e-12, 0.05e-3


def best_of(run, rounds):
    def once():
        start = time.perf_counter()
        run()
        return time.perf_counter() - start

    run()
    return min(once() for _ in range(rounds))


def conductance(ohm, n):
    return lambda s: np.broadcast_to(np.eye(n, dtype=complex) / ohm, (s.size, n, n))


def three_phase_fault():
    """150 km, fault at 60 km, 10 ms at 1 MHz."""
    grid = laplace_grid(10e-3, 1e6)
    line = balanced_line(TOWER, 100.0)
    spans = (Span("A", "F", 60e3, line), Span("F", "B", 90e3, line))
    ends = {"A": conductance(20.0, 3), "B": conductance(20.0, 3)}
    source = 180e3 / 20.0 * np.exp(-2j * np.pi / 3 * np.arange(3))
    before = steady_state(Network(spans, ends), OMEGA, {"A": source, "B": source})
    fault = fault_admittance("ag", 5.0)
    drawn = -(sinusoid(grid.s, before["F"], OMEGA, 1e-4) @ fault)
    faulted = Network(spans, {**ends, "F": lambda s: np.broadcast_to(fault.astype(complex), (s.size, 3, 3))})
    return [grid.to_time(volts) for volts in solve(faulted, grid.s, {"F": drawn}).values()]


def long_pipe():
    """10 km, 60 s at 100 Hz."""
    grid = laplace_grid(60.0, 100.0)
    network = Network((Span("R", "V", 10e3, pipe(1000.0, 1200.0, 0.6, resistance=0.05)),), held=frozenset({"R"}))
    return grid.to_time(solve(network, grid.s, {"V": 0.28 * step(grid.s, 0.5)[:, None]})["V"])


def single_line():
    """150 km, 10 ms at 1 MHz, one conductor."""
    grid = laplace_grid(10e-3, 1e6)
    line = uniform_line(R_PER_M, L_PER_M, C_PER_M)
    network = Network((Span("a", "b", 150e3, line),), {"a": conductance(100.0, 1), "b": conductance(700.0, 1)})
    return grid.to_time(solve(network, grid.s, {"a": step(grid.s)[:, None] / 100.0})["b"])


def test_line_and_pipe_in_process():
    line_s, pipe_s = best_of(three_phase_fault, 5), best_of(long_pipe, 5)
    print(f"\nthree-phase line {line_s * 1e3:.1f} ms, pipe {pipe_s * 1e3:.2f} ms")
    assert line_s < 0.060
    assert pipe_s < 0.020


@pytest.mark.skipif(shutil.which("ngspice") is None, reason="ngspice is not installed (apt install ngspice)")
def test_single_line_beside_ngspice(tmp_path):
    deck = tmp_path / "line.cir"
    deck.write_text(
        f"""* 150 km
v1 src 0 pwl(0 0 1u 1 1 1)
rs src a 100
o1 a 0 b 0 lossy
.model lossy ltra r={R_PER_M} l={L_PER_M} g=0 c={C_PER_M} len=150e3 rel=0.2
rb b 0 700
.tran 1u 10m 0 1u
.control
run
wrdata {tmp_path / "out.txt"} v(b)
quit
.endc
.end
""",
        encoding="utf-8",
    )

    def theirs():
        subprocess.run(["ngspice", "-b", str(deck)], check=True, capture_output=True, timeout=300)

    ours_s, theirs_s = best_of(single_line, 5), best_of(theirs, 1)
    print(f"\ntwlocate {ours_s * 1e3:.1f} ms, ngspice {theirs_s:.2f} s: {theirs_s / ours_s:.0f} times faster")
    assert theirs_s / ours_s >= 100
