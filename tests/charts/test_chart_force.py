"""Largest forces at a place: against J^T F itself, sampled directions and SciPy's hull."""

import numpy as np
import pytest
from drawn import furthest_out, points
from example_arms import cell_of, path_of_motion
from scipy.spatial import ConvexHull

import pathaudit as pa
from pathaudit import capacity, charts
from pathaudit.errors import ModelError



@pytest.mark.parametrize("n", [6, 7, 9])
@pytest.mark.parametrize("plane", ["xy", "zy"])
def test_in_a_plane_every_point_of_the_outline_uses_up_one_drive_and_overloads_none(arms, jacobian_at, n, plane):
    audit = arms(n)
    rows = ["xyz".index(letter) for letter in plane]
    jacobian, _ = jacobian_at(audit, 30)
    trace = charts.force_capacity(audit, sample=30, plane=plane).data[0]
    drawn = np.stack([trace.x, trace.y], axis=1)
    loads = np.abs(drawn @ jacobian[rows]) / audit.cell.arm.effort
    np.testing.assert_allclose(loads.max(axis=1), 1.0, rtol=1e-6)
    for point, words, load in zip(drawn, trace.text, loads, strict=True):
        ties = [audit.cell.arm.joint_names[j] for j in np.flatnonzero(load > 1 - 1e-6)]
        assert words in [f"{np.linalg.norm(point):.0f} N, joint {name} at its limit" for name in ties]


def test_in_space_the_faces_hold_just_the_forces_that_the_drives_carry(demo, jacobian_at):
    k, effort = 400, demo.cell.arm.effort
    jacobian, _ = jacobian_at(demo, k)
    figure = charts.force_capacity(demo, sample=k)
    mesh = figure.data[0]
    hull = ConvexHull(np.stack([mesh.x, mesh.y, mesh.z], axis=1))
    directions = np.random.default_rng(3).normal(size=(2000, 3))
    most = np.array([capacity.largest_force(jacobian[:3], d, effort) for d in directions])[:, None] * directions
    assert abs(furthest_out(hull, most)) < 1e-5 * np.abs(most).max() and furthest_out(hull, 0.999 * most) < 0
    np.testing.assert_allclose(mesh.intensity, np.linalg.norm(np.stack([mesh.x, mesh.y, mesh.z], axis=1), axis=1))
    assert mesh.colorbar.title.text == "largest force, N" and [figure.layout.scene[f"{c}axis"].title.text for c in "xyz"] == ["part X, N", "part Y, N", "part Z, N"]
    assert points(figure, "edges").shape[1] == 3


def test_the_weakest_direction_is_the_least_of_all(demo, jacobian_at):
    jacobian, _ = jacobian_at(demo, 400)
    for plane, rows in ((None, [0, 1, 2]), ("yz", [1, 2])):
        figure = charts.force_capacity(demo, sample=400, plane=plane)
        end = points(figure, "weakest")[-1]
        size = np.linalg.norm(end)
        directions = np.random.default_rng(4).normal(size=(4000, len(rows)))
        directions /= np.linalg.norm(directions, axis=1)[:, None]
        others = [capacity.largest_force(jacobian[rows], d, demo.cell.arm.effort) for d in directions]
        assert size == pytest.approx(min(others), rel=0.01) and size <= min(others) * (1 + 1e-9)
        assert size == pytest.approx(capacity.largest_force(jacobian[rows], end / size, demo.cell.arm.effort), rel=1e-6)
        assert f"{size:.0f} N, with joint" in figure.layout.title.text.replace("<br>", " ")


def test_what_the_structure_carries_is_cut_off_and_told(arms):
    figure = charts.force_capacity(arms(2), 1.0)
    assert "Cut off at" in figure.layout.title.text and any("and more" in words for words in figure.data[0].text)
    flat = charts.force_capacity(arms(3), 1.0, plane="xy")
    assert np.isfinite(flat.data[0].x).all() and flat.layout.yaxis.scaleanchor == "x"
    with pytest.raises(ValueError, match="loads no drive"):
        charts.force_capacity(slide(), 0.0, plane="xy")


def slide():
    """A single joint that slides along z: a force across it is no matter of its drive."""
    arm = pa.Arm.from_dh([{"type": "prismatic", "lower_mm": 0, "upper_mm": 500, "speed_mm_s": 100, "effort_n": 50}])
    time = np.linspace(0, 1, 5)
    cell = cell_of(arm, start=np.array([0.1]))
    return pa.audit(path_of_motion(cell, time, 0.1 + 0.05 * time[:, None]), cell)


def test_an_arm_without_efforts_is_refused_in_words(arms):
    with pytest.raises(ModelError, match="no effort limit for joint a0, a1, .*expected an arm that states what every drive can give"):
        charts.force_capacity(arms(6, effort=False), 1.0)


def test_units_stand_on_axes_and_hover(demo):
    figure = charts.force_capacity(demo, 10, plane="xz", axes="tool")
    assert figure.layout.xaxis.title.text == "force along the tool's X, N" and figure.layout.yaxis.title.text == "force along the tool's Z, N"
    assert all(" N" in words for words in figure.data[0].text)
