"""What an audit rests on, written down."""

import numpy as np
import pytest
from example_arms import SWAY_TIME, path_of_motion, swaying

from pathaudit import given


@pytest.fixture(scope="module")
def job():
    cell, joints = swaying(2)[:2]
    return path_of_motion(cell, SWAY_TIME, joints), cell


def test_every_number_of_the_cell_is_there_with_its_unit(job):
    cell = job[1]
    values = given.cell_values(cell)
    assert list(values["joints"]) == list(cell.arm.joint_names)
    flat = given.flat(values)
    for j, name in enumerate(cell.arm.joint_names):
        assert flat[f"joints.{name}.speed_deg_s"] == pytest.approx(np.degrees(cell.arm.speed[j]))
        assert flat[f"joints.{name}.travel_deg"] == pytest.approx(np.degrees([cell.arm.lower[j], cell.arm.upper[j]]))
    assert flat["tool.xyz_mm"] == pytest.approx(1e3 * cell.tool[:3, 3])
    assert flat["thresholds.sigma_min_warn"] == cell.thresholds.sigma_min_warn
    assert all(value is None or isinstance(value, (str, float, int, list)) for value in flat.values())


def test_the_shape_lies_on_the_path_and_has_its_ends(job):
    path = job[0]
    shape = np.array(given.path_shape(path))
    assert len(shape) == min(given.SHAPE_POINTS, path.samples)
    np.testing.assert_allclose(shape[[0, -1]], 1e3 * path.position[[0, -1]], atol=1e-4)
    steps = np.linalg.norm(np.diff(shape, axis=0), axis=1)
    assert steps.max() < 1.001 * 1e3 * path.length / (len(shape) - 1)


def test_a_path_that_rests_is_one_place(job):
    from dataclasses import replace

    path = replace(job[0], position=np.tile(job[0].position[:1], (job[0].samples, 1)))
    assert given.path_shape(path) == [pytest.approx(1e3 * path.position[0], abs=1e-4)]
