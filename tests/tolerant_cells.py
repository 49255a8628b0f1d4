"""Cells with tolerances, and audits in them."""

from dataclasses import replace

import numpy as np
from example_arms import SWAY_TIME, cell_of, dh_rows, path_of_motion, swaying

import pathaudit as pa
from pathaudit.tolerances import Tolerances

EVERY = {"part_xyz_mm": 1.0, "part_rpy_deg": 0.1, "tool_xyz_mm": [0.5, 0.5, 1.0], "base_rpy_deg": {"sigma": 0.05}, "joint_zero_deg": 0.02, "link_mm": 0.2, "speed_percent": 3.0}


def tolerant(cell, **stated):
    return replace(cell, tolerances=Tolerances.of(cell.arm, **stated))


def swayed(seed, quick=1.0, every=1, **stated):
    """The audit of a swaying motion run `quick` times as fast, of every so many samples, in a cell with tolerances."""
    cell, joints = swaying(seed)
    return pa.audit(path_of_motion(cell, SWAY_TIME[::every] / quick, joints[::every]), tolerant(cell, **stated))


def near_a_limit(seed, share=0.85, every=3, **stated):
    """The audit of a swaying motion whose busiest joint comes to `share` of a speed or acceleration limit"""
    rates = swayed(seed, every=every).rates
    most = max(np.nanmax(rates.speed_share) / share, np.sqrt(np.nanmax(rates.acceleration_share) / share))
    return swayed(seed, 1.0 / most, every, **stated)


def wrist_bench(limit_deg, samples=5, **stated):
    """A planar arm of three joints whose wrist goes straight out from 0.80 to 0.85 m, its elbow to stay above limit_deg: the audit of 5 samples.

    The elbow's angle depends on the wrist's distance r alone: cos q2 = (r^2 - a^2 - b^2) / (2 a b).
    """
    a, b = 0.5, 0.4
    rows = dh_rows([500.0, 400.0, 100.0], [0.0] * 3, [0.0] * 3, [[-360, 360], [limit_deg, 170], [-360, 360]])
    reach = np.linspace(0.80, 0.85, samples)
    elbow = np.arccos((reach**2 - a * a - b * b) / (2 * a * b))
    shoulder = -np.arctan2(b * np.sin(elbow), a + b * np.cos(elbow))
    joints = np.stack([shoulder, elbow, -shoulder - elbow], axis=1)
    cell = tolerant(cell_of(pa.Arm.from_dh(rows), start=joints[0], travel_warn_deg=0.0), **stated)
    return pa.audit(path_of_motion(cell, np.linspace(0.0, 2.0, samples), joints), cell)
