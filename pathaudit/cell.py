"""The cell: the arm where it stands, its tool, the part, and the thresholds of what is flagged."""

from dataclasses import dataclass, fields
from functools import cached_property

import numpy as np

from .arm import Arm, Chain
from .conventions import FARTHEST, frozen
from .errors import ModelError
from .kernels import rotations
from .tolerances import Tolerances


@dataclass(frozen=True)
class Thresholds:
    """What is flagged. Shares are of the limit; sigma_min belongs to the Jacobian scaled by the characteristic length.

    travel_warn_*: least travel left (at 0 it fails).  deviation_*: how far the computed joints may leave the tool off the path.
    tool_speed_mm_s: a ceiling for the tool centre point, None for none.  characteristic_length_mm: None for half the arm's reach.
    """

    sigma_min_warn: float = 0.06
    sigma_min_fail: float = 0.02
    speed_share_warn: float = 0.9
    speed_share_fail: float = 1.0
    acceleration_share_warn: float = 0.9
    acceleration_share_fail: float = 1.0
    travel_warn_deg: float = 5.0
    travel_warn_mm: float = 5.0
    deviation_mm: float = 0.01
    deviation_deg: float = 0.01
    tool_speed_mm_s: float | None = None
    characteristic_length_mm: float | None = None

    def travel_warn(self, slides):
        """Least travel left in m where the joint slides, else in rad: slides a bool or (n,)."""
        return np.where(slides, self.travel_warn_mm / 1000.0, np.radians(self.travel_warn_deg))

    def __post_init__(self):
        for field in fields(self):
            value = getattr(self, field.name)
            if value is None and field.default is None:
                continue
            least = "a number of 0 or more" if field.default is not None else "a number above 0"
            if isinstance(value, bool) or not isinstance(value, (int, float, np.floating)):
                raise ModelError(field.name, repr(value), least)
            if not np.isfinite(value) or value < 0 or (value == 0 and field.default is None):
                raise ModelError(field.name, f"{value:g}", least)
        if self.sigma_min_fail > self.sigma_min_warn:
            raise ModelError("sigma_min_fail", f"{self.sigma_min_fail:g}", f"no more than sigma_min_warn ({self.sigma_min_warn:g})")
        for name in ("speed_share", "acceleration_share"):
            warn, fail = getattr(self, f"{name}_warn"), getattr(self, f"{name}_fail")
            if warn > fail:
                raise ModelError(f"{name}_warn", f"{warn:g}", f"no more than {name}_fail ({fail:g})")


@dataclass(frozen=True, eq=False)
class Cell:
    """arm (its limits as they hold in this cell); placement (4, 4) base in world; tool (4, 4) tool centre point in flange;
    part (4, 4) part frame in world; start (n,) rad or m, the posture to start near, or None.

    tolerances: how far it may be from all this; an audit takes the cell as stated.
    file, sha256: where the cell was read; sources: (file, sha256) of every file that it came from. Raises ModelError.
    """

    name: str
    arm: Arm
    placement: np.ndarray
    tool: np.ndarray
    part: np.ndarray
    start: np.ndarray | None = None
    thresholds: Thresholds = Thresholds()
    file: str = ""
    sha256: str = ""
    sources: tuple = ()
    tolerances: Tolerances = Tolerances()

    def __post_init__(self):
        for field in ("placement", "tool", "part"):
            object.__setattr__(self, field, frozen(_rigid(field, getattr(self, field))))
        if self.start is not None:
            object.__setattr__(self, "start", frozen(self.start))
            if self.start.shape != (self.arm.n,) or not np.isfinite(self.start).all():
                raise ModelError("start", f"{np.size(self.start)} numbers", f"{self.arm.n} finite numbers, one a joint")
        self.tolerances.check(self.arm)
        for k, joint in enumerate(self.arm.joint_names):
            slides = self.arm.prismatic[k]
            if not self.arm.lower[k] < self.arm.upper[k]:
                key = "travel_mm" if slides else "travel_deg"
                raise ModelError(f"joint {joint}", "no travel limits", f"limits from the arm, or {key} under [limits]")
            if not self.arm.speed[k] > 0:
                key = "speed_mm_s" if slides else "speed_deg_s"
                raise ModelError(f"joint {joint}", "no speed limit", f"a limit from the arm, or {key} under [limits]")

    @cached_property
    def chain(self) -> Chain:
        """The chain from the part frame to the tool centre point."""
        links = self.arm.chain.links.copy()
        links[0] = rotations.inverse_pose(self.part) @ self.placement @ links[0]
        links[-1] = links[-1] @ self.tool
        return Chain(frozen(links), self.arm.chain.prismatic)

    @property
    def characteristic_length(self) -> float:
        """m, the length that scales the Jacobian's linear rows."""
        stated = self.thresholds.characteristic_length_mm
        return self.arm.reach / 2 if stated is None else stated / 1000.0


def _rigid(field, pose):
    pose = np.asarray(pose, dtype=np.float64)
    if pose.shape != (4, 4):
        raise ModelError(field, f"shape {pose.shape}", "a pose of shape (4, 4)")
    turn = pose[:3, :3]
    if not (np.allclose(turn @ turn.T, np.eye(3), atol=1e-9) and np.linalg.det(turn) > 0 and (pose[3] == (0, 0, 0, 1)).all() and np.isfinite(pose).all()):
        raise ModelError(field, "a matrix that is not a rigid pose", "a rotation and a translation with the last row 0 0 0 1")
    if not (np.abs(pose) <= FARTHEST).all():
        raise ModelError(field, f"a place {np.abs(pose).max():g} m away", f"coordinates within {FARTHEST:g} m (check the unit)")
    return pose
