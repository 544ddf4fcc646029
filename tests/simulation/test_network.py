"""Networks against lattice diagrams, water hammer and another program's line."""

import numpy as np
import pytest

from twlocate.simulation import Network, Span, laplace_grid, pipe, ramp, solve, step, through_into, uniform_line
from twlocate.simulation.media import constant_line
from twlocate.simulation.network import span_admittance
from twlocate.waves import split

RATE = 1e6


def lossless(impedance, speed=3e8):
    return uniform_line(0.0, impedance / speed, 1 / (impedance * speed))


def resistor(ohm):
    return lambda s: np.full((s.size, 1, 1), 1 / ohm, dtype=complex)


def test_lattice_of_gonen_example_7_6():
    # T. Gönen, Electric Power Transmission System Engineering, Ex 7.6 (FOSSEE companion): 1000 V dc, source 0 ohm,
    # line 40 ohm, end 60 ohm; T is the transit time. At 6.5 T the 1008 V
    # stand a quarter of the line from its receiving end
    transit = 200e-6
    grid = laplace_grid(16 * transit, RATE)
    half = [Span("S", "q", 0.75 * transit * 3e8, lossless(40)), Span("q", "R", 0.25 * transit * 3e8, lossless(40))]
    network = Network(tuple(half), {"R": resistor(60.0)}, frozenset({"S"}))
    across = solve(network, grid.s, {}, {"S": 1000 * step(grid.s)[:, None]})
    end, quarter = (grid.to_time(across[name])[:, 0] for name in ("R", "q"))
    for turn, volts in [(0, 0.0), (2, 1200.0), (4, 960.0), (6, 1008.0), (8, 998.4), (10, 1000.32), (12, 999.936)]:
        assert end[int((turn + 0.02) * transit * RATE) + 20] == pytest.approx(volts, abs=0.2)
    assert quarter[int(6.5 * transit * RATE)] == pytest.approx(1008.0, abs=0.2)


def test_capacitor_at_the_end_of_wadhwa_example_12_4():
    # C. L. Wadhwa, Electrical Power Systems, Ex 12.4: 500 kV for 2 µs on 350 ohm into 3000 pF: 851.14 kV
    grid = laplace_grid(20e-6, 500e6)
    network = Network(
        (Span("A", "B", 3000.0, lossless(350)),),
        {"A": resistor(350.0), "B": lambda s: (3000e-12 * s)[:, None, None]},
    )
    pulse = step(grid.s) - step(grid.s, 2e-6)
    across = solve(network, grid.s, {"A": 2 * 500 / 350 * pulse[:, None]})
    assert grid.to_time(across["B"]).max() == pytest.approx(851.14, rel=2e-3)


def test_attenuation_of_wadhwa_example_12_6():
    # C. L. Wadhwa, Electrical Power Systems, Ex 12.6: 50 kV over 50 km of 6 ohm/km and 400 ohm: 50·exp(−R·x/2Z) =
    # 34.364 kV (recomputed; the book's companion prints a slip)
    grid = laplace_grid(400e-6, 10e6)
    line = constant_line(np.array([3e8]), np.array([400.0]), loss_rate=6e-3 / (400 / 3e8))
    network = Network((Span("A", "B", 50e3, line), Span("B", "C", 50e3, line)), held=frozenset({"A"}))
    volts = grid.to_time(solve(network, grid.s, {}, {"A": 50 * step(grid.s)[:, None]})["B"])[:, 0]
    assert volts[round(50e3 / 3e8 * 10e6) + 9] == pytest.approx(34.364, rel=3e-3)


def valve_closing(speed=1200.0, length=6000.0, **friction):
    """A reservoir, a pipe, a valve that stops 1 m/s at 0.5 s."""
    rate = 200.0
    grid = laplace_grid(60.0, rate)
    medium = pipe(1000.0, speed, 0.6, **friction)
    network = Network((Span("reservoir", "valve", length, medium),), held=frozenset({"reservoir"}))
    stopped = np.pi * 0.3**2 * step(grid.s, 0.5)[:, None]
    return grid, grid.to_time(solve(network, grid.s, {"valve": stopped})["valve"])[:, 0]


def test_square_wave_of_joukowsky():
    # N. Joukowsky, 1898: ± ρ·a·Δv, turning over each 2L/a = 10 s, for ever without friction
    grid, pressure = valve_closing()
    rise, t = 1000.0 * 1200.0 * 1.0, grid.time_s - 0.5
    expected = np.where(t < 0, 0.0, rise * (-1.0) ** np.floor(t / 10.0))
    near_a_front = np.abs((t + 5) % 10 - 5) < 0.05
    assert np.abs(pressure - expected)[~near_a_front].max() / rise < 1e-3


def test_friction_makes_the_wave_die():
    _, ideal = valve_closing()
    _, rubbed = valve_closing(viscosity=1e-3)
    later = slice(10_000, None)
    assert np.abs(rubbed[later]).max() < 0.9 * np.abs(ideal[later]).max()
    with pytest.raises(ValueError, match="not both"):
        pipe(1000.0, 1200.0, 0.6, resistance=0.1, viscosity=1e-6)


