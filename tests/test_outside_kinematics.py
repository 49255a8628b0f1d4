"""Arms, Jacobians, capacities and rotations against the outside values (references/README.md): each test names its rows."""

import hashlib

import numpy as np
import pytest
from example_arms import dh_rows, planar, puma, sixteen, square
from open_arms import Reference, robot_file
from outside import ROWS, agrees, inputs
from scipy.optimize import brentq

import pathaudit as pa
from pathaudit import capacity
from pathaudit.kernels import rotations, steps

PLANE = slice(0, 2)  # the task rows of a planar arm


def two_link(row_id):
    """Jacobian (2, 2) of the planar arm of a row, and the row's inputs."""
    given = inputs(row_id)
    lengths = (given["l1"], given["l2"]) if "l1" in given else (given["l"], given["l"])
    return planar(*lengths).jacobian(np.radians(given["th_deg"]))[PLANE], given


# --------------------------------------------------------------------------------------------- manipulability and conditioning


def test_manipulability_of_a_planar_arm():
    agrees("KIN-001", capacity.manipulability(two_link("KIN-001")[0]))


@pytest.mark.parametrize("row_id", ["KIN-002", "KIN-003"])
def test_singular_values_of_planar_arms(row_id):
    longest, shortest = capacity.velocity_ellipsoid(two_link(row_id)[0]).semi_axes
    agrees(row_id, [longest, shortest, longest / shortest])


def test_isotropic_three_link_arm_and_its_characteristic_length():
    r = inputs("KIN-004")["r"]
    side = np.sqrt(3.0) * r  # axes at 90, 210 and 330 degrees around the tip
    jacobian = planar(side, side, r).jacobian(np.radians([240.0, 120.0, 150.0]))[[0, 1, 5]]
    length = np.linalg.norm(jacobian[0]) / np.linalg.norm(jacobian[2])
    sigma = capacity.velocity_ellipsoid(jacobian / [[length], [length], [1.0]]).semi_axes
    agrees("KIN-004", [length, sigma[0] / sigma[-1]])


def test_frobenius_condition():
    agrees("KIN-004b", capacity.frobenius_condition(inputs("KIN-004b")["J"]))


def test_a_condition_number_needs_a_length():
    given = inputs("KIN-005")
    arm = pa.Arm.from_urdf(robot_file(given["file"]), tip=given["tip"])
    jacobian = arm.jacobian(given["q"])

    def condition(length):
        sigma = capacity.velocity_ellipsoid(np.vstack([jacobian[:3] / length, jacobian[3:]])).semi_axes
        return sigma[0] / sigma[-1]

    agrees("KIN-005", [condition(1.0), condition(0.001), condition(given["L"])])


# ------------------------------------------------------------------------------------------------------- spherical-wrist arms


def puma_determinant(q_deg):
    return np.linalg.det(puma().jacobian(np.radians(q_deg)))


def test_published_arm_matrix():
    pose = puma().flange_pose(np.radians(inputs("KIN-010")["q_deg"]))
    pose[:3, 3] *= 1000.0
    agrees("KIN-010", pose)


def test_both_conventions_describe_the_same_arm():
    given = inputs("KIN-011")
    q = np.random.default_rng(given["seed"]).uniform(-np.pi, np.pi, (given["n_random"], 6))
    difference = puma("standard").flange_pose(q) - puma("modified").flange_pose(q)
    difference[:, :3, 3] *= 1000.0
    agrees("KIN-011", np.abs(difference).max())


def test_factored_determinant():
    agrees("KIN-012", puma_determinant(inputs("KIN-012")["q_deg"]))


def test_wrist_singularity_and_its_null_vector():
    jacobian = puma().jacobian(np.radians(inputs("KIN-013")["q_deg"]))
    _, sigma, right = np.linalg.svd(jacobian)
    agrees("KIN-013", [sigma[-1], *(right[-1] * np.sign(right[-1, 3]))])


