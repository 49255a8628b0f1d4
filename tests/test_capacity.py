"""Capacities against a linear programme, a convex hull and the definitions, on random Jacobians of every shape."""

from itertools import product

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.optimize import linprog
from scipy.spatial import ConvexHull

from pathaudit import capacity

seeds = st.integers(0, 2**32 - 1)


@st.composite
def jacobians(draw, rows=st.integers(1, 6), joints=st.integers(1, 10)):
    """J (m, n), joint speeds (n,) and a source of random numbers; some columns parallel, some rows or columns zero."""
    m, n, random = draw(rows), draw(joints), np.random.default_rng(draw(seeds))
    J, speed = random.normal(size=(m, n)), random.uniform(0.1, 3.0, n)
    if n > 2 and draw(st.booleans()):
        J[:, 1] = -2.0 * J[:, 0]
    if n > 3 and draw(st.booleans()):
        J[:, 2] = J[:, 0] + J[:, 3]
    if draw(st.integers(0, 3)) == 0:
        J[:, random.integers(n)] = 0.0
    if m > 1 and draw(st.integers(0, 3)) == 0:
        J[random.integers(m)] = 0.0
    return J, speed, random


def optimal_speed(J, direction, speed):
    """The linear programme that largest_speed answers, by HiGHS."""
    n = J.shape[1]
    bounds = [(-limit, limit) for limit in speed] + [(0, None)]
    best = linprog(np.r_[np.zeros(n), -1.0], A_eq=np.c_[J, -direction], b_eq=np.zeros(len(J)), bounds=bounds, method="highs")
    assert best.status == 0, best.message
    return -best.fun


def corners(J, speed):
    return np.array(list(product((-1.0, 1.0), repeat=J.shape[1]))) * speed @ J.T


@given(jacobians(), st.booleans())
def test_largest_speed_is_the_optimum_of_the_linear_programme(case, reachable):
    J, speed, random = case
    direction = J @ random.normal(size=J.shape[1]) if reachable else random.normal(size=len(J))
    if not np.linalg.norm(direction) > 1e-3:
        return
    assert capacity.largest_speed(J, direction, speed) == pytest.approx(optimal_speed(J, direction, speed), rel=1e-8, abs=1e-9)


@given(seeds, st.integers(2, 6))
def test_largest_speed_of_a_square_jacobian_is_the_closed_form(seed, n):
    random = np.random.default_rng(seed)
    J, speed, direction = random.normal(size=(n, n)), random.uniform(0.1, 3.0, n), random.normal(size=n)
    rates = np.linalg.solve(J, direction)
    assert capacity.largest_speed(J, direction, speed) == pytest.approx(np.min(speed / np.abs(rates)), rel=1e-7)


def test_a_redundant_arm_goes_faster_than_the_least_norm_rates_allow():
    J = np.array([[1.0, 0.2, 0.1]])
    least_norm = np.min(1.0 / np.abs(capacity.damped_step(J, [1.0], 0.0)))
    assert capacity.largest_speed(J, [1.0], np.ones(3)) == pytest.approx(1.3)
    assert least_norm == pytest.approx(1.05)


def test_no_speed_towards_a_lost_direction_and_none_lost_along_the_others():
    J = np.array([[0.0, 0.0], [2.0, 1.0]])  # two equal links stretched out along x
    assert capacity.largest_speed(J, [1.0, 0.0], [1.0, 1.0]) == 0.0
    assert capacity.largest_speed(J, [1.0, 1.0], [1.0, 1.0]) == 0.0
    assert capacity.largest_speed(J, [0.0, 1.0], [1.0, 1.0]) == pytest.approx(3.0)
    assert capacity.largest_speed(J, [0.0, 1.0], [0.0, 0.0]) == 0.0


@given(jacobians())
def test_largest_component_is_reached_at_a_corner_and_bounds_the_speed(case):
    J, speed, random = case
    direction = random.normal(size=len(J))
    component = capacity.largest_component(J, direction, speed)
    assert component == pytest.approx(np.max(corners(J, speed) @ direction), abs=1e-9)
    assert capacity.largest_speed(J, direction, speed) * (direction @ direction) <= component * (1 + 1e-9) + 1e-12


