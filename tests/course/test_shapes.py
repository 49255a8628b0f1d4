"""Arcs, helices and curves against closed forms and SciPy: points, tangents, curvature, length, and the way back from length to place."""

import numpy as np
import pytest
from courses import draft
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.integrate import quad
from scipy.interpolate import CubicSpline
from scipy.spatial.transform import Rotation

from pathaudit.course.corners import parameter
from pathaudit.course.curves import arc_over, joining_quintic, spline, tridiagonal
from pathaudit.course.shapes import Curves, curvature

pytestmark = pytest.mark.filterwarnings("error")


def arc(radius, sweep, rise, turn=None):
    """A helix about z, or about z turned by `turn`, that begins at (radius, 0, 0), and its closed form of the share t."""
    turn = Rotation.identity() if turn is None else turn

    def place(t):
        t = np.asarray(t)
        return turn.apply(np.stack([radius * np.cos(sweep * t), radius * np.sin(sweep * t), rise * t], axis=-1))

    course = draft(place(0.0))
    course.arc_about(tuple(place(1.0)), (0.0, 0.0, 0.0), tuple(turn.apply([0.0, 0.0, 1.0])), sweep, 2)
    return course.finish(), place


@settings(deadline=None)
@given(st.floats(1e-3, 2.0), st.floats(0.01, 2.0 * np.pi), st.floats(-1.0, 1.0), st.integers(0, 10_000))
def test_a_helix_about_any_axis_has_its_points_length_and_curvature(radius, sweep, rise, seed):
    course, place = arc(radius, sweep, rise, Rotation.random(rng=np.random.default_rng(seed)))
    t = np.linspace(0.0, 1.0, 11)
    here, slope, bend = course.at(np.zeros(11, dtype=int), t)
    np.testing.assert_allclose(here, place(t), atol=1e-14)
    length = np.hypot(radius * sweep, rise)
    assert course.length[0] == pytest.approx(length, rel=1e-12)
    _, speed, bent = curvature(slope, bend)
    np.testing.assert_allclose(speed, length, rtol=1e-12)  # even along the arc
    np.testing.assert_allclose(np.linalg.norm(bent, axis=1), radius * sweep**2 / length**2, rtol=1e-9)


@pytest.mark.parametrize("turn", [Rotation.identity(), Rotation.from_euler("x", 90, degrees=True), Rotation.from_euler("yz", [40, -70], degrees=True)])
def test_a_full_turn_comes_back(turn):
    course, place = arc(0.05, 2.0 * np.pi, 0.0, turn)
    np.testing.assert_allclose(course.at(np.array([0, 0]), np.array([0.0, 1.0]))[0], [place(0.0), place(0.0)], atol=1e-16)
    np.testing.assert_allclose(course.at(np.array([0]), np.array([0.5]))[0], [-place(0.0)], atol=1e-16)
    assert course.length[0] == pytest.approx(0.1 * np.pi, rel=1e-14)


def test_an_arc_ends_exactly_where_the_file_says_although_rounded_numbers_put_its_end_beside_the_circle():
    course = draft((0.01, 0.0, 0.0))
    course.arc_about((0.0, 0.010001, 0.0), (0.0, 0.0, 0.0), (0.0, 0.0, 1.0), np.pi / 2, 2)
    course = course.finish()
    np.testing.assert_array_equal(course.at(np.array([0]), np.array([1.0]))[0], [[0.0, 0.010001, 0.0]])
    assert course.length[0] == pytest.approx(0.005 * np.pi, rel=1e-7)


@pytest.mark.parametrize("n", [3, 4, 5, 6, 50])
def test_the_spline_is_the_one_without_a_knot_beside_its_ends(n):
    rng = np.random.default_rng(n)
    points, chords = rng.normal(size=(n, 3)), rng.uniform(0.2, 3.0, n - 1)
    reference = CubicSpline(np.concatenate([[0.0], np.cumsum(chords)]), points, bc_type="not-a-knot")
    share = np.linspace(0.0, 1.0, 6)
    ours = np.einsum("kpc,sp->ksc", spline(points, chords), share[:, None] ** np.arange(4))
    np.testing.assert_allclose(ours, reference(reference.x[:-1, None] + share * chords[:, None]), atol=1e-12)


def test_two_points_make_a_straight_line():
    cubic = spline(np.array([[0.0, 1.0], [2.0, 5.0]]), [0.3])
    np.testing.assert_allclose(cubic, [[[0.0, 1.0], [2.0, 4.0], [0.0, 0.0], [0.0, 0.0]]], atol=1e-15)


