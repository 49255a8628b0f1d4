"""The notes on show: one message at a time changes them and saves them; what goes wrong is told in words, and no text is lost by it.

Knows no widget library. What cannot be saved stays here and is saved with the next change that can be, or under another name.
"""

import os
from getpass import getuser
from pathlib import Path, PurePath
from threading import RLock

from ..errors import PathAuditError, ReadError
from ..notes import Notes, merge, new_note, placed, read_notes, write_notes
from ..notes.values import name
from ..report.noted import for_view
from ..writing import write_whole

ENDING = ".notes.toml"


class Noting:
    """The notes of an audit's path and their file. Calls may come from any thread.

    file: by default beside the notebook, named like the path's file; '' for none yet. author: by default as last time, or the user's name.
    """

    def __init__(self, audit, file=None, author=None):
        self._lock, self._audit = RLock(), audit
        self._notes, self._base = Notes(), None      # what holds; what the file held when it was last read or written
        self._file = _default_file(audit.path) if file is None else _with_ending(file)
        self._author = name(author) if author else _remembered_author()
        self._fault, self._slip, self._shown = "", "", None
        if self._file and os.path.lexists(self._file):
            self._reload()

    @property
    def notes(self) -> Notes:
        """What holds now, saved or not"""
        return self._notes

    @property
    def placed(self) -> tuple:
        """Each note on the audit's path, in the order of the path"""
        with self._lock:
            if self._shown is None or self._shown[0] is not self._notes:
                self._shown = self._notes, placed(self._notes, self._audit)
            return self._shown[1]

    def told(self) -> dict:
        """What the browser shows: the notes in the order of the path, the author, the file and how it stands with it."""
        with self._lock:
            return {
                "file": self._file, "writable": bool(self._file) and not self._fault, "author": self._author, "state": self._state(),
                "fault": " ".join(filter(None, (self._slip, self._fault))), "notes": [for_view(p, self._audit) for p in self.placed],
            }  # fmt: skip

    def handle(self, message, shown=None):
        """Do what a message asks for. shown: the audit on show, whose findings it numbers, where that is not the audit of the notes."""
        acts = {"note add": self._add, "note edit": self._edit, "note settle": self._settle, "note delete": self._delete,
                "note reload": self._again, "note author": self._sign, "note file": self._rename}  # fmt: skip
        with self._lock:
            self._slip = ""
            try:
                act = acts[message["do"]]
                act(message, shown or self._audit) if act == self._add else act(message)
            except _Slip as slip:
                self._slip = str(slip)
            except Exception as error:      # whatever a message holds: what was written before it stays, and the reason is shown
                self._slip = f"That did not work. {error if isinstance(error, (ValueError, PathAuditError)) else f'{type(error).__name__}: {error}'}"

    # ---- what messages ask for

    def _add(self, message, shown):
        text, finding, sample = _text_of(message), message.get("finding"), int(message["sample"])
        self._sign(message, quietly=True)
        number = None if finding is None else _same_finding(shown.finding_list[int(finding)], self._audit)
        if number is not None and not self._audit.finding_list[number].first <= sample <= self._audit.finding_list[number].last:
            sample = None      # the cursor is elsewhere: at the finding's worst
        self._put(new_note(self._audit, sample, text, self._author, finding=number, taken=self._notes.by_id))

    def _edit(self, message):
        note, text = self._note(message), _text_of(message)
        if text != note.text or note.marked:
            self._put(note.edit(text, self._author))

    def _settle(self, message):
        note = self._note(message)
        if bool(message["settled"]) != note.status.settled:
            self._put(note.settle(message["settled"], self._author))

    def _delete(self, message):
        self._put(self._note(message).delete(self._author))

    def _again(self, message):
        if not self._file:
            raise _Slip("These notes have no file yet: give it a name.")
        if os.path.lexists(self._file):
            self._reload()
        elif self._notes.items:
            self._fault = f"{self._file} is gone. The notes are kept here; the next change writes the file again."

    def _sign(self, message, quietly=False):
        author = name(message.get("author") or "")
        if author and author != self._author:
            self._author = author
            _remember_author(author)
        elif not author and not quietly:
            raise _Slip("The notes need a name to sign them with.")

    def _rename(self, message):
        file = _with_ending(str(message["file"]).strip())
        if not file:
            raise _Slip("The notes need a file name.")
        before = self._file, self._base, self._fault
        if os.path.abspath(file) != os.path.abspath(self._file or "."):
            self._base = None
        self._file = file
        self._save()
        if self._fault:
            self._slip, (self._file, self._base, self._fault) = self._fault, before

    # ---- the file

    def _put(self, note):
        self._notes = self._notes.put(note)
        if self._file:
            self._save()

    def _save(self):
        gone = self._base is not None and not os.path.lexists(self._file)
        try:
            self._notes = self._base = write_notes(self._file, self._notes, self._base)
            self._fault = ""
            self._slip = f"{self._file} was gone and has been written again." if gone else ""
        except PathAuditError as error:
            self._fault = _refused(error)

    def _reload(self):
        """Take in what is in the file; what is here and not saved yet stays."""
        try:
            there = read_notes(self._file)
        except ReadError as error:
            self._fault = _refused(error)
            return
        unsaved = self._notes != (self._base or Notes())
        self._notes = merge(self._notes, there, self._base) if unsaved else there
        self._base, self._fault = there, ""
        if unsaved:
            self._save()

    def _state(self):
        count = f"{len(self._notes.kept)} note{'' if len(self._notes.kept) == 1 else 's'}"
        if not self._file:
            return f"Not saved: {count} without a file name." if self._notes.items else "The notes have no file name yet."
        if self._notes != (self._base or Notes()):
            return "Not saved; kept here while the kernel runs."
        return f"Saved: {count} in {self._file}." if self._base else f"The first note makes the file {self._file}."

    def _note(self, message):
        note = self._notes.by_id.get(message["id"])
        if note is None or note.deleted:
            raise _Slip("This note is not there any more.")
        return note


