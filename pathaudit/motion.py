"""Following a path: the joint motion that keeps the tool on it, sample by sample, and what happened where it could not."""

from collections.abc import Mapping
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from .arm import Chain
from .cell import Cell
from .conventions import frozen
from .taskpath import Path

TURN = 2.0 * np.pi
STARTS = 64  # random starts for the postures of the first pose; seeded, so that the same input gives the same answer
TRIED = 400  # samples of the path on which postures are compared


@dataclass(frozen=True, eq=False)
class Motion:
    """The joint motion along a path of N samples, for n joints.

    joints (N, n) rad or m, rows of NaN where the pose cannot be reached; closest (N, n), the same with the closest posture there.
    outcome (N,) one of kernels.steps.REACHED, CROSSED, JUMPED, UNREACHED. deviation_m, deviation_rad (N,): what is left to the pose.
    rows: 6, or 5 where the spin about the tool axis is free. twist, twist_rate (N, 6): the tool's motion in part axes.
    start_reason: why it starts in this posture.
    """

    path: Path
    cell: Cell
    joints: np.ndarray
    closest: np.ndarray
    outcome: np.ndarray
    deviation_m: np.ndarray
    deviation_rad: np.ndarray
    rows: int
    twist: np.ndarray
    twist_rate: np.ndarray
    start_reason: str

    @cached_property
    def reached(self) -> np.ndarray:
        """(N,) bool"""
        from .kernels.steps import UNREACHED

        return frozen(self.outcome != UNREACHED, bool)

    @cached_property
    def jumps(self) -> tuple:
        """Numbers of the samples that were reached, though not by a continuous motion from the sample before."""
        from .kernels.steps import JUMPED

        return tuple(int(k) for k in np.flatnonzero(self.outcome == JUMPED))

    @cached_property
    def reasons(self) -> Mapping:
        """For each sample that cannot be reached, a sentence."""
        return {int(k): self.reason(int(k)) for k in np.flatnonzero(~self.reached)}

    def reason(self, k: int) -> str:
        """Why sample k cannot be reached, in a sentence."""
        from .kernels.linkage import locate

        far, turned = self.deviation_m[k] * 1000.0, np.degrees(self.deviation_rad[k])
        short = f"{far:.0f}" if far >= 100.0 else f"{far:.3g}"
        off = f"at the closest the tool stays {short} mm and {turned:.2g} deg off the path"
        n = self.cell.arm.n
        if n < self.rows:
            return f"An arm with {n} joints cannot hold all {self.rows} directions of this task; {off}."
        pose, _, points = locate(*self.cell.chain, self.closest[k : k + 1])
        shoulder = points[0, min(1, n - 1)]
        wanted, got = np.linalg.norm(self.path.position[k] - shoulder), np.linalg.norm(pose[0, :3, 3] - shoulder)
        if far < 0.1:
            return f"The tool can stand there, but not at this angle; {off}."
        side = f"too far away by {short} mm" if wanted > got else f"inside the arm's inner bound by {short} mm"
        return f"The pose is {side}: {wanted * 1000:.0f} mm from joint {self.cell.arm.joint_names[min(1, n - 1)]}; {off}."


def follow(path: Path, cell: Cell, *, start=None, start_reason="") -> Motion:
    """Follow `path` with the arm of `cell` by damped Jacobian pseudo-inverse steps.

    start (n,) rad or m: the posture to start near; else cell.start; else of all postures found for the first pose the one with the
    best worst reserve over the path. start_reason: the sentence to give for a start that is known to fit.
    """
    from .kernels import rates, steps

    twist, twist_rate = rates.twists(path.time, path.position, path.rotation)
    along = pose_distance(path, cell.characteristic_length)
    lay = rates.twists(along, path.position, path.rotation)[0]
    task = _Task(path, cell, 5 if path.spin_free else 6, twist, twist_rate, along, lay)
    start = cell.start if start is None else np.asarray(start, dtype=float)
    first, reason = task.best_posture() if start is None else task.posture_near(start)
    reason = start_reason or reason
    closest, outcome, left = task.follow(first, slice(None))
    joints = np.where((outcome == steps.UNREACHED)[:, None], np.nan, closest)
    return Motion(
        path, cell, frozen(joints), frozen(closest), frozen(outcome, np.uint8), frozen(left[:, 0]), frozen(left[:, 1]), task.rows,
        frozen(twist), frozen(twist_rate), reason,
    )  # fmt: skip


def pose_distance(path: Path, length: float) -> np.ndarray:
    """(N,) strictly increasing: how far the poses have moved and turned, in units of `length` and radians.

    The parameter that a path is followed by. What lies between two samples then depends on the poses alone: other times for the same
    poses never change the way that the joints take.
    """
    moved = np.linalg.norm(np.diff(path.position, axis=0), axis=1) / length
    half = np.linalg.norm(np.diff(path.rotation, axis=0), axis=(1, 2)) / np.sqrt(8.0)
    steps = moved + 2.0 * np.arcsin(np.minimum(half, 1.0))
    least = 1e-6 * steps.mean() or 1.0  # for dwells, which do not move at all
    return np.concatenate([[0.0], np.cumsum(np.maximum(steps, least))])


