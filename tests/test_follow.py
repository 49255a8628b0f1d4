"""Following a path: known motions come back, singular places are passed on the smooth branch, what cannot be reached is said."""

import numpy as np
import pytest
import reference_follower
from example_arms import cell_of, dh_rows, path_of_motion, path_of_poses, planar, puma
from hypothesis import given, settings
from hypothesis import strategies as st
from open_arms import robot_file
from outside import agrees, inputs

import pathaudit as pa
from pathaudit.kernels import linkage, rotations

FLANGE = 0.05625  # from the wrist centre of the arm of KIN-010 to its flange, m
FAST = [2000.0] * 6  # joint speeds that no test here reaches, deg/s


def of_kind(audit, kind):
    return [finding for finding in audit.finding_list if finding.kind == kind]


# --------------------------------------------------------------------------------------- the great-circle pass of a wrist


def great_circle(delta_deg, omega_deg_s, time, speed=FAST):
    """The tool of a spherical-wrist arm, held at the wrist centre, swings past the axis of joint 4 at the distance delta, at time 0.

    The audit, and the time; the tool does not spin about itself.
    """
    arm = puma(speed_deg_s=speed)
    delta, swing = np.radians(delta_deg), np.radians(omega_deg_s) * time
    closest = np.radians([10.0, -40.0, 30.0, 0.0, delta_deg, 0.0])
    cell = cell_of(arm, -FLANGE)
    forearm = linkage.poses(*cell.chain, np.radians([[10.0, -40.0, 30.0, 0.0, 0.0, 0.0]]))[0, :3, :3]
    axis = forearm @ np.cross([np.sin(delta), 0.0, np.cos(delta)], [0.0, 1.0, 0.0])
    pose = linkage.poses(*cell.chain, closest[None])[0]
    poses = np.tile(pose, (len(time), 1, 1))
    poses[:, :3, :3] = rotations.exp_vector(swing[:, None] * axis) @ pose[:3, :3]
    th4 = np.arctan2(np.sin(swing[0]), np.cos(swing[0]) * np.sin(delta))
    th5 = np.arccos(np.cos(delta) * np.cos(swing[0]))
    start = closest + [0.0, 0.0, 0.0, th4, th5 - closest[4], -th4]
    return pa.audit(path_of_poses(time, poses), cell_of(arm, -FLANGE, start=start))


def test_great_circle_peak_rate_and_time_over_the_limit():
    given = inputs("KIN-021")
    speed = [*FAST[:3], given["limit_deg_s"], *FAST[4:]]
    audit = great_circle(given["delta_deg"], given["omega_deg_s"], np.linspace(-0.3, 0.3, 6001), speed)
    (finding,) = of_kind(audit, "joint speed")
    assert finding.joint == "j4" and finding.severity == "fail" and finding.unit == "deg/s" and finding.limit == pytest.approx(360.0)
    assert finding.worst_t - audit.time[0] == pytest.approx(0.3, abs=1e-6)
    agrees("KIN-021", [np.degrees(np.abs(audit.rates.joint_speed[:, 3]).max()), finding.t_end - finding.t_start])
    assert finding.value == pytest.approx(859.611250, abs=1e-5)


def test_great_circle_retimed_in_closed_form():
    """KIN-021 without acceleration limits: an even factor is limit / peak; slowing locally takes the swing over the limit in between."""
    given = inputs("KIN-021")
    speed = [*FAST[:3], given["limit_deg_s"], *FAST[4:]]
    audit = great_circle(given["delta_deg"], given["omega_deg_s"], np.linspace(-0.3, 0.3, 6001), speed)
    even, local = audit.retime("even"), audit.retime("local")
    assert even.slowest == pytest.approx(360.0 / 859.6112504, rel=2e-6) and np.ptp(even.factor) < 1e-12
    edge = np.radians(given["omega_deg_s"] * 0.15718192640 / 2.0)
    swing_deg = 2.0 * np.degrees(np.arctan2(np.tan(edge), np.sin(np.radians(given["delta_deg"]))))
    assert local.duration == pytest.approx(0.6 - 0.15718192640 + swing_deg / 360.0, rel=1e-5)
    for retiming in (even, local):
        again = retiming.audit()
        assert retiming.feasible and again.rates.speed_share.max() <= 1 + 1e-6
        assert all(finding.severity == "warn" for finding in of_kind(again, "joint speed"))


