"""The inverse transform against signals that are known in closed form."""

import numpy as np
import pytest

from twlocate.simulation import laplace_grid, ramp, sinusoid, step

RATE = 1e6


def error(signal, expected, away_from):
    """Largest difference where no step is within thirteen samples."""
    t = np.arange(signal.size) / RATE
    return np.abs(signal - expected)[np.abs(t - away_from) > 13.5 / RATE].max()


@pytest.mark.parametrize(("accuracy", "limit"), [(1e-2, 1e-2), (1e-4, 1e-4), (1e-6, 1e-6)])
def test_step_to_the_accuracy_asked_for(accuracy, limit):
    grid = laplace_grid(4e-3, RATE, accuracy)
    found = grid.to_time(step(grid.s, 1.2345e-3))
    assert error(found, (grid.time_s > 1.2345e-3).astype(float), 1.2345e-3) < limit


def test_step_does_not_overshoot_and_is_half_up_at_its_time():
    grid = laplace_grid(4e-3, RATE)
    found = grid.to_time(step(grid.s, 1e-3))
    assert found[1000] == pytest.approx(0.5, abs=2e-3)
    assert np.diff(found).min() > -1e-4
    assert found.max() < 1 + 1e-4


def test_decay_ramp_and_sine():
    grid = laplace_grid(4e-3, RATE)
    t = grid.time_s
    decay = grid.to_time(np.exp(-grid.s * 1e-3) / (grid.s + 800.0))
    assert error(decay, np.where(t > 1e-3, np.exp(-800 * (t - 1e-3)), 0.0), 1e-3) < 1e-4
    rise = grid.to_time(ramp(grid.s, 1e-3, 5e-4))
    assert np.abs(rise - np.clip((t - 5e-4) / 1e-3, 0, 1)).max() < 2e-3
    turning = grid.to_time(sinusoid(grid.s, [2 - 1j], 2 * np.pi * 50, 1e-3))[:, 0]
    expected = ((2 - 1j) * np.exp(2j * np.pi * 50 * t)).real
    assert error(turning, np.where(t > 1e-3, expected, 0.0), 1e-3) < 1e-3


def test_shift_by_whole_samples_shifts_the_result():
    grid = laplace_grid(2e-3, RATE)
    early, late = (grid.to_time(step(grid.s, onset)) for onset in (0.5e-3, 0.7e-3))
    assert np.allclose(late[200:], early[:-200], atol=1e-6)


def test_limits_are_stated():
    with pytest.raises(ValueError, match="outside 1e-6 to 1e-2"):
        laplace_grid(1e-3, RATE, 1e-9)
    with pytest.raises(ValueError, match="at least 16 are needed"):
        laplace_grid(1e-5, RATE)
