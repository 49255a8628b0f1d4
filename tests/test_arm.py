"""The arm as a value: Denavit-Hartenberg rows, limits, reach, shapes."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

import pathaudit as pa
from pathaudit.arm import Chain

DEG = np.pi / 180


def translation(x, y, z):
    m = np.eye(4)
    m[:3, 3] = x, y, z
    return m


def turn(axis, angle):
    c, s = np.cos(angle), np.sin(angle)
    m, (a, b) = np.eye(4), {"x": (1, 2), "z": (0, 1)}[axis]
    m[a, a], m[a, b], m[b, a], m[b, b] = c, -s, s, c
    return m


def textbook(rows, convention, q):
    """The product of the published transforms, written out."""
    pose = np.eye(4)
    for row, value in zip(rows, q):
        slides = row["type"] == "prismatic"
        d, theta = row["d_mm"] / 1000 + value * slides, row["theta_deg"] * DEG + value * (not slides)
        z = turn("z", theta) @ translation(0, 0, d)
        x = translation(row["a_mm"] / 1000, 0, 0) @ turn("x", row["alpha_deg"] * DEG)
        pose = pose @ (z @ x if convention == "standard" else x @ z)
    return pose


number = st.floats(-500, 500)
rows_of_any_arm = st.lists(
    st.fixed_dictionaries({"type": st.sampled_from(["revolute", "prismatic"]), "a_mm": number, "alpha_deg": number, "d_mm": number, "theta_deg": number}),
    min_size=1,
    max_size=12,
)


@settings(max_examples=60, deadline=None)
@given(rows_of_any_arm, st.sampled_from(["standard", "modified"]), st.integers(0, 1000))
def test_rows_of_either_convention_give_the_published_product(rows, convention, seed):
    arm = pa.Arm.from_dh(rows, convention)
    q = np.random.default_rng(seed).uniform(-3, 3, arm.n)
    np.testing.assert_allclose(arm.flange_pose(q), textbook(rows, convention, q), atol=1e-12)


@settings(max_examples=30, deadline=None)
@given(rows_of_any_arm, st.integers(0, 1000))
def test_jacobian_is_the_derivative_of_the_pose(rows, seed):
    arm = pa.Arm.from_dh(rows)
    q = np.random.default_rng(seed).uniform(-3, 3, arm.n)
    step = 1e-6
    ends = arm.flange_pose(np.array([q + step * np.eye(arm.n), q - step * np.eye(arm.n)]))
    change = (ends[0] - ends[1]) / (2 * step)
    spin = change[:, :3, :3] @ arm.flange_pose(q)[:3, :3].T
    expected = np.concatenate([change[:, :3, 3], np.stack([spin[:, 2, 1], spin[:, 0, 2], spin[:, 1, 0]], axis=-1)], axis=-1).T
    np.testing.assert_allclose(arm.jacobian(q), expected, atol=2e-8)


@pytest.mark.parametrize("shape", [(), (5,), (2, 3), (0,)])
def test_poses_and_jacobians_at_any_batch_shape(shape):
    arm = pa.Arm.from_dh([{"a_mm": 500}, {"a_mm": 400}, {"type": "prismatic"}])
    q = np.random.default_rng(0).normal(size=shape + (3,))
    assert arm.flange_pose(q).shape == shape + (4, 4) and arm.jacobian(q).shape == shape + (6, 3)
    for index in np.ndindex(shape):
        np.testing.assert_array_equal(arm.flange_pose(q)[index], arm.flange_pose(q[index]))


def test_wrong_number_of_joint_values():
    with pytest.raises(pa.ModelError, match=r"q: found shape \(3,\), expected \(\.\.\., 2\)"):
        pa.Arm.from_dh([{}, {}]).flange_pose([0, 0, 0])


def test_limits_in_their_units():
    turning = {"lower_deg": -90, "upper_deg": 180, "speed_deg_s": 360, "acceleration_deg_s2": 720, "effort_nm": 55}
    sliding = {"type": "prismatic", "lower_mm": -10, "upper_mm": 1500, "speed_mm_s": 250, "acceleration_mm_s2": 2000, "effort_n": 900}
    arm = pa.Arm.from_dh([turning, sliding], name="rail arm")
    assert arm.name == "rail arm" and arm.joint_names == ("j1", "j2") and arm.prismatic.tolist() == [False, True]
    np.testing.assert_allclose(arm.lower, [-np.pi / 2, -0.01])
    np.testing.assert_allclose(arm.upper, [np.pi, 1.5])
    np.testing.assert_allclose(arm.speed, [2 * np.pi, 0.25])
    np.testing.assert_allclose(arm.acceleration, [4 * np.pi, 2.0])
    np.testing.assert_allclose(arm.effort, [55, 900])


def test_limits_that_nobody_stated_stay_open():
    arm = pa.Arm.from_dh([{}])
    for limit in (arm.lower, arm.upper, arm.speed, arm.acceleration, arm.effort):
        assert np.isnan(limit).all()


def test_endless_turning_may_be_said():
    arm = pa.Arm.from_dh([{"lower_deg": -np.inf, "upper_deg": np.inf}])
    assert arm.lower[0] == -np.inf and arm.upper[0] == np.inf


def test_reach():
    rows = [{"d_mm": 450, "a_mm": 30, "alpha_deg": 90}, {"a_mm": 600}, {"type": "prismatic", "d_mm": 80, "lower_mm": -250, "upper_mm": 100}]
    assert pa.Arm.from_dh(rows).reach == pytest.approx(np.hypot(0.45, 0.03) + 0.6 + 0.08 + 0.25)
    assert pa.Arm.from_dh(rows, "modified").reach == pytest.approx(0.6 + 0.08 + 0.25)


@settings(max_examples=60, deadline=None)
@given(rows_of_any_arm, st.sampled_from(["standard", "modified"]), st.integers(0, 1000))
def test_the_flange_never_leaves_the_reach(rows, convention, seed):
    for row in rows:
        row.update({"lower_mm": -300, "upper_mm": 200} if row["type"] == "prismatic" else {"lower_deg": -180, "upper_deg": 180})
    arm = pa.Arm.from_dh(rows, convention)
    q = np.random.default_rng(seed).uniform(arm.lower, arm.upper, (200, arm.n))
    first = arm.chain.links[0][:3, 3]
    assert np.linalg.norm(arm.flange_pose(q)[:, :3, 3] - first, axis=1).max() <= arm.reach + 1e-12


def test_an_arm_is_a_value():
    arm = pa.Arm.from_dh([{"a_mm": 1}, {}])
    for array in (*arm.chain, arm.lower, arm.upper, arm.speed, arm.acceleration, arm.effort):
        with pytest.raises(ValueError):
            array[0] = 0
    with pytest.raises(AttributeError):
        arm.name = "other"


@pytest.mark.parametrize(
    "rows, words",
    [
        ([], ["joints: found 0", "1 to 12"]),
        ([{}] * 13, ["joints: found 13", "1 to 12"]),
        ([{"name": "a"}, {"name": "a"}], ["'a' twice"]),
        ([{"type": "screw"}], ["joint j1", "'screw'", "'revolute' or 'prismatic'"]),
        ([{"a": 1}], ["the key 'a'", "a_mm"]),
        ([{"speed_mm_s": 1}], ["speed_mm_s", "speed_deg_s"]),
        ([{"type": "prismatic", "upper_deg": 1}], ["upper_deg", "upper_mm"]),
        ([{"a_mm": "long"}], ["joint j1, a_mm", "'long'", "a finite number"]),
        ([{"a_mm": np.nan}], ["joint j1, a_mm", "a finite number"]),
        ([{"a_mm": None}], ["a_mm", "a finite number"]),
        ([{"a_mm": True}], ["a_mm", "a finite number"]),
        ([{"d_mm": [1, 2]}], ["d_mm", "a finite number"]),
        ([{"lower_deg": 10, "upper_deg": 10}], ["joint j1", "below the upper"]),
        ([{"speed_deg_s": 0}], ["joint j1", "speed limit 0", "above 0"]),
        ([{"speed_deg_s": -3}], ["speed limit", "above 0"]),
        ([{"type": "prismatic", "lower_mm": np.inf}], ["lower_mm", "a finite number"]),
        ([{"a_mm": 10**400}], ["a_mm", "a finite number"]),
        ([{"a_mm": 1e9}], ["chain", "longer than 10 km"]),
        ([7], ["joint row 1", "a mapping"]),
    ],
)
def test_rows_that_are_refused(rows, words):
    with pytest.raises(pa.ModelError) as caught:
        pa.Arm.from_dh(rows)
    for word in words:
        assert word in str(caught.value)


def test_a_convention_that_is_refused():
    with pytest.raises(pa.ModelError, match="'classic', expected 'standard' or 'modified'"):
        pa.Arm.from_dh([{}], "classic")


def test_arrays_of_the_wrong_shape_are_refused():
    two = np.ones(2)
    with pytest.raises(pa.ModelError, match=r"links of shape \(2, 4, 4\)"):
        pa.Arm("arm", ("a", "b"), Chain(np.zeros((2, 4, 4)), np.zeros(2)), -two, two, two, two, two)
    with pytest.raises(pa.ModelError, match=r"speed: found shape \(3,\)"):
        pa.Arm("arm", ("a", "b"), Chain(np.zeros((3, 4, 4)), np.zeros(2)), -two, two, np.ones(3), two, two)
