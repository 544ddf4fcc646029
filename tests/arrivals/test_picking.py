"""From a trace to its arrivals: found where they are, none where none is, none moved by hum or by the converter."""

import numpy as np
import pytest

from twlocate.arrivals import Trace, pick, strongest_mode
from twlocate.arrivals.denoise import shrink
from twlocate.arrivals.detect import threshold
from twlocate.arrivals.modulus import haar_coefficients, robust_sigma
from twlocate.arrivals.noise import measure_noise, without_hum
from twlocate.waves import AERIAL_MODES

RATE_HZ = 1e6


def step(n, onset, rise=3.0):
    return np.clip((np.arange(n) - onset) / rise, 0, 1)


def noise(rng, n, sigma):
    return rng.normal(0, sigma, n)


def test_times_fronts_in_order_with_their_signs():
    rng = np.random.default_rng(1)
    samples = step(8000, 3000.3) - 0.5 * step(8000, 3400.7) + noise(rng, 8000, 0.01)
    picks = pick(Trace(samples, RATE_HZ, start_s=2.0))
    onsets = [(a.time_s - 2.0) * RATE_HZ for a in picks.arrivals]
    assert onsets == pytest.approx([3000.3, 3400.7], abs=1.5)
    assert [a.polarity for a in picks.arrivals] == [1, -1]
    assert picks.arrivals[0].snr_db == pytest.approx(40, abs=1.5)
    assert picks.arrivals[0].outlier < 0.01


@pytest.mark.parametrize("rise", [1, 10, 100, 1000])
def test_fronts_from_one_sample_to_thousands(rise):
    rng = np.random.default_rng(rise)
    n = 40_000
    picks = pick(Trace(step(n, 15_000.5, rise) + noise(rng, n, 0.02), RATE_HZ))
    first = picks.arrivals[0]
    assert abs(first.time_s * RATE_HZ - 15_000.5) < 4 * first.u_s * RATE_HZ
    assert first.u_s * RATE_HZ < 0.2 * rise + 1


def test_noise_alone_gives_no_arrival():
    """The stated false-alarm probability, with three binomial standard deviations over 300 records."""
    rng = np.random.default_rng(2)
    found = sum(bool(pick(Trace(noise(rng, 2000, 1.0), RATE_HZ), false_alarm=0.02).arrivals) for _ in range(300))
    assert found <= 300 * 0.04 + 3 * np.sqrt(300 * 0.04)


def test_a_silent_record_gives_no_arrival():
    assert pick(Trace(np.zeros(2000), RATE_HZ)).arrivals == ()
    flicker = np.zeros(2000)
    flicker[700:] = 0.01  # one converter step, up for good
    assert pick(Trace(flicker, RATE_HZ, step=0.01)).arrivals == ()


def test_a_front_with_nothing_before_it_fails_the_gate():
    picks = pick(Trace(step(4000, 20.0) + noise(np.random.default_rng(3), 4000, 0.01), RATE_HZ))
    assert picks.arrivals == ()
    (gate,) = [gate for gate in picks.gates if not gate.passed]
    assert gate.fatal
    assert "precede the first front" in gate.detail


def test_hum_is_taken_off_without_moving_the_front():
    rng = np.random.default_rng(4)
    n, onset = 25_000, 12_000.4
    hum = 100.0 * np.sin(2 * np.pi * 50 * np.arange(n) / RATE_HZ + 0.7)
    front = step(n, onset) + noise(rng, n, 0.02)
    with_hum = pick(Trace(front + hum, RATE_HZ, line_frequency_hz=50.0)).arrivals[0]
    without = pick(Trace(front, RATE_HZ)).arrivals[0]
    assert with_hum.time_s == pytest.approx(without.time_s, abs=0.2 / RATE_HZ)
    left = without_hum(front + hum, RATE_HZ, 50.0, 11_000)
    assert np.std(left[:11_000]) == pytest.approx(0.02, rel=0.1)


def test_shrinkage_moves_no_front_and_takes_noise_away():
    rng = np.random.default_rng(5)
    clean = step(6000, 2500.0, 2.0)
    noisy = clean + noise(rng, 6000, 0.05)
    denoised = shrink(noisy, 2400)
    assert np.std(denoised[:2400]) < 0.2 * 0.05
    assert np.std(denoised - clean) < 0.5 * np.std(noisy - clean)
    middle = [int(np.argmax(haar_coefficients(x, 4))) for x in (clean, denoised)]
    assert abs(middle[0] - middle[1]) <= 1


def test_shrinkage_is_translation_invariant():
    rng = np.random.default_rng(6)
    noisy = step(4096, 2000.0) + noise(rng, 4096, 0.05)
    one, other = shrink(noisy, 1500), shrink(noisy[5:], 1495)
    assert other[600:3000] == pytest.approx(one[605:3005], abs=5e-3)


