"""Notes from TOML text, written by pathaudit or by hand: what is wrong is refused with its line, what is unknown is kept."""

import re
from datetime import UTC, datetime
from math import isfinite

from ..errors import ReadError, quoted
from ..reading.toml_text import parse_toml, shown
from .to_toml import MERGING, margin
from .values import Note, Pin, Place, Status, Version

EXPECTED = "notes as TOML text"
_ID = re.compile(r"[a-z0-9]{1,20}")
_DATE = "a date and time with its offset, as 2026-12-01T09:30:00Z"
_NUMBERS = ("at_s", "left_mm", "speed_mm_s")
_POINTS = ("position_mm", "axis", "before_mm", "after_mm")


def notes_from(file, text) -> tuple:
    """The notes in the text of `file`. Raises ReadError."""
    marks = MERGING.search(text)
    if marks:
        line = text.count("\n", 0, marks.start()) + 1
        raise ReadError(file, f"line {line}", f"the marks of an unfinished merge ({quoted(marks[0])})",
                        "notes merged to the end; `pathaudit notes merge` does it from the two files")
    return tuple(_note(file, text, id, values) for id, values in parse_toml(file, text, EXPECTED).items())


class _Fields:
    """The fields of one note, or of a table in it, that are still to be read. Every error names the line and the key."""

    def __init__(self, file, text, path, values):
        self.file, self.text, self.path = file, text, path
        if not isinstance(values, dict):
            raise self.error((), shown(values), "lines that begin with the id of a note, as k7f3mq.text = \"...\"" if len(path) == 1 else "a table")
        self.values = dict(values)

    def error(self, keys, found, expected):
        """`keys` name the place inside this table."""
        path = (*self.path, *keys)
        for end in range(len(path), 0, -1):      # the nearest line that names it
            name = r"[ \t]*\.[ \t]*".join(rf'"?{re.escape(key)}"?' for key in path[:end])
            line = re.search(rf"^[ \t]*\[*[ \t]*{name}(?![\w-])", self.text, re.MULTILINE)
            if line:
                place = f"line {self.text.count(chr(10), 0, line.start()) + 1}, "
                return ReadError(self.file, place + ".".join(path), found, expected)
        return ReadError(self.file, ".".join(path), found, expected)

    def take(self, key, right, expected, missing=None):
        """The value of a key, where it is right; `missing` where the key is not there."""
        value = self.values.pop(key, None)
        if value is None:
            return missing
        if not right(value):
            raise self.error((key,), shown(value), expected)
        return value

    def table(self, key):
        value = self.values.pop(key, None)
        return None if value is None else _Fields(self.file, self.text, (*self.path, key), value)

    def words(self, key, missing=""):
        return self.take(key, lambda v: isinstance(v, str), "a text in quotes", missing)

    def person(self, key, missing=""):
        return " ".join(self.words(key, missing).split())

    def number(self, key, missing=None):
        value = self.take(key, _is_number, "a number", missing)
        return None if value is None else float(value)

    def point(self, key):
        value = self.take(key, lambda v: isinstance(v, list) and len(v) == 3 and all(map(_is_number, v)), "3 numbers in brackets")
        return None if value is None else tuple(map(float, value))

    def date(self, key, missing=""):
        value = self.values.pop(key, None)
        if value is None or value == "":
            return missing if value is None else ""
        try:
            if isinstance(value, datetime) and value.tzinfo:
                return value.astimezone(UTC).replace(tzinfo=None).isoformat(timespec="seconds") + "Z"
        except OverflowError:
            pass
        raise self.error((key,), shown(value) if not isinstance(value, datetime) else str(value), _DATE)

    def rest(self):
        """((path below the note, value), ...) of what nobody has taken."""
        return tuple(((*self.path[1:], key), value) for key, value in self.values.items())


def _is_number(value):
    return isinstance(value, (int, float)) and not isinstance(value, bool) and abs(value) < 1e300 and isfinite(value)


def _note(file, text, id, values):
    fields = _Fields(file, text, (id,), values)
    if not _ID.fullmatch(id):
        raise fields.error((), f"the id {quoted(id)}", "small letters and digits, at most 20, as k7f3mq")
    at_mm, author, date = fields.number("at_mm"), fields.person("author"), fields.date("date")
    if at_mm is None:
        raise fields.error((), "a note without at_mm", f"{id}.at_mm, its distance along the path in mm")
    status, extra = _status(fields), []
    versions = [*_text(fields, author, date), *_others(fields, extra), *_deletions(fields)]
    if not versions:
        raise fields.error((), "a note without text", f"{id}.text")
    replaced = fields.take("replaced", lambda v: isinstance(v, list) and all(isinstance(n, str) for n in v), "a list of texts", [])
    finding, place = _finding(fields, extra), _place(fields)
    note = Note(id, at_mm, tuple(versions), author, date, place, finding, status, tuple(replaced), tuple(sorted((*extra, *fields.rest()))))
    return note.bare() if note.deleted else note


def _status(fields):
    settled = fields.take("status", lambda v: v in ("open", "settled"), '"open" or "settled"', "open") == "settled"
    return Status(settled, fields.person("status_by"), fields.date("status_date"))


def _text(fields, author, date):
    text, by, since = fields.words("text", None), fields.person("text_by", author), fields.date("text_date", date)
    return [] if text is None else [Version(by, since, _without_margin(fields.path[0], text))]


def _others(fields, extra):
    others = fields.table("other")
    for key in list(others.values) if others else ():
        other = others.table(key)
        by, date, text = other.person("by"), other.date("date"), other.words("text", None)
        if text is None:
            raise other.error((), "no text", "a text that somebody else wrote at the same time")
        extra += other.rest()
        yield Version(by, date, _without_margin(fields.path[0], text))


def _deletions(fields):
    for values in fields.take("deleted", lambda v: isinstance(v, list), "a list of { by, date }", []):
        deletion = _Fields(fields.file, fields.text, (*fields.path, "deleted"), values)
        yield Version(deletion.person("by"), deletion.date("date"), None)
        for key in deletion.values:
            raise fields.error(("deleted",), f"the key {quoted(key)}", "by and date")


def _without_margin(id, text):
    return margin(id).sub("", text) if "\n" in text else text


def _finding(fields, extra):
    found = fields.table("finding")
    if found is None:
        return None
    severity = found.take("severity", lambda v: v in ("warn", "fail"), '"warn" or "fail"', "")
    pin = Pin(found.words("kind"), found.words("joint", None), severity, found.number("value"), found.number("limit"), found.words("unit"),
              tuple(found.take("cell", lambda v: isinstance(v, dict) and all(isinstance(n, str) for n in v.values()), "a table of texts", {}).items()))
    if not (pin.kind and pin.severity):
        raise found.error((), "a finding without " + ("severity" if pin.kind else "kind"), "both kind and severity")
    extra += found.rest()
    return pin


def _place(fields):
    place = Place(**{key: fields.number(key) for key in _NUMBERS}, **{key: fields.point(key) for key in _POINTS})
    return None if place == Place() else place
