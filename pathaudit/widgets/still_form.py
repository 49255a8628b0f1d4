"""The two outputs beside the live timeline that readers without a kernel see, kept up to date while a person works."""

import base64
from threading import Lock, Timer

from ..report.html_tables import still_tables
from ..report.scene import scene
from ..report.still import png_picture, svg_picture
from ..report.text import summary

QUIET = 1.0  # s without a change before the picture is drawn anew: drawing it would slow the work down


def still_form(audit, shown=None, applied=None, before=None, notes=()):
    """Two mime bundles that need no kernel: the picture and the tables.

    applied: the Retiming that made the audit, and before: the audit as programmed, where there is one; notes: placed.

    They stay two outputs beside the widget's: in one bundle with it, readers that cannot show the widget would show nothing.
    """
    shown = shown or scene(audit, applied=applied, before=before)
    picture = {"image/svg+xml": svg_picture(shown, notes=notes), "image/png": base64.b64encode(png_picture(shown, notes=notes)).decode(),
               "text/plain": "(picture of the timeline)"}
    return picture, {"text/html": still_tables(audit, notes, applied), "text/plain": summary(audit, notes)}


class StillForm:
    """The displayed outputs. refresh() asks for them to be drawn again: a moment after the last change, or at the end of the cell that is running."""

    def __init__(self, shell):
        self._shell, self._lock = shell, Lock()
        self._handles, self._timer, self._pending = [], None, None

    def display(self, bundles):
        from IPython.display import display

        self._handles = [display(bundle, raw=True, display_id=True) for bundle in bundles]
        self._shell.events.register("post_run_cell", self._cell_has_run)

    def refresh(self, session, noting):
        with self._lock:
            self._drop_timer()
            self._pending, self._timer = (session, noting), Timer(QUIET, self._draw)
            self._timer.daemon = True
            self._timer.start()

    def close(self):
        with self._lock:
            self._drop_timer()
            if self._handles:
                self._shell.events.unregister("post_run_cell", self._cell_has_run)
            self._handles, self._pending = [], None

    def _drop_timer(self):
        if self._timer:
            self._timer.cancel()

    def _cell_has_run(self, result):
        """So that a notebook that is run from top to bottom holds the last state, however fast it runs."""
        self._draw()

    def _draw(self):
        with self._lock:
            pending, self._pending, handles = self._pending, None, list(self._handles)
        if pending is None:
            return
        session, noting = pending
        again = session.shown.retiming
        bundles = still_form(session.shown.audit, applied=again, before=session.given if again else None, notes=noting.placed)
        for handle, bundle in zip(handles, bundles):
            handle.update(bundle, raw=True)
