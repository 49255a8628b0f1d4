"""Corners: stops, smooth joins, roundings by a radius or a speed, their round-off against closed forms, and curvature without a step."""

import numpy as np
import pytest
from courses import accelerations, draft, polyline, speeds
from hypothesis import example, given, settings
from hypothesis import strategies as st
from scipy.optimize import minimize_scalar

import pathaudit as pa
from pathaudit.course import Corner, corner_from, round_corners, timed
from pathaudit.course.corners import SHARPEST, peak_factor
from pathaudit.course.shapes import curvature

pytestmark = pytest.mark.filterwarnings("error")


def corner_of(bend, legs=0.1, **more):
    """Two lines that bend by an angle at the origin."""
    return polyline([(-legs, 0, 0), (0, 0, 0), (legs * np.cos(bend), legs * np.sin(bend), 0)], **more)


def rounded(course, corner, speed=0.1, acceleration=1.0):
    return round_corners(course, corner, np.full(course.moves, speed), acceleration)


@settings(deadline=None)
@given(st.floats(0.01, 3.0), st.floats(1e-4, 0.05))
@example(2.256524521055669, 0.05)  # half a leg of 0.1 rounds to one bit less than 0.05 here; legs of 0.2 leave every radius its room
def test_the_round_off_between_lines_is_the_closed_form(bend, radius):
    """At the middle of the quintic each leg gives d/2 - 5 L/32, with L = d bend / tan(bend/2); the two legs span 2 sin(bend/2)."""
    found = rounded(corner_of(bend, 0.2), Corner(radius=radius))
    length = radius * bend / np.tan(bend / 2)
    assert found.deviation[0] == pytest.approx(2 * np.sin(bend / 2) * (radius / 2 - 5 * length / 32), rel=1e-9)
    assert found.used[0] == radius and found.bend[0] == pytest.approx(bend, abs=1e-12)


def test_the_round_off_is_the_least_distance_also_between_arcs():
    course = draft((-0.1, 0, 0))
    course.line_to((0, 0, 0), 2, speed=0.1)
    course.arc_about((0.05, -0.05, 0.0), (0.05, 0, 0), (0, 0, 1.0), np.pi / 2, 3, speed=0.1)
    found = rounded(course.finish(), Corner(radius=0.01))
    curve = found.curves

    def apart(t):
        return np.linalg.norm(curve.at(np.array([0]), np.array([t]))[0])

    best = minimize_scalar(apart, bounds=(0, 1), method="bounded", options={"xatol": 1e-12})
    assert found.deviation[0] == pytest.approx(best.fun, rel=1e-9)


def test_curvature_has_no_step_where_a_rounding_begins_and_ends():
    course = draft((-0.1, 0, 0.02))
    course.line_to((0, 0, 0), 2, speed=0.1)
    course.arc_about((0.05, -0.05, 0.01), (0.05, 0, 0), (0, 0, 1.0), np.pi / 2, 3, speed=0.1)
    course.curve_to((0.1, -0.02, 0.0), 4, speed=0.1)
    course.curve_to((0.12, 0.06, 0.0), 5, speed=0.1)
    course = course.finish()
    found = rounded(course, Corner(radius=0.01))
    assert found.at.tolist() == [0, 1]  # the third join lies inside the curve
    for k, move in enumerate(found.at):
        for t, of, s in ((0.0, move, course.length[move] - found.used[k]), (1.0, move + 1, found.used[k])):
            from pathaudit.course.corners import parameter

            place = parameter(course, np.array([of]), np.array([s]))
            ours, theirs = found.curves.at(np.array([k]), np.array([t])), course.at(np.array([of]), place)
            np.testing.assert_allclose(ours[0], theirs[0], atol=1e-14)
            a, b = curvature(*ours[1:]), curvature(*theirs[1:])
            np.testing.assert_allclose(a[0], b[0], atol=1e-12)
            np.testing.assert_allclose(a[2], b[2], atol=1e-8)


def test_the_peak_of_the_curvature_is_little_above_that_of_a_circle():
    bend = np.radians([1, 10, 30, 60, 90, 120, 150, 170])
    ratio = peak_factor(bend) / np.tan(bend / 2)
    assert (ratio < 1.51).all() and (ratio > 1.17).all() and ratio[4] == pytest.approx(1.194, abs=0.002)


