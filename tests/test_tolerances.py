"""What may be stated under [tolerance], and what is refused."""

import numpy as np
import pytest
from example_arms import planar, swaying

import pathaudit as pa
from pathaudit.errors import ModelError
from pathaudit.tolerances import KEYS, Dimension, Tolerances

ARM = swaying(1)[0].arm
CELL = """
[arm]
dh = "standard"
[[arm.joint]]
name = "rail"
type = "prismatic"
alpha_deg = 90
lower_mm = 0
upper_mm = 1000
speed_mm_s = 500
[[arm.joint]]
name = "turn"
a_mm = 300
lower_deg = -90
upper_deg = 90
speed_deg_s = 100
"""


def stated(**keys):
    return {d.name: (d.unit, d.size, d.normal) for d in Tolerances.of(ARM, **keys).dimensions}


def test_nothing_stated_nothing_varies():
    assert Tolerances().dimensions == Tolerances.of(ARM).dimensions == () == Tolerances.of(ARM, part_xyz_mm=0.0).dimensions


def test_a_number_stands_for_all_axes_and_joints_and_zeros_do_not_vary():
    assert stated(part_xyz_mm=1.5, tool_rpy_deg=[0, 0, 0.2]) == {
        "part x": ("mm", 1.5, False), "part y": ("mm", 1.5, False), "part z": ("mm", 1.5, False), "tool rz": ("deg", 0.2, False),
    }  # fmt: skip
    assert list(stated(joint_zero_deg=0.1)) == [f"zero of j{k}" for k in range(1, 7)]
    assert stated(joint_zero_deg={"j4": 0.3}) == {"zero of j4": ("deg", 0.3, False)}
    assert stated(speed_percent=5) == {"programmed speed": ("%", 5.0, False)}


def test_a_standard_deviation_is_stated_by_its_name():
    assert stated(base_xyz_mm={"sigma": [0.0, 0.0, 2.0]}, joint_zero_deg={"sigma": {"j1": 0.01}}) == {
        "base z": ("mm", 2.0, True), "zero of j1": ("deg", 0.01, True),
    }  # fmt: skip
    assert Dimension("speed_percent", 0, "programmed speed", "%", 3.0).deviation == pytest.approx(np.sqrt(3.0))
    assert Dimension("speed_percent", 0, "programmed speed", "%", 3.0, True).deviation == 3.0


def test_only_links_with_a_length_have_one_that_varies():
    lengths = np.linalg.norm(ARM.chain.links[1:, :3, 3], axis=1)
    assert [d.index for d in Tolerances.of(ARM, link_mm=0.5).dimensions] == list(np.flatnonzero(lengths > 1e-3))
    assert [d.name for d in Tolerances.of(planar(0.5, 0.4), link_mm=1).dimensions] == ["length from j1 to j2", "length from j2 to the flange"]


@pytest.mark.parametrize(
    "keys, field, expected",
    [
        ({"part_xyz": 1}, "'part_xyz'", "part_xyz_mm"),
        ({"part_xyz_mm": -1}, "part_xyz_mm", "from 0 to 1000 mm"),
        ({"part_xyz_mm": [1, 2]}, "part_xyz_mm", "three in brackets"),
        ({"part_xyz_mm": float("nan")}, "part_xyz_mm", "from 0"),
        ({"part_rpy_deg": True}, "part_rpy_deg", "a tolerance from 0"),
        ({"part_rpy_deg": {"sigma": 6}}, "part_rpy_deg", "a standard deviation from 0 to 5 deg"),
        ({"part_rpy_deg": {"x": 6}}, "part_rpy_deg", "a tolerance"),
        ({"joint_zero_deg": {"j9": 1}}, "joint_zero_deg.j9", "j1, j2"),
        ({"joint_zero_deg": {"j2": "much"}}, "joint_zero_deg.j2", "a tolerance"),
        ({"joint_zero_mm": 1}, "joint_zero_mm", "slides"),
        ({"joint_zero_mm": {"j1": 1}}, "joint_zero_mm.j1", "slides"),
        ({"link_mm": {"j5": 1}}, "link_mm.j5", "a length"),
        ({"speed_percent": [1, 2, 3]}, "speed_percent", "from 0 to 50 %"),
    ],
)
def test_what_cannot_be_used_is_told_by_its_key(keys, field, expected):
    with pytest.raises(ModelError) as error:
        Tolerances.of(ARM, **keys)
    assert error.value.field == field and expected in error.value.reason


def test_a_cell_refuses_tolerances_of_joints_that_its_arm_does_not_have():
    arm = planar(0.5, 0.4)
    with pytest.raises(ModelError, match="zero of j6"):
        pa.Cell("bench", arm, np.eye(4), np.eye(4), np.eye(4), tolerances=Tolerances.of(ARM, joint_zero_deg={"j6": 1}))


def read(tmp_path, text):
    file = tmp_path / "cell.toml"
    file.write_text(CELL + text, "utf-8")
    return pa.read_cell(file)


def test_a_cell_states_them_in_its_file(tmp_path):
    cell = read(tmp_path, "[tolerance]\npart_xyz_mm = [1, 1, 0.5]\njoint_zero_mm = 0.2\njoint_zero_deg = { sigma = { turn = 0.05 } }\nlink_mm = 0.3\n")
    assert [f"{d.name} {d.words}" for d in cell.tolerances.dimensions] == [
        "part x +-1 mm", "part y +-1 mm", "part z +-0.5 mm", "zero of turn sigma 0.05 deg", "zero of rail +-0.2 mm", "length from turn to the flange +-0.3 mm",
    ]  # fmt: skip
    assert read(tmp_path, "").tolerances == Tolerances()


@pytest.mark.parametrize(
    "text, message",
    [
        ("part_xyz = 1", r"tolerance.part_xyz: found an unknown key, expected a known one \(the nearest is part_xyz_mm\)"),
        ("part_xyz_mm = [1, 1]", "tolerance.part_xyz_mm"),
        ("joint_zero_deg = { rail = 1 }", "tolerance.joint_zero_deg.rail: found a joint that this key does not fit, expected a joint that turns"),
        ("speed_percent = -3", "tolerance.speed_percent: found -3, expected a tolerance from 0 to 50 %"),
    ],
)
def test_errors_name_file_and_key(tmp_path, text, message):
    with pytest.raises(pa.ReadError, match=message):
        read(tmp_path, f"[tolerance]\n{text}\n")


def test_every_key_can_be_stated_for_some_arm(tmp_path):
    every = {key: ({"turn": 1} if key == "joint_zero_deg" else 1) for key in KEYS}
    arm = read(tmp_path, "").arm
    assert {d.key for d in Tolerances.of(arm, **every).dimensions} == set(KEYS)
