"""Laws that hold for every arm and path: Jacobians are derivatives, twists move with frames, units, places and directions do not matter."""

from dataclasses import replace

import numpy as np
import pytest
from called import called
from example_arms import SWAY_TIME as TIME
from example_arms import dh_rows, path_of_motion, path_of_poses, swaying
from hypothesis import given, settings
from hypothesis import strategies as st

import pathaudit as pa
from pathaudit.kernels import linkage, rates, rotations, task

seeds = st.integers(0, 2**32 - 1)
few = settings(max_examples=25, deadline=None)
many = settings(max_examples=100, deadline=None)


def random_arm(random, n, scale=1.0):
    """Any chain of n joints, some of them slides; lengths times `scale`."""
    rows = dh_rows(scale * random.uniform(-500, 500, n), random.uniform(-180, 180, n), scale * random.uniform(-400, 400, n))
    for row in rows:
        row["theta_deg"] = random.uniform(-180, 180)
        if random.random() < 0.25:
            for key in ("lower_deg", "upper_deg", "speed_deg_s"):
                del row[key]
            row |= {"type": "prismatic", "lower_mm": -1000.0, "upper_mm": 1000.0, "speed_mm_s": 500.0}
    return pa.Arm.from_dh(rows, convention=random.choice(["standard", "modified"]))


def random_pose(random):
    return rotations.pose(rotations.exp_vector(random.normal(size=3)), random.normal(size=3))


# ------------------------------------------------------------------------------------------------------- Jacobians and twists


@many
@given(seeds, st.integers(1, 12))
def test_a_jacobian_is_the_derivative_of_the_pose(seed, n):
    random = np.random.default_rng(seed)
    arm, q, h = random_arm(random, n), random.uniform(-3, 3, n), 1e-3
    moved = [arm.flange_pose(q + k * h * np.eye(n)) for k in (-2, -1, 1, 2)]
    slope = (moved[0] - 8 * moved[1] + 8 * moved[2] - moved[3]) / (12 * h)  # fourth order, (n, 4, 4)
    turning = slope[:, :3, :3] @ arm.flange_pose(q)[:3, :3].T
    expected = np.vstack([slope[:, :3, 3].T, turning[:, 2, 1], turning[:, 0, 2], turning[:, 1, 0]])
    np.testing.assert_allclose(arm.jacobian(q), expected, atol=1e-9)
    np.testing.assert_allclose(turning, -np.swapaxes(turning, 1, 2), atol=1e-9)


@many
@given(seeds, st.integers(1, 8))
def test_a_twist_moves_with_the_point_and_turns_with_the_frame(seed, n):
    random = np.random.default_rng(seed)
    arm, q = random_arm(random, n), random.uniform(-3, 3, n)
    cell = pa.Cell("bench", arm, random_pose(random), random_pose(random), random_pose(random))
    to_part = rotations.inverse_pose(cell.part) @ cell.placement
    flange, jacobian = arm.flange_pose(q), arm.jacobian(q)
    arm_of_tool = flange[:3, :3] @ cell.tool[:3, 3]
    expected = np.vstack([
        to_part[:3, :3] @ (jacobian[:3] + np.cross(jacobian[3:], arm_of_tool, axisa=0, axisc=0)), to_part[:3, :3] @ jacobian[3:],
    ])  # fmt: skip
    np.testing.assert_allclose(linkage.jacobians(*cell.chain, q[None])[0], expected, atol=1e-12)
    np.testing.assert_allclose(linkage.poses(*cell.chain, q[None])[0], to_part @ flange @ cell.tool, atol=1e-12)


@many
@given(seeds, st.floats(-14, np.log10(3.1)), st.floats(-14, 0))
def test_rotation_vectors_add_up_along_an_axis_and_turn_with_the_frame(seed, first, second):
    random = np.random.default_rng(seed)
    axis = random.normal(size=3)
    axis /= np.linalg.norm(axis)
    a, b, frame = 10.0**first * axis, 10.0**second * axis, rotations.exp_vector(random.normal(size=3))
    np.testing.assert_allclose(rotations.log_matrix(rotations.exp_vector(a)), a, rtol=1e-9, atol=3e-16)
    np.testing.assert_allclose(rotations.exp_vector(a) @ rotations.exp_vector(b), rotations.exp_vector(a + b), atol=1e-14)
    np.testing.assert_allclose(frame @ rotations.exp_vector(a) @ frame.T, rotations.exp_vector(frame @ a), atol=1e-14)


