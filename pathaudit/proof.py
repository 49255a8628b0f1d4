"""What holds between the samples: certified bounds on every interval of an audited path, for the motion that between.py states."""

from dataclasses import dataclass
from functools import cached_property

import numpy as np

from . import between
from .conventions import frozen, owned
from .measures import Rates, tool_jacobians

MOTION = (
    "Between two samples each joint is taken to run along the smooth curve in time that has, at both, the position, speed and acceleration that were "
    "measured there. A controller may move otherwise."
)

CLOSE = 0.95  # of the least sigma_min of all samples: to this share the bound of the whole path is sought
SHARPENED = 200  # intervals, at most, of a block on which it is


@dataclass(frozen=True, eq=False)
class Proof:
    """Bounds on the K = N - 1 intervals between N samples, for n joints; NaN where no motion leads from sample to sample (not reached, a jump).

    position_low, position_high (K, n) rad or m; speed_share, acceleration_share (K, n) of the limits, the latter NaN where there is none: exact
    extremes of the motion, moved outwards by rounding. sigma_bound (K,): sigma_min is nowhere below it on the interval. sigma_least (K,): the least
    that was met, at sigma_time (K,) s, so that the true least lies between the two. against (K,): the threshold that both samples keep and that was to be
    proven, NaN where a sample is below sigma_min_fail already. stray_m, stray_rad (K,): the tool is nowhere farther than this from the straight line
    between the two poses, and from the least turn between them (of its axis, where the spin is free). points (K,): postures looked at inside.
    """

    rates: Rates
    position_low: np.ndarray
    position_high: np.ndarray
    speed_share: np.ndarray
    acceleration_share: np.ndarray
    sigma_bound: np.ndarray
    sigma_least: np.ndarray
    sigma_time: np.ndarray
    against: np.ndarray
    stray_m: np.ndarray
    stray_rad: np.ndarray
    points: np.ndarray

    @property
    def motion(self) -> str:
        """The motion that is meant, in words"""
        return MOTION

    @cached_property
    def known(self) -> np.ndarray:
        """(K,) bool: a motion leads from sample to sample"""
        return frozen(np.isfinite(self.sigma_bound), bool)

    @property
    def whole(self) -> tuple:
        """Of the whole path: sigma_min stays above the first, the tool within the second, m, and the third, rad, of the straight way; NaN where no motion is known."""
        if not self.known.any():
            return (np.nan,) * 3
        return float(np.nanmin(self.sigma_bound)), float(np.nanmax(self.stray_m)), float(np.nanmax(self.stray_rad))

    @cached_property
    def unproven(self) -> np.ndarray:
        """(K,) bool: sigma_min could be shown to stay neither above what was to be proven nor, where it was met below that, above sigma_min_fail."""
        fail = self.rates.motion.cell.thresholds.sigma_min_fail
        with np.errstate(invalid="ignore"):
            need = np.where(self.sigma_least >= self.against, self.against, fail)
            return frozen((self.sigma_bound < need) & (self.sigma_least >= fail) & np.isfinite(self.against), bool)

    def joints(self, k: int) -> between.Joints:
        """The joint motion on interval k alone"""
        return _motion(self.rates, slice(k, k + 1))

    def joints_at(self, k: int, time: float) -> np.ndarray:
        """(n,) rad or m, on interval k at `time`"""
        start = self.rates.motion.path.time
        return self.joints(k).at(np.array([0]), np.array([(time - start[k]) / (start[k + 1] - start[k])]))[0]


def _motion(rates, rows):
    """The joint motion on the intervals `rows`, with the closest postures where a pose was not reached, so that all of it is finite."""
    ends = slice(rows.start, rows.stop + 1)
    speed, acceleration = np.nan_to_num(rates.joint_speed[ends]), np.nan_to_num(rates.joint_acceleration[ends])
    return between.joints_between(rates.motion.path.time[ends], rates.motion.closest[ends], speed, acceleration)


def _blocks(count):
    """Slices of all intervals: a long path needs little more room than what is kept of it."""
    return [slice(start, min(start + between.BLOCK, count)) for start in range(0, count, between.BLOCK)]


def connected(rates: Rates) -> np.ndarray:
    """(N - 1,) bool: the samples at both ends were reached, the second by a motion from the first."""
    reached = rates.motion.reached
    known = reached[1:] & reached[:-1]
    known[[k - 1 for k in rates.motion.jumps if k > 0]] = False
    return known


def shares_of_halves(rates: Rates):
    """Speed and acceleration shares, the exact largest on the first and on the second half of each interval (2, K, n each); 0 where there is no motion."""
    arm, known = rates.motion.cell.arm, connected(rates)
    out = np.zeros((2, 2, len(known), arm.n))
    for rows in _blocks(len(known)):
        speed, acceleration = between.peaks_of_halves(_motion(rates, rows))
        out[0, :, rows], out[1, :, rows] = speed / arm.speed, acceleration / arm.acceleration
    out[:, :, ~known] = 0.0
    return out


def prove(rates: Rates) -> Proof:
    """The bounds of every interval."""
    known = connected(rates)
    lowest = CLOSE * np.nanmin(rates.sigma_min, initial=np.inf)
    blocks = [_block(rates, known[rows], rows, lowest) for rows in _blocks(len(known))]
    arrays = [np.concatenate(column) for column in zip(*blocks, strict=True)]
    for array in arrays[:-1]:
        array[~known] = np.nan
    return Proof(rates, *map(owned, arrays))


def _block(rates, known, rows, lowest):
    motion, cell = rates.motion, rates.motion.cell
    chain, length, limits = cell.chain, rates.characteristic_length, cell.thresholds
    part = _motion(rates, rows)
    h = part.span_s[:, None]
    speed, acceleration = between.peaks(part)
    low, high = between.span(part.position)
    both = slice(rows.start, rows.stop + 1)
    poses, jacobians, task = tool_jacobians(chain, length, motion.rows, motion.closest[both])
    sigma = np.stack([rates.sigma_min[both][:-1], rates.sigma_min[both][1:]], axis=1)
    least = np.where(known, sigma.min(axis=1), -1.0)
    warn, fail = limits.sigma_min_warn, limits.sigma_min_fail
    first, second = np.where(least >= warn, warn, np.where(least >= fail, fail, -np.inf)), np.where(least >= fail, fail, -np.inf)
    arms = between.lever_arms(chain, np.maximum(np.abs(low), np.abs(high)))
    pairs = np.stack([task[:-1], task[1:]], axis=1)

    def certify(k, goals):
        return between.certify(
            chain, length, motion.rows, part.part(k), arms[k], np.nan_to_num(sigma[k]), pairs[k], (speed * h)[k], (acceleration * h**2)[k], goals
        )  # fmt: skip

    found = certify(slice(None), np.stack([first, second], axis=1))
    # where it matters for what can be said of the whole path, the bound is brought close to the least that the samples have
    k = np.flatnonzero(known & (found.bound < lowest))[:SHARPENED]
    closer = certify(k, np.full((len(k), 2), lowest))
    found.bound[k], found.points[k] = np.maximum(found.bound[k], closer.bound), found.points[k] + closer.points
    time = motion.path.time[both][:-1] + found.where * part.span_s
    far, turned = between.stray(chain, motion.path.spin_free, part, poses, jacobians, speed * h, acceleration * h**2)
    against = np.where(np.isfinite(first), first, np.nan)
    return (
        low, high, speed / cell.arm.speed, acceleration / cell.arm.acceleration, found.bound, found.least, time, against, far, turned, found.points
    )  # fmt: skip
