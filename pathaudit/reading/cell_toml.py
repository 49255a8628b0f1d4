"""A cell from a TOML file, with the arm that it names."""

import difflib
import math
import os
from dataclasses import fields, replace

import numpy as np

from .. import arm as arms
from ..arm import Arm
from ..cell import Cell, Thresholds
from ..conventions import DEG, MM
from ..errors import ModelError, ReadError
from ..kernels import rotations
from ..tolerances import KEYS as TOLERANCES, Tolerances
from .sources import decode, read_bytes
from .toml_text import parse_toml, shown

EXPECTED = "a cell as TOML text"
FRAME_KEYS = ("xyz_mm", "rpy_deg")
KEYS = {
    "": ("name", "arm", "tool", "part", "limits", "thresholds", "tolerance"),
    "arm": ("urdf", "base", "tip", "placement", "start_deg", "dh", "joint"),
    "tool": FRAME_KEYS,
    "part": FRAME_KEYS,
    "limits": ("speed_deg_s", "speed_mm_s", "acceleration_deg_s2", "acceleration_mm_s2", "travel_deg", "travel_mm"),
    "thresholds": tuple(field.name for field in fields(Thresholds)),
    "tolerance": TOLERANCES,
}


def read_cell_toml(file) -> Cell:
    """The cell in `file`. Raises ReadError."""
    data, sha256 = read_bytes(file, EXPECTED)
    top = _Table(file, "", parse_toml(file, decode(file, data, EXPECTED), EXPECTED), KEYS[""])
    arm_table = top.table("arm", required=True)
    arm, sources = _arm(arm_table)
    try:
        return Cell(
            name=top.text("name", os.path.splitext(os.path.basename(os.fspath(file)))[0]),
            arm=_limited(arm, top.table("limits")),
            placement=_frame(arm_table.table("placement", FRAME_KEYS)),
            tool=_frame(top.table("tool")),
            part=_frame(top.table("part")),
            start=_start(arm_table, arm),
            thresholds=_thresholds(top.table("thresholds")),
            tolerances=_tolerances(top.table("tolerance"), arm),
            file=str(file),
            sha256=sha256,
            sources=((str(file), sha256), *sources),
        )
    except ModelError as error:
        raise ReadError(file, error.field, error.value, error.reason) from None


class _Table:
    """One TOML table with known keys; every error names the file and the key's full name."""

    def __init__(self, file, name, values, known):
        self.file, self.name, self.values = file, name, values
        if not isinstance(values, dict):
            raise ReadError(file, name, shown(values), f"a table with the keys {', '.join(known)}")
        for key in values:
            if key not in known:
                raise self.error(key, "an unknown key", f"a known one (the nearest is {nearest(key, known)})")

    def place(self, key):
        return f"{self.name}.{key}" if self.name else key

    def error(self, key, found, expected):
        return ReadError(self.file, self.place(key), found, expected)

    def __contains__(self, key):
        return key in self.values

    def table(self, key, known=None, required=False):
        if required and key not in self:
            raise self.error(key, "nothing", f"a table [{self.place(key)}]")
        return _Table(self.file, self.place(key), self.values.get(key, {}), known or KEYS[self.place(key)])

    def text(self, key, missing=None):
        value = self.values.get(key, missing)
        if value is not None and not (isinstance(value, str) and value.strip()):
            raise self.error(key, shown(value), "a text that is not empty")
        return value

    def number(self, key, value=None, endless=False):
        """`value` (by default the key's own) as a float; `endless` lets infinity pass."""
        value = self.values[key] if value is None else value
        try:
            number = math.nan if isinstance(value, bool) or not isinstance(value, (int, float)) else float(value)
        except OverflowError:
            number = math.nan
        if math.isnan(number) or (math.isinf(number) and not endless):
            raise self.error(key, shown(value), "a number")
        return number

    def numbers(self, key, count, value=None, what=None, endless=False):
        value = self.values[key] if value is None else value
        if not isinstance(value, list) or len(value) != count:
            raise self.error(key, shown(value), what or f"{count} numbers in brackets")
        return np.array([self.number(key, item, endless) for item in value])


def nearest(key, known):
    """The known word that is most like `key`."""
    return max(known, key=lambda word: difflib.SequenceMatcher(None, key.lower(), word.lower()).ratio())


def _frame(table):
    xyz_mm = table.numbers("xyz_mm", 3) if "xyz_mm" in table else np.zeros(3)
    rpy_deg = table.numbers("rpy_deg", 3) if "rpy_deg" in table else np.zeros(3)
    return rotations.pose(rotations.matrix_from_rpy_deg(rpy_deg), xyz_mm / 1000.0)


def _start(table, arm):
    if "start_deg" not in table:
        return None
    return table.numbers("start_deg", arm.n, what=f"{arm.n} numbers, one a joint") * np.where(arm.prismatic, MM, DEG)


