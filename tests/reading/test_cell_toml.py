"""Cells from TOML: every key, the limits laid over the arm's, every refusal by its key, damaged files."""

import hashlib
import random
import tomllib

import numpy as np
import pytest
from damage import damaged

import pathaudit as pa
from pathaudit.reading import cell_toml

pytestmark = pytest.mark.filterwarnings("error")

DEG = np.pi / 180

URDF = """<robot name="r"><link name="base"/><link name="l1"/><link name="l2"/><link name="torch"/><link name="camera"/>
<joint name="a" type="revolute"><parent link="base"/><child link="l1"/><axis xyz="0 0 1"/><limit lower="-1" upper="2" velocity="3" effort="4"/></joint>
<joint name="b" type="revolute"><parent link="l1"/><child link="l2"/><origin xyz="0.5 0 0"/><limit lower="-1" upper="2" velocity="3" effort="4"/></joint>
<joint name="f" type="fixed"><parent link="l2"/><child link="torch"/><origin xyz="0.1 0 0"/></joint>
<joint name="g" type="fixed"><parent link="l2"/><child link="camera"/></joint></robot>"""

PLAIN = """
name = "weld cell"
[arm]
urdf = "robots/arm.urdf"
base = "base"
tip = "torch"
placement = { xyz_mm = [1000, 0, 250.5], rpy_deg = [0, 0, 90] }
start_deg = [10, -20]
[tool]
xyz_mm = [0, 0, 350]
rpy_deg = [0, 45, 0]
[part]
xyz_mm = [1500, 200, 0]
"""

ROWS = """
[arm]
dh = "modified"
start_deg = [300, 45]
[[arm.joint]]
name = "slide"
type = "prismatic"
lower_mm = 0
upper_mm = 1200
speed_mm_s = 500
[[arm.joint]]
name = "turn"
alpha_deg = 90
a_mm = 120
lower_deg = -180
upper_deg = 180
speed_deg_s = 90
"""


@pytest.fixture
def read(tmp_path):
    (tmp_path / "robots").mkdir()
    (tmp_path / "robots" / "arm.urdf").write_text(URDF)

    def read(text):
        file = tmp_path / "cell.toml"
        file.write_bytes(text if isinstance(text, bytes) else text.encode("utf-8"))
        return pa.read_cell(file)

    return read


@pytest.fixture
def refused(read, tmp_path):
    def refused(text):
        with pytest.raises(pa.ReadError) as caught:
            read(text)
        message = str(caught.value)
        assert "\n" not in message and message.startswith(str(tmp_path))
        return message.removeprefix(f"{tmp_path / 'cell.toml'}: ")

    return refused


def test_a_whole_cell(read, tmp_path):
    cell = read(PLAIN)
    assert cell.name == "weld cell" and cell.arm.joint_names == ("a", "b")
    assert cell.placement.tolist() == [[0, -1, 0, 1.0], [1, 0, 0, 0], [0, 0, 1, 0.2505], [0, 0, 0, 1]]
    s = np.sqrt(0.5)
    np.testing.assert_allclose(cell.tool, [[s, 0, s, 0], [0, 1, 0, 0], [-s, 0, s, 0.35], [0, 0, 0, 1]], atol=1e-16)
    assert cell.part[:3, 3].tolist() == [1.5, 0.2, 0.0] and (cell.part[:3, :3] == np.eye(3)).all()
    np.testing.assert_allclose(cell.start, [10 * DEG, -20 * DEG])
    assert cell.thresholds == pa.Thresholds()
    assert cell.file == str(tmp_path / "cell.toml") and cell.sha256 == hashlib.sha256(PLAIN.encode()).hexdigest()
    assert cell.sources == ((cell.file, cell.sha256), (str(tmp_path / "robots/arm.urdf"), hashlib.sha256(URDF.encode()).hexdigest()))


def test_what_may_be_left_out(read):
    cell = read('[arm]\nurdf = "robots/arm.urdf"\ntip = "camera"\n')
    assert cell.name == "cell" and cell.start is None
    for pose in (cell.placement, cell.tool, cell.part):
        assert (pose == np.eye(4)).all()


def test_rpy_turns_about_the_fixed_axes_x_then_y_then_z(read):
    tool = read(PLAIN.replace("[0, 45, 0]", "[90, 0, 90]")).tool
    assert tool[:3, :3].tolist() == [[0, 0, 1], [1, 0, 0], [0, 1, 0]]


