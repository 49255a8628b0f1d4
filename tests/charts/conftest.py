"""Audits for the charts: the demo's, arms of any number of joints, and one with a gap. Only read, so made once."""

from functools import cache
from pathlib import Path

import numpy as np
import pytest
from example_arms import cell_of, path_of_motion, path_of_poses, swaying

import pathaudit as pa
from pathaudit.kernels import linkage

DEMO = Path(pa.__file__).parent / "demo"


@pytest.fixture(scope="session")
def demo():
    return pa.audit(pa.read_path(DEMO / "seam.csv"), pa.read_cell(DEMO / "cell.toml"))


@pytest.fixture(scope="session")
def bead():
    """A path whose turn about the tool axis is free."""
    return pa.audit(pa.read_path(DEMO / "bead.csv"), pa.read_cell(DEMO / "cell-bead.toml"))


@pytest.fixture(scope="session")
def arms():
    """arms(n): the audit of a smooth motion of an arm with n joints; with fewer than six, of a planar one; efforts are stated."""
    return cache(audit_of_arm)


def audit_of_arm(n, effort=True, samples=81):
    random = np.random.default_rng(n)
    planar = n < 6
    rows = [{"name": f"a{k}", "a_mm": 300.0 - 20.0 * k if planar else random.uniform(50, 300), "alpha_deg": 0.0 if planar else random.choice([-90.0, 90.0, 60.0]),
             "d_mm": 0.0 if planar else random.uniform(50, 250), "lower_deg": -200, "upper_deg": 200, "speed_deg_s": 28.0 + 7.0 * k,
             **({"effort_nm": 200.0 / (k + 1)} if effort else {})} for k in range(n)]
    time = np.linspace(0.0, 2.0, samples)
    joints = 0.6 + 0.4 * np.sin(np.outer(time, 1.5 + 0.2 * np.arange(n)) + np.arange(n))
    cell = cell_of(pa.Arm.from_dh(rows), 0.1, start=joints[0])
    return pa.audit(path_of_motion(cell, time, joints), cell)


@pytest.fixture(scope="session")
def gap():
    """An audit whose samples 100 to 139 lie far out of reach, starting at a clock's date."""
    cell, joints = swaying(3)
    poses = linkage.poses(*cell.chain, joints)
    poses[100:140, 0, 3] += 5.0
    audit = pa.audit(path_of_poses(1.7e9 + np.linspace(0.0, 3.0, 301), poses), cell)
    assert not audit.motion.reached[100:140].any() and audit.motion.reached[:100].all()
    return audit


@pytest.fixture(scope="session")
def long():
    """An audit of 200,000 samples."""
    time = np.linspace(0.0, 3.0, 200_000)
    cell, joints = swaying(7, time=time)
    return pa.audit(path_of_motion(cell, time, joints), cell)


@pytest.fixture(scope="session")
def jacobian_at():
    """jacobian_at(audit, k): (6, n) of the tool point in part axes, by differences of poses."""

    def differences(audit, k):
        q, step = audit.joints[k], 1e-6
        here = linkage.poses(*audit.cell.chain, q[None])[0]
        columns = []
        for joint in np.eye(len(q)):
            there, before = linkage.poses(*audit.cell.chain, np.stack([q + step * joint, q - step * joint]))
            turn = (there[:3, :3] - before[:3, :3]) / (2 * step) @ here[:3, :3].T
            columns.append([*(there[:3, 3] - before[:3, 3]) / (2 * step), turn[2, 1], turn[0, 2], turn[1, 0]])
        return np.array(columns).T, here[:3, :3]

    return differences
