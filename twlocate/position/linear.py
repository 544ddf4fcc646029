"""The linear-Gaussian model of one explanation for an event in one section.

At a fixed place x the arrival times are linear in everything else that is unknown::

    t = c + m·x + J(x)·δ + F·β + ε

with δ the errors of the inputs (prior: zero mean, variances u²), ε the arrival errors, and β what has a flat
prior: the event time and the offsets of free clocks. δ and β are integrated out in closed form, which leaves
the likelihood of x (A. Gelman et al., Bayesian Data Analysis, 3rd ed. 2013, sec. 14.8, from memory).

The columns of F say which readings share an unknown time, and no reading has two of them. Such a time drops out of
the differences D·t between each reading of a group and the first, exactly and before anything is squared, so that
neither a late event nor a badly known section costs digits. With these differences |D·V·Dᵀ| = |V|·|FᵀV⁻¹F|, so their
density is the marginal likelihood without a further constant (D·Dᵀ = I + 1·1ᵀ has the determinant of FᵀF).
"""

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from twlocate.arrays import FloatArray
from twlocate.position.evidence import Reading, Station
from twlocate.position.explanations import ECHOES, Cause, Explanation, path_of
from twlocate.position.inputs import columns, input_variances
from twlocate.quantity import Quantity
from twlocate.routes import Route, travel_time


@dataclass(frozen=True)
class LinearModel:
    """Arrival times of the n attributed readings as a function of x, for P inputs."""

    times: FloatArray
    """(n,) measured times less known delays and clock offsets, s."""
    constant: FloatArray
    """(n,) predicted time at x = 0 for an event at time zero, s."""
    per_metre: FloatArray
    """(n,) its slope, s/m."""
    at_zero: FloatArray
    """(n, P) d t / d input at x = 0."""
    slope: FloatArray
    """(n, P) its slope a metre of x."""
    flat: FloatArray
    """(n, d) columns of the unknowns with a flat prior."""
    variance: FloatArray
    """(n,) of the readings, s²."""
    input_variance: FloatArray
    """(P,)"""
    n_strays: int = 0
    """Readings that this explanation leaves to chance."""

    @cached_property
    def differences(self) -> FloatArray:
        """D, shape (n − d, n): each reading less the first that shares its unknown time."""
        groups = [np.flatnonzero(column) for column in self.flat.T]
        pairs = [(first, other) for first, *others in groups for other in others]
        rows = np.zeros((len(pairs), self.times.size))
        for row, (first, other) in zip(rows, pairs, strict=True):
            row[first], row[other] = -1.0, 1.0
        return rows

    @property
    def informative(self) -> bool:
        """Whether the times say anything about x at all."""
        return bool(self.times.size > self.flat.shape[1])

    def jacobian(self, x: FloatArray) -> FloatArray:
        """Return d t / d input at each x, shape (G, n, P)."""
        return self.at_zero + x[:, None, None] * self.slope

    def residual(self, x: FloatArray) -> FloatArray:
        """Return measured less predicted time differences at each x, shape (G, n − d)."""
        d = self.differences
        return d @ self.times - d @ self.constant - x[:, None] * (d @ self.per_metre)

    def covariance(self, x: FloatArray) -> FloatArray:
        """Return the covariance of the differences at each x, shape (G, n − d, n − d)."""
        d = self.differences
        weighted = (d @ self.jacobian(x)) * np.sqrt(self.input_variance)
        return weighted @ weighted.transpose(0, 2, 1) + (d * self.variance) @ d.T

    def pull(self, x: float) -> tuple[FloatArray, float]:
        """Return the weight of each difference in the least squares solution, (n − d,), and the curvature, 1/m².

        The curvature is 0 where the readings do not depend on x: beyond a tee, seen from the other branches.
        """
        slope = self.differences @ self.per_metre
        weights = np.linalg.solve(self.covariance(np.array([x]))[0], slope)
        return weights, float(weights @ slope)

    def log_likelihood(self, x: FloatArray, window_s: float) -> FloatArray:
        """Return log p(times | x) at each x, shape (G,).

        `window_s` is the span over which a flat unknown or a stray reading may lie; it makes explanations
        with different numbers of them comparable.
        """
        n, d = self.flat.shape
        proper = -0.5 * (n - d) * np.log(2 * np.pi) - (d + self.n_strays) * np.log(window_s)
        if not self.informative:
            return np.full(x.shape, proper)
        covariance, residual = self.covariance(x), self.residual(x)
        misfit = np.einsum("gi,gi->g", residual, np.linalg.solve(covariance, residual[..., None])[..., 0])
        return np.asarray(proper - 0.5 * (np.linalg.slogdet(covariance)[1] + misfit), dtype=np.float64)

    def left_over(self, x: float) -> FloatArray:
        """Return the most probable error of each reading's time for an event at x, shape (n,), s.

        What the readings do not fit by is shared out between them and the inputs in proportion to their variances.
        """
        here = np.array([x])
        pull = np.linalg.solve(self.covariance(here)[0], self.residual(here)[0])
        return np.asarray(self.variance * (self.differences.T @ pull), dtype=np.float64)

    def difference_left(self, row: int, other: int, x: float, u_x: float) -> Quantity:
        """Return how much later than another, beyond what the paths explain, a reading is at x ± `u_x`, s."""
        times = self.times - self.constant - x * self.per_metre
        jacobian = self.jacobian(np.array([x]))[0]
        variance = (
            self.variance[row]
            + self.variance[other]
            + float((jacobian[row] - jacobian[other]) ** 2 @ self.input_variance)
            + ((self.per_metre[row] - self.per_metre[other]) * u_x) ** 2
        )
        return Quantity(float(times[row] - times[other]), float(np.sqrt(variance)))

    def best_x(self, length_m: float) -> tuple[float, float]:
        """Return the x of least misfit on [0, `length_m`] and its standard uncertainty, m.

        The residual is linear in x, so each step solves exactly for the weights of the last.
        """
        x, spread = length_m / 2, length_m
        for _ in range(3):
            pull, curvature = self.pull(x)
            if curvature * length_m**2 < 1:
                return x, length_m
            x = float(np.clip(x + pull @ self.residual(np.array([x]))[0] / curvature, 0.0, length_m))
            spread = curvature**-0.5
        return x, spread


