"""A cell with some of its dimensions off: the chains of many draws at once, and the cell and the path of one draw."""

from dataclasses import dataclass, replace

import numpy as np

from ..arm import Chain
from ..cell import Cell
from ..kernels import rotations
from ..taskpath import Path
from ..tolerances import UNITS


@dataclass(frozen=True, eq=False)
class Frames:
    """The parts of M draws: part, placement, tool (M, 4, 4), links (M, n + 1, 4, 4) of the arm, speed (M,) times the programmed one."""

    part: np.ndarray
    placement: np.ndarray
    tool: np.ndarray
    links: np.ndarray
    speed: np.ndarray

    @property
    def chains(self) -> np.ndarray:
        """(M, n + 1, 4, 4) links of the chains from the part frame to the tool centre point"""
        links = self.links.copy()
        links[:, 0] = rotations.inverse_pose(self.part) @ self.placement @ links[:, 0]
        links[:, -1] = links[:, -1] @ self.tool
        return links


def frames(cell: Cell, dimensions, values) -> Frames:
    """The frames of draws whose `dimensions` are off by values (M, D), or of one by values (D,), each in its own unit."""
    values = np.asarray(values, dtype=np.float64)
    values = values[None] if values.ndim == 1 else values
    off = {}
    for column, d in zip(values.T, dimensions, strict=True):
        off[d.key, d.index] = off.get((d.key, d.index), 0.0) + column * UNITS[d.unit]
    count = len(values)
    return Frames(
        _moved(cell.part, "part", off, count), _moved(cell.placement, "base", off, count), _moved(cell.tool, "tool", off, count),
        _links(cell.arm, off, count), 1.0 + np.broadcast_to(off.get(("speed_percent", 0), 0.0), count),
    )  # fmt: skip


def _moved(pose, frame, off, count):
    """(count, 4, 4) the pose turned about its own origin, and moved, along the axes that it is stated in."""
    place, turn = (np.stack([np.broadcast_to(off.get((f"{frame}_{kind}", i), 0.0), count) for i in range(3)], axis=1) for kind in ("xyz_mm", "rpy_deg"))
    out = np.tile(pose, (count, 1, 1))
    if turn.any():
        out[:, :3, :3] = rotations.matrix_from_rpy(turn) @ pose[:3, :3]
    out[:, :3, 3] += place
    return out


def _links(arm, off, count):
    links = np.tile(arm.chain.links, (count, 1, 1, 1))
    for j in range(arm.n):
        if ("link_mm", j) in off:
            p = arm.chain.links[j + 1, :3, 3]
            links[:, j + 1, :3, 3] += off["link_mm", j][:, None] * p / np.linalg.norm(p)
        if ("joint_zero_deg", j) in off:
            turn = np.zeros((count, 3))
            turn[:, 2] = off["joint_zero_deg", j]
            links[:, j + 1, :3] = rotations.matrix_from_rpy(turn) @ links[:, j + 1, :3]
        if ("joint_zero_mm", j) in off:
            links[:, j + 1, 2, 3] += off["joint_zero_mm", j]
    return links


def cell_off(cell: Cell, dimensions, values) -> Cell:
    """The cell with its `dimensions` off by values (D,). The characteristic length stays: it scales what the thresholds are stated for."""
    one = frames(cell, dimensions, values)
    limits = cell.thresholds
    if any(d.key == "link_mm" for d in dimensions):
        limits = replace(limits, characteristic_length_mm=1000.0 * cell.characteristic_length)
    arm = replace(cell.arm, chain=Chain(one.links[0], cell.arm.chain.prismatic))
    return replace(cell, arm=arm, part=one.part[0], placement=one.placement[0], tool=one.tool[0], thresholds=limits)


def path_off(path: Path, dimensions, values) -> Path:
    """The path with its speed off by what `values` (D,) say, from the same first moment on."""
    speed = 1.0 + sum(value * UNITS["%"] for d, value in zip(dimensions, values, strict=True) if d.key == "speed_percent")
    return path if speed == 1.0 else replace(path, time=path.time[0] + (path.time - path.time[0]) / speed)
