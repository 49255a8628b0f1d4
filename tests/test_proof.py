"""What the audit says of the intervals between samples: found, unproven, left alone, and kept by a retiming."""

import numpy as np
import pytest
from example_arms import SWAY_TIME, cell_of, dh_rows, path_of_motion, path_of_poses, puma, swaying, swaying_audit

import pathaudit as pa
from pathaudit import between, hidden, proof
from pathaudit.measures import measure


def crossing(step, along=(0.0, 0.0, 0.0, 0.0, 1.0, 0.0), samples=41, shift=0.5, **thresholds):
    """A cell, times and a joint motion through a straight wrist, which lies between two samples, `step` rad apart in joint 5."""
    cell = cell_of(puma(speed_deg_s=[400.0] * 6), **thresholds)
    place = (np.arange(samples) - samples // 2 + shift) * step
    return cell, 0.05 * np.arange(samples), np.array([0.3, -0.5, 0.4, 0.2, 0.0, 0.3]) + np.outer(place, along)


def between_samples(audit):
    return [f for f in audit.finding_list if f.why.startswith("Between two samples")]


@pytest.mark.parametrize("free", [False, True])
@pytest.mark.parametrize("along", [(0.0, 0.0, 0.0, 0.0, 1.0, 0.0), (0.1, 0.05, -0.1, 0.0, 1.0, 0.0)])
@pytest.mark.parametrize("shift", [0.5, 0.4])
def test_a_crossing_that_no_sample_shows_is_found(free, along, shift):
    cell, time, joints = crossing(0.05, along, shift=shift, sigma_min_warn=0.01, sigma_min_fail=0.004)
    audit = pa.audit(path_of_motion(cell, time, joints, spin_free=free), cell, start=joints[0])
    assert np.abs(audit.joints - joints).max() < 1e-6 and audit.rates.sigma_min.min() > 0.01  # nothing to see at the samples
    (found,) = audit.finding_list
    assert (found.kind, found.severity, found.joint) == ("near-singular", "fail", None) and audit.verdict == "fail"
    assert found.value < 0.004 and found.limit == 0.004
    crossed = np.interp(0.0, joints[:, 4], time)
    assert found.t_start < crossed < found.t_end and abs(found.worst_t - crossed) < 0.05 * 0.02
    assert found.last == found.first + 1 and found.worst in (found.first, found.last)
    assert "(wrist)" in found.why and "The samples beside do not show it" in found.why


def test_a_dip_below_the_warning_is_found_as_a_warning():
    cell, time, joints = crossing(0.05, sigma_min_warn=0.002, sigma_min_fail=0.001)
    joints[:, 4] = 0.03 + joints[:, 4] ** 2  # comes close and turns back, halfway between two samples
    base = pa.audit(path_of_motion(cell, time, joints), cell, start=joints[0])
    warn = 0.99 * base.rates.sigma_min.min()
    assert base.verdict == "pass"
    audit = pa.audit(base.path, cell_of(cell.arm, sigma_min_warn=warn, sigma_min_fail=0.001), start=joints[0])
    (found,) = audit.finding_list
    assert (found.kind, found.severity) == ("near-singular", "warn") and 0.98 * warn < found.value < warn
    assert found.worst_t == pytest.approx(time[20] - 0.025, abs=1e-3) and audit.verdict == "warn"


def test_what_floor_and_effort_leave_undecided_is_unproven(monkeypatch):
    cell, time, joints = crossing(0.05, sigma_min_warn=0.01, sigma_min_fail=0.01)
    joints[:, 4] = 0.04 + 0.05 * np.arange(41)  # clear of the threshold, which takes a closer look to be shown
    path = path_of_motion(cell, time, joints)
    clear = pa.audit(path, cell, start=joints[0])
    assert clear.verdict == "pass" and not clear.proof.unproven.any() and 0 < clear.proof.points.sum() < 20
    monkeypatch.setattr(between, "MOST_POINTS", 0)
    audit = pa.audit(path, cell, start=joints[0])
    (found,) = audit.finding_list
    assert audit.proof.points.sum() == 0 and audit.verdict == "warn"
    assert (found.kind, found.severity, found.joint, found.unit, found.limit) == ("unproven", "warn", None, "", 0.01)
    assert found.first == 0 and found.value < clear.proof.sigma_bound[0] and "could not be shown" in found.why
    monkeypatch.undo()
    threshold = float(clear.rates.sigma_min.min()) * (1 - 1e-12)  # the sample itself keeps it by less than rounding is allowed for
    (found,) = pa.audit(path, cell_of(cell.arm, sigma_min_warn=threshold, sigma_min_fail=0.01), start=joints[0]).finding_list
    assert found.kind == "unproven" and (1 - 1e-7) * threshold < found.value < threshold


def test_a_peak_of_joint_speed_between_samples_is_found():
    cell, joints = swaying(2)[:2]
    path = path_of_motion(cell, SWAY_TIME[::6], joints[::6])
    free = pa.Arm.from_dh([row | {"name": f"j{i + 1}", "speed_deg_s": 1000.0} for i, row in enumerate(dh_rows(*ROWS))])
    rates = pa.audit(path, cell_of(free, 0.1), start=joints[0]).rates
    joint = int(np.argmax(np.nanmax(rates.speed_share, axis=0)))
    whole = pa.audit(path, cell_of(free, 0.1), start=joints[0]).proof.speed_share[:, joint].max()
    seen = rates.speed_share[:, joint].max()
    assert whole > seen * (1 + 1e-5)
    limit = 1000.0 * 0.5 * (whole + seen)
    tight = pa.Arm.from_dh([row | {"name": f"j{i + 1}", "speed_deg_s": limit if i == joint else 1000.0} for i, row in enumerate(dh_rows(*ROWS))])
    audit = pa.audit(path, cell_of(tight, 0.1, speed_share_warn=1.0), start=joints[0])
    assert audit.finding_list and audit.verdict == "fail" and not (audit.rates.speed_share > 1.0).any()
    for found in audit.finding_list:
        assert (found.kind, found.severity, found.joint, found.unit) == ("joint speed", "fail", f"j{joint + 1}", "deg/s")
        assert found.limit == pytest.approx(limit) and found.limit < found.value < 1.001 * limit
        assert audit.time[found.first] < found.worst_t < audit.time[found.last]
    slower = audit.retime()
    assert slower.slowest < 1.0 and slower.audit().verdict == "pass"


ROWS = [0.0, 431.8, -20.32, 0.0, 0.0, 0.0], [-90.0, 0.0, 90.0, -90.0, 90.0, 0.0], [0.0, 149.09, 0.0, 433.07, 0.0, 56.25]


def test_an_end_of_travel_passed_between_samples_is_found():
    cell, joints = swaying(2)[:2]
    path = path_of_motion(cell, SWAY_TIME[::6], joints[::6])
    highest = np.degrees(joints[::6, 4].max())
    rows = [row | {"name": f"j{i + 1}", "speed_deg_s": 1000.0} for i, row in enumerate(dh_rows(*ROWS))]
    rows[4] |= {"upper_deg": highest + 1e-4}
    audit = pa.audit(path, cell_of(pa.Arm.from_dh(rows), 0.1, travel_warn_deg=0.0), start=joints[0])
    (found,) = audit.finding_list
    assert (found.kind, found.severity, found.joint) == ("joint travel", "fail", "j5") and found.value > found.limit
    assert "past the end of its travel" in found.why
    true = np.degrees(joints[:, 4].max())  # the motion that the path was made from, six times as many samples
    assert found.value == pytest.approx(true, abs=0.01)


@pytest.mark.parametrize("seed", range(4))
@pytest.mark.parametrize("style", ["even", "local"])
def test_a_retimed_audit_has_nothing_between_its_samples(seed, style):
    audit = swaying_audit(seed)
    again = audit.retime(style).audit()
    assert again.verdict == "warn" and not between_samples(again)
    assert again.proof.speed_share.max() < 1.0 and again.proof.acceleration_share.max() < 1.0
    assert audit.proof.speed_share.max() > 1.0 or audit.proof.acceleration_share.max() > 1.0


def test_a_corner_is_told_once():
    """At a corner the measured acceleration fails; what lies between the samples beside it adds no finding of its own."""
    rows = [row | {"acceleration_deg_s2": 800.0} for row in dh_rows(*ROWS)]
    time = np.linspace(0.0, 4.0, 401)
    poses = np.tile(np.diag([1.0, -1.0, -1.0, 1.0]), (401, 1, 1))
    along = 0.2 * time
    poses[:, :3, 3] = [0.5, -0.2, 0.2] + np.outer(np.minimum(along, 0.4), [0, 1, 0]) + np.outer(np.maximum(along - 0.4, 0), [-0.5, 0, 0.75**0.5])
    audit = pa.audit(path_of_poses(time, poses), cell_of(pa.Arm.from_dh(rows)))
    assert {f.joint for f in audit.finding_list if f.kind == "joint acceleration"}
    told = {f.joint for f in audit.finding_list if f.kind == "joint acceleration" and f.severity == "fail"}
    assert not told & {f.joint for f in between_samples(audit)}
    retimed = audit.retime().audit()
    assert not [f for f in retimed.finding_list if f.severity == "fail"] and not between_samples(retimed)


def test_dwells_and_air_moves_are_proven_like_the_rest():
    cell, joints = swaying(2)[:2]
    rest = np.concatenate([joints[:100], np.tile(joints[99], (50, 1)), joints[100:200]])
    process = (np.arange(250) < 120).astype(int)
    audit = pa.audit(path_of_motion(cell, 0.1 * np.arange(250), rest, process=process), cell, start=joints[0])
    kept = audit.proof
    assert kept.known.all() and not kept.unproven.any()
    still = slice(103, 145)
    np.testing.assert_allclose(kept.sigma_bound[still], audit.rates.sigma_min[still], rtol=1e-7)
    assert kept.speed_share[still].max() < 1e-6 and kept.stray_m[still].max() < 1e-9
    np.testing.assert_allclose(kept.position_low[still], audit.joints[still], atol=1e-9)


def test_where_there_is_no_motion_nothing_is_said():
    poses = np.tile(np.diag([1.0, -1.0, -1.0, 1.0]), (201, 1, 1))
    poses[:, :3, 3] = [0.5, 0.0, 0.2] + np.outer(np.linspace(0, 0.8, 201), [1.0, 0.0, 0.0])
    audit = pa.audit(path_of_poses(np.linspace(0, 4, 201), poses), cell_of(puma()))
    lost = ~audit.motion.reached
    assert lost.any() and (audit.proof.known == ~(lost[1:] | lost[:-1])).all()
    assert np.isnan(audit.proof.sigma_bound[~audit.proof.known]).all() and np.isnan(audit.proof.stray_m[~audit.proof.known]).all()
    assert not [f for f in between_samples(audit) if not audit.proof.known[f.first : f.last].all()]


def test_a_posture_jump_is_no_motion():
    cell = cell_of(puma(speed_deg_s=[400.0] * 6))
    place = 0.3 * (np.arange(10) - 4.5)
    joints = np.array([0.3, -0.5, 0.4, 0.2, 0.0, 0.3]) + np.outer(place, [0, 0, 0, 0, 1.0, 0])
    audit = pa.audit(path_of_motion(cell, 0.4 * np.arange(10), joints), cell, start=joints[0])
    assert audit.motion.jumps and not audit.proof.known[[k - 1 for k in audit.motion.jumps]].any()


@pytest.mark.parametrize("free", [False, True])
def test_bounds_hold_along_a_whole_path(free):
    """Against the path's own joint motion, sampled ten times as densely: what the audit proves of every tenth sample."""
    cell, joints = swaying(3)[:2]
    fine = pa.audit(path_of_motion(cell, SWAY_TIME, joints, spin_free=free), cell, start=joints[0])
    coarse = pa.audit(path_of_motion(cell, SWAY_TIME[::10], joints[::10], spin_free=free), cell, start=joints[0]).proof
    inside = fine.rates.sigma_min[:-1].reshape(-1, 10).min(axis=1)
    if not free:  # else the surplus joint takes another way on other samples
        assert np.all(coarse.sigma_bound <= inside + 1e-4)
        assert np.all(coarse.position_high >= joints[:-1].reshape(-1, 10, 6).max(axis=1) - 1e-3)
    assert np.all(coarse.sigma_bound <= coarse.sigma_least) and np.all(coarse.sigma_least <= np.minimum(*(s for s in _beside(coarse))))
    assert coarse.position_low.shape == (30, 6) and coarse.sigma_bound.shape == coarse.stray_m.shape == (30,)
    assert not coarse.sigma_bound.flags.writeable and "controller" in coarse.motion


def _beside(kept):
    return kept.rates.sigma_min[:-1], kept.rates.sigma_min[1:]


def test_the_reports_say_what_is_certain_between_the_samples():
    from pathaudit.report.tables import check_values
    from pathaudit.report.text import summary

    audit = swaying_audit(3)
    told, text = check_values(audit)["proof"], " ".join(summary(audit).split())
    assert told["intervals"] == 300 and told["intervals_without_motion"] == told["intervals_unproven"] == 0 and told["motion"] in text
    assert 0.9 * audit.rates.sigma_min.min() < told["sigma_min_above"] <= audit.rates.sigma_min.min()
    assert f"sigma_min stays above {told['sigma_min_above']:.3g}" in text and audit.suggestion.certificate in text
    assert 0.0 < told["off_line_mm_below"] < 0.1 and 0.0 < told["off_turn_deg_below"] < 0.1


def test_long_paths_are_proven_in_blocks(monkeypatch):
    rates = measure(swaying_audit(4).motion)
    whole = proof.prove(rates)
    monkeypatch.setattr(between, "BLOCK", 47)
    for field in ("sigma_bound", "stray_m", "stray_rad", "speed_share", "position_high", "points"):
        np.testing.assert_allclose(getattr(proof.prove(rates), field), getattr(whole, field), rtol=1e-9, atol=1e-12)


def test_the_hunt_would_find_what_is_not_looked_for(monkeypatch):
    from hunt import hunt

    monkeypatch.setattr(hidden, "find", lambda kept, found: [])
    assert hunt(8.0, seed=1)[2]


def test_no_false_pass_in_a_minute():
    from hunt import hunt

    draws, met, missed = hunt(60.0)
    assert not missed, "\n".join(missed)
    assert draws > 30 and met["pass"] and met["found: unproven"] and met["beyond between samples: near-singular"]
