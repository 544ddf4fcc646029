"""Two sensors of one kind, a known distance apart, in place of an across and a through variable.

With the near sensor at the terminal and the far one `spacing_m` into the route, near = f + b and
far = f·e^(−γd) + b·e^(γd). The two equations have no solution where sinh γd = 0, that is at d = n·λ/2 and at
zero frequency: there both sensors say the same thing.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from twlocate.arrays import ComplexArray, FloatArray, as_signal

SHARE_OF_HALF_WAVE = (0.1, 0.9)
"""ISO 10534-2:2001, 4.2: d > 0.05·λ and d < 0.45·λ, as a share of the half wave λ/2."""


@dataclass(frozen=True)
class SpacingLimits:
    """The frequencies between which two sensors can be told apart."""

    low_hz: float
    high_hz: float
    bore_hz: float | None
    """Above it waves across the bore spoil the plane wave; None where no bore was given."""


def spacing_limits(speed: float, spacing_m: float, bore_m: float | None = None) -> SpacingLimits:
    """Return the working range of a sensor pair at wave speed `speed` (m/s).

    ISO 10534-2:2001, clause 4.2: f > c/(20 d), f·d < 0.45 c and, in a round bore D, f·D < 0.58 c.
    """
    bore_hz = None if bore_m is None else 0.58 * speed / bore_m
    return SpacingLimits(speed / (20 * spacing_m), 0.45 * speed / spacing_m, bore_hz)


def split_two_sensors(
    near: ArrayLike, far: ArrayLike, gamma_d: ArrayLike, *, limits: tuple[float, float] = SHARE_OF_HALF_WAVE
) -> tuple[ComplexArray, ComplexArray]:
    """Split two spectra into the outgoing and the incoming wave at the near sensor.

    Parameters
    ----------
    near, far : array_like, shape (n,)
        Spectra of the across variable.
    gamma_d : array_like, shape (n,)
        Propagation function times the spacing; j·k·d without loss.
    limits : (float, float)
        How near to a multiple of half a wave the spacing may come, as shares of the half wave.

    Raises
    ------
    ValueError
        A frequency is outside `limits`, where the sensors (almost) say the same.
    """
    near, far, gamma_d = (np.asarray(values, dtype=np.complex128) for values in (near, far, gamma_d))
    share = np.mod(gamma_d.imag / np.pi, 1.0)
    low, high = limits
    bad = (share < low * (1 - 1e-12)) | (share > high * (1 + 1e-12))
    if bad.any():
        worst = share[np.argmax(np.abs(share - 0.5))]
        raise ValueError(
            f"{np.count_nonzero(bad)} of {share.size} frequencies put the sensors near a multiple of half a wave apart "
            f"(worst: {worst:.3f} of a half wave beyond one; limits {low} to {high}); "
            "drop them or change the spacing"
        )
    out, back = np.exp(-gamma_d), np.exp(gamma_d)
    determinant = back - out
    return (near * back - far) / determinant, (far - near * out) / determinant


def split_two_traces(
    near: ArrayLike, far: ArrayLike, rate_hz: float, *, delay_s: float, floor: float = 0.1
) -> tuple[FloatArray, FloatArray]:
    """Split two records into the outgoing and the incoming wave at the near sensor, both as departures from rest.

    Parameters
    ----------
    near, far : array_like, shape (n,)
        The across variable; the mean of the first tenth is taken as the state of rest.
    rate_hz : float
        Sampling rate.
    delay_s : float
        Time a wave takes from one sensor to the other.
    floor : float
        Regularisation: a singular direction is damped where |2 sinh γd| falls towards `floor`, so noise is
        amplified by at most 1/(2·floor). What lies below about floor/(2π·delay) in frequency is lost.

    Raises
    ------
    ValueError
        The records differ in length, are not finite, or are shorter than ten delays.
    """
    near, far = as_signal(near, "near sensor"), as_signal(far, "far sensor")
    if near.size != far.size or near.size < 10 * delay_s * rate_hz:
        raise ValueError(
            f"sensor records of {near.size} and {far.size} samples; both need the same length, "
            f"at least ten delays ({10 * delay_s * rate_hz:.0f} samples)"
        )
    n = near.size
    rest = max(n // 10, 1)
    near_f, far_f = (np.fft.rfft(x - x[:rest].mean(), 2 * n) for x in (near, far))
    turn = np.exp(2j * np.pi * np.fft.rfftfreq(2 * n, 1 / rate_hz) * delay_s)
    determinant = turn - turn.conj()
    inverse = determinant.conj() / (np.abs(determinant) ** 2 + floor**2)
    outgoing = (near_f * turn - far_f) * inverse
    incoming = (far_f - near_f * turn.conj()) * inverse
    return np.fft.irfft(outgoing, 2 * n)[:n], np.fft.irfft(incoming, 2 * n)[:n]
