"""Notes as TOML text, read by people and merged line by line by version control.

Every line of a field begins with the note's id, and a text of many lines has the id as a margin, so that no line of one note equals a line of
another. A line-based merge that keeps the lines of both sides can then neither mix nor drop lines of two notes that were added at the same
place. It does not take apart a short run of equal lines, up to three, so that a short text needs no margin.
"""

import re
from datetime import date, datetime, time

from .values import Status

HEAD = "# Notes pinned to a path, in the order of the path. Each line begins with its note's id. pathaudit keeps all keys, but no comments.\n"

MERGING = re.compile(r"^(?:<{7}|>{7}|\|{7}|={7}$).*", re.MULTILINE)
"""The lines that version control leaves where it could not merge; no line that is written here looks like them."""

_UNMARGINED = 3
_BARE = re.compile(r"[A-Za-z0-9_-]+")
_UNSEEN = "\0-\x08\x0b-\x1f\x7f-\x9f\u061c\u200e\u200f\u2028-\u202e\u2066-\u2069\ufeff"      # what would not show, or turn its line around
_IN_LINES = re.compile(rf'[{_UNSEEN}\\]|"(?="|$)|[ \t]$')      # editors drop blanks at the end of a line
_IN_LINE = re.compile(rf'[{_UNSEEN}\\"\n]')
_SHORT = {"\\": "\\\\", '"': '\\"', "\t": "\\t", "\r": "\\r", "\n": "\\n"}


def notes_text(notes) -> str:
    """What the file of these notes holds."""
    return HEAD + "".join("\n" + "".join(f"{note.id}.{line}\n" for line in _lines(note)) for note in notes.items)


def margin(id):
    """What may stand at the beginning of each line of a text."""
    return re.compile(rf"^{id} \|(?: |$)", re.MULTILINE)


def _lines(note):
    """'key = value' for each field of a note: what people read first."""
    yield f"at_mm = {_value(note.at_mm)}"
    if note.place and note.place.at_s is not None:
        yield f"at_s = {_value(note.place.at_s)}"
    if not note.deleted:
        yield from _signed(("author", note.author), ("date", note.date))
    if not note.deleted or note.status != Status():
        yield f'status = "{"settled" if note.status.settled else "open"}"'
    yield from _signed(("status_by", note.status.by), ("status_date", note.status.date))
    yield from _versions(note)
    for prefix, part in (("finding.", note.finding), ("", note.place)):
        for key, value in vars(part).items() if part else ():
            if value not in (None, "", ()) and key != "at_s":
                yield f"{prefix}{key} = {_value(dict(value) if key == 'cell' else value)}"
    for path, value in note.extra:
        yield f"{'.'.join(map(_key, path))} = {_value(value)}"


def _versions(note):
    """What the note says, what else it says after a merge, who has deleted it, and what was replaced."""
    if not note.deleted:
        newest = note.newest
        if (newest.by, newest.date) != (note.author, note.date):
            yield f"text_by = {_value(newest.by)}"
            yield f"text_date = {newest.date or _value('')}"
        yield f"text = {_text(note.id, newest.text)}"
    for version in note.versions[1:]:
        if version.text is not None:
            key = f"other.{version.number}"
            yield from _signed((f"{key}.by", version.by), (f"{key}.date", version.date))
            yield f"{key}.text = {_text(note.id, version.text)}"
    if note.deletions:
        yield f"deleted = {_value([{'by': v.by, **({'date': datetime.fromisoformat(v.date)} if v.date else {})} for v in note.deletions])}"
    if note.past:
        yield f"replaced = {_value(note.past)}"


def _signed(by, date):
    if by[1]:
        yield f"{by[0]} = {_value(by[1])}"
    if date[1]:
        yield f"{date[0]} = {date[1]}"


def _text(id, text):
    lines = text.split("\n")
    if len(lines) == 1:
        return _value(text)
    wide = len(lines) > _UNMARGINED or margin(id).search(text) or MERGING.search(text)
    shown = [_IN_LINES.sub(_escape, line) for line in lines]
    return '"""\n' + "\n".join((f"{id} | {line}" if line else f"{id} |") if wide else line for line in shown) + '"""'


def _escape(found):
    return _SHORT.get(found[0]) or f"\\u{ord(found[0]):04x}"


def _value(value):
    """Any value that TOML can hold, on one line."""
    if isinstance(value, str):
        return f'"{_IN_LINE.sub(_escape, value)}"'
    if isinstance(value, bool):
        return str(value).lower()
    if isinstance(value, datetime):
        return value.isoformat().replace("+00:00", "Z")
    if isinstance(value, (date, time)):
        return value.isoformat()
    if isinstance(value, dict):
        return "{ " + ", ".join(f"{_key(key)} = {_value(item)}" for key, item in value.items()) + " }" if value else "{}"
    if isinstance(value, (list, tuple)):
        return "[" + ", ".join(map(_value, value)) + "]"
    return repr(value)


def _key(key):
    return key if _BARE.fullmatch(key) else _value(key)
