"""A cell whose dimensions are off: its chain, against poses composed by hand."""

import numpy as np
import pytest
from example_arms import path_of_motion, swaying
from scipy.spatial.transform import Rotation

import pathaudit as pa
from pathaudit.kernels import linkage, rotations
from pathaudit.spread.placing import cell_off, frames, path_off
from pathaudit.tolerances import Tolerances

STATED = {key: 1.0 for key in ("part_xyz_mm", "part_rpy_deg", "tool_xyz_mm", "tool_rpy_deg", "base_xyz_mm", "base_rpy_deg", "link_mm", "speed_percent")}


@pytest.fixture(scope="module")
def cell():
    bench, _ = swaying(5)
    turned = rotations.pose(rotations.matrix_from_rpy_deg([10.0, -20.0, 30.0]), [0.4, -0.2, 0.3])
    return pa.Cell("bench", bench.arm, turned, turned @ turned, rotations.inverse_pose(turned), start=bench.start)


def off(cell, **values):
    """The cell off by values of dimensions given by name, and the dimensions and values"""
    every = Tolerances.of(cell.arm, joint_zero_deg=1.0, **STATED).dimensions
    names = {d.name: d for d in every}
    dimensions = tuple(names[name.replace("_", " ")] for name in values)
    return cell_off(cell, dimensions, list(values.values())), dimensions, list(values.values())


def test_part_and_base_turn_about_their_own_origin_and_the_axes_of_the_world(cell):
    turn = Rotation.from_euler("xyz", [1.0, 2.0, -3.0], degrees=True).as_matrix()
    for frame, field in (("part", "part"), ("base", "placement"), ("tool", "tool")):
        there = getattr(off(cell, **{f"{frame}_rx": 1.0, f"{frame}_ry": 2.0, f"{frame}_rz": -3.0, f"{frame}_y": 5.0})[0], field)
        now = getattr(cell, field)
        np.testing.assert_allclose(there[:3, :3], turn @ now[:3, :3], atol=1e-15)
        np.testing.assert_allclose(there[:3, 3] - now[:3, 3], [0.0, 0.005, 0.0], atol=1e-15)


def test_a_joint_whose_zero_is_off_stands_further_than_it_reads(cell):
    q = np.array([[0.1, -0.3, 0.7, 0.2, 0.5, -0.4]])
    there = off(cell, **{"zero_of_j3": 2.0})[0]
    moved = q + np.radians(2.0) * (np.arange(6) == 2)
    np.testing.assert_allclose(linkage.poses(*there.chain, q), linkage.poses(*cell.chain, moved), atol=1e-14)
    np.testing.assert_array_equal(there.arm.lower, cell.arm.lower)


def test_a_longer_link_is_longer_and_the_characteristic_length_stays(cell):
    there = off(cell, **{"length_from_j2_to_j3": 3.0})[0]
    lengths = [np.linalg.norm(c.arm.chain.links[:, :3, 3], axis=1) for c in (cell, there)]
    np.testing.assert_allclose(lengths[1] - lengths[0], [0, 0, 0.003, 0, 0, 0, 0], atol=1e-15)
    assert there.characteristic_length == pytest.approx(cell.characteristic_length, rel=1e-15) != there.arm.reach / 2


def test_a_slide_whose_zero_is_off_stands_further_out():
    row = {"type": "prismatic", "lower_mm": 0, "upper_mm": 900, "speed_mm_s": 100, "alpha_deg": 40.0, "a_mm": 20.0}
    arm = pa.Arm.from_dh([row, {"a_mm": 300, "lower_deg": -90, "upper_deg": 90, "speed_deg_s": 90}])
    cell = pa.Cell("bench", arm, np.eye(4), np.eye(4), np.eye(4))
    there = cell_off(cell, Tolerances.of(arm, joint_zero_mm=1.0).dimensions, [4.0])
    np.testing.assert_allclose(linkage.poses(*there.chain, np.array([[0.2, 0.3]])), linkage.poses(*cell.chain, np.array([[0.204, 0.3]])), atol=1e-15)


def test_many_draws_at_once_are_the_cells_of_each(cell):
    dimensions = Tolerances.of(cell.arm, joint_zero_deg=1.0, **STATED).dimensions
    values = np.random.default_rng(2).uniform(-1.0, 1.0, (7, len(dimensions)))
    many = frames(cell, dimensions, values)
    for k in range(7):
        one = cell_off(cell, dimensions, values[k])
        np.testing.assert_allclose(many.chains[k], one.chain.links, atol=1e-14)
        np.testing.assert_array_equal(many.chains[k], frames(cell, dimensions, values[k]).chains[0])
    np.testing.assert_allclose(many.speed, 1.0 + values[:, -1] / 100.0)


def test_nothing_off_is_the_cell_bit_for_bit(cell):
    dimensions = Tolerances.of(cell.arm, joint_zero_deg=1.0, **STATED).dimensions
    np.testing.assert_array_equal(frames(cell, dimensions, np.zeros(len(dimensions))).chains[0], cell.chain.links)


def test_a_path_run_faster_takes_less_time():
    cell, joints = swaying(1)
    path = path_of_motion(cell, np.linspace(5.0, 8.0, 301), joints)
    speed = Tolerances.of(cell.arm, speed_percent=9.0).dimensions
    quick = path_off(path, speed, [25.0])
    assert quick.time[0] == 5.0 and quick.duration == pytest.approx(path.duration / 1.25)
    assert path_off(path, speed, [0.0]) is path
