"""Make the three demo events in this folder: recordings, case files and truth, from a seed.

Each event is the exact d'Alembert solution of a lossy route: every wave is delayed by its way over the
speed, scaled by the reflections it met, and smeared by the loss of that way. Speeds, lengths, delays and
clock offsets are drawn with the uncertainties that the case file states. The scenario (places, names,
figures) is invented. ``python recordings/make_events.py`` writes the files again.

A route with skin effect has γ = s/v + κ√s, so a step that has run a distance d arrives as erfc(κd / 2√t)
behind its delay d/v (R. L. Wigington and N. S. Nahman, Transient Analysis of Coaxial Cables Considering Skin
Effect, Proc. IRE 45, 1957, from memory).
"""

import json
from collections.abc import Callable, Iterator, Mapping
from dataclasses import dataclass
from pathlib import Path

import numpy as np
from scipy import signal, special

from twlocate.records import Channel, Clock, Record, Stretch, write_comtrade
from twlocate.waves import CLARKE

HERE = Path(__file__).parent
SEED = 20260302


@dataclass(frozen=True)
class Event:
    """An event that can be written to a folder: its case file, its recordings and what truly happened."""

    case: str
    truth: dict[str, object]
    write_recordings: Callable[[Path], None]

    def write(self, folder: Path) -> Path:
        """Write everything and return the case file's path."""
        folder.mkdir(parents=True, exist_ok=True)
        self.write_recordings(folder)
        (folder / "case.toml").write_text(self.case, encoding="utf-8")
        (folder / "truth.json").write_text(
            json.dumps(self.truth, indent=2, ensure_ascii=False) + "\n", encoding="utf-8"
        )
        return folder / "case.toml"


# ---------------------------------------------------------------- the lattice


@dataclass(frozen=True)
class Span:
    """A uniform piece of route between two scattering points; one entry a mode."""

    delay_up_s: np.ndarray
    """Towards higher node numbers."""
    delay_down_s: np.ndarray
    loss: np.ndarray
    """κd, √s."""


@dataclass(frozen=True)
class Scatterer:
    """What a node does to waves that reach it from below (lower node numbers) or above; matrices over modes."""

    reflect_below: np.ndarray
    reflect_above: np.ndarray
    transmit_up: np.ndarray
    transmit_down: np.ndarray


@dataclass(frozen=True)
class Packet:
    """A wave that reaches a node: when, how smeared, how high, in which mode."""

    delay_s: float
    loss: float
    amplitude: float
    mode: int


def lattice(
    spans: list[Span], nodes: list[Scatterer], source: int, launched: np.ndarray, *, horizon_s: float, floor: float
) -> list[list[Packet]]:
    """Follow the waves launched both ways at node `source` until `horizon_s`; return what reaches each node."""
    reached: list[list[Packet]] = [[] for _ in nodes]
    waves = [(source, up, Packet(0.0, 0.0, a, m)) for up in (True, False) for m, a in enumerate(launched) if a]
    while waves:
        node, up, wave = waves.pop()
        if not 0 <= node + (1 if up else -1) < len(nodes):
            continue
        span, target = (spans[node], node + 1) if up else (spans[node - 1], node - 1)
        delay = (span.delay_up_s if up else span.delay_down_s)[wave.mode]
        there = Packet(wave.delay_s + delay, wave.loss + span.loss[wave.mode], wave.amplitude, wave.mode)
        if there.delay_s > horizon_s:
            continue
        reached[target].append(there)
        s = nodes[target]
        for onward, matrix in (
            (up, s.transmit_up if up else s.transmit_down),
            (not up, s.reflect_below if up else s.reflect_above),
        ):
            for mode, amplitude in enumerate(matrix[:, wave.mode] * wave.amplitude):
                if abs(amplitude) > floor:
                    waves.append((target, onward, Packet(there.delay_s, there.loss, amplitude, mode)))
    return reached


def end_node(reflection: float, modes: int = 1) -> Scatterer:
    """Return a terminal that reflects every mode alike."""
    r, none = reflection * np.eye(modes), np.zeros((modes, modes))
    return Scatterer(r, r, none, none)


def joint(z_below: float, z_above: float) -> Scatterer:
    """Return the joint of two impedances, for the across variable."""
    r = (z_above - z_below) / (z_above + z_below)
    return Scatterer(np.array([[r]]), np.array([[-r]]), np.array([[1 + r]]), np.array([[1 - r]]))


