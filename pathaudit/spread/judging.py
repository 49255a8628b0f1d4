"""Many draws of a cell through the audit's own following, measures and bounds, at the samples of its path.

A draw costs a kernel call or a few, which let other threads run; what remains is done for a few draws at once. A draw's numbers depend on nothing but
the draw, so that any number of threads, processes or machines of one kind gives the same bits.
"""

from dataclasses import dataclass

import numpy as np

from ..arm import Chain, unit_of
from ..findings import PEAK, RULES, TRAVEL_SLACK
from ..measures import task_jacobians
from ..motion import pose_distance

TOGETHER = 5_000  # samples of draws that are worked on at once: their arrays stay in a core's cache
PIECE = 2000  # samples of one kernel call, so that it does not share itself out to the cores
NEAR = 1e-4  # sigma_min below which the followed motion itself decides what the Jacobian cannot tell


@dataclass(frozen=True)
class Watched:
    """What is judged in a draw: a kind of finding, of one joint (number) or of the whole path (None).

    The level of a draw is its worst over the path, flagged where it passes warn or fail upwards (sense 1) or downwards (-1); either may be None.
    scale, unit: what a level is multiplied with to be shown.
    """

    kind: str
    joint: int | None
    sense: float
    warn: float | None
    fail: float | None
    scale: float
    unit: str

    def beyond(self, levels, severity) -> np.ndarray:
        """bool for each level: at least a finding of this severity, "warn" or "fail"."""
        bounds = [bound for bound in ((self.fail,) if severity == "fail" else (self.warn, self.fail)) if bound is not None]
        with np.errstate(invalid="ignore"):
            return np.any([self.sense * np.asarray(levels) > self.sense * bound for bound in bounds] or [np.zeros(np.shape(levels), bool)], axis=0)


def watched(rates) -> tuple:
    """All that the audit's rules judge, unreachable samples and posture jumps first."""
    arm = rates.motion.cell.arm
    out = [Watched(kind, None, 1.0, None, 0.0, 1.0, words) for kind, words in (("unreachable", "samples"), ("posture jump", "jumps"))]
    for rule in RULES:
        for joint in range(arm.n) if rule.joints else (None,):
            warn, fail = rule.bounds(rates, joint)
            judged = rule.kind != "joint acceleration" or np.isfinite(arm.acceleration[joint])
            if judged and not (warn is None and fail is None):
                scale, unit = _shown(rule.kind, arm, joint)
                out.append(Watched(rule.kind, joint, rule.sense, warn, fail, scale, unit))
    return tuple(out)


def _shown(kind, arm, joint):
    if kind == "joint travel":
        scale, unit = unit_of(arm, joint)
        return scale, f"{unit} left"
    return {"near-singular": (1.0, ""), "tool speed": (1.0, "mm/s")}.get(kind, (100.0, "% of the limit"))


