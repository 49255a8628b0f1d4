"""The file of a path's notes: read, and saved without overwriting what somebody else has saved meanwhile."""

import hashlib
import os
from threading import Lock

from ..reading.sources import decode, read_bytes
from ..writing import write_whole
from .from_toml import EXPECTED, notes_from
from .merging import merge
from .to_toml import notes_text
from .values import Notes

_saving = Lock()      # two views in one process must not save between each other's reading and writing


def read_notes(file) -> Notes:
    """The notes in `file`. Raises ReadError."""
    data, sha256 = read_bytes(file, EXPECTED)
    return Notes(notes_from(file, decode(file, data, EXPECTED)), sha256)


def write_notes(file, notes, base=None) -> Notes:
    """Save `notes`; returns what is in the file then: what somebody else has saved there since `base` was read is merged into it.

    base: the Notes that the file held when `notes` began, or None. Raises ReadError where the file that is there cannot be understood, and
    leaves it alone; WriteError where it cannot be written.
    """
    with _saving:
        there = read_notes(file) if os.path.lexists(file) else None
        if there is not None and (base is None or there.sha256 != base.sha256):
            notes = merge(notes, there, base)
        data = notes_text(notes).encode()
        sha256 = hashlib.sha256(data).hexdigest()
        if there is None or there.sha256 != sha256:
            write_whole(file, data)
        return Notes(notes.items, sha256)
