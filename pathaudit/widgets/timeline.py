"""An audit on show in a notebook: the live timeline, and beside it the still form that readers without a kernel see."""

import re
import sys
from pathlib import PurePath

import anywidget
import traitlets

from ..conventions import LONG
from ..edits import Lock, Slow
from ..report.scene import scene
from ..report.script import shared_module, style_sheet
from ..report.tables import retimed_csv
from ..report.text import summary
from .desk import Desk
from .noting import Noting
from .session import Session
from .still_form import StillForm, still_form
from .trial_facts import trial_facts


class Timeline(anywidget.AnyWidget):
    """The live timeline of an audit. Moving the cursor asks nothing of the kernel; `cursor` is the sample number it stands at.

    facts and block are one Scene (report/scene.py): what is said once, and the columns packed. trial: what is tried by hand
    (trial_facts.py). notes: the notes and how it stands with their file (noting.py). status: one sentence, shown when not empty.
    """

    _esm = shared_module()
    _css = style_sheet()
    facts = traitlets.Dict().tag(sync=True)
    block = traitlets.Bytes().tag(sync=True)
    trial = traitlets.Dict().tag(sync=True)
    notes = traitlets.Dict().tag(sync=True)
    status = traitlets.Unicode().tag(sync=True)
    cursor = traitlets.Int().tag(sync=True, echo_update=False)

    def __init__(self, audit, shown=None, still=None, noting=None, study=None):
        """shown: the audit's Scene, where it has been made already; still: the StillForm beside this one, told of every change.

        study: of the audit under tolerances, whose bands are drawn while it runs as programmed.
        """
        self.session, self.still, self.noting, self.study = Session(audit, self), still, noting or Noting(audit), study
        super().__init__(**_state(shown or scene(audit, study=study)), trial=trial_facts(self.session), notes=self.noting.told())
        self.on_msg(self._on_message)

    def close(self):
        self.session.close()
        if self.still:
            self.still.close()
        if self.layout is not None:
            self.layout.close()
        self.set_trait("block", b"")      # a notebook's page keeps the widgets that were closed, but what is large goes
        super().close()

    # ---- what the session tells (session.Listener)

    def drawn(self, variant):
        if variant.retiming is None:
            return _state(scene(variant.audit, study=self.study))
        return _state(scene(variant.audit, applied=variant.retiming, before=self.session.given))

    def shown(self, variant, drawing):
        with self.hold_sync():
            self.set_trait("status", "")
            for name, value in drawing.items():
                self.set_trait(name, value)
            self.set_trait("trial", trial_facts(self.session))
        self._refresh_still()

    def begun(self):
        self.trial = {**self.trial, "busy": True}

    def changed(self):
        with self.hold_sync():
            if not self.session.busy:
                self.set_trait("status", "")
            self.set_trait("trial", trial_facts(self.session))
        self._refresh_still()

    def told(self, words):
        if self.session.given.path.samples > LONG:
            self.status = f"Working: {words} ..." if words else ""

    def failed(self, sentence):
        with self.hold_sync():
            self.set_trait("status", f"That did not work. {sentence}")
            self.set_trait("trial", trial_facts(self.session))

    # ---- what the browser asks for

    def _on_message(self, _, content, __):
        try:
            do = content.get("do")
            self.take_note(content) if str(do).startswith("note ") else self._acts()[do](content)
        except Exception as error:      # a callback's exception would end in a log that nobody reads
            self.status = f"That did not work. {error if isinstance(error, ValueError) else f'{type(error).__name__}: {error}'}"

    def _acts(self):
        session = self.session
        change = lambda make: lambda c: session.change(make(session.edits, *self._stretch(c), c), c.get("gesture"))
        return {
            "slow": change(lambda edits, first, last, c: edits.plus(Slow(first, last, _factor(c)))),
            "lock": change(lambda edits, first, last, c: edits.plus(Lock(first, last))),
            "free": change(lambda edits, first, last, c: edits.freed(first, last)),
            "accept": change(lambda edits, first, last, c: edits.accept(first, last, session.given.suggestion.style)),
            "reject": change(lambda edits, first, last, c: edits.reject(first, last)),
            "undo": lambda c: session.walk(-1), "redo": lambda c: session.walk(1), "cancel": lambda c: session.cancel(),
            "show": lambda c: session.change(session.edits_of(c["name"])), "keep": lambda c: session.keep(c["name"]), "drop": lambda c: session.drop(c["name"]),
            "export": lambda c: self._export(c["name"]),
        }  # fmt: skip

    def _stretch(self, content):
        """First and last sample of a message; all of the path where it names none."""
        last = self.session.given.path.samples - 1
        ends = sorted((int(content.get("first", 0)), int(content.get("last", last))))
        return max(ends[0], 0), min(ends[1], last)

    def _export(self, name):
        variant = self.session.variants.get(name) or self.session.shown
        if variant.retiming is None:
            raise ValueError("The path runs as programmed: there are no other times to write.")
        stem = PurePath(variant.retiming.rates.motion.path.file).stem
        ending = re.sub(r"[^\w-]+", "-", variant.name or "retimed").strip("-")
        self.send({"save": f"{stem}-{ending}.csv"}, [retimed_csv(variant.retiming).encode()])

    def take_note(self, message):
        """Do what a message about notes asks for (noting.py), and show what came of it."""
        self.noting.handle(message, self.session.shown.audit)
        self.notes = self.noting.told()
        self._refresh_still()

    def _refresh_still(self):
        if self.still:
            self.still.refresh(self.session, self.noting)