@settings(deadline=None)
@given(jacobians(rows=st.integers(2, 3), joints=st.integers(2, 8)))
def test_velocity_polytope_is_the_convex_hull_of_the_box_corners(case):
    J, speed, _ = case
    polytope = capacity.velocity_polytope(J, speed)
    if np.linalg.matrix_rank(J) < len(J):
        assert polytope.size == pytest.approx(0.0, abs=1e-9)
        return
    hull = ConvexHull(corners(J, speed))
    own = ConvexHull(polytope.vertices)
    assert polytope.size == pytest.approx(hull.volume, rel=1e-9)
    assert own.volume == pytest.approx(hull.volume, rel=1e-9)
    outside = own.equations[:, :-1] @ corners(J, speed).T + own.equations[:, -1:]
    assert outside.max() < 1e-9 * np.abs(polytope.vertices).max()
    assert len(own.vertices) == len(polytope.vertices)  # every vertex is a corner of the hull


@settings(deadline=None)
@given(jacobians(rows=st.just(3), joints=st.integers(3, 8)))
def test_faces_close_the_polytope_and_look_outwards(case):
    J, speed, _ = case
    if np.linalg.matrix_rank(J) < 3:
        return
    vertices, faces, size = capacity.velocity_polytope(J, speed)
    fans = [np.linalg.det(vertices[face[[0, i, i + 1]]]) / 6 for face in faces for i in range(1, len(face) - 1)]
    assert sum(fans) == pytest.approx(size, rel=1e-9)  # the divergence theorem needs every face, turned outwards
    assert len(vertices) - sum(map(len, faces)) / 2 + len(faces) == 2


def test_a_planar_polytope_runs_counter_clockwise():
    vertices, (loop,), size = capacity.velocity_polytope([[1.0, 0.0, 1.0], [0.0, 1.0, -1.0]], [1.0, 2.0, 0.5])
    x, y = vertices[loop].T
    assert (x @ np.roll(y, -1) - y @ np.roll(x, -1)) / 2 == pytest.approx(size)


def test_flat_polytopes():
    point = capacity.velocity_polytope(np.zeros((3, 2)), 1.0)
    assert point.vertices.shape == (1, 3) and point.faces == () and point.size == 0
    segment = capacity.velocity_polytope([[1.0, -2.0], [0.0, 0.0]], [1.0, 1.0])
    assert sorted(segment.vertices.tolist()) == [[-3, 0], [3, 0]] and segment.faces == () and segment.size == 0
    square = capacity.velocity_polytope(np.eye(3)[:, :2], 1.0)
    assert len(square.vertices) == 4 and len(square.faces) == 2 and square.size == 0


def farthest(J, speed, shown, twist, direction):
    """Largest direction . (J qd)[shown] while the other rows of J qd are those of twist, by HiGHS; None where nothing fits."""
    held = np.setdiff1d(np.arange(len(J)), shown)
    bounds = [(-limit, limit) for limit in speed]
    best = linprog(-direction @ J[shown], A_eq=J[held], b_eq=twist[held], bounds=bounds, method="highs")
    assert best.status in (0, 2), best.message
    return -best.fun if best.status == 0 else None


@settings(deadline=None, max_examples=60)
@given(seeds, st.integers(2, 3), st.integers(1, 4), st.integers(0, 3), st.floats(0.0, 1.5))
def test_a_velocity_cut_reaches_as_far_as_the_linear_programme(seed, k, more_rows, more_joints, scale):
    random, m = np.random.default_rng(seed), k + more_rows
    J, speed = random.normal(size=(m, m + more_joints)), random.uniform(0.1, 3.0, m + more_joints)
    shown, twist = random.permutation(m)[:k], scale * J @ (speed * random.uniform(-1, 1, m + more_joints))
    cut = capacity.velocity_cut(J, speed, shown, twist)
    for direction in random.normal(size=(6, k)):
        best = farthest(J, speed, shown, twist, direction)
        if best is None:
            assert len(cut.vertices) == 0 and cut.faces == () and cut.size == 0
        elif cut.size > 1e-9:  # a cut that is only just touched may be lost in rounding
            assert np.max(cut.vertices @ direction) == pytest.approx(best, rel=1e-7, abs=1e-8)
    if scale <= 1.0:
        hull = ConvexHull(cut.vertices)
        assert np.max(hull.equations[:, :-1] @ twist[shown] + hull.equations[:, -1]) < 1e-9
        assert hull.volume == pytest.approx(cut.size, rel=1e-7)
        assert k == 2 or len(cut.vertices) - sum(map(len, cut.faces)) / 2 + len(cut.faces) == 2