@settings(deadline=None)
@given(st.integers(1, 40), st.integers(0, 1000))
def test_tridiagonal_systems_are_solved(n, seed):
    rng = np.random.default_rng(seed)
    below, above = rng.uniform(-1, 1, (2, n, 1))
    below[0] = above[-1] = 0.0
    on, right = 1.1 * (np.abs(below) + np.abs(above)) + 0.1, rng.normal(size=(n, 2))
    matrix = np.diag(on[:, 0]) + np.diag(below[1:, 0], -1) + np.diag(above[:-1, 0], 1)
    np.testing.assert_allclose(tridiagonal(below, on, above, right), np.linalg.solve(matrix, right), atol=1e-9)


def curve_through(points):
    course = draft(points[0])
    for line, point in enumerate(points[1:], 2):
        course.curve_to(tuple(point), line)
    return course.finish()


def test_a_curve_passes_its_points_and_its_length_is_the_integral():
    points = np.array([[0, 0, 0], [0.1, 0.02, 0], [0.15, 0.1, 0.03], [0.1, 0.2, 0.0], [0.0, 0.22, -0.02]])
    course = curve_through(points)
    for move in range(4):
        ends = course.at(np.array([move, move]), np.array([0.0, 1.0]))[0]
        np.testing.assert_allclose(ends, points[move : move + 2], atol=1e-16)
        length = quad(lambda t: np.linalg.norm(course.at(np.array([move]), np.array([t]))[1]), 0, 1, epsabs=1e-13)[0]  # noqa: B023
        assert course.length[move] == pytest.approx(length, rel=1e-12)


def test_a_curve_through_points_of_a_circle_nears_it_with_the_fourth_power():
    off = []
    for n in (20, 40):
        angle = np.linspace(0.0, 3.0, n) + 0.4 / n * np.sin(np.arange(n))
        course = curve_through(np.stack([np.cos(angle), np.sin(angle), 0 * angle], axis=1))
        move, t = np.repeat(np.arange(n - 1), 5), np.tile(np.linspace(0.1, 0.9, 5), n - 1)
        off.append(np.abs(np.linalg.norm(course.at(move, t)[0], axis=1) - 1.0).max())
    assert off[0] < 1e-4 and off[0] / off[1] > 12.0


@settings(deadline=None)
@given(st.floats(1e-6, 1.0))
def test_the_place_at_a_length_is_found_again(share):
    course = curve_through(np.array([[0, 0, 0], [0.1, 0.02, 0], [0.15, 0.1, 0.03], [0.1, 0.2, 0.0]]))
    for move in range(3):
        t = parameter(course, np.array([move]), np.array([share * course.length[move]]))[0]
        length = quad(lambda u: np.linalg.norm(course.at(np.array([move]), np.array([u]))[1]), 0.0, t, epsabs=1e-14)[0]  # noqa: B023
        assert length == pytest.approx(share * course.length[move], abs=1e-13)


def test_the_joining_quintic_takes_tangents_and_curvatures_of_two_helices():
    turn = Rotation.from_euler("xyz", [20, -30, 50], degrees=True)
    one, other = arc(0.05, 1.0, 0.01)[0], arc(0.08, 2.0, -0.02, turn)[0]
    start, slope0, bend0 = one.at(np.array([0]), np.array([0.7]))
    end, slope1, bend1 = other.at(np.array([0]), np.array([0.3]))
    (tangent0, _, bent0), (tangent1, _, bent1) = curvature(slope0, bend0), curvature(slope1, bend1)
    join = Curves(joining_quintic(start, end, (tangent0, tangent1), (bent0, bent1)))
    for t, place, tangent, bent in ((0.0, start, tangent0, bent0), (1.0, end, tangent1, bent1)):
        here, slope, bend = join.at(np.array([0]), np.array([t]))
        found = curvature(slope, bend)
        np.testing.assert_allclose(here, place, atol=1e-15)
        np.testing.assert_allclose(found[0], tangent, atol=1e-13)
        np.testing.assert_allclose(found[2], bent, atol=1e-9)


def test_an_arc_over_a_chord():
    np.testing.assert_allclose(arc_over(np.array([2.0, 2.0, np.sqrt(2.0)]), np.array([0.0, np.pi, np.pi / 2])), [2.0, np.pi, np.pi / 2], rtol=1e-15)