@dataclass(frozen=True, eq=False)
class Course:
    """All that a draw needs beside its chain, as plain arrays, so that it can be sent to another process.

    keep (K,): the samples whose sigma_min and speed shares are kept. joints (N, n), jacobians (N, n, n), sigma (N,), weights (N, 4): the followed path of the cell as
    stated, from which draws are solved; of no samples where it was not followed smoothly, or has not as many joints as its task has rows.
    """

    prismatic: np.ndarray
    length: float
    rows: int
    lower: np.ndarray
    upper: np.ndarray
    speed: np.ndarray
    acceleration: np.ndarray
    time: np.ndarray
    along: np.ndarray
    position: np.ndarray
    rotation: np.ndarray
    lay: np.ndarray
    twist: np.ndarray
    twist_rate: np.ndarray
    start: np.ndarray
    allow: np.ndarray
    watched: tuple
    keep: np.ndarray
    joints: np.ndarray
    jacobians: np.ndarray
    sigma: np.ndarray
    weights: np.ndarray

    @classmethod
    def of(cls, audit, keep=()) -> "Course":
        from ..kernels import rates

        path, cell, motion = audit.path, audit.cell, audit.motion
        arm, length, limits = cell.arm, cell.characteristic_length, cell.thresholds
        along = pose_distance(path, length)
        allow = limits.deviation_mm / 1000.0, np.radians(limits.deviation_deg)
        arrays = (arm.lower, arm.upper, arm.speed, arm.acceleration, path.time, along, path.position, path.rotation,
                  rates.twists(along, path.position, path.rotation)[0], motion.twist, motion.twist_rate, motion.closest[0], allow)  # fmt: skip
        # kernels take no read-only arrays, and a copy for every draw would cost as much as an eighth of its work
        return cls(np.array(cell.chain.prismatic), length, motion.rows, *(np.array(a, dtype=float, order="C") for a in arrays),
                   watched(audit.rates), np.asarray(keep, dtype=int), *_known(audit, along))  # fmt: skip

    def near(self, links, joints, rate, change, sigma) -> bool:
        """Fill joints, rate, change (N, n) and sigma (N,) from the cell as stated; False where the path has to be followed anew."""
        from ..kernels import draws

        if not len(self.joints):
            return False
        path = self.position, self.rotation, self.twist, self.twist_rate
        return draws.draw(Chain(links, self.prismatic), self.length, self.weights, path, self.joints, self.jacobians, self.sigma, joints, rate, change, sigma)

    def follow(self, links):
        """joints (N, n), NaN where not reached; closest (N, n); outcome (N,)"""
        from ..kernels import steps

        closest, outcome, _ = steps.follow(
            Chain(links, self.prismatic), self.length, self.rows, (self.lower, self.upper), self.along, self.position, self.rotation, self.lay,
            self.start, self.allow,
        )  # fmt: skip
        lost = outcome == steps.UNREACHED
        return (np.where(lost[:, None], np.nan, closest) if lost.any() else closest), closest, outcome

    def rates(self, links, joints, closest):
        """Joint speeds and accelerations (N, n) at the programmed speed, and sigma_min (N,)."""
        from ..kernels import rates

        chain = Chain(links, self.prismatic)
        still = np.zeros_like(joints)
        slope, bend = (still, still) if joints.shape[1] == self.rows else rates.derivatives(self.time, closest)
        out = self._pieces(chain, joints, slope, bend)
        if slope is still and np.fmin.reduce(out[2]) <= NEAR:
            out = self._pieces(chain, joints, *rates.derivatives(self.time, closest))
        return out

    def _pieces(self, chain, joints, slope, bend):
        from ..kernels import rates

        given, out = (joints, self.twist, self.twist_rate, slope, bend), []
        for first in range(0, len(joints), PIECE):
            piece = slice(first, first + PIECE)
            out.append(rates.rates(chain, self.length, self.rows, self.speed, *(a[piece] for a in given)))
        speed, acceleration, measures = out[0] if len(out) == 1 else (np.concatenate(parts) for parts in zip(*out, strict=True))
        return speed, acceleration, measures[:, 0]


def _known(audit, along):
    """joints, jacobians, sigma_min and weights of the cell as stated, of no samples where draws cannot be solved from there"""
    from ..kernels.draws import BEFORE, foretelling
    from ..kernels.steps import REACHED

    motion, n = audit.motion, audit.cell.arm.n
    if n != motion.rows or (motion.outcome != REACHED).any():
        return np.empty((0, n)), np.empty((0, n, n)), np.empty(0), np.empty((0, BEFORE))
    jacobians = task_jacobians(motion, slice(None))
    return tuple(np.array(a, dtype=float, order="C") for a in (motion.joints, jacobians, audit.rates.sigma_min, foretelling(along)))


@dataclass(frozen=True, eq=False)
class Judged:
    """levels (M, L) of what is watched in M draws; at the samples kept sigma (M, K), sigma_min, 0 where not reached, and share (M, K, n), the speed
    shares, infinite there; both float32."""

    levels: np.ndarray
    sigma: np.ndarray
    share: np.ndarray


