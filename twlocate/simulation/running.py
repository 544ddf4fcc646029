"""From a scenario to what each terminal's recorder stores, and the truth behind it."""

from dataclasses import dataclass
from typing import Any

import numpy as np

from twlocate.arrays import ComplexArray, FloatArray
from twlocate.errors import CaseError
from twlocate.forms import IMPEDANCE_UNIT
from twlocate.quantity import Quantity, parse_quantity
from twlocate.simulation.events import fault_admittance, ramp, sinusoid, steady_state
from twlocate.simulation.laplace import LaplaceGrid, laplace_grid
from twlocate.simulation.media import constant_line
from twlocate.simulation.network import Network, Shunt, Span, solve, through_into
from twlocate.simulation.scenario import (
    BurstForm,
    FaultForm,
    RecorderForm,
    Scenario,
    SimulatedSection,
    SimulatedTerminal,
)

OVERSAMPLING = 2
"""The grid is this much finer than the recorder: its Gaussian then is the anti-alias filter, −3 dB at 0.14 of the
recorder's rate and −40 dB at half of it."""

EVENT_NODE = "\0event"
"""Cannot be a name in a file."""


@dataclass(frozen=True)
class Drawn:
    """What is drawn from the stated uncertainties: the true values."""

    lengths_m: FloatArray
    speeds: FloatArray
    late_s: FloatArray
    """One a terminal: delay of its transducer plus offset of its clock."""


@dataclass(frozen=True)
class Trace:
    """What one channel stores."""

    role: str
    samples: FloatArray


@dataclass(frozen=True)
class Simulated:
    """Traces of every terminal, in the scenario's order, and the truth."""

    traces: tuple[tuple[Trace, ...], ...]
    truth: dict[str, Any]


def simulate(scenario: Scenario, *, rng: np.random.Generator) -> Simulated:
    """Draw the true route and clocks, solve the event, and record it.

    Lengths, speeds, delays and clock offsets are drawn from normal distributions with the stated standard
    uncertainties, so that a case file that repeats the statement is honest.

    Raises
    ------
    CaseError
        What was drawn leaves no route, or puts the event before the record.
    """
    drawn = _draw(scenario, rng)
    grid = laplace_grid(scenario.recorder.duration.value, OVERSAMPLING * scenario.recorder.rate.value)
    network = _network(scenario, drawn)
    solver = _fault if isinstance(scenario.event, FaultForm) else _burst
    before, change, full = solver(scenario, network, grid)
    traces = tuple(
        _terminal(scenario, terminal, _Solved(grid, network, full, before, change), late, rng)
        for terminal, late in zip(scenario.terminal, drawn.late_s, strict=True)
    )
    return Simulated(traces, _truth(scenario, drawn))


def _draw(scenario: Scenario, rng: np.random.Generator) -> Drawn:
    def normal(quantities: list[Quantity]) -> FloatArray:
        return rng.normal([q.value for q in quantities], [q.u for q in quantities])

    lengths, speeds = (normal([getattr(s, name) for s in scenario.section]) for name in ("length", "speed"))
    late = normal([t.clock for t in scenario.terminal]) + normal([t.delay for t in scenario.terminal])
    _check_drawn(scenario, lengths, speeds, late)
    return Drawn(lengths, speeds, late)


def _check_drawn(scenario: Scenario, lengths: FloatArray, speeds: FloatArray, late: FloatArray) -> None:
    """Refuse draws that leave no route, or put the event off the record; wide uncertainties can."""
    event = scenario.event
    if min(lengths.min(), speeds.min(), lengths[scenario.event_section] - event.distance.value) <= 0:
        raise CaseError("the drawn lengths and speeds leave no route; the event is too near an end, or a ± too wide")
    if event.onset.value + late.min() <= 0:
        raise CaseError(f"a clock is {-late.min():g} s early, before the record starts; let the onset be later")


def _network(scenario: Scenario, drawn: Drawn) -> Network:
    """Return the route with the event's section cut in two at the event, without the event itself."""
    spans = []
    for index, section in enumerate(scenario.section):
        medium = constant_line(*_modes(section, float(drawn.speeds[index]), scenario), section.loss_rate.value)
        length, x = float(drawn.lengths_m[index]), scenario.event.distance.value
        if index == scenario.event_section:
            spans += [
                Span(section.from_node, EVENT_NODE, x, medium),
                Span(EVENT_NODE, section.to_node, length - x, medium),
            ]
        else:
            spans.append(Span(section.from_node, section.to_node, length, medium))
    impedances = {end.node: parse_quantity(end.impedance, IMPEDANCE_UNIT[scenario.kind]).value for end in scenario.end}
    held = frozenset(node for node, value in impedances.items() if value == 0)
    shunts = {node: _constant(np.eye(scenario.phases) / value) for node, value in impedances.items() if value}
    return Network(tuple(spans), shunts, held)


