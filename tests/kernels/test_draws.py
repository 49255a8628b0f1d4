"""A path solved once more from joints that are known, against following it."""

import numpy as np
import pytest
from tolerant_cells import swayed

from pathaudit.arm import Chain
from pathaudit.kernels import draws
from pathaudit.spread.judging import Course
from pathaudit.spread.placing import frames
from pathaudit.tolerances import Tolerances


def off(audit, **values):
    """Links of the chain with dimensions off by values"""
    names = {d.name: d for d in Tolerances.of(audit.cell.arm, part_xyz_mm=1, part_rpy_deg=1, tool_xyz_mm=1, joint_zero_deg=1).dimensions}
    return frames(audit.cell, tuple(names[name.replace("_", " ")] for name in values), list(values.values())).chains[0]


def drawn(course, links):
    """Whether it was solved, and joints, speed, acceleration, sigma"""
    out = [np.full_like(course.joints, np.nan) for _ in range(3)] + [np.full(len(course.joints), np.nan)]
    return course.near(links, *out), out


@pytest.mark.parametrize("seed", range(6))
@pytest.mark.parametrize("size", [1e-3, 0.3, 5.0])
def test_what_is_solved_is_what_following_finds(seed, size):
    audit = swayed(seed, 0.7, every=3)
    course = Course.of(audit)
    links = off(audit, part_x=size, part_rz=0.1 * size, tool_z=-size, zero_of_j4=0.05 * size)
    solved, (joints, speed, acceleration, sigma) = drawn(course, links)
    followed, closest, outcome = course.follow(links)
    rate, change, least = course.rates(links, followed, closest)
    assert solved and not outcome.any()
    np.testing.assert_allclose(joints, followed, atol=2e-8)
    np.testing.assert_allclose(speed, rate, atol=1e-6)
    np.testing.assert_allclose(acceleration, change, atol=1e-5)
    np.testing.assert_allclose(sigma, least, rtol=1e-6)


def test_too_far_off_it_is_left_to_following():
    audit = swayed(1, 0.7, every=3)
    course = Course.of(audit)
    assert not drawn(course, off(audit, part_x=2000.0))[0] and not drawn(course, off(audit, part_z=150.0, part_rx=12.0))[0]


def test_where_the_path_crosses_a_singular_place_it_is_left_to_following():
    audit = swayed(1, 0.7, every=3)
    course = Course.of(audit)
    # the wrist is straight where its middle joint stands at zero: known joints that cross it
    links = np.array(course.prismatic), off(audit, part_x=0.0)
    joints = course.joints.copy()
    joints[:, 4] = np.linspace(0.3, -0.3, len(joints))
    from pathaudit.kernels import linkage

    poses = linkage.poses(links[1], links[0], joints)
    path = np.ascontiguousarray(poses[:, :3, 3]), np.ascontiguousarray(poses[:, :3, :3]), course.twist, course.twist_rate
    out = [np.empty_like(joints) for _ in range(3)] + [np.empty(len(joints))]
    chain = Chain(links[1], links[0])
    assert not draws.draw(chain, course.length, course.weights, path, joints, course.jacobians, course.sigma, *out)


@pytest.mark.parametrize("degree", [0, 1, 2, 3])
def test_what_is_foretold_is_exact_for_cubics(degree):
    along = np.cumsum(np.random.default_rng(1).uniform(0.5, 1.2, 50))
    weights, values = draws.foretelling(along), along**degree
    for k in range(draws.BEFORE, 50):
        told = sum(weights[k, j] * values[k - 1 - j] for j in range(draws.BEFORE))
        assert told == pytest.approx(values[k], rel=1e-9)
    assert not weights[0].any()
    np.testing.assert_allclose(weights[1:].sum(axis=1), 1.0, atol=1e-9)


def test_after_a_leap_of_the_parameter_only_the_last_sample_is_trusted():
    weights = draws.foretelling(np.array([0.0, 1.0, 2.0, 3.0, 9.0, 10.0]))
    np.testing.assert_array_equal(weights[4], [1.0, 0.0, 0.0, 0.0])
    np.testing.assert_array_equal(draws.foretelling(np.array([0.0, 1.0])), [[0, 0, 0, 0], [1, 0, 0, 0]])


def test_shapes_that_do_not_fit_are_refused():
    course = Course.of(swayed(1, 0.7, every=30))
    chain = Chain(np.zeros((7, 4, 4)), np.zeros(6, np.uint8))
    with pytest.raises(ValueError, match="expected"):
        draws.draw(chain, 1.0, course.weights, (), course.joints[:, :5], course.jacobians, course.sigma, None, None, None, None)
