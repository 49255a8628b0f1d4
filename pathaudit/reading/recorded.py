"""A path that was recorded on the line: time-stamped, noisy, uneven, with repeats and drop-outs. What is wrong is repaired by stated rules
and every repair is told: how often, where first, and the largest change in mm, degrees and ms. Nothing else is altered; smoothing is done
only where it is asked for.

The rows come from a timed CSV, JSON lines, Parquet or Feather with the columns of a timed path.
"""

from typing import NamedTuple

import numpy as np

from ..conventions import DEG, MM, UNIT_TOLERANCE
from ..errors import ReadError, quoted
from ..kernels import rotations
from ..runs import runs
from ..taskpath import ANGLE, AXIS, LENGTH, QUATERNION, TIME, Path, assemble
from .csv_table import NUMERIC, Table, is_number, not_a_number
from .json_lines import json_columns
from .smoothing import HALF, MOST, dwells, noise, smoothed
from .sniffing import sniff
from .tables import table_columns

MOST_ROWS = 500_000
NOTHING = {"", "nan", "na", "n/a", "null", "none", "-", "--"}
"""What stands in a cell of a row that was dropped by the recorder."""

LATE = 1.0  # s; a row may come so much too late
GAP = 2.5  # usual intervals; a longer one is a drop-out
FILLED = 20  # usual intervals; a longer drop-out is not filled
REST = 0.1 * MM, 0.1 * DEG
"""A tool that moved less over a drop-out rested."""
STALE = 5  # rows that may repeat a pose while the tool moves
SPIKE, SPIKE_NOISE, SPIKE_LEAST = 5, 10, (1.0 * MM, 1.0 * DEG)
"""A sample that is off its neighbours by more than so many steps around it, so many times the noise and so much is a spike."""
LONGEST_SPIKE = 3  # samples; one alone is mended, more are told
UNIT = 0.05  # how far from length 1 an orientation may be
TURN = 90 * DEG  # the most that a filled drop-out may turn


def read_recorded(data: bytes, name, sha256: str, options) -> Path:
    """The repaired path in the bytes of a file; `name` stands in messages. Raises ReadError."""
    table = _table(data, name)
    if len(table.cells[0]) > MOST_ROWS:
        raise ReadError(name, "", f"{len(table.cells[0]):,} rows", f"at most {MOST_ROWS:,} of a recorded path: cut the log")
    said = []
    log = _Log.of(name, table, said)
    for mend in (_dropped_rows, _late_rows, _equal_stamps, _spikes, _stale_poses, _drop_outs):
        log = mend(log, said)
    if len(log.time) < 2:
        raise ReadError(name, "", f"{len(log.time)} usable samples", "at least 2 samples")
    said.append(_intervals(log))
    if options.smooth_ms:
        log = _smooth(log, options.smooth_ms / 1000.0, said)
    rows = len(table.cells[0])
    head = f"Recorded: {rows:,} rows became {len(log.time):,} samples" + ("." if len(said) > 1 else "; nothing was wrong and nothing was changed.")
    return log.path(sha256, [head, *said])


def _table(data, name):
    kind = sniff(name, data)
    if kind in ("parquet", "feather"):
        return table_columns(data, name, kind)
    if kind == "json-lines":
        return json_columns(data, name)
    return Table(name, data, "a recorded path as CSV text", whole=True)