def test_great_circle_swings_the_wrist_by_half_a_turn():
    given = inputs("KIN-022")
    audit = great_circle(given["delta_deg"], given["omega_deg_s"], np.linspace(-3.0, 3.0, 3001))
    th4, th5 = np.degrees(audit.joints[:, 3]), np.degrees(audit.joints[:, 4])
    agrees("KIN-022", [th4[-1] - th4[0], th5.min()])
    assert np.all(np.diff(th4) > 0) and not of_kind(audit, "posture jump")


def test_great_circle_turns_joint_6_against_joint_4():
    given = inputs("KIN-023")
    audit = great_circle(given["delta_deg"], given["omega_deg_s"], given["t_s"] * np.arange(-200, 201) / 100.0)
    agrees("KIN-023", np.degrees(audit.rates.joint_speed[300, 5]))


def test_coarse_samples_do_not_hide_the_peak():
    """Joint differences over 80 ms see 15 % less than the peak of KIN-021; the rates come from the Jacobian and see it all."""
    given = inputs("KIN-021")
    time = np.arange(-10, 11) * 0.08
    audit = great_circle(given["delta_deg"], given["omega_deg_s"], time)
    differences = np.degrees(np.diff(audit.joints[:, 3]) / np.diff(time))
    assert differences.max() < 0.85 * 859.611250
    assert np.degrees(audit.rates.joint_speed[10, 3]) == pytest.approx(859.611250, abs=1e-3)


@pytest.mark.parametrize("delta_deg", [0.05, 2.0, -2.0])
def test_great_circle_in_closed_form(delta_deg):
    audit = great_circle(delta_deg, 30.0, np.linspace(-1.0, 1.0, 101))
    swing, delta = np.radians(30.0) * audit.time, np.radians(delta_deg)
    th4 = np.unwrap(np.arctan2(np.sin(swing), np.cos(swing) * np.sin(delta)))
    th5 = np.arccos(np.cos(delta) * np.cos(swing))
    np.testing.assert_allclose(audit.joints[:, 3:5], np.stack([th4, th5], axis=1), atol=1e-6)
    assert audit.motion.deviation_m.max() < 1e-9 and audit.motion.deviation_rad.max() < 1e-9


# --------------------------------------------------------------------------------------------------- straight through th5 = 0


@pytest.mark.parametrize("samples", [201, 200])
@pytest.mark.parametrize("moving", [False, True])
def test_a_crossing_of_the_wrist_singularity_stays_smooth(samples, moving):
    """KIN-027: th5 changes sign; keeping it positive would turn joints 4 and 6 by 180 degrees. 201 samples hit th5 = 0 exactly."""
    time = np.linspace(-1.0, 1.0, samples)
    turns = np.radians([[10.0, -40.0, 20.0, 30.0, 0.0, 50.0]]) + np.outer(time, np.radians([5.0, -8.0, 6.0, 0.0, 20.0, 0.0]) * [moving, moving, moving, 0, 1, 0])
    cell = cell_of(puma(speed_deg_s=FAST), 0.1, start=turns[0])
    audit = pa.audit(path_of_motion(cell, time, turns), cell)
    assert audit.motion.reached.all() and not of_kind(audit, "posture jump")
    np.testing.assert_allclose(audit.joints, turns, atol=1e-6)
    assert of_kind(audit, "near-singular")


def test_a_crossing_of_the_shoulder_singularity_stays_smooth():
    time = np.linspace(0.0, 4.0, 801)
    joints, speed, _ = wave([0.2, -0.7, 0.5, 0.5, 0.9, 0.3], 0.3, time)
    cell = cell_of(puma(speed_deg_s=FAST), 0.1, start=joints[0])
    assert np.count_nonzero(np.diff(np.sign(np.linalg.det(cell.arm.jacobian(joints))))) == 2
    audit = pa.audit(path_of_motion(cell, time, joints), cell)
    np.testing.assert_allclose(audit.joints, joints, atol=1e-6)


@pytest.mark.parametrize("seed", range(40))
def test_coarse_crossings_stay_smooth(seed):
    """Random motions around the shoulder singularity, 20 ms apart, most of which cross it: the known motion comes back all the same."""
    random, time = np.random.default_rng(seed), np.linspace(0.0, 3.0, 151)
    middle = [0.2, -0.7 + random.uniform(-0.2, 0.2), 0.5 + random.uniform(-0.2, 0.2), 0.5, 0.9, 0.3]
    joints = middle + random.uniform(0.05, 0.4, 6) * np.sin(np.outer(time, random.uniform(0.5, 2.5, 6)) + random.uniform(0, 6, 6))
    cell = cell_of(puma(speed_deg_s=FAST), 0.1, start=joints[0])
    audit = pa.audit(path_of_motion(cell, time, joints), cell)
    np.testing.assert_allclose(audit.joints, joints, atol=1e-5)
    assert not audit.motion.jumps


