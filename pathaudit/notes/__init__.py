"""Notes pinned to a place on the path or to a finding: values, their one file, merging, and where they stand on a path now."""

from .files import read_notes, write_notes
from .merging import merge
from .placing import Placed, new_note, placed
from .to_toml import notes_text
from .values import Note, Notes

__all__ = ["Note", "Notes", "Placed", "merge", "new_note", "notes_text", "placed", "read_notes", "write_notes"]
