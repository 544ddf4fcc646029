"""The estimator's behaviour: bands that hold, alternatives, joints, refusals."""

import numpy as np
import pytest

from twlocate.errors import NoPosition
from twlocate.position import Reading, Station, estimate
from twlocate.position.band import SectionDensity, band_length, highest_density
from twlocate.quantity import Quantity
from twlocate.routes import Route, Section

V = 2.94e8
CLOCK = Quantity(0.0, 0.1e-6)
ENDS = [Station("A", CLOCK), Station("B", CLOCK)]


def line(**changes):
    values = {"length": Quantity(100e3, 50.0), "speed": Quantity(V, 5e5)} | changes
    return Route((Section("A", "B", values["length"], values["speed"]),))


def inside(found, section, x):
    return any(p.section == section and p.from_m <= x <= p.to_m for p in found.band)


def binomial_margin(share, n):
    return 3 * np.sqrt(share * (1 - share) / n)


@pytest.mark.parametrize("coverage", [0.68, 0.95])
def test_band_holds_the_truth_as_often_as_it_says(coverage):
    """Truth drawn from the stated priors; margin three binomial standard deviations of 600 draws."""
    rng = np.random.default_rng(11)
    n, held = 600, 0
    for _ in range(n):
        length, speed = rng.normal(100e3, 50.0), rng.normal(V, 5e5)
        x = rng.uniform(5e3, 95e3)
        t_a = x / speed + rng.normal(0, 0.3e-6) + rng.normal(0, 0.1e-6)
        t_b = (length - x) / speed + rng.normal(0, 0.3e-6) + rng.normal(0, 0.1e-6)
        stations = ENDS
        found = estimate(line(), stations, [Reading(0, t_a, 0.3e-6), Reading(1, t_b, 0.3e-6)], coverage=coverage)
        held += inside(found, 0, x)
    assert abs(held / n - coverage) < binomial_margin(coverage, n)


def echoed(rng, x, length, speed, station, times):
    """Return the readings of one end: first front, the event's echo, the far end's, and a wave of something else."""
    start, own = times
    near, far = (x, length - x) if station == 0 else (length - x, x)
    fronts = [(near / speed, 1), (3 * near / speed, 1), ((near + 2 * far) / speed, -1)]
    fronts.append((near / speed + rng.uniform(20e-6, 600e-6), rng.choice([-1, 1])))
    return [
        Reading(station, start + own + time + rng.normal(0, 0.2e-6), 0.2e-6, 1e-3, int(sign))
        for time, sign in sorted(fronts)
    ]


@pytest.mark.parametrize("ends", ["clocks", "free clocks", "one end"])
def test_band_with_echoes_holds_the_truth(ends):
    """Truth drawn from the priors; at least 95 % less three binomial standard deviations of 100 draws."""
    rng = np.random.default_rng(17)
    n, held, narrow, refused = 100, 0, 0, 0
    clock = CLOCK if ends == "clocks" else None
    stations = [Station("A", clock, reflects=-1), Station("B", clock, reflects=-1)]
    for _ in range(n):
        length, speed = rng.normal(100e3, 50.0), rng.normal(V, 5e5)
        x = rng.uniform(5e3, 95e3)
        readings = echoed(rng, x, length, speed, 0, (0.0, rng.normal(0, 0.1e-6)))
        if ends != "one end":
            readings += echoed(rng, x, length, speed, 1, (0.0 if clock else 0.3, rng.normal(0, 0.1e-6)))
        try:
            found = estimate(line(), stations if ends != "one end" else stations[:1], readings)
        except NoPosition:
            refused += 1
            continue
        held += inside(found, 0, x)
        narrow += band_length(found.band) < 1000
    located = n - refused
    assert refused <= (0.1 * n if ends == "one end" else 0)
    assert held / located > 0.95 - binomial_margin(0.95, located)
    assert narrow > 0.9 * located


def test_a_doubtful_first_pick_gives_an_alternative_with_its_probability():
    x = 40e3
    times = [x / V, (100e3 - x) / V]
    readings = [
        Reading(0, times[0] - 50e-6, 0.3e-6, outlier=0.4),
        Reading(0, times[0], 0.3e-6),
        Reading(1, times[1], 0.3e-6),
    ]
    found = estimate(line(), ENDS, readings)
    assert len(found.alternatives) == 2
    assert inside(found, 0, x)
    assert not found.in_one_run
    shares = {round(row.point.distance_m, -3): row.probability for row in found.alternatives}
    # 0.4 for a stray before the first front, against 0.6 for a front with some other wave behind it, itself 0.5
    assert shares[40e3] == pytest.approx(0.4 / 0.7, abs=0.02)
    assert shares[33e3] == pytest.approx(0.3 / 0.7, abs=0.02)


