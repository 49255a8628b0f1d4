"""Pose and Jacobian of a serial chain: frames multiplied from the part to the tool.

A chain of n joints is `links` (n+1, 4, 4), the fixed transforms, and `prismatic` (n,) uint8. Joint i turns about, or slides along, the
local +z that stands after links[i]; its pose is links[0] Z(q0) links[1] ... Z(q[n-1]) links[n].
"""

from math import cos, sin

import numpy as np

from .compiled import dense, helper, kernel


@helper
def place(links, prismatic, q, axes, origins, tool):
    """Fill axes (n, 3) and origins (n, 3) of the joints and tool (3, 4), the pose of the chain's end, all in the chain's first frame."""
    n = prismatic.shape[0]
    m = links[0]
    r00, r01, r02, x = m[0, 0], m[0, 1], m[0, 2], m[0, 3]
    r10, r11, r12, y = m[1, 0], m[1, 1], m[1, 2], m[1, 3]
    r20, r21, r22, z = m[2, 0], m[2, 1], m[2, 2], m[2, 3]
    for i in range(n):
        axes[i, 0], axes[i, 1], axes[i, 2] = r02, r12, r22
        origins[i, 0], origins[i, 1], origins[i, 2] = x, y, z
        if prismatic[i]:
            x += r02 * q[i]
            y += r12 * q[i]
            z += r22 * q[i]
        else:
            c, s = cos(q[i]), sin(q[i])
            r00, r01 = c * r00 + s * r01, c * r01 - s * r00
            r10, r11 = c * r10 + s * r11, c * r11 - s * r10
            r20, r21 = c * r20 + s * r21, c * r21 - s * r20
        m = links[i + 1]
        m00, m10, m20 = m[0, 0], m[1, 0], m[2, 0]
        m01, m11, m21 = m[0, 1], m[1, 1], m[2, 1]
        m02, m12, m22 = m[0, 2], m[1, 2], m[2, 2]
        px, py, pz = m[0, 3], m[1, 3], m[2, 3]
        x += r00 * px + r01 * py + r02 * pz
        y += r10 * px + r11 * py + r12 * pz
        z += r20 * px + r21 * py + r22 * pz
        r00, r01, r02 = r00 * m00 + r01 * m10 + r02 * m20, r00 * m01 + r01 * m11 + r02 * m21, r00 * m02 + r01 * m12 + r02 * m22
        r10, r11, r12 = r10 * m00 + r11 * m10 + r12 * m20, r10 * m01 + r11 * m11 + r12 * m21, r10 * m02 + r11 * m12 + r12 * m22
        r20, r21, r22 = r20 * m00 + r21 * m10 + r22 * m20, r20 * m01 + r21 * m11 + r22 * m21, r20 * m02 + r21 * m12 + r22 * m22
    tool[0, 0], tool[0, 1], tool[0, 2], tool[0, 3] = r00, r01, r02, x
    tool[1, 0], tool[1, 1], tool[1, 2], tool[1, 3] = r10, r11, r12, y
    tool[2, 0], tool[2, 1], tool[2, 2], tool[2, 3] = r20, r21, r22, z


@helper
def columns(prismatic, axes, origins, tool, jacobian):
    """Fill jacobian (6, n), linear rows first, at the tool point in the axes of the chain's first frame."""
    px, py, pz = tool[0, 3], tool[1, 3], tool[2, 3]
    for i in range(prismatic.shape[0]):
        ax, ay, az = axes[i, 0], axes[i, 1], axes[i, 2]
        if prismatic[i]:
            jacobian[0, i], jacobian[1, i], jacobian[2, i] = ax, ay, az
            jacobian[3, i], jacobian[4, i], jacobian[5, i] = 0.0, 0.0, 0.0
        else:
            dx, dy, dz = px - origins[i, 0], py - origins[i, 1], pz - origins[i, 2]
            jacobian[0, i], jacobian[1, i], jacobian[2, i] = ay * dz - az * dy, az * dx - ax * dz, ax * dy - ay * dx
            jacobian[3, i], jacobian[4, i], jacobian[5, i] = ax, ay, az


@kernel("void(f8[:,:,::1], u1[::1], f8[:,::1], f8[:,:,::1], f8[:,:,::1], f8[:,:,::1])")
def _locate(links, prismatic, q, poses, jacobians, points):
    n = prismatic.shape[0]
    axes, origins, tool = np.empty((n, 3)), np.empty((n, 3)), np.empty((3, 4))
    for k in range(q.shape[0]):
        place(links, prismatic, q[k], axes, origins, tool)
        for i in range(3):
            for j in range(4):
                poses[k, i, j] = tool[i, j]
        poses[k, 3, 0], poses[k, 3, 1], poses[k, 3, 2], poses[k, 3, 3] = 0.0, 0.0, 0.0, 1.0
        columns(prismatic, axes, origins, tool, jacobians[k])
        for i in range(n):
            for j in range(3):
                points[k, i, j] = origins[i, j]


def locate(links, prismatic, q):
    """Poses (M, 4, 4), Jacobians (M, 6, n) and joint origins (M, n, 3) of the chain at q (M, n), in the chain's first frame."""
    links, prismatic, q = dense(links), dense(prismatic, np.uint8), dense(q)
    n = prismatic.shape[0]
    if links.shape != (n + 1, 4, 4):
        raise ValueError(f"links have shape {links.shape}, expected {(n + 1, 4, 4)} for {n} joints")
    if q.ndim != 2 or q.shape[1] != n:
        raise ValueError(f"joint positions have shape {q.shape}, expected (M, {n})")
    m = q.shape[0]
    poses, jacobians, points = np.empty((m, 4, 4)), np.empty((m, 6, n)), np.empty((m, n, 3))
    _locate(links, prismatic, q, poses, jacobians, points)
    return poses, jacobians, points


def poses(links, prismatic, q):
    """Poses (M, 4, 4) of the chain's end at q (M, n), in the chain's first frame."""
    return locate(links, prismatic, q)[0]


def jacobians(links, prismatic, q):
    """Jacobians (M, 6, n): linear rows first, at the chain's end, in the axes of the chain's first frame."""
    return locate(links, prismatic, q)[1]
