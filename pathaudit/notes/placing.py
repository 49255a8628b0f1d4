"""Where a note stands on a path now, and what has changed there since it was written.

The place is looked for by geometry, not by time or sample number: on every straight piece of the path the point nearest to the noted tool
centre point is taken, and the piece that costs least is the place, where a cost is the distance in mm, plus TURN for each degree that the tool
axis is turned, plus SLIP for each mm that the place has slipped along the path. The slip is counted from the path's start or from its end,
whichever is less, so that samples may be put before or behind. Pieces that are passed in another direction do not count. Where a path passes
one place several times, the geometry is the same and the slip decides.
"""

from dataclasses import dataclass
from functools import cached_property
from hashlib import sha256

import numpy as np

from .values import Note, Pin, Place, Version, name, new_id, now, sound

TURN = 0.5  # mm a degree
SLIP = 0.05  # mm a mm: a move of 5 mm is as likely as a slip of 100 mm along the path
NEARBY = 5.0  # mm along the path, before and behind: the neighbourhood that tells the direction and the speed
SAME_WAY = 0.5  # cosine of the largest angle between the directions of the path then and now
AHEAD = 0.8  # cosine of the smallest angle between the path and the way to a place that lies beside it
GONE = 50.0  # mm: farther away it is another place
MOVED = 0.2  # mm, above what rounded columns do
TURNED = 0.3  # degrees, likewise
SPEED = 0.03  # share of the programmed speed that a note does not mind
VALUE = 0.02  # likewise of a finding's value: another sampling meets another peak
BESIDE = 10.0  # mm along the path: a finding that begins nearer than this is still the same


@dataclass(frozen=True)
class Placed:
    """A note on a path: sample is where it stands now (for a place that is gone, where its distance along the path would be).

    time_s, at_mm: of that place now, the time as the path counts it. stale: what has changed since, in sentences, or ''.
    finding: which of the audit's findings it belongs to now, or None.
    """

    note: Note
    sample: int
    time_s: float
    at_mm: float
    stale: str
    finding: int | None = None


def new_note(audit, sample, text, author, *, finding=None, date=None, taken=()) -> Note:
    """A note at a sample of the audit's path, or on one of its findings (then `sample` None stands for the finding's worst).

    finding: a number in audit.finding_list; taken: ids in use; date: UTC, ISO 8601, by default now.
    """
    flagged = None if finding is None else audit.finding_list[finding]
    track, k = _Track(audit.path), int(flagged.worst if sample is None else sample)
    if not 0 <= k < len(track.time):
        raise ValueError(f"sample is {k}, expected 0 to {len(track.time) - 1}")
    author, date = name(author), date or now()
    return Note(new_id(taken), _rounded(track.along[k]), (Version(author, date, sound(text)),), author, date, track.place(k), _pin(flagged, audit.cell))


def placed(notes, audit) -> tuple:
    """A Placed for each note that was not deleted, in the order of the path."""
    track = _Track(audit.path)
    found = (_placed(note, audit, track) for note in notes.kept)
    return tuple(sorted(found, key=lambda p: (p.sample, p.note.at_mm, p.note.id)))


def _placed(note, audit, track):
    spot, known = None, note.place is not None and note.place.position_mm is not None
    if known:
        spot = track.find(note.place, note.at_mm)
    if spot is None:
        sample = int(np.abs(track.along - note.at_mm).argmin())
        said = ["The place is gone: " + track.nearest_words(note.place)] if known else _beyond(note, track)
        return Placed(note, sample, float(track.time[sample]), float(track.along[sample]), " ".join(said))
    said = _moves(spot) + _speed_change(note.place, spot)
    finding, changes = _finding_change(note.finding, audit, spot) if note.finding else (None, [])
    return Placed(note, spot.sample, spot.time, spot.along, " ".join(said + changes), finding)


def _beyond(note, track):
    over = note.at_mm - track.along[-1]
    return [f"The path ends {over:.1f} mm before this place."] if over > MOVED else []


def _moves(spot):
    moved, turned = spot.near > MOVED + spot.near_slack, spot.turned > TURNED + spot.turned_slack
    words = [f"moved by {spot.near:.1f} mm"] * moved + [f"turned by {spot.turned:.1f} deg"] * turned
    return [f"The path has {' and '.join(words)} here."] if words else []


def _speed_change(place, spot):
    was, is_now = place.speed_mm_s, spot.speed
    if was is None or abs(is_now - was) <= max(SPEED * was, 0.5):
        return []
    return [f"The programmed speed here was {_number(was)} mm/s and is {_number(is_now)} mm/s."]