def _modes(section: SimulatedSection, speed: float, scenario: Scenario) -> tuple[FloatArray, FloatArray]:
    z = parse_quantity(section.impedance, IMPEDANCE_UNIT[scenario.kind]).value
    if section.ground_speed is None or section.ground_impedance is None or scenario.phases == 1:
        return np.array([speed]), np.array([z])
    return np.array([section.ground_speed.value, speed, speed]), np.array([section.ground_impedance.value, z, z])


def _constant(matrix: FloatArray) -> Shunt:
    return lambda s: np.broadcast_to(matrix.astype(np.complex128), (s.size, *matrix.shape))


Before = dict[str, ComplexArray]
"""Phasors of every node's across value, shape (n,)."""


def _fault(scenario: Scenario, network: Network, grid: LaplaceGrid) -> tuple[Before, Before, Network]:
    """Superpose: the line as it ran, and what a source of the opposite voltage at the fault adds to it."""
    event = scenario.event
    assert isinstance(event, FaultForm)
    omega, n = 2 * np.pi * event.frequency.value, scenario.phases
    turn = np.deg2rad(event.angle.value - 90) - omega * event.onset.value
    source = event.voltage.value * np.exp(1j * (turn - 2 * np.pi / 3 * np.arange(n)))
    s = np.array([1j * omega])
    before = steady_state(network, omega, {node: shunt(s)[0] @ source for node, shunt in network.shunts.items()})
    admittance = np.eye(1) / event.resistance.value if n == 1 else fault_admittance(event.type, event.resistance.value)
    full = Network(network.spans, {**network.shunts, EVENT_NODE: _constant(admittance)}, network.held)
    drawn = -(sinusoid(grid.s, before[EVENT_NODE], omega, event.onset.value) @ admittance)
    return before, solve(full, grid.s, {EVENT_NODE: drawn}), full


def _burst(scenario: Scenario, network: Network, grid: LaplaceGrid) -> tuple[Before, Before, Network]:
    event = scenario.event
    assert isinstance(event, BurstForm)
    drawn = -event.outflow.value * ramp(grid.s, event.opening.value, event.onset.value)[:, None]
    level = {node: np.array([event.pressure.value + 0j]) for node in network.nodes}
    return level, solve(network, grid.s, {EVENT_NODE: drawn}), network


@dataclass(frozen=True)
class _Solved:
    grid: LaplaceGrid
    network: Network
    full: Network
    before: Before
    change: Before


def _terminal(
    scenario: Scenario, terminal: SimulatedTerminal, solved: _Solved, late_s: float, rng: np.random.Generator
) -> tuple[Trace, ...]:
    """Record every role of a terminal: what was, what the event adds, late by its clock and transducer."""
    grid, node, event = solved.grid, terminal.node, scenario.event
    omega = 2 * np.pi * event.frequency.value if isinstance(event, FaultForm) else 0.0
    shift = np.exp(-grid.s * late_s)[:, None]
    turning = np.exp(1j * omega * (grid.time_s - late_s))[:, None]
    across = grid.to_time(shift * solved.change[node]) + (solved.before[node] * turning).real
    flow = through_into(solved.full, grid.s, solved.change, node)
    through = grid.to_time(shift * flow) + (_flow_before(solved, node, omega) * turning).real
    signals = {"across": across[::OVERSAMPLING], "through": through[::OVERSAMPLING]}
    return tuple(
        Trace(
            role,
            _stored(signals[_KINDS[role[0]]][:, _COLUMN.get(role[1:], 0)], _KINDS[role[0]], scenario.recorder, rng),
        )
        for role in terminal.channels
    )


_KINDS = {"v": "across", "p": "across", "i": "through", "q": "through"}
_COLUMN = {"a": 0, "b": 1, "c": 2}


def _flow_before(solved: _Solved, node: str, omega: float) -> ComplexArray:
    """Phasor of the through value before the event; a pipe's steady flow is taken as zero."""
    if omega == 0:
        return np.zeros(solved.network.conductors, dtype=np.complex128)
    s = np.array([1j * omega])
    phasors = {name: value[None, :] for name, value in solved.before.items()}
    flow: ComplexArray = through_into(solved.network, s, phasors, node)[0]
    return flow


def _stored(signal: FloatArray, kind: str, recorder: RecorderForm, rng: np.random.Generator) -> FloatArray:
    noise: float = getattr(recorder, f"{kind}_noise")
    step: float = getattr(recorder, f"{kind}_step")
    noisy = signal + rng.normal(0.0, noise, signal.size)
    return np.rint(noisy / step) * step if step else noisy


def _truth(scenario: Scenario, drawn: Drawn) -> dict[str, Any]:
    event = scenario.event
    return {
        "section": scenario.section[scenario.event_section].name,
        "distance_m": event.distance.value,
        "onset_s": event.onset.value,
        "lengths_m": drawn.lengths_m.tolist(),
        "speeds_m_per_s": drawn.speeds.tolist(),
        "late_s": {t.node: float(late) for t, late in zip(scenario.terminal, drawn.late_s, strict=True)},
    }
