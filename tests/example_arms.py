"""Arms of the outside values, built from their Denavit-Hartenberg rows, and paths made by moving an arm."""

import numpy as np
from outside import inputs

import pathaudit as pa
from pathaudit.kernels import linkage, rotations


def dh_rows(a_mm, alpha_deg, d_mm, range_deg=None, speed_deg_s=None):
    n = len(a_mm)
    ranges = range_deg or [[-360.0, 360.0]] * n
    speeds = speed_deg_s or [180.0] * n
    return [
        {
            "name": f"j{i + 1}", "type": "revolute", "a_mm": a_mm[i], "alpha_deg": alpha_deg[i], "d_mm": d_mm[i], "theta_deg": 0.0,
            "lower_deg": ranges[i][0], "upper_deg": ranges[i][1], "speed_deg_s": speeds[i],
        }
        for i in range(n)
    ]  # fmt: skip


def planar(*lengths):
    """Joints about +z, links along x, lengths in metres: task rows 0 and 1 are the plane, row 5 the turn."""
    n = len(lengths)
    return pa.Arm.from_dh(dh_rows([1000.0 * length for length in lengths], [0.0] * n, [0.0] * n))


def puma(convention="standard", **limits):
    row = inputs("KIN-011")
    if convention == "standard":
        table = row["dh"]["a"], row["dh"]["alpha_deg"], row["dh"]["d"]
    else:
        table = row["mod"]["a_prev"], row["mod"]["alpha_prev_deg"], row["mod"]["d"]
    return pa.Arm.from_dh(dh_rows(*table, **limits), convention=convention)


def sixteen():
    """The arm of Manseur and Doty with sixteen postures for one pose (KIN-018)."""
    row = inputs("KIN-018")
    metres = [[1000.0 * value for value in row[key]] for key in ("a", "d")]
    return pa.Arm.from_dh(dh_rows(metres[0], row["alpha_deg"], metres[1]))


def square(rows):
    """A 3 x 4 pose with its last row."""
    return np.vstack([rows, [0.0, 0.0, 0.0, 1.0]])


def cell_of(arm, tool_z=0.0, start=None, **thresholds):
    """The arm at the world's origin, which is the part frame too, with the tool centre point `tool_z` m along the flange's +Z."""
    tool = rotations.pose(np.eye(3), [0.0, 0.0, tool_z])
    return pa.Cell("bench", arm, np.eye(4), tool, np.eye(4), start=start, thresholds=pa.Thresholds(**thresholds))


def path_of_poses(time, poses, spin_free=False, **columns):
    """A path through poses (N, 4, 4); only the tool axis is given where the spin is free."""
    columns = {"t_s": time} | dict(zip(("x_m", "y_m", "z_m"), poses[:, :3, 3].T, strict=True)) | columns
    if spin_free:
        return pa.path_from(columns | dict(zip("ijk", poses[:, :3, 2].T, strict=True)))
    return pa.path_from(columns | dict(zip(("qw", "qx", "qy", "qz"), rotations.wxyz_from_matrix(poses[:, :3, :3]).T, strict=True)))


def path_of_motion(cell, time, joints, **options):
    """The path that the tool of a cell draws when its arm moves through joints (N, n)."""
    return path_of_poses(time, linkage.poses(*cell.chain, joints), **options)


SWAY_TIME = np.linspace(0.0, 3.0, 301)


def swaying(seed, scale=1.0, time=SWAY_TIME):
    """A cell, and a smooth motion (N, 6) of its arm well inside its travel, random by the seed, that passes some of its limits."""
    random = np.random.default_rng(seed)
    table = [0.0, 431.8, -20.32, 0.0, 0.0, 0.0], [-90.0, 0.0, 90.0, -90.0, 90.0, 0.0], [0.0, 149.09, 0.0, 433.07, 0.0, 56.25]
    rows = dh_rows(scale * np.array(table[0]), table[1], scale * np.array(table[2]), speed_deg_s=[22.0, 22.0, 22.0, 30.0, 30.0, 40.0])
    for row in rows:
        row["acceleration_deg_s2"] = 50.0
    middle = np.array([0.2, -0.4, 0.2, 0.5, 0.9, 0.3])
    size, rate, phase = random.uniform(0.05, 0.25, 6), random.uniform(0.5, 4.0, 6), random.uniform(0, 6.3, 6)
    joints = middle + size * np.sin(np.outer(time, rate) + phase)
    return cell_of(pa.Arm.from_dh(rows), 0.1 * scale, start=joints[0]), joints


def swaying_audit(seed):
    """The audit of a swaying motion, begun as the arm was moved."""
    cell, joints = swaying(seed)
    return pa.audit(path_of_motion(cell, SWAY_TIME, joints), cell, start=joints[0])
