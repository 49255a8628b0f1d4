"""Which joint and which place of a path a chart is about, and what the arm can do there."""

from dataclasses import dataclass

import numpy as np

from .along import shown_time

PLANES = ("xy", "xz", "yz")


@dataclass(frozen=True, eq=False)
class Posture:
    """The arm at one sample, for n joints: rows (m, n) of the Jacobian, first the tool point's three in m along the axes that were asked
    for, then what the task needs of the turning about the tool's axes; twist (m,) as programmed; name of the axes' frame."""

    sample: int
    jacobian: np.ndarray
    twist: np.ndarray
    frame: str


def joint_number(arm, joint):
    names = list(arm.joint_names)
    if isinstance(joint, str) and joint in names:
        return names.index(joint)
    if isinstance(joint, (int, np.integer)) and not isinstance(joint, bool) and 0 <= joint < len(names):
        return int(joint)
    raise ValueError(f"joint is {joint!r}, expected one of {', '.join(names)}, or a number from 0 to {len(names) - 1}")


def sample_at(audit, time, sample):
    """The number of the reached sample that a time (s, nearest sample) or a sample number names."""
    times = shown_time(audit)
    if (time is None) == (sample is None):
        raise ValueError("a place is one of two: a time in s, or sample=, a sample number")
    if sample is not None:
        if not isinstance(sample, (int, np.integer)) or isinstance(sample, bool) or not 0 <= sample < len(times):
            raise ValueError(f"sample is {sample!r}, expected a number from 0 to {len(times) - 1}")
        k = int(sample)
    else:
        slack = 1e-6 * max(1.0, times[-1] - times[0])
        if isinstance(time, (bool, str)) or not np.isscalar(time) or not times[0] - slack <= time <= times[-1] + slack:
            raise ValueError(f"time is {time!r}, expected one from {times[0]:.3f} to {times[-1]:.3f} s")
        k = int(np.abs(times - time).argmin())
    if not audit.motion.reached[k]:
        raise ValueError(f"{place_words(audit, k)} cannot be reached, expected a place where the arm has a posture. {audit.motion.reason(k)}")
    return k


def place_words(audit, k):
    return f"{shown_time(audit)[k]:.3f} s, {1e3 * audit.path.distance[k]:.1f} mm (sample {k})"


def plane_rows(plane):
    """Numbers of the rows that a chart shows: two for a plane, three where `plane` is None."""
    if plane is None:
        return [0, 1, 2]
    letters = plane.lower() if isinstance(plane, str) else ""
    if "".join(sorted(letters)) not in PLANES:
        raise ValueError(f"plane is {plane!r}, expected 'xy', 'xz', 'yz', or None for all three directions")
    return ["xyz".index(letter) for letter in letters]


def posture_at(audit, time, sample, axes) -> Posture:
    from ..kernels.linkage import locate

    if axes not in ("part", "tool"):
        raise ValueError(f"axes is {axes!r}, expected 'part' or 'tool'")
    motion, k = audit.motion, sample_at(audit, time, sample)
    poses, jacobians, _ = locate(*audit.cell.chain, motion.closest[k : k + 1])
    turned = poses[0, :3, :3].T
    into = turned if axes == "tool" else np.eye(3)
    jacobian = np.concatenate([into @ jacobians[0, :3], turned @ jacobians[0, 3:]])
    twist = np.concatenate([into @ motion.twist[k, :3], turned @ motion.twist[k, 3:]])
    return Posture(k, jacobian[: motion.rows], twist[: motion.rows], axes)
