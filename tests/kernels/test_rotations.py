"""Rotations: against scipy, against exact values, and by their algebra at any batch shape."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.spatial.transform import Rotation

from pathaudit.kernels import rotations as rot

BATCHES = [(), (7,), (3, 4), (0,)]


def some(shape, seed=0):
    count = int(np.prod(shape))
    turns = Rotation.random(count, rng=np.random.default_rng(seed)) if count else None
    return turns.as_matrix().reshape(shape + (3, 3)) if count else np.empty(shape + (3, 3))


def angle_between(a, b):
    return np.linalg.norm(rot.log_matrix(np.swapaxes(a, -1, -2) @ b), axis=-1)


unit_vectors = st.tuples(*[st.floats(-1, 1)] * 3).map(np.array).filter(lambda v: np.linalg.norm(v) > 1e-3).map(lambda v: v / np.linalg.norm(v))
angles = st.floats(-10, 10)


@pytest.mark.parametrize("shape", BATCHES)
def test_conversions_round_trip_at_any_batch_shape(shape):
    m = some(shape)
    for there, back in [
        (rot.wxyz_from_matrix, rot.matrix_from_wxyz),
        (rot.rpy_from_matrix, rot.matrix_from_rpy),
        (rot.log_matrix, rot.exp_vector),
    ]:
        assert back(there(m)).shape == m.shape
        np.testing.assert_allclose(back(there(m)), m, rtol=0, atol=4e-15)


def test_conversions_agree_with_scipy():
    turns = Rotation.random(400, rng=np.random.default_rng(3))
    m = turns.as_matrix()
    np.testing.assert_allclose(rot.matrix_from_rpy(turns.as_euler("xyz")), m, atol=2e-15)
    np.testing.assert_allclose(rot.matrix_from_rpy_deg(turns.as_euler("xyz", degrees=True)), m, atol=2e-15)
    np.testing.assert_allclose(rot.rpy_from_matrix(m), turns.as_euler("xyz"), atol=1e-12)
    np.testing.assert_allclose(rot.wxyz_from_matrix(m), turns.as_quat(canonical=True, scalar_first=True), atol=2e-15)
    np.testing.assert_allclose(rot.log_matrix(m), turns.as_rotvec(), atol=1e-13)
    np.testing.assert_allclose(rot.exp_vector(turns.as_rotvec()), m, atol=2e-15)
    other = Rotation.random(400, rng=np.random.default_rng(4))
    product = rot.matrix_from_wxyz(rot.multiply_wxyz(rot.wxyz_from_matrix(m), rot.wxyz_from_matrix(other.as_matrix())))
    np.testing.assert_allclose(product, (turns * other).as_matrix(), atol=2e-15)


def test_quarter_turns_are_exact():
    assert rot.matrix_from_rpy_deg([90.0, -90.0, 180.0]).tolist() == [[0, 1, 0], [0, 0, 1], [1, 0, 0]]
    cos, sin = rot.cos_sin_deg(np.arange(-720, 721, 90))
    assert set(cos) == set(sin) == {-1.0, 0.0, 1.0} and not np.signbit([*cos[cos == 0], *sin[sin == 0]]).any()


@given(st.floats(-1e6, 1e6))
def test_cosine_and_sine_of_degrees(angle):
    cos, sin = rot.cos_sin_deg(angle)
    exact = np.deg2rad(np.fmod(angle, 360.0))
    np.testing.assert_allclose([cos, sin], [np.cos(exact), np.sin(exact)], rtol=0, atol=2e-15)


@pytest.mark.parametrize("y", [np.pi / 2, -np.pi / 2])
def test_rpy_where_the_first_and_the_last_axis_line_up(y):
    m = rot.matrix_from_rpy([0.3, y, -0.4])
    np.testing.assert_allclose(rot.matrix_from_rpy(rot.rpy_from_matrix(m)), m, atol=1e-12)
    assert rot.rpy_from_matrix(m)[2] == 0.0


@given(unit_vectors, st.floats(-200, 0.4969).map(lambda power: 10.0**power))
def test_log_after_exp_at_every_size_of_the_angle(axis, angle):
    """From 1e-200 rad to just below pi, relative to the angle: no small-angle switch to fall off."""
    vector = rot.log_matrix(rot.exp_vector(axis * angle))
    tolerance = 1e-14 * angle / min(1.0, np.pi - angle)
    np.testing.assert_allclose(vector, axis * angle, rtol=0, atol=tolerance + 4e-16 * (angle > 1e-3))


@pytest.mark.parametrize("angle", [1e-9, 1e-6, 1e-4, 1e-3, 0.1])
def test_exp_of_small_angles_against_more_digits(angle):
    import mpmath

    with mpmath.workdps(50):
        v = [mpmath.mpf(angle) * c for c in (mpmath.mpf(2) / 7, mpmath.mpf(3) / 7, mpmath.mpf(6) / 7)]
        exact = mpmath.expm(mpmath.matrix([[0, -v[2], v[1]], [v[2], 0, -v[0]], [-v[1], v[0], 0]]))
        found = rot.exp_vector([float(c) for c in v])
        error = max(abs(mpmath.mpf(found[r, c]) - exact[r, c]) for r in range(3) for c in range(3))
    assert error < 3e-16


def test_half_a_turn_has_a_log():
    for axis in np.eye(3):
        vector = rot.log_matrix(rot.exp_vector(np.pi * axis))
        np.testing.assert_allclose(np.abs(vector), np.pi * axis, atol=1e-15)


@given(unit_vectors)
def test_turn_of_z_onto_an_axis_is_a_rotation(axis):
    m = rot.turn_z_onto(axis)
    np.testing.assert_allclose(m[:, 2], axis, rtol=0, atol=1e-15)
    np.testing.assert_allclose(m @ m.T, np.eye(3), atol=1e-15)
    assert np.linalg.det(m) > 0


def test_turn_of_z_onto_the_axis_directions_is_exact():
    for axis in [*np.eye(3), *-np.eye(3)]:
        m = rot.turn_z_onto(axis)
        assert (m[:, 2] == axis).all() and (m @ m.T == np.eye(3)).all()
    assert (rot.turn_z_onto([0.0, 0.0, 1.0]) == np.eye(3)).all()


@pytest.mark.parametrize("tilt", [1e-3, 1e-6, 1e-8, 1e-12])
def test_turn_of_z_onto_nearly_downward_axes_keeps_its_digits(tilt):
    axis = np.array([np.sin(tilt), 0.0, -np.cos(tilt)])
    m = rot.turn_z_onto(axis)
    np.testing.assert_allclose(m[:, 2], axis, rtol=0, atol=2e-16)
    np.testing.assert_allclose(m @ m.T, np.eye(3), atol=4e-16)


@given(unit_vectors, unit_vectors)
def test_least_turn_brings_one_onto_the_other_and_no_turn_is_smaller(start, end):
    m = rot.matrix_from_wxyz(rot.least_turn_wxyz(start, end))
    np.testing.assert_allclose(m @ start, end, atol=1e-7 if start @ end < -1 + 1e-9 else 1e-12)
    least = np.arctan2(np.linalg.norm(np.cross(start, end)), start @ end)
    assert np.linalg.norm(rot.log_matrix(m)) <= least + 1e-7


@given(unit_vectors)
def test_opposite_axes_turn_by_half_a_turn(start):
    m = rot.matrix_from_wxyz(rot.least_turn_wxyz(start, -start))
    np.testing.assert_allclose(m @ start, -start, atol=1e-14)


@given(unit_vectors)
def test_frame_on_an_axis(axis):
    m = rot.frame_on_axis(axis)
    np.testing.assert_allclose(m[:, 2], axis)
    np.testing.assert_allclose(m @ m.T, np.eye(3), atol=1e-14)
    assert np.linalg.det(m) > 0


def test_frame_on_a_downward_axis_keeps_x():
    assert rot.frame_on_axis([0.0, 0.0, -1.0]).tolist() == [[1, 0, 0], [0, -1, 0], [0, 0, -1]]


def wandering_axes(n, seed, step=0.2):
    rng = np.random.default_rng(seed)
    axes = np.cumsum(step * rng.normal(size=(n, 3)), axis=0) + rng.normal(size=3)
    return axes / np.linalg.norm(axes, axis=1, keepdims=True)


@pytest.mark.parametrize("n", [1, 2, 3, 64, 65, 1000])
def test_carried_frames_are_those_of_one_step_after_the_other(n):
    axes = wandering_axes(n, seed=n)
    frames = rot.carry_frames(axes)
    step_by_step = [rot.frame_on_axis(axes[0])]
    for before, after in zip(axes[:-1], axes[1:]):
        turn, _ = Rotation.align_vectors([after, np.cross(before, after)], [before, np.cross(before, after)])
        step_by_step.append(turn.as_matrix() @ step_by_step[-1])
    np.testing.assert_allclose(frames, step_by_step, atol=1e-6 if n > 100 else 1e-7)  # align_vectors itself keeps half the digits
    np.testing.assert_allclose(frames[:, :, 2], axes, atol=1e-15)
    np.testing.assert_allclose(frames @ np.swapaxes(frames, 1, 2), np.broadcast_to(np.eye(3), frames.shape), atol=2e-15)


@settings(max_examples=40)
@given(st.integers(2, 60), st.integers(0, 2**32 - 1))
def test_no_spin_is_added_between_carried_frames(n, seed):
    axes = wandering_axes(n, seed)
    frames = rot.carry_frames(axes)
    turned = rot.log_matrix(np.swapaxes(frames[:-1], 1, 2) @ frames[1:])
    assert np.abs(turned[:, 2]).max() < 1e-7  # the turn has no part about the tool axis


def test_carrying_around_a_cone_turns_the_frame_by_the_solid_angle():
    """Closed form: parallel transport once around a cone of half angle c turns a frame by 2 pi (1 - cos c) (Gauss-Bonnet)."""
    half, around = np.deg2rad(40.0), np.linspace(0.0, 2 * np.pi, 20_001)
    axes = np.stack([np.sin(half) * np.cos(around), np.sin(half) * np.sin(around), np.full_like(around, np.cos(half))], axis=-1)
    frames = rot.carry_frames(axes)
    assert angle_between(frames[0], frames[-1]) == pytest.approx(2 * np.pi * (1 - np.cos(half)), abs=1e-7)


def test_signs_of_quaternions_become_continuous():
    smooth = rot.wxyz_from_matrix(rot.exp_vector(np.linspace(0, 6, 50)[:, None] * [0.0, 0.6, 0.8]))
    signs = np.random.default_rng(1).choice([-1.0, 1.0], size=50)
    q = rot.continuous_wxyz(smooth * signs[:, None])
    assert (np.sum(q[1:] * q[:-1], axis=1) > 0).all() and (q[0] == smooth[0] * signs[0]).all()
    np.testing.assert_allclose(rot.matrix_from_wxyz(q), rot.matrix_from_wxyz(smooth), atol=1e-15)


@pytest.mark.parametrize("shape", BATCHES)
def test_inverse_of_poses(shape):
    poses = rot.pose(some(shape), np.random.default_rng(2).normal(size=shape + (3,)))
    np.testing.assert_allclose(poses @ rot.inverse_pose(poses), np.broadcast_to(np.eye(4), poses.shape), atol=4e-15)


@given(unit_vectors, unit_vectors)
def test_cross_matrix(a, b):
    np.testing.assert_allclose(rot.cross_matrix(a) @ b, np.cross(a, b), atol=1e-15)
