"""Times from ceilings: closed forms on lines and arcs, and no ceiling passed, measured by fine differences of the samples."""

import numpy as np
import pytest
from courses import DOWN, accelerations, draft, polyline, random_course, speeds, turn_rates
from hypothesis import given, settings
from hypothesis import strategies as st

import pathaudit as pa
from pathaudit.course import Corner, Draft, timed

pytestmark = pytest.mark.filterwarnings("error")


def rest_to_rest(length, speed, rate):
    """The closed form: a trapezoid where the speed is reached, else a triangle."""
    return length / speed + speed / rate if length > speed**2 / rate else 2.0 * np.sqrt(length / rate)


@settings(deadline=None)
@given(st.floats(1e-4, 2.0), st.floats(0.01, 2.0), st.floats(0.1, 20.0))
def test_a_line_takes_the_closed_form(length, speed, rate):
    path = timed(polyline([(0, 0, 0), (length, 0, 0)], speed), acceleration=rate)
    assert path.duration == pytest.approx(rest_to_rest(length, speed, rate), rel=1e-12)
    assert path.position[-1, 0] == pytest.approx(length, rel=1e-13)
    t, x = path.time, path.position[:, 0]
    peak = min(speed, np.sqrt(rate * length))
    ramp = peak / rate
    rest = path.duration - t
    expected = np.where(t < ramp, 0.5 * rate * t**2, np.where(rest < ramp, length - 0.5 * rate * rest**2, peak * (t - 0.5 * ramp)))
    np.testing.assert_allclose(x, expected, atol=1e-12 * length)


@settings(deadline=None)
@given(st.floats(0.005, 0.5), st.floats(0.3, 2 * np.pi), st.floats(0.01, 2.0), st.floats(0.1, 10.0))
def test_an_arc_takes_the_closed_form_with_the_bend_counted(radius, sweep, speed, acceleration):
    course = draft((radius, 0, 0))
    course.arc_about((radius * np.cos(sweep), radius * np.sin(sweep), 0), (0, 0, 0), (0, 0, 1.0), sweep, 2, speed=speed)
    path = timed(course.finish(), acceleration=acceleration)
    most = min(speed, np.sqrt(0.8 * acceleration * radius))
    rate = np.sqrt(acceleration**2 - (most**2 / radius) ** 2)
    assert rate >= 0.6 * acceleration * (1 - 1e-12)
    assert path.duration == pytest.approx(rest_to_rest(radius * sweep, most, rate), rel=1e-9)
    np.testing.assert_allclose(np.linalg.norm(path.position, axis=1), radius, rtol=1e-12)


def test_moves_of_different_speed_in_one_line_change_it_in_the_faster_one():
    course = draft()
    for line, (x, speed) in enumerate([(0.1, 0.1), (0.3, 0.3), (0.4, 0.05)], 2):
        course.line_to((x, 0, 0), line, speed=speed)
    path = timed(course.finish(), acceleration=0.5)
    expected = (0.1 / 0.1 + 0.05 / 0.5 * 2) - 0.1 / 0.5 / 2  # first move: rise from rest, no fall
    expected += ((0.3 - 0.1) + (0.3 - 0.05)) / 0.5 + (0.2 - (0.09 - 0.01 + 0.09 - 0.0025) / 1.0) / 0.3
    expected += 0.05 / 0.5 + (0.1 - 0.0025) / 0.05
    assert path.duration == pytest.approx(expected, rel=1e-12)
    at = np.searchsorted(path.position[:, 0], [0.1, 0.3])
    moved = speeds(path)
    assert moved[at].max() < 0.3 and moved[at[0] - 1] == pytest.approx(0.1) and moved[at[1] + 1] == pytest.approx(0.05)


def test_a_short_fast_move_does_not_reach_its_speed_and_slows_what_comes_before_a_slow_one():
    course = draft()
    course.line_to((0.002, 0, 0), 2, speed=1.0)
    course.line_to((0.102, 0, 0), 3, speed=0.01)
    path = timed(course.finish(), acceleration=1.0)
    peak = np.sqrt(0.5 * (0.0 + 0.01**2) + 0.002)
    assert path.duration == pytest.approx(peak + (peak - 0.01) + (0.1 - 0.00005) / 0.01 + 0.01, rel=1e-12)


