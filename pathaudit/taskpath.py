"""The task path: the tool poses over time, in the part frame.

`path_from` takes columns that lie in memory; `reading.timed_csv` takes a file. Both end in `assemble`, the one place where
the column names of a timed path get their meaning.
"""

import hashlib
import re
from collections.abc import Callable
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from .conventions import FARTHEST, INCH, LATEST, SHORTEST_STEP, UNIT_TOLERANCE, owned
from .errors import ReadError, first_repeated, quoted
from .kernels import rotations

TIME = {"t_s": lambda v: v, "t_ms": lambda v: v / 1000.0}
LENGTH = {"mm": lambda v: v / 1000.0, "m": lambda v: v, "in": lambda v: v * INCH}
ANGLE = {"deg": np.deg2rad, "rad": lambda v: v}
QUATERNION = ("qw", "qx", "qy", "qz")
AXIS = ("i", "j", "k")
MEANING = frozenset(
    [*TIME, *QUATERNION, *AXIS, "process", "label"]
    + [f"{c}_{unit}" for c in "xyz" for unit in LENGTH]
    + [f"r{c}_{unit}" for c in "xyz" for unit in ANGLE]
)
"""Every column name that this module understands; all others are handed through."""

BLOCK = 1 << 15  # rows worked on at once: what is formed on the way stays in the processor's cache

ORIENTATIONS = "qw,qx,qy,qz or rx_deg,ry_deg,rz_deg (or _rad) or i,j,k"


@dataclass(frozen=True, eq=False)
class Path:
    """Tool poses over time in the part frame: N samples, SI units, read-only arrays.

    time (N,) s, strictly increasing.  position (N, 3) m, the tool centre point.
    rotation (N, 3, 3): columns are the tool axes in the part frame.
    spin_free: only the tool axis was given; `rotation` is then a frame with that +Z, carried along by the least turns.
    process (N,) bool: the process runs (all True where nothing was said).  label: N texts, '' where none.
    columns, cells: the source's header and, for each column, its N values as given (raw text for a file), to hand through.
    file, sha256: the source and the hash of its bytes.
    source_line (N,) int: for each sample the line of the file that it comes from; None where the source has no lines to name.
    made: plain sentences on how the samples came about (sampled, repaired, assumed); empty where they are the file's own.
    """

    time: np.ndarray
    position: np.ndarray
    rotation: np.ndarray
    spin_free: bool
    process: np.ndarray
    label: tuple
    columns: tuple
    cells: tuple
    file: str
    sha256: str
    source_line: np.ndarray | None = None
    made: tuple = ()

    @property
    def samples(self) -> int:
        return len(self.time)

    @property
    def duration(self) -> float:
        """s"""
        return float(self.time[-1] - self.time[0])

    @cached_property
    def distance(self) -> np.ndarray:
        """(N,) m, cumulated along the straight lines between the positions."""
        steps = np.linalg.norm(np.diff(self.position, axis=0), axis=1)
        return owned(np.concatenate([[0.0], np.cumsum(steps)]))

    @property
    def length(self) -> float:
        """m"""
        return float(self.distance[-1])


def path_from(columns, *, name: str = "arrays") -> Path:
    """A path from a mapping or a DataFrame whose keys are the column names of a timed path.

    >>> path = path_from({"t_s": [0, 1], "x_mm": [0, 50], "y_mm": [0, 0], "z_mm": [0, 0], "i": [0, 0], "j": [0, 0], "k": [-1, -1]})
    >>> path.duration, path.length, path.spin_free
    (1.0, 0.05, True)

    `name` stands where errors name a file. Raises ReadError.
    """
    header = tuple(str(key) for key in columns.keys())
    twice = first_repeated(header)
    if twice is not None:
        raise ReadError(name, f"column {twice}", "the column twice", "each column once")
    values = {str(key): _column_array(name, str(key), columns[key]) for key in columns.keys()}
    lengths = {len(array) for array in values.values()}
    if len(lengths) > 1:
        raise ReadError(name, "", f"columns of {min(lengths)} and {max(lengths)} values", "the same number of values in every column")
    return assemble(
        header, tuple(values.values()), lambda column: _numbers(name, column, values[column]),
        name=name, sha256=_hash(values), place=lambda row: f"row {row + 1}",
    )  # fmt: skip


