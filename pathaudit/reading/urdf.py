"""An arm from a URDF file: the serial chain between two of its links.

Read as the format is specified: origins in metres and rpy radians about fixed axes (R = Rz Ry Rx), the axis in the joint's
frame with default 1 0 0, lower and upper default 0, velocity and effort required. What cannot be judged is refused, never guessed.
Masses, meshes, transmissions and safety controllers are not read. The format knows no acceleration limits.
"""

import math
import os
from typing import NamedTuple

import defusedxml.ElementTree as ElementTree
import numpy as np
from defusedxml import DefusedXmlException

from ..arm import Arm, Chain
from ..errors import ModelError, ReadError, first_repeated, one_line, quoted
from ..kernels import rotations
from .sources import read_bytes

EXPECTED = "an arm as URDF"
MOVING = ("revolute", "continuous", "prismatic")
XACRO = "plain URDF (this is a xacro template: expand it first with xacro)"


class _Joint(NamedTuple):
    name: str
    kind: str
    parent: str
    child: str
    element: object


def read_urdf_arm(file, base=None, tip=None) -> Arm:
    """The chain from link `base` to link `tip`; each may be left out where the file leaves one choice. Raises ReadError."""
    data, _ = read_bytes(file, EXPECTED)
    return arm_from_urdf(file, data, base, tip)


def arm_from_urdf(file, data: bytes, base=None, tip=None) -> Arm:
    """The same from the file's bytes; `file` only names it in messages."""
    robot = _parse(file, data)
    joints = _tree(file, robot)
    chain = _between(file, joints, base, tip)
    reader = _Reader(file)
    links, moving = reader.links(chain)
    limits = np.array([reader.limits(joint) for joint in moving])
    name = robot.get("name") or os.path.basename(str(file))
    try:
        return Arm(name, tuple(j.name for j in moving), Chain(links, [j.kind == "prismatic" for j in moving]), *limits.T[:3], np.full(len(moving), np.nan), limits.T[3])
    except ModelError as error:
        raise ReadError(file, error.field, error.value, error.reason) from None


def _parse(file, data):
    try:
        robot = ElementTree.fromstring(data, forbid_dtd=True)
    except ElementTree.ParseError as error:
        if "unbound prefix" in str(error) and b"xacro" in data:
            raise ReadError(file, f"line {error.position[0]}", "an element of a template", XACRO) from None
        raise ReadError(file, f"line {error.position[0]}", f"text that is not XML ({error})", EXPECTED) from None
    except DefusedXmlException:
        raise ReadError(file, "", "a document type or entities", f"{EXPECTED} without them (they are refused for safety)") from None
    except (ValueError, LookupError) as error:
        raise ReadError(file, "", f"XML that cannot be decoded ({one_line(error)})", EXPECTED) from None
    if robot.tag != "robot":
        raise ReadError(file, "", f"the root element <{one_line(robot.tag)}>", "the root element <robot> of a URDF file")
    for element in robot.iter():
        if "xacro" in element.tag or any("${" in value or "$(" in value for value in element.attrib.values()):
            raise ReadError(file, "", f"the element <{one_line(element.tag.split('}')[-1])}> of a template", XACRO)
    return robot


def _tree(file, robot):
    """The joints by child link, after checking that links and joints are one tree."""
    links, joints = _names(file, robot, "link"), {}
    _names(file, robot, "joint")
    known = set(links)
    for element in robot.findall("joint"):
        joint = _joint(file, element, known)
        if joint.child in joints:
            both = f"{quoted(joints[joint.child].name)} and {quoted(joint.name)}"
            raise ReadError(file, f"link {quoted(joint.child)}", f"two parents (joints {both})", "one parent for every link: a tree")
        joints[joint.child] = joint
    _check_one_root(file, links, joints)
    return joints


def _names(file, robot, tag):
    names = [element.get("name") for element in robot.findall(tag)]
    if not all(names):
        raise ReadError(file, "", f"a {tag} without a name", f"a name of its own for every {tag}")
    twice = first_repeated(names)
    if twice:
        raise ReadError(file, f"{tag} {quoted(twice)}", f"the {tag} twice", f"a name of its own for every {tag}")
    return names


def _joint(file, element, known):
    name, kind = element.get("name"), element.get("type")
    ends = [getattr(element.find(end), "attrib", {}).get("link") for end in ("parent", "child")]
    for end, link in zip(("parent", "child"), ends):
        if link not in known:
            found = f"the {end} link {quoted(link)}, which the file does not define" if link else f"no {end} link"
            raise ReadError(file, f"joint {quoted(name)}", found, f"a {end} that is one of the file's links")
    if kind not in MOVING + ("fixed", "floating", "planar"):
        raise ReadError(file, f"joint {quoted(name)}", f"the type {quoted(kind)}", "revolute, continuous, prismatic or fixed")
    return _Joint(name, kind, *ends, element)


def _check_one_root(file, links, joints):
    roots = [link for link in links if link not in joints]
    if not links:
        raise ReadError(file, "", "no links", EXPECTED)
    if len(roots) > 1:
        raise ReadError(file, "", f"several root links: {_list(roots)}", "one tree with a single root link")
    settled = set(roots)
    for link in links:
        trail = set()
        while link not in settled:
            if link in trail:
                raise ReadError(file, "", f"a cycle of joints through the link {quoted(link)}", "one tree with a single root link")
            trail.add(link)
            link = joints[link].parent
        settled.update(trail)


