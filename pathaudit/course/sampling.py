"""A course as a timed path: rounded, timed, and sampled by stated tolerances."""

import numpy as np

from ..conventions import DEG, MM, frozen
from ..errors import ReadError
from ..kernels.rotations import matrix_from_wxyz
from ..taskpath import AXIS, QUATERNION, Path, assemble
from .corners import SMOOTH, Corner, round_corners
from .moves import Course
from .pieces import cut
from .shapes import CURVE, STILL
from .timing import Ceilings, phases

RAMP = 4  # samples at least in a rise or fall of the speed on a line or an arc
SHORTEST = 1e-7  # s: a phase below this gets no sample of its own
MOST, MOST_A_MOVE = 250_000, 40
"""Samples, and samples more for each move: more than an hour and a half at the default step. A short file with a slip in a number must not fill the memory."""
BLOCK = 1 << 14  # samples


def timed(
    course: Course, *, speed=None, acceleration=None, turn_speed=None, turn_acceleration=None,
    corner=Corner(), chord=0.01 * MM, angle=1.0 * DEG, step=0.025,
) -> Path:  # fmt: skip
    """The course as a timed path.

    speed m/s, acceleration m/s2: ceilings of the tool centre point, the latter together with what a bend needs. turn_speed rad/s, turn_acceleration
    rad/s2: ceilings of the tool's turning. corner: how corners are passed that say nothing themselves. Samples: the path leaves the straight line
    between two by at most `chord` m, the tool turns between two by at most `angle` rad, and they are at most `step` s apart.
    Raises ReadError where a ceiling is missing that the course needs.
    """
    ceilings = _ceilings(course, speed, acceleration, turn_speed, turn_acceleration)
    programmed = np.where(np.isnan(course.speed), ceilings.speed, course.speed)
    rounded = round_corners(course, corner, np.minimum(programmed, ceilings.speed), ceilings.acceleration)
    pieces = cut(course, rounded, programmed)
    passed = phases(pieces, ceilings)
    time, piece, s = _samples(course, pieces, passed, chord, angle, step)
    position, quaternion = _poses(pieces, piece, s)
    move = pieces.move[piece]
    process = ~course.air[move]
    process[:-1] |= process[1:]  # the sample at a join belongs to the process that begins there
    made = (*course.notes, *_made(course, corner, ceilings, rounded, passed, chord, angle, step))
    return _path(course, time, position, quaternion, process, move, course.line[move], made)


def _ceilings(course, speed, acceleration, turn_speed, turn_acceleration):
    """The ceilings, after asking for what is missing and refusing what is no ceiling."""
    given = {"speed_mm_s (--speed)": speed, "acceleration_mm_s2 (--acceleration)": acceleration, "turn_speed_deg_s (--turn-speed)": turn_speed,
             "turn_acceleration_deg_s2 (--turn-acceleration)": turn_acceleration}  # fmt: skip
    for name, value in given.items():
        if value is not None and not 1e-9 <= value <= 1e9:
            raise ReadError(course.file, "", f"a ceiling {name} of {value:g} in SI units", "a number above 0 that a tool can reach")
    if acceleration is None:
        raise ReadError(course.file, "", "moves without times", "the ceiling acceleration_mm_s2 (--acceleration) of the tool, to time them")
    moving, turns = course.kind != STILL, (course.kind == STILL) & (course.dwell == 0.0)
    _ask(course, moving & np.isnan(course.speed), speed is None, "a move without a speed", "the ceiling speed_mm_s (--speed) of the tool, for moves that state none")
    _ask(course, turns, turn_speed is None, "a tool that turns in place", "the ceiling turn_speed_deg_s (--turn-speed)")
    _ask(course, turns, turn_acceleration is None, "a tool that turns in place", "the ceiling turn_acceleration_deg_s2 (--turn-acceleration)")
    return Ceilings(*(np.inf if value is None else float(value) for value in (speed, acceleration, turn_speed, turn_acceleration)))


def _ask(course, needed, missing, found, expected):
    if missing and needed.any():
        raise ReadError(course.file, f"line {course.line[np.argmax(needed)]}", found, expected)