# ------------------------------------------------------------------------------------------------- known motions come back


def wave(middle, size, time):
    """Smooth joint motion (N, n) around `middle`, its speeds and its accelerations."""
    middle, size = np.array(middle, dtype=float), np.broadcast_to(np.asarray(size, dtype=float), np.shape(middle))
    rate = 0.8 + 0.15 * np.arange(len(middle))
    angle = np.outer(time, rate) + np.arange(len(middle))
    return middle + size * np.sin(angle), size * rate * np.cos(angle), -size * rate**2 * np.sin(angle)


def slider():
    """A portal: three slides and a spherical wrist."""
    rows = dh_rows([0.0] * 6, [-90.0, -90.0, 0.0, -90.0, 90.0, 0.0], [0.0] * 6)
    for row, theta in zip(rows[:3], (0.0, -90.0, 0.0), strict=True):
        for key in ("lower_deg", "upper_deg", "speed_deg_s"):
            del row[key]
        row |= {"type": "prismatic", "theta_deg": theta, "lower_mm": -2000.0, "upper_mm": 2000.0, "speed_mm_s": 3000.0}
    return pa.Arm.from_dh(rows)


KNOWN = {
    "spherical wrist": (puma, [0.2, -0.4, 0.2, 0.5, 0.9, 0.3], 0.25),
    "three parallel axes": (lambda: pa.Arm.from_urdf(robot_file("ur_description/urdf/ur5_robot.urdf"), tip="tool0"), [0.3, -1.1, 1.4, -0.7, 0.9, 0.2], 0.2),
    "endless joints": (
        lambda: pa.Arm.from_urdf(robot_file("kinova_description/robots/kinova.urdf"), tip="j2s6s200_end_effector"), [0.5, 2.9, 1.3, 4.2, 1.4, 0.3], 0.2,
    ),
    "slides": (slider, [0.4, 0.3, -0.2, 0.5, 0.9, 0.3], 0.2),
}  # fmt: skip


@pytest.mark.parametrize("name", KNOWN)
def test_a_known_motion_comes_back(name):
    make, middle, size = KNOWN[name]
    time = np.linspace(0.0, 4.0, 801)
    joints, speed, acceleration = wave(middle, size, time)
    cell = cell_of(make(), 0.1, start=joints[0])
    audit = pa.audit(path_of_motion(cell, time, joints), cell)
    np.testing.assert_allclose(audit.joints, joints, atol=2e-8)
    np.testing.assert_allclose(audit.rates.joint_speed, speed, atol=2e-6)
    np.testing.assert_allclose(audit.rates.joint_acceleration, acceleration, atol=2e-3)
    assert max(audit.motion.deviation_m.max(), audit.motion.deviation_rad.max()) < 1e-9


def test_a_stated_start_picks_the_posture():
    time = np.linspace(0.0, 1.0, 101)
    joints = wave(KNOWN["spherical wrist"][1], 0.2, time)[0]
    flipped = joints * [1, 1, 1, 1, -1, 1] + [0, 0, 0, np.pi, 0, np.pi]
    for expected in (joints, flipped):
        cell = cell_of(puma(), 0.1, start=expected[0] + 0.05)
        audit = pa.audit(path_of_motion(cell, time, joints), cell)
        np.testing.assert_allclose(audit.joints, expected, atol=1e-8)


# --------------------------------------------------------------------------------------------------- more joints than the task


def dense_and_path(cell, time, joints, substeps, **options):
    fine = np.linspace(time[0], time[-1], substeps * (len(time) - 1) + 1)
    return linkage.poses(*cell.chain, joints(fine)), path_of_motion(cell, time, joints(time), **options)


def test_a_redundant_arm_moves_its_joints_least():
    arm = pa.Arm.from_urdf(robot_file("xarm_description/urdf/xarm7.urdf"), tip="link_eef")
    middle = np.array([0.2, 0.2, -0.3, 1.6, 0.4, 0.9, -0.7])
    time = np.linspace(0.0, 2.0, 201)
    start = wave(middle, 0.2, time)[0][0]
    cell = cell_of(arm, 0.1, start=start)
    fine, path = dense_and_path(cell, time, lambda t: wave(middle, 0.2, t)[0], 8)
    audit = pa.audit(path, cell)
    assert audit.motion.reached.all() and audit.motion.deviation_m.max() < 1e-9
    least = reference_follower.follow(cell.chain, fine, start)[::8]
    np.testing.assert_allclose(audit.joints, least, atol=2e-3)
    assert np.abs(audit.joints - wave(middle, 0.2, time)[0]).max() > 0.01  # the motion that drew the path was not the least