def test_elbow_singularity():
    def determinant(th3_deg, th2_deg):
        return puma_determinant([10.0, th2_deg, th3_deg, 30.0, 40.0, 50.0])

    # folded, the arm has its wrist centre 2 mm beside axis 1: only a level upper arm keeps the two singularities apart
    folded = brentq(determinant, -90.0, -84.0, args=(0.0,), xtol=1e-12)
    stretched = brentq(determinant, 50.0, 120.0, args=(-40.0,), xtol=1e-12)
    agrees("KIN-014", [folded, stretched])


def test_shoulder_singularity_brings_the_wrist_centre_closest_to_axis_1():
    th3_deg, arm = inputs("KIN-015")["th3_deg"], puma()

    def posture(th2_deg):
        return [10.0, th2_deg, th3_deg, 30.0, 40.0, 50.0]

    th2_deg = brentq(lambda th2: puma_determinant(posture(th2)), -120.0, -60.0, xtol=1e-12)
    pose = arm.flange_pose(np.radians(posture(th2_deg)))
    wrist = pose[:3, 3] - 0.05625 * pose[:3, 2]
    agrees("KIN-015", [th2_deg, 1000.0 * np.hypot(wrist[0], wrist[1])])


def test_wrist_flip_is_the_same_orientation():
    q = np.array(inputs("KIN-027")["q_deg"], dtype=float)
    flipped = q + [0.0, 0.0, 0.0, 180.0, -2.0 * q[4], 180.0]
    difference = puma().flange_pose(np.radians(q)) - puma().flange_pose(np.radians(flipped))
    difference[:3, 3] *= 1000.0
    agrees("KIN-027", np.abs(difference).max())


# -------------------------------------------------------------------------------------------------- sixteen postures of a pose


def test_a_posture_in_closed_form_reaches_the_recalled_and_the_exact_pose():
    pose = sixteen().flange_pose(np.radians(ROWS["KIN-019"]["expected"]))
    agrees("KIN-019b", pose[:3])
    np.testing.assert_allclose(pose, square(inputs("KIN-018")["pose"]), atol=1e-12)


def test_search_finds_all_sixteen_postures():
    arm, pose = sixteen(), square(inputs("KIN-018")["pose"])
    seeds = np.random.default_rng(1).uniform(-np.pi, np.pi, (1500, 6))
    q, left = steps.solve(arm.chain, 1.0, 6, pose[:3, 3], pose[:3, :3], seeds)
    found = np.degrees(q[np.all(left < 1e-9, axis=1)])
    agrees("KIN-018", len(np.unique(np.round(np.mod(found + 0.01, 360.0), 1), axis=0)))
    apart = np.mod(found - ROWS["KIN-019"]["expected"] + 180.0, 360.0) - 180.0
    agrees("KIN-019", ROWS["KIN-019"]["expected"] + apart[np.argmin(np.abs(apart).max(axis=1))])


# --------------------------------------------------------------------------------------------------------- rates and steps


def test_elbow_rate_near_full_stretch():
    given = inputs("KIN-025")
    arm, q = planar(given["l"], given["l"]), np.radians([0.0, given["th2_deg"]])
    tip = arm.flange_pose(q)[PLANE, 3]
    rates = capacity.damped_step(arm.jacobian(q)[PLANE], given["rdot"] * tip / np.linalg.norm(tip), 0.0)
    agrees("KIN-025", rates[1])


def test_newton_steps_of_a_planar_arm():
    given = inputs("KIN-028")
    arm, q, walked = planar(*given["l"]), np.array(given["q0"]), []
    for _ in range(given["n"]):
        q = q + capacity.damped_step(arm.jacobian(q)[PLANE], given["target"] - arm.flange_pose(q)[PLANE, 3], 0.0)
        walked.extend(q)
    agrees("KIN-028", walked)


def test_damped_steps_of_a_stretched_arm():
    given = inputs("KIN-030")
    agrees("KIN-030", [capacity.damped_step(given["J"], v, given["lam"]) for v in given["v"]])


def test_damping_bounds_the_gain():
    damping = inputs("KIN-031")["lam"]
    gains = [capacity.damped_step([[sigma]], [1.0], damping)[0] for sigma in np.linspace(0.01, 0.09, 81)]
    agrees("KIN-031", max(gains))


