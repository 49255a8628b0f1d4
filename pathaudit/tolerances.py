"""How far a cell may be from what is stated: the dimensions that vary, each with its bounds or its standard deviation."""

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np

from .arm import Arm
from .errors import ModelError, quoted

FRAME_KEYS = ("part_xyz_mm", "part_rpy_deg", "tool_xyz_mm", "tool_rpy_deg", "base_xyz_mm", "base_rpy_deg")
JOINT_KEYS = ("joint_zero_deg", "joint_zero_mm", "link_mm")
KEYS = (*FRAME_KEYS, *JOINT_KEYS, "speed_percent")
"""What may be stated. A number stands for all three axes, or for all joints that it fits."""

UNITS = {"mm": 1e-3, "deg": np.pi / 180.0, "%": 0.01}
LARGEST = {"mm": 1000.0, "deg": 45.0, "%": 50.0}
LARGEST_SIGMA = {"mm": 100.0, "deg": 5.0, "%": 5.0}  # eight times as much can be drawn
SHORTEST_LINK = 1e-3  # m, whose length has a direction


@dataclass(frozen=True)
class Dimension:
    """One number that may be off: by at most `size` either way, all equally likely, or normally with the standard deviation `size`.

    key: one of KEYS. index: the axis 0..2 of a frame, the joint of a joint key, 0 for the speed. name: for people, "part rx", "zero of j4".
    size in `unit`, "mm", "deg" or "%".
    """

    key: str
    index: int
    name: str
    unit: str
    size: float
    normal: bool = False

    @property
    def deviation(self) -> float:
        """The standard deviation, in `unit`"""
        return self.size if self.normal else self.size / np.sqrt(3.0)

    @property
    def words(self) -> str:
        """The size for people: "+-1 mm", or "sigma 1 mm" """
        return f"{'sigma ' if self.normal else '+-'}{self.size:g} {self.unit}"


@dataclass(frozen=True)
class Tolerances:
    """The dimensions that vary, independently of each other; none by default, which is the cell exactly as stated.

    Frames: part and base move along and turn about the axes of the world, the tool about those of the flange, each about its own origin; rpy are
    rotations about the fixed X, then Y, then Z axes. joint_zero: the joint stands so much further than its reading says. link: the straight distance
    from one joint's frame to the next, or to the flange, along its own direction. speed_percent: of the programmed speed.
    """

    dimensions: tuple = ()

    @classmethod
    def of(cls, arm: Arm, **stated) -> "Tolerances":
        """Tolerances by KEYS. A value is a number, [x, y, z] for a frame, {JOINT: number} for joints, or {"sigma": any of these}. Raises ModelError.

        >>> arm = Arm.from_dh([{"a_mm": 500}, {"a_mm": 400}])
        >>> [f"{d.name} {d.words}" for d in Tolerances.of(arm, part_xyz_mm=[1, 1, 0], joint_zero_deg={"sigma": 0.02}).dimensions]
        ['part x +-1 mm', 'part y +-1 mm', 'zero of j1 sigma 0.02 deg', 'zero of j2 sigma 0.02 deg']
        """
        for key in stated:
            if key not in KEYS:
                raise ModelError(quoted(key), "an unknown key", f"one of {', '.join(KEYS)}")
        return cls(tuple(d for key in KEYS if key in stated for d in _dimensions(arm, key, stated[key]) if d.size > 0.0))

    def check(self, arm: Arm):
        """Raise ModelError where a dimension belongs to a joint that the arm does not have."""
        for d in self.dimensions:
            if d.key in JOINT_KEYS and d.index >= arm.n:
                raise ModelError("tolerance", d.name, f"a joint of the arm, which has {arm.n}")


def part_placement(sizes_mm_deg=(1.0, 0.1)) -> tuple:
    """The six dimensions of where the part stands, with one size for its places and one for its turns."""
    return tuple(Dimension(key, i, name, unit, size) for key, size in zip(FRAME_KEYS[:2], sizes_mm_deg, strict=True)
                 for i, name, unit in _axes(key))  # fmt: skip


def _axes(key):
    frame, kind, unit = key.split("_")
    return [(i, f"{frame} {'r' if kind == 'rpy' else ''}{axis}", unit) for i, axis in enumerate("xyz")]


def _dimensions(arm, key, value):
    normal = isinstance(value, Mapping) and set(value) == {"sigma"}
    value = value["sigma"] if normal else value
    if key in FRAME_KEYS:
        sizes = _three(key, value, normal)
        return [Dimension(key, i, name, unit, sizes[i], normal) for i, name, unit in _axes(key)]
    if key == "speed_percent":
        return [Dimension(key, 0, "programmed speed", "%", _size(key, value, "%", normal), normal)]
    unit = key.rpartition("_")[2]
    return [Dimension(key, j, _joint_name(arm, key, j), unit, _size(f"{key}.{arm.joint_names[j]}", size, unit, normal), normal)
            for j, size in _by_joint(arm, key, value)]  # fmt: skip


def _joint_name(arm, key, j):
    names = arm.joint_names
    if key != "link_mm":
        return f"zero of {names[j]}"
    return f"length from {names[j]} to {names[j + 1] if j + 1 < arm.n else 'the flange'}"


def _three(key, value, normal):
    unit = key.rpartition("_")[2]
    if isinstance(value, (list, tuple, np.ndarray)):
        if len(value) != 3:
            raise ModelError(key, quoted(value), "a number, or three in brackets, for x, y and z")
        return [_size(key, item, unit, normal) for item in value]
    return [_size(key, value, unit, normal)] * 3


def _fits(arm, key):
    """The joints that a key can be stated for, and what they are called."""
    if key == "link_mm":
        lengths = np.linalg.norm(arm.chain.links[1:, :3, 3], axis=1)
        return [j for j in range(arm.n) if lengths[j] >= SHORTEST_LINK], "a joint with a length to the next"
    slides = key == "joint_zero_mm"
    return [j for j in range(arm.n) if arm.prismatic[j] == slides], "a joint that slides" if slides else "a joint that turns"


def _by_joint(arm, key, value):
    fits, words = _fits(arm, key)
    if not isinstance(value, Mapping):
        if not fits:
            raise ModelError(key, "a tolerance in this unit", f"{words}, of which the arm has none")
        return [(j, value) for j in fits]
    for name in value:
        if name not in arm.joint_names:
            raise ModelError(f"{key}.{name}", "an unknown joint", f"one of {', '.join(arm.joint_names)}")
        if arm.joint_names.index(name) not in fits:
            raise ModelError(f"{key}.{name}", "a joint that this key does not fit", words)
    return [(arm.joint_names.index(name), size) for name, size in value.items()]


def _size(key, value, unit, normal):
    largest = (LARGEST_SIGMA if normal else LARGEST)[unit]
    number = not isinstance(value, bool) and isinstance(value, (int, float, np.integer, np.floating))
    if not number or not 0.0 <= value <= largest:
        kind = "a standard deviation" if normal else "a tolerance"
        raise ModelError(key, f"{value:g}" if number else quoted(value), f"{kind} from 0 to {largest:g} {unit}")
    return float(value)
