"""Measures of followed paths against numpy.linalg.svd and against the linear programme of the largest speed, by HiGHS."""

import numpy as np
import pytest
from example_arms import cell_of, dh_rows, path_of_motion, puma
from open_arms import robot_file
from reference_follower import pose_and_jacobian
from scipy.optimize import linprog

import pathaudit as pa
from pathaudit import capacity

TIME = np.linspace(0.0, 2.0, 81)


def nine_joints():
    """A seven-joint arm on two more joints."""
    random = np.random.default_rng(5)
    rows = dh_rows(random.uniform(50, 300, 9), [90, -90, 90, -90, 90, -90, 90, -90, 0], random.uniform(50, 300, 9), speed_deg_s=list(random.uniform(40, 200, 9)))
    return pa.Arm.from_dh(rows)


ARMS = {
    "six joints, six rows": (puma, False, [0.2, -0.4, 0.2, 0.5, 0.9, 0.3]),
    "six joints, five rows": (puma, True, [0.2, -0.4, 0.2, 0.5, 0.9, 0.3]),
    "seven joints, six rows": (
        lambda: pa.Arm.from_urdf(robot_file("xarm_description/urdf/xarm7.urdf"), tip="link_eef"), False, [0.2, 0.2, -0.3, 1.6, 0.4, 0.9, -0.7],
    ),
    "seven joints, five rows": (
        lambda: pa.Arm.from_urdf(robot_file("panda_description/urdf/panda.urdf"), tip="panda_hand_tcp"), True, [0.1, -0.4, 0.2, -1.9, 0.3, 1.6, 0.8],
    ),
    "nine joints, six rows": (nine_joints, False, [0.1, 0.5, -0.4, 0.6, 0.3, -0.5, 0.4, 0.7, 0.2]),
}  # fmt: skip


@pytest.fixture(scope="module", params=ARMS)
def audited(request):
    """An audit, and at each sample the task Jacobian (rows, n) and the demanded task twist (rows,), from the NumPy twin."""
    make, spin_free, middle = ARMS[request.param]
    joints = np.array(middle) + 0.15 * np.sin(np.outer(TIME, 1.0 + 0.3 * np.arange(len(middle))) + np.arange(len(middle)))
    cell = cell_of(make(), 0.1, start=joints[0])
    audit = pa.audit(path_of_motion(cell, TIME, joints, spin_free=spin_free), cell)
    length, rows = audit.rates.characteristic_length, 5 if spin_free else 6
    jacobians, demands = [], []
    for q, twist in zip(audit.joints, audit.motion.twist, strict=True):
        pose, jacobian = pose_and_jacobian(cell.chain, q)
        turn = pose[:3, :3].T
        jacobians.append(np.vstack([turn @ jacobian[:3] / length, turn @ jacobian[3:]])[:rows])
        demands.append(np.r_[turn @ twist[:3] / length, turn @ twist[3:]][:rows])
    return audit, np.array(jacobians), np.array(demands)


def test_singular_values(audited):
    audit, jacobians, _ = audited
    sigma = np.linalg.svd(jacobians, compute_uv=False)
    np.testing.assert_allclose(audit.rates.sigma_min, sigma[:, -1], rtol=1e-9)
    np.testing.assert_allclose(audit.rates.sigma_max, sigma[:, 0], rtol=1e-9)
    np.testing.assert_allclose(audit.rates.manipulability, sigma.prod(axis=1), rtol=1e-9)


def test_joint_rates_do_the_demanded_motion(audited):
    audit, jacobians, demands = audited
    np.testing.assert_allclose(np.einsum("kij,kj->ki", jacobians, audit.rates.joint_speed), demands, atol=1e-9)


def test_reserve_is_the_optimum_of_the_linear_programme(audited):
    audit, jacobians, demands = audited
    speed, n = audit.cell.arm.speed, audit.cell.arm.n
    bounds = [(-limit, limit) for limit in speed] + [(0.0, None)]
    for k in range(0, len(TIME), 8):
        best = linprog(np.r_[np.zeros(n), -1.0], A_eq=np.c_[jacobians[k], -demands[k]], b_eq=np.zeros(len(demands[k])), bounds=bounds, method="highs")
        assert audit.rates.reserve[k] == pytest.approx(-best.fun, rel=1e-7)
        assert capacity.largest_speed(jacobians[k], demands[k], speed) == pytest.approx(-best.fun, rel=1e-7)


def test_the_tool_speed_limit_is_the_reserve_times_the_programmed_speed(audited):
    audit, _, _ = audited
    programmed = np.linalg.norm(audit.motion.twist[:, :3], axis=1)
    np.testing.assert_allclose(audit.rates.tool_speed, programmed, rtol=1e-12)
    np.testing.assert_allclose(audit.rates.tool_speed_limit, programmed * audit.rates.reserve, rtol=1e-12)


@pytest.mark.parametrize("th5_deg", [0.0, 1e-9, 1e-6, 1e-3, 0.1])
def test_the_smallest_singular_value_beside_a_singularity(th5_deg):
    """Squaring the Jacobian would lose half the digits: relative accuracy holds down to nothing."""
    joints = np.tile(np.radians([10.0, -40.0, 20.0, 30.0, th5_deg, 50.0]), (5, 1))
    cell = cell_of(puma(), start=joints[0])
    audit = pa.audit(path_of_motion(cell, TIME[:5], joints), cell)
    _, jacobian = pose_and_jacobian(cell.chain, audit.joints[2])
    jacobian[:3] /= audit.rates.characteristic_length
    expected = np.linalg.svd(jacobian, compute_uv=False)[-1]
    assert audit.rates.sigma_min[2] == pytest.approx(expected, rel=1e-9, abs=1e-15)
    assert np.all(audit.rates.reserve > 1e9) and np.isnan(audit.rates.tool_speed_limit).all()  # the tool rests
