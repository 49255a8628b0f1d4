"""Units, frames and orders: stated once, kept everywhere.

Units.   Inside: metre, second, radian, kilogram, newton, newton metre; bare names mean these. Where numbers cross a
         door (files, report keys, widget labels, command line) the unit is in the name: `x_mm`, `speed_mm_s`.
Frames.  world; base (of the arm); flange (where the tool is bolted, the mechanical interface of ISO 9787); tool; part.
         `pose_base_tool` is the pose of tool seen from base: it takes coordinates in tool to coordinates in base, so in a
         product neighbouring frames meet: `pose_part_base @ pose_base_tool`. The tool's +Z points out of the tool,
         towards the work. `rpy` are rotations about the fixed X, then Y, then Z axes: R = Rz Ry Rx.
Orders.  Twists and Jacobians: linear rows first, then angular. Quaternions are (w, x, y, z), `_wxyz` in the name.
Shapes.  Time is the first axis, coordinates the last.
Mixed units.  A measure that puts metres and radians in one number names its characteristic length.
Arrays are values.  Models keep read-only float64 arrays; no function changes its input.
"""

import numpy as np

MM = 1e-3
INCH = 0.0254
DEG = np.pi / 180.0

MAX_JOINTS = 12

UNIT_TOLERANCE = 1e-3
"""How far a given unit vector or quaternion may be from length 1 (rounded columns) before it is refused."""

SHORTEST_STEP = 1e-9
"""Least time between two samples, s: far below any controller's clock, and no rate overflows above it."""

LATEST = 1e10
"""Largest time of a path, s: enough for a clock that counts from 1970."""

FARTHEST = 1e4
"""Largest coordinate of anything given, m: what lies beyond is a mistake in the unit."""

LONG = 50_000
"""Samples from which work may take longer than a second, so that somebody says what goes on."""

CAUTIONS = (
    "This is not a risk assessment and does not replace one.",
    "Run the programme first at reduced speed, at most 250 mm/s at the tool centre point in manual reduced-speed mode "
    "(ISO 10218-1 practice), with the usual safeguards in place.",
    "Local codes and the qualified welding procedure prevail over anything said here.",
    "Not judged: the controller's own interpolation where it is not the motion stated between samples, servo lag, cables and hoses, collisions.",
    "Joint limits, frames and tool dimensions are taken as given; they were not checked against the real cell.",
)


def frozen(values, dtype=np.float64) -> np.ndarray:
    """A read-only, C-ordered copy of `values`."""
    array = np.array(values, dtype=dtype, order="C")
    array.flags.writeable = False
    return array


def owned(array) -> np.ndarray:
    """`array` itself, read-only from here on: for arrays that nobody else holds, so that millions of rows need no copy."""
    array.flags.writeable = False
    return array