def test_variable_damping_laws():
    given = inputs("KIN-032")
    agrees("KIN-032", capacity.damping_by_manipulability(given["w"], given["w0"], given["lam0"]) ** 2)
    given = inputs("KIN-033")
    agrees("KIN-033", capacity.damping_by_singular_value(given["sigma"], given["eps"], given["lam_max"]) ** 2)


def test_numerical_filtering_leaves_the_other_directions_alone():
    given = inputs("KIN-034")
    turn = np.linalg.qr(np.random.default_rng(3).normal(size=(2, 3, 3)))[0]
    jacobian = turn[0] @ np.diag(given["sig"]) @ turn[1].T
    steps = [capacity.damped_step(jacobian, direction, [0.0, 0.0, given["beta"]]) for direction in turn[0].T]
    agrees("KIN-034", np.linalg.norm(steps, axis=1))


def test_demand_left_undone_by_damping():
    given = inputs("KIN-035")
    agrees("KIN-035", 1.0 - given["sigma"] * capacity.damped_step([[given["sigma"]]], [1.0], given["lam"])[0])


def test_least_norm_and_weighted_rates():
    given = inputs("KIN-036")
    jacobian = planar(*given["l"]).jacobian(np.radians(given["q_deg"]))[PLANE]
    agrees("KIN-036", capacity.damped_step(jacobian, given["v"], 0.0))
    given = inputs("KIN-037")
    agrees("KIN-037", capacity.weighted_step(jacobian, given["v"], given["W"]))


# ---------------------------------------------------------------------------------------------------------- speeds and forces

AXES = np.array([[1.0, 0.0], [0.0, 1.0], [np.sqrt(0.5), np.sqrt(0.5)]])


def test_speed_exactly_along_a_direction_and_component_along_it():
    jacobian, given = two_link("KIN-040")
    agrees("KIN-040", [capacity.largest_speed(jacobian, u, given["qdmax"]) for u in AXES])
    agrees("KIN-041", [capacity.largest_component(jacobian, u, given["qdmax"]) for u in AXES])


def test_velocity_polytope():
    jacobian, given = two_link("KIN-042")
    polytope = capacity.velocity_polytope(jacobian, given["qdmax"])
    agrees("KIN-042", [*sorted(np.round(polytope.vertices, 12).tolist()), [polytope.size, 0.0]])


def test_joint_torques_that_hold_a_mass():
    jacobian, given = two_link("KIN-045")
    agrees("KIN-045", jacobian.T @ [0.0, given["m"] * given["g"]])


def test_velocity_and_force_ellipsoids_share_their_axes():
    jacobian, _ = two_link("KIN-046")
    speed_axes, speeds = capacity.velocity_ellipsoid(jacobian)
    force_axes, forces = capacity.force_ellipsoid(jacobian)
    across = np.cross(np.r_[speed_axes[:, 0], 0.0], np.r_[force_axes[:, 1], 0.0])[2]
    agrees("KIN-046", [speeds[0] * forces[1], speeds[1] * forces[0], np.arcsin(across)])


def test_largest_force():
    jacobian, given = two_link("KIN-047")
    agrees("KIN-047", [capacity.largest_force(jacobian, u, given["taumax"]) for u in given["u"]])


# ------------------------------------------------------------------------------------------------------------------ rotations


def test_rotation_between_two_orientations():
    first, second = (rotations.matrix_from_rpy_deg(inputs("KIN-050")[key]) for key in ("rpy1_deg", "rpy2_deg"))
    turn = rotations.log_matrix(second @ first.T)
    agrees("KIN-050", [*turn, np.degrees(np.linalg.norm(turn))])


def test_constant_turn():
    given = inputs("KIN-051")
    turn = np.radians(given["angle_deg"]) * np.array(given["axis"]) / np.linalg.norm(given["axis"])
    w, x, y, z = rotations.wxyz_from_matrix(rotations.exp_vector(turn / 2.0))
    agrees("KIN-051", [*np.degrees(rotations.log_matrix(rotations.exp_vector(turn)) / given["T"]), x, y, z, w])


