"""What may be asked for when a path is read, as one value."""

from dataclasses import dataclass

import numpy as np

from ..errors import ModelError, quoted
from .geometry import UNIT_OF

FORMATS = {
    "timed": "a timed path (CSV)",
    "waypoints": "points with a speed (CSV)",
    "iso6983": "machine code (ISO 6983-1)",
    "cutter-location": "cutter-location text (ISO 4343 words)",
    "parquet": "a Parquet table",
    "feather": "a Feather table",
    "json-lines": "JSON lines",
    "recorded": "a recorded path",
}
"""Every format that can be asked for, and what it is called in messages."""


@dataclass(frozen=True)
class ReadOptions:
    """Choices of the reader of a path. None: not stated, and asked for where a file needs it.

    format: one of FORMATS; None takes what the file's content says.
    axis: the tool's +Z in the part frame, from the tool to the work, for files without orientation; scaled to length 1.
    inch_codes: G20 means inch and G21 millimetre (a dialect's words).  units: 'mm' or 'inch' for files that do not say theirs.
    speed_mm_s, acceleration_mm_s2, turn_speed_deg_s, turn_acceleration_deg_s2: what the tool can do, to give untimed geometry its times.
    corner: 'stop', or a radius ('5mm') or a speed ('50mm/s') to round corners with.
    chord_mm, angle_deg, step_s: how finely geometry is sampled.
    smooth_ms: half the width of the window in which a recorded path is smoothed; None does not smooth.
    """

    format: str | None = None
    axis: tuple | None = None
    inch_codes: bool = False
    units: str | None = None
    speed_mm_s: float | None = None
    acceleration_mm_s2: float | None = None
    turn_speed_deg_s: float | None = None
    turn_acceleration_deg_s2: float | None = None
    corner: str | None = None
    chord_mm: float | None = None
    angle_deg: float | None = None
    step_s: float | None = None
    smooth_ms: float | None = None

    def __post_init__(self):
        _one_of("format", self.format, FORMATS)
        _one_of("units", self.units, UNIT_OF)
        if self.axis is not None:
            object.__setattr__(self, "axis", _direction(self.axis))
        for name in ABOVE_ZERO:
            value = getattr(self, name)
            if value is not None:
                object.__setattr__(self, name, _above_zero(name, value))


ABOVE_ZERO = (
    "speed_mm_s", "acceleration_mm_s2", "turn_speed_deg_s", "turn_acceleration_deg_s2", "chord_mm", "angle_deg", "step_s", "smooth_ms",
)  # fmt: skip


def _one_of(name, value, known):
    if value is not None and value not in known:
        raise ModelError(name, quoted(value), f"one of {', '.join(known)}")


def _above_zero(name, value):
    try:
        number = float(value)
    except (TypeError, ValueError):
        number = np.nan
    if not 0 < number < np.inf:
        raise ModelError(name, quoted(value), "a number above 0")
    return number


def _direction(axis):
    """The axis as three numbers of length 1."""
    try:
        vector = np.array(axis.split(",") if isinstance(axis, str) else axis, dtype=np.float64)
    except (TypeError, ValueError):
        vector = np.zeros(0)
    length = np.linalg.norm(vector) if vector.shape == (3,) else 0.0
    if not 1e-9 < length < 1e9:
        raise ModelError("axis", quoted(axis), "three numbers i,j,k that give a direction, such as 0,0,-1")
    return tuple((vector / length).tolist())
