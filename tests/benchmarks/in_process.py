"""Work that is timed in this process: following, retiming, measures, whole audits."""

from concurrent.futures import ThreadPoolExecutor

import numba
import numpy as np
import pinocchio
from example_arms import cell_of, path_of_motion
from open_arms import robot_file
from optimal_timing import Problem, by_native_matrices

import pathaudit as pa
from pathaudit.kernels import clocks, linkage, rates, steps, task
from pathaudit.kernels.compiled import OPTIONS
from pathaudit.proof import prove

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

    followed, _, left = own()
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


@numba.njit(**OPTIONS)
def _named_work(jacobians, demands, limit, out):
    """What `rates` does for the two measures alone, with its own helpers, from finished Jacobians (M, 6, 6) and tool motions (M, 6)."""
    here, before, demand, speed = np.empty((6, 6)), np.zeros((6, 6)), np.empty(6), np.empty(6)
    work, order, d, e, low = np.empty((8, 8)), np.empty(8), np.empty(8), np.empty(8), 0.0
    for k in range(jacobians.shape[0]):
        for i in range(6):
            demand[i] = demands[k, i]
            for j in range(6):
                here[i, j] = jacobians[k, i, j]
        low = rates.smallest_singular_value(here, 6, 6, max(0.999 * (low - rates.change_of(here, before)), 0.0), work, d, e)
        task.factor(here, 6, work, order)
        task.substitute(work, order, demand, 6, speed)
        share = 0.0
        for i in range(6):
            share = max(share, abs(speed[i]) / limit[i])
        out[k, 0], out[k, 1] = low, share


def measuring(samples=20_000):
    """Twice: the two measures alone from finished Jacobians, and the whole of what is measured at a sample; both shared by the cores."""
    cell, time, joints = smooth_motion(samples)
    path = path_of_motion(cell, time, joints)
    twist, twist_rate = rates.twists(path.time, path.position, path.rotation)
    length, still, limit = cell.characteristic_length, np.zeros_like(joints), np.array(cell.arm.speed)
    jacobians = linkage.jacobians(*cell.chain, joints)
    jacobians[:, :3] /= length
    demands = np.concatenate([twist[:, :3] / length, twist[:, 3:]], axis=1)
    alone, halves = np.empty((samples, 2)), [slice(None, samples // 2), slice(samples // 2, None)]

    def whole():
        return rates.rates(cell.chain, length, 6, limit, joints, twist, twist_rate, still, still)

    with ThreadPoolExecutor(2) as pool:

        def named():
            list(pool.map(lambda half: _named_work(jacobians[half], demands[half], limit, alone[half]), halves))

        named()
        sigma = np.linalg.svd(jacobians, compute_uv=False)
        shares = np.max(np.abs(np.linalg.solve(jacobians, demands[..., None])[..., 0]) / limit, axis=1)
        for measures in (alone, whole()[2][:, [0, -1]]):
            assert np.allclose(measures, np.stack([sigma[:, -1], shares], axis=1), rtol=1e-8)
        values = seconds(lambda: np.linalg.svd(jacobians, compute_uv=False)) / samples
        note = f"from finished Jacobians, on both cores; reference: numpy.linalg.svd of them, from which both follow ({1e6 * values:.2f} us for the values alone)"
        times = side_by_side(named, lambda: np.linalg.svd(jacobians))
    everything = "kinematics, joint rates and accelerations included, on both cores; the same reference"
    return [
        Row("sigma_min and exact directional limit, per sample", *(t / samples for t in times), ">= 10", note),
        Row("all that is measured at a sample", *(t / samples for t in side_by_side(whole, lambda: np.linalg.svd(jacobians))), "-", everything),
    ]


def whole_audit(samples=2_000):
    cell, time, joints = smooth_motion(samples)
    path = path_of_motion(cell, time, joints)
    audit = pa.audit(path, cell)
    without_start = pa.Cell(cell.name, cell.arm, cell.placement, cell.tool, cell.part, None, cell.thresholds)
    searched = seconds(lambda: pa.audit(path, without_start))
    retimed = seconds(lambda: audit.retime())
    note = f"{1e3 * searched:.0f} ms when the start posture is searched too; the suggested retiming {1e3 * retimed:.0f} ms more"
    return Row(f"whole audit, {samples:,} samples, warm", seconds(lambda: pa.audit(path, cell)), None, "<= 30 ms", note)


def proving(samples=2_000):
    """Twice: at steps of 0.01 rad, and through a straight wrist that no sample shows, where the intervals beside it are halved."""
    rows = []
    for what, (cell, time, joints) in (("0.01 rad apart", smooth_motion(samples, duration=1.03 * samples * 0.01 / 0.42)), ("a hidden crossing", hidden_crossing(samples))):
        measured = pa.audit(path_of_motion(cell, time, joints), cell, start=joints[0])
        proof = prove(measured.rates)
        step = np.abs(np.diff(joints, axis=0)).max(axis=1).mean()
        share = np.nanmedian(proof.sigma_bound / np.fmin(measured.rates.sigma_min[1:], measured.rates.sigma_min[:-1]))
        note = f"{1e3 * step:.1f} mrad a step; {proof.points.sum()} postures looked at between samples, {proof.unproven.sum()} intervals unproven, bound {100 * share:.1f} % of what the samples have (median)"
        rows.append(Row(f"proof between {samples:,} samples, {what}", seconds(lambda: prove(measured.rates)), None, "<= 20 ms", note))
    return rows


def hidden_crossing(samples):
    """The six-axis arm through a straight wrist between two samples, clear of its thresholds at both."""
    joints = MIDDLE + 0.2 * np.sin(np.outer(np.linspace(0.0, 6.0, samples), 0.7 + 0.1 * np.arange(6)))
    joints[:, 4] = (np.arange(samples) - samples // 2 + 0.5) * 0.0015
    arm = pa.Arm.from_urdf(robot_file(SIX_AXIS), tip="tool0")
    return cell_of(arm, start=joints[0], sigma_min_warn=2e-4, sigma_min_fail=1e-4), 0.02 * np.arange(samples), joints