def smeared_step(t: np.ndarray, loss: float) -> np.ndarray:
    """Return a unit step after a way with the loss κd = `loss`."""
    out = np.zeros_like(t)
    after = t > 0
    out[after] = special.erfc(loss / (2 * np.sqrt(t[after])))
    return out


# ---------------------------------------------------------------- (a) an overhead line

LINE_CASE = """\
title = "Hollin Fell – Marsh End 220 kV, single-phase-to-ground fault (invented)"
kind = "line"

[[section]]
from = "Hollin Fell"
to = "Marsh End"
length = "118.42 km ± 60 m"
speed = "294.6 m/µs ± 0.5 m/µs"
impedance = "385 ohm"

[[terminal]]
node = "Hollin Fell"
recording = "hollin-fell.cfg"
channels = { va = "U L1", vb = "U L2", vc = "U L3", ia = "I L1", ib = "I L2", ic = "I L3" }
clock = "± 0.1 µs"
delay = "0.9 µs ± 0.05 µs"

[[terminal]]
node = "Marsh End"
recording = "marsh-end.cfg"
channels = { va = "U L1", vb = "U L2", vc = "U L3", ia = "I L1", ib = "I L2", ic = "I L3" }
clock = "± 0.1 µs"
delay = "0.6 µs ± 0.05 µs"

[places]
file = "towers.csv"
"""

LINE_RATE_HZ = 1_250_000
LINE_SAMPLES = 25_000
LINE_START_NS = 1_772_425_867_250_000_000
LINE_Z = np.array([640.0, 385.0, 385.0])
"""Ohm, ground and two aerial modes."""
OVERSAMPLING = 4


def line_event(rng: np.random.Generator) -> Event:
    """Draw a fault from phase b to ground somewhere on the line."""
    length = rng.normal(118_420.0, 60.0)
    speed = np.array([rng.normal(2.71e8, 2e6), *2 * [rng.normal(2.946e8, 0.5e6)]])
    x = float(rng.uniform(0.04, 0.96) * length)
    resistance, angle = rng.uniform(2.0, 40.0), np.deg2rad(rng.uniform(30.0, 150.0))
    clocks = rng.normal(0.0, 0.1e-6, 2)
    delays = rng.normal([0.9e-6, 0.6e-6], 0.05e-6)
    onset_s = 7.3e-3 + rng.uniform(0, 1e-3)
    reached = line_waves(length, speed, x, resistance, 180e3 * np.sin(angle))

    def write(folder: Path) -> None:
        for node, name, stem, reflection, clock, delay in (
            (0, "Hollin Fell", "hollin-fell", -0.5, clocks[0], delays[0]),
            (2, "Marsh End", "marsh-end", -0.25, clocks[1], delays[1]),
        ):
            record = Record(
                path=folder / f"{stem}.cfg",
                format="",
                channels=line_channels(reached[node], reflection, onset_s + clock + delay, angle, rng),
                stretches=(Stretch(0, LINE_SAMPLES, 0.0, LINE_RATE_HZ),),
                station=name,
                device="wave recorder",
                start_ns=LINE_START_NS,
                resolution_ns=1,
                trigger_s=8e-3,
                line_frequency_hz=50.0,
                clock=Clock(u_s=0.1e-6 / 3**0.5, utc_offset_s=0),
            )
            write_comtrade(record, record.path, "BINARY32")
        write_towers(folder / "towers.csv")

    truth = {
        "section": "Hollin Fell–Marsh End",
        "distance_m": x,
        "share_of_stated_length": x / length,
        "length_m": length,
        "speed_m_per_s": speed[1],
        "fault_resistance_ohm": resistance,
        "clock_offsets_s": clocks.tolist(),
        "delays_s": delays.tolist(),
    }
    return Event(LINE_CASE, truth, write)


def line_waves(length: float, speed: np.ndarray, x: float, resistance: float, voltage: float) -> list[list[Packet]]:
    """Launch the waves of a fault from phase b and follow them; voltages in Clarke components."""
    kappa = np.array([4e-9, 0.25e-9, 0.25e-9])  # √s/m: a few dB over the line at 500 kHz in the aerial modes
    spans = [Span(d / speed, d / speed, kappa * d) for d in (x, length - x)]
    of_phase_b = CLARKE[:, 1]
    to_phase_b = np.linalg.inv(CLARKE)[1]
    drawn = 1 / (resistance + to_phase_b @ (LINE_Z / 2 * of_phase_b))
    sent = -LINE_Z / 2 * of_phase_b * drawn  # waves that one volt across the fault sends both ways
    reflect = np.outer(sent, to_phase_b)
    fault = Scatterer(reflect, reflect, np.eye(3) + reflect, np.eye(3) + reflect)
    nodes = [end_node(-0.5, 3), fault, end_node(-0.25, 3)]
    return lattice(spans, nodes, 1, sent * voltage, horizon_s=6e-3, floor=150.0)