class _Log(NamedTuple):
    """The rows that are left, in SI units; pose is (N, 7), position and quaternion, or (N, 6), position and axis. kept: the row of the source
    that each comes from; own: whether its orientation is that row's own, and clock: whether its time is."""

    name: str
    table: object
    time: np.ndarray
    pose: np.ndarray
    kept: np.ndarray
    own: np.ndarray
    clock: np.ndarray

    @classmethod
    def of(cls, name, table, said):
        time = _quantity(name, table, "time", TIME)
        position = [_quantity(name, table, f"the tool centre point's {c}", {f"{c}_{unit}": convert for unit, convert in LENGTH.items()}) for c in "xyz"]
        vectors, scaled = _orientation(name, table, said)
        return cls(name, table, time, np.column_stack([*position, vectors]), np.arange(len(time)), ~scaled, np.ones(len(time), bool))

    def rows(self, which):
        return self._replace(**{field: getattr(self, field)[which] for field in ("time", "pose", "kept", "own", "clock")})

    def place(self, k):
        return self.table.place(int(self.kept[k]))

    def error(self, k, found, expected):
        return ReadError(self.name, self.place(k), found, expected)

    def path(self, sha256, made):
        """The Path: values that were not altered are those of the source, to the last bit."""
        numbers = {name: self._column(name) for name in self.table.header if name in NUMERIC}
        cells = [self._cells(name, numbers) for name in self.table.header]
        lines = None if self.table.lines is None else self.table.lines[self.kept]
        return assemble(
            self.table.header, cells, numbers.__getitem__, name=self.name, sha256=sha256, place=self.place, lines=lines, made=tuple(made)
        )  # fmt: skip

    def _column(self, name):
        """The numbers of a known column, in the source's unit."""
        given = _numbers(self.name, self.table, name)[self.kept]
        if name == "process":
            return given
        made = self._made(name)
        if name[0] in "xyz" and name[1] == "_":
            own = LENGTH[name[2:]](given) == self.pose[:, "xyz".index(name[0])]
        else:
            own = self.clock if name in TIME else self.own
        return given if made is None else np.where(own, given, made)

    def _made(self, name):
        if name in TIME:
            return self.time * (1000.0 if name == "t_ms" else 1.0)
        if name[0] in "xyz" and name[1] == "_":
            return self.pose[:, "xyz".index(name[0])] / LENGTH[name[2:]](1.0)
        if name in (*QUATERNION, *AXIS):
            return self.pose[:, 3 + (QUATERNION if name in QUATERNION else AXIS).index(name)]
        if self.own.all():
            return None
        return rotations.rpy_from_matrix(rotations.matrix_from_wxyz(self.pose[:, 3:]))[:, "xyz".index(name[1])] / ANGLE[name[3:]](1.0)

    def _cells(self, name, numbers):
        if name in numbers:
            return numbers[name]
        values = list(self.table.cells[self.table.header.index(name)])
        return tuple(values[row] for row in self.kept)


def leaves_out(column, found) -> bool:
    """Whether a row goes here for what another reader refuses: its words for what it found in that column."""
    return column in NUMERIC - {"process"} and (found in ("an empty cell", "no value") or found.strip("'").strip().lower() in NOTHING - {""})


def _numbers(name, table, column):
    """(N,) float64 of a column; NaN where the recorder has nothing."""
    cells = table.cells[table.header.index(column)]
    values = np.empty(len(cells))
    for row, cell in enumerate(cells):
        if isinstance(cell, (int, float)):
            values[row] = cell
        elif cell is None or isinstance(cell, str) and cell.strip().lower() in NOTHING:
            values[row] = np.nan
        elif isinstance(cell, str) and is_number(cell):
            values[row] = float(cell)
        else:
            words = not_a_number(cell) if isinstance(cell, str) else (quoted(cell), "a number")
            raise ReadError(name, f"{table.place(row)}, column {column}", *words)
    return values


def _quantity(name, table, title, units):
    given = [column for column in units if column in table.header]
    if len(given) != 1:
        found = f"both {given[0]} and {given[1]}" if given else f"the columns {quoted(', '.join(table.header))}"
        raise ReadError(name, "header", found, f"{title} once, as {' or '.join(units)}")
    return units[given[0]](_numbers(name, table, given[0]))