def _finding_change(pin, audit, spot):
    """(number of the finding now or None, sentences)"""
    alike = [(max(f.from_mm - spot.along, spot.along - f.to_mm, 0.0), k) for k, f in enumerate(audit.finding_list) if (f.kind, f.joint) == (pin.kind, pin.joint)]
    beside, number = min(alike, default=(np.inf, None))
    what = f"{pin.kind}, {pin.joint}" if pin.joint else pin.kind
    if beside > BESIDE:
        return None, [f"The finding ({what}) is gone.", *_cell_change(pin, audit.cell)]
    now_is = audit.finding_list[number]
    said = [f"The finding ({what}) is now {now_is.severity} instead of {pin.severity}."] if now_is.severity != pin.severity else []
    for title, was, value in (("value", pin.value, now_is.value), ("limit", pin.limit, now_is.limit)):
        if was is not None and np.isfinite(value) and abs(value - was) > VALUE * max(abs(was), 1e-12):
            said.append(f"Its {title} was {_number(was)} {pin.unit}".rstrip() + f" and is {_number(value)} {now_is.unit}".rstrip() + ".")
    return number, said + (_cell_change(pin, audit.cell) if said else [])


def _cell_change(pin, cell):
    changed = [part for part, print_ in _fingerprints(cell) if dict(pin.cell).get(part, print_) != print_]
    return [f"Changed in the cell since: {', '.join(changed)}."] if changed else []


def _pin(finding, cell):
    if finding is None:
        return None
    value, limit = (float(f"{v:.9g}") if v is not None and np.isfinite(v) else None for v in (finding.value, finding.limit))
    return Pin(finding.kind, finding.joint, finding.severity, value, limit, finding.unit, _fingerprints(cell))


def _fingerprints(cell):
    """((part of the cell, digits that tell it from another), ...)"""
    arm = cell.arm
    parts = {"arm": (arm.chain.links,), "placement": (cell.placement,), "tool": (cell.tool,), "part": (cell.part,),
             "limits": (arm.lower, arm.upper, arm.speed, arm.acceleration)}
    texts = {part: " ".join(f"{v:.6f}" for array in arrays for v in np.ravel(array) + 0.0) for part, arrays in parts.items()}
    return tuple((part, sha256(text.replace("-0.000000", "0.000000").encode()).hexdigest()[:6]) for part, text in texts.items())


def _number(value):
    return f"{value:.4g}" if abs(value) < 1e4 else f"{value:.0f}"


def _rounded(values, digits=3):
    """Plain floats that a person can read; three digits of a mm are far below MOVED."""
    return (np.round(values, digits) + 0.0).tolist() if np.ndim(values) == 0 else tuple((np.round(values, digits) + 0.0).tolist())


@dataclass(frozen=True)
class _Spot:
    """A place found: the nearest sample, time in s, along in mm, how near in mm, how far turned in degrees, speed in mm/s.

    near_slack, turned_slack: what the sampling of the path can make out of nothing here.
    """

    sample: int
    time: float
    along: float
    near: float
    turned: float
    speed: float
    near_slack: float
    turned_slack: float


