"""Untimed paths: exact moves (`moves`), rounded corners (`corners`), the times that ceilings give them (`timing`), and their samples (`sampling`).

    file -> Draft -> Course -> Rounded -> Pieces -> Phases -> Path
"""

from .corners import Corner, Rounded, corner_from, round_corners
from .moves import Course, Draft
from .sampling import timed

__all__ = ["Corner", "Course", "Draft", "Rounded", "corner_from", "round_corners", "timed"]
