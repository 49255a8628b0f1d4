"""The DataFrames of an audit: units in the names, nothing lost, gaps kept."""

import numpy as np
from example_arms import SWAY_TIME, cell_of, path_of_motion, path_of_poses, puma, swaying, swaying_audit

import pathaudit as pa


def test_measures_are_one_row_a_sample_in_the_trades_units():
    cell, joints = swaying(1)[:2]
    audit = pa.audit(path_of_motion(cell, SWAY_TIME, joints), cell, start=joints[0])
    frame = audit.measures
    assert len(frame) == len(SWAY_TIME) and audit.measures is frame
    np.testing.assert_allclose(frame["j4_deg"], np.degrees(joints[:, 3]), atol=1e-6)
    np.testing.assert_allclose(frame["j4_speed_share"], np.abs(frame["j4_deg_s"]) / 30.0, rtol=1e-9)
    np.testing.assert_allclose(frame["reserve"], 1.0 / frame["speed_use"], rtol=1e-9)
    np.testing.assert_allclose(frame["condition"] * frame["sigma_min"], frame["sigma_max"], rtol=1e-6)
    np.testing.assert_allclose(np.linalg.norm(frame[[f"lost_{c}" for c in ("x", "y", "z", "rx", "ry", "rz")]], axis=1), 1.0)
    left = frame[[f"j{i}_travel_left_deg" for i in range(1, 7)]].to_numpy()
    assert (frame["least_travel_joint"] == np.array([f"j{i}" for i in range(1, 7)])[left.argmin(axis=1)]).all()


def test_findings_carry_the_fields_of_the_report():
    audit = swaying_audit(1)
    wanted = ["kind", "severity", "joint", "t_start_s", "t_end_s", "worst_t_s", "value", "limit", "unit", "why"]
    assert list(audit.findings.columns[:10]) == wanted and len(audit.findings) == len(audit.finding_list) > 0


def test_no_findings_and_no_reach_give_frames_too():
    poses = np.tile(np.diag([1.0, -1.0, -1.0, 1.0]), (5, 1, 1))
    poses[:, :3, 3] = [9.0, 0.0, 0.0] + np.outer(np.arange(5), [0.01, 0.0, 0.0])
    audit = pa.audit(path_of_poses(np.arange(5.0), poses), cell_of(puma()))
    assert not audit.measures["reached"].any() and audit.measures["sigma_min"].isna().all() and (audit.measures["least_travel_joint"] == "").all()
    assert (audit.measures["deviation_mm"] > 7000).all()
    cell, joints = swaying(1)[:2]
    still = pa.audit(path_of_motion(cell, 100.0 * SWAY_TIME, joints), cell, start=joints[0])
    assert list(still.findings.columns) == list(audit.findings.columns) and len(still.findings) == 0