def _orientation(name, table, said):
    """(N, 4) quaternions with neighbouring signs, or (N, 3) axes; of length 1, or NaN where the recorder has nothing. And which were scaled (N,)."""
    forms = [form for form in (QUATERNION, AXIS) if all(c in table.header for c in form)]
    angles = [c for c in table.header if c[:2] in ("rx", "ry", "rz") and c in NUMERIC]
    if len(forms) + bool(angles) != 1:
        raise ReadError(name, "header", f"the columns {quoted(', '.join(table.header))}", "exactly one of qw,qx,qy,qz or rx_deg,ry_deg,rz_deg (or _rad) or i,j,k")
    if angles:
        rpy = [_quantity(name, table, f"the turn about {c.upper()}", {f"r{c}_{unit}": convert for unit, convert in ANGLE.items()}) for c in "xyz"]
        lost = np.isnan(rpy).any(axis=0)
        vectors = rotations.wxyz_from_matrix(rotations.matrix_from_rpy(np.where(lost, 0.0, np.stack(rpy)).T))
        vectors[lost] = np.nan
        return _continuous(vectors), np.zeros(len(vectors), bool)
    vectors = np.column_stack([_numbers(name, table, c) for c in forms[0]])
    with np.errstate(over="ignore", invalid="ignore"):
        length = np.linalg.norm(vectors, axis=1)
    wrong = (np.abs(length - 1.0) > UNIT) & (length != 0.0)
    if wrong.any():
        row = int(np.argmax(wrong))
        raise ReadError(name, table.place(row), f"an orientation of length {length[row]:.6g} ({', '.join(forms[0])})", "length 1, or 0 where nothing was recorded")
    vectors[length == 0.0] = np.nan
    scaled = (np.abs(length - 1.0) > UNIT_TOLERANCE) & (length > 0.0)
    if scaled.any():
        said.append(f"{_times(int(scaled.sum()), 'orientation')} of length {length[scaled].min():.4g} to {length[scaled].max():.4g} scaled to 1, first in {table.place(int(np.argmax(scaled)))}.")
    with np.errstate(invalid="ignore", divide="ignore"):
        vectors = vectors / length[:, None]
    return (_continuous(vectors) if forms[0] == QUATERNION else vectors), scaled


def _continuous(wxyz):
    """Signs chosen so that each has a dot product >= 0 with the one before that is there."""
    there = ~np.isnan(wxyz).any(axis=1)
    wxyz[there] = rotations.continuous_wxyz(wxyz[there])
    return wxyz


def _apart(one, other):
    """Distance in m and turn in rad between poses (..., 6 or 7)."""
    cross = np.linalg.norm(one[..., 3:] - other[..., 3:], axis=-1)
    if one.shape[-1] == 7:  # a quaternion and its negative are one orientation
        cross = np.minimum(cross, np.linalg.norm(one[..., 3:] + other[..., 3:], axis=-1))
    half = 2.0 * np.arcsin(np.clip(cross / 2.0, 0.0, 1.0))
    return np.linalg.norm(one[..., :3] - other[..., :3], axis=-1), half * (2.0 if one.shape[-1] == 7 else 1.0)


def _times(count, what):
    return f"{count:,} {what}{'' if count == 1 else 's'}"


def _dropped_rows(log, said):
    """Rows in which a value is missing go."""
    with np.errstate(invalid="ignore"):
        lost = ~np.isfinite(log.time) | ~np.isfinite(log.pose).all(axis=1)
    if lost.any():
        said.append(f"{_times(int(lost.sum()), 'row')} without a whole time and pose left out, first in {log.place(int(np.argmax(lost)))}.")
    return log.rows(~lost)


def _late_rows(log, said):
    """Rows that come too late are put where their time says."""
    behind = np.maximum.accumulate(log.time) - log.time if len(log.time) else log.time
    if not (behind > 0).any():
        return log
    worst = int(np.argmax(behind))
    if behind[worst] > LATE:
        raise log.error(worst, f"a time {behind[worst]:.6g} s before an earlier row's", f"rows at most {LATE:g} s late (was the recorder started anew? cut the log there)")
    late = behind > 0
    said.append(f"{_times(int(late.sum()), 'row')} out of order put where the time says, first in {log.place(int(np.argmax(late)))}, by at most {1000 * behind[worst]:.4g} ms.")
    return log.rows(np.argsort(log.time, kind="stable"))