def test_free_spin_moves_the_joints_least():
    middle, time = np.array(KNOWN["spherical wrist"][1]), np.linspace(0.0, 2.0, 201)
    start = wave(middle, 0.25, time)[0][0]
    cell = cell_of(puma(), 0.1, start=start)
    fine, path = dense_and_path(cell, time, lambda t: wave(middle, 0.25, t)[0], 8, spin_free=True)
    assert path.spin_free
    audit = pa.audit(path, cell)
    reached = linkage.poses(*cell.chain, audit.joints)
    np.testing.assert_allclose(reached[:, :3, 3], path.position, atol=1e-9)
    np.testing.assert_allclose(reached[:, :3, 2], path.rotation[:, :, 2], atol=2e-9)
    least = reference_follower.follow(cell.chain, fine, audit.joints[0], rows=5)[::8]
    np.testing.assert_allclose(audit.joints, least, atol=2e-3)


def test_five_joints_hold_a_tool_axis():
    arm = pa.Arm.from_urdf(robot_file("so_arm_description/urdf/so101.urdf"), tip="gripper_frame_link")
    time = np.linspace(0.0, 2.0, 201)
    joints, speed, _ = wave([0.2, -0.4, 0.3, 0.5, 0.1], 0.2, time)
    cell = cell_of(arm, 0.05, start=joints[0])
    audit = pa.audit(path_of_motion(cell, time, joints, spin_free=True), cell)
    np.testing.assert_allclose(audit.joints, joints, atol=1e-7)
    np.testing.assert_allclose(audit.rates.joint_speed, speed, atol=1e-5)


# ------------------------------------------------------------------------------------------------------- what is out of reach

LONGEST = 0.4318 + np.hypot(0.02032, 0.43307)  # upper arm and forearm of the arm of KIN-010 in one line, m
OFFSET = 0.14909  # of the arm's plane from axis 1, m


def reach_and_return(furthest, samples=301):
    """A path of the wrist centre straight out from the shoulder and back, at a fixed tool orientation; which samples can be reached."""
    time = np.linspace(0.0, 3.0, samples)
    out = 0.6 + (furthest - 0.6) * np.sin(np.pi * time / 3.0) ** 2
    poses = np.tile(np.eye(4), (samples, 1, 1))
    poses[:, :3, :3] = rotations.matrix_from_rpy_deg([0.0, 60.0, 20.0])
    poses[:, 0, 3], poses[:, 1, 3], poses[:, 2, 3] = out, 0.2, 0.1
    from_shoulder = np.sqrt(out**2 + 0.2**2 + 0.1**2 - OFFSET**2)
    return path_of_poses(time, poses), from_shoulder <= LONGEST


def test_what_is_out_of_reach_is_said_and_the_rest_is_audited():
    path, reachable = reach_and_return(0.95)
    assert 50 < np.count_nonzero(~reachable) < 150
    audit = pa.audit(path, cell_of(puma(speed_deg_s=FAST), -FLANGE))
    np.testing.assert_array_equal(audit.motion.reached, reachable)
    np.testing.assert_array_equal(np.isnan(audit.joints).all(axis=1), ~reachable)
    assert np.isfinite(audit.rates.joint_speed[reachable]).all() and np.isnan(audit.rates.joint_speed[~reachable]).all()
    middle = path.samples // 2
    assert "too far" in audit.motion.reasons[middle] and "mm" in audit.motion.reasons[middle]
    assert set(audit.motion.reasons) == set(np.flatnonzero(~reachable))
    least = np.sqrt(0.95**2 + 0.2**2 + 0.1**2) - np.hypot(LONGEST, OFFSET)  # no closer than this to the outermost pose
    assert least - 1e-6 < audit.motion.deviation_m[middle] < 3 * least
    (finding,) = of_kind(audit, "unreachable")
    assert finding.severity == "fail" and audit.verdict == "fail"
    first, last = np.flatnonzero(~reachable)[[0, -1]]
    assert (finding.first, finding.last) == (first, last)
    assert audit.findings.notna().all(axis=None) or audit.findings["joint"].isna().any()


def test_all_in_reach_when_it_ends_just_before():
    path, reachable = reach_and_return(np.sqrt((LONGEST - 1e-4) ** 2 + OFFSET**2 - 0.2**2 - 0.1**2))
    assert reachable.all()
    audit = pa.audit(path, cell_of(puma(speed_deg_s=FAST), -FLANGE))
    assert audit.motion.reached.all() and not of_kind(audit, "unreachable") and not of_kind(audit, "posture jump")
    assert of_kind(audit, "near-singular")


