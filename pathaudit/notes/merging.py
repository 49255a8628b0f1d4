"""Two people's notes made one, without loss."""

from dataclasses import replace

from .values import Note, Notes, Version

BY_HAND = "somebody, in the file"
"""Who deleted a note whose lines are gone from a file."""


def merge(ours, theirs, base=None) -> Notes:
    """The notes of both. What both have changed is kept twice, in one note; what one has deleted and the other edited is kept and marked.

    base: what both began with, where that is known: it tells a change that was made in the file by hand from one that is still to come.
    Without it a note that one of the two does not have is new. The order of the two does not matter, and merging again changes nothing.
    """
    before = base.by_id if base else {}
    ids = {**ours.by_id, **theirs.by_id}
    merged = (_merged(ours.by_id.get(id), theirs.by_id.get(id), before.get(id)) for id in ids)
    return Notes(tuple(note for note in merged if note))


def _merged(ours, theirs, base):
    if ours is None or theirs is None:
        return _alone(ours or theirs, base)
    if ours == theirs:
        return ours
    numbers = [{v.number for v in note.versions} for note in (ours, theirs)]
    past = {*ours.past, *theirs.past}
    if base:
        past |= {v.number for v in base.versions} - (numbers[0] & numbers[1])
    found = (*ours.versions, *theirs.versions)
    left = tuple(v for v in found if v.number not in past) or found      # never nothing, whatever hands have written
    note = Note(
        ours.id, _of_both("at_mm", ours, theirs, base), left, past=tuple(past - {v.number for v in left}), status=_status(ours, theirs, base),
        extra=_extra(ours, theirs, base), **{what: _of_both(what, ours, theirs, base) for what in ("author", "date", "place", "finding")},
    )  # fmt: skip
    return note.bare() if note.deleted else note


def _alone(note, base):
    """A note that one of the two has. Where both had it, the other has taken its lines out of the file by hand."""
    if base is None:
        return note
    if note == base or note.deleted:
        return note if note.deleted else None
    return replace(note, versions=(*note.versions, Version(BY_HAND, note.newest.date, None)))


def _of_both(what, ours, theirs, base):
    """A field that people do not edit: the one that is known; where hands have changed it, the changed one."""
    return _changed(getattr(ours, what), getattr(theirs, what), base and getattr(base, what))


def _changed(ours, theirs, base):
    if ours == theirs or theirs in (None, ""):
        return ours
    if ours in (None, ""):
        return theirs
    return theirs if ours == base else ours if theirs == base else min(ours, theirs, key=repr)


def _status(ours, theirs, base):
    """The later one; where only one has changed it since, that one."""
    if base and base.status in (ours.status, theirs.status):
        return theirs.status if ours.status == base.status else ours.status
    return max(ours.status, theirs.status, key=lambda s: (s.date, s.by, s.settled))


def _extra(ours, theirs, base):
    ours, theirs, before = dict(ours.extra), dict(theirs.extra), dict(base.extra) if base else {}
    removed = {path for path, value in before.items() if (ours.get(path), theirs.get(path)) in ((None, value), (value, None))}
    paths = sorted({*ours, *theirs} - removed)
    return tuple((path, _changed(ours.get(path), theirs.get(path), before.get(path))) for path in paths)
