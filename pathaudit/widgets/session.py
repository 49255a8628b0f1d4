"""The audit on show and what is tried on it: edits with undo, variants that are kept, one worker. Knows no widget library.

Nothing here changes an audit: an edit of the speed makes another one, in the worker's thread, and the newest change wins.
"""

from dataclasses import dataclass, replace
from functools import cached_property

from ..by_hand import by_hand
from ..changes import outline
from ..edits import Edits
from .history import History
from .worker import Worker

PROGRAMMED = "as programmed"


@dataclass(frozen=True, eq=False)
class Variant:
    """An audit on trial under a name: the edits that made it, its times (None as programmed), its audit."""

    name: str
    edits: Edits
    retiming: object
    audit: object

    @cached_property
    def numbers(self):
        """What variants are compared by: `changes.outline` and the slowest factor"""
        slowest = 100.0 if self.retiming is None else 100.0 * self.retiming.slowest
        return {**outline(self.audit), "slowest_percent": slowest}


class Listener:
    """What a session tells, all from the worker's thread but `begun` and `changed`; this one hears nothing."""

    def begun(self):
        """Another audit is being made."""

    def drawn(self, variant):
        """Whatever takes long before `shown`: its result is handed to it."""

    def shown(self, variant, drawing):
        """Another variant is on show."""

    def changed(self):
        """Edits, undo or variants changed, the audit on show did not."""

    def told(self, words):
        """What the worker is doing; '' when it begins."""

    def failed(self, sentence):
        """A change could not be made; what was on show stays."""


class Session:
    """given: the audit as it came. shown: the Variant on show. variants: name -> Variant, in the order in which they were kept."""

    def __init__(self, audit, listener=None):
        self.given = audit
        self.shown = self._programmed = Variant(PROGRAMMED, Edits(), None, audit)
        self.variants = {}
        self._listener = listener or Listener()
        self._worker = Worker(self._listener.told)
        self._history = History(Edits())

    def keep(self, name):
        """Keep what is on show as a variant, in place of one of the same name."""
        name = " ".join(str(name).split())
        if not name or name == PROGRAMMED:
            raise ValueError(f"the name is {name!r}, expected one of your own for the variant")
        self.variants[name] = replace(self.shown, name=name)
        self._listener.changed()

    @property
    def edits(self):
        """The Edits that hold, or will when the worker is done."""
        return self._history.now

    @property
    def steps(self):
        """Whether there is something to undo, and to redo."""
        return self._history.can_undo, self._history.can_redo

    @property
    def busy(self):
        """Whether another audit is being made."""
        return self.edits != self.shown.edits

    def change(self, edits, gesture=None):
        """Make and show the audit of other edits; gives a Future. Equal gestures are one step of the history."""
        self._history.push(edits, gesture)
        return self._start()

    def walk(self, by):
        """One step of the history back (-1) or forth (1); gives a Future."""
        self._history.undo() if by < 0 else self._history.redo()
        return self._start()

    def edits_of(self, name):
        """The Edits of a variant, or those of the path as programmed, which are none."""
        if name != PROGRAMMED and name not in self.variants:
            raise ValueError(f"there is no variant {name!r}, expected one of {', '.join([PROGRAMMED, *self.variants])}")
        return Edits() if name == PROGRAMMED else self.variants[name].edits

    def drop(self, name):
        """Forget a variant; what is on show stays."""
        self.edits_of(name)
        self.variants.pop(name, None)
        self._listener.changed()

    def cancel(self):
        """Give up the change under way: what is on show stays, and redo brings the change back."""
        self._worker.cancel()
        self._history.back_to(self.shown.edits)
        self._listener.changed()

    def close(self):
        self._worker.close()

    def outlines(self):
        """(name, whether it is on show, what it is compared by) of every variant, the path as programmed first; one without a name is on trial."""
        rows = self._all()
        if all(v.edits != self.shown.edits for v in rows):
            rows = *rows, self.shown
        return [(v.name, v.edits == self.shown.edits, v.numbers) for v in rows]

    def _start(self):
        edits = self._history.now
        kept = next((v for v in self._all() if v.edits == edits), None)
        self._listener.begun()
        return self._worker.start(lambda told: self._make(edits, kept, told), self._take, self._fail)

    def _make(self, edits, kept, told):
        variant = kept or self._variant(edits, told)
        told("drawing")
        return variant, self._listener.drawn(variant)

    def _variant(self, edits, told):
        told("finding the new times")
        again = by_hand(self.given.rates, edits, (self.given.suggestion,))
        return Variant("", edits, again, again.audit(told))

    def _take(self, made):
        self.shown, drawing = made
        self._listener.shown(self.shown, drawing)

    def _fail(self, sentence):
        self._history.back_to(self.shown.edits)
        self._listener.failed(sentence)

    def _all(self):
        return self._programmed, *self.variants.values()