def test_a_twist_lies_in_its_cut_just_where_the_joints_can_do_it():
    random = np.random.default_rng(5)
    for _ in range(25):
        J, speed, twist = random.normal(size=(6, 7)), random.uniform(0.5, 2.0, 7), random.normal(size=6)
        most = capacity.largest_speed(J, twist, speed)
        for share, fits in ((0.99, True), (1.01, False)):
            cut = capacity.velocity_cut(J, speed, [0, 1, 2], share * most * twist)
            assert fits <= (len(cut.vertices) > 0)
            if len(cut.vertices):
                equations = ConvexHull(cut.vertices).equations
                assert (np.max(equations[:, :-1] @ (share * most * twist[:3]) + equations[:, -1]) < 0) == fits


def test_a_cut_without_other_rows_is_the_whole_and_a_flat_posture_has_none():
    J = np.random.default_rng(1).normal(size=(3, 5))
    whole, cut = capacity.velocity_polytope(J, np.ones(5)), capacity.velocity_cut(J, np.ones(5), [0, 1, 2], np.zeros(3))
    np.testing.assert_allclose(cut.vertices, whole.vertices)
    planar = np.zeros((6, 3))
    planar[[0, 1, 5]] = np.random.default_rng(2).normal(size=(3, 3))
    assert capacity.velocity_cut(planar, np.ones(3), [0, 1, 2], np.zeros(6)).faces == ()
    cut = capacity.velocity_cut(planar, np.ones(3), [0, 1], np.zeros(6))  # the plane of a planar arm, its turning held
    turning = np.array([1.0, 0.0])
    assert np.max(cut.vertices @ turning) == pytest.approx(farthest(planar[[0, 1, 5]], np.ones(3), [0, 1], np.zeros(3), turning))


@settings(deadline=None)
@given(jacobians(rows=st.integers(2, 3), joints=st.integers(1, 9)))
def test_a_force_polytope_is_bounded_by_the_efforts_and_by_nothing_else(case):
    J, effort, random = case
    most = 20.0 * effort.max()
    vertices, faces, size = capacity.force_polytope(J, effort, most)
    assert np.max(np.abs(vertices @ J) / effort) < 1 + 1e-7 and np.abs(vertices).max() <= most * (1 + 1e-9)
    hull = ConvexHull(vertices)
    assert hull.volume == pytest.approx(size, rel=1e-7)
    for direction in random.normal(size=(5, len(J))):
        largest = min(capacity.largest_force(J, direction, effort), most / np.abs(direction).max())
        assert np.max(hull.equations[:, :-1] @ (largest * direction) + hull.equations[:, -1]) == pytest.approx(0.0, abs=1e-7 * most)


@given(jacobians())
def test_ellipsoids_hold_the_images_of_the_unit_sphere(case):
    J, _, random = case
    axes, semi_axes = capacity.velocity_ellipsoid(J)
    np.testing.assert_allclose(axes @ axes.T, np.eye(len(J)), atol=1e-12)
    np.testing.assert_allclose((axes * semi_axes**2) @ axes.T, J @ J.T, atol=1e-11)
    axes, semi_axes = capacity.force_ellipsoid(J)
    for axis, length in zip(axes.T, semi_axes, strict=True):
        effort = np.linalg.norm(J.T @ axis)
        assert effort < 1e-9 if length == np.inf else length * effort == pytest.approx(1.0, rel=1e-6)
    assert np.all(np.diff(semi_axes[np.isfinite(semi_axes)]) <= 0)


@given(jacobians())
def test_largest_force_uses_up_one_joint_and_overloads_none(case):
    J, effort, random = case
    direction = random.normal(size=len(J))
    largest = capacity.largest_force(J, direction, effort)
    if np.isfinite(largest):
        assert np.max(np.abs(J.T @ direction) * largest / effort) == pytest.approx(1.0)
    else:
        np.testing.assert_allclose(J.T @ direction, 0.0, atol=1e-12)


