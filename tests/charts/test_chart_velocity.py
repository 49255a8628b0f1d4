"""Tool speeds at a place: against random joint speeds, SciPy's convex hull, and what the audit says of the same place."""

from itertools import product

import numpy as np
import pytest
from drawn import furthest_out, points
from scipy.optimize import linprog
from scipy.spatial import ConvexHull

from pathaudit import charts

WHOLE, CUT = "polytope", "with the tool"


def corner_speeds(jacobian, speed):
    return 1e3 * np.array(list(product((-1.0, 1.0), repeat=len(speed)))) * speed @ jacobian.T


@pytest.mark.parametrize("n", [6, 7, 9])
@pytest.mark.parametrize("plane", [None, "xy", "zx"])
def test_no_joint_speeds_leave_the_polytope_and_its_corners_are_attained(arms, jacobian_at, n, plane):
    audit = arms(n)
    figure = charts.velocity_capacity(audit, sample=30, plane=plane)
    rows = ["xyz".index(letter) for letter in plane or "xyz"]
    jacobian, _ = jacobian_at(audit, 30)
    drawn, speed = points(figure, WHOLE), audit.cell.arm.speed
    hull, size = ConvexHull(drawn), np.abs(drawn).max()
    random = 1e3 * np.random.default_rng(1).uniform(-speed, speed, (20_000, n)) @ jacobian[rows].T
    corners = corner_speeds(jacobian[rows], speed)
    assert furthest_out(hull, random) < 1e-6 * size and abs(furthest_out(hull, corners)) < 1e-6 * size
    for vertex in drawn[hull.vertices]:
        assert np.min(np.linalg.norm(corners - vertex, axis=1)) < 1e-6 * size


@pytest.mark.parametrize("n", [2, 3, 4])
def test_a_planar_arm_has_its_polytope_in_its_plane(arms, jacobian_at, n):
    audit = arms(n)
    drawn = points(charts.velocity_capacity(audit, 1.0, plane="xy"), WHOLE)
    jacobian, _ = jacobian_at(audit, 40)
    hull = ConvexHull(corner_speeds(jacobian[:2], audit.cell.arm.speed))
    assert ConvexHull(drawn).volume == pytest.approx(hull.volume, rel=1e-6)
    flat = charts.velocity_capacity(audit, 1.0)
    assert np.abs(points(flat, WHOLE)[:, 2]).max() < 1e-6 and flat.to_json()
    assert not [t for t in flat.data if t.name.startswith(CUT)]  # no third direction to choose a speed in


@pytest.mark.parametrize("n, plane", [(6, None), (6, "xy"), (7, None), (7, "yz"), (9, None)])
def test_the_inner_polytope_reaches_as_far_as_the_joints_can_go_with_the_rest_of_the_motion(arms, jacobian_at, n, plane):
    audit = arms(n)
    k = int(np.argmax(audit.rates.reserve))
    figure = charts.velocity_capacity(audit, sample=k, plane=plane)
    rows = ["xyz".index(letter) for letter in plane or "xyz"]
    jacobian, _ = jacobian_at(audit, k)
    held, speed = np.setdiff1d(np.arange(6), rows), audit.cell.arm.speed
    drawn = points(figure, CUT)
    for direction in np.random.default_rng(2).normal(size=(12, len(rows))):
        best = linprog(-1e3 * direction @ jacobian[rows], A_eq=jacobian[held], b_eq=audit.motion.twist[k, held], bounds=np.stack([-speed, speed], axis=1))
        assert np.max(drawn @ direction) == pytest.approx(-best.fun, rel=1e-5)
    assert furthest_out(ConvexHull(points(figure, WHOLE)), drawn) < 1e-6 * np.abs(drawn).max()


@pytest.mark.parametrize("n", [6, 7])
@pytest.mark.parametrize("plane", [None, "xy"])
def test_the_programmed_speed_lies_inside_just_where_the_reserve_is_above_one(arms, n, plane):
    audit = arms(n)
    reserve = audit.rates.reserve
    assert (reserve < 0.98).any() and (reserve > 1.02).any()
    for k in np.flatnonzero(np.abs(reserve - 1) > 0.01)[::6]:
        figure = charts.velocity_capacity(audit, sample=int(k), plane=plane)
        v = points(figure, "programmed")[-1]
        np.testing.assert_allclose(v, 1e3 * audit.motion.twist[k, : len(v)], rtol=1e-9)
        cuts = [t for t in figure.data if t.name.startswith(CUT)]
        inside = bool(cuts) and furthest_out(ConvexHull(points(figure, CUT)), v[None]) <= 0
        assert inside == (reserve[k] > 1)
        assert f"programmed: {'fits' if inside else 'does not fit'}" in [t.name for t in figure.data]