def test_the_logarithm_of_the_kernels_on_both_sides_of_its_switches():
    """At a sine of 0.01 a series gives way to the arc tangent, at a sine of 1e-6 near half a turn the symmetric part takes over."""
    random, out, rotation_log = np.random.default_rng(4), np.empty(3), called(task.rotation_log)
    near_half = np.pi - np.array([0.0, 1e-9, 0.9e-6, 1.1e-6, 1e-3])
    for angle in [0.0, 1e-12, 1e-3, 0.0099999, 0.0100001, 0.5, 1.5, 1.6, 3.0, *near_half]:
        for axis in (*np.eye(3), *random.normal(size=(5, 3))):
            vector = angle * axis / np.linalg.norm(axis)
            rotation_log(rotations.exp_vector(vector), out)
            tolerance = 4e-15 if angle < 3.0 else 1e-9  # the matrix itself tells the angle no better there
            np.testing.assert_allclose(out if out @ vector >= 0 else -out, vector, rtol=0, atol=max(tolerance * angle, 1e-16))


@many
@given(seeds)
def test_the_twist_of_a_screw_motion_is_constant(seed):
    """On uneven times; in part axes the point moves as v + w x p."""
    random = np.random.default_rng(seed)
    time = np.cumsum(random.uniform(0.01, 0.03, 60))
    turn, shift, pose = random.normal(size=3), random.normal(size=3), random_pose(random)
    rotation = rotations.exp_vector(time[:, None] * turn) @ pose[:3, :3]
    twist, twist_rate = rates.twists(time, time[:, None] * shift, rotation)
    np.testing.assert_allclose(twist, np.tile(np.r_[shift, turn], (60, 1)), atol=1e-10)
    np.testing.assert_allclose(twist_rate, 0.0, atol=1e-7)


@many
@given(seeds)
def test_polynomials_of_time_are_differentiated_exactly(seed):
    random = np.random.default_rng(seed)
    time = np.cumsum(random.uniform(0.05, 0.15, 40))
    time -= time.mean()
    curve = [np.polynomial.Polynomial(random.normal(size=5)) for _ in range(3)]
    first, second = rates.derivatives(time, np.stack([p(time) for p in curve], axis=1))
    np.testing.assert_allclose(first, np.stack([p.deriv()(time) for p in curve], axis=1), atol=1e-9)
    np.testing.assert_allclose(second, np.stack([p.deriv(2)(time) for p in curve], axis=1), atol=1e-7)


# ---------------------------------------------------------------------------------------------------- the same path otherwise

def assert_same(audit, other, atol=1e-9):
    """Both audits say the same, apart from rounding."""
    np.testing.assert_allclose(other.joints, audit.joints, atol=atol)
    for name in ("speed_share", "acceleration_share", "sigma_min", "reserve"):
        np.testing.assert_allclose(getattr(other.rates, name), getattr(audit.rates, name), rtol=1e-6, atol=1e-6, err_msg=name)
    assert [(f.kind, f.severity, f.joint, f.worst) for f in other.finding_list] == [(f.kind, f.severity, f.joint, f.worst) for f in audit.finding_list]
    np.testing.assert_allclose([f.t_end for f in other.finding_list], [f.t_end for f in audit.finding_list], atol=1e-6)
    assert other.verdict == audit.verdict


@few
@given(seeds)
def test_units_do_not_matter(seed):
    cell, joints = swaying(seed)
    poses = linkage.poses(*cell.chain, joints)
    audit = pa.audit(path_of_poses(TIME, poses), cell)
    millimetres = {"t_ms": 1000.0 * TIME} | dict(zip(("x_mm", "y_mm", "z_mm"), 1000.0 * poses[:, :3, 3].T, strict=True))
    inches = {"t_s": TIME} | dict(zip(("x_in", "y_in", "z_in"), poses[:, :3, 3].T / 0.0254, strict=True))
    rpy = rotations.rpy_from_matrix(poses[:, :3, :3])
    degrees = dict(zip(("rx_deg", "ry_deg", "rz_deg"), np.degrees(rpy).T, strict=True))
    radians = dict(zip(("rx_rad", "ry_rad", "rz_rad"), rpy.T, strict=True))
    for columns in (millimetres | degrees, inches | radians):
        assert_same(audit, pa.audit(pa.path_from(columns), cell))


@few
@given(seeds)
def test_the_place_in_the_world_does_not_matter(seed):
    cell, joints = swaying(seed)
    random = np.random.default_rng(seed)
    path, world = path_of_motion(cell, TIME, joints), random_pose(random)
    assert_same(pa.audit(path, cell), pa.audit(path, replace(cell, placement=world @ cell.placement, part=world @ cell.part)))


@few
@given(seeds, st.sampled_from([0.1, 3.0]))
def test_size_does_not_matter(seed, scale):
    """Arm, tool and path k times as large: the same joints, and the same nearness to singular."""
    (cell, joints), (large, _) = swaying(seed), swaying(seed, scale)
    assert_same(pa.audit(path_of_motion(cell, TIME, joints), cell), pa.audit(path_of_motion(large, TIME, joints), large))


