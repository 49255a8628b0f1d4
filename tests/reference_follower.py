"""A follower of paths in plain NumPy, by small full Newton steps: slow, short, and independent of the kernels that it checks."""

import numpy as np


def pose_and_jacobian(chain, q):
    """(4, 4) and (6, n), linear rows first, at the chain's end in the axes of its first frame."""
    pose, axes, origins = chain.links[0], [], []
    for i, slides in enumerate(chain.prismatic):
        axes.append(pose[:3, 2])
        origins.append(pose[:3, 3])
        move = np.eye(4)
        if slides:
            move[2, 3] = q[i]
        else:
            move[:2, :2] = [[np.cos(q[i]), -np.sin(q[i])], [np.sin(q[i]), np.cos(q[i])]]
        pose = pose @ move @ chain.links[i + 1]
    columns = [
        np.r_[axis, np.zeros(3)] if slides else np.r_[np.cross(axis, pose[:3, 3] - origin), axis]
        for axis, origin, slides in zip(axes, origins, chain.prismatic, strict=True)
    ]
    return pose, np.array(columns).T


def turn_between(a, b):
    """Rotation vector (3,) that takes a (3, 3) to b, in the fixed axes; for turns well below half a revolution."""
    r = b @ a.T
    sine = np.array([r[2, 1] - r[1, 2], r[0, 2] - r[2, 0], r[1, 0] - r[0, 1]]) / 2.0
    size = np.linalg.norm(sine)
    return sine if size < 1e-12 else sine * np.arctan2(size, (np.trace(r) - 1.0) / 2.0) / size


def left_to(pose, target, rows):
    """What is left from a pose to a target, (rows,) in tool axes; five rows leave out the turn about the tool's +Z."""
    linear = pose[:3, :3].T @ (target[:3, 3] - pose[:3, 3])
    if rows == 6:
        return np.r_[linear, pose[:3, :3].T @ turn_between(pose[:3, :3], target[:3, :3])]
    axis = pose[:3, :3].T @ target[:3, 2]
    return np.r_[linear, np.cross([0.0, 0.0, 1.0], axis)[:2]]


def follow(chain, targets, start, rows=6):
    """Joints (N, n) through poses (N, 4, 4) that lie close together, each from the one before by least-norm steps to 1e-12."""
    q, joints = np.array(start, dtype=float), []
    for target in targets:
        for _ in range(20):
            pose, jacobian = pose_and_jacobian(chain, q)
            error = left_to(pose, target, rows)
            if np.abs(error).max() < 1e-12:
                break
            turn = pose[:3, :3].T
            q = q + np.linalg.pinv(np.vstack([turn @ jacobian[:3], turn @ jacobian[3:]])[:rows]) @ error
        joints.append(q)
    return np.array(joints)