def _equal_stamps(log, said):
    """Of rows with one time, those with one pose become one; different poses are spread evenly up to the next time."""
    same = np.concatenate([[False], (np.diff(log.time) <= 0)]) if len(log.time) else np.zeros(0, bool)
    copies = same & np.concatenate([[False], (log.pose[1:] == log.pose[:-1]).all(axis=1)])[: len(same)]
    if copies.any():
        said.append(f"{_times(int(copies.sum()), 'row')} with the time and pose of the row before left out, first in {log.place(int(np.argmax(copies)))}.")
        log, same = log.rows(~copies), same[~copies]
    if not same.any():
        return log
    first = np.flatnonzero(~same)
    size = np.diff(np.append(first, len(same)))
    stamps = log.time[first]
    usual = float(np.median(np.diff(stamps))) if len(stamps) > 1 else 0.0
    if usual <= 0:
        raise log.error(0, "one time in all rows", "times that go on")
    room = np.minimum(np.append(np.diff(stamps), usual), usual)
    within = np.arange(len(same)) - np.repeat(first, size)
    time = np.repeat(stamps, size) + within * np.repeat(room / size, size)
    moved = within > 0
    said.append(f"{_times(int(moved.sum()), 'row')} with the time of the row before but another pose spread evenly, first in {log.place(int(np.argmax(moved)))}: "
                f"times changed by at most {1000 * np.abs(time - log.time).max():.4g} ms.")  # fmt: skip
    return log._replace(time=time, clock=log.clock & ~moved)


def _spikes(log, said):
    """One sample that leaves the path and is back with the next is put on the straight line between its neighbours; two or three are told and stay.

    It is off that line by more than SPIKE times the longest of the steps around it (the two beyond its neighbours, and that from neighbour to
    neighbour), SPIKE_NOISE times the log's noise and SPIKE_LEAST, in place or in orientation. A motion that did this would need, for one interval,
    many times the speed that it has before and after. What has another spike or an end of the log within two samples is not judged.
    """
    found = {size: _off_the_path(log, size) for size in range(1, LONGEST_SPIKE + 1)}
    first = np.flatnonzero(found[1][0])
    longer = [(k, found[size][1][k], found[size][2][k]) for size in range(2, LONGEST_SPIKE + 1) for k in np.flatnonzero(found[size][0])]
    if longer:
        said.append(f"{_times(len(longer), 'jump')} of two or three samples off the path and back left as {'it is' if len(longer) == 1 else 'they are'}, first in {log.place(min(longer)[0])}, "
                    f"by at most {max(jump[1] for jump in longer) / MM:.4g} mm and {max(jump[2] for jump in longer) / DEG:.4g} deg: look at the recording there.")  # fmt: skip
    if not len(first):
        return log
    pose = log.pose.copy()
    pose[first] = _mixed(log.pose[first - 1], log.pose[first + 1], _share(log.time[first - 1], log.time[first], log.time[first + 1]))
    length, turn = _apart(log.pose[first], pose[first])
    said.append(f"{_times(len(first), 'spike')} of one sample off the path put on the straight line between the samples before and after, first in {log.place(first[0])}: changed by at most "
                f"{length.max() / MM:.4g} mm and {turn.max() / DEG:.4g} deg.")  # fmt: skip
    if pose.shape[1] == 7:
        pose[:, 3:] = rotations.continuous_wxyz(pose[:, 3:])
    own = log.own.copy()
    own[first] = False
    return log._replace(pose=pose, own=own)


