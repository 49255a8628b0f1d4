"""What an audit rests on, as plain keyed values: to be written down with its verdict, and to be compared with what is given later."""

import hashlib
from dataclasses import asdict

import numpy as np

from .arm import unit_of, units_of
from .cell import Cell
from .kernels import rotations
from .taskpath import Path

SHAPE_POINTS = 200  # of the path's shape that are written down


def cell_values(cell: Cell) -> dict:
    """The cell by key, with units in the keys: frames, limits as they hold, thresholds, and the hash of the arm's geometry."""
    arm = cell.arm
    values = {
        "arm": {"name": arm.name, "links_sha256": _hash(arm.chain.links, np.asarray(arm.chain.prismatic, np.uint8))},
        "placement": _pose(cell.placement), "tool": _pose(cell.tool), "part": _pose(cell.part),
        "joints": {name: _joint(arm, j) for j, name in enumerate(arm.joint_names)},
        "thresholds": asdict(cell.thresholds),
    }  # fmt: skip
    if cell.start is not None:
        values["start"] = _listed(cell.start * units_of(arm)[0])
    if cell.tolerances.dimensions:
        values["tolerance"] = {d.name: d.words for d in cell.tolerances.dimensions}
    return values


def path_shape(path: Path) -> list:
    """At most SHAPE_POINTS places of the tool centre point, [x, y, z] in mm, evenly spaced along the path, its ends among them."""
    if not path.length > 0.0:
        return [_listed(1000.0 * path.position[0], 4)]
    at = np.linspace(0.0, path.length, min(SHAPE_POINTS, path.samples))
    distance, keep = np.unique(path.distance, return_index=True)
    points = np.stack([np.interp(at, distance, path.position[keep, c]) for c in range(3)], axis=1)
    return [_listed(1000.0 * point, 4) for point in points]


def flat(values, prefix="") -> dict:
    """Nested values as one mapping with dotted keys; lists stay values."""
    found = {}
    for key, value in values.items():
        name = f"{prefix}{key}"
        found |= flat(value, f"{name}.") if isinstance(value, dict) else {name: value}
    return found


def _joint(arm, j):
    per, unit = unit_of(arm, j)
    values = {f"travel_{unit}": _listed(per * np.array([arm.lower[j], arm.upper[j]])), f"speed_{unit}_s": _number(per * arm.speed[j]),
              f"acceleration_{unit}_s2": _number(per * arm.acceleration[j])}  # fmt: skip
    return values | {"effort_n" if arm.prismatic[j] else "effort_nm": _number(arm.effort[j])}


def _pose(pose):
    return {"xyz_mm": _listed(1000.0 * pose[:3, 3]), "rpy_deg": _listed(np.degrees(rotations.rpy_from_matrix(pose[:3, :3])))}


def _listed(values, digits=9):
    return [_number(value, digits) for value in np.asarray(values, float)]


def _number(value, digits=9):
    """Rounded far below what matters, so that the last bits of a conversion are no change; None where there is none."""
    return round(float(value), digits) + 0.0 if np.isfinite(value) else None


def _hash(*arrays):
    digest = hashlib.sha256()
    for array in arrays:
        digest.update(np.ascontiguousarray(array).tobytes())
    return digest.hexdigest()
