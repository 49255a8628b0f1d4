"""The fastest clock along a path against closed forms (RET rows of references/README.md) and against Clarabel."""

import numpy as np
import pytest
from example_arms import SWAY_TIME, path_of_motion, swaying
from optimal_timing import Problem, by_cvxpy, by_native_matrices, duration
from outside import agrees, inputs
from scipy.optimize import brentq

import pathaudit as pa
from pathaudit.kernels import clocks


def fastest(problem):
    """b (N,) and the duration, by sweeps."""
    ceiling = problem.largest.copy()
    ceiling[0], ceiling[-1] = min(ceiling[0], problem.start), min(ceiling[-1], problem.end)
    b = clocks.sweep(problem.s, problem.first, problem.second, problem.acceleration, ceiling)
    return b, float(np.sum(clocks.durations(problem.s, b)))


def straight(distances, speed, acceleration, intervals):
    """Rest to rest along a straight line in joint space, over s from 0 to 1."""
    s = np.linspace(0.0, 1.0, intervals + 1)
    first = np.tile(np.asarray(distances, dtype=float), (intervals + 1, 1))
    return Problem(s, first, np.zeros_like(first), np.asarray(speed, dtype=float), np.asarray(acceleration, dtype=float))


def circle(normals, radius, acceleration, intervals, turns=1.0):
    """A circle of arc length s whose acceleration has at most the given component along each normal (m, 2), without speed limits."""
    s = np.linspace(0.0, 2.0 * np.pi * radius * turns, intervals + 1)
    tangent = np.stack([-np.sin(s / radius), np.cos(s / radius)], axis=1)
    inward = -np.stack([np.cos(s / radius), np.sin(s / radius)], axis=1) / radius
    limits = np.full(len(normals), np.inf), np.full(len(normals), float(acceleration))
    return Problem(s, tangent @ normals.T, inward @ normals.T, *limits)


def around(count):
    """Unit normals of a regular polygon of 2 * count sides; the limits hold both ways."""
    angles = np.pi * np.arange(count) / count
    return np.stack([np.cos(angles), np.sin(angles)], axis=1)


# ------------------------------------------------------------------------------------------------------------- closed forms


def test_acceleration_limit_alone():
    given = inputs("RET-001")
    b, total = fastest(straight([given["d"]], [np.inf], [given["a"]], 10))
    agrees("RET-001", [total, given["d"] * np.sqrt(b.max())])


def test_speed_and_acceleration_limits():
    given = inputs("RET-002")
    agrees("RET-002", fastest(straight([given["d"]], [given["v"]], [given["a"]], 20))[1])


def test_shortest_distance_that_reaches_full_speed():
    given = inputs("RET-003")

    def spare(distance):
        b, _ = fastest(straight([distance], [np.inf], [given["a"]], 2))
        return distance * np.sqrt(b.max()) - given["v"]

    agrees("RET-003", brentq(spare, 0.01, 1.0, xtol=1e-15))


@pytest.mark.parametrize("intervals", [16, 64])
def test_several_joints_on_a_straight_line(intervals):
    """RET-004; the switches fall on nodes."""
    given = inputs("RET-004")
    agrees("RET-012", fastest(straight(given["dq"], given["v"], given["a"], intervals))[1])


def test_a_switch_between_nodes_costs_part_of_an_interval():
    given = inputs("RET-004")
    lost = [fastest(straight(given["dq"], given["v"], given["a"], intervals))[1] - 11 / 6 for intervals in (50, 5000)]
    assert 0.0 < lost[1] < 1e-6 and 0.0 < lost[0] < 1e-2


def test_circle_under_a_limit_on_the_norm_of_acceleration():
    """A polygon of 480 sides stands for the norm; what the rows at both ends of an interval cost halves with the interval."""
    given = inputs("RET-013")
    coarse, fine = (fastest(circle(around(240), given["R"], given["A"], intervals))[1] for intervals in (1500, 3000))
    agrees("RET-013", 2.0 * fine - coarse)


def test_circle_under_joint_acceleration_limits():
    problem = circle(np.eye(2), 1.0, inputs("RET-014")["A"][0], 100_000)
    agrees("RET-014", fastest(problem)[1])


def test_radial_line_of_a_planar_arm():
    given = inputs("RET-015")
    r = np.linspace(*given["r"], 60_001)
    reach = 2.0 * given["l"]
    elbow = -2.0 / np.sqrt(reach**2 - r**2)  # th2 = 2 acos(r / reach), th1 = phi - th2 / 2
    bend = r * elbow / (reach**2 - r**2)
    share = np.array([-0.5, 1.0])
    problem = Problem(r, elbow[:, None] * share, bend[:, None] * share, np.array(given["v"], float), np.array(given["a"], float))
    agrees("RET-015", fastest(problem)[1])


def test_speed_on_an_arc():
    given = inputs("RET-019")
    b, _ = fastest(circle(around(60), given["r"], given["a"], 120))  # every node lies on a normal of the polygon
    agrees("RET-019", np.sqrt(b[60]))


# ----------------------------------------------------------------------------------------------------------------- optimality


