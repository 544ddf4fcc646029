"""Two sensors a known distance apart: published values, limits, and recovery of known waves."""

import numpy as np
import pytest

from twlocate.waves import spacing_limits, split, split_dispersive, split_two_sensors, split_two_traces

C0, SPACING, FARTHER = 343.2, 0.03, 0.12  # m/s, m, m


@pytest.mark.parametrize(
    ("frequency_hz", "h12"),
    [(500.0, 0.98136903 - 0.81303727j), (1000.0, 0.61785818 - 0.21490554j), (1800.0, 1.65851578 - 1.49771554j)],
)
def test_reflection_factor_of_iso_10534_2(frequency_hz, h12):
    # ISO 10534-2:2001, Eq 17; H12 computed for r = 0.3 − 0.4j from the standard's field e^{jkx} + r·e^{−jkx}
    k = 2 * np.pi * frequency_hz / C0
    towards, back = split_two_sensors([1.0], [h12], [1j * k * SPACING], limits=(0.08, 0.9))  # 500 Hz is below the limit
    assert (back / towards * np.exp(2j * k * FARTHER))[0] == pytest.approx(0.3 - 0.4j, abs=3e-7)


@pytest.mark.parametrize(("spacing_m", "low", "high"), [(0.03, 572, 5148), (0.05, 343.2, 3088.8), (0.5, 34.32, 308.88)])
def test_limits_of_iso_10534_2(spacing_m, low, high):
    # ISO 10534-2:2001, clause 4.2, recomputed; the bore of 0.1 m gives 1990.6 Hz
    limits = spacing_limits(C0, spacing_m, bore_m=0.1)
    assert (limits.low_hz, limits.high_hz, limits.bore_hz) == pytest.approx((low, high, 1990.56))


@pytest.mark.parametrize("half_waves", [0.0, 0.05, 0.95, 1.0, 2.0])
def test_sensors_half_a_wave_apart_are_refused(half_waves):
    with pytest.raises(ValueError, match="multiple of half a wave"):
        split_two_sensors([1.0], [1.0], [1j * np.pi * half_waves])


def bursts(rng, n, rate_hz):
    """Two band-limited waves, zero at both ends of the record."""
    f = np.fft.rfftfreq(n, 1 / rate_hz)
    window = np.hanning(n) ** 4
    band = np.where((f > 12) & (f < 40), 1.0, 0.0)
    return [np.fft.irfft(np.fft.rfft(rng.normal(size=n)) * band, n) * window for _ in range(2)]


def later(x, seconds, rate_hz):
    f = np.fft.rfftfreq(x.size, 1 / rate_hz)
    return np.fft.irfft(np.fft.rfft(x) * np.exp(-2j * np.pi * f * seconds), x.size)


def rms(x):
    return np.sqrt(np.mean(np.square(x)))


def test_traces_give_the_waves_back_under_noise():
    rng = np.random.default_rng(3)
    n, rate, delay = 8192, 500.0, 8e-3  # 8 m of a water main
    out, back = bursts(rng, n, rate)
    sensors = out + back, later(out, delay, rate) + later(back, -delay, rate)
    clean = split_two_traces(*sensors, rate, delay_s=delay, floor=0.01)
    noisy = [x + rng.normal(0, 0.01 * rms(x), n) for x in sensors]
    found = split_two_traces(*noisy, rate, delay_s=delay, floor=0.05)
    band = [in_band(x, rate) for x in found]
    assert rms(clean[0] - out) / rms(out) < 1e-3
    assert rms(clean[1] - back) / rms(back) < 1e-3
    assert rms(band[0] - out) / rms(out) < 0.01
    assert rms(band[1] - back) / rms(back) < 0.01


def in_band(x, rate_hz):
    """Keep 10 to 42 Hz: the band in which the waves of this test live."""
    f = np.fft.rfftfreq(x.size, 1 / rate_hz)
    return np.fft.irfft(np.fft.rfft(x) * ((f > 10) & (f < 42)), x.size)


def test_traces_that_do_not_match_are_refused():
    with pytest.raises(ValueError, match="same length"):
        split_two_traces(np.zeros(100), np.zeros(99), 1.0, delay_s=2.0)
    with pytest.raises(ValueError, match="at least ten delays"):
        split_two_traces(np.zeros(10), np.zeros(10), 1.0, delay_s=2.0)


def test_constant_impedance_splits_the_same_through_the_spectrum():
    rng = np.random.default_rng(5)
    u, i = rng.normal(size=(2, 256))
    spectral = split_dispersive(u, i, 1e6, lambda s: np.full(s.shape, 385.0 + 0j))
    for a, b in zip(spectral, split(u, i, 385.0), strict=True):
        assert np.allclose(a, b)


def test_dispersive_impedance_recovers_the_waves():
    n, rate = 2048, 1e6
    t = np.arange(n) / rate
    outgoing = np.exp(-(((t - 4e-4) / 2e-5) ** 2))
    incoming = -0.5 * np.exp(-(((t - 9e-4) / 3e-5) ** 2))

    def impedance(s):
        return 300 * np.sqrt(1 + 1e4 / (s + 1e4))

    s = 2j * np.pi * np.fft.rfftfreq(8 * n, 1 / rate)
    through = np.fft.irfft(np.fft.rfft(outgoing - incoming, 8 * n) / impedance(s), 8 * n)[:n]
    f, b = split_dispersive(outgoing + incoming, through, rate, impedance)
    assert rms(f - outgoing) / rms(outgoing) < 0.01
    assert rms(b - incoming) / rms(incoming) < 0.01


def test_current_and_voltage_give_the_waves_back_under_noise():
    rng = np.random.default_rng(7)
    out, back = bursts(rng, 8192, 500.0)
    u, i = out + back, (out - back) / 400.0
    noisy = [x + rng.normal(0, 0.01 * rms(x), x.size) for x in (u, i)]
    found = [in_band(x, 500.0) for x in split(*noisy, 400.0)]
    assert rms(found[0] - out) / rms(out) < 0.01
    assert rms(found[1] - back) / rms(back) < 0.01


def test_direction_of_a_thousand_random_events():
    # a step from the route or from behind the terminal, at 15 dB over the noise of either channel
    rng = np.random.default_rng(11)
    right = 0
    for _ in range(1000):
        from_route = bool(rng.integers(2))
        onset = rng.integers(100, 156)
        wave = rng.choice([-1.0, 1.0]) * (np.arange(256) >= onset)
        noise = 10 ** (-15 / 20) * rng.normal(size=(2, 256))
        u, i = wave + noise[0], ((-wave if from_route else wave) + noise[1]) / 400.0
        outgoing, incoming = (np.abs(x[onset : onset + 16].mean()) for x in split(u, i, 400.0))
        right += (incoming > outgoing) == from_route
    assert right >= 990