def _column_array(name, column, values):
    try:
        array = np.array(values)
    except ValueError:
        raise ReadError(name, f"column {column}", "values of different shapes", "one number a sample") from None
    if array.ndim != 1:
        raise ReadError(name, f"column {column}", f"an array of shape {array.shape}", "one number a sample")
    array.flags.writeable = False
    return array


def _numbers(name, column, array):
    """(N,) float64; texts are read as Python reads them."""
    if array.dtype.kind in "biuf":
        return array.astype(np.float64)
    if array.dtype.kind in "OU":
        try:
            return array.astype(np.float64)
        except (TypeError, ValueError, OverflowError):
            row = next(row for row, value in enumerate(array) if not _is_number(value))
            mend = " (write a point in place of the decimal comma)" if _is_number(str(array[row]).replace(",", ".")) else ""
            raise ReadError(name, f"row {row + 1}, column {column}", _shown(array[row]), f"a number{mend}") from None
    raise ReadError(name, f"column {column}", f"values of type {array.dtype}", "numbers")


def _is_number(value):
    try:
        float(value)
    except (TypeError, ValueError, OverflowError):
        return False
    return True


def _shown(value):
    return quoted(value) if isinstance(value, str) else f"{quoted(value)[1:-1]} ({type(value).__name__})"


def _hash(values):
    digest = hashlib.sha256()
    for column, array in values.items():
        digest.update(repr((column, array.dtype.str)).encode())
        digest.update("\0".join(map(str, array)).encode() if array.dtype == object else array.tobytes())
    return digest.hexdigest()


def assemble(header, cells, numbers, *, name, sha256, place, label=None, lines=None, made=()) -> Path:
    """Build a Path from named columns.

    header, cells: the column names and, for each, its values as given.
    numbers(column) -> (N,) float64, or a list of such arrays that follow each other; raises ReadError.
    place(row) -> words that name a row for the user.
    label: the texts of the column of that name, where they are at hand already.  lines, made: the path's `source_line` and `made`.
    All is formed in blocks of rows: a path of millions of samples needs little more memory than it keeps.
    """
    source = _Source(header, numbers, name, place)
    time = np.concatenate(source.quantity("time", TIME))
    position = np.empty((len(time), 3))
    for k, c in enumerate("xyz"):
        np.concatenate(source.quantity(f"the tool centre point's {c}", _units(c, LENGTH)), out=position[:, k])
    if len(time) < 2:
        raise ReadError(name, "", f"{len(time)} sample" + "s" * (len(time) != 1), "at least 2 samples")
    _check_time(source, time)
    _check_position(source, position)
    rotation, spin_free = _rotation(source, len(time))
    process = _process(source, len(time))
    if label is None:
        label = map(str, cells[header.index("label")]) if "label" in header else ("",) * len(time)
    lines = None if lines is None else owned(lines)
    columns = tuple(header), tuple(cells)
    return Path(owned(time), owned(position), owned(rotation), spin_free, owned(process), tuple(label), *columns, str(name), sha256, lines, tuple(made))


