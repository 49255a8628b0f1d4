"""Where the arm stands, for drawing it."""

from types import SimpleNamespace

import numpy as np
from fake_audit import fake_audit

import pathaudit as pa
from pathaudit.report.scene import scene
from pathaudit.report.skeleton import arm_facts, skeleton

ROWS = [{"name": "lift", "type": "prismatic", "a_mm": 0, "alpha_deg": 20, "d_mm": 300, "theta_deg": 10, "lower_mm": -100, "upper_mm": 500, "speed_mm_s": 400}]
ROWS += [{"name": f"j{k}", "type": "revolute", "a_mm": 250 - 30 * k, "alpha_deg": (-1) ** k * 90, "d_mm": 40 * k, "theta_deg": 15 * k,
          "lower_deg": -170, "upper_deg": 170, "speed_deg_s": 180} for k in range(5)]


def posed(arm, joints, tool=np.eye(4), base=np.eye(4)):
    return skeleton({**arm_facts(SimpleNamespace(arm=arm, tool=tool)), "base": base.tolist()}, joints)


def test_the_skeleton_agrees_with_the_arms_own_kinematics():
    arm = pa.Arm.from_dh(ROWS)
    joints = np.random.default_rng(1).uniform(-1, 1, (40, 6))
    joints[7] = np.nan
    found = posed(arm, joints)
    good = np.isfinite(joints).all(axis=1)
    points, axes, jacobian = found.points[good], found.axes[good], arm.jacobian(joints[good])
    np.testing.assert_allclose(points[:, -2], arm.flange_pose(joints[good])[:, :3, 3], atol=1e-10)
    np.testing.assert_allclose(axes[:, 0], jacobian[:, :3, 0], atol=1e-10)      # a sliding joint moves the flange along its axis
    np.testing.assert_allclose(axes[:, 1:], np.moveaxis(jacobian[:, 3:, 1:], 2, 1), atol=1e-10)
    arms = points[:, -2, None] - points[:, 1:-2]
    np.testing.assert_allclose(np.cross(axes[:, 1:], arms), np.moveaxis(jacobian[:, :3, 1:], 2, 1), atol=1e-10)
    assert all(np.isnan(values[7]).all() for values in found)


def test_a_slide_begins_at_its_root():
    arm = pa.Arm.from_dh(ROWS)
    joints = np.random.default_rng(2).uniform(-0.4, 0.4, (5, 6))
    found = posed(arm, joints)
    np.testing.assert_allclose(found.points[:, 0] - found.roots[:, 0], joints[:, :1] * found.axes[:, 0], atol=1e-12)
    np.testing.assert_array_equal(found.roots[:, 1:], found.points[:, 1:-2])


def test_the_tool_has_its_pose_in_the_world():
    arm, rng = pa.Arm.from_dh(ROWS), np.random.default_rng(3)
    joints, tool, base = rng.uniform(-1, 1, (6, 6)), np.eye(4), np.eye(4)
    tool[:3, :3], tool[:3, 3] = np.linalg.qr(rng.standard_normal((3, 3)))[0], (0.1, -0.2, 0.3)
    base[:3, :3], base[:3, 3] = np.diag([1.0, -1.0, -1.0]), (0.0, 0.5, 2.4)
    found = posed(arm, joints, tool, base)
    np.testing.assert_allclose(found.tool, (base @ arm.flange_pose(joints) @ tool)[:, :3], atol=1e-10)
    np.testing.assert_array_equal(found.points[:, -1], found.tool[:, :, 3])


def test_the_tool_point_of_a_scene_lies_on_its_path():
    shown = scene(fake_audit(300, gap=False))
    np.testing.assert_allclose(skeleton(shown.facts, shown.arrays["joints"]).points[:, -1], shown.arrays["path_m"], atol=2e-6)