def line_channels(
    packets: list[Packet], reflection: float, onset_s: float, angle: float, rng: np.random.Generator
) -> tuple[Channel, ...]:
    """Return what a recorder with a fourth-order anti-alias filter stores: three voltages, three currents."""
    warm_up = 500
    t = (np.arange((LINE_SAMPLES + warm_up) * OVERSAMPLING) / OVERSAMPLING - warm_up) / LINE_RATE_HZ
    omega = 2 * np.pi * 50
    incoming = np.zeros((3, t.size))
    for packet in packets:
        since = t - onset_s - packet.delay_s
        incoming[packet.mode] += (
            packet.amplitude * smeared_step(since, packet.loss) * np.sin(omega * since + angle) / np.sin(angle)
        )
    voltage = np.linalg.inv(CLARKE) @ ((1 + reflection) * incoming)
    current = np.linalg.inv(CLARKE) @ ((reflection - 1) * incoming / LINE_Z[:, None])
    turn = 2 * np.pi / 3 * (np.arange(3) - 1)[:, None]
    steady = omega * (t - onset_s) + angle - turn
    voltage += 180e3 * np.sin(steady)
    current += 610 * np.sin(steady - 0.4)
    low_pass = signal.bessel(4, 380e3, fs=LINE_RATE_HZ * OVERSAMPLING, output="sos", norm="mag")
    channels = []
    for names, unit, rows, noise, step in (
        (("U L1", "U L2", "U L3"), "V", voltage, 40.0, 12.2),
        (("I L1", "I L2", "I L3"), "A", current, 0.6, 0.3),
    ):
        filtered = signal.sosfilt(low_pass, rows)[:, warm_up * OVERSAMPLING :: OVERSAMPLING]
        for name, row in zip(names, filtered, strict=True):
            readings = np.rint((row + rng.normal(0, noise, row.size)) / step)
            channels.append(Channel(name, unit, readings * step, step=step, side="primary"))
    return tuple(channels)


def write_towers(path: Path) -> None:
    """Write structures about every 340 m along an invented course."""
    rng = np.random.default_rng(SEED)
    chainages = np.cumsum(rng.uniform(290, 390, 348))
    lat, lon = 54.2, -2.4
    rows = ["name,section,chainage,lat,lon"]
    for number, chainage in enumerate(chainages[chainages < 118_420.0], 1):
        lat_here, lon_here = lat + chainage / 111.2e3 * 0.6, lon + chainage / 65.0e3 * 0.8
        rows.append(f"T{number:03d},Hollin Fell–Marsh End,{chainage:.0f} m,{lat_here:.6f},{lon_here:.6f}")
    path.write_text("\n".join(rows) + "\n", encoding="utf-8")


# ---------------------------------------------------------------- (b) a water main

MAIN_CASE = """\
title = "Kestrel Brow pumping main, burst (invented)"
kind = "pipe"

[[section]]
from = "Pump house"
to = "Quarry joint"
length = "4.115 km ± 6 m"
speed = "1148 m/s ± 9 m/s"
flow_speed = "1.35 m/s ± 0.05 m/s"

[[section]]
from = "Quarry joint"
to = "Ridge chamber"
length = "1.240 km ± 3 m"
speed = "612 m/s ± 8 m/s"
flow_speed = "1.35 m/s ± 0.05 m/s"

[[terminal]]
node = "Pump house"
recording = "pump-house.csv"
channels = { p = "pressure" }
clock = "± 2 ms"

[[terminal]]
node = "Ridge chamber"
recording = "ridge-chamber.csv"
channels = { p = "pressure" }
clock = "± 2 ms"
"""

MAIN_RATE_HZ = 250
MAIN_SAMPLES = 15_000


