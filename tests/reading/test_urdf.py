"""Arms from URDF: what the format says, and everything in it that cannot be judged, refused in plain words."""

import random

import numpy as np
import pytest
from damage import damaged
from open_arms import robot_file
from outside import agrees, inputs

import pathaudit as pa
from pathaudit.kernels import rotations as rot

pytestmark = pytest.mark.filterwarnings("error")

LIMIT = '<limit lower="-1" upper="2" velocity="3" effort="4"/>'


def link(*names):
    return "".join(f'<link name="{name}"/>' for name in names)


def joint(name, parent, child, inside=LIMIT, kind="revolute"):
    return f'<joint name="{name}" type="{kind}"><parent link="{parent}"/><child link="{child}"/>{inside}</joint>'


def robot(*parts):
    return f'<?xml version="1.0"?>\n<robot name="r">{"".join(parts)}</robot>'


TWO = robot(link("base", "l1", "l2"), joint("a", "base", "l1", LIMIT), joint("b", "l1", "l2", '<origin xyz="0.3 0 0"/>' + LIMIT))


@pytest.fixture
def read(tmp_path):
    def read(text, **ends):
        file = tmp_path / "arm.urdf"
        file.write_bytes(text if isinstance(text, bytes) else text.encode("utf-8"))
        return pa.Arm.from_urdf(file, **ends)

    return read


@pytest.fixture
def refused(read, tmp_path):
    def refused(text, **ends):
        with pytest.raises(pa.ReadError) as caught:
            read(text, **ends)
        message = str(caught.value)
        assert message.startswith(f"{tmp_path / 'arm.urdf'}: ") and "\n" not in message
        return message.removeprefix(f"{tmp_path / 'arm.urdf'}: ")

    return refused


def one_joint(inside, kind="revolute"):
    return robot(link("base", "l1"), joint("a", "base", "l1", inside, kind))


def test_a_chain_found_without_asking(read):
    arm = read(TWO)
    assert arm.name == "r" and arm.joint_names == ("a", "b")
    assert arm.lower.tolist() == [-1, -1] and arm.upper.tolist() == [2, 2] and arm.speed.tolist() == [3, 3] and arm.effort.tolist() == [4, 4]
    assert np.isnan(arm.acceleration).all()


def test_origin_angles_about_fixed_axes(read):
    rpy = " ".join(map(str, inputs("URD-001")["rpy"]))
    agrees("URD-001", read(one_joint(f'<origin rpy="{rpy}"/>{LIMIT}')).flange_pose([0.0])[:3, :3])


@pytest.mark.parametrize("text, axis", [("", [1, 0, 0]), ('<axis xyz="0 0 2"/>', [0, 0, 1]), ('<axis xyz="3 -4 0"/>', [0.6, -0.8, 0]), ('<axis xyz="0 0 -1"/>', [0, 0, -1])])
def test_the_axis_defaults_to_x_and_is_scaled_to_length_1(read, text, axis):
    arm = read(one_joint(text + LIMIT))
    np.testing.assert_allclose(arm.flange_pose([0.7])[:3, :3], rot.exp_vector(0.7 * np.array(axis)), atol=1e-15)
    slide = read(one_joint(text + LIMIT, "prismatic"))
    np.testing.assert_allclose(slide.flange_pose([0.7])[:3, 3], 0.7 * np.array(axis), atol=1e-15)
    assert slide.prismatic.tolist() == [True]


def test_a_continuous_joint_ignores_its_travel(read):
    arm = read(one_joint('<limit lower="0" upper="0" velocity="3" effort="4"/>', "continuous"))
    assert arm.lower.tolist() == [-np.inf] and arm.upper.tolist() == [np.inf] and arm.speed.tolist() == [3]
    silent = read(one_joint("", "continuous"))
    assert np.isnan(silent.speed).all() and np.isnan(silent.effort).all()


def test_one_of_lower_and_upper_defaults_to_0(read):
    arm = read(one_joint('<limit upper="2" velocity="3" effort="4"/>'))
    assert arm.lower.tolist() == [0] and arm.upper.tolist() == [2]


def test_an_effort_of_0_is_not_stated(read):
    assert np.isnan(read(one_joint('<limit lower="-1" upper="2" velocity="3" effort="0"/>')).effort).all()


def test_fixed_joints_belong_to_the_links_around_them(read):
    offset = '<origin xyz="0 0 0.1" rpy="0 0 1.5707963267948966"/>'
    parts = link("world", "base", "l1", "flange"), joint("f0", "world", "base", offset, "fixed"), joint("a", "base", "l1", LIMIT), joint("f1", "l1", "flange", offset, "fixed")
    arm = read(robot(*parts))
    assert arm.joint_names == ("a",)
    q = 0.4
    fixed = rot.pose(rot.matrix_from_rpy([0, 0, np.pi / 2]), [0, 0, 0.1])
    expected = fixed @ rot.pose(rot.exp_vector([q, 0, 0]), np.zeros(3)) @ fixed
    np.testing.assert_allclose(arm.flange_pose([q]), expected, atol=1e-15)
    np.testing.assert_allclose(read(robot(*parts), base="base").flange_pose([q]), np.linalg.inv(fixed) @ expected, atol=1e-15)