class _Track:
    """A path as a line of straight pieces, in mm: N samples, N - 1 pieces."""

    def __init__(self, path):
        self.time, self.along = np.asarray(path.time), 1e3 * np.asarray(path.distance)
        self.position, self.axis = 1e3 * np.asarray(path.position), np.asarray(path.rotation)[:, :, 2]

    @cached_property
    def pieces(self):
        """(lengths (N - 1,), their directions (N - 1, 3) with zeros where the tool point rests)"""
        step = np.diff(self.position, axis=0)
        length = np.diff(self.along)
        return length, step / np.where(length > 1e-9, length, np.inf)[:, None]

    def at(self, along):
        """The tool centre point at a distance along the path; past the ends, the ends. Shape of `along` + (3,)."""
        return np.stack([np.interp(along, self.along, column) for column in self.position.T], axis=-1)

    def speed(self, along):
        """mm/s over the neighbourhood, so that it does not hang on how the path is sampled."""
        ends = np.clip([along - NEARBY, along + NEARBY], 0.0, self.along[-1])
        time = np.interp(ends, self.along, self.time)
        return float((ends[1] - ends[0]) / (time[1] - time[0])) if time[1] > time[0] else 0.0

    def place(self, k):
        along, here = self.along[k], self.position[k]
        around = self.at(np.array([along - NEARBY, along + NEARBY])) - here
        return Place(
            _rounded(self.time[k]), _rounded(self.along[-1] - along), _rounded(here), _rounded(self.axis[k], 6),
            _rounded(around[0]), _rounded(around[1]), _rounded(self.speed(along)),
        )  # fmt: skip

    def find(self, place, at_mm):
        """The _Spot of a place, or None."""
        here, axis = np.array(place.position_mm), np.array(place.axis if place.axis else (0.0, 0.0, 0.0))
        length, direction = self.pieces
        k = np.flatnonzero((np.abs(self.position[:-1] - here) <= GONE + length[:, None]).all(axis=1))
        share = np.clip(self._shares(k, here, axis, place.at_s), 0.0, 1.0)
        off = here - self.position[k] - (share * length[k])[:, None] * direction[k]
        near = np.linalg.norm(off, axis=1)
        turned = _angles(self.axis[k] + share[:, None] * (self.axis[k + 1] - self.axis[k]), axis)
        along = self.along[k] + share * length[k]
        slip = np.abs(along - at_mm)
        if place.left_mm is not None:
            slip = np.minimum(slip, np.abs(self.along[-1] - along - place.left_mm))
        cost = near + TURN * turned + SLIP * slip
        cost[(near > GONE) | ~self._alike(place, along, off, near)] = np.inf
        if not len(cost) or not np.isfinite(cost.min()):
            return None
        best = self._waiting(np.flatnonzero(cost <= cost.min() + 1e-9), k, place)
        sample = int(k[best] + (share[best] > 0.5))
        time = np.interp(share[best], [0, 1], self.time[k[best] : k[best] + 2])
        return _Spot(sample, float(time), float(along[best]), float(near[best]), float(turned[best]), self.speed(along[best]), *self._slack(int(k[best])))

    def _shares(self, k, here, axis, at_s=None):
        """(len(k),) where on each piece, 0 to 1, the place comes nearest; where the tool point rests, where the axis does; else by the time."""
        length, direction = self.pieces
        turn, step = self.axis[k + 1] - self.axis[k], self.time[k + 1] - self.time[k]
        turning = np.einsum("ij,ij->i", turn, turn)
        by_point = np.einsum("ij,ij->i", here - self.position[k], direction[k]) / np.where(length[k] > 1e-6, length[k], 1.0)
        by_axis = np.einsum("ij,ij->i", axis - self.axis[k], turn) / np.where(turning > 0, turning, 1.0)
        by_time = 0.0 if at_s is None else (at_s - self.time[k]) / step
        return np.where(length[k] > 1e-6, by_point, np.clip(np.where(turning > 0, by_axis, by_time), 0.0, 1.0))

    def _alike(self, place, along, off, near):
        """(len(along),) where the path goes the same way as it did, and the place lies beside it, not before it or behind it."""
        way = self.at(along + NEARBY) - self.at(along - NEARBY)
        size = np.linalg.norm(way, axis=1)
        beside = (near < 1.0) | (np.abs(np.einsum("ij,ij->i", off, way)) <= AHEAD * near * size)
        if place.before_mm is None or place.after_mm is None:
            return beside
        then = np.array(place.after_mm) - np.array(place.before_mm)
        return beside & (way @ then >= SAME_WAY * np.linalg.norm(then) * size - 1e-9)

    def _waiting(self, alike, k, place):
        """Of pieces that are as good as each other, as where the tool waits, the one nearest in time."""
        return alike[np.abs(self.time[k[alike]] - place.at_s).argmin()] if place.at_s is not None else alike[0]

    def _slack(self, k):
        """(mm, degrees) by which the true path may differ from the straight piece k between two of its samples.

        It lies between the piece and the neighbouring pieces drawn on until they meet. A piece that is much longer than those around is
        no coarse sample of a bend but a leap.
        """
        length, direction = self.pieces
        around = slice(max(0, k - 5), k + 6)
        moving = length[around][length[around] > 1e-6]
        usual = float(np.median(moving)) if len(moving) else 0.0
        bends = [np.radians(min(60.0, _angles(direction[i], direction[k]))) for i in (k - 1, k + 1) if 0 <= i < len(length)]
        near = 0.0
        if len(bends) == 2 and min(bends) > 0 and length[k] <= 3 * usual:
            first, second = np.tan(bends)
            near = length[k] * first * second / (first + second)
        return float(near), float(min(5.0, 0.25 * _angles(self.axis[k], self.axis[k + 1])))

    def nearest_words(self, place):
        here = np.array(place.position_mm)
        length, direction = self.pieces
        k = np.arange(len(length))
        share = np.clip(self._shares(k, here, np.zeros(3)), 0.0, 1.0)
        near = np.linalg.norm(self.position[:-1] + (share * length)[:, None] * direction - here, axis=1).min()
        return f"the path does not come nearer than {near:.0f} mm." if near > GONE else "the path does not pass it as it did."


def _angles(a, b):
    """Degrees between vectors (..., 3); 0 where one of them is zero."""
    cross = np.linalg.norm(np.cross(a, b), axis=-1)
    return np.degrees(np.arctan2(cross, (a * b).sum(axis=-1)))