def test_joint_rows(read, tmp_path):
    cell = read(ROWS)
    assert cell.arm.joint_names == ("slide", "turn") and cell.arm.prismatic.tolist() == [True, False]
    np.testing.assert_allclose(cell.start, [0.3, 45 * DEG])
    np.testing.assert_allclose(cell.arm.upper, [1.2, np.pi])
    assert cell.sources == ((str(tmp_path / "cell.toml"), cell.sha256),)
    rows = tomllib.loads(ROWS)["arm"]["joint"]
    np.testing.assert_array_equal(cell.arm.chain.links, pa.Arm.from_dh(rows, "modified").chain.links)


def test_limits_lie_over_the_arm_s_own(read):
    arm = read(PLAIN + "[limits]\nspeed_deg_s = { b = 90 }\nacceleration_deg_s2 = 800\ntravel_deg = { a = [-360, 360], b = [-inf, inf] }").arm
    np.testing.assert_allclose(arm.speed, [3, 90 * DEG])
    np.testing.assert_allclose(arm.acceleration, [800 * DEG, 800 * DEG])
    np.testing.assert_allclose(arm.lower, [-360 * DEG, -np.inf])
    np.testing.assert_allclose(arm.upper, [360 * DEG, np.inf])
    np.testing.assert_allclose(arm.effort, [4, 4])


def test_one_number_holds_for_all_joints_of_its_unit(read):
    arm = read(ROWS + "[limits]\nspeed_mm_s = 100\nspeed_deg_s = 10\nacceleration_mm_s2 = { slide = 1000 }\ntravel_mm = [-5, 5]\ntravel_deg = [-10, 20]").arm
    np.testing.assert_allclose(arm.speed, [0.1, 10 * DEG])
    np.testing.assert_allclose(arm.acceleration, [1.0, np.nan])
    np.testing.assert_allclose(arm.lower, [-0.005, -10 * DEG])
    np.testing.assert_allclose(arm.upper, [0.005, 20 * DEG])


def test_limits_that_only_the_cell_states(read):
    rows = ROWS.replace("speed_deg_s = 90\n", "").replace("lower_deg = -180\n", "").replace("upper_deg = 180\n", "")
    arm = read(rows + "[limits]\nspeed_deg_s = 45\ntravel_deg = { turn = [-90, 90] }").arm
    np.testing.assert_allclose([arm.speed[1], arm.lower[1], arm.upper[1]], [45 * DEG, -90 * DEG, 90 * DEG])


def test_thresholds(read):
    cell = read(PLAIN + "[thresholds]\nsigma_min_warn = 0.1\ntool_speed_mm_s = 20\ncharacteristic_length_mm = 400")
    assert cell.thresholds == pa.Thresholds(sigma_min_warn=0.1, tool_speed_mm_s=20, characteristic_length_mm=400)
    assert cell.characteristic_length == 0.4


@pytest.mark.parametrize("change", [lambda t: t.replace("\n", "\r\n"), lambda t: "\ufeff" + t, lambda t: "# a comment\n" + t])
def test_every_form_of_the_text(read, change):
    assert read(change(PLAIN)).name == "weld cell"


UNKNOWN_KEYS = [
    (PLAIN + "[limit]\nspeed_deg_s = 3", "limit", "limits"),
    ("nam = 'x'\n" + PLAIN, "nam", "name"),
    (PLAIN.replace("urdf =", "udrf ="), "arm.udrf", "urdf"),
    (PLAIN.replace("start_deg", "start"), "arm.start", "start_deg"),
    (PLAIN.replace("{ xyz_mm", "{ xyz"), "arm.placement.xyz", "xyz_mm"),
    (PLAIN.replace("[tool]", "[tool]\nrpy_rad = [0, 0, 0]"), "tool.rpy_rad", "rpy_deg"),
    (PLAIN.replace("[part]", "[part]\nXYZ_MM = [0, 0, 0]"), "part.XYZ_MM", "xyz_mm"),
    (PLAIN + "[limits]\nspeed = 3", "limits.speed", "speed_mm_s"),
    (PLAIN + "[limits]\nspeeds_deg = 3", "limits.speeds_deg", "speed_deg_s"),
    (PLAIN + "[thresholds]\nsigma_warn = 3", "thresholds.sigma_warn", "sigma_min_warn"),
    (ROWS.replace("a_mm", "a_m"), "arm.joint row 2.a_m", "a_mm"),
]


@pytest.mark.parametrize("text, key, nearest", UNKNOWN_KEYS)
def test_unknown_keys_name_the_nearest_known_one(refused, text, key, nearest):
    assert refused(text) == f"{key}: found an unknown key, expected a known one (the nearest is {nearest})"


