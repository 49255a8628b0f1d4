"""What is measured at each sample of a followed path: joint rates, nearness to singular, reserve, travel."""

from dataclasses import dataclass
from functools import cached_property

import numpy as np

from .conventions import frozen
from .motion import Motion


@dataclass(frozen=True, eq=False)
class Rates:
    """Measures at N samples for n joints; rows of NaN where the pose cannot be reached.

    joint_speed, joint_acceleration (N, n) rad or m, per second, from the Jacobian and the tool twist. speed_share,
    acceleration_share (N, n): of the limits, the latter NaN where there is none. between (N - 1, n): the mean joint speed over the
    interval as a share of the limit, which somewhere inside it is reached or passed. sigma_min (N,): smallest singular value of the
    task Jacobian whose linear rows are divided by characteristic_length (m). least_share (N,): the largest speed share when a surplus
    joint, if there is one, is used as well as it can be. tool_speed (N,) m/s, programmed. travel_left (N, n) rad or m, negative outside.
    """

    motion: Motion
    joint_speed: np.ndarray
    joint_acceleration: np.ndarray
    speed_share: np.ndarray
    acceleration_share: np.ndarray
    between: np.ndarray
    sigma_min: np.ndarray
    least_share: np.ndarray
    tool_speed: np.ndarray
    travel_left: np.ndarray
    characteristic_length: float

    @cached_property
    def reserve(self) -> np.ndarray:
        """(N,) the largest speed along the path that the joint speed limits allow over the programmed one; inf at rest.

        Exact: one division where the arm has as many joints as the task has rows, a small linear programme where it has more.
        """
        share = self.least_share
        if self.motion.joints.shape[1] > self.motion.rows + 1:
            share = self._least_shares()
        with np.errstate(divide="ignore"):
            return frozen(1.0 / share)

    @cached_property
    def tool_speed_limit(self) -> np.ndarray:
        """(N,) m/s, the largest tool speed along the path that the joint speed limits allow; NaN where the tool point rests."""
        with np.errstate(invalid="ignore"):
            return frozen(np.where(self.tool_speed > 1e-9, self.reserve * self.tool_speed, np.nan))

    @cached_property
    def singular_values(self) -> np.ndarray:
        """(N, min(rows, n)) of the scaled task Jacobian, largest first"""
        out = np.full((len(self.sigma_min), min(self.motion.rows, self.motion.joints.shape[1])), np.nan)
        ok = np.flatnonzero(self.motion.reached)
        if len(ok):
            out[ok] = np.linalg.svd(task_jacobians(self.motion, ok), compute_uv=False)
        return frozen(out)

    @property
    def sigma_max(self) -> np.ndarray:
        """(N,) largest singular value"""
        return self.singular_values[:, 0]

    @property
    def condition(self) -> np.ndarray:
        """(N,) sigma_max / sigma_min"""
        with np.errstate(divide="ignore"):
            return self.sigma_max / self.sigma_min

    @property
    def manipulability(self) -> np.ndarray:
        """(N,) the product of the singular values of the scaled task Jacobian (Yoshikawa 1985)"""
        return self.singular_values.prod(axis=1)

    @cached_property
    def lost_direction(self) -> np.ndarray:
        """(N, 6) unit vector in part axes, linear rows first (in characteristic lengths): the tool motion that costs most joint speed."""
        out = np.full((len(self.sigma_min), 6), np.nan)
        ok = np.flatnonzero(self.motion.reached)
        if len(ok):
            left, _, _ = np.linalg.svd(task_jacobians(self.motion, ok), full_matrices=False)
            out[ok] = in_part_axes(self.motion, ok, left[:, :, -1])
        return frozen(out)

    def _least_shares(self):
        from .capacity import largest_speed

        out = self.least_share.copy()
        speed = self.motion.cell.arm.speed
        ok = np.flatnonzero(self.motion.reached & (self.least_share > 0.0))
        jacobians = task_jacobians(self.motion, ok)
        demand = np.einsum("kij,kj->ki", jacobians, self.joint_speed[ok])
        for k, jacobian, v in zip(ok, jacobians, demand, strict=True):
            size = np.linalg.norm(v)
            if size > 0.0:
                out[k] = min(out[k], size / largest_speed(jacobian, v / size, speed))
        return out


def measure(motion: Motion) -> Rates:
    """All measures of a followed path."""
    from .kernels import rates

    path, cell = motion.path, motion.cell
    arm, length = cell.arm, cell.characteristic_length
    slope, bend = rates.derivatives(path.time, motion.closest)
    speed, acceleration, measures = rates.rates(
        cell.chain, length, motion.rows, arm.speed, motion.joints, motion.twist, motion.twist_rate, slope, bend
    )
    between = np.abs(np.diff(motion.joints, axis=0)) / np.diff(path.time)[:, None] / arm.speed
    left = np.minimum(motion.joints - arm.lower, arm.upper - motion.joints)
    arrays = (
        speed, acceleration, np.abs(speed) / arm.speed, np.abs(acceleration) / arm.acceleration, between, measures[:, 0], measures[:, 2],
        np.linalg.norm(motion.twist[:, :3], axis=1), left,
    )  # fmt: skip
    return Rates(motion, *(frozen(a) for a in arrays), length)


def task_jacobians(motion: Motion, samples) -> np.ndarray:
    """The task Jacobians (M, rows, n) at the samples (M,)."""
    return tool_jacobians(motion.cell.chain, motion.cell.characteristic_length, motion.rows, motion.closest[samples])[2]


def tool_jacobians(chain, length, rows, q):
    """Poses (M, 4, 4) and Jacobians (M, 6, n) in the chain's first frame at q (M, n), and the task Jacobians (M, rows, n): in tool axes, linear
    rows divided by the characteristic length."""
    from .kernels.linkage import locate

    poses, jacobians, _ = locate(*chain, q)
    turned = np.swapaxes(poses[:, :3, :3], 1, 2)
    linear = turned @ jacobians[:, :3] / length
    return poses, jacobians, np.concatenate([linear, turned @ jacobians[:, 3:]], axis=1)[:, :rows]


def in_part_axes(motion: Motion, samples, vectors) -> np.ndarray:
    """Task vectors (M, rows) in tool axes as (M, 6) in part axes."""
    from .kernels.linkage import poses

    turned = poses(*motion.cell.chain, motion.closest[samples])[:, :3, :3]
    full = np.zeros((len(vectors), 6))
    full[:, : vectors.shape[1]] = vectors
    return np.concatenate([np.einsum("kij,kj->ki", turned, full[:, :3]), np.einsum("kij,kj->ki", turned, full[:, 3:])], axis=1)
