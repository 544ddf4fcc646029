"""Faults on three phases, with the steady state before them."""

import numpy as np
import pytest

from twlocate.media.overhead import Conductor
from twlocate.simulation import (
    Network,
    Span,
    balanced_line,
    fault_admittance,
    laplace_grid,
    sinusoid,
    solve,
    steady_state,
)
from twlocate.simulation.events import FAULTS
from twlocate.waves import aerial_mode, ground_mode

RATE = 1e6
OMEGA = 2 * np.pi * 50
TOWER = (
    *(Conductor(x, 24.0, 0.0143, 5.5e-5, sag_m=9.0) for x in (-7.5, 0.0, 7.5)),
    Conductor(0.0, 31.0, 0.0075, 2.5e-4, sag_m=7.0),
)
SOURCE = 20.0
"""Ohm, either end's."""
PHASORS = 180e3 * np.exp(-2j * np.pi / 3 * np.arange(3))


def shunt(matrix):
    return lambda s: np.broadcast_to(matrix.astype(complex), (s.size, 3, 3))


def faulted(kind, resistance, onset_s=1e-4, conductors=TOWER):
    """Return grid and phase voltages at A, F and B: steady state and what the fault adds."""
    grid = laplace_grid(3e-3, RATE)
    line = balanced_line(conductors, 100.0)
    ends = {"A": shunt(np.eye(3) / SOURCE), "B": shunt(np.eye(3) / SOURCE)}
    spans = (Span("A", "F", 60e3, line), Span("F", "B", 90e3, line))
    before = steady_state(Network(spans, ends), OMEGA, {"A": PHASORS / SOURCE, "B": PHASORS / SOURCE})
    fault = fault_admittance(kind, resistance)
    drawn = -(sinusoid(grid.s, before["F"], OMEGA, onset_s) @ fault)
    change = solve(Network(spans, {**ends, "F": shunt(fault)}), grid.s, {"F": drawn})
    turning = np.exp(1j * OMEGA * grid.time_s)[:, None]
    return grid, {name: (before[name] * turning).real + grid.to_time(change[name]) for name in before}


def test_a_solid_fault_holds_its_phase_at_zero_and_is_continuous_before():
    grid, volts = faulted("bg", 0.01)
    before = grid.time_s < 0.9e-4
    assert np.abs(volts["F"][~before][30:, 1]).max() < 0.002 * 180e3
    expected = np.abs(volts["F"][before]).max()
    assert expected == pytest.approx(180e3, rel=0.02)


@pytest.mark.parametrize("kind", FAULTS)
def test_what_the_fault_bridges_is_brought_together(kind):
    grid, volts = faulted(kind, 0.01)
    after = volts["F"][grid.time_s > 2e-4]
    for phase, other in FAULTS[kind]:
        level = 0.0 if other is None else after[:, other]
        assert np.abs(after[:, phase] - level).max() < 0.002 * 180e3


def test_waves_arrive_when_the_line_says():
    grid, volts = faulted("ag", 5.0)
    wave = aerial_mode(np.diff(volts["A"], axis=0).T, "alpha (a)")
    front = grid.time_s[np.argmax(np.abs(wave))] + 0.5 / RATE
    assert front == pytest.approx(1e-4 + 60e3 / (0.995 * 299_792_458.0), abs=2e-6)


def test_ground_mode_comes_later_and_blunter():
    _, volts = faulted("ag", 5.0)
    late, early = (np.abs(np.diff(x)) for x in (ground_mode(volts["A"].T), aerial_mode(volts["A"].T, "alpha (a)")))
    window = slice(250, 500)
    assert np.argmax(late[window]) > np.argmax(early[window])
    assert late[window].max() / late[window].sum() < early[window].max() / early[window].sum()


def test_fault_between_phases_sends_no_ground_wave():
    _, volts = faulted("bc", 1.0)
    assert np.abs(ground_mode(volts["A"].T)).max() < 1e-3 * 180e3


def test_twice_the_voltage_gives_twice_the_waves():
    admittance = fault_admittance("cag", 3.0)
    assert np.allclose(admittance, admittance.T)
    grid = laplace_grid(1e-4, RATE)
    one, two = (sinusoid(grid.s, scale * PHASORS, OMEGA) @ admittance for scale in (1.0, 2.0))
    assert np.allclose(two, 2 * one)


def test_faults_that_cannot_be_are_refused():
    with pytest.raises(ValueError, match="'abz' is unknown; choose one of ag, bg"):
        fault_admittance("abz", 1.0)
    with pytest.raises(ValueError, match="resistance 0 ohm is not positive"):
        fault_admittance("ag", 0.0)
    with pytest.raises(ValueError, match="a three-phase line has at least 3"):
        balanced_line(TOWER[:2], 100.0)
