"""A joint along the path: the right numbers in the right units, limits where they are known."""

import numpy as np
import pytest
from example_arms import cell_of, path_of_motion

import pathaudit as pa
from pathaudit import charts


def rows(figure):
    return [t for t in figure.data if t.name in ("position", "speed", "acceleration")]


def bounds(figure):
    return {row: sorted(t.y[0] for t in figure.data if t.name == "limit" and t.yaxis == row) for row in ("y", "y2", "y3")}


def test_position_speed_and_acceleration_with_their_limits(demo):
    figure, arm = charts.joint_over_time(demo, "j4"), demo.cell.arm
    for trace, values in zip(rows(figure), (demo.joints, demo.rates.joint_speed, demo.rates.joint_acceleration), strict=True):
        np.testing.assert_allclose(trace.y, np.degrees(values[:, 3]))
    drawn = bounds(figure)
    np.testing.assert_allclose(drawn["y"], np.degrees([arm.lower[3], arm.upper[3]]))
    np.testing.assert_allclose(drawn["y2"], np.degrees([-arm.speed[3], arm.speed[3]]))
    np.testing.assert_allclose(drawn["y3"], np.degrees([-arm.acceleration[3], arm.acceleration[3]]))
    layout = figure.layout
    assert [axis.title.text for axis in (layout.yaxis, layout.yaxis2, layout.yaxis3)] == ["position, deg", "speed, deg/s", "acceleration, deg/s2"]
    assert [unit in t.hovertemplate for t, unit in zip(rows(figure), ("deg<", "deg/s<", "deg/s2<"), strict=True)] == [True] * 3
    assert charts.joint_over_time(demo, 3).to_json() == figure.to_json()
    for axis, values, limits in zip((layout.yaxis, layout.yaxis2, layout.yaxis3), (t.y for t in rows(figure)), drawn.values(), strict=True):
        assert axis.range[0] < min(values.min(), limits[0]) and axis.range[1] > max(values.max(), limits[1])


def test_only_its_own_findings_are_shown(demo):
    words = " ".join(a.text for a in charts.joint_over_time(demo, "j4").layout.annotations)
    assert "2 fail: acceleration" in words and "3 fail: speed" in words and "4 fail" not in words and "near-singular" not in words


@pytest.mark.parametrize("joint", ["j9", 6, -1, 1.5, None, True])
def test_an_unknown_joint_is_refused(demo, joint):
    with pytest.raises(ValueError, match="expected one of j1, j2, .* or a number from 0 to 5"):
        charts.joint_over_time(demo, joint)


@pytest.mark.parametrize("n", [2, 3, 6, 7, 9])
def test_arms_of_any_size_and_without_acceleration_limits(arms, n):
    audit = arms(n)
    assert audit.motion.reached.all()
    figure = charts.joint_over_time(audit, n - 1)
    np.testing.assert_allclose(rows(figure)[1].y, np.degrees(audit.rates.joint_speed[:, n - 1]))
    assert bounds(figure)["y3"] == [] and len(bounds(figure)["y2"]) == 2
    assert "no limit is stated" in [a.text for a in figure.layout.annotations]


def test_a_sliding_joint_is_in_mm_and_a_name_is_shown_as_it_is_written():
    dh = [{"name": "rail <b>1", "type": "prismatic", "lower_mm": -500, "upper_mm": 500, "speed_mm_s": 300},
          {"name": "turn", "a_mm": 400, "lower_deg": -np.inf, "upper_deg": np.inf, "speed_deg_s": 90}]
    time = np.linspace(0, 1, 50)
    joints = np.stack([0.2 * time, 0.3 * time], axis=1)
    cell = cell_of(pa.Arm.from_dh(dh), start=joints[0])
    audit = pa.audit(path_of_motion(cell, time, joints), cell)
    figure = charts.joint_over_time(audit, "rail <b>1")
    np.testing.assert_allclose(rows(figure)[0].y, 200 * time, atol=1e-3)
    assert figure.layout.yaxis2.title.text == "speed, mm/s" and "mm/s" in rows(figure)[1].hovertemplate
    assert "Joint rail &lt;b&gt;1 " in figure.layout.title.text
    endless = charts.joint_over_time(audit, "turn")
    assert bounds(endless)["y"] == [] and "travel without end" in [a.text for a in endless.layout.annotations]