def test_an_event_at_a_joint_gives_one_band_over_two_sections():
    route = Route(
        (Section("A", "J", Quantity(60e3), Quantity(V, 3e5)), Section("J", "B", Quantity(40e3), Quantity(V, 3e5)))
    )
    readings = [Reading(0, 60e3 / V, 0.3e-6), Reading(1, 40e3 / V, 0.3e-6)]
    found = estimate(route, ENDS, readings)
    assert {piece.section for piece in found.band} == {0, 1}
    assert found.in_one_run


def test_splitting_a_section_changes_nothing():
    """The same line as one section or as two with the same, exactly known, speed."""
    whole = Route((Section("A", "B", Quantity(100e3), Quantity(V)),))
    halves = Route((Section("A", "J", Quantity(60e3), Quantity(V)), Section("J", "B", Quantity(40e3), Quantity(V))))
    readings = [Reading(0, 30e3 / V, 0.3e-6), Reading(1, 70e3 / V, 0.3e-6)]
    stations = ENDS
    one, two = estimate(whole, stations, readings), estimate(halves, stations, readings)
    assert two.point.distance_m == pytest.approx(one.point.distance_m, abs=1.0)
    assert band_length(two.band) == pytest.approx(band_length(one.band), rel=0.01)


def test_more_uncertainty_in_any_input_widens_the_band():
    readings = [Reading(0, 30e3 / V, 0.3e-6), Reading(1, 70e3 / V, 0.3e-6)]

    def width(route, clock):
        return band_length(estimate(route, [Station("A", clock), Station("B", clock)], readings).band)

    base = width(line(), CLOCK)
    assert width(line(length=Quantity(100e3, 200.0)), CLOCK) > base
    assert width(line(speed=Quantity(V, 2e6)), CLOCK) > base
    assert width(line(), Quantity(0.0, 1e-6)) > base


def test_density_adds_up_to_one_and_band_to_the_coverage():
    readings = [Reading(0, 30e3 / V, 0.3e-6), Reading(1, 70e3 / V, 0.3e-6)]
    found = estimate(line(), ENDS, readings)
    assert sum(section.mass for section in found.densities) == pytest.approx(1.0, abs=1e-9)
    piece = found.band[0]
    assert found.densities[0].between(piece.from_m, piece.to_m) == pytest.approx(0.95, abs=2e-3)


def test_highest_density_of_a_normal_density():
    """±1.959964 standard deviations hold 95 % (standard normal table)."""
    x = np.linspace(-8, 8, 2001)
    density = SectionDensity(x, np.exp(-(x**2) / 2) / np.sqrt(2 * np.pi))
    (piece,) = highest_density([density], 0.95)
    assert (piece.from_m, piece.to_m) == (pytest.approx(-1.959964, abs=1e-3), pytest.approx(1.959964, abs=1e-3))


def test_highest_density_of_two_peaks_is_in_two_pieces():
    x = np.linspace(0, 100, 4001)
    density = SectionDensity(x, np.exp(-((x - 20) ** 2) / 2) + np.exp(-((x - 70) ** 2) / 2))
    pieces = highest_density([density], 0.9)
    assert [round((p.from_m + p.to_m) / 2) for p in pieces] == [20, 70]


@pytest.mark.parametrize(
    ("stations", "readings", "words"),
    [
        (ENDS, [Reading(0, 0.0, 1e-7)], "stands out of the noise at B"),
        (
            [Station("A", CLOCK), Station("B", None)],
            [Reading(0, 0.0, 1e-7), Reading(1, 1e-4, 1e-7)],
            "clock of B is free",
        ),
        ([Station("A", CLOCK)], [Reading(0, 0.0, 1e-7)], "add a second terminal"),
        ([Station("A", None, launches=True)], [Reading(0, 0.0, 1e-7)], "no echo stands out of the noise"),
        (ENDS, [Reading(0, 0.0, 1e-7), Reading(1, 1.0, 1e-7)], "contradict"),
        (
            ENDS,
            [Reading(0, 0.0, 1e-3), Reading(1, 0.0, 1e-3)],
            "would cover more than",
        ),
    ],
    ids=["silent end", "free clock", "one end", "no echo", "impossible difference", "too coarse"],
)
def test_refuses_with_the_reason_and_the_way_out(stations, readings, words):
    with pytest.raises(NoPosition, match=words):
        estimate(line(), stations, readings)