def test_a_branch_that_no_joint_moves_is_no_choice(read):
    assert read(TWO.replace("</robot>", link("marker") + joint("m", "base", "marker", "", "fixed") + "</robot>")).joint_names == ("a", "b")


def test_the_tip_must_be_named_where_several_are_possible(read, refused):
    text = TWO.replace("</robot>", link("torch", "camera") + joint("t", "l2", "torch", "", "fixed") + joint("c", "l2", "camera", "", "fixed") + "</robot>")
    assert refused(text) == "tip: found 2 possible tips, expected tip to name one of torch, camera"
    assert read(text, tip="camera").joint_names == ("a", "b")
    assert read(text, base="l1", tip="torch").joint_names == ("b",)


def test_parts_of_the_file_outside_the_chain_do_not_matter(read):
    hand = link("f1", "f2") + joint("g", "l2", "f1", LIMIT) + joint("h", "l2", "f2", LIMIT + '<mimic joint="g"/>', "prismatic")
    wheel = link("w") + joint("w", "base", "w", "", "floating")
    assert read(TWO.replace("</robot>", hand + wheel + "</robot>"), tip="f1").joint_names == ("a", "b", "g")


@pytest.mark.parametrize("robot_row, limits_row", [(f"ROB-00{k}", f"ROB-04{k}") for k in range(1, 8)])
def test_limits_of_open_robot_data(robot_row, limits_row):
    given = inputs(limits_row)
    arm = pa.Arm.from_urdf(robot_file(given["file"]), tip=given["tip"])
    endless = np.isinf(arm.lower)
    lower, upper = np.where(endless, 0.0, arm.lower), np.where(endless, 0.0, arm.upper)  # the row keeps what the file says of continuous joints
    agrees(limits_row, np.stack([lower, upper, arm.speed, arm.effort], axis=-1))


REFUSED_JOINTS = [
    ("", "found no <limit>, expected <limit lower upper velocity effort>"),
    ('<limit lower="-1" upper="1" effort="1"/>', "found <limit> without velocity"),
    ('<limit lower="-1" upper="1" velocity="1"/>', "found <limit> without effort"),
    ('<limit lower="-1" upper="1" velocity="0" effort="1"/>', "found <limit velocity> 0, expected a largest speed above 0"),
    ('<limit lower="-1" upper="1" velocity="-2" effort="1"/>', "found <limit velocity> -2"),
    ('<limit lower="-1" upper="1" velocity="1" effort="-1"/>', "found <limit effort> -1"),
    ('<limit lower="1" upper="-1" velocity="1" effort="1"/>', "found <limit> lower 1 above upper -1, expected lower below upper"),
    ('<limit velocity="1" effort="1"/>', "found <limit> lower and upper both 0, a locked joint, expected lower below upper (state lower and upper"),
    ('<limit lower="-pi" upper="1" velocity="1" effort="1"/>', "found <limit lower> '-pi', expected a finite number"),
    ('<limit lower="-1" upper="inf" velocity="1" effort="1"/>', "found <limit upper> 'inf', expected a finite number"),
    ('<limit lower="-1" upper="1_0" velocity="1" effort="1"/>', "found <limit upper> '1_0'"),
    ('<axis xyz="0 0 0"/>' + LIMIT, "found an axis of length 0, expected an axis with a direction"),
    ('<axis xyz="0 1"/>' + LIMIT, "found <axis xyz> with 2 numbers, expected 3 numbers"),
    ('<axis xyz="0 nan 1"/>' + LIMIT, "found <axis xyz> 'nan'"),
    ('<origin xyz="1,2,3"/>' + LIMIT, "found <origin xyz> with 1 numbers"),
    ('<origin rpy="0 0 ninety"/>' + LIMIT, "found <origin rpy> 'ninety'"),
    (LIMIT + '<mimic joint="other" multiplier="2"/>', "found a joint that mimics 'other' between base and tip"),
]


@pytest.mark.parametrize("inside, words", REFUSED_JOINTS)
def test_joints_that_are_refused(refused, inside, words):
    assert refused(one_joint(inside)).startswith(f"joint 'a': {words}")


@pytest.mark.parametrize("kind, words", [("floating", "found a floating joint between base and tip"), ("planar", "found a planar joint"), ("screw", "found the type 'screw'"), ("", "found the type ''")])
def test_joint_types_that_are_refused(refused, kind, words):
    assert words in refused(one_joint(LIMIT, kind))