def judge(course: Course, links, speed) -> Judged:
    """Judge draws of chains `links` (M, n + 1, 4, 4) run at `speed` (M,) times the programmed one."""
    step = max(1, TOGETHER // len(course.time))
    parts = [_few(course, links[first : first + step], speed[first : first + step]) for first in range(0, len(links), step)]
    return Judged(*map(np.concatenate, zip(*parts, strict=True)))


def _few(course, links, speed):
    draws, samples, n = len(links), len(course.time), len(course.speed)
    joints, rate, change = (np.empty((draws, samples, n)) for _ in range(3))
    sigma, outcome = np.empty((draws, samples)), np.zeros((draws, samples), np.uint8)
    for k in range(draws):
        if not course.near(links[k], joints[k], rate[k], change[k], sigma[k]):
            joints[k], closest, outcome[k] = course.follow(links[k])
            rate[k], change[k], sigma[k] = course.rates(links[k], joints[k], closest)
    rate, change = np.abs(rate, out=rate), np.abs(change, out=change)
    columns = _levels(course, joints, outcome, sigma, rate, change, speed)
    levels = np.stack([columns[w.kind] if w.joint is None else columns[w.kind][:, w.joint] for w in course.watched], axis=1)
    every = len(course.keep) == samples
    low, share = (a.astype(np.float32) if every else a[:, course.keep].astype(np.float32) for a in (sigma, rate))
    share *= (speed[:, None] / course.speed)[:, None].astype(np.float32)
    if outcome.any():
        low[np.isnan(low)], share[np.isnan(share)] = 0.0, np.inf
    return levels, low, share


def _levels(course, joints, outcome, sigma, rate, change, speed):
    """kind -> (M,) or (M, n), the worst over the path; NaN where nothing was reached. rate, change: sizes of joint speeds and accelerations."""
    from ..kernels.steps import JUMPED, UNREACHED

    lost, jumped = outcome == UNREACHED, outcome == JUMPED
    jumps = jumped.copy()
    jumps[:, 0] = False
    jumps[:, 1:] &= ~lost[:, :-1]
    least, most = (np.fmin, np.fmax) if lost.any() else (np.minimum, np.maximum)
    left = np.minimum(_over_path(least, joints) - course.lower, course.upper - _over_path(most, joints))
    peaks = np.maximum(_over_path(most, rate), _hidden(course, joints, jumped, rate))  # NaN stays
    tool = np.linalg.norm(course.twist[:, :3], axis=1).max() * 1000.0
    return {
        "unreachable": lost.sum(axis=1).astype(float), "posture jump": jumps.sum(axis=1).astype(float),
        "near-singular": least.reduce(sigma, axis=1), "joint travel": np.where(np.abs(left) < TRAVEL_SLACK, 0.0, left),
        "joint speed": peaks * (speed[:, None] / course.speed), "joint acceleration": _over_path(most, change) * (speed[:, None] ** 2 / course.acceleration),
        "tool speed": tool * speed,
    }  # fmt: skip


def _hidden(course, joints, jumped, rate):
    """(M, n) the largest mean joint speed over an interval that shows a peak hidden in it, as in findings.peak_share; 0 where none does."""
    between = np.abs(np.diff(joints, axis=1))
    between *= np.repeat(1.0 / np.diff(course.time), joints.shape[2]).reshape(-1, joints.shape[2])
    beside = np.maximum(rate[:, 1:], rate[:, :-1])
    beside *= PEAK
    with np.errstate(invalid="ignore"):
        hidden = between > beside
    if jumped.any():
        hidden &= ~jumped[:, 1:, None]
    return np.where(hidden, between, 0.0).max(axis=1) if hidden.any() else np.zeros((len(joints), joints.shape[2]))


def _over_path(reach, values):
    """(M, n) reach.reduce of values (M, N, n) over the samples, half against half: N short loops over n would take most of the time of all this."""
    while values.shape[1] > 8:
        half = values.shape[1] // 2
        rest = values[:, 2 * half :]
        values = reach(values[:, :half], values[:, half : 2 * half])
        if rest.shape[1]:
            values[:, :1] = reach(values[:, :1], rest)
    return reach.reduce(values, axis=1)
