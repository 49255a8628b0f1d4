"""Where the arm's joints stand in the world at each sample, for drawing it."""

from typing import NamedTuple

import numpy as np


class Skeleton(NamedTuple):
    """In m and world axes, M samples: points (M, n+2, 3), the origin of every joint, the flange, the tool point; roots (M, n, 3), where each
    joint's slide begins (for a joint that turns, its origin); axes (M, n, 3), the joints' directions; tool (M, 3, 4), the tool's pose."""

    points: np.ndarray
    roots: np.ndarray
    axes: np.ndarray
    tool: np.ndarray


def arm_facts(cell):
    """The arm of a cell as JSON values: what `skeleton` and space.js need beside the joints' positions, and the speed limits in rad/s or m/s."""
    chain = cell.arm.chain
    fixed = np.round(np.concatenate([chain.links, [cell.tool]])[:, :3], 12).tolist()
    return {"links": fixed[:-1], "tool": fixed[-1], "prismatic": np.asarray(chain.prismatic, dtype=bool).tolist(),
            "joint_speed": np.asarray(cell.arm.speed, dtype=float).tolist()}


def skeleton(facts, joints):
    """The Skeleton at joints (M, n), rad or m. A row of NaN gives NaN.

    facts: those of `arm_facts` and "base", the arm's pose in the world. links[k] leads to joint k, which turns about its z or slides along it.
    """
    joints, links, tool = np.asarray(joints, dtype=float), np.array(facts["links"]), np.array(facts["tool"])
    samples, n = joints.shape
    points, roots, axes = (np.empty((samples, count, 3)) for count in (n + 2, n, n))
    base = np.array(facts["base"])
    turned, at = (np.broadcast_to(part, (samples, *part.shape)) for part in (base[:3, :3], base[:3, 3]))
    for i in range(n):
        turned, at = _onward(turned, at, links[i])
        roots[:, i], axes[:, i] = at, turned[:, :, 2]
        if facts["prismatic"][i]:
            at = at + axes[:, i] * joints[:, i, None]
        else:
            turned = _turn(turned, joints[:, i])
        points[:, i] = at
    turned, points[:, n] = _onward(turned, at, links[n])
    turned, points[:, n + 1] = _onward(turned, points[:, n], tool)
    found = Skeleton(points, roots, axes, np.concatenate([turned, points[:, n + 1, :, None]], axis=2))
    for values in found:
        values[~np.isfinite(joints).all(axis=1)] = np.nan
    return found


def _turn(turned, angle):
    c, s = np.cos(angle)[:, None], np.sin(angle)[:, None]
    x, y = turned[:, :, 0], turned[:, :, 1]
    return np.stack([c * x + s * y, c * y - s * x, turned[:, :, 2]], axis=2)


def _onward(turned, at, link):
    return turned @ link[:, :3], at + turned @ link[:, 3]