def test_angular_velocity_is_not_the_rates_of_the_angles():
    given, h = inputs("KIN-052"), 1e-4
    start, rates = np.radians(given["rpy_deg"]), np.array(given["rates"])
    turns = [
        rotations.log_matrix(rotations.matrix_from_rpy(start + k * h * rates) @ rotations.matrix_from_rpy(start - k * h * rates).T)
        for k in (1, 2)
    ]
    agrees("KIN-052", (8.0 * turns[0] - turns[1]) / (12.0 * h))


# ------------------------------------------------------------------------------------------------------------------ open arms


@pytest.mark.parametrize("row_id", [f"ROB-00{k}" for k in range(1, 8)])
def test_pose_and_jacobian_of_open_arms(row_id):
    given = inputs(row_id)
    file = robot_file(given["file"])
    if not hashlib.sha256(file.read_bytes()).hexdigest().startswith(given["sha256_16"]):
        pytest.skip(f"this wheel holds another version of {file.name} than the values were computed from")
    arm = pa.Arm.from_urdf(file, tip=given["tip"])
    pose = arm.flange_pose(given["q"])
    sigma = capacity.velocity_ellipsoid(arm.jacobian(given["q"])).semi_axes
    agrees(row_id, [*pose[:3, 3], *rotations.log_matrix(pose[:3, :3]), np.prod(sigma), sigma[0] / sigma[-1]])


@pytest.mark.parametrize("row_id", [f"ROB-04{k}" for k in range(1, 8)])
def test_limits_of_open_arms(row_id):
    given = inputs(row_id)
    arm = pa.Arm.from_urdf(robot_file(given["file"]), tip=given["tip"])
    endless = np.isinf(arm.lower) & np.isinf(arm.upper)  # the row writes 0, 0 where a joint has no end stops
    travel = np.where(endless, 0.0, [arm.lower, arm.upper])
    agrees(row_id, np.column_stack([*travel, arm.speed, arm.effort]))
    np.testing.assert_array_equal(endless, ~np.array(ROWS[row_id]["expected"])[:, :2].any(axis=1))


def test_a_jacobian_says_where_and_in_which_axes():
    import pinocchio

    given = inputs("KIN-053")
    file = robot_file(given["file"])
    arm, reference = pa.Arm.from_urdf(file, tip=given["tip"]), Reference(file)
    jacobian, pose = arm.jacobian(given["q"]), arm.flange_pose(given["q"])
    rotation, position = pose[:3, :3], pose[:3, 3]
    in_tip_axes = np.vstack([rotation.T @ jacobian[:3], rotation.T @ jacobian[3:]])
    at_origin = np.vstack([jacobian[:3] + np.cross(position, jacobian[3:], axisb=0, axisc=0), jacobian[3:]])
    frame = reference.model.getFrameId(given["tip"])
    for own, axes in ((in_tip_axes, pinocchio.ReferenceFrame.LOCAL), (at_origin, pinocchio.ReferenceFrame.WORLD)):
        other = pinocchio.computeFrameJacobian(reference.model, reference.data, np.array(given["q"]), frame, axes)
        agrees("KIN-053", np.abs(own - other).max())


# --------------------------------------------------------------------------------------------- the robot description format


def description(tmp_path, joints):
    """A robot description of links l0, l1, ... joined by the given inner XML, one (type, inner) a joint."""
    links = "".join(f'<link name="l{i}"/>' for i in range(len(joints) + 1))
    chain = "".join(
        f'<joint name="j{i + 1}" type="{kind}"><parent link="l{i}"/><child link="l{i + 1}"/>{inner}</joint>'
        for i, (kind, inner) in enumerate(joints)
    )
    file = tmp_path / "arm.urdf"
    file.write_text(f'<robot name="arm">{links}{chain}</robot>', encoding="utf-8")
    return file


LIMIT = '<limit lower="-1" upper="2" effort="3" velocity="4"/>'