def _off_the_path(log, size):
    """Where (N,) a spike of so many samples begins; how far, m, and turned, rad, its farthest sample is off."""
    n = len(log.time)
    out = np.zeros(n, bool), np.zeros(n), np.zeros(n)
    if n < size + 4:
        return out
    before, after = np.arange(1, n - size - 2), np.arange(1, n - size - 2) + size + 1
    with np.errstate(over="ignore", invalid="ignore"):
        steps = [_apart(log.pose[before - 1], log.pose[before]), _apart(log.pose[after], log.pose[after + 1]), _apart(log.pose[before], log.pose[after])]
        rough = noise(log.pose[:, :3]), noise(log.pose[:, 3:]) * (2.0 if log.pose.shape[1] == 7 else 1.0)
        scale = (1.0, 1.0, 2.0 / (size + 1))  # from neighbour to neighbour it is size + 1 intervals
        limits = [np.maximum(SPIKE * np.max([part * step[k] for part, step in zip(scale, steps)], axis=0), max(SPIKE_NOISE * rough[k], SPIKE_LEAST[k])) for k in range(2)]
        off = np.array([_apart(log.pose[before + j], _mixed(log.pose[before], log.pose[after], _share(log.time[before], log.time[before + j], log.time[after]))) for j in range(1, size + 1)])
        out[0][before + 1] = (off > limits).all(axis=0).any(axis=0)
    out[1][before + 1], out[2][before + 1] = off.max(axis=0)
    return out


def _share(start, time, end):
    return ((time - start) / (end - start))[:, None]


def _stale_poses(log, said):
    """A pose that is repeated while the tool moves was not read anew: up to STALE such rows in a run go, where the step after them makes up for them."""
    if len(log.time) < 4:
        return log
    equal = np.concatenate([[False], (log.pose[1:] == log.pose[:-1]).all(axis=1)])
    stale = np.zeros(len(equal), bool)
    for start, last in runs(equal):  # these rows repeat row start - 1
        end = last + 1
        if end - start > STALE or start < 2 or end >= len(equal):
            continue
        before = _rate(log, start - 2, start - 1)
        over = _rate(log, start - 1, end)
        if 0.5 * before <= over <= 2.0 * before and before > 0:
            stale[start:end] = True
    if not stale.any():
        return log
    kept = log.rows(~stale)
    there = _between(kept, log.time[stale])
    length, turn = _apart(log.pose[stale], there)
    said.append(f"{_times(int(stale.sum()), 'row')} that repeat a pose while the tool moves left out, first in {log.place(int(np.argmax(stale)))}: the pose there changes by at most "
                f"{length.max() / MM:.4g} mm and {turn.max() / DEG:.4g} deg.")  # fmt: skip
    return kept


def _rate(log, a, b):
    return float(np.linalg.norm(log.pose[b, :3] - log.pose[a, :3]) / (log.time[b] - log.time[a]))


def _between(log, time):
    """Poses at times, on the straight line and at the constant turn between the samples around them."""
    k = np.clip(np.searchsorted(log.time, time, "right") - 1, 0, len(log.time) - 2)
    return _mixed(log.pose[k], log.pose[k + 1], _share(log.time[k], time, log.time[k + 1]))


def _mixed(a, b, share):
    """Poses at the given shares (M, 1) of the way from a to b (M, 6 or 7)."""
    if a.shape[1] == 7:
        b = np.where((np.arange(7) > 2) & (np.sum(a[:, 3:] * b[:, 3:], axis=1) < 0.0)[:, None], -b, b)
    angle = np.arccos(np.clip(np.sum(a[:, 3:] * b[:, 3:], axis=1), -1.0, 1.0))[:, None]
    with np.errstate(invalid="ignore", divide="ignore"):
        left, right = np.sin((1.0 - share) * angle) / np.sin(angle), np.sin(share * angle) / np.sin(angle)
    near = angle < 1e-6
    turned = np.where(near, 1.0 - share, left) * a[:, 3:] + np.where(near, share, right) * b[:, 3:]
    turned /= np.linalg.norm(turned, axis=1, keepdims=True)
    return np.column_stack([a[:, :3] + share * (b[:, :3] - a[:, :3]), turned])