def wavy(seed, nodes=120, n=6):
    """Smooth joint motion of n joints on uneven nodes, with a ceiling that dips, starting and ending in motion or at rest."""
    random = np.random.default_rng(seed)
    s = np.cumsum(random.uniform(0.5, 1.5, nodes))
    s = (s - s[0]) / (s[-1] - s[0])
    size, rate, phase = random.uniform(0.2, 1.0, (3, n, 1)) * [[[1.0]], [[12.0]], [[6.0]]]
    first = (size * rate * np.cos(rate * s + phase)).T
    second = (-size * rate**2 * np.sin(rate * s + phase)).T
    ceiling = np.where((s > 0.3) & (s < 0.6), random.uniform(0.05, 0.3), 4.0)
    speed, acceleration = random.uniform(1.0, 3.0, n), random.uniform(4.0, 12.0, n)
    start, end = random.choice([0.0, 0.01], 2)
    return Problem(s, first, second, speed, acceleration, start, end, ceiling)


@pytest.mark.parametrize("seed", range(8))
@pytest.mark.parametrize("nodes, rel", [(120, 1e-4), (600, 2e-6)])
def test_sweeps_reach_the_optimum(seed, nodes, rel):
    """The largest b at each node need not be the best where a joint reverses: the loss falls with the interval, fast."""
    problem = wavy(seed, nodes)
    _, total = fastest(problem)
    _, least, status = by_native_matrices(problem)
    assert status == "Solved"
    assert least * (1 - 1e-7) <= total <= least * (1 + rel)


@pytest.mark.parametrize("seed", range(8))
def test_sweeps_keep_every_limit(seed):
    problem = wavy(seed, nodes=2000)
    b, total = fastest(problem)
    rows, bound = problem.rows()
    assert np.all(b >= 0.0) and np.all(b <= problem.largest * (1 + 1e-12))
    assert np.max(np.abs(rows @ b) / bound) < 1 + 1e-9
    assert b[0] == problem.start and b[-1] == pytest.approx(problem.end, abs=1e-12)
    assert total == pytest.approx(duration(problem.s, b))


@pytest.mark.parametrize("seed", range(3))
def test_both_statements_of_the_reference_agree(seed):
    problem = wavy(seed, nodes=200)
    assert by_native_matrices(problem)[1] == pytest.approx(by_cvxpy(problem)[1], rel=1e-7)


def test_reversed_paths_take_the_same_time():
    problem = wavy(3)
    back = Problem(
        -problem.s[::-1], -problem.first[::-1], problem.second[::-1], problem.speed, problem.acceleration,
        problem.end, problem.start, problem.ceiling[::-1],
    )  # fmt: skip
    np.testing.assert_allclose(fastest(back)[0][::-1], fastest(problem)[0], rtol=1e-9)


@pytest.mark.parametrize("seed", range(6))
def test_a_local_retiming_is_close_to_the_optimum(seed):
    """The suggestion also passes the audit's own measures of its new times, which costs a little on coarse samples."""
    cell, joints = swaying(seed)
    audit = pa.audit(path_of_motion(cell, 0.8 * SWAY_TIME, joints), cell)
    retiming = audit.retime("local")
    b = retiming.factor**2
    problem = Problem(
        audit.time, audit.rates.joint_speed, audit.rates.joint_acceleration, cell.arm.speed, cell.arm.acceleration, b[0], b[-1], 1.0
    )
    _, least, status = by_native_matrices(problem)
    assert status == "Solved" and retiming.slowest < 0.9
    assert least * (1 - 1e-7) <= retiming.duration <= least * 1.0003


@pytest.mark.parametrize("seed", range(8))
@pytest.mark.parametrize("nodes, rel", [(120, 2e-4), (600, 2e-6)])
def test_the_least_duration_is_a_lower_bound_and_close(seed, nodes, rel):
    """Never above the optimum that the cone solver finds, and within twice what the sweeps lose by taking the largest b at each node."""
    problem = wavy(seed, nodes)
    ceiling = problem.largest.copy()
    ceiling[0], ceiling[-1] = min(ceiling[0], problem.start), min(ceiling[-1], problem.end)
    top = clocks.largest_anywhere(problem.s, problem.first, problem.second, problem.acceleration, ceiling)
    b, least, status = by_native_matrices(problem)
    bound = float(clocks.durations(problem.s, top).sum())
    assert status == "Solved" and least * (1 - rel) <= bound <= least * (1 + 1e-8)
    assert np.all(b[1:-1] <= top[1:-1] * (1 + 1e-6) + 1e-8) and np.all(fastest(problem)[0] <= top)


@pytest.mark.parametrize("seed", range(6))
def test_a_retiming_carries_its_certificate(seed):
    cell, joints = swaying(seed)
    audit = pa.audit(path_of_motion(cell, 0.8 * SWAY_TIME, joints), cell)
    local, even = audit.retime("local"), audit.retime("even")
    ends = local.factor[0] ** 2, local.factor[-1] ** 2
    limits = cell.arm.speed, cell.arm.acceleration
    best = by_native_matrices(Problem(audit.time, audit.rates.joint_speed, audit.rates.joint_acceleration, *limits, *ends, 1.0))[1]
    assert local.least_duration <= best * (1 + 1e-8) and local.least_duration == even.least_duration
    assert 0.0 < local.gap < 2e-3 and local.gap < even.gap and local.duration == pytest.approx(local.least_duration * (1 + local.gap))
    assert f"{local.least_duration:.3f} s" in local.certificate and f"{100 * local.gap:.2g} % more" in local.certificate


def test_a_path_that_keeps_its_times_cannot_be_faster():
    cell, joints = swaying(2)
    again = pa.audit(path_of_motion(cell, 4.0 * SWAY_TIME, joints), cell).retime()
    assert abs(again.gap) < 1e-8 and again.certificate.endswith("these take no more.")