def _thresholds(table):
    try:
        return Thresholds(**{key: table.number(key) for key in table.values})
    except ModelError as error:
        raise table.error(error.field, error.value, error.reason) from None


def _tolerances(table, arm):
    try:
        return Tolerances.of(arm, **table.values)
    except ModelError as error:
        raise table.error(error.field, error.value, error.reason) from None


def _arm(table):
    """The arm and the (file, sha256) of what it was read from."""
    if ("urdf" in table) == ("joint" in table):
        found = "both urdf and joint rows" if "urdf" in table else "neither urdf nor joint rows"
        raise ReadError(table.file, "arm", found, "one of them: urdf = \"FILE\", or [[arm.joint]] rows with dh")
    if "joint" in table:
        return _arm_from_rows(table), ()
    if "dh" in table:
        raise table.error("dh", "dh beside urdf", "dh only with [[arm.joint]] rows")
    from .urdf import EXPECTED as URDF, arm_from_urdf

    file = os.path.join(os.path.dirname(os.fspath(table.file)), table.text("urdf"))
    data, sha256 = read_bytes(file, f"{URDF}, named by arm.urdf in {table.file}")
    return arm_from_urdf(file, data, table.text("base"), table.text("tip")), ((file, sha256),)


def _arm_from_rows(table):
    for key in ("base", "tip"):
        if key in table:
            raise table.error(key, f"{key} beside joint rows", f"{key} only with urdf")
    if "dh" not in table:
        raise table.error("dh", "nothing", "dh = \"standard\" or \"modified\", the convention of the joint rows")
    rows = table.values["joint"]
    if not isinstance(rows, list):
        raise table.error("joint", shown(rows), "[[arm.joint]] rows")
    for number, row in enumerate(rows, 1):
        row = _Table(table.file, f"arm.joint row {number}", row, arms.ROW_KEYS)
        row.text("name")
    try:
        return Arm.from_dh(rows, table.text("dh"))
    except ModelError as error:
        raise ReadError(table.file, f"arm: {error.field}", error.value, error.reason) from None


class _Limits:
    """The [limits] table laid over an arm's own limits."""

    def __init__(self, table, arm):
        self.table, self.arm = table, arm

    def matching(self, key, slides):
        """The joint numbers that a key's unit fits, and each one's value in the file."""
        value = self.table.values[key]
        fits = [k for k in range(self.arm.n) if self.arm.prismatic[k] == slides]
        kind = "prismatic" if slides else "turning"
        if not isinstance(value, dict):
            if not fits:
                raise self.table.error(key, "a limit in this unit", f"no such key: the arm has no {kind} joint")
            return {k: value for k in fits}
        for name in value:
            if name not in self.arm.joint_names:
                raise self.table.error(f"{key}.{name}", "an unknown joint", f"one of the arm's, the nearest is {nearest(name, self.arm.joint_names)}")
            if self.arm.joint_names.index(name) not in fits:
                raise self.table.error(f"{key}.{name}", f"a joint that is not {kind}", "the key in the joint's own unit (mm where it slides, deg where it turns)")
        return {self.arm.joint_names.index(name): item for name, item in value.items()}

    def rate(self, name):
        """(n,) the arm's limit of this name with what the table says in its place."""
        limit = getattr(self.arm, name).copy()
        for unit, scale, slides in (("deg", DEG, False), ("mm", MM, True)):
            key = f"{name}_{unit}_s2" if name == "acceleration" else f"{name}_{unit}_s"
            if key in self.table:
                for k, value in self.matching(key, slides).items():
                    limit[k] = self.table.number(key, value) * scale
                    if limit[k] <= 0:
                        raise self.table.error(self.key_of(key, k), f"{value:g}", "a limit above 0")
        return limit

    def travel(self):
        lower, upper = self.arm.lower.copy(), self.arm.upper.copy()
        for key, scale, slides in (("travel_deg", DEG, False), ("travel_mm", MM, True)):
            if key in self.table:
                for k, value in self.matching(key, slides).items():
                    place = self.key_of(key, k)
                    low, high = self.table.numbers(place, 2, value, "[lower, upper]", endless=not slides)
                    if not low < high:
                        raise self.table.error(place, f"[{low:g}, {high:g}]", "a lower limit below the upper one")
                    lower[k], upper[k] = low * scale, high * scale
        return {"lower": lower, "upper": upper}

    def key_of(self, key, k):
        return f"{key}.{self.arm.joint_names[k]}" if isinstance(self.table.values[key], dict) else key


def _limited(arm, table):
    limits = _Limits(table, arm)
    return replace(arm, **limits.travel(), speed=limits.rate("speed"), acceleration=limits.rate("acceleration"))