def test_modulus_of_a_step_is_its_height_at_every_scale():
    """Lipschitz exponent 0 (Mallat and Hwang 1992): the modulus of a step does not depend on the scale."""
    samples = step(1000, 500.0, 1e-9)
    assert [np.abs(haar_coefficients(samples, s)).max() for s in (2, 8, 32, 128)] == pytest.approx([1.0] * 4)


def test_modulus_of_a_ramp_grows_with_the_scale():
    """Lipschitz exponent 1: within a ramp the modulus doubles with the scale."""
    samples = step(4000, 1000.0, 2000.0)
    heights = [np.abs(haar_coefficients(samples, s)).max() for s in (8, 16, 32)]
    assert heights[1] / heights[0] == pytest.approx(2.0)
    assert heights[2] / heights[1] == pytest.approx(2.0)


def test_robust_sigma_of_normal_noise():
    """median|z| = 0.6745 for a standard normal z (Donoho and Johnstone 1994)."""
    values = np.random.default_rng(7).normal(0, 3.0, 200_000)
    assert robust_sigma(values) == pytest.approx(3.0, rel=0.01)


def test_threshold_is_the_two_sided_normal_quantile():
    assert threshold(0.05, 1, 1) == pytest.approx(1.959964, abs=1e-6)  # standard normal table
    assert threshold(0.001, 10_000, 10) > threshold(0.01, 10_000, 10)


def test_noise_model_finds_the_colour():
    rng = np.random.default_rng(8)
    x = np.zeros(20_000)
    for k in range(1, x.size):
        x[k] = 0.8 * x[k - 1] + rng.normal()
    model = measure_noise(x, 0.0)
    assert model.coefficients[0] == pytest.approx(0.8, abs=0.03)
    assert model.sigma == pytest.approx(1.0, rel=0.03)
    assert model.spread == pytest.approx(1 / np.sqrt(1 - 0.64), rel=0.05)
    assert np.std(model.whiten(x)) == pytest.approx(1.0, rel=0.03)


@pytest.mark.parametrize(
    ("phases", "expected"),
    [
        ((1.0, 0.0, 0.0), {"alpha (a)"}),
        ((0.0, 1.0, 0.0), {"alpha (b)"}),
        ((0.0, 1.0, -1.0), {"beta (a)"}),
        ((1.0, -1.0, 0.0), {"beta (c)"}),
    ],
    ids=["a to ground", "b to ground", "b to c", "a to b"],
)
def test_the_mode_follows_the_faulted_phases(phases, expected):
    """a-g excites alpha (a), b-c excites beta (a): Clarke's transform by hand. Equal noise in all phases."""
    rng = np.random.default_rng(9)
    signals = np.outer(phases, step(4000, 2000.0)) + rng.normal(0, 0.01, (3, 4000))
    assert strongest_mode(signals) in expected


def test_aerial_modes_do_not_see_what_all_phases_share():
    assert all(sum(weights) == pytest.approx(0.0) for weights in AERIAL_MODES.values())


def test_a_trace_must_be_finite():
    with pytest.raises(ValueError, match="voltage has 1 missing or infinite samples of 3"):
        pick(Trace(np.array([1.0, np.nan, 2.0]), RATE_HZ, name="voltage"))


def test_hum_that_steepens_before_the_event_is_no_front():
    """A fifth of a cycle from the crest on: the noise is measured where the hum is level, the front is on its slope."""
    rng = np.random.default_rng(11)
    rate, n, onset = 1.25e6, 10_000, 5_200.3
    hum = 180e3 * np.cos(2 * np.pi * 50 * np.arange(n) / rate + np.array([[0.0], [-2.1], [2.1]]))
    phases = hum + rng.normal(0, 40.0, (3, n))
    phases[1] -= 20e3 * step(n, onset, 2.0)
    assert strongest_mode(phases) == "alpha (b)"
    trace = Trace(np.asarray(AERIAL_MODES["alpha (b)"]) @ phases, rate, line_frequency_hz=50.0)
    first = pick(trace).arrivals[0]
    assert first.time_s * rate == pytest.approx(onset, abs=1.0)
    assert first.polarity == -1


@pytest.mark.parametrize(("rise", "snr_db"), [(1e-3, 10.0), (30.0, 20.0)])
def test_weak_fronts_in_short_records_are_found(rise, snr_db):
    """Twenty records of 2048 samples; at least nineteen fronts within five samples or their rise of the truth."""
    rng = np.random.default_rng(12)
    found = 0
    for _ in range(20):
        onset = 1190 + rng.uniform()
        picks = pick(Trace(step(2048, onset, rise) + noise(rng, 2048, 10 ** (-snr_db / 20)), 1.0))
        found += bool(picks.arrivals) and abs(picks.arrivals[0].time_s - onset) < max(5.0, rise)
    assert found >= 19