def test_where_a_wrist_lines_up_the_outer_polytope_would_deceive(demo):
    figure = charts.velocity_capacity(demo, 27.525, plane="xy")
    v = points(figure, "programmed")[-1]
    assert furthest_out(ConvexHull(points(figure, WHOLE)), v[None]) < 0 < furthest_out(ConvexHull(points(figure, CUT)), v[None])
    assert "24.0 mm/s, turning at 59.7 deg/s. It does not fit" in figure.layout.title.text and "174 %" in figure.layout.title.text.replace("<br>", " ")


def test_the_ellipsoid_is_that_of_the_joint_speeds_in_shares_of_their_limits(arms, jacobian_at):
    audit = arms(7)
    jacobian, _ = jacobian_at(audit, 20)
    for plane in (None, "xz"):
        figure = charts.velocity_capacity(audit, sample=20, plane=plane)
        rows = ["xyz".index(letter) for letter in plane or "xyz"]
        scaled = 1e3 * jacobian[rows] * audit.cell.arm.speed
        ring = points(figure, "ellipsoid")
        sizes = np.sum(ring * np.linalg.solve(scaled @ scaled.T, ring.T).T, axis=1)
        np.testing.assert_allclose(sizes, 1.0, atol=1e-6)
        assert furthest_out(ConvexHull(points(figure, WHOLE)), ring) < 1e-6 * np.abs(ring).max()
        lengths = np.linalg.norm(ring, axis=1)
        sigma = np.linalg.svd(scaled, compute_uv=False)
        assert lengths.max() == pytest.approx(sigma[0], rel=1e-6) and lengths.min() == pytest.approx(sigma[-1], rel=1e-6)


def test_tool_axes_are_the_part_axes_turned(arms, jacobian_at):
    audit = arms(6)
    _, rotation = jacobian_at(audit, 30)
    part, tool = (charts.velocity_capacity(audit, sample=30, axes=axes) for axes in ("part", "tool"))
    for name in (WHOLE, "programmed"):
        turned = points(part, name) @ rotation
        assert all(np.min(np.linalg.norm(points(tool, name) - p, axis=1)) < 1e-6 * np.abs(turned).max() for p in turned)
    assert tool.layout.scene.xaxis.title.text == "tool X, mm/s"


def test_axes_have_one_scale_and_units(demo):
    flat, space = charts.velocity_capacity(demo, 10, plane="yz", span_mm_s=500), charts.velocity_capacity(demo, 10)
    assert flat.layout.yaxis.scaleanchor == "x" and flat.layout.xaxis.range == (-500, 500) == flat.layout.yaxis.range
    assert flat.layout.xaxis.title.text == "speed along the part's Y, mm/s" and flat.layout.yaxis.title.text == "speed along the part's Z, mm/s"
    assert space.layout.scene.aspectmode == "data"
    assert [space.layout.scene[f"{letter}axis"].title.text for letter in "xyz"] == [f"part {letter}, mm/s" for letter in "XYZ"]
    assert all("mm/s" in t.hovertemplate for t in (*flat.data, *space.data) if t.hoverinfo != "skip")


def test_with_the_turn_about_the_tool_free_five_directions_are_held(bead):
    assert bead.path.spin_free
    for k in np.linspace(0, bead.path.samples - 1, 5).astype(int).tolist():
        figure = charts.velocity_capacity(bead, sample=k)
        v = points(figure, "programmed")[-1:]
        assert (furthest_out(ConvexHull(points(figure, CUT)), v) <= 0) == (bead.rates.reserve[k] >= 1)


@pytest.mark.parametrize("place, words", [
    ({}, "a place is one of two"), ({"time": 1.0, "sample": 3}, "a place is one of two"), ({"time": 60.0}, "expected one from 0.000 to 53.000 s"),
    ({"time": "now"}, "expected one from"), ({"time": np.nan}, "expected one from"), ({"sample": 2121}, "expected a number from 0 to 2120"),
    ({"sample": 1.5}, "expected a number from"), ({"time": 1.0, "plane": "xw"}, "expected 'xy', 'xz', 'yz'"), ({"time": 1.0, "plane": "xx"}, "expected 'xy'"),
    ({"time": 1.0, "plane": 2}, "expected 'xy'"), ({"time": 1.0, "axes": "world"}, "expected 'part' or 'tool'"), ({"time": 1.0, "span_mm_s": 0}, "expected a number above 0"),
])  # fmt: skip
def test_what_is_no_place_is_refused_in_words(demo, place, words):
    with pytest.raises(ValueError, match=words):
        charts.velocity_capacity(demo, **place)


def test_a_place_that_is_not_reached_is_refused_with_the_reason(gap):
    for draw in (charts.velocity_capacity, charts.force_capacity if np.isfinite(gap.cell.arm.effort).all() else charts.velocity_capacity):
        with pytest.raises(ValueError, match=r"1\.200 s, .* \(sample 120\) cannot be reached, expected .* The pose is too far away"):
            draw(gap, 1.2)
    assert charts.velocity_capacity(gap, 0.5, plane="xy").data  # seconds from the first sample, not the clock's date