def _between(file, joints, base, tip):
    """The joints from base to tip, in order."""
    links = {joint.parent for joint in joints.values()} | set(joints)
    for title, link in (("base", base), ("tip", tip)):
        if link is not None and link not in links:
            raise ReadError(file, title, f"{quoted(link)}, which is no link of a joint here", f"one of {_list(sorted(links))}")
    if tip is None:
        tip = _only_leaf(file, joints, base)
    chain, link = [], tip
    while link in joints and link != base:
        chain.append(joints[link])
        link = joints[link].parent
    if base is not None and link != base:
        raise ReadError(file, "base, tip", f"no way down from {quoted(base)} to {quoted(tip)}", f"a base among the links above the tip: {_list([j.parent for j in chain])}")
    if all(joint.kind == "fixed" for joint in chain):
        raise ReadError(file, "base, tip", f"no moving joint between {quoted(link)} and {quoted(tip)}", "a chain with at least one moving joint")
    return chain[::-1]


def _only_leaf(file, joints, base):
    """The one link without children that a moving joint carries below the base."""
    below = {}
    for joint in joints.values():
        below.setdefault(joint.parent, []).append(joint)
    leaves, stack = [], [(base, False)] if base else [(link, False) for link in below if link not in joints]
    while stack:
        link, moved = stack.pop()
        if moved and link not in below:
            leaves.append(link)
        stack.extend((joint.child, moved or joint.kind != "fixed") for joint in reversed(below.get(link, [])))
    if len(leaves) != 1:
        found = f"{len(leaves)} possible tips" if leaves else "no link that a joint moves"
        raise ReadError(file, "tip", found, f"tip to name one of {_list(leaves)}" if leaves else EXPECTED)
    return leaves[0]


def _list(names, most=12):
    more = f" and {len(names) - most} more" if len(names) > most else ""
    return ", ".join(one_line(name) for name in names[:most]) + more


class _Reader:
    """The numbers of one file's joints."""

    def __init__(self, file):
        self.file = file

    def error(self, joint, found, expected):
        return ReadError(self.file, f"joint {quoted(joint.name)}", found, expected)

    def links(self, chain):
        """Fixed transforms around the moving joints (n+1, 4, 4), each joint's frame turned so that it moves about +z."""
        links, moving, link = [], [], np.eye(4)
        for joint in chain:
            self.check_kind(joint)
            link = link @ self.origin(joint)
            if joint.kind in MOVING:
                turn = rotations.pose(rotations.turn_z_onto(self.axis(joint)), np.zeros(3))
                links.append(link @ turn)
                moving.append(joint)
                link = rotations.inverse_pose(turn)
        return np.array([*links, link]), moving

    def check_kind(self, joint):
        if joint.kind in ("floating", "planar"):
            raise self.error(joint, f"a {joint.kind} joint between base and tip", "revolute, continuous, prismatic or fixed joints")
        if joint.element.find("mimic") is not None and joint.kind in MOVING:
            leader = quoted(joint.element.find("mimic").get("joint"))
            raise self.error(joint, f"a joint that mimics {leader} between base and tip", "joints that move on their own")

    def origin(self, joint):
        origin = joint.element.find("origin")
        if origin is None:
            return np.eye(4)
        xyz, rpy = (self.triple(joint, "origin", origin, key, "0 0 0") for key in ("xyz", "rpy"))
        return rotations.pose(rotations.matrix_from_rpy(rpy), xyz)

    def axis(self, joint):
        element = joint.element.find("axis")
        axis = np.array([1.0, 0.0, 0.0]) if element is None else self.triple(joint, "axis", element, "xyz", "1 0 0")
        length = np.linalg.norm(axis)
        if not 1e-6 < length < 1e6:
            raise self.error(joint, f"an axis of length {length:g}", "an axis with a direction")
        return axis / length

    def triple(self, joint, tag, element, key, default):
        words = element.get(key, default).split()
        if len(words) != 3:
            raise self.error(joint, f"<{tag} {key}> with {len(words)} numbers", "3 numbers")
        return np.array([self.number(joint, f"{tag} {key}", word) for word in words])

    def number(self, joint, place, word):
        try:
            value = float(word)
        except ValueError:
            value = math.nan
        if not math.isfinite(value) or "_" in word or not word.isascii():
            raise self.error(joint, f"<{place}> {quoted(word)}", "a finite number")
        return value

    def limits(self, joint):
        """lower, upper, speed, effort of a moving joint; NaN where the file need not say."""
        element, endless = joint.element.find("limit"), joint.kind == "continuous"
        if element is None:
            if endless:
                return -math.inf, math.inf, math.nan, math.nan
            raise self.error(joint, "no <limit>", "<limit lower upper velocity effort>")
        for key in ("velocity", "effort"):
            if element.get(key) is None:
                raise self.error(joint, f"<limit> without {key}", f"{key}, which URDF requires")
        speed, effort = (self.number(joint, f"limit {key}", element.get(key)) for key in ("velocity", "effort"))
        if speed <= 0:
            raise self.error(joint, f"<limit velocity> {speed:g}", "a largest speed above 0 (rad/s or m/s)")
        if effort < 0:
            raise self.error(joint, f"<limit effort> {effort:g}", "0 (not stated) or more")
        lower, upper = (-math.inf, math.inf) if endless else self.travel(joint, element)
        return lower, upper, speed, effort or math.nan

    def travel(self, joint, element):
        lower, upper = (self.number(joint, f"limit {key}", element.get(key, "0")) for key in ("lower", "upper"))
        if lower > upper:
            raise self.error(joint, f"<limit> lower {lower:g} above upper {upper:g}", "lower below upper")
        if lower == upper:
            mend = "state lower and upper, or make the joint type fixed or continuous"
            raise self.error(joint, f"<limit> lower and upper both {lower:g}, a locked joint", f"lower below upper ({mend})")
        return lower, upper