@few
@given(seeds, st.floats(0.2, 5.0))
def test_slower_times_divide_rates(seed, factor):
    cell, joints = swaying(seed)
    audit, slow = (pa.audit(path_of_motion(cell, k * TIME, joints), cell) for k in (1.0, factor))
    np.testing.assert_allclose(slow.joints, audit.joints, atol=1e-9)
    np.testing.assert_allclose(slow.rates.joint_speed * factor, audit.rates.joint_speed, atol=1e-7)
    np.testing.assert_allclose(slow.rates.joint_acceleration * factor**2, audit.rates.joint_acceleration, atol=1e-4)
    np.testing.assert_allclose(slow.rates.reserve / factor, audit.rates.reserve, rtol=1e-6)


@few
@given(seeds)
def test_a_reversed_path_mirrors_the_audit(seed):
    cell, joints = swaying(seed)
    audit = pa.audit(path_of_motion(cell, TIME, joints), cell)
    back = pa.audit(path_of_motion(cell, TIME, joints[::-1]), cell, start=joints[-1])
    np.testing.assert_allclose(back.joints[::-1], audit.joints, atol=1e-9)
    np.testing.assert_allclose(back.rates.joint_speed[::-1], -audit.rates.joint_speed, atol=1e-7)
    np.testing.assert_allclose(back.rates.joint_acceleration[::-1], audit.rates.joint_acceleration, atol=1e-4)
    mirrored = sorted((f.kind, f.severity, f.joint or "", TIME[-1] - f.t_end, TIME[-1] - f.t_start) for f in back.finding_list)
    straight = sorted((f.kind, f.severity, f.joint or "", f.t_start, f.t_end) for f in audit.finding_list)
    assert [m[:3] for m in mirrored] == [s[:3] for s in straight]
    np.testing.assert_allclose([m[3:] for m in mirrored], [s[3:] for s in straight], atol=1e-6)


# ------------------------------------------------------------------------------------------------------------------- retiming


def runs(process):
    """Index arrays of the contiguous stretches where the process runs."""
    return [run for run in np.split(np.arange(len(process)), np.flatnonzero(np.diff(process.astype(int))) + 1) if process[run[0]]]


@pytest.mark.parametrize("style", ["even", "local", None])
@few
@given(seeds, st.floats(0.1, 1.5), st.sampled_from([(), (120, 180), (0, 90), (210, 301), (0, 301)]))
def test_a_retimed_path_keeps_its_geometry_and_the_limits(style, seed, tempo, air):
    cell, joints = swaying(seed)
    process = np.ones(len(TIME))
    process[slice(*air) if air else slice(0, 0)] = 0.0
    path = path_of_motion(cell, tempo * TIME, joints, process=process)
    audit = pa.audit(path, cell)
    retiming = audit.retime(style)
    again = retiming.audit()
    assert again.path.position is path.position or np.array_equal(again.path.position, path.position)
    assert np.array_equal(again.path.rotation, path.rotation) and again.path.cells == path.cells
    np.testing.assert_allclose(again.joints, audit.joints, atol=1e-9)
    assert retiming.feasible and np.all(np.diff(retiming.time) > 0.0)
    assert np.nanmax(again.rates.speed_share) <= 1 + 1e-6 and np.nanmax(again.rates.acceleration_share) <= 1 + 1e-6
    assert not [f for f in again.finding_list if f.severity == "fail" and f.kind in ("joint speed", "joint acceleration")]

    process = path.process
    both = process[1:] & process[:-1]
    longer = np.diff(retiming.time) / np.diff(path.time)
    assert longer[both].min(initial=np.inf) >= 1 - 1e-9
    assert np.all(retiming.factor > 0.0) and np.all(retiming.factor[process] <= 1.0)
    if style == "even":
        for run in runs(process):
            assert np.ptp(retiming.factor[run]) < 1e-9


@few
@given(seeds)
def test_a_path_within_its_limits_keeps_its_times(seed):
    cell, joints = swaying(seed)
    path = path_of_motion(cell, 20.0 * TIME, joints)
    retiming = pa.audit(path, cell).retime()
    assert np.array_equal(retiming.time, path.time) and np.all(retiming.factor == 1.0)


def test_a_local_retiming_is_no_longer_than_an_even_one():
    for seed in range(8):
        cell, joints = swaying(seed)
        audit = pa.audit(path_of_motion(cell, 0.5 * TIME, joints), cell)
        assert audit.retime("local").duration <= audit.retime("even").duration * (1 + 1e-9)
