"""The arm: a serial chain from base to flange with its joint limits."""

from collections.abc import Mapping
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np

from .conventions import DEG, FARTHEST, MAX_JOINTS, MM, frozen
from .errors import ModelError, first_repeated, quoted
from .kernels import rotations


LIMIT_KEYS = ("lower", "upper", "speed", "acceleration", "effort")
TURN_UNITS = {"lower_deg": DEG, "upper_deg": DEG, "speed_deg_s": DEG, "acceleration_deg_s2": DEG, "effort_nm": 1.0}
SLIDE_UNITS = {"lower_mm": MM, "upper_mm": MM, "speed_mm_s": MM, "acceleration_mm_s2": MM, "effort_n": 1.0}
GEOMETRY_KEYS = ("a_mm", "alpha_deg", "d_mm", "theta_deg")
ROW_KEYS = ("name", "type", *GEOMETRY_KEYS, *TURN_UNITS, *SLIDE_UNITS)
"""Every key of a Denavit-Hartenberg row."""


class Chain(NamedTuple):
    """links (n+1, 4, 4) fixed transforms, prismatic (n,) uint8.

    pose(q) = links[0] Z(q0) links[1] ... Z(q[n-1]) links[n], where Z turns about the local +z (revolute) or slides along it.
    """

    links: np.ndarray
    prismatic: np.ndarray


@dataclass(frozen=True, eq=False)
class Arm:
    """n joints (1 to 12) between base and flange; limits (n,) in rad or m, per second, per second squared, N m or N.

    lower, upper: -inf and inf for a joint that turns without end. NaN stands for a limit that nobody stated, in every
    array; a Cell refuses an arm whose travel or speed limits are not stated.
    """

    name: str
    joint_names: tuple
    chain: Chain
    lower: np.ndarray
    upper: np.ndarray
    speed: np.ndarray
    acceleration: np.ndarray
    effort: np.ndarray

    def __post_init__(self):
        n = len(self.joint_names)
        if not 1 <= n <= MAX_JOINTS:
            raise ModelError("joints", n, f"1 to {MAX_JOINTS} moving joints between base and tip")
        twice = first_repeated(self.joint_names)
        if twice is not None:
            raise ModelError("joints", f"{quoted(twice)} twice", "a name of its own for every joint")
        object.__setattr__(self, "chain", Chain(frozen(self.chain.links), frozen(self.chain.prismatic, np.uint8)))
        if self.chain.links.shape != (n + 1, 4, 4) or self.chain.prismatic.shape != (n,):
            raise ModelError("chain", f"links of shape {self.chain.links.shape}", f"{(n + 1, 4, 4)} for {n} joints")
        if not (np.abs(self.chain.links) <= FARTHEST).all():
            raise ModelError("chain", "a link that is not finite or longer than 10 km", "lengths in the stated unit")
        for field in LIMIT_KEYS:
            object.__setattr__(self, field, frozen(getattr(self, field)))
            if getattr(self, field).shape != (n,):
                raise ModelError(field, f"shape {getattr(self, field).shape}", f"one number for each of {n} joints")
        self._check_limits()

    def _check_limits(self):
        for k, name in enumerate(self.joint_names):
            if self.lower[k] >= self.upper[k]:
                raise ModelError(f"joint {name}", f"travel from {self.lower[k]:g} to {self.upper[k]:g}", "a lower limit below the upper one")
            if self.chain.prismatic[k] and np.isinf([self.lower[k], self.upper[k]]).any():
                raise ModelError(f"joint {name}", "endless travel", "finite travel for a joint that slides")
            for field in ("speed", "acceleration", "effort"):
                value = getattr(self, field)[k]
                if value <= 0 or np.isinf(value):
                    raise ModelError(f"joint {name}", f"{field} limit {value:g}", "a finite number above 0")

    @classmethod
    def from_urdf(cls, file, base=None, tip=None) -> "Arm":
        """The chain between two links of a URDF file; each may be left out where the file leaves one choice."""
        from .reading.urdf import read_urdf_arm

        return read_urdf_arm(file, base, tip)

    @classmethod
    def from_dh(cls, rows, convention="standard", name="arm") -> "Arm":
        """The chain of Denavit-Hartenberg rows, one mapping a joint, from base to flange.

        standard: each joint's transform is Rz(theta) Tz(d) Tx(a) Rx(alpha) (J. Denavit, R. S. Hartenberg, J. Applied
        Mechanics 22, 1955); modified: Rx(alpha) Tx(a) Rz(theta) Tz(d) (J. J. Craig, Introduction to Robotics, 1986).
        The moving variable adds to theta (revolute) or to d (prismatic).

        Keys: name, type ('revolute' or 'prismatic'), a_mm, alpha_deg, d_mm, theta_deg (0 where left out), and the limits
        lower_deg, upper_deg, speed_deg_s, acceleration_deg_s2, effort_nm, or for a prismatic joint lower_mm, upper_mm,
        speed_mm_s, acceleration_mm_s2, effort_n (not stated where left out). Raises ModelError.

        >>> arm = Arm.from_dh([{"a_mm": 500}, {"a_mm": 400}])
        >>> arm.joint_names, arm.flange_pose([0.0, 0.0])[:3, 3].tolist()
        (('j1', 'j2'), [0.9, 0.0, 0.0])
        """
        if convention not in ("standard", "modified"):
            raise ModelError("dh", quoted(convention), "'standard' or 'modified'")
        joints = [_Row(row, k) for k, row in enumerate(rows)]
        moves = [joint.transform(convention) for joint in joints]
        links = [np.eye(4), *moves] if convention == "standard" else [*moves, np.eye(4)]
        return cls(
            name,
            tuple(joint.name for joint in joints),
            Chain(np.array(links).reshape(-1, 4, 4), np.array([joint.prismatic for joint in joints])),
            *(np.array([joint.limit(key) for joint in joints]) for key in LIMIT_KEYS),
        )

    @property
    def n(self) -> int:
        return len(self.joint_names)

    @property
    def prismatic(self) -> np.ndarray:
        """(n,) bool"""
        return self.chain.prismatic.astype(bool)

    @property
    def reach(self) -> float:
        """m, no less than the flange can be from the first joint's frame: the lengths of all links and slides after it."""
        lengths = np.linalg.norm(self.chain.links[1:, :3, 3], axis=1).sum()
        slides = np.maximum(np.abs(self.lower), np.abs(self.upper))[self.prismatic]
        return float(lengths + np.nansum(slides))

    def flange_pose(self, q) -> np.ndarray:
        """q (..., n) rad or m -> (..., 4, 4), flange in the arm's base frame."""
        return self._each("poses", q)

    def jacobian(self, q) -> np.ndarray:
        """q (..., n) -> (..., 6, n): linear rows first, then angular; at the flange origin, in base-frame axes."""
        return self._each("jacobians", q)

    def _each(self, kernel, q):
        q = np.ascontiguousarray(q, dtype=np.float64)
        if q.shape[-1:] != (self.n,):
            raise ModelError("q", f"shape {q.shape}", f"(..., {self.n}), one number a joint")
        from .kernels import linkage  # loads Numba: only where numbers are wanted

        out = getattr(linkage, kernel)(*self.chain, q.reshape(-1, self.n))
        return out.reshape(q.shape[:-1] + out.shape[1:])


