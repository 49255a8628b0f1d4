"""The times that ceilings of tool speed and tool acceleration give to pieces of a path, in closed form for each piece.

Along a piece the speed rises and falls at one constant rate and does not pass one ceiling (a trapezoid over time, a triangle where the piece is
short). The rate leaves room for going round the bend: on a bend of curvature c the speed v stays below sqrt(0.8 A / c), and sqrt(A^2 - (v^2 c)^2), at
least 0.6 A, is left along the path, so that the whole acceleration never passes A. Squared speeds at the joins come from one sweep forwards and
one backwards (the two-pass rule of Bobrow, Dubowsky & Gibson 1985 for a limit that is constant on each piece), written as running minima.
"""

from dataclasses import dataclass

import numpy as np

from .corners import SIDEWAYS
from .pieces import Pieces
from .shapes import STILL


@dataclass(frozen=True)
class Ceilings:
    """speed m/s, acceleration m/s2 of the tool centre point; turn_speed rad/s, turn_acceleration rad/s2 of the tool, inf where none is set."""

    speed: float
    acceleration: float
    turn_speed: float = np.inf
    turn_acceleration: float = np.inf


@dataclass(frozen=True, eq=False)
class Phases:
    """Stretches of constant rate, in order.  piece (f,).  start (f,) m into the piece.  speed (f,) m/s at the start.  rate (f,) m/s2.  duration (f,) s > 0.

    Of a turn in place rad in the place of m.
    """

    piece: np.ndarray
    start: np.ndarray
    speed: np.ndarray
    rate: np.ndarray
    duration: np.ndarray


def limits(pieces: Pieces, ceilings: Ceilings):
    """(p,) the highest speed on each piece and (p,) the rate at which it may rise and fall there."""
    still = pieces.kind == STILL
    most, bent = np.where(still, 0.0, np.minimum(pieces.speed, ceilings.speed)), pieces.curvature
    with np.errstate(divide="ignore"):
        most = np.minimum(most, np.sqrt(SIDEWAYS * ceilings.acceleration / bent))
        most = np.minimum(most, ceilings.turn_speed / pieces.turning)
        most = np.minimum(most, np.sqrt(0.5 * ceilings.turn_acceleration / pieces.turning_change))
        rate = np.sqrt(np.maximum(ceilings.acceleration**2 - (most**2 * bent) ** 2, 0.0))
        uneven = np.where(pieces.turning_change > 0.0, 0.5, 1.0)
        rate = np.minimum(rate, uneven * ceilings.turn_acceleration / pieces.turning)
    return np.where(still, ceilings.turn_speed, most), np.where(still, ceilings.turn_acceleration, rate)


def phases(pieces: Pieces, ceilings: Ceilings) -> Phases:
    """How each piece is passed: faster, even, slower."""
    most, rate = limits(pieces, ceilings)
    length, top = pieces.length, most**2
    moving = length > 0.0
    safe = np.where(moving, rate, 1.0)
    gain = 2.0 * safe * length
    joins = np.concatenate([[0.0], np.where(pieces.stops, 0.0, np.minimum(top[:-1], top[1:])), [0.0]])
    joins = _reachable(_reachable(joins, gain)[::-1], gain[::-1])[::-1]
    start, end = joins[:-1], joins[1:]
    peak = np.maximum(np.minimum(top, 0.5 * (start + end) + safe * length), np.maximum(start, end))
    peak = np.where(moving, peak, 0.0)
    v0, v1, v = np.sqrt(start), np.sqrt(end), np.sqrt(peak)
    up, down = (peak - start) / (2.0 * safe), (peak - end) / (2.0 * safe)
    even = np.maximum(length - up - down, 0.0)
    duration = np.stack([(v - v0) / safe, np.where(moving, even / np.where(v > 0.0, v, 1.0), pieces.dwell), (v - v1) / safe], axis=1)
    begin = np.stack([np.zeros_like(up), up, up + even], axis=1)
    speed, change = np.stack([v0, v, v], axis=1), np.stack([rate, np.zeros_like(rate), -rate], axis=1)
    number = np.broadcast_to(np.arange(len(length))[:, None], duration.shape)
    kept = duration > 0.0
    return Phases(number[kept], begin[kept], speed[kept], change[kept], duration[kept])


def _reachable(squares, gain):
    """The largest squared speeds below `squares` (p + 1,) of which each is at most `gain` (p,) above the one before.

    w_k = min over j <= k of squares_j + the gains from j to k: a running minimum.
    """
    total = np.concatenate([[0.0], np.cumsum(gain)])
    return np.minimum(total + np.minimum.accumulate(squares - total), squares)