@pytest.mark.parametrize(
    "text, words",
    [
        (b"", "found an empty file, expected a cell as TOML text"),
        ("# nothing\n", "arm: found nothing, expected a table [arm]"),
        ("name = ", "end of document: found text that is not TOML (Invalid value), expected a cell as TOML text"),
        (PLAIN + "[arm]", "line 14, column 5: found text that is not TOML (Cannot declare ('arm',) twice)"),
        (PLAIN + "x = [" + "[" * 50_000, "found text that is not TOML (RecursionError)"),
        (PLAIN.replace('"weld cell"', "5"), "name: found 5, expected a text"),
        (PLAIN.replace('"weld cell"', '" "'), "name: found '', expected a text that is not empty"),
        (PLAIN.replace('"weld cell"', '""'), "name: found '', expected a text"),
        ("arm = 5", "arm: found 5, expected a table with the keys urdf, base"),
        ("tool = [1, 2]\n" + PLAIN.replace("[tool]", "[limits]"), "limits.xyz_mm: found an unknown key"),
        ("tool = [1, 2]\n[arm]\nurdf = 'robots/arm.urdf'\ntip = 'torch'", "tool: found a list of 2, expected a table with the keys xyz_mm, rpy_deg"),
        (PLAIN.replace("[0, 0, 350]", "[0, 0]"), "tool.xyz_mm: found a list of 2, expected 3 numbers in brackets"),
        (PLAIN.replace("[0, 0, 350]", "350"), "tool.xyz_mm: found 350, expected 3 numbers"),
        (PLAIN.replace("[0, 0, 350]", '[0, 0, "350"]'), "tool.xyz_mm: found '350', expected a number"),
        (PLAIN.replace("[0, 0, 350]", "[0, 0, true]"), "tool.xyz_mm: found true, expected a number"),
        (PLAIN.replace("[0, 0, 350]", "[0, 0, inf]"), "tool.xyz_mm: found inf, expected a number"),
        (PLAIN.replace("[0, 0, 350]", "[0, 0, nan]"), "tool.xyz_mm: found nan, expected a number"),
        (PLAIN.replace("[0, 0, 350]", f"[0, 0, 1{'0' * 400}]"), "tool.xyz_mm: found 1000"),
        (PLAIN.replace("[0, 0, 350]", "[0, 0, 1979-05-27]"), "tool.xyz_mm: found 1979-05-27, expected a number"),
        (PLAIN.replace("[0, 0, 350]", "[0, 0, [1]]"), "tool.xyz_mm: found a list of 1, expected a number"),
        (PLAIN.replace("[10, -20]", "[10]"), "arm.start_deg: found a list of 1, expected 2 numbers, one a joint"),
        (PLAIN.replace("[10, -20]", "[10, '-20']"), "arm.start_deg: found '-20', expected a number"),
        (PLAIN.replace('urdf = "robots/arm.urdf"', ""), "arm: found neither urdf nor joint rows"),
        (PLAIN.replace("[tool]", "[[arm.joint]]\n[tool]"), "arm: found both urdf and joint rows"),
        (PLAIN.replace("start_deg", "dh = 'standard'\nstart_deg"), "arm.dh: found dh beside urdf"),
        (PLAIN.replace('"torch"', '"hand"'), "/robots/arm.urdf: tip: found 'hand', which is no link"),
        (PLAIN.replace('tip = "torch"', ""), "/robots/arm.urdf: tip: found 2 possible tips, expected tip to name one of torch, camera"),
        (PLAIN.replace('"torch"', "3"), "arm.tip: found 3, expected a text"),
        (PLAIN.replace("robots/arm.urdf", "robots/none.urdf"), "/robots/none.urdf: found no such file, expected an arm as URDF, named by arm.urdf in "),
        (PLAIN.replace("robots/arm.urdf", "robots"), "/robots: found a folder"),
        (PLAIN.replace("robots/arm.urdf", r"robots\u0000"), "found a name that no file can have"),
        (ROWS.replace('dh = "modified"', ""), "arm.dh: found nothing, expected dh ="),
        (ROWS.replace('dh = "modified"', "dh = 'classic'"), "arm: dh: found 'classic', expected 'standard' or 'modified'"),
        (ROWS.replace("[arm]", "[arm]\nbase = 'b'"), "arm.base: found base beside joint rows"),
        ("[arm]\ndh = 'standard'\njoint = 3", "arm.joint: found 3, expected [[arm.joint]] rows"),
        ("[arm]\ndh = 'standard'\njoint = [3]", "arm.joint row 1: found 3, expected a table"),
        ("[arm]\ndh = 'standard'\njoint = []", "arm: joints: found 0, expected 1 to 12"),
        (ROWS.replace('"slide"', "4"), "arm.joint row 1.name: found 4, expected a text"),
        (ROWS.replace('"slide"', '"turn"'), "arm: joints: found 'turn' twice"),
        (ROWS.replace("a_mm = 120", "a_mm = '120'"), "arm: joint turn, a_mm: found '120', expected a finite number"),
        (ROWS.replace('"prismatic"', '"screw"'), "arm: joint slide, type: found 'screw'"),
        (ROWS.replace("speed_deg_s = 90", ""), "joint turn: found no speed limit, expected a limit from the arm, or speed_deg_s under [limits]"),
        (ROWS.replace("upper_mm = 1200", ""), "joint slide: found no travel limits, expected limits from the arm, or travel_mm under [limits]"),
        (ROWS.replace("speed_deg_s = 90", "speed_mm_s = 90"), "arm: joint turn: found the key 'speed_mm_s', expected for this type one of"),
        (PLAIN + "[limits]\nspeed_deg_s = 0", "limits.speed_deg_s: found 0, expected a limit above 0"),
        (PLAIN + "[limits]\nspeed_deg_s = { a = -1 }", "limits.speed_deg_s.a: found -1, expected a limit above 0"),
        (PLAIN + "[limits]\nspeed_deg_s = { A1 = 1 }", "limits.speed_deg_s.A1: found an unknown joint, expected one of the arm's, the nearest is a"),
        (PLAIN + "[limits]\nspeed_deg_s = [1, 2]", "limits.speed_deg_s: found a list of 2, expected a number"),
        (PLAIN + "[limits]\nspeed_mm_s = 100", "limits.speed_mm_s: found a limit in this unit, expected no such key: the arm has no prismatic joint"),
        (PLAIN + "[limits]\nacceleration_deg_s2 = inf", "limits.acceleration_deg_s2: found inf, expected a number"),
        (PLAIN + "[limits]\ntravel_deg = { a = [10, 10] }", "limits.travel_deg.a: found [10, 10], expected a lower limit below the upper one"),
        (PLAIN + "[limits]\ntravel_deg = { a = 90 }", "limits.travel_deg.a: found 90, expected [lower, upper]"),
        (PLAIN + "[limits]\ntravel_deg = { a = [nan, 90] }", "limits.travel_deg.a: found nan, expected a number"),
        (ROWS + "[limits]\ntravel_mm = [0, inf]", "limits.travel_mm: found inf, expected a number"),
        (ROWS + "[limits]\nspeed_deg_s = { slide = 5 }", "limits.speed_deg_s.slide: found a joint that is not turning"),
        ("limits = 3\n" + PLAIN, "limits: found 3, expected a table with the keys speed_deg_s"),
        (PLAIN + "[thresholds]\nsigma_min_warn = 'low'", "thresholds.sigma_min_warn: found 'low', expected a number"),
        (PLAIN + "[thresholds]\nsigma_min_warn = -1", "thresholds.sigma_min_warn: found -1, expected a number of 0 or more"),
        (PLAIN + "[thresholds]\nspeed_share_fail = 0.5", "thresholds.speed_share_warn: found 0.9, expected no more than speed_share_fail (0.5)"),
        (PLAIN.encode("utf-16"), "found UTF-16 text, expected a cell as TOML text saved as UTF-8"),
    ],
)
def test_refusals_name_the_key(refused, tmp_path, text, words):
    assert words in refused(text)


def test_every_threshold_and_limit_key_is_known():
    assert set(cell_toml.KEYS["thresholds"]) == set(pa.Thresholds.__dataclass_fields__)


def test_damaged_files_are_read_or_refused_in_one_line(read):
    rng, letters = random.Random(3), b"0123456789abe._-[]{}='\"\n, "
    pieces = [b"\xff", b"\0", b"nan", b"inf", b"-", b"[[", b"true", b"'", b"1e999", b"{}", b"[]", b"\n[arm]\n"]
    whole = PLAIN + "[limits]\nspeed_deg_s = { b = 90 }\ntravel_deg = { a = [-360, 360] }\n[thresholds]\nsigma_min_warn = 0.1\n"
    for text in (whole, ROWS):
        for _ in range(700):
            try:
                cell = read(damaged(text, rng, letters, pieces))
            except pa.PathAuditError as error:
                assert len(str(error).splitlines()) == 1
            else:
                assert np.isfinite(cell.chain.links).all() and (cell.arm.speed > 0).all()