class _Slip(Exception):
    """A message that asks for something that cannot be, in words for the person."""


def _text_of(message):
    text = str(message["text"])
    if not text.strip():
        raise _Slip("A note without words is not kept; to remove a note, delete it.")
    return text


def _refused(error):
    if isinstance(error, ReadError):
        return (f"Not saved, and the file is left as it is: {error}. The notes are kept here; mend the file and read it again, or give another file name.")
    return f"Not saved: {error}. The notes are kept here; the next change tries again, or give another file name."


def _same_finding(finding, audit):
    """The number of the audit's own finding that is meant, or None where it has none like it there."""
    if finding in audit.finding_list:
        return audit.finding_list.index(finding)
    alike = [k for k, f in enumerate(audit.finding_list) if (f.kind, f.joint) == (finding.kind, finding.joint) and f.first <= finding.last and finding.first <= f.last]
    return alike[0] if alike else None


def _default_file(path):
    """Named like the path's file, in the current folder; '' for a path that came from arrays."""
    file = PurePath(path.file)
    return file.stem + ENDING if file.suffix else ""


def _with_ending(file):
    file = os.fspath(file)
    return file if not file or file.endswith(".toml") else file + ENDING


def _author_file():
    from platformdirs import user_config_path

    return Path(user_config_path("pathaudit")) / "author.txt"


def _remembered_author():
    try:
        author = name(_author_file().read_text(encoding="utf-8"))
    except (OSError, ValueError):
        author = ""
    try:
        return author or name(getuser()) or "unnamed"
    except (OSError, KeyError):      # a user without a name, as in some containers
        return "unnamed"


def _remember_author(author):
    """For next time; where that cannot be, the name holds for this time."""
    try:
        file = _author_file()
        file.parent.mkdir(parents=True, exist_ok=True)
        write_whole(file, author + "\n")
    except (OSError, PathAuditError):
        pass