def main_event(rng: np.random.Generator) -> Event:
    """Draw a burst somewhere on a main of two materials."""
    lengths = rng.normal([4115.0, 1240.0], [6.0, 3.0])
    speeds = rng.normal([1148.0, 612.0], [9.0, 8.0])
    flows = rng.normal(1.35, 0.05, 2)
    clocks = rng.normal(0.0, 2e-3, 2)
    along = float(rng.uniform(0.04, 0.96) * lengths.sum())
    section = int(along > lengths[0])
    x = along - section * lengths[0]
    onset_s, opening_s, drop_kpa = rng.uniform(20.0, 22.0), rng.uniform(0.04, 0.12), rng.uniform(25.0, 60.0)
    reached = main_waves(lengths, speeds, flows, section, x)

    def write(folder: Path) -> None:
        for node, stem, reflection, level, clock in (
            (0, "pump-house", 0.3, 812.0, clocks[0]),
            (3, "ridge-chamber", 0.5, 405.0, clocks[1]),
        ):
            t = np.arange(MAIN_SAMPLES) / MAIN_RATE_HZ
            pressure = level + main_noise(rng)
            for packet in reached[node]:
                since = t - onset_s - clock - packet.delay_s
                height = drop_kpa * (1 + reflection) * packet.amplitude * np.exp(-np.maximum(since, 0) / 25.0)
                pressure -= height * np.clip(since / opening_s, 0.0, 1.0)
            write_pressures(folder / f"{stem}.csv", np.round(pressure / 0.05) * 0.05)

    truth = {
        "section": ("Pump house–Quarry joint", "Quarry joint–Ridge chamber")[section],
        "distance_m": x,
        "lengths_m": lengths.tolist(),
        "speeds_m_per_s": speeds.tolist(),
        "flow_speeds_m_per_s": flows.tolist(),
        "opening_s": opening_s,
        "clock_offsets_s": clocks.tolist(),
    }
    return Event(MAIN_CASE, truth, write)


def main_waves(
    lengths: np.ndarray, speeds: np.ndarray, flows: np.ndarray, section: int, x: float
) -> list[list[Packet]]:
    """Follow the waves of a burst of unit height in `section` at `x`; friction takes 3 % a kilometre."""
    through = Scatterer(*(np.array([[value]]) for value in (0.0, 0.0, 1.0, 1.0)))
    change = joint(*speeds)  # the bore is the same, so the impedances go as the speeds
    pieces = [(0, lengths[0]), (1, lengths[1])]
    pieces[section : section + 1] = [(section, x), (section, lengths[section] - x)]
    spans = [
        Span(np.array([d / (speeds[k] + flows[k])]), np.array([d / (speeds[k] - flows[k])]), np.zeros(1))
        for k, d in pieces
    ]
    inner = [through, change] if section == 0 else [change, through]
    nodes = [end_node(0.3), *inner, end_node(0.5)]
    source = 1 if section == 0 else 2
    return lattice(spans, nodes, source, np.ones(1), horizon_s=40.0, floor=0.005)


def main_noise(rng: np.random.Generator) -> np.ndarray:
    """Return demand noise falling off with frequency, a pump tone and sensor noise, kPa."""
    white = np.fft.rfft(rng.normal(0.0, 1.0, MAIN_SAMPLES))
    f = np.fft.rfftfreq(MAIN_SAMPLES, 1 / MAIN_RATE_HZ)
    coloured = np.fft.irfft(white / np.sqrt(1 + (f / 0.05) ** 2), MAIN_SAMPLES) * 8.0
    t = np.arange(MAIN_SAMPLES) / MAIN_RATE_HZ
    tone = 0.5 * np.sin(2 * np.pi * 24.3 * t + rng.uniform(0, 2 * np.pi))
    return coloured + tone + rng.normal(0.0, 0.25, MAIN_SAMPLES)


def write_pressures(path: Path, pressure: np.ndarray) -> None:
    """Write one column of pressures behind a header that states rate and start."""
    head = ["# rate: 250 Hz", "# start: 2026-03-02T04:11:07.250000000Z", "pressure [kPa]"]
    path.write_text("\n".join([*head, *(f"{value:.2f}" for value in pressure)]) + "\n", encoding="utf-8")


# ---------------------------------------------------------------- (c) a cable pulse echo

CABLE_CASE = """\
title = "Tannery Lane feeder, pulse echo from the substation end (invented)"
kind = "line"

[[section]]
from = "Substation"
to = "Joint bay"
length = "412 m ± 1.5 m"
speed = "171.5 m/µs ± 0.8 m/µs"

[[section]]
from = "Joint bay"
to = "Mill"
length = "1.386 km ± 3 m"
speed = "166.0 m/µs ± 0.8 m/µs"

[[terminal]]
node = "Substation"
recording = "pulse-echo.csv"
channels = { v = "voltage" }
launches = "pulse"
"""