class _Row:
    """One Denavit-Hartenberg row, checked."""

    def __init__(self, row, number):
        if not isinstance(row, Mapping):
            raise ModelError(f"joint row {number + 1}", type(row).__name__, "a mapping of keys to values")
        self.row, self.name = row, str(row.get("name", f"j{number + 1}"))
        self.prismatic = row.get("type", "revolute") == "prismatic"
        if row.get("type", "revolute") not in ("revolute", "prismatic"):
            raise ModelError(f"joint {self.name}, type", quoted(row["type"]), "'revolute' or 'prismatic'")
        self.units = SLIDE_UNITS if self.prismatic else TURN_UNITS
        for key in row:
            if key not in ("name", "type", *GEOMETRY_KEYS, *self.units):
                raise ModelError(f"joint {self.name}", f"the key {quoted(key)}", f"for this type one of {', '.join(GEOMETRY_KEYS + tuple(self.units))}")

    def number(self, key, missing):
        value = self.row.get(key, missing)
        try:
            number = np.nan if isinstance(value, (bool, str)) else float(value)
        except (TypeError, ValueError, OverflowError):
            number = np.nan
        if key in self.row and (np.isnan(number) or (np.isinf(number) and key not in ("lower_deg", "upper_deg"))):
            raise ModelError(f"joint {self.name}, {key}", quoted(value), "a finite number")
        return number

    def limit(self, name):
        key = next(key for key in self.units if key.startswith(name))
        return self.number(key, np.nan) * self.units[key]

    def transform(self, convention):
        a, d = self.number("a_mm", 0.0) / 1000.0, self.number("d_mm", 0.0) / 1000.0
        about_z = rotations.pose(rotations.matrix_from_rpy_deg([0.0, 0.0, self.number("theta_deg", 0.0)]), [0.0, 0.0, d])
        about_x = rotations.pose(rotations.matrix_from_rpy_deg([self.number("alpha_deg", 0.0), 0.0, 0.0]), [a, 0.0, 0.0])
        return about_z @ about_x if convention == "standard" else about_x @ about_z


def unit_of(arm, joint):
    """Factor and unit in which a joint's position is shown: (1000, "mm") where it slides, else degrees."""
    return (1000.0, "mm") if arm.prismatic[joint] else (180.0 / np.pi, "deg")


def units_of(arm):
    """The factors (n,) and the n units of all joints."""
    scales, units = zip(*(unit_of(arm, joint) for joint in range(len(arm.joint_names))), strict=True)
    return np.array(scales), units