@dataclass(frozen=True)
class _Source:
    """The named columns of one source and the words for its places. A column comes in blocks of rows, the same for every column."""

    header: tuple
    numbers: Callable
    name: str
    place: Callable

    def error(self, row, found, expected):
        return ReadError(self.name, self.place(int(row)), found, expected)

    def column(self, column):
        values = self.numbers(column)
        pieces = [values] if isinstance(values, np.ndarray) else values
        blocks = [piece[at : at + BLOCK] for piece in pieces for at in range(0, len(piece) or 1, BLOCK)]
        for start, block in _numbered(blocks):
            bad = ~np.isfinite(block)
            if bad.any():
                row = int(np.argmax(bad))
                raise ReadError(self.name, f"{self.place(start + row)}, column {column}", f"{block[row]}", "a finite number")
        return blocks

    def quantity(self, title, units):
        """The column that gives one quantity, converted; `units` maps column names to conversions."""
        given = [column for column in units if column in self.header]
        if len(given) > 1:
            raise ReadError(self.name, "header", f"both {given[0]} and {given[1]}", f"{title} once")
        if not given:
            raise ReadError(self.name, "header", self._missing(units), f"{title} as {_either(units)}")
        return [units[given[0]](block) for block in self.column(given[0])]

    def _missing(self, wanted):
        """What to say was found where none of the `wanted` columns is there: a column that looks like a try at one."""
        stem = next(iter(wanted)).split("_")[0]
        names = {stem, "time"} if stem == "t" else {stem}
        near = [c for c in self.header if c not in MEANING and re.match("[a-z]*", c.lower())[0] in names]
        if near:
            return f"a column {quoted(near[0])}" + (" without a unit" if near[0].lower() in names else "")
        return f"the columns {quoted(', '.join(self.header))}"


def _numbered(blocks):
    """(first row, block) of blocks of rows that follow each other."""
    start = 0
    for block in blocks:
        yield start, block
        start += len(block)


def _units(name, units):
    return {f"{name}_{unit}": convert for unit, convert in units.items()}


def _either(names):
    *first, last = names
    return f"{', '.join(first)} or {last}" if first else last


def _check_time(source, time):
    far = ~(np.abs(time) <= LATEST)
    if far.any():
        row = int(np.argmax(far))
        raise source.error(row, f"time {time[row]:g} s", f"times within {LATEST:g} s (check the unit of the column)")
    late = ~(np.diff(time) >= SHORTEST_STEP)
    if late.any():
        row = int(np.argmax(late)) + 1
        raise source.error(row, f"time {time[row]:.9g} s after {time[row - 1]:.9g} s in {source.place(row - 1)}", "times that strictly increase (a recorded log is repaired when it is read as format recorded)")


def _check_position(source, position):
    for start in range(0, len(position), BLOCK):
        far = ~(np.abs(position[start : start + BLOCK]) <= FARTHEST)
        if far.any():
            row, c = np.argwhere(far)[0] + (start, 0)
            raise source.error(row, f"a tool centre point at {position[row, c]:g} m", f"coordinates within {FARTHEST:g} m (check the unit of the column)")


def _process(source, samples):
    if "process" not in source.header:
        return np.ones(samples, dtype=bool)
    process = np.concatenate(source.column("process"))
    wrong = (process != 0) & (process != 1)
    if wrong.any():
        row = int(np.argmax(wrong))
        raise source.error(row, f"process = {process[row]:g}", "1 while the process runs or 0 on an air move")
    return process != 0


def _rotation(source, samples):
    """(N, 3, 3) and whether the spin about the tool axis is free, from the one orientation form that the source has."""
    angles = [_units(f"r{c}", ANGLE) for c in "xyz"]
    groups = {"quaternion": [{c: None} for c in QUATERNION], "angles": angles, "axis": [{c: None} for c in AXIS]}
    there = {form: [any(c in source.header for c in names) for names in group] for form, group in groups.items()}
    whole = [form for form, found in there.items() if all(found)]
    if len(whole) > 1:
        columns = [c for form in whole for names in groups[form] for c in names if c in source.header]
        raise ReadError(source.name, "header", f"two forms of the orientation ({', '.join(columns)})", f"exactly one of {ORIENTATIONS}")
    if not whole:
        raise _no_orientation(source, groups, there)
    rotation = np.empty((samples, 3, 3))
    if whole == ["angles"]:
        columns = [source.quantity(f"the turn about {c.upper()}", names) for c, names in zip("xyz", angles)]
        _in_blocks(lambda start, *rpy: _put(rotation, start, rotations.matrix_from_rpy(np.stack(rpy, axis=-1))), columns)
    elif whole == ["quaternion"]:
        columns = [source.column(c) for c in QUATERNION]
        _in_blocks(lambda start, *q: _frames_from_wxyz(_unit(source, start, q, QUATERNION, "a quaternion"), rotation[start : start + len(q[0])]), columns)
    else:
        start = 0
        for axis in zip(*(source.column(c) for c in AXIS)):
            axes = np.stack(_unit(source, start, axis, AXIS, "a tool axis"), axis=-1)
            start = _put(rotation, start, _carried_on(axes, rotation[start - 1] if start else None))
    return rotation, whole == ["axis"]


