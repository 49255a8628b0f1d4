"""How the tool turns along moves: constant rate about one axis, splines, and what is refused."""

import numpy as np
import pytest
from courses import turn_rates
from scipy.spatial.transform import Rotation, Slerp

import pathaudit as pa
from pathaudit.course import Corner, Draft, timed

pytestmark = pytest.mark.filterwarnings("error")

TURNS = Rotation.from_euler("xyz", [[170, 5, 0], [150, -20, 40], [160, 10, 80], [175, 20, 60]], degrees=True)
POINTS = [(0.0, 0.0, 0.0), (0.1, 0.0, 0.0), (0.15, 0.08, 0.0), (0.1, 0.15, 0.02)]


def course_of(add, turns=TURNS):
    course = Draft("turns", "", False, POINTS[0], 1)
    course.pose(tuple(turns[0].as_quat(scalar_first=True)))
    for line, (point, turn) in enumerate(zip(POINTS[1:], turns[1:], strict=False), 2):
        add(course, point, line, course.pose(tuple(turn.as_quat(scalar_first=True))))
    return course.finish()


def lines():
    return course_of(lambda course, point, line, pose: course.line_to(point, line, pose=pose, speed=0.1))


def curve():
    return course_of(lambda course, point, line, pose: course.curve_to(point, line, pose=pose, speed=0.1))


def test_a_line_turns_at_constant_rate_about_one_axis():
    course = lines()
    t = np.linspace(0.0, 1.0, 9)
    for move in range(3):
        reference = Slerp([0.0, 1.0], TURNS[move : move + 2])(t)
        ours = Rotation.from_quat(course.quaternion(np.full(9, move), t), scalar_first=True)
        assert (reference.inv() * ours).magnitude().max() < 1e-14


def test_a_curve_turns_smoothly_through_the_orientations_of_its_points():
    course = curve()
    ends = Rotation.from_quat(course.quaternion(np.repeat(np.arange(3), 2), np.tile([0.0, 1.0], 3)), scalar_first=True)
    assert (TURNS[[0, 1, 1, 2, 2, 3]].inv() * ends).magnitude().max() < 1e-14
    steps = [np.abs(np.diff(turn_rates(timed(course, acceleration=1.0, step=step)), axis=0)).max() for step in (2e-3, 1e-3)]
    assert steps[0] == pytest.approx(2.0 * steps[1], rel=0.1)  # a kink at a point would leave a step of the same size


def test_a_curve_is_the_same_seen_from_another_frame():
    other = Rotation.from_euler("xyz", [30, 40, 50], degrees=True)
    one = curve()
    two = course_of(lambda course, point, line, pose: course.curve_to(point, line, pose=pose, speed=0.1), other * TURNS)
    move, t = np.repeat(np.arange(3), 5), np.tile(np.linspace(0, 1, 5), 3)
    a, b = (Rotation.from_quat(c.quaternion(move, t), scalar_first=True) for c in (one, two))
    assert (b.inv() * other * a).magnitude().max() < 1e-14


def test_a_rounded_corner_turns_without_a_step_close_to_what_is_programmed():
    path, finer = (timed(lines(), acceleration=1.0, corner=Corner(radius=0.01), step=step) for step in (5e-4, 2.5e-4))
    steps = [np.abs(np.diff(turn_rates(p), axis=0)).max() for p in (path, finer)]
    assert steps[0] == pytest.approx(2.0 * steps[1], rel=0.1)
    assert timed(lines(), acceleration=1.0).duration > path.duration
    for corner in (1, 2):
        k = np.argmin(np.linalg.norm(path.position - POINTS[corner], axis=1))
        left = (Rotation.from_matrix(path.rotation[k]).inv() * TURNS[corner]).magnitude()
        assert left < np.radians(0.5)


def test_a_tool_axis_moves_on_the_great_circle():
    course = Draft("axes", "", True, POINTS[0], 1)
    a, b = np.array([0.0, 0.6, -0.8]), np.array([0.48, 0.64, -0.6])
    course.pose(tuple(a))
    course.line_to(POINTS[1], 2, pose=course.pose(tuple(b)), speed=0.1)
    path = timed(course.finish(), acceleration=1.0)
    assert path.spin_free
    axes, share = path.rotation[:, :, 2], path.position[:, 0] / 0.1
    angle = np.arccos(a @ b)
    expected = (np.sin((1 - share) * angle)[:, None] * a + np.sin(share * angle)[:, None] * b) / np.sin(angle)
    np.testing.assert_allclose(axes, expected, atol=1e-14)


def test_half_a_turn_leaves_the_way_open_and_is_refused():
    flipped = Rotation.concatenate([TURNS[0], TURNS[0] * Rotation.from_euler("x", 180, degrees=True)])
    with pytest.raises(pa.ReadError, match="turns: line 2: found a tool that turns by 180 deg in one move, expected less than half a turn"):
        course_of(lambda course, point, line, pose: course.line_to(point, line, pose=pose), flipped)
    wide = Rotation.concatenate([TURNS[0], TURNS[0] * Rotation.from_euler("x", 100, degrees=True)])
    with pytest.raises(pa.ReadError, match="turns by 100 deg in one move, expected at most 90 deg between points of a curve"):
        course_of(lambda course, point, line, pose: course.curve_to(point, line, pose=pose), wide)


def test_turning_that_swings_out_between_uneven_points_is_refused():
    course = Draft("turns", "", True, (0, 0, 0), 1)
    course.pose((0.0, 0.0, -1.0))
    for line, (x, axis) in enumerate([(0.003, (0.6, 0.0, -0.8)), (0.3, (0.0, 0.6, -0.8)), (0.6, (0.0, 0.0, -1.0))], 2):
        course.curve_to((x, 0.01 * line, 0.0), line, pose=course.pose(axis))
    with pytest.raises(pa.ReadError, match="line [34]: found a tool whose turning swings out between the points of a curve, expected points at distances"):
        course.finish()