def a_bit_of_everything():
    course = draft()
    course.line_to((0.1, 0, 0), 2, speed=0.1)
    course.line_to((0.1, 0.1, 0), 3, speed=0.1, zone=0.02)
    course.arc_about((0.0, 0.2, 0.01), (0.0, 0.1, 0), (0, 0, 1.0), np.pi / 2, 4, speed=0.25)
    for line, point in enumerate([(-0.05, 0.25, 0), (-0.15, 0.2, 0.05), (-0.16, 0.19, 0.05), (-0.15, 0.1, 0.0)], 5):
        course.curve_to(point, line, speed=0.2)
    course.dwell(0.4, 9)
    course.line_to((-0.15, 0, 0), 10, pose=course.pose((0.0, 0.6, -0.8)), speed=0.1)
    course.line_to((-0.15, 0, 0), 11, pose=course.pose(DOWN))
    course.line_to((-0.2, 0.05, 0), 12, air=True)
    course.line_to((-0.2, 0.2, 0.1), 13, air=True)
    return course.finish()


@pytest.mark.parametrize("corner", [Corner(), Corner(radius=0.003), Corner(speed=0.05), Corner(speed=0.2)])
@pytest.mark.parametrize("acceleration", [0.3, 2.0])
def test_no_ceiling_is_passed(corner, acceleration):
    course = a_bit_of_everything()
    path = timed(course, speed=0.3, acceleration=acceleration, turn_speed=0.8, turn_acceleration=3.0, corner=corner, step=1e-3)
    assert speeds(path).max() <= 0.3 * (1 + 1e-9) and accelerations(path).max() <= acceleration * (1 + 1e-4)
    turning = turn_rates(path)
    assert np.linalg.norm(turning, axis=1).max() <= 0.8 * (1 + 1e-9)
    steps = np.linalg.norm(np.diff(turning, axis=0), axis=1) / (0.5 * (path.time[2:] - path.time[:-2]))
    assert steps.max() <= 3.0 * (1 + 1e-3)
    programmed = np.append(course.speed, np.nan)[path.source_line[1:] - 2]
    assert (speeds(path) <= np.fmin(programmed, 0.3) * (1 + 1e-9)).all()


@settings(max_examples=40, deadline=None)
@given(st.lists(st.tuples(st.floats(-0.2, 0.2), st.floats(-0.2, 0.2), st.floats(-0.2, 0.2)), min_size=3, max_size=8), st.floats(0.2, 5.0), st.floats(0, 0.05))
def test_no_ceiling_is_passed_on_any_way_through_points(points, acceleration, zone):
    points = [p for k, p in enumerate(points) if k == 0 or np.linalg.norm(np.subtract(p, points[k - 1])) > 1e-3]
    if len(points) < 2:
        return
    path = timed(polyline(points, 0.5, zone=zone), acceleration=acceleration, step=2e-3)
    assert speeds(path).max() <= 0.5 * (1 + 1e-9) and accelerations(path).max() <= acceleration * (1 + 1e-3)


@pytest.mark.parametrize("seed", range(40))
def test_no_ceiling_is_passed_on_any_course(seed):
    rng = np.random.default_rng(seed)
    try:
        course = random_course(rng)
    except pa.ReadError as error:
        assert "of a curve" in str(error) or "no move" in str(error)  # a tool that turns too far or too unevenly between its points
        return
    acceleration, (turn_speed, turn_acceleration) = rng.choice([0.3, 2.0, 10.0]), [(1.0, 4.0), (30.0, 1e4)][seed % 2]
    corner = [Corner(), Corner(radius=0.005), Corner(speed=0.05)][seed % 3]
    path = timed(course, speed=0.25, acceleration=acceleration, turn_speed=turn_speed, turn_acceleration=turn_acceleration, corner=corner, step=1e-3, chord=1e-6, angle=0.005)
    apart = 0.5 * (path.time[2:] - path.time[:-2])
    told = np.minimum(np.diff(path.time)[1:], np.diff(path.time)[:-1]) > 2e-5  # below, differences of rounded positions say nothing
    turning = turn_rates(path)
    assert speeds(path).max() <= 0.25 * (1 + 1e-9) and accelerations(path)[told].max(initial=0.0) <= acceleration * (1 + 1e-3)
    assert np.linalg.norm(turning, axis=1).max() <= turn_speed * (1 + 1e-3)
    assert (np.linalg.norm(np.diff(turning, axis=0), axis=1) / apart)[told].max(initial=0.0) <= turn_acceleration * (1 + 1e-2)


