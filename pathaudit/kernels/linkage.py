"""Poses, Jacobians and joint origins of a serial chain (frames.py says what a chain is) at many postures."""

import numpy as np

from .compiled import dense, kernel
from .frames import columns, place


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
