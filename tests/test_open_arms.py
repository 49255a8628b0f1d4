"""Every serial chain in the robot descriptions of `example-robot-data`, against pinocchio."""

import numpy as np
import pytest
from open_arms import Reference, Tree, all_robot_files, folder_of_robots, robot_file

import pathaudit as pa
from pathaudit import conventions

ARMS = {  # file: (tip, joints)
    "asr_twodof_description/urdf/TwoDofs.urdf": ("Tip", 2),
    "kinova_description/robots/kinova.urdf": ("j2s6s200_end_effector", 6),
    "panda_description/urdf/panda.urdf": ("panda_hand_tcp", 7),
    "so_arm_description/urdf/so101.urdf": ("gripper_frame_link", 5),
    "talos_data/robots/talos_left_arm.urdf": ("gripper_left_base_link", 6),
    "ur_description/urdf/ur10_joint_limited_robot.urdf": ("tool0", 6),
    "ur_description/urdf/ur10_robot.urdf": ("tool0", 6),
    "ur_description/urdf/ur3_joint_limited_robot.urdf": ("tool0", 6),
    "ur_description/urdf/ur3_robot.urdf": ("tool0", 6),
    "ur_description/urdf/ur5_joint_limited_robot.urdf": ("tool0", 6),
    "ur_description/urdf/ur5_robot.urdf": ("tool0", 6),
    "xarm_description/urdf/xarm7.urdf": ("link_eef", 7),
    "z1_description/urdf/z1.urdf": ("link06", 6),
}


def postures(arm, count, seed):
    low, high = np.where(np.isfinite(arm.lower), arm.lower, -np.pi), np.where(np.isfinite(arm.upper), arm.upper, np.pi)
    return np.random.default_rng(seed).uniform(low, high, (count, arm.n))


def compare(arm, reference, tip, count=3, seed=0):
    q = postures(arm, count, seed)
    poses, jacobians = arm.flange_pose(q), arm.jacobian(q)
    for k in range(count):
        pose, jacobian = reference.pose_and_jacobian(tip, arm.joint_names, q[k])
        np.testing.assert_allclose(poses[k], pose, rtol=0, atol=1e-9)
        np.testing.assert_allclose(jacobians[k], jacobian, rtol=0, atol=1e-9)


def assert_limits(arm, reference):
    model, columns = reference.model, reference.columns(arm.joint_names)
    for own, other in ((arm.speed, model.velocityLimit[columns]), (arm.effort, model.effortLimit[columns])):
        np.testing.assert_array_equal(own, np.where(np.isfinite(other), other, np.nan))
    for name, lower, upper in zip(arm.joint_names, arm.lower, arm.upper, strict=True):
        joint = model.joints[model.getJointId(name)]
        if joint.nq == 2:  # no end stops
            assert (lower, upper) == (-np.inf, np.inf)
        else:
            assert (lower, upper) == (model.lowerPositionLimit[joint.idx_q], model.upperPositionLimit[joint.idx_q])


@pytest.mark.parametrize("name", ARMS)
def test_open_arm_against_pinocchio(name):
    tip, n = ARMS[name]
    arm, reference = pa.Arm.from_urdf(robot_file(name), tip=tip), Reference(robot_file(name))
    assert arm.n == n and arm.lower.shape == arm.upper.shape == arm.speed.shape == (n,)
    compare(arm, reference, tip, count=50)
    assert_limits(arm, reference)


def test_batches_of_any_shape():
    arm = pa.Arm.from_urdf(robot_file("xarm_description/urdf/xarm7.urdf"), tip="link_eef")
    q = postures(arm, 24, 1)
    np.testing.assert_array_equal(arm.flange_pose(q.reshape(2, 3, 4, 7)), arm.flange_pose(q).reshape(2, 3, 4, 4, 4))
    np.testing.assert_array_equal(arm.jacobian(q.reshape(4, 6, 7)), arm.jacobian(q).reshape(4, 6, 6, 7))
    np.testing.assert_array_equal(arm.flange_pose(q[0]), arm.flange_pose(q)[0])


def usable(joints):
    """Whether a chain is one that an audit takes, judged from the file's text alone."""
    moving = [joint for joint in joints if joint.get("type") != "fixed"]
    if not 1 <= len(moving) <= conventions.MAX_JOINTS:
        return False
    for joint in moving:
        limit, endless = joint.find("limit"), joint.get("type") == "continuous"
        if limit is None and endless:
            continue  # the format demands no limits of a joint without end stops
        if joint.find("mimic") is not None or limit is None or not float(limit.get("velocity", "nan")) > 0:
            return False
        if not endless and not float(limit.get("lower", "0")) < float(limit.get("upper", "0")):
            return False
    return True


def chains():
    """(file, [(tip, usable)]) of every description; of the tips that share all their moving joints, the first."""
    found = []
    for file in all_robot_files():
        if file.name == "ur3.urdf":  # a macro, not a description
            continue
        tree, seen, tips = Tree(file), set(), []
        for tip in tree.leaves:
            joints = tree.chain(tip)
            names = tuple(joint.get("name") for joint in joints if joint.get("type") != "fixed")
            if names and names not in seen:
                seen.add(names)
                tips.append((tip, usable(joints)))
        if tips:
            found.append((file, tips))
    return found


CHAINS = chains()


@pytest.mark.parametrize("file, tips", CHAINS, ids=[file.stem for file, _ in CHAINS])
def test_every_chain_of_a_description(file, tips):
    root, reference = Tree(file).root, Reference(file)
    for tip, accepted in tips:
        if accepted:
            arm = pa.Arm.from_urdf(file, base=root, tip=tip)
            compare(arm, reference, tip)
            assert_limits(arm, reference)
        else:
            with pytest.raises(pa.PathAuditError):
                pa.Arm.from_urdf(file, base=root, tip=tip)


def test_the_sweep_covers_the_wheel():
    taken = sum(accepted for _, tips in CHAINS for _, accepted in tips)
    assert taken > 300, f"only {taken} chains of {folder_of_robots()} were compared"
