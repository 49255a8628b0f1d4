"""Why a joint is asked for too much at a place: which joints line up, what the tool loses, what the tool motion asks for, in words."""

from dataclasses import dataclass

import numpy as np

from .measures import Rates, in_part_axes, task_jacobians

AXES = ("x", "y", "z")


@dataclass(frozen=True)
class Lineup:
    """What makes a posture near-singular: where ("wrist", "elbow", "shoulder" or ""), the joints, and a sentence part."""

    where: str
    joints: tuple
    words: str


def lineup(rates: Rates, k: int) -> Lineup:
    """The joints that come close to doing the same thing at sample k, from the null vector of the task Jacobian."""
    from .kernels.linkage import locate

    motion = rates.motion
    arm = motion.cell.arm
    _, _, right = np.linalg.svd(task_jacobians(motion, [k])[0], full_matrices=False)
    shares = np.abs(right[-1])
    _, jacobian, points = (a[0] for a in locate(*motion.cell.chain, motion.closest[k : k + 1]))
    axes = np.where(arm.prismatic, jacobian[:3], jacobian[3:]).T
    centre = _wrist_centre(arm, axes, points)
    if centre is not None:
        return _spherical(rates, arm, axes, points, centre)
    joints = [int(i) for i in np.argsort(-shares) if shares[i] > 0.3 * shares.max()]
    names = tuple(arm.joint_names[i] for i in sorted(joints))
    if len(joints) == 2 and not arm.prismatic[joints].any():
        angle = _between(axes[joints[0]], axes[joints[1]])
        if angle < 30.0:
            return Lineup("", names, f"joints {names[0]} and {names[1]} are within {angle:.1f} deg of lining up")
    if len(names) == 1:
        return Lineup("", names, f"joint {names[0]} hardly moves the tool any more")
    return Lineup("", names, f"joints {', '.join(names[:-1])} and {names[-1]} come close to cancelling each other")


def _wrist_centre(arm, axes, points):
    """The point where the last three axes of a six-axis arm meet, or None."""
    if arm.n != 6 or arm.prismatic.any():
        return None
    projectors = np.eye(3) - axes[3:, :, None] * axes[3:, None, :]
    centre = np.linalg.lstsq(projectors.reshape(9, 3), np.einsum("kij,kj->ki", projectors, points[3:]).reshape(9), rcond=None)[0]
    off = np.einsum("kij,kj->ki", projectors, centre - points[3:])
    return centre if np.abs(off).max() < 1e-6 * arm.reach else None


def _spherical(rates, arm, axes, points, centre):
    """A wrist whose axes meet splits the question in two: the three axes of the wrist, and the first three moving its centre."""
    names = arm.joint_names
    wrist = np.linalg.svd(axes[3:], compute_uv=False)[-1]
    placing = np.cross(axes[:3], centre - points[:3]).T / rates.characteristic_length
    _, sigma, right = np.linalg.svd(placing)
    if wrist <= sigma[-1]:
        angle = _between(axes[3], axes[5])
        return Lineup("wrist", (names[3], names[5]), f"joints {names[3]} and {names[5]} are within {angle:.1f} deg of lining up (wrist)")
    if np.argmax(np.abs(right[-1])) == 0:
        across = (centre - points[0]) - axes[0] * (axes[0] @ (centre - points[0]))
        away = np.linalg.norm(across) * 1000.0
        return Lineup("shoulder", (names[0],), f"the wrist centre stands only {away:.0f} mm from the axis of joint {names[0]} (shoulder)")
    upper, fore = points[2] - points[1], centre - points[2]
    flat = np.eye(3) - np.outer(axes[2], axes[2])
    angle = _between(flat @ upper, flat @ fore, fold=False)
    state, rest = ("stretched", angle) if angle < 90.0 else ("folded", 180.0 - angle)
    return Lineup("elbow", (names[1], names[2]), f"the arm is within {rest:.1f} deg of fully {state} between joints {names[1]} and {names[2]} (elbow)")


def _between(a, b, fold=True):
    size = np.linalg.norm(a) * np.linalg.norm(b)
    if size == 0.0:
        return 0.0
    sine, cosine = np.linalg.norm(np.cross(a, b)) / size, (a @ b) / size
    return float(np.degrees(np.arctan2(sine, abs(cosine) if fold else cosine)))


def lost_words(rates: Rates, k: int) -> str:
    """What the tool can hardly do any more at sample k, in words and part axes."""
    return lost_words_along(rates, [k])[0]


def lost_words_along(rates: Rates, samples) -> list:
    """`lost_words` at each of the samples (M,)."""
    left, _, _ = np.linalg.svd(task_jacobians(rates.motion, samples), full_matrices=False)
    return [_lost(direction) for direction in in_part_axes(rates.motion, samples, left[:, :, -1])]


def _lost(direction):
    slides, turns = direction[:3], direction[3:]
    if np.linalg.norm(slides) >= np.linalg.norm(turns):
        return f"move along {_axis_words(slides)} of the part"
    return f"turn about {_axis_words(turns)} of the part"


def _axis_words(v):
    v = v / np.linalg.norm(v)
    main = int(np.argmax(np.abs(v)))
    v = v * np.sign(v[main])
    if abs(v[main]) > 0.996:  # within 5 deg
        return AXES[main]
    return f"({v[0]:.2f}, {v[1]:.2f}, {v[2]:.2f})"


def demand_words(rates: Rates, k: int, joint: int) -> str:
    """Which part of the tool's motion asks joint number `joint` for its speed at sample k."""
    motion = rates.motion
    twist = motion.twist[k]
    speed, turning = np.linalg.norm(twist[:3]) * 1000.0, np.degrees(np.linalg.norm(twist[3:]))
    inverse = np.linalg.pinv(task_jacobians(motion, [k])[0])
    from .kernels.linkage import poses

    turned = poses(*motion.cell.chain, motion.closest[k : k + 1])[0, :3, :3]
    demand = np.concatenate([turned.T @ twist[:3] / rates.characteristic_length, turned.T @ twist[3:]])[: motion.rows]
    by_move, by_turn = abs(inverse[joint, :3] @ demand[:3]), abs(inverse[joint, 3:] @ demand[3:])
    if by_turn > 2.0 * by_move:
        return f"the tool turns at {turning:.1f} deg/s there"
    if by_move > 2.0 * by_turn:
        return f"the tool point moves at {speed:.0f} mm/s there"
    return f"the tool point moves at {speed:.0f} mm/s and the tool turns at {turning:.1f} deg/s there"


def corner_words(rates: Rates, k: int) -> str:
    """Tells of a corner of the path beside sample k; '' where there is none."""
    path = rates.motion.path
    for j in (k, k - 1, k + 1):
        if 0 < j < path.samples - 1:
            before, after = path.position[j] - path.position[j - 1], path.position[j + 1] - path.position[j]
            if min(np.linalg.norm(before), np.linalg.norm(after)) > 1e-7:
                angle = _between(before, after, fold=False)
                if angle > 10.0:
                    return f"the path turns a corner of {angle:.0f} deg within one sample without slowing down"
    return ""
