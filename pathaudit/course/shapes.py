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
        return _travelled(self._slopes(row), low, high)

    def parameter(self, row, low, high, length, s):
        """(N,) the parameter at the arc length s (N,) after `low` on a part whose whole length (N,) is known: Newton from Hermite's cubic."""
        slopes, share = self._slopes(row), np.clip(s / length, 0.0, 1.0)
        rise = length / np.maximum(high - low, 1e-300)
        first, last = (rise / np.maximum(_speed(slopes, end), 1e-300) for end in (low, high))
        smooth = share**2 * (3.0 - 2.0 * share)
        t = smooth + share * (1.0 - share) * ((1.0 - share) * first - share * last)
        t = low + (high - low) * np.clip(np.where(np.isfinite(t), t, share), 0.0, 1.0)
        left = np.arange(len(t))
        for _ in range(4):
            some, at = slopes[:, left], t[left]
            off = _travelled(some, low[left], at) - s[left]
            t[left] = np.clip(at - off / np.maximum(_speed(some, at), 1e-300), low[left], high[left])
            left = left[np.abs(off) > 1e-7 * length[left]]  # the next step squares what is off by so little
            if not len(left):
                break
        return t

    def _slopes(self, row):
        """(5, N, 3) coefficients of the derivative."""
        return np.moveaxis(self.coefficients[row, 1:], 1, 0) * np.arange(1.0, 6.0)[:, None, None]


def _speed(slopes, t):
    """(N,) m per unit of the parameter."""
    t = t[:, None]
    v = (((slopes[4] * t + slopes[3]) * t + slopes[2]) * t + slopes[1]) * t + slopes[0]
    return np.sqrt(np.einsum("ni,ni->n", v, v))


def _travelled(slopes, low, high):
    span = np.asarray(high - low)
    return span * sum(weight * _speed(slopes, low + node * span) for node, weight in zip(NODES, WEIGHTS, strict=True))


def curvature(slope, bend):
    """Tangent (N, 3), speed (N,) and curvature vector (N, 3) 1/m, the derivative of the tangent by arc length, from two derivatives."""
    speed = np.linalg.norm(slope, axis=1)
    safe = np.where(speed > 0.0, speed, 1.0)[:, None]
    tangent = slope / safe
    return tangent, speed, (bend - tangent * np.sum(tangent * bend, axis=1, keepdims=True)) / safe**2