def _drop_outs(log, said):
    """Short drop-outs are filled, long ones at rest stay, long ones in motion are refused."""
    if len(log.time) < 3:
        return log
    steps = np.diff(log.time)
    usual = float(np.median(steps))
    gaps = np.flatnonzero(steps > GAP * usual)
    if not len(gaps):
        return log
    length, turn = _apart(log.pose[gaps], log.pose[gaps + 1])
    rest = (length <= REST[0]) & (turn <= REST[1])
    if rest.any():
        said.append(f"{_times(int(rest.sum()), 'pause')} without rows while the tool rested, first after {log.place(gaps[rest][0])}, at most {1000 * steps[gaps[rest]].max():.4g} ms long: left as they are.")
    gaps, length, turn = gaps[~rest], length[~rest], turn[~rest]
    for k, moved, turned in zip(gaps, length, turn):
        if steps[k] > (FILLED + 0.5) * usual or turned > TURN:
            found = f"a drop-out of {1000 * steps[k]:.6g} ms in which the tool moved {moved / MM:.4g} mm and turned {turned / DEG:.4g} deg"
            raise log.error(k, found, f"drop-outs of at most {1000 * FILLED * usual:.4g} ms ({FILLED} usual intervals) and {TURN / DEG:g} deg while the tool moves (cut the log there)")
    if not len(gaps):
        return log
    count = np.rint(steps[gaps] / usual).astype(int) - 1
    owner = np.repeat(gaps, count)
    within = np.arange(len(owner)) - np.repeat(np.cumsum(count) - count, count) + 1
    time = log.time[owner] + steps[owner] * within / np.repeat(count + 1, count)
    said.append(f"{_times(len(gaps), 'drop-out')} filled with {_times(len(time), 'sample')} on the straight line, first after {log.place(gaps[0])}: the longest "
                f"{1000 * steps[gaps].max():.4g} ms, the farthest {length.max() / MM:.4g} mm and {turn.max() / DEG:.4g} deg.")  # fmt: skip
    whole = log._replace(
        time=np.concatenate([log.time, time]), pose=np.concatenate([log.pose, _between(log, time)]), kept=np.concatenate([log.kept, log.kept[owner]]),
        own=np.concatenate([log.own, np.zeros(len(time), bool)]), clock=np.concatenate([log.clock, np.zeros(len(time), bool)]),
    )  # fmt: skip
    return whole.rows(np.argsort(whole.time, kind="stable"))


def _intervals(log):
    steps = 1000.0 * np.diff(log.time)
    return f"Intervals between {steps.min():.4g} and {steps.max():.4g} ms, usually {np.median(steps):.4g} ms: left as they are."


def _smooth(log, width, said):
    usual = float(np.median(np.diff(log.time)))
    if not 3 * usual <= width <= MOST * usual / 2:
        wanted = f"{3000 * usual:.4g} to {500 * MOST * usual:.4g} ms for a log with intervals of {1000 * usual:.4g} ms"
        raise ReadError(log.name, "", f"smoothing over {1000 * width:.4g} ms", wanted)
    lever = 0.1 / (2.0 if log.pose.shape[1] == 7 else 1.0)  # m; the orientation weighs as at a point 100 mm from the tool centre point
    rests = dwells(log.time, log.pose * np.array([1.0] * 3 + [2.0 * lever] * (log.pose.shape[1] - 3)), width, 0.02 * MM)
    pose, lone = smoothed(log.time, log.pose, width, rests)
    pose[:, 3:] /= np.linalg.norm(pose[:, 3:], axis=1, keepdims=True)
    length, turn = _apart(log.pose, pose)
    text = (f"Smoothed as asked by local cubics over {1000 * width:.4g} ms before and after each sample (half the amplitude stays at {HALF / width:.3g} Hz), "
            f"{_times(len(rests), 'dwell')} held still: poses changed by at most {length.max() / MM:.4g} mm (after {log.place(int(np.argmax(length)))}) and {turn.max() / DEG:.4g} deg.")  # fmt: skip
    if lone.any():
        text += f" {_times(int(lone.sum()), 'sample')} had too few neighbours and stayed as they are."
    said.append(text.replace("(after line", "(line"))
    return log._replace(pose=pose, own=log.own & (pose == log.pose).all(axis=1))