@dataclass(frozen=True, eq=False)
class _Task:
    """A path to follow with a cell: the search for the posture to start in.

    along (N,) and lay (N, 6): the pose distance and the tool's motion by it, between whose values the path is interpolated.
    """

    path: Path
    cell: Cell
    rows: int
    twist: np.ndarray
    twist_rate: np.ndarray
    along: np.ndarray
    lay: np.ndarray

    @property
    def chain(self) -> Chain:
        return self.cell.chain

    def follow(self, start, samples):
        from .kernels import steps

        path, cell = self.path, self.cell
        allow = np.array([cell.thresholds.deviation_mm / 1000.0, np.radians(cell.thresholds.deviation_deg)])
        return steps.follow(
            self.chain, cell.characteristic_length, self.rows, (cell.arm.lower, cell.arm.upper), self.along[samples],
            path.position[samples], path.rotation[samples], self.lay[samples], start, allow,
        )  # fmt: skip

    def solve(self, seeds):
        from .kernels import steps

        return steps.solve(self.chain, self.cell.characteristic_length, self.rows, self.path.position[0], self.path.rotation[0], seeds)

    def solved(self, left):
        """Which of left (M, 2) are solutions; an arm with fewer joints than rows can only come close to poses that were rounded."""
        from .kernels import steps

        return left.max(axis=1) < (1e-9 if self.cell.arm.n >= self.rows else steps.LOOSE)

    def posture_near(self, start):
        """The solution of the first pose next to `start`, and the reason to give for it."""
        joints, left = self.solve(start[None])
        near, reached = joints[0], self.solved(left)[0]
        if reached and np.abs(near - start).max() <= 1.0:
            return near, "Starts near the stated start posture."
        found = self.postures()
        if len(found):
            found = found + TURN * np.round((start - found) / TURN) * ~self.cell.arm.prismatic
            best = found[np.argmin(np.abs(found - start).max(axis=1))]
            if not reached or np.abs(best - start).max() < np.abs(near - start).max():
                return best, f"Starts in the posture nearest to the stated one, of {len(found)} found for the first pose."
        if reached:
            return near, "Starts near the stated start posture."
        return near, "The first pose cannot be reached; the motion starts as close to it as the arm comes from the stated start posture."

    def seeds(self):
        arm, rng = self.cell.arm, np.random.default_rng(20)
        lower = np.where(np.isfinite(arm.lower), np.maximum(arm.lower, -np.pi), -np.pi)
        upper = np.where(np.isfinite(arm.upper), np.minimum(arm.upper, np.pi), np.pi)
        turned = lower >= upper  # a travel that lies outside one turn about zero
        lower, upper = np.where(turned, arm.lower, lower), np.where(turned, arm.upper, upper)
        return lower + (upper - lower) * rng.random((STARTS, arm.n))

    def postures(self):
        """The distinct joint solutions (M, n) of the first pose, each joint turned to lie in its travel where it can."""
        joints, left = self.solve(self.seeds())
        joints = joints[self.solved(left)]
        distinct = []
        for q in (self.into_travel(q, q, q) for q in joints):
            if all(np.abs(_apart(q, other, self.cell.arm.prismatic)).max() > (1e-3 if self.rows >= len(q) else 0.5) for other in distinct):
                distinct.append(q)
        return np.array(distinct[:24]).reshape(-1, self.cell.arm.n)

    def into_travel(self, q, low, high):
        """q moved by full turns so that low..high (n,), where the joints go to, lies best inside the travel."""
        arm = self.cell.arm
        free = ~arm.prismatic & np.isfinite(arm.lower) & np.isfinite(arm.upper)
        middle = (np.where(free, arm.lower, 0.0) + np.where(free, arm.upper, 0.0)) / 2.0
        turns = np.round((middle - (low + high) / 2.0) / TURN)
        return q + TURN * np.where(arm.prismatic, 0.0, turns)

    def best_posture(self):
        """The posture of the first pose with the best worst reserve over the path, and the reason to give for it."""
        found = self.postures()
        if len(found) == 0:
            joints, left = self.solve(self.seeds())
            best = np.argmin(left[:, 0] / self.cell.characteristic_length + left[:, 1])
            return joints[best], f"The first pose cannot be reached; the motion starts as close to it as was found from {STARTS} starts."
        if len(found) == 1:
            return self.judged(found[0])[1], "Starts in the only posture found for the first pose."
        judged = [self.judged(q) for q in found]
        best = min(range(len(found)), key=lambda i: judged[i][0])
        samples = "all samples" if self.path.samples <= TRIED else f"{TRIED} of the samples"
        return judged[best][1], f"Starts in the posture with the best worst reserve of {len(found)} found for the first pose, compared on {samples}."

    def judged(self, start):
        """A score of following the path from `start`, smaller is better, and the start moved by full turns to suit the travel."""
        from .kernels import rates, steps

        arm = self.cell.arm
        count = min(TRIED, self.path.samples)
        samples = np.unique(np.linspace(0, self.path.samples - 1, count).astype(int))
        joints, outcome, _ = self.follow(start, samples)
        low, high = joints.min(axis=0), joints.max(axis=0)
        moved = self.into_travel(start, low, high)
        left = np.minimum(low + moved - start - arm.lower, arm.upper - (high + moved - start))
        zero = np.zeros_like(joints)
        _, _, measures = rates.rates(
            self.chain, self.cell.characteristic_length, self.rows, arm.speed, joints, self.twist[samples], self.twist_rate[samples], zero, zero
        )
        limits = self.cell.thresholds
        wanted = limits.travel_warn(arm.prismatic)
        # each of the three is 1 where its own limit or bound is just met
        near = limits.sigma_min_fail / np.maximum(measures[:, 0], 1e-12)
        worst = max(measures[:, 1].max(), near.max(), (wanted / np.maximum(left, 1e-12)).max())
        lost, jumps = int((outcome == steps.UNREACHED).sum()), int((outcome == steps.JUMPED).sum())
        return (lost, jumps, round(max(0.0, -left.min()), 6), worst), moved


def _apart(a, b, prismatic):
    difference = a - b
    return np.where(prismatic, difference, (difference + np.pi) % TURN - np.pi)
