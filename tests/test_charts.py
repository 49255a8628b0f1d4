"""Charts: the right numbers in the right units, gaps kept, plain refusals."""

from pathlib import Path
from types import SimpleNamespace

import numpy as np
import pytest

import pathaudit as pa
from pathaudit import charts

DEMO = Path(pa.__file__).parent / "demo"


@pytest.fixture(scope="module")
def audit():
    return pa.audit(pa.read_path(DEMO / "seam.csv"), pa.read_cell(DEMO / "cell.toml"))


def test_a_joint_over_time_with_its_limits(audit):
    figure = charts.joint_over_time(audit, "j4")
    position, speed = figure.data
    np.testing.assert_allclose(position.y, np.degrees(audit.joints[:, 3]))
    np.testing.assert_allclose(speed.y, np.degrees(audit.rates.joint_speed[:, 3]))
    arm = audit.cell.arm
    assert sorted(shape.y0 for shape in figure.layout.shapes) == pytest.approx(sorted(np.degrees([arm.lower[3], arm.upper[3], -arm.speed[3], arm.speed[3]])))
    assert figure.layout.yaxis.title.text == "position, deg" and figure.layout.yaxis2.title.text == "speed, deg/s"
    assert figure.layout.xaxis2.title.text == "time, s" and "deg/s" in speed.hovertemplate
    assert charts.joint_over_time(audit, 3) == figure


@pytest.mark.parametrize("joint", ["j9", 6, -1])
def test_an_unknown_joint_is_refused(audit, joint):
    with pytest.raises(ValueError, match="expected one of j1, j2"):
        charts.joint_over_time(audit, joint)


def test_a_gap_stays_a_gap_and_a_sliding_joint_is_in_mm():
    rows = [{"name": "rail", "type": "prismatic", "a_mm": 0, "alpha_deg": 0, "d_mm": 0, "theta_deg": 0, "lower_mm": -500, "upper_mm": 500, "speed_mm_s": 300}]
    arm = pa.Arm.from_dh(rows)
    joints = np.array([[0.1], [np.nan], [0.2]])
    audit = SimpleNamespace(cell=SimpleNamespace(arm=arm), joints=joints, time=np.arange(3.0), rates=SimpleNamespace(joint_speed=joints / 2))
    position, speed = charts.joint_over_time(audit, "rail").data
    np.testing.assert_allclose(position.y, [100, np.nan, 200])
    np.testing.assert_allclose(speed.y, [50, np.nan, 100])
    assert position.connectgaps is False and "mm/s" in speed.hovertemplate