def linear_model(
    route: Route, section: int, stations: Sequence[Station], readings: Sequence[Reading], explanation: Explanation
) -> LinearModel | None:
    """Set up the model of `explanation` for an event in `section`; None where one of its causes has no path there."""
    rows = [readings[index] for index, _ in explanation.causes]
    paths = [
        path_of(cause, route, section, stations[row.station].node)
        for row, (_, cause) in zip(rows, explanation.causes, strict=True)
    ]
    travels = [travel_time(route, path) for path in paths if path is not None]
    if len(travels) < len(paths):
        return None
    partials = [columns(travel, row.station, len(stations)) for travel, row in zip(travels, rows, strict=True)]
    n_inputs = 3 * len(route.sections) + 2 * len(stations)
    return LinearModel(
        times=np.array([row.time_s - _known_lag(stations[row.station]) for row in rows]),
        constant=np.array([travel.constant_s for travel in travels]),
        per_metre=np.array([travel.per_metre for travel in travels]),
        at_zero=np.array([at_zero for at_zero, _ in partials]).reshape(-1, n_inputs),
        slope=np.array([slope for _, slope in partials]).reshape(-1, n_inputs),
        flat=_flat_columns(rows, stations, explanation),
        variance=np.array(
            [time_variance(row, cause) for row, (_, cause) in zip(rows, explanation.causes, strict=True)]
        ),
        input_variance=input_variances(route, stations),
        n_strays=len(readings) - len(rows),
    )


def time_variance(reading: Reading, cause: Cause) -> float:
    """Return the variance of a reading's time, s²; an echo is reshaped on its way and rides on other waves."""
    return reading.u_s**2 + (reading.blur_s**2 if cause.kind in ECHOES else 0.0)


def _known_lag(station: Station) -> float:
    clock = 0.0 if station.clock is None else station.clock.value
    return station.delay.value + clock


def _flat_columns(rows: Sequence[Reading], stations: Sequence[Station], explanation: Explanation) -> FloatArray:
    """One column for the event time, one for each free or wrong clock and each launch; no reading has two of them."""
    own_zero = {s for s, station in enumerate(stations) if station.clock is None or station.launches}
    alone = own_zero | explanation.wrong_clocks
    used = {row.station for row in rows}
    groups = [{station} for station in sorted(used & alone)]
    if used - alone:
        groups.append(used - alone)
    return np.array([[float(row.station in group) for group in groups] for row in rows]).reshape(len(rows), len(groups))