def test_two_port_of_a_lossy_line_beside_scikit_rf():
    # scikit-rf's line of the same γ and Z: admittance parameters to 1e-9
    rf = pytest.importorskip("skrf", reason="scikit-rf is not installed")
    f = np.linspace(1e3, 1e6, 200)
    s = 2j * np.pi * f
    r, l_per_m, c_per_m, g, length = 0.2e-3, 1.3e-6, 8.9e-12, 1e-9, 12e3
    frequency = rf.Frequency.from_f(f, unit="hz")
    z0, gamma = np.sqrt((r + s * l_per_m) / (g + s * c_per_m)), np.sqrt((r + s * l_per_m) * (g + s * c_per_m))
    media = rf.media.DefinedGammaZ0(frequency, gamma=gamma, z0=z0)
    own, mutual = span_admittance(Span("A", "B", length, uniform_line(r, l_per_m, c_per_m, g)), s)
    theirs = media.line(length, "m", z0=z0).y
    scale = np.abs(theirs[:, 0, 0])
    assert (np.abs(own[:, 0, 0] - theirs[:, 0, 0]) / scale).max() < 1e-9
    assert (np.abs(mutual[:, 0, 0] - theirs[:, 0, 1]) / scale).max() < 1e-9


def mesh():
    """A ring with a spur, lossy, on loads."""
    line = uniform_line(0.1e-3, 1.3e-6, 9e-12)
    spans = [("A", "B", 8e3), ("B", "C", 5e3), ("C", "A", 11e3), ("C", "D", 7e3)]
    return Network(
        tuple(Span(a, b, length, line) for a, b, length in spans), {"A": resistor(300.0), "D": resistor(90.0)}
    )


def test_through_values_balance_at_every_node():
    grid = laplace_grid(1e-3, RATE)
    network, injected = mesh(), step(grid.s, 1e-5)[:, None]
    across = solve(network, grid.s, {"B": injected})
    flows = {name: through_into(network, grid.s, across, name) for name in network.nodes}
    assert np.abs(flows["B"] - injected).max() < 1e-9 * np.abs(injected).max()
    assert np.abs(flows["C"]).max() < 1e-9 * np.abs(injected).max()
    assert np.allclose(flows["D"], -across["D"] / 90.0, rtol=1e-9)


def test_transfer_is_reciprocal():
    grid = laplace_grid(1e-3, RATE)
    network, injected = mesh(), step(grid.s)[:, None]
    there = solve(network, grid.s, {"B": injected})["D"]
    back = solve(network, grid.s, {"D": injected})["B"]
    assert np.abs(there - back).max() < 1e-9 * np.abs(there).max()


def test_blocks_of_frequencies_make_no_difference(monkeypatch):
    grid = laplace_grid(1e-3, RATE)
    injected = {"B": step(grid.s)[:, None]}
    whole = solve(mesh(), grid.s, injected)
    monkeypatch.setattr("twlocate.simulation.network.BLOCK", 100)
    in_blocks = solve(mesh(), grid.s, injected)
    assert all(np.array_equal(whole[name], in_blocks[name]) for name in "ABCD")


def test_nothing_arrives_before_light_could():
    grid = laplace_grid(2e-3, RATE)
    across = solve(mesh(), grid.s, {"B": step(grid.s, 1e-4)[:, None]})
    speed = 1 / np.sqrt(1.3e-6 * 9e-12)
    for node, way in (("A", 8e3), ("C", 5e3), ("D", 12e3)):
        signal = grid.to_time(across[node])[:, 0]
        before = grid.time_s < 1e-4 + way / speed - 8 / RATE
        assert np.abs(signal[before]).max() < 1e-4 * np.abs(signal).max()
        assert np.abs(signal[~before][:20]).max() > 0.01 * np.abs(signal).max()


def test_split_at_a_terminal_gives_the_waves_back():
    grid = laplace_grid(1e-3, RATE)
    network = Network((Span("A", "B", 30e3, lossless(400)),), {"A": resistor(100.0), "B": resistor(50.0)})
    across = solve(network, grid.s, {"A": ramp(grid.s, 2e-5, 1e-5)[:, None]})
    u = grid.to_time(across["A"])[:, 0]
    i = grid.to_time(through_into(network, grid.s, across, "A"))[:, 0]
    outgoing, incoming = split(u, i, 400.0)
    rho, turn = (50 - 400) / (50 + 400), 200
    assert np.allclose(incoming[turn:], rho * outgoing[:-turn], atol=1e-4 * outgoing.max())


def test_loss_free_network_keeps_the_energy():
    # what the source puts in, less what the end takes, is zero once all is over: two ways of adding up
    grid = laplace_grid(6e-3, RATE, 1e-6)
    network = Network((Span("A", "B", 30e3, lossless(400)),), {"B": resistor(300.0)})
    pulse = (step(grid.s, 1e-4) - 2 * step(grid.s, 1.5e-4) + step(grid.s, 2e-4))[:, None]
    across = solve(network, grid.s, {"A": pulse})
    u, i = (grid.to_time(x)[:, 0] for x in (across["A"], pulse))
    taken = grid.to_time(across["B"])[:, 0] ** 2 / 300.0
    assert np.sum(taken) == pytest.approx(np.sum(u * i), rel=1e-3)


def test_impossible_networks_are_refused():
    s = np.array([1.0 + 1j])
    span = Span("A", "B", 1e3, lossless(400))
    with pytest.raises(ValueError, match="C: not a node of any span; nodes are A, B"):
        solve(Network((span,), held=frozenset({"C"})), s, {})
    with pytest.raises(ValueError, match="A: an across value is imposed on a node that is not held"):
        solve(Network((span,), {"B": resistor(1.0)}), s, {}, {"A": np.ones((1, 1))})