CABLE_RATE_HZ = 200e6
CABLE_SAMPLES = 6_000


def cable_event(rng: np.random.Generator) -> Event:
    """Draw a low-resistance fault somewhere on a cable with one joint between two makes."""
    lengths = rng.normal([412.0, 1386.0], [1.5, 3.0])
    speeds = rng.normal([171.5e6, 166.0e6], 0.8e6)
    section = int(rng.uniform() > 0.25)
    x = float(rng.uniform(0.08, 0.92) * lengths[section])
    resistance = rng.uniform(5.0, 60.0)
    launched_s = 2e-6 + rng.uniform(0, 5e-9)
    packets = cable_waves(lengths, speeds, section, x, resistance)

    def write(folder: Path) -> None:
        volts = cable_trace(packets, launched_s) + rng.normal(0.0, 0.02, CABLE_SAMPLES)
        step = 40 / 4096
        write_volts(folder / "pulse-echo.csv", np.rint(volts / step) * step)

    truth = {
        "section": ("Substation–Joint bay", "Joint bay–Mill")[section],
        "distance_m": x,
        "lengths_m": lengths.tolist(),
        "speeds_m_per_s": speeds.tolist(),
        "fault_resistance_ohm": resistance,
    }
    return Event(CABLE_CASE, truth, write)


def cable_waves(lengths: np.ndarray, speeds: np.ndarray, section: int, x: float, resistance: float) -> list[Packet]:
    """Follow a unit pulse from the substation; return what comes back to it, the launch included."""
    z = np.array([38.0, 34.0])
    rho = -z[section] / (z[section] + 2 * resistance)
    fault = Scatterer(*(np.array([[value]]) for value in (rho, rho, 1 + rho, 1 + rho)))
    pieces = [(0, lengths[0]), (1, lengths[1])]
    pieces[section : section + 1] = [(section, x), (section, lengths[section] - x)]
    spans = [Span(*2 * [np.array([d / speeds[k]])], np.array([1.6e-8 * d])) for k, d in pieces]
    change = joint(*z)
    inner = [fault, change] if section == 0 else [change, fault]
    nodes = [end_node(0.0), *inner, end_node(1.0)]  # the set is matched to the cable; the far end is open
    reached = lattice(spans, nodes, 0, np.ones(1), horizon_s=28e-6, floor=2e-3)
    return [Packet(0.0, 0.0, 1.0, 0), *reached[0]]


def cable_trace(packets: list[Packet], launched_s: float) -> np.ndarray:
    """Return the pulse (12 V, 90 ns, rounded edges) and its echoes, each smeared by the loss of its way."""
    n = 8 * CABLE_SAMPLES
    f = np.fft.rfftfreq(n, 1 / CABLE_RATE_HZ)
    s = 2j * np.pi * f
    width, edge = 90e-9, 12e-9
    pulse = 12.0 * width * np.sinc(f * width) * np.exp(-s * (width / 2 + 2 * edge)) * np.exp(-((np.pi * f * edge) ** 2))
    returned = sum(p.amplitude * np.exp(-s * (launched_s + p.delay_s) - p.loss * np.sqrt(s)) for p in packets)
    return np.fft.irfft(pulse * returned * CABLE_RATE_HZ, n)[:CABLE_SAMPLES]


def write_volts(path: Path, volts: np.ndarray) -> None:
    """Write one column of voltages behind a header that states the rate; there is no absolute time."""
    head = ["# rate: 200 MHz", "voltage [V]"]
    path.write_text("\n".join([*head, *(f"{value:.6g}" for value in volts)]) + "\n", encoding="utf-8")


EVENTS: Mapping[str, Callable[[np.random.Generator], Event]] = {
    "line-fault": line_event,
    "main-burst": main_event,
    "cable-echo": cable_event,
}


def seeded(name: str, count: int = 1) -> Iterator[Event]:
    """Draw `count` events of a kind; the first is the one in this folder."""
    for child in np.random.SeedSequence([SEED, list(EVENTS).index(name)]).spawn(count):
        yield EVENTS[name](np.random.default_rng(child))


if __name__ == "__main__":
    for kind in EVENTS:
        print(next(seeded(kind)).write(HERE / kind))