def test_air_moves_without_a_speed_go_at_the_ceiling_and_the_process_keeps_its_first_and_last_sample():
    course = draft((0, 0, 0.1))
    course.line_to((0, 0, 0), 2, air=True)
    course.line_to((0.1, 0, 0), 3, speed=0.05)
    course.line_to((0.1, 0, 0.1), 4, air=True)
    path = timed(course.finish(), speed=0.4, acceleration=4.0)
    on = np.flatnonzero(path.process)
    np.testing.assert_allclose(path.position[on[[0, -1]]], [[0, 0, 0], [0.1, 0, 0]], atol=1e-15)
    assert (np.diff(on) == 1).all() and speeds(path)[: on[0]].max() == pytest.approx(0.4, rel=1e-6)
    assert path.source_line[on[0]] == 2 and set(path.source_line[on[1:]]) == {3}


def test_a_dwell_stands_still_for_its_time():
    course = draft()
    course.line_to((0.1, 0, 0), 2, speed=0.1)
    course.dwell(0.75, 3)
    course.line_to((0.2, 0, 0), 4, speed=0.1)
    path = timed(course.finish(), acceleration=1.0)
    standing = path.source_line == 3
    assert np.ptp(path.time[standing]) == pytest.approx(0.75 - 0.025) and np.ptp(path.position[standing], axis=0).max() == 0.0
    assert path.duration == pytest.approx(2 * 1.1 + 0.75, rel=1e-12)


def test_a_turn_in_place_takes_the_closed_form():
    course = Draft("turn", "", True, (0, 0, 0), 1)
    course.pose(DOWN)
    course.line_to((0, 0, 0), 2, pose=course.pose((0.0, 0.6, -0.8)))
    path = timed(course.finish(), acceleration=1.0, turn_speed=0.5, turn_acceleration=2.0)
    assert path.duration == pytest.approx(rest_to_rest(np.arccos(0.8), 0.5, 2.0), rel=1e-12)
    assert np.linalg.norm(turn_rates(path), axis=1).max() <= 0.5 * (1 + 1e-9)


@pytest.mark.parametrize(
    "given, words",
    [
        ({}, "course: found moves without times, expected the ceiling acceleration_mm_s2 (--acceleration) of the tool"),
        ({"acceleration": 1.0}, "course: line 11: found a move without a speed, expected the ceiling speed_mm_s (--speed)|"
                                "course: line 12: found a move without a speed, expected the ceiling speed_mm_s (--speed)"),
        ({"acceleration": 1.0, "speed": 1.0}, "course: line 11: found a tool that turns in place, expected the ceiling turn_speed_deg_s (--turn-speed)"),
        ({"acceleration": 1.0, "speed": 1.0, "turn_speed": 1.0}, "expected the ceiling turn_acceleration_deg_s2 (--turn-acceleration)"),
        ({"acceleration": 0.0}, "course: found a ceiling acceleration_mm_s2 (--acceleration) of 0 in SI units, expected a number above 0"),
        ({"acceleration": float("nan")}, "course: found a ceiling acceleration_mm_s2 (--acceleration) of nan in SI units, expected a number above 0"),
        ({"acceleration": 1.0, "speed": 1.0, "turn_speed": 1.0, "turn_acceleration": 1.0, "step": 1e-9}, "samples, expected at most 250,480 from 12 moves: a faster path, or larger chord_mm (--chord)"),
    ],
)  # fmt: skip
def test_what_is_missing_is_asked_for_by_name(given, words):
    with pytest.raises(pa.ReadError) as caught:
        timed(a_bit_of_everything(), **given)
    assert any(word in str(caught.value) for word in words.split("|"))