def test_origin_angles_turn_about_fixed_axes(tmp_path):
    rpy = " ".join(map(str, inputs("URD-001")["rpy"]))
    file = description(tmp_path, [("revolute", f'<origin rpy="{rpy}"/>{LIMIT}')])
    agrees("URD-001", pa.Arm.from_urdf(file).flange_pose([0.0])[:3, :3])


def test_axes_are_normalised_and_x_by_default(tmp_path):
    """URD-002."""
    file = description(tmp_path, [("revolute", f'<axis xyz="0 0 2"/>{LIMIT}'), ("revolute", LIMIT), ("prismatic", LIMIT)])
    jacobian = pa.Arm.from_urdf(file).jacobian([0.0, 0.0, 0.5])
    np.testing.assert_allclose(jacobian[3:, :2], [[0.0, 1.0], [0.0, 0.0], [1.0, 0.0]], atol=1e-15)
    np.testing.assert_allclose(jacobian[:, 2], [1.0, 0.0, 0.0, 0.0, 0.0, 0.0], atol=1e-15)


def test_travel_that_is_not_stated_is_zero_and_a_locked_joint_is_refused(tmp_path):
    """URD-002: lower = upper = 0 where the file says neither."""
    with pytest.raises(pa.PathAuditError, match="lower and upper both 0"):
        pa.Arm.from_urdf(description(tmp_path, [("revolute", '<limit effort="3" velocity="4"/>')]))


@pytest.mark.parametrize("limit", ["", '<limit lower="-1" upper="1" velocity="1"/>', '<limit lower="-1" upper="1" effort="1"/>'])
def test_what_the_format_demands_of_limits(tmp_path, limit):
    assert ROWS["URD-003"]["expected"] == [True, True, True]
    with pytest.raises(pa.PathAuditError, match="joint 'j1'.*limit"):
        pa.Arm.from_urdf(description(tmp_path, [("revolute", limit)]))


def test_endless_joints_drop_their_travel(tmp_path):
    file = description(tmp_path, [("revolute", LIMIT), ("continuous", LIMIT), ("prismatic", LIMIT)])
    arm = pa.Arm.from_urdf(file)
    assert ROWS["URD-004"]["expected"][1] == len(arm.joint_names)
    np.testing.assert_array_equal(arm.lower, [-1.0, -np.inf, -1.0])
    np.testing.assert_array_equal(arm.upper, [2.0, np.inf, 2.0])
    np.testing.assert_array_equal(arm.speed, [4.0, 4.0, 4.0])


def test_followers_are_refused(tmp_path):
    """URD-005: q = 2 * 0.4 + 0.5; a serial chain that took the follower for free would be wrong by 1.3 rad."""
    mimic = LIMIT + '<mimic joint="j1" multiplier="2" offset="0.5"/>'
    file = description(tmp_path, [("revolute", LIMIT), ("revolute", mimic)])
    with pytest.raises(pa.PathAuditError, match="j2"):
        pa.Arm.from_urdf(file)


def test_modified_rows_as_joint_origins(tmp_path):
    given, table = inputs("URD-006"), inputs("KIN-011")["mod"]
    joints = []
    for a, alpha_deg, d in zip(table["a_prev"], table["alpha_prev_deg"], table["d"], strict=True):
        alpha = np.radians(alpha_deg)
        xyz = f"{a / 1000} {-d / 1000 * np.sin(alpha)} {d / 1000 * np.cos(alpha)}"
        joints.append(("revolute", f'<origin xyz="{xyz}" rpy="{alpha} 0 0"/><axis xyz="0 0 1"/>{LIMIT}'))
    q = np.random.default_rng(given["seed"]).uniform(-1.0, 1.0, (given["n_random"], 6))
    described = pa.Arm.from_urdf(description(tmp_path, joints))
    tabled = pa.Arm.from_dh(dh_rows(table["a_prev"], table["alpha_prev_deg"], table["d"]), convention="modified")
    difference = described.flange_pose(q) - tabled.flange_pose(q)
    difference[:, :3, 3] *= 1000.0
    agrees("URD-006", np.abs(difference).max())
