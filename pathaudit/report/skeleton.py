"""Where the arm's joints stand in the world at each sample, for drawing it."""

import numpy as np


def joint_points(chain, placement, tool, joints):
    """Points (M, n+2, 3) in m: the origin of every joint, the flange, the tool centre point; and axes (M, n, 3), each joint's direction.

    chain: links (n+1, 4, 4) and prismatic (n,) from base to flange; placement (4, 4) base in world; tool (4, 4) in the flange;
    joints (M, n) in rad or m. A row of NaN gives NaN. All in world axes; a sliding joint's origin is taken after its slide.
    """
    links, prismatic = np.asarray(chain.links, dtype=float), np.asarray(chain.prismatic, dtype=bool)
    samples, n = joints.shape
    points, axes = np.empty((samples, n + 2, 3)), np.empty((samples, n, 3))
    start = placement @ links[0]
    turned, at = np.broadcast_to(start[:3, :3], (samples, 3, 3)), np.broadcast_to(start[:3, 3], (samples, 3))
    for i in range(n):
        axis = turned[:, :, 2]
        if prismatic[i]:
            at = at + axis * joints[:, i, None]
        else:
            turned = _turn(turned, joints[:, i])
        points[:, i], axes[:, i] = at, axis
        turned, at = _onward(turned, at, links[i + 1])
    points[:, n] = at
    points[:, n + 1] = _onward(turned, at, tool)[1]
    bad = ~np.isfinite(joints).all(axis=1)
    points[bad] = axes[bad] = np.nan
    return points, axes


def _turn(turned, angle):
    c, s = np.cos(angle)[:, None], np.sin(angle)[:, None]
    x, y = turned[:, :, 0], turned[:, :, 1]
    return np.stack([c * x + s * y, c * y - s * x, turned[:, :, 2]], axis=2)


def _onward(turned, at, link):
    return turned @ link[:3, :3], at + turned @ link[:3, 3]
