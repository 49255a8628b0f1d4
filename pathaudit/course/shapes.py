"""The exact geometry of moves on arrays: straight lines, circular arcs with a rise (helices), polynomial curves. NumPy only.

Each function takes numbers of table rows (N,) and local parameters (N,) in 0..1 and gives one row each. On a line and an arc the
parameter is the share of the arc length. An arc is centre + cos(sweep t) first + sin(sweep t) second + t drift, where first and second
have the length of the radius; drift is the rise of a helix, and what rounding in a file leaves between the circle and the given end.
A curve is a polynomial of degree 5 at most, coefficients in ascending powers of its parameter.
"""

from dataclasses import dataclass

import numpy as np

LINE, ARC, CURVE, STILL = range(4)
"""Kinds of moves; STILL stands, or turns in place."""

NODES, WEIGHTS = (0.5 * (values + shift) for values, shift in zip(np.polynomial.legendre.leggauss(8), (1.0, 0.0), strict=True))
"""Gauss-Legendre on 0..1: exact to degree 15."""


@dataclass(frozen=True, eq=False)
class Lines:
    """start, end (m, 3) m."""

    start: np.ndarray
    end: np.ndarray

    def at(self, row, t):
        """Position, first and second derivative by the parameter, (N, 3) each."""
        step = self.end[row] - self.start[row]
        return self.start[row] + t[:, None] * step, step, np.zeros_like(step)


@dataclass(frozen=True, eq=False)
class Arcs:
    """centre, first, second, drift (k, 3) m; sweep (k,) rad, above 0: from first towards second."""

    centre: np.ndarray
    first: np.ndarray
    second: np.ndarray
    sweep: np.ndarray
    drift: np.ndarray

    def at(self, row, t):
        """Position, first and second derivative by the parameter, (N, 3) each."""
        sweep, first, second = self.sweep[row, None], self.first[row], self.second[row]
        cos, sin = np.cos(sweep * t[:, None]), np.sin(sweep * t[:, None])
        out = cos * first + sin * second
        along = cos * second - sin * first
        return self.centre[row] + out + t[:, None] * self.drift[row], sweep * along + self.drift[row], -(sweep**2) * out

    @property
    def radius(self) -> np.ndarray:
        """(k,) m"""
        return np.linalg.norm(self.first, axis=1)

    @property
    def length(self) -> np.ndarray:
        """(k,) m, by Pythagoras of the arc and the rise"""
        return np.hypot(self.radius * self.sweep, np.linalg.norm(self.drift, axis=1))


@dataclass(frozen=True, eq=False)
class Curves:
    """coefficients (k, 6, 3) m, ascending powers."""

    coefficients: np.ndarray

    def at(self, row, t):
        """Position, first and second derivative by the parameter, (N, 3) each."""
        c, t = self.coefficients[row], t[:, None]
        place, slope, bend = c[:, 5], np.zeros_like(c[:, 5]), np.zeros_like(c[:, 5])
        for power in range(4, -1, -1):  # Horner's rule for the value and both derivatives at once
            bend = bend * t + slope
            slope = slope * t + place
            place = place * t + c[:, power]
        return place, slope, 2.0 * bend

    def length(self, row, low, high):
        """(N,) m, arc length between two parameters (N,), which are not far apart, by 8 Gauss-Legendre nodes."""
        span = np.asarray(high - low)
        total = np.zeros(len(row))
        for node, weight in zip(NODES, WEIGHTS, strict=True):
            total += weight * np.linalg.norm(self._slope(row, low + node * span), axis=1)
        return total * span

    def _slope(self, row, t):
        c, t = self.coefficients, t[:, None]
        slope = 5.0 * c[row, 5]
        for power in range(4, 0, -1):
            slope = slope * t + power * c[row, power]
        return slope

    def parameter(self, row, low, high, length, s):
        """(N,) the parameter at the arc length s (N,) after `low` on a part whose whole length (N,) is known: Newton from Hermite's cubic."""
        share = np.clip(s / length, 0.0, 1.0)
        rise = length / np.maximum(high - low, 1e-300)
        first, last = (rise / np.maximum(np.linalg.norm(self._slope(row, end), axis=1), 1e-300) for end in (low, high))
        smooth = share**2 * (3.0 - 2.0 * share)
        t = smooth + share * (1.0 - share) * ((1.0 - share) * first - share * last)
        t = low + (high - low) * np.clip(np.where(np.isfinite(t), t, share), 0.0, 1.0)
        for _ in range(2):
            speed = np.maximum(np.linalg.norm(self._slope(row, t), axis=1), 1e-300)
            t = np.clip(t - (self.length(row, low, t) - s) / speed, low, high)
        return t


def curvature(slope, bend):
    """Tangent (N, 3), speed (N,) and curvature vector (N, 3) 1/m, the derivative of the tangent by arc length, from two derivatives."""
    speed = np.linalg.norm(slope, axis=1)
    safe = np.where(speed > 0.0, speed, 1.0)[:, None]
    tangent = slope / safe
    return tangent, speed, (bend - tangent * np.sum(tangent * bend, axis=1, keepdims=True)) / safe**2
