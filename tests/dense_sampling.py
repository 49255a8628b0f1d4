"""The motion between samples looked at closely, in plain NumPy: the adversary of every bound. Nothing here comes from the package.

A chain is `links` (n + 1, 4, 4) and `slides` (n,) bool; its pose is links[0] Z(q0) links[1] ... Z(q[n-1]) links[n], Z a turn about, or a slide along, +z.
"""

import numpy as np


def quintic(span, q0, q1, v0, v1, a0, a1):
    """Power coefficients (6, ...) by time since the start of the quintics with these positions, speeds and accelerations at 0 and at span (s)."""
    h = np.asarray(span)
    jump = q1 - q0 - v0 * h - 0.5 * a0 * h**2
    speed = v1 - v0 - a0 * h
    bend = a1 - a0
    return np.stack([
        q0, v0, 0.5 * a0, (10 * jump - 4 * speed * h + 0.5 * bend * h**2) / h**3, (-15 * jump + 7 * speed * h - bend * h**2) / h**4,
        (6 * jump - 3 * speed * h + 0.5 * bend * h**2) / h**5,
    ])  # fmt: skip


def value(power, t, order=0):
    """Of quintics with the coefficients power (6, ...) the derivative of that order at t."""
    total = 0.0
    for i in range(order, 6):
        factor = np.prod(np.arange(i - order + 1, i + 1)) if order else 1.0
        total = total + factor * power[i] * t ** (i - order)
    return total


def forward(links, slides, q):
    """Poses (M, 4, 4), and axes and origins (n, M, 3) of the joints at q (M, n)."""
    pose = np.broadcast_to(links[0], (len(q), 4, 4))
    axes, origins = [], []
    for i, slide in enumerate(slides):
        axes.append(pose[:, :3, 2])
        origins.append(pose[:, :3, 3])
        move = np.tile(np.eye(4), (len(q), 1, 1))
        if slide:
            move[:, 2, 3] = q[:, i]
        else:
            c, s = np.cos(q[:, i]), np.sin(q[:, i])
            move[:, 0, 0], move[:, 0, 1], move[:, 1, 0], move[:, 1, 1] = c, -s, s, c
        pose = pose @ move @ links[i + 1]
    return pose, np.array(axes), np.array(origins)


def task_jacobian(links, slides, length, rows, q):
    """Poses (M, 4, 4) and Jacobians (M, rows, n) in tool axes, linear rows first and divided by length."""
    pose, axes, origins = forward(links, slides, q)
    columns = []
    for slide, axis, origin in zip(slides, axes, origins):
        linear = axis if slide else np.cross(axis, pose[:, :3, 3] - origin)
        angular = np.zeros_like(axis) if slide else axis
        columns.append(np.concatenate([np.einsum("mji,mj->mi", pose[:, :3, :3], part) for part in (linear / length, angular)], axis=1))
    return pose, np.stack(columns, axis=2)[:, :rows]


def sigma_min(links, slides, length, rows, q):
    """(M,)"""
    return np.linalg.svd(task_jacobian(links, slides, length, rows, q)[1], compute_uv=False)[:, -1]


def off_line(points, first, last):
    """(...) m, from points (..., 3) to the segment from first to last (3 each, broadcast)."""
    along = last - first
    size = np.maximum((along**2).sum(-1), 1e-300)
    share = np.clip(((points - first) * along).sum(-1) / size, 0.0, 1.0)
    return np.linalg.norm(points - first - share[..., None] * along, axis=-1)


def off_turn(turns, first, last, steps=200):
    """(...) rad, least angle from rotations (..., 3, 3) to those on the least turn from first to last, tried at `steps` places."""
    from scipy.spatial.transform import Rotation

    whole = Rotation.from_matrix(first.T @ last).as_rotvec()
    way = Rotation.from_matrix(first) * Rotation.from_rotvec(np.linspace(0.0, 1.0, steps)[:, None] * whole)
    return np.array([(way.inv() * Rotation.from_matrix(turn)).magnitude().min() for turn in turns])


def off_arc(axes, first, last):
    """(...) rad, angle from unit vectors (..., 3) to the great arc from first to last, a right angle apart at most."""
    normal = np.cross(first, last)
    size = np.linalg.norm(normal)
    if size < 1e-12:
        return np.arctan2(np.linalg.norm(np.cross(axes, first), axis=-1), axes @ first)
    normal = normal / size
    beside = np.abs(np.arcsin(np.clip(axes @ normal, -1.0, 1.0)))
    within = (np.cross(first, axes) @ normal >= 0.0) & (np.cross(axes, last) @ normal >= 0.0)
    ends = [np.arctan2(np.linalg.norm(np.cross(axes, end), axis=-1), axes @ end) for end in (first, last)]
    return np.where(within, beside, np.minimum(*ends))


def random_chain(random, n):
    """Links (n + 1, 4, 4), slides (n,) and a length (m) of an arm with n joints: parallel, right-angled or skew axes, one in five joints sliding."""
    links = np.tile(np.eye(4), (n + 1, 1, 1))
    for link in links:
        alpha = random.choice([0.0, np.pi / 2, -np.pi / 2, random.uniform(-np.pi, np.pi)])
        a, d = random.choice([0.0, random.uniform(0.0, 0.6)], 2)
        c, s = np.cos(alpha), np.sin(alpha)
        link[:3, :3] = [[1.0, 0.0, 0.0], [0.0, c, -s], [0.0, s, c]]
        link[:3, 3] = [a, -s * d, c * d]
    reach = np.linalg.norm(links[1:, :3, 3], axis=1).sum()
    return links, random.random(n) < 0.2, max(0.5 * reach, 0.1)


def random_segments(random, slides, count, largest=0.3):
    """Positions, speeds and accelerations (count, n) at both ends, and spans (count, 1) s: smooth, bent, and restless motions of any size up to largest."""
    n = len(slides)
    step = np.exp(random.uniform(np.log(1e-4), np.log(largest), (count, 1)))
    span = np.exp(random.uniform(np.log(1e-3), np.log(0.1), (count, 1)))
    q0 = random.uniform(-np.pi, np.pi, (count, n)) * np.where(slides, 0.2, 1.0)
    aligned = random.random((count, n)) < 0.1  # joints at rest at a quarter turn: where arms are singular
    q0 = np.where(aligned, np.round(q0 / (np.pi / 2)) * np.pi / 2 + random.choice([0.0, 1.0], (count, 1)) * random.normal(0.0, 1.0, (count, n)) * step, q0)
    move = step * random.uniform(-1.0, 1.0, (count, n))
    mean, wild = move / span, random.choice([0.0, 0.1, 1.0], (count, 1))
    v0, v1 = (mean + wild * random.normal(0.0, 1.0, (count, n)) * step / span for _ in range(2))
    a0, a1 = (wild * random.normal(0.0, 2.0, (count, n)) * step / span**2 + (v1 - v0) / span for _ in range(2))
    return q0, q0 + move, v0, v1, a0, a1, span
