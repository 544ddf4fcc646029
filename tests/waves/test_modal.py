"""Modal transforms: what they diagonalise, and the order of eigenmodes over frequency."""

import numpy as np
import pytest

from twlocate.waves import AERIAL_MODES, CLARKE, KARRENBAUER, aerial_mode, eigenmodes, ground_mode


@pytest.mark.parametrize("transform", [CLARKE, KARRENBAUER], ids=["Clarke", "Karrenbauer"])
def test_balanced_matrix_becomes_diagonal(transform):
    self_z, mutual_z = 5.0, 1.5
    z = np.full((3, 3), mutual_z) + (self_z - mutual_z) * np.eye(3)
    modal = transform @ z @ np.linalg.inv(transform)
    assert np.allclose(modal, np.diag([self_z + 2 * mutual_z, self_z - mutual_z, self_z - mutual_z]))


def test_karrenbauer_inverse_as_published():
    # H. Karrenbauer's T (value from memory)
    assert np.allclose(np.linalg.inv(KARRENBAUER), [[1, 1, 1], [1, -2, 1], [1, 1, -2]])


def test_aerial_modes_ignore_what_all_phases_share():
    common = np.ones((3, 1)) * np.sin(np.arange(50.0))
    assert np.allclose(ground_mode(common), common[0])
    for mode in AERIAL_MODES:
        assert np.allclose(aerial_mode(common, mode), 0.0)


def crossing_line():
    """Two modes whose speeds cross halfway; T is known and does not change."""
    t = np.array([[1.0, 1.0], [1.0, -1.0]]) / np.sqrt(2)
    omega = np.linspace(1e4, 2e5, 60)
    squared = np.stack([-(omega**2) * 1e-17, -(omega**2) * np.linspace(0.5e-17, 2e-17, 60)], axis=1)
    zy = t @ (squared[:, :, None] * np.eye(2)) @ np.linalg.inv(t)
    return zy, np.sqrt(squared.astype(complex)), t


def test_modes_keep_their_order_through_a_crossing():
    zy, gamma, t = crossing_line()
    modes = eigenmodes(zy, np.broadcast_to(np.eye(2), zy.shape))
    first = int(np.argmin(np.abs(modes.gamma[0] - gamma[0, 0])))
    assert np.allclose(modes.gamma[:, first].imag, gamma[:, 0].imag)
    assert np.allclose(np.abs(modes.transform[:, :, first]), np.abs(t[:, 0]))


def test_modes_diagonalise_a_lossy_matrix_and_decay():
    rng = np.random.default_rng(1)
    inductance, capacitance = (x @ x.T + 5 * np.eye(4) for x in rng.normal(size=(2, 4, 4)))
    omega = np.logspace(3, 6, 25)[:, None, None]
    z, y = 1e-4 * np.eye(4) + 1j * omega * inductance * 1e-7, 1j * omega * capacitance * 1e-12
    modes = eigenmodes(z, y)
    back = modes.transform @ (modes.gamma[:, :, None] ** 2 * np.eye(4)) @ np.linalg.inv(modes.transform)
    assert np.allclose(back, z @ y, rtol=1e-9, atol=1e-12 * np.abs(z @ y).max())
    assert (modes.gamma.real >= 0).all()