@pytest.mark.parametrize(
    "text, words",
    [
        (b"", "found an empty file, expected an arm as URDF"),
        (b"\n \n", "found an empty file"),
        ("joints: 6", "line 1: found text that is not XML"),
        (TWO[:-5], "line 2: found text that is not XML"),
        ("<sdf version='1.9'/>", "found the root element <sdf>, expected the root element <robot>"),
        ("<robot name='r'/>", "found no links, expected an arm as URDF"),
        (robot(link("a")), "tip: found no link that a joint moves"),
        ('<!DOCTYPE r [<!ENTITY a "b">]>' + TWO[22:], "found a document type or entities"),
        ('<!DOCTYPE r SYSTEM "http://localhost/x.dtd">' + TWO[22:], "found a document type or entities"),
        ('<robot xmlns:xacro="http://www.ros.org/wiki/xacro"><xacro:macro name="m"/></robot>', "found the element <macro> of a template, expected plain URDF (this is a xacro"),
        ("<robot><xacro:include filename='a'/></robot>", "line 1: found an element of a template, expected plain URDF"),
        (TWO.replace('xyz="0.3 0 0"', 'xyz="${length} 0 0"'), "found the element <origin> of a template, expected plain URDF"),
        (robot(link("a", "a")), "link 'a': found the link twice"),
        (robot("<link/>"), "found a link without a name"),
        (robot(link("a", "b"), "<joint type='fixed'/>"), "found a joint without a name"),
        (TWO.replace('name="b"', 'name="a"'), "joint 'a': found the joint twice"),
        (TWO.replace('<parent link="l1"/>', ""), "joint 'b': found no parent link"),
        (TWO.replace('<child link="l2"/>', '<child link="l9"/>'), "joint 'b': found the child link 'l9', which the file does not define"),
        (TWO.replace("</robot>", joint("c", "base", "l2") + "</robot>"), "link 'l2': found two parents (joints 'b' and 'c')"),
        (TWO.replace("</robot>", link("loose") + "</robot>"), "found several root links: base, loose, expected one tree"),
        (robot(link("a", "b"), joint("j", "a", "b"), joint("k", "b", "a")), "found a cycle of joints through the link 'a'"),
        (TWO.replace("</robot>", link("a", "b") + joint("j", "a", "b") + joint("k", "b", "a") + "</robot>"), "found a cycle of joints through the link 'a'"),
        (robot(link("a"), joint("j", "a", "a")), "found a cycle of joints"),
        (robot(link(*(f"l{k}" for k in range(14))), *(joint(f"j{k}", f"l{k}", f"l{k + 1}") for k in range(13))), "joints: found 13, expected 1 to 12"),
        ('<?xml version="1.0" encoding="klingon"?><robot/>', "found XML that cannot be decoded"),
        ('<?xml version="1.0" encoding="utf-16"?><robot/>', ""),
    ],
)
def test_files_that_are_refused(refused, text, words):
    message = refused(text)
    assert message.startswith(words), message


@pytest.mark.parametrize(
    "ends, words",
    [
        ({"tip": "l9"}, "tip: found 'l9', which is no link of a joint here, expected one of base, l1, l2"),
        ({"base": "l9"}, "base: found 'l9'"),
        ({"base": "l2", "tip": "l1"}, "base, tip: found no way down from 'l2' to 'l1', expected a base among the links above the tip: base"),
        ({"base": "l1", "tip": "l1"}, "base, tip: found no moving joint between 'l1' and 'l1'"),
        ({"base": "l2"}, "tip: found no link that a joint moves"),
    ],
)
def test_ends_that_are_refused(refused, ends, words):
    assert refused(TWO, **ends).startswith(words)


def test_thousands_of_links_do_not_hang(refused):
    n = 20_000
    text = robot(link(*(f"l{k}" for k in range(n))), *(joint(f"j{k}", f"l{k}", f"l{k + 1}", "", "fixed") for k in range(n - 1)))
    assert refused(text).startswith("tip: found no link that a joint moves")
    nested = "<robot>" + "<a>" * 50_000 + "</a>" * 50_000 + "</robot>"
    assert refused(nested) == "found no links, expected an arm as URDF"


def test_damaged_files_are_read_or_refused_in_one_line(tmp_path):
    rng, file, letters = random.Random(2), tmp_path / "arm.urdf", b"0123456789abl<>\"'/= "
    pieces = [b'"', b"<", b">", b"/", b"&lt;", b"\0", b"\xff", b"e9", b"-", b" ", b"nan", b"<limit/>", b'<mimic joint="a"/>']
    for _ in range(1500):
        file.write_bytes(damaged(TWO, rng, letters, pieces))
        try:
            arm = pa.Arm.from_urdf(file)
        except pa.PathAuditError as error:
            assert len(str(error).splitlines()) == 1
        else:
            assert np.isfinite(arm.chain.links).all()