def test_too_close_to_axis_1_is_out_of_reach():
    time = np.linspace(0.0, 2.0, 201)
    poses = np.tile(np.eye(4), (len(time), 1, 1))
    poses[:, :3, :3] = rotations.matrix_from_rpy_deg([0.0, 150.0, 0.0])
    across = np.linspace(0.4, 0.05, len(time))
    poses[:, 0, 3], poses[:, 1, 3], poses[:, 2, 3] = across, 0.0, 0.5
    audit = pa.audit(path_of_poses(time, poses), cell_of(puma(speed_deg_s=FAST), -FLANGE))
    np.testing.assert_array_equal(audit.motion.reached, across >= OFFSET)


# ---------------------------------------------------------------------------------------------------------- nothing is hidden


@settings(max_examples=60, deadline=None)
@given(st.integers(0, 2**32 - 1), st.sampled_from([(5, True), (6, False), (6, True), (7, False), (8, True)]), st.integers(20, 120))
def test_whatever_the_arm_and_the_path_nothing_is_hidden(seed, kind, samples):
    """Any arm through any path of its own: what counts as reached is reached, and what moves too fast between two samples is a finding."""
    (n, spin_free), random = kind, np.random.default_rng(seed)
    rows = dh_rows(random.uniform(-400, 400, n), random.choice([-90.0, 0.0, 90.0, 37.0], n), random.uniform(-300, 300, n))
    time = np.linspace(0.0, 2.0, samples)
    joints = random.uniform(-2, 2, n) + random.uniform(0.1, 1.0, n) * np.sin(np.outer(time, random.uniform(0.5, 3.0, n)) + random.uniform(0, 6, n))
    cell = cell_of(pa.Arm.from_dh(rows), 0.1, start=joints[0])
    path = path_of_motion(cell, time, joints, spin_free=spin_free)
    audit = pa.audit(path, cell)

    reached = audit.motion.reached
    assert reached[0]
    poses = linkage.poses(*cell.chain, audit.joints[reached])
    off = np.linalg.norm(poses[:, :3, 3] - path.position[reached], axis=1)
    np.testing.assert_allclose(off, audit.motion.deviation_m[reached], atol=1e-9)
    axes = np.einsum("kij,kij->kj", poses[:, :3, :3], path.rotation[reached])
    turned = np.arccos(np.clip(axes[:, 2] if spin_free else (axes.sum(axis=1) - 1.0) / 2.0, -1.0, 1.0))
    assert np.all(turned <= audit.motion.deviation_rad[reached] + 5e-8)  # the arc cosine sees no less
    late = np.flatnonzero(reached & ((audit.motion.deviation_m > 1e-9) | (audit.motion.deviation_rad > 1e-9)))
    loose = audit.cell.thresholds
    assert np.all(audit.motion.deviation_m[late] <= loose.deviation_mm / 1000) and np.all(audit.motion.deviation_rad[late] <= np.radians(loose.deviation_deg))

    share = np.abs(np.diff(audit.joints, axis=0)).T / np.diff(time) / cell.arm.speed[:, None]
    for joint, k in np.argwhere(share > 1.02):  # below that, what the rates at the samples say stands
        said = [
            f for f in audit.finding_list
            if f.severity == "fail" and f.last >= k and f.first <= k + 1
            and (f.kind == "posture jump" or (f.kind == "joint speed" and f.joint == cell.arm.joint_names[joint]))
        ]  # fmt: skip
        assert said, f"joint {joint} moves at {share[joint, k]:.2f} of its limit between samples {k} and {k + 1}, and no finding says so"


def test_a_planar_arm_starts_where_rounded_poses_let_it():
    """Two joints cannot meet a pose that a file has rounded, only come within the rounding; that is a start all the same."""
    time = np.linspace(0.0, 1.0, 51)
    turns = np.stack([0.3 * np.sin(time), 1.0 + 0.5 * np.cos(time)], axis=1)
    arm = planar(0.5, 0.4)
    poses = arm.flange_pose(turns)
    poses[:, :3, 3] = poses[:, :3, 3].round(7)
    for start in (None, turns[0]):
        motion = pa.audit(path_of_poses(time, poses), cell_of(arm, start=start)).motion
        assert motion.reached.all() and motion.start_reason.startswith("Starts ") and 0.0 < motion.deviation_m.max() < 1e-6
