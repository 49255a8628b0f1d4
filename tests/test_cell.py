"""The cell as a value: the chain from part to tool, thresholds, what is refused."""

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

import pathaudit as pa
from pathaudit.kernels import linkage, rotations

pytestmark = pytest.mark.filterwarnings("error")

LIMITS = {"lower_deg": -170, "upper_deg": 170, "speed_deg_s": 180}
ARM = pa.Arm.from_dh([{"d_mm": 300, "alpha_deg": 90, **LIMITS}, {"a_mm": 500, **LIMITS}, {"a_mm": 400, **LIMITS}])


def some_pose(seed):
    rng = np.random.default_rng(seed)
    return rotations.pose(Rotation.random(rng=rng).as_matrix(), rng.normal(size=3))


def cell(**changes):
    return pa.Cell(**{"name": "c", "arm": ARM, "placement": np.eye(4), "tool": np.eye(4), "part": np.eye(4), **changes})


def test_the_chain_leads_from_the_part_to_the_tool():
    c = cell(placement=some_pose(1), tool=some_pose(2), part=some_pose(3))
    q = np.random.default_rng(4).uniform(-2, 2, (5, 3))
    expected = np.linalg.inv(c.part) @ c.placement @ ARM.flange_pose(q) @ c.tool
    found = linkage.poses(c.chain.links.copy(), c.chain.prismatic.copy(), q)
    np.testing.assert_allclose(found, expected, atol=1e-14)


def test_moving_the_whole_cell_changes_nothing():
    world = some_pose(9)
    one = cell(placement=some_pose(1), part=some_pose(3))
    other = cell(placement=world @ some_pose(1), part=world @ some_pose(3))
    np.testing.assert_allclose(one.chain.links, other.chain.links, atol=1e-14)


def test_characteristic_length():
    assert cell().characteristic_length == ARM.reach / 2
    assert cell(thresholds=pa.Thresholds(characteristic_length_mm=250)).characteristic_length == 0.25


def test_a_cell_is_a_value():
    placement = np.eye(4)
    c = cell(placement=placement, start=[0, 1, 0])
    placement[0, 3] = 5
    assert c.placement[0, 3] == 0
    for array in (c.placement, c.tool, c.part, c.start, *c.chain):
        with pytest.raises(ValueError):
            array[0] = 0
    assert c.chain is c.chain


@pytest.mark.parametrize(
    "changes, words",
    [
        ({"start": [0, 0]}, ["start", "2 numbers", "3 finite numbers"]),
        ({"start": [0, 0, np.nan]}, ["start", "3 finite numbers"]),
        ({"tool": np.eye(3)}, ["tool", "(4, 4)"]),
        ({"tool": np.diag([1, 1, 2, 1])}, ["tool", "rigid"]),
        ({"part": np.diag([1, 1, -1, 1])}, ["part", "rigid"]),
        ({"placement": np.full((4, 4), np.nan)}, ["placement", "rigid"]),
        ({"placement": rotations.pose(np.eye(3), [0, 2e4, 0])}, ["placement", "20000 m away", "check the unit"]),
        ({"arm": pa.Arm.from_dh([{}])}, ["joint j1", "no travel limits", "travel_deg under [limits]"]),
        ({"arm": pa.Arm.from_dh([{"type": "prismatic"}])}, ["no travel limits", "travel_mm"]),
        ({"arm": pa.Arm.from_dh([{"lower_deg": -1, "upper_deg": 1}])}, ["no speed limit", "speed_deg_s under [limits]"]),
    ],
)
def test_cells_that_are_refused(changes, words):
    with pytest.raises(pa.ModelError) as caught:
        cell(**changes)
    for word in words:
        assert word in str(caught.value)


@pytest.mark.parametrize(
    "changes, words",
    [
        ({"sigma_min_warn": -0.1}, ["sigma_min_warn: found -0.1"]),
        ({"sigma_min_warn": 0.01}, ["sigma_min_fail: found 0.02", "no more than sigma_min_warn (0.01)"]),
        ({"speed_share_warn": 1.2}, ["speed_share_warn: found 1.2", "speed_share_fail (1)"]),
        ({"acceleration_share_fail": 0.5}, ["acceleration_share_warn: found 0.9"]),
        ({"travel_warn_deg": np.nan}, ["travel_warn_deg: found nan"]),
        ({"travel_warn_deg": "5"}, ["travel_warn_deg: found '5'"]),
        ({"travel_warn_deg": None}, ["travel_warn_deg: found None"]),
        ({"deviation_mm": True}, ["deviation_mm: found True"]),
        ({"tool_speed_mm_s": 0}, ["tool_speed_mm_s: found 0", "above 0"]),
        ({"characteristic_length_mm": np.inf}, ["characteristic_length_mm: found inf"]),
    ],
)
def test_thresholds_that_are_refused(changes, words):
    with pytest.raises(pa.ModelError) as caught:
        pa.Thresholds(**changes)
    for word in words:
        assert word in str(caught.value)


def test_thresholds_may_be_nought_and_optional_ones_absent():
    t = pa.Thresholds(travel_warn_deg=0, sigma_min_fail=0, tool_speed_mm_s=None)
    assert t.travel_warn_deg == 0 and t.tool_speed_mm_s is None