def test_a_stretched_arm_carries_any_load_along_itself():
    J = np.array([[0.0, 0.0], [2.0, 1.0]])
    assert capacity.largest_force(J, [1.0, 0.0], [10.0, 4.0]) == np.inf


@given(jacobians(), st.floats(0.01, 1.0))
def test_damped_step_is_the_published_formula(case, damping):
    J, _, random = case
    v = random.normal(size=len(J))
    expected = J.T @ np.linalg.solve(J @ J.T + damping**2 * np.eye(len(J)), v)
    np.testing.assert_allclose(capacity.damped_step(J, v, damping), expected, rtol=1e-7, atol=1e-9)


@given(jacobians())
def test_undamped_step_is_the_pseudo_inverse(case):
    J, _, random = case
    v = random.normal(size=len(J))
    np.testing.assert_allclose(capacity.damped_step(J, v, 0.0), np.linalg.pinv(J) @ v, rtol=1e-7, atol=1e-9)


def test_damping_leaves_the_stated_share_of_the_demand():
    J, damping = np.diag([2.0, 0.03]), 0.05
    left = np.array([0.0, 1.0]) - J @ capacity.damped_step(J, [0.0, 1.0], damping)
    np.testing.assert_allclose(left, [0.0, damping**2 / (0.03**2 + damping**2)], rtol=1e-12)


@given(seeds, st.integers(2, 4), st.integers(5, 7))
def test_weighted_step_has_the_least_weighted_norm(seed, m, n):
    random = np.random.default_rng(seed)
    J, v, weights = random.normal(size=(m, n)), random.normal(size=m), random.uniform(0.2, 5.0, n)
    step = capacity.weighted_step(J, v, weights)
    np.testing.assert_allclose(J @ step, v, atol=1e-9)
    idle = np.linalg.svd(J)[2][m:]  # moves that leave the task alone
    np.testing.assert_allclose(idle @ (weights * step), 0.0, atol=1e-8)


def test_variable_damping_ends_where_it_should():
    for law in (capacity.damping_by_manipulability, capacity.damping_by_singular_value):
        np.testing.assert_allclose(law(np.array([0.0, 0.05, 1.0]), 0.05, 0.1), [0.1, 0.0, 0.0])


def test_single_numbers_of_regular_and_lost_postures():
    J = np.array([[3.0, 0.0, 0.0], [0.0, 0.5, 0.0]])
    assert capacity.manipulability(J) == pytest.approx(1.5)
    assert capacity.frobenius_condition(J) == pytest.approx((3 / 0.5 + 0.5 / 3) / 2)
    assert capacity.manipulability(J[:, :1]) == 0.0
    assert capacity.frobenius_condition(J[:, :1]) == np.inf


@pytest.mark.parametrize(
    "call, complaint",
    [
        (lambda: capacity.largest_speed(np.eye(2), [1.0, 0.0, 0.0], 1.0), "2 task rows, found a direction of shape"),
        (lambda: capacity.largest_speed(np.eye(2), [0.0, 0.0], 1.0), "not zero"),
        (lambda: capacity.largest_speed(np.eye(2), [1.0, 0.0], [1.0, np.nan]), "one finite number"),
        (lambda: capacity.largest_force(np.eye(2), [1.0, 0.0], [1.0, -1.0]), "not negative"),
        (lambda: capacity.velocity_polytope(np.eye(4), 1.0), "2 or 3 task rows"),
        (lambda: capacity.force_polytope(np.eye(4), 1.0, 10.0), "2 or 3 task rows"),
        (lambda: capacity.velocity_cut(np.eye(4), 1.0, [0, 1], np.zeros(3)), "4 task rows, found a twist of shape"),
        (lambda: capacity.velocity_cut(np.eye(4), 1.0, [0, 1], np.full(4, np.nan)), "a twist is finite"),
        (lambda: capacity.velocity_ellipsoid(np.full((2, 2), np.nan)), "NaN"),
        (lambda: capacity.manipulability(np.ones(3)), "shape"),
    ],
)
def test_what_cannot_be_answered_is_refused(call, complaint):
    with pytest.raises(ValueError, match=complaint):
        call()