def _put(out, start, values):
    """Write rows from `start` on; returns the row after them."""
    out[start : start + len(values)] = values
    return start + len(values)


def _in_blocks(work, columns):
    """work(first row, one block a column) for each block of rows; many blocks are shared by two threads."""
    jobs = [(start, blocks) for (start, _), blocks in zip(_numbered(columns[0]), zip(*columns))]
    if len(jobs) < 8:
        for start, blocks in jobs:
            work(start, *blocks)
        return
    with ThreadPoolExecutor(2) as pool:
        list(pool.map(lambda job: work(job[0], *job[1]), jobs))


def _unit(source, start, vectors, columns, title):
    """One block of vectors, an array a component, with length 1: what is within the tolerance of 1 is scaled to it."""
    with np.errstate(over="ignore"):
        length = np.sqrt(sum(value * value for value in vectors))
    bad = ~(np.abs(length - 1.0) <= UNIT_TOLERANCE)
    if bad.any():
        row = int(np.argmax(bad))
        raise source.error(start + row, f"{title} of length {length[row]:.6g} ({', '.join(columns)})", "length 1")
    return [value / length for value in vectors]


def _frames_from_wxyz(wxyz, out):
    """`rotations.matrix_from_wxyz`, written entry by entry into `out`: several times as fast on long paths."""
    w, x, y, z = wxyz
    xx, yy, zz, xy, xz, yz, wx, wy, wz = x * x, y * y, z * z, x * y, x * z, y * z, w * x, w * y, w * z
    rows = ((1 - 2 * (yy + zz), 2 * (xy - wz), 2 * (xz + wy)), (2 * (xy + wz), 1 - 2 * (xx + zz), 2 * (yz - wx)), (2 * (xz - wy), 2 * (yz + wx), 1 - 2 * (xx + yy)))
    for i, row in enumerate(rows):
        for j, entry in enumerate(row):
            out[:, i, j] = entry


def _carried_on(axes, before):
    """Frames on the axes (M, 3), each reached from the one before by the least turn; the first from the frame `before`.

    The least turn does not depend on the spin: frames carried from any first frame differ from these by one spin about their +Z.
    """
    if before is None:
        return rotations.carry_frames(axes)
    frames = rotations.carry_frames(np.concatenate([before[None, :, 2], axes]))
    c, s = frames[0, :, :2].T @ before[:, 0]
    size = np.hypot(c, s)
    c, s = c / size, s / size
    return frames[1:] @ np.array([[c, -s, 0.0], [s, c, 0.0], [0.0, 0.0, 1.0]])


def _no_orientation(source, groups, there):
    for form, found in there.items():
        if any(found):
            missing = [_either(names) for names, ok in zip(groups[form], found) if not ok]
            return ReadError(source.name, "header", f"an orientation without {', '.join(missing)}", f"all of one form: {ORIENTATIONS}")
    near = [c for c in source.header if c.lower() in ("rx", "ry", "rz", "roll", "pitch", "yaw", "a", "b", "c")]
    found = f"a column {quoted(near[0])} without a unit or a known meaning" if near else "no orientation"
    return ReadError(source.name, "header", found, ORIENTATIONS)
