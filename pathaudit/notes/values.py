"""A note, and all notes of a path, as frozen values.

A note holds its text as versions, so that two people's copies can be merged without a common ancestor at hand: an edit puts a new version
in place of those it was made on, and remembers their numbers as `past`; a merge keeps every version that nobody has replaced. A deletion is
a version without text. (A multi-value register: Shapiro, Preguica, Baquero, Zawirski, "A comprehensive study of convergent and commutative
replicated data types", INRIA 7506, 2011, specification 10.)
"""

import hashlib
import json
import secrets
from dataclasses import dataclass, field, replace
from datetime import UTC, datetime, timedelta
from functools import cached_property

_LETTERS = "abcdefghjkmnpqrstuvwxyz"
_SIGNS = _LETTERS + "23456789"      # without the ones that are taken for one another
_DATE = "%Y-%m-%dT%H:%M:%SZ"
LONGEST_NAME = 80


def now() -> str:
    """The time as notes write it: UTC, ISO 8601, whole seconds."""
    return datetime.now(UTC).strftime(_DATE)


def later(date, than):
    """`date`, or the second after `than` where it is not later."""
    return date if date > than else (datetime.strptime(than, _DATE) + timedelta(seconds=1)).strftime(_DATE)


def new_id(taken=()) -> str:
    """A short random name for a note, none of `taken`."""
    while True:
        made = secrets.choice(_LETTERS) + "".join(secrets.choice(_SIGNS) for _ in range(5))
        if made not in taken:
            return made


def sound(text) -> str:
    """The text as UTF-8 can hold it: halves of a pair are joined, or replaced where one half is missing."""
    return str(text).encode("utf-16", "surrogatepass").decode("utf-16", "replace")


def name(text) -> str:
    """A person's name on one line."""
    return " ".join(sound(text).split())[:LONGEST_NAME].rstrip()


@dataclass(frozen=True)
class Version:
    """What a note says since `date`, and who wrote it; text None: it was deleted then."""

    by: str
    date: str
    text: str | None

    @cached_property
    def number(self) -> str:
        """Eight digits that tell this version from any other"""
        return hashlib.sha256(json.dumps([self.by, self.date, self.text]).encode()).hexdigest()[:8]


@dataclass(frozen=True)
class Status:
    """Open or settled; by and date are empty until somebody has settled or reopened the note."""

    settled: bool = False
    by: str = ""
    date: str = ""


@dataclass(frozen=True)
class Place:
    """The tool's pose in the part frame, and what makes the place known again. None where a hand-written note does not say.

    at_s: programmed time; left_mm: distance to the path's end; position_mm, axis: the tool centre point and the tool axis; before_mm,
    after_mm: from there to the points a little earlier and later on the path; speed_mm_s: the programmed speed there.
    """

    at_s: float | None = None
    left_mm: float | None = None
    position_mm: tuple | None = None
    axis: tuple | None = None
    before_mm: tuple | None = None
    after_mm: tuple | None = None
    speed_mm_s: float | None = None


@dataclass(frozen=True)
class Pin:
    """The finding that a note belongs to, as it was then, with a fingerprint of each part of the cell: ((part, digits), ...)."""

    kind: str
    joint: str | None
    severity: str
    value: float
    limit: float
    unit: str
    cell: tuple = ()


@dataclass(frozen=True)
class Note:
    """One note. at_mm: distance along the path; author, date: who began it and when; extra: keys of the file that are not ours.

    versions: what it says; several where people wrote at the same time. past: the numbers of versions that were replaced.
    """

    id: str
    at_mm: float
    versions: tuple
    author: str = ""
    date: str = ""
    place: Place | None = None
    finding: Pin | None = None
    status: Status = Status()
    past: tuple = ()
    extra: tuple = ()

    def __post_init__(self):
        ordered = sorted({v.number: v for v in self.versions}.values(), key=lambda v: (v.text is not None, v.date, v.by, v.text or ""), reverse=True)
        object.__setattr__(self, "versions", tuple(ordered))
        object.__setattr__(self, "past", tuple(sorted(set(self.past))))

    @property
    def newest(self) -> Version:
        """The newest version; one with a text, where there is one"""
        return self.versions[0]

    @property
    def text(self) -> str:
        return self.newest.text or ""

    @property
    def others(self) -> tuple:
        """Versions that say something else than the newest"""
        seen = {self.newest.text}
        return tuple(v for v in self.versions if v.text is not None and not (v.text in seen or seen.add(v.text)))

    @property
    def deletions(self) -> tuple:
        return tuple(v for v in self.versions if v.text is None)

    @property
    def deleted(self) -> bool:
        """Nothing but the mark of its deletion is left"""
        return self.newest.text is None

    @property
    def marked(self) -> bool:
        """A merge has kept something that somebody has to decide"""
        return not self.deleted and bool(self.others or self.deletions)

    def edit(self, text, by, date=None):
        """The note with another text, in place of all that it said."""
        return self._said(sound(text), by, date)

    def settle(self, settled, by, date=None):
        """The note settled or reopened."""
        return replace(self, status=Status(bool(settled), name(by), later(date or now(), self.status.date) if self.status.date else date or now()))

    def delete(self, by, date=None):
        """What is left of a note that was deleted: who did it and when, and where it was."""
        return self._said(None, by, date).bare()

    def bare(self):
        """Without what a deleted note need not keep."""
        return Note(self.id, self.at_mm, self.versions, status=self.status, past=self.past, extra=self.extra)

    def _said(self, text, by, date):
        said, past = Version(name(by), date or now(), text), {*self.past, *(v.number for v in self.versions)}
        while said.number in past:      # back to what it said before: not the version that was replaced
            said = replace(said, date=later(said.date, said.date))
        return replace(self, versions=(said,), past=tuple(past))


@dataclass(frozen=True)
class Notes:
    """All notes of a path in the order of their distance, deleted ones among them. sha256: of the file they were read from or written to."""

    items: tuple = ()
    sha256: str = field(default="", compare=False)

    def __post_init__(self):
        object.__setattr__(self, "items", tuple(sorted(self.items, key=lambda note: (note.at_mm, note.id))))

    @cached_property
    def by_id(self) -> dict:
        return {note.id: note for note in self.items}

    @property
    def kept(self) -> tuple:
        """Those that were not deleted"""
        return tuple(note for note in self.items if not note.deleted)

    def put(self, note):
        """With this note, in place of the one of the same id."""
        return replace(self, items=(*(n for n in self.items if n.id != note.id), note))
