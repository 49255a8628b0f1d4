"""How the tool turns along moves, on arrays of unit quaternions (w, x, y, z): about one axis at constant rate, by a spline, blended at corners."""

from dataclasses import dataclass

import numpy as np

from ..kernels.rotations import multiply_wxyz

EVEN, SPLINED, BLENDED = range(3)


def exp_wxyz(vector):
    """Rotation vectors (..., 3) rad -> unit quaternions (..., 4)."""
    half = 0.5 * np.asarray(vector, dtype=np.float64)
    angle = np.linalg.norm(half, axis=-1, keepdims=True)
    return np.concatenate([np.cos(angle), np.sinc(angle / np.pi) * half], axis=-1)


def log_wxyz(q):
    """Unit quaternions (..., 4) -> rotation vectors (..., 3), rad, of length 0 to pi."""
    q = np.where(q[..., :1] < 0.0, -q, q)
    sine = np.linalg.norm(q[..., 1:], axis=-1, keepdims=True)
    tiny = sine < 1e-100
    return np.where(tiny, 2.0, 2.0 * np.arctan2(sine, q[..., :1]) / np.where(tiny, 1.0, sine)) * q[..., 1:]


def between(start, end):
    """(..., 3) rad, in the axes of the turned tool: the one turn by at most half a revolution that takes `start` to `end`, (..., 4) each."""
    return log_wxyz(multiply_wxyz(start * [1.0, -1.0, -1.0, -1.0], end))


@dataclass(frozen=True, eq=False)
class Even:
    """The tool turns by `turn` (m, 3) rad, in tool axes, from `start` (m, 4), at constant rate about the one axis (slerp)."""

    start: np.ndarray
    turn: np.ndarray

    def at(self, row, t):
        return multiply_wxyz(self.start[row], exp_wxyz(self.turn[row] * t[:, None]))


@dataclass(frozen=True, eq=False)
class Splined:
    """Polynomials (k, 4, 4) in the four quaternion components, scaled to length 1: C2, and the same in every frame."""

    coefficients: np.ndarray

    def at(self, row, t):
        c, t = self.coefficients[row], t[:, None]
        q = ((c[:, 3] * t + c[:, 2]) * t + c[:, 1]) * t + c[:, 0]
        return q / np.linalg.norm(q, axis=1, keepdims=True)


@dataclass(frozen=True, eq=False)
class Blended:
    """From one even turning to another: `first` (k, 4) at the start with `turn_in` (k, 3), `last` (k, 4) at the end with `turn_out` (k, 3) rad.

    Both turnings go on beyond the corner, and 10 t^3 - 15 t^4 + 6 t^5 of the way from the one to the other is taken at each place. Its first and
    second derivatives are 0 at both ends, so that the rates of turning join there.
    """

    first: np.ndarray
    turn_in: np.ndarray
    last: np.ndarray
    turn_out: np.ndarray

    def at(self, row, t):
        t = t[:, None]
        one = multiply_wxyz(self.first[row], exp_wxyz(self.turn_in[row] * t))
        other = multiply_wxyz(self.last[row], exp_wxyz(self.turn_out[row] * (t - 1.0)))
        share = t**3 * (10.0 + t * (6.0 * t - 15.0))
        return multiply_wxyz(one, exp_wxyz(share * between(one, other)))


def splined_rate(table: Splined, row, t):
    """(N, 3) rad per unit of the parameter, in tool axes: 2 vec(conj(q) q') over |q|, since what changes the length of q does not turn."""
    c, t = table.coefficients[row], t[:, None]
    q = ((c[:, 3] * t + c[:, 2]) * t + c[:, 1]) * t + c[:, 0]
    slope = (3.0 * c[:, 3] * t + 2.0 * c[:, 2]) * t + c[:, 1]
    return 2.0 * multiply_wxyz(q * [1.0, -1.0, -1.0, -1.0], slope)[:, 1:] / np.sum(q * q, axis=1, keepdims=True)
