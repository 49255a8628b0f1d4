"""From Python what the mouse does in the instrument: try other speeds on an audit, take them back, keep variants, compare them."""

import numpy as np

from ..edits import Lock, Slow
from .noting import Noting
from .session import PROGRAMMED, Session


class Desk:
    """A person's hand on a Session. Stretches are in s, as the path's own clock has them; each call waits for its audit.

    >>> desk.slow(27.2, 27.9, 0.5)  # doctest: +SKIP
    >>> desk.audit.verdict, desk.retiming.why  # doctest: +SKIP
    """

    def __init__(self, session: Session, noting=None, take_note=None):
        """noting: the Noting that keeps the notes; take_note(message) lets the instrument do what a message about notes asks for."""
        self._session, self._noting = session, noting or Noting(session.given)
        self._take_note = take_note or self._noting.handle

    @property
    def audit(self):
        """The Audit on show"""
        return self._session.shown.audit

    @property
    def retiming(self):
        """The Retiming that made it, or None as programmed"""
        return self._session.shown.retiming

    @property
    def variants(self):
        """name -> Audit of every variant that was kept, the path as programmed first"""
        return {PROGRAMMED: self._session.given, **{name: variant.audit for name, variant in self._session.variants.items()}}

    def slow(self, from_s, to_s, factor):
        """Run the stretch at `factor`, above 0 and at most 1, of the programmed speed."""
        if not 0.0 < factor <= 1.0:
            raise ValueError(f"factor is {factor!r}, expected a fraction of the programmed speed above 0 and at most 1")
        self._change(lambda edits, first, last: edits.plus(Slow(first, last, float(factor))), from_s, to_s)

    def lock(self, from_s, to_s):
        """Keep the stretch as programmed, whatever is asked for beside it."""
        self._change(lambda edits, first, last: edits.plus(Lock(first, last)), from_s, to_s)

    def free(self, from_s=-np.inf, to_s=np.inf):
        """Take back every edit on the stretch; without one, on the whole path."""
        self._change(lambda edits, first, last: edits.freed(first, last), from_s, to_s)

    def accept(self, from_s=-np.inf, to_s=np.inf):
        """Take over the suggested retiming on the stretch; without one, as a whole."""
        style = self._session.given.suggestion.style
        self._change(lambda edits, first, last: edits.accept(first, last, style), from_s, to_s)

    def undo(self):
        """Take back the last step."""
        self._wait(self._session.walk(-1))

    def redo(self):
        """Take the last undone step again."""
        self._wait(self._session.walk(1))

    def keep(self, name):
        """Keep what is on show as a variant, in place of one of the same name."""
        self._session.keep(name)

    def show(self, name):
        """Show a variant again, or the path "as programmed"."""
        self._wait(self._session.change(self._session.edits_of(name)))

    def drop(self, name):
        """Forget a variant; what is on show stays."""
        self._session.drop(name)

    def note(self, text, at_s, author=None):
        """Write a note at a time of the path's own clock; it is saved with the others. Raises ValueError with the reason where that cannot be."""
        time = self._session.given.time
        if not time[0] <= at_s <= time[-1]:
            raise ValueError(f"the place is {at_s!r} s, expected a time of the path from {time[0]:g} to {time[-1]:g} s")
        self._take_note({"do": "note add", "sample": int(np.abs(time - at_s).argmin()), "finding": None, "author": author or "", "text": text})
        fault = self._noting.told()["fault"]
        if fault:
            raise ValueError(fault)

    @property
    def notes(self):
        """pandas.DataFrame, one row a note in the order of the path: where, by, date, status, text, and what has changed at its place since"""
        import pandas as pd

        shown = self._noting.told()["notes"]
        rows = [{"where": n["where"], "by": n["author"], "date": n["date"], "settled": n["settled"], "text": n["text"], "changed since": n["stale"]} for n in shown]
        return pd.DataFrame(rows, columns=["where", "by", "date", "settled", "text", "changed since"])

    def compared(self):
        """pandas.DataFrame, one row a variant, the path as programmed first."""
        import pandas as pd

        rows = [{"variant": name or "on trial", "shown": shown, **numbers} for name, shown, numbers in self._session.outlines()]
        return pd.DataFrame(rows).set_index("variant")

    def _change(self, make, from_s, to_s):
        self._wait(self._session.change(make(self._session.edits, *self._samples(from_s, to_s))))

    @staticmethod
    def _wait(future):
        sentence = future.result()
        if sentence:
            raise RuntimeError(sentence)

    def _samples(self, from_s, to_s):
        """First and last sample within a stretch."""
        if not from_s <= to_s:
            raise ValueError(f"the stretch is from {from_s!r} to {to_s!r} s, expected its start first")
        time = self._session.given.time
        first, last = int(np.searchsorted(time, from_s - 1e-9)), int(np.searchsorted(time, to_s + 1e-9, side="right")) - 1
        if first > last:
            raise ValueError(f"no sample lies between {from_s:g} and {to_s:g} s, expected a stretch of the path from {time[0]:g} to {time[-1]:g} s")
        return first, last