def _factor(content):
    return min(max(float(content["factor"]), 0.01), 1.0)


def _state(shown):
    block, layout = shown.packed()
    return {"facts": {**shown.facts, "layout": layout}, "block": block}


def show(audit, notes=None, study=None):
    """Display an audit in the running notebook cell: live timeline, picture and tables; plain text where there is no notebook.

    notes: the file that holds the notes; by default beside the notebook, named like the path's file, and made by the first note.
    study: of this audit under tolerances, drawn as bands. Gives the Desk, on which the same can be tried from Python as with the mouse.
    """
    from IPython import get_ipython
    from IPython.display import display

    shell, noting = get_ipython(), Noting(audit, notes)
    if shell is None:
        sys.stdout.write(summary(audit, noting.placed))      # display() would write the bundle as it stands
    elif not hasattr(shell, "kernel"):
        display({"text/plain": summary(audit, noting.placed)}, raw=True)
    if not hasattr(shell, "kernel"):
        return Desk(Session(audit), noting)
    shown = scene(audit, study=study)
    still = StillForm(shell)
    timeline = Timeline(audit, shown, still, noting, study)
    _replace(shell, timeline)
    display({"application/vnd.jupyter.widget-view+json": {"version_major": 2, "version_minor": 0, "model_id": timeline.model_id},
             "text/plain": _line(audit)}, raw=True)
    still.display(still_form(audit, shown, notes=noting.placed))
    return Desk(timeline.session, noting, timeline.take_note)


def _line(audit):
    count = len(audit.finding_list)
    return f"Path audit of {audit.cell.name}: {audit.verdict}, {count or 'no'} finding{'' if count == 1 else 's'}"


_ON_SHOW = {}      # cell id -> (execution, timelines): the only way to let the old ones go when a cell is run again


def _replace(shell, timeline):
    """Close the timelines that an earlier run of the same cell has left."""
    header = shell.get_parent() or {}
    cell, execution = header.get("metadata", {}).get("cellId"), header.get("header", {}).get("msg_id")
    if cell is None:
        return
    before, old = _ON_SHOW.get(cell, (None, []))
    if before != execution:
        for widget in old:
            widget.close()
        old = []
    _ON_SHOW[cell] = execution, [*old, timeline]
