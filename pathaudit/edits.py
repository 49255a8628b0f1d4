"""What-if edits of a path's speed, as values: stretches that are slowed, kept as programmed, or taken from a suggestion.

A stretch is a pair of sample numbers, both included, so that it means the same poses whatever the times are. Later edits paint over earlier
ones; a lock holds against all of them.
"""

from dataclasses import dataclass, replace

import numpy as np


@dataclass(frozen=True)
class Slow:
    """The samples first..last run at `factor` of the programmed speed, above 0 and at most 1."""

    first: int
    last: int
    factor: float


@dataclass(frozen=True)
class Adopt:
    """The samples first..last run as the retiming of `style` suggests."""

    first: int
    last: int
    style: str


@dataclass(frozen=True)
class Lock:
    """The samples first..last keep the programmed speed."""

    first: int
    last: int


@dataclass(frozen=True)
class Decline:
    """The suggestion is not wanted on first..last: it is no longer offered there."""

    first: int
    last: int


@dataclass(frozen=True)
class Edits:
    """Edits in the order in which they were made. Each method gives another value."""

    items: tuple = ()

    def __bool__(self):
        return bool(self.items)

    def plus(self, edit):
        """With one more edit; what it hides entirely is dropped, so that dragging does not pile up."""
        return replace(self, items=(*(item for item in self.items if not _hides(edit, item)), edit))

    def freed(self, first, last, kinds=(Slow, Adopt, Lock, Decline)):
        """Without any edit of these kinds on first..last: what reaches into the stretch is cut off at its ends."""
        pieces = (_outside(item, first, last) if isinstance(item, kinds) else (item,) for item in self.items)
        return replace(self, items=tuple(piece for group in pieces for piece in group))

    def accept(self, first, last, style):
        """With the suggestion of `style` in force on first..last."""
        return self.freed(first, last, (Decline,)).plus(Adopt(first, last, style))

    def reject(self, first, last):
        """With the suggestion neither in force nor offered on first..last."""
        return self.freed(first, last, (Adopt,)).plus(Decline(first, last))

    def accepted(self, first, last):
        """Whether the suggestion is in force on all of first..last."""
        return _covered(self.items, Adopt, first, last, (Slow,))

    def declined(self, first, last):
        return _covered(self.items, Decline, first, last, (Adopt,))

    def factors(self, samples, suggested):
        """What the edits ask for: slowed (N,) and adopted (N,), fractions of the programmed speed, and locked (N,) bool.

        suggested: style -> (N,) factors of the retiming of that style.
        """
        slowed, adopted, locked = np.ones(samples), np.ones(samples), np.zeros(samples, dtype=bool)
        for item in self.items:
            stretch = slice(item.first, item.last + 1)
            if isinstance(item, Slow):
                slowed[stretch], adopted[stretch] = item.factor, 1.0
            elif isinstance(item, Adopt):
                slowed[stretch], adopted[stretch] = 1.0, suggested[item.style][stretch]
            elif isinstance(item, Lock):
                locked[stretch] = True
        return slowed, adopted, locked


def _hides(edit, item):
    kinds = {Slow: (Slow, Adopt), Adopt: (Slow, Adopt), Lock: (Lock,), Decline: (Decline,)}
    return edit.first <= item.first and item.last <= edit.last and isinstance(item, kinds[type(edit)])


def _outside(item, first, last):
    """What remains of an edit outside first..last: the edit itself, one piece, two, or none."""
    if item.last < first or item.first > last:
        return (item,)
    pieces = (item.first, first - 1), (last + 1, item.last)
    return tuple(replace(item, first=a, last=b) for a, b in pieces if a <= b)


def _covered(items, kind, first, last, undone_by):
    state = np.zeros(last - first + 1, dtype=bool)
    for item in items:
        if isinstance(item, (kind, *undone_by)):
            state[max(item.first - first, 0) : max(item.last + 1 - first, 0)] = isinstance(item, kind)
    return bool(state.all())
