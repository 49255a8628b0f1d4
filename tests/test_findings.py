"""Stretches with exact crossing times, and findings with their numbers and reasons."""

import numpy as np
import pytest
from example_arms import cell_of, dh_rows, path_of_motion, path_of_poses, puma
from hypothesis import given
from hypothesis import strategies as st

import pathaudit as pa
from pathaudit.findings import MERGE, stretches


@given(st.lists(st.floats(-1, 1).map(lambda v: round(v, 3)), min_size=2, max_size=60), st.sampled_from([1.0, -1.0]))
def test_stretches_cover_what_is_beyond_and_nothing_far_from_it(levels, sense):
    level = np.array(levels)
    time = np.cumsum(np.linspace(0.5, 1.5, len(level)))
    found = stretches(time, level, 0.25, sense)
    beyond = set(np.flatnonzero(sense * level > sense * 0.25).tolist())
    inside = [k for s in found for k in range(s.first, s.last + 1)]
    assert beyond <= set(inside) and len(inside) == len(set(inside))
    for s in found:
        assert {s.first, s.last, s.worst} <= beyond and sense * level[s.worst] == max(sense * level[s.first : s.last + 1])
        assert time[max(s.first - 1, 0)] <= s.t_start <= time[s.first] and time[s.last] <= s.t_end <= time[min(s.last + 1, len(level) - 1)]
    for a, b in zip(found, found[1:], strict=False):
        assert b.first - a.last > MERGE + 1


def test_crossings_lie_where_the_line_crosses():
    time = np.array([0.0, 1.0, 2.0, 3.0])
    (s,) = stretches(time, np.array([0.0, 2.0, 2.0, 1.0]), 1.5, 1.0)
    assert (s.t_start, s.t_end, s.worst) == (0.75, 2.5, 1)


def test_missing_samples_are_not_beyond_and_end_a_stretch_at_the_last_one():
    (s,) = stretches(np.arange(5.0), np.array([np.nan, 3.0, 3.0, np.nan, 0.0]), 1.0, 1.0)
    assert (s.t_start, s.t_end) == (1.0, 2.0)


def scara():
    rows = dh_rows([400.0, 300.0], [0.0, 180.0], [0.0, 0.0], [[-170.0, 170.0], [-150.0, 150.0]], [200.0, 200.0])
    rows += [{"name": "z", "type": "prismatic", "lower_mm": 0, "upper_mm": 250, "speed_mm_s": 100.0, "acceleration_mm_s2": 400.0}]
    return pa.Arm.from_dh([*rows, dh_rows([0.0], [0.0], [0.0])[0] | {"name": "spin"}])


def slide(start_m, speed_m_s, duration=1.0):
    time = np.linspace(0.0, duration, 201)
    joints = np.tile([0.2, 1.0, start_m, 0.1], (201, 1))
    joints[:, 2] += speed_m_s * time
    return time, joints


def test_a_sliding_joint_speaks_in_millimetres():
    cell = cell_of(scara())
    time, joints = slide(0.05, 0.15)
    audit = pa.audit(path_of_motion(cell, time, joints), cell, start=joints[0])
    (speed,) = [f for f in audit.finding_list if f.kind == "joint speed"]
    assert (speed.joint, speed.unit, speed.severity) == ("z", "mm/s", "fail")
    assert speed.value == pytest.approx(150.0) and speed.limit == pytest.approx(100.0)
    assert "150 % of its limit" in speed.why and (speed.t_start, speed.t_end) == (0.0, 1.0)


def test_travel_is_warned_of_before_it_fails():
    cell = cell_of(scara())
    time, joints = slide(0.20, 0.06)
    found = [f for f in pa.audit(path_of_motion(cell, time, joints), cell, start=joints[0]).finding_list if f.kind == "joint travel"]
    (fail,) = found
    assert fail.severity == "fail" and fail.value == pytest.approx(260.0) and fail.limit == pytest.approx(250.0) and fail.unit == "mm"
    assert fail.t_start == pytest.approx(0.05 / 0.06, abs=1e-9) and "10.0 mm past the end of its travel" in fail.why
    time, joints = slide(0.20, 0.047)
    (warn,) = [f for f in pa.audit(path_of_motion(cell, time, joints), cell, start=joints[0]).finding_list if f.kind == "joint travel"]
    assert warn.severity == "warn" and warn.value == pytest.approx(247.0) and "within 3.0 mm" in warn.why


def test_what_cannot_be_judged_is_said():
    cell = cell_of(scara())
    time, joints = slide(0.1, 0.01)
    audit = pa.audit(path_of_motion(cell, time, joints), cell, start=joints[0])
    said = dict(audit.not_judged)
    assert "acceleration limit for j1, j2" in said["joint acceleration"] and "z" not in said["joint acceleration"].split(" for ")[1]
    assert "tool_speed_mm_s" in said["tool speed"]
    assert audit.verdict == "pass"
    again = pa.audit(audit.path, cell_of(scara(), tool_speed_mm_s=9.0), start=joints[0])
    (found,) = [f for f in again.finding_list if f.kind == "tool speed"]
    assert found.value == pytest.approx(10.0) and found.unit == "mm/s" and "tool speed" not in dict(again.not_judged)


def test_a_corner_without_slowing_down_is_named():
    rows = dh_rows([0.0, 431.8, -20.32, 0.0, 0.0, 0.0], [-90.0, 0.0, 90.0, -90.0, 90.0, 0.0], [0.0, 149.09, 0.0, 433.07, 0.0, 56.25])
    arm = pa.Arm.from_dh([row | {"acceleration_deg_s2": 800.0} for row in rows])
    time = np.linspace(0.0, 4.0, 401)
    along = 0.2 * time
    poses = np.tile(np.diag([1.0, -1.0, -1.0, 1.0]), (401, 1, 1))
    poses[:, :3, 3] = [0.5, -0.2, 0.2] + np.outer(np.minimum(along, 0.4), [0, 1, 0]) + np.outer(np.maximum(along - 0.4, 0), [-0.5, 0, 0.75**0.5])
    audit = pa.audit(path_of_poses(time, poses), cell_of(arm))
    found = [f for f in audit.finding_list if f.kind == "joint acceleration"]
    assert found and all("corner of 90 deg" in f.why and abs(f.worst_t - 2.0) < 0.011 for f in found)


@pytest.mark.parametrize(
    "posture, where",
    [
        ([0.3, -0.5, 0.4, 0.2, 0.004, 0.3], "within 0.2 deg of lining up (wrist)"),
        ([0.3, -0.5, np.radians(92.686394754 - 0.3), 0.2, 0.9, 0.3], "fully stretched between joints j2 and j3 (elbow)"),
        ([0.3, np.radians(-88.654091268), np.radians(90.0), 0.2, 0.9, 0.3], "mm from the axis of joint j1 (shoulder)"),
    ],
)
def test_the_joints_that_line_up_are_named(posture, where):
    """The singular postures of KIN-013, KIN-014 and KIN-015 (references/README.md)."""
    cell = cell_of(puma())
    time = np.linspace(0.0, 1.0, 51)
    joints = np.array(posture) + 0.002 * np.outer(np.sin(time), np.ones(6))
    audit = pa.audit(path_of_motion(cell, time, joints), cell, start=joints[0])
    (found,) = [f for f in audit.finding_list if f.kind == "near-singular"]
    assert where in found.why and found.severity == "fail" and found.joint is None and found.value < 0.02
