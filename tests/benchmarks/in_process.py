"""Work that is timed in this process: following, retiming, measures, whole audits."""

import numpy as np
import pinocchio
from example_arms import cell_of, path_of_motion
from open_arms import robot_file
from optimal_timing import Problem, by_native_matrices

import pathaudit as pa
from pathaudit.kernels import clocks, linkage, rates, steps

from .timing import Row, seconds, side_by_side

SIX_AXIS = "ur_description/urdf/ur5_robot.urdf"
MIDDLE = np.array([0.3, -1.1, 1.4, -0.7, 0.9, 0.2])


def smooth_motion(samples, duration=20.0):
    """A cell with an open six-axis arm, times (N,) and a smooth joint motion (N, 6) of several sweeps, clear of singularities."""
    time = np.linspace(0.0, duration, samples)
    rate = 0.7 + 0.2 * np.arange(6)
    joints = MIDDLE + 0.3 * np.sin(np.outer(time, rate) + np.arange(6))
    cell = cell_of(pa.Arm.from_urdf(robot_file(SIX_AXIS), tip="tool0"), start=joints[0])
    return cell, time, joints


def newton_loop(targets, start, tolerance=1e-9):
    """The reference: a Python loop over pinocchio, full Newton steps from the sample before; joints (N, 6) and the steps taken."""
    model = pinocchio.buildModelFromUrdf(str(robot_file(SIX_AXIS)))
    data, frame = model.createData(), model.getFrameId("tool0")
    q, joints, count = start.copy(), np.empty((len(targets), 6)), 0
    goals = [pinocchio.SE3(target) for target in targets]
    for k, goal in enumerate(goals):
        for _ in range(20):
            pinocchio.framesForwardKinematics(model, data, q)
            error = pinocchio.log6(data.oMf[frame].actInv(goal)).vector
            if error.dot(error) < tolerance**2:
                break
            count += 1
            q = q + np.linalg.solve(pinocchio.computeFrameJacobian(model, data, q, frame), error)
        joints[k] = q
    return joints, count


def following(samples=20_000):
    """Twice: as a controller samples a path, and as coarsely as a programme states it."""
    return [_following(samples, interval) for interval in (0.004, 0.04)]


def _following(samples, interval):
    cell, time, joints = smooth_motion(samples, duration=interval * samples)
    targets = linkage.poses(*cell.chain, joints)
    path = path_of_motion(cell, time, joints)
    twist, _ = rates.twists(path.time, path.position, path.rotation)
    limits, exact = (cell.arm.lower, cell.arm.upper), np.array([1e-9, 1e-9])

    def own():
        return steps.follow(
            cell.chain, cell.characteristic_length, 6, limits, path.time, path.position, path.rotation, twist, joints[0], exact
        )

    followed, _, left, _ = own()
    reference, count = newton_loop(targets, joints[0])
    assert left.max() < 1e-9 and np.abs(followed - joints).max() < 1e-7 and np.abs(reference - joints).max() < 1e-7
    times = side_by_side(own, lambda: newton_loop(targets, joints[0]))
    move = np.degrees(np.abs(np.diff(joints, axis=0)).max(axis=1).mean())
    note = f"{1e6 * times[0] / samples:.2f} us a pose; reference: a Python loop over pinocchio, {count / samples:.1f} full Newton steps a pose"
    return Row(f"follow {samples:,} poses to 1e-9, six-axis, {move:.2f} deg apart", *times, ">= 80", note)


def retiming(nodes=10_000):
    cell, time, joints = smooth_motion(nodes + 1, duration=60.0)
    first, second = rates.derivatives(time, joints)
    acceleration = np.full(6, 0.8)
    problem = Problem(time, first, second, 0.4 * cell.arm.speed, acceleration, 0.0, 0.0, 1.0)
    ceiling = problem.largest.copy()
    ceiling[[0, -1]] = 0.0

    def own():
        return clocks.sweep(problem.s, first, second, acceleration, ceiling)

    total = float(clocks.durations(problem.s, own()).sum())
    found = {}
    times = side_by_side(own, lambda: found.update(zip(("b", "least", "status"), by_native_matrices(problem), strict=True)), rounds=1)
    note = f"time {total / found['least']:.7f} of the optimum; reference: Clarabel with native matrices ({found['status']})"
    return Row(f"retiming, N = {nodes:,}, six joints", *times, ">= 1,000, time within 1.00005", note)


def measuring(samples=20_000):
    cell, time, joints = smooth_motion(samples)
    path = path_of_motion(cell, time, joints)
    twist, twist_rate = rates.twists(path.time, path.position, path.rotation)
    length, still = cell.characteristic_length, np.zeros_like(joints)
    jacobians = linkage.jacobians(*cell.chain, joints)
    jacobians[:, :3] /= length

    def own():
        return rates.rates(cell.chain, length, 6, cell.arm.speed, joints, twist, twist_rate, still, still)

    sigma = np.linalg.svd(jacobians, compute_uv=False)
    speeds = np.linalg.solve(jacobians, np.concatenate([twist[:, :3] / length, twist[:, 3:]], axis=1)[..., None])[..., 0]
    measures = own()[2]
    assert np.allclose(measures[:, 0], sigma[:, -1], rtol=1e-8) and np.allclose(measures[:, -1], np.max(np.abs(speeds) / cell.arm.speed, axis=1))
    times = side_by_side(own, lambda: np.linalg.svd(jacobians))
    values = seconds(lambda: np.linalg.svd(jacobians, compute_uv=False)) / samples
    note = (
        "kinematics, joint rates and accelerations included, samples shared by the cores; reference: numpy.linalg.svd of the finished Jacobians, "
        f"from which both follow ({1e6 * values:.2f} us for the values alone)"
    )
    return Row("sigma_min and exact directional limit, per sample", *(t / samples for t in times), ">= 10", note)


def whole_audit(samples=2_000):
    cell, time, joints = smooth_motion(samples)
    path = path_of_motion(cell, time, joints)
    audit = pa.audit(path, cell)
    without_start = pa.Cell(cell.name, cell.arm, cell.placement, cell.tool, cell.part, None, cell.thresholds)
    searched = seconds(lambda: pa.audit(path, without_start))
    retimed = seconds(lambda: audit.retime())
    note = f"{1e3 * searched:.0f} ms when the start posture is searched too; the suggested retiming {1e3 * retimed:.0f} ms more"
    return Row(f"whole audit, {samples:,} samples, warm", seconds(lambda: pa.audit(path, cell)), None, "<= 30 ms", note)