@pytest.mark.parametrize("bend", [0.2, np.pi / 2, 2.6])
def test_a_rounding_by_speed_keeps_that_speed_and_no_more_room_than_it_needs(bend):
    course = corner_of(bend, 0.3, speed=0.3)
    path = timed(course, acceleration=1.0, corner=Corner(speed=0.1), step=1e-3)
    near = np.linalg.norm(path.position[1:], axis=1) < rounded(course, Corner(speed=0.1), 0.3).used[0]
    assert speeds(path)[near].min() == pytest.approx(0.1, rel=0.01)
    assert 0.75 < accelerations(path)[near[1:]].max() < 1.0 + 1e-4


def test_a_radius_in_the_file_goes_before_the_choice_for_all():
    course = draft()
    course.line_to((0.1, 0, 0), 2, speed=0.1, zone=0.0)
    course.line_to((0.1, 0.1, 0), 3, speed=0.1, zone=0.004)
    course.line_to((0.0, 0.1, 0), 4, speed=0.1)
    course.line_to((0.0, 0.0, 0), 5, speed=0.1)
    found = rounded(course.finish(), Corner(radius=0.01))
    assert found.at.tolist() == [1, 2] and found.used.tolist() == [0.004, 0.01]


def test_short_moves_leave_half_of_each_to_a_corner_and_it_is_said():
    course = polyline([(0, 0, 0), (0.1, 0, 0), (0.1, 0.004, 0), (0.2, 0.004, 0)])
    found = rounded(course, Corner(radius=0.01))
    np.testing.assert_allclose(found.used, 0.002)
    made = timed(course, acceleration=1.0, corner=Corner(radius=0.01)).made
    assert any("2 roundings smaller than asked for" in words for words in made)


def test_a_move_that_roundings_use_up_joins_them_without_a_stop():
    course = polyline([(0, 0, 0), (0.1, 0, 0), (0.1, 0.02, 0), (0.2, 0.02, 0)])
    path = timed(course, acceleration=1.0, corner=Corner(radius=0.01), step=1e-3)
    assert speeds(path)[60:-120].min() > 0.05 and accelerations(path).max() < 1.0001


def test_what_is_not_rounded_stops():
    def stops(course, corner):
        path = timed(course, acceleration=1.0, speed=0.2, corner=corner)
        return bool(speeds(path)[4:-4].min() < 0.02)

    assert stops(corner_of(1.0), Corner()) and not stops(corner_of(1.0), Corner(radius=0.005))
    assert stops(corner_of(SHARPEST + 0.01), Corner(radius=0.005))  # turns back
    course = draft()
    course.line_to((0.1, 0, 0), 2, speed=0.1)
    course.line_to((0.1, 0.1, 0), 3, air=True)
    assert stops(course.finish(), Corner(radius=0.005))  # the process ends in the corner itself
    assert not stops(corner_of(np.radians(0.05)), Corner()) and stops(corner_of(np.radians(0.2)), Corner())


def test_what_was_done_in_corners_is_said():
    made = " ".join(timed(corner_of(np.pi / 2), acceleration=1.0, corner=corner_from("5mm")).made)
    assert "1 corner rounded (within 5 mm); the commanded path passes a corner by at most 1.8 mm (round-off, after line 2)." in made
    assert "The tool stops exactly in 1 corner." in " ".join(timed(corner_of(np.pi / 2), acceleration=1.0).made)
    assert "1 join that bend by up to 0.05 deg (allowed 0.1) passed" in " ".join(timed(corner_of(np.radians(0.05)), acceleration=1.0).made)


@pytest.mark.parametrize(
    "text, corner",
    [("stop", Corner()), ("5mm", Corner(radius=0.005)), (" 0.5 in ", Corner(radius=0.0127)), ("40mm/s", Corner(speed=0.04)), ("3 m/min", Corner(speed=0.05)), (".2m", Corner(radius=0.2))],
)
def test_words_for_a_corner(text, corner):
    found = corner_from(text)
    assert found.radius == pytest.approx(corner.radius) and found.speed == pytest.approx(corner.speed)


@pytest.mark.parametrize("text", ["", "5", "mm", "-5mm", "0mm", "5 cm", "1e3mm", "5mm/h", "٥mm", "stop 5mm", None])
def test_words_that_are_no_corner(text):
    with pytest.raises(pa.ModelError, match="corner: found .*, expected stop, a radius such as 5mm or a speed such as 40mm/s"):
        corner_from(text)
