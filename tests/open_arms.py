"""The robot descriptions of the wheel `example-robot-data`, and pinocchio's answers about them."""

import xml.etree.ElementTree as ElementTree
from functools import lru_cache
from importlib.metadata import distribution
from pathlib import Path

import numpy as np
import pinocchio

WHEEL = distribution("example-robot-data")


def folder_of_robots() -> Path:
    return Path(WHEEL.locate_file("cmeel.prefix/share/example-robot-data/robots"))


def robot_file(name: str) -> Path:
    """The file of a name like ur_description/urdf/ur5_robot.urdf."""
    return folder_of_robots() / name


def all_robot_files() -> list[Path]:
    return sorted(folder_of_robots().rglob("*.urdf"))


class Tree:
    """Links and joints of a robot description, read with nothing but the standard library."""

    def __init__(self, file: Path):
        robot = ElementTree.parse(file).getroot()
        self.joint_above = {joint.find("child").get("link"): joint for joint in robot.findall("joint")}
        parents = {joint.find("parent").get("link") for joint in self.joint_above.values()}
        self.links = [link.get("name") for link in robot.findall("link")]
        (self.root,) = [link for link in self.links if link not in self.joint_above]
        self.leaves = [link for link in self.links if link not in parents]

    def chain(self, tip):
        """All joints from the root to `tip`, the fixed ones too."""
        joints = []
        while tip in self.joint_above:
            joints.append(self.joint_above[tip])
            tip = joints[-1].find("parent").get("link")
        return joints[::-1]


class Reference:
    """Pose and Jacobian of any link by pinocchio, for named joints; joints that are not named stand at zero."""

    def __init__(self, file: Path):
        self.model = _model(file)
        self.data = self.model.createData()

    def columns(self, joint_names):
        return np.array([self.model.joints[self.model.getJointId(name)].idx_v for name in joint_names])

    def pose_and_jacobian(self, tip, joint_names, q):
        """(4, 4) and (6, n), linear rows first, at the tip's origin in the axes of the root link."""
        columns, moves = self.columns(joint_names), np.zeros(self.model.nv)
        moves[columns] = q
        # integrating from the neutral state turns angles into pinocchio's (cos, sin) of a joint without end stops
        state = pinocchio.integrate(self.model, pinocchio.neutral(self.model), moves)
        frame = self.model.getFrameId(tip)
        aligned = pinocchio.ReferenceFrame.LOCAL_WORLD_ALIGNED
        jacobian = pinocchio.computeFrameJacobian(self.model, self.data, state, frame, aligned)
        pinocchio.framesForwardKinematics(self.model, self.data, state)
        return self.data.oMf[frame].homogeneous.copy(), jacobian[:, columns]


@lru_cache(maxsize=4)
def _model(file):
    return pinocchio.buildModelFromUrdf(str(file))