def _samples(course, pieces, passed, chord, angle, step):
    """Time (N,) s, piece (N,) and arc length into it (N,) of each sample."""
    piece, duration = passed.piece, passed.duration
    fastest = np.maximum(passed.speed, passed.speed + passed.rate * duration)
    travel = fastest * duration
    still = pieces.kind[piece] == STILL
    with np.errstate(divide="ignore", invalid="ignore"):
        bend, turning = np.where(still, 0.0, pieces.curvature[piece]), np.where(still, 1.0, pieces.turning[piece])
        wanted = np.maximum(duration / step, np.maximum(travel * np.sqrt(bend / (8.0 * chord)), travel * turning / angle))
    ramp = (passed.rate != 0.0) & (pieces.kind[piece] != CURVE)
    count = np.maximum(np.ceil(wanted - 1e-9), np.where(ramp, RAMP, 1.0))
    count[duration < SHORTEST] = 0.0
    most = MOST + MOST_A_MOVE * course.moves
    if not count.sum() + 1 <= most:
        raise ReadError(course.file, "", f"a path of {count.sum():.3g} samples", f"at most {most:,} from {_many(course.moves, 'move')}: a faster path, or larger chord_mm (--chord), angle_deg (--angle) or step_s (--step)")
    count = count.astype(np.int64)
    if not count.any():
        raise ReadError(course.file, "", "a path that takes no time", "at least one move from a point to another")
    owner = np.repeat(np.arange(len(count)), count)
    within = np.arange(len(owner)) - np.repeat(np.cumsum(count) - count, count) + 1
    local = duration[owner] * (within / count[owner])
    before = np.cumsum(duration) - duration
    s = np.clip(passed.start[owner] + local * (passed.speed[owner] + 0.5 * passed.rate[owner] * local), 0.0, pieces.length[piece[owner]])
    first = piece[owner[0]]
    return np.concatenate([[0.0], before[owner] + local]), np.concatenate([[first], piece[owner]]), np.concatenate([[0.0], s])


def _poses(pieces, piece, s):
    """Positions (N, 3) and quaternions (N, 4), in blocks that stay in the cache."""
    position, quaternion = np.empty((len(s), 3)), np.empty((len(s), 4))
    for first in range(0, len(s), BLOCK):
        some = slice(first, first + BLOCK)
        position[some], quaternion[some] = pieces.pose(piece[some], s[some])
    return position, quaternion


def _path(course, time, position, quaternion, process, move, line, made):
    """The Path, with the columns of a timed CSV so that all that a path read from one can do works."""
    columns = {"t_s": time} | {f"{c}_mm": position[:, k] / MM for k, c in enumerate("xyz")}
    if course.spin_free:
        axis = matrix_from_wxyz(quaternion)[:, :, 2]
        columns |= {c: axis[:, k] for k, c in enumerate(AXIS)}
    else:
        columns |= {c: quaternion[:, k] for k, c in enumerate(QUATERNION)}
    columns["process"] = process
    if any(course.label):
        columns["label"] = np.array(course.label)[move]
    columns["line"] = line
    cells = {name: frozen(values, values.dtype) for name, values in columns.items()}
    return assemble(
        tuple(cells), tuple(cells.values()), lambda name: cells[name].astype(np.float64),
        name=course.file, sha256=course.sha256, place=lambda row: f"line {line[row]}", lines=line, made=made,
    )  # fmt: skip


def _made(course, corner, ceilings, rounded, passed, chord, angle, step):
    """How the samples came about, in sentences."""
    said = [f"Timed with at most {ceilings.acceleration / MM:.6g} mm/s2 of the tool" + _at_most(ceilings.speed / MM, "mm/s")
            + _at_most(ceilings.turn_speed / DEG, "deg/s") + _at_most(ceilings.turn_acceleration / DEG, "deg/s2") + "."]  # fmt: skip
    over = ~np.isnan(course.speed) & (course.speed > ceilings.speed)
    if over.any():
        said.append(f"{_many(over.sum(), 'move')} faster than that in the file, first in line {course.line[np.argmax(over)]}, slowed to it.")
    said.append(
        f"Sampled so that the path leaves the straight line between two samples by at most {chord / MM:.4g} mm, the tool turns between them by at most "
        f"{angle / DEG:.4g} deg, and they are at most {step:.4g} s apart."
    )
    kinks = int((~rounded.smooth).sum()) - len(rounded.at)
    passed_by = rounded.smooth & (rounded.bend > 1e-6)
    said += _rounded(course, corner, rounded)
    stops = kinks - int(((course.kind[:-1] == STILL) | (course.kind[1:] == STILL)).sum())
    if stops:
        said.append(f"The tool stops exactly in {_many(stops, 'corner')}.")
    if passed_by.any():
        said.append(f"{_many(passed_by.sum(), 'join')} that bend by up to {rounded.bend[passed_by].max() / DEG:.2g} deg (allowed {SMOOTH / DEG:.1g}) passed without a stop.")
    return said


def _rounded(course, corner, rounded):
    if not len(rounded.at):
        return
    worst = int(np.argmax(rounded.deviation))
    line = course.line[rounded.at[worst]]
    yield (f"{_many(len(rounded.at), 'corner')} rounded ({corner if np.isnan(course.zone[rounded.at]).any() else 'as the file says'}); the commanded path passes "
           f"a corner by at most {rounded.deviation[worst] / MM:.4g} mm (round-off, after line {line}).")  # fmt: skip
    short = int((rounded.used < rounded.asked * (1.0 - 1e-9)).sum())
    if short:
        yield f"{_many(short, 'rounding')} smaller than asked for, because the moves beside the corner are short."


def _at_most(value, unit):
    return f", {value:.6g} {unit}" if np.isfinite(value) else ""


def _many(number, noun):
    return f"{int(number):,} {noun}" + "s" * (int(number) != 1)
