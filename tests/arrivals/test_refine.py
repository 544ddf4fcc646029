"""The onset of a front: truth is built, then recovered; the stated uncertainty is held against the errors made."""

import numpy as np
import pytest
from scipy import special

from twlocate.arrivals.noise import measure_noise
from twlocate.arrivals.refine import refine
from twlocate.arrivals.shapes import SHAPES

ONSET = 120
N = 240


def erfc_front(t, onset, way=0.3):
    """A step after skin effect (scipy's erfc, not ours)."""
    since = np.maximum(t - onset, 1e-12)
    return special.erfc(way / np.sqrt(since)) * (t > onset)


def ramp(rise):
    return lambda t, onset: np.clip((t - onset) / rise, 0, 1)


def decaying(t, onset):
    since = np.maximum(t - onset, 0.0)
    return (1 - np.exp(-since / 1.5)) * np.exp(-since / 60)


FRONTS = {
    "ramp of 3 samples": ramp(3.0),
    "ramp of 12 samples": ramp(12.0),
    "decaying": lambda t, onset: np.where(
        t >= onset, (1 - np.exp(-(t - onset) / 1.5)) * np.exp(-(t - onset) / 60), 0.0
    ),
    "erfc": erfc_front,
}


def trials(front, snr_db, n, rng, colour=0.0):
    """Return errors and standard uncertainties in samples, at random sub-sample phases."""
    errors, us = [], []
    for _ in range(n):
        onset = ONSET + rng.uniform()
        noise = rng.normal(0, 10 ** (-snr_db / 20), N + 100)
        for k in range(1, noise.size):
            noise[k] += colour * noise[k - 1]
        samples = front(np.arange(N, dtype=float), onset) + noise[100:] * np.sqrt(1 - colour**2)
        found = refine(samples, onset + rng.uniform(-2, 3), 16, 1.0, (60, 200), measure_noise(samples[:100], 0.0))
        errors.append(found.onset - onset)
        us.append(found.u)
    return np.array(errors), np.array(us)


@pytest.mark.parametrize("name", FRONTS)
def test_the_95_percent_interval_holds_the_onset(name):
    """At least 95 % less three binomial standard deviations of 80 trials."""
    errors, us = trials(FRONTS[name], 20.0, 80, np.random.default_rng(3))
    assert np.mean(np.abs(errors) < 1.96 * us) >= 0.95 - 3 * np.sqrt(0.95 * 0.05 / 80)


def test_coloured_noise_is_allowed_for():
    errors, us = trials(FRONTS["ramp of 3 samples"], 20.0, 80, np.random.default_rng(4), colour=0.7)
    assert np.mean(np.abs(errors) < 1.96 * us) >= 0.95 - 3 * np.sqrt(0.95 * 0.05 / 80)


def test_the_onset_of_a_clean_front_is_good_to_a_fraction_of_a_sample():
    errors, _ = trials(ramp(3.0), 40.0, 30, np.random.default_rng(5))
    assert np.quantile(np.abs(errors), 0.95) < 0.6
    assert abs(errors.mean()) < 0.25


def test_less_noise_gives_a_smaller_uncertainty():
    us = [np.median(trials(ramp(3.0), snr, 10, np.random.default_rng(6))[1]) for snr in (10.0, 20.0, 40.0)]
    assert us[0] > us[1] > us[2]


def test_shifting_the_samples_shifts_the_onset():
    rng = np.random.default_rng(7)
    samples = ramp(3.0)(np.arange(N, dtype=float), ONSET + 0.4) + rng.normal(0, 0.01, N)
    one = refine(samples, 121.0, 16, 1.0, (60, 190), measure_noise(samples[:100], 0.0))
    moved = np.concatenate([samples[7:], samples[-7:]])
    other = refine(moved, 114.0, 16, 1.0, (53, 183), measure_noise(samples[:100], 0.0))
    assert one.onset - other.onset == pytest.approx(7.0, abs=1e-6)
    assert other.u == pytest.approx(one.u, rel=1e-6)


def test_scaling_the_samples_changes_nothing():
    rng = np.random.default_rng(8)
    samples = ramp(3.0)(np.arange(N, dtype=float), ONSET + 0.4) + rng.normal(0, 0.01, N)
    one = refine(samples, 121.0, 16, 1.0, (60, 190), measure_noise(samples[:100], 0.0))
    other = refine(-5e4 * samples, 121.0, 16, 5e4, (60, 190), measure_noise(-5e4 * samples[:100], 0.0))
    assert other.onset == pytest.approx(one.onset, abs=1e-6)
    assert other.u == pytest.approx(one.u, rel=1e-4)


@pytest.mark.parametrize("name", SHAPES)
def test_every_shape_starts_at_zero_and_ends_at_one(name):
    shape = SHAPES[name]
    assert shape(np.array([-1.0, -1e-9])) == pytest.approx([0.0, 0.0])
    assert shape(np.array([1e9]))[0] == pytest.approx(1.0, abs=1e-4)
    rising = shape(np.linspace(-1, 5, 200))
    assert (np.diff(rising) >= -1e-7).all()


@pytest.mark.parametrize("name", ["exponential", "cascade", "diffusion"])
def test_shapes_without_an_end_reach_90_percent_at_their_rise(name):
    assert SHAPES[name](np.array([1.0]))[0] == pytest.approx(0.9, abs=1e-5)


def test_the_diffusion_front_is_erfc():
    u = np.array([0.01, 0.1, 0.5, 1.0, 10.0])
    assert SHAPES["diffusion"](u) == pytest.approx(special.erfc(0.088856 / np.sqrt(u)), abs=2e-7)
