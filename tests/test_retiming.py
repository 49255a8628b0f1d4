"""The suggestion and its reasons; what no retiming can cure; air moves; the laws stand in test_laws.py."""

import numpy as np
import pytest
from example_arms import SWAY_TIME, cell_of, path_of_motion, path_of_poses, puma, swaying, swaying_audit

import pathaudit as pa


def overruns(audit):
    return [f for f in audit.finding_list if f.kind in ("joint speed", "joint acceleration") and f.severity == "fail"]


def test_one_even_speed_is_one_factor_and_just_enough():
    audit = swaying_audit(1)
    assert overruns(audit)
    even = audit.retime("even")
    assert np.ptp(even.factor) < 1e-12 and even.feasible and not overruns(even.audit())
    assert np.allclose(np.diff(even.time) * even.slowest, np.diff(audit.time), rtol=1e-12)
    worst = max(np.nanmax(even.speed_share), np.nanmax(even.acceleration_share))
    assert worst == pytest.approx(1.0, abs=2e-6)


def test_only_air_moves_are_slowed_where_only_they_need_it():
    cell, joints = swaying(1)[:2]
    time = np.cumsum(np.r_[0.0, np.where(np.arange(300) < 200, 0.05, 0.01)])  # slow while welding, then away
    welding = (np.arange(301) < 150).astype(int)
    audit = pa.audit(path_of_motion(cell, time, joints, process=welding), cell, start=joints[0])
    assert overruns(audit) and all(f.first > 150 for f in overruns(audit))
    again = audit.retime()
    assert again.style == "local" and "Only air moves are slowed" in again.why
    assert (again.factor[welding == 1] == 1.0).all() and again.slowest < 1.0
    assert not overruns(again.audit()) and (np.diff(again.time) >= np.diff(audit.time) * (1 - 1e-12)).all()


def test_every_slowed_sample_says_what_limits_it():
    again = swaying_audit(2).retime("local")
    assert len(again.binding) == len(again.time)
    for words, factor in zip(again.binding, again.factor, strict=True):
        assert (words == "") == (factor >= 1.0 - 1e-9)
    assert any(words.startswith(("speed of joint", "acceleration of joint")) for words in again.binding)


def test_no_retiming_helps_where_a_pose_is_out_of_reach():
    poses = np.tile(np.diag([1.0, -1.0, -1.0, 1.0]), (201, 1, 1))
    poses[:, :3, 3] = [0.5, 0.0, 0.2] + np.outer(np.linspace(0, 0.8, 201), [1.0, 0.0, 0.0])
    audit = pa.audit(path_of_poses(np.linspace(0, 4, 201), poses), cell_of(puma()))
    again = audit.retime()
    assert not again.feasible and "cannot be reached at any speed" in again.why
    assert np.isfinite(again.time).all() and (np.diff(again.time) > 0).all()


def test_an_unknown_style_is_refused():
    with pytest.raises(ValueError, match="'even', 'local' or None"):
        swaying_audit(2).retime("fast")


def test_the_audit_of_new_times_is_that_of_the_retimed_path_on_its_own():
    cell, joints = swaying(2)[:2]
    programmed = pa.audit(path_of_motion(cell, SWAY_TIME, joints), cell, start=joints[0])
    for again in (programmed.retime("local"), programmed.retime("even")):
        judged, alone = again.audit(), pa.audit(again.path(), cell, start=joints[0])
        assert np.allclose(judged.joints, alone.joints, rtol=0, atol=1e-12) and np.array_equal(judged.time, alone.time)
        for name in ("joint_speed", "joint_acceleration", "sigma_min", "tool_speed", "travel_left"):
            assert np.allclose(getattr(judged.rates, name), getattr(alone.rates, name), rtol=1e-9, atol=1e-9, equal_nan=True), name
        assert [(f.kind, f.joint, f.severity, f.first, f.last) for f in judged.finding_list] == [(f.kind, f.joint, f.severity, f.first, f.last) for f in alone.finding_list]
