"""The two outputs beside the live timeline that readers without a kernel see, kept up to date while a person works."""

import base64
from threading import Lock, Timer

from ..report.html_tables import still_tables
from ..report.scene import scene
from ..report.still import png_picture, svg_picture
from ..report.text import summary

QUIET = 1.0  # s without a change before the picture is drawn anew: drawing it would slow the work down


def still_form(audit, shown=None, applied=None):
    """Two mime bundles that need no kernel: the picture and the tables. applied: the Retiming that made the audit, where one did.

    They stay two outputs beside the widget's: in one bundle with it, readers that cannot show the widget would show nothing.
    """
    shown = shown or scene(audit, applied=applied)
    picture = {"image/svg+xml": svg_picture(shown), "image/png": base64.b64encode(png_picture(shown)).decode(),
               "text/plain": "(picture of the timeline)"}
    return picture, {"text/html": still_tables(audit), "text/plain": summary(audit)}


class StillForm:
    """The displayed outputs. refresh() draws them again a moment after the last change, in a thread of its own."""

    def __init__(self):
        self._handles, self._timer, self._lock = [], None, Lock()

    def display(self, bundles):
        from IPython.display import display

        self._handles = [display(bundle, raw=True, display_id=True) for bundle in bundles]

    def refresh(self, session):
        with self._lock:
            if self._timer:
                self._timer.cancel()
            self._timer = Timer(QUIET, self._draw, (session,))
            self._timer.daemon = True
            self._timer.start()

    def close(self):
        with self._lock:
            if self._timer:
                self._timer.cancel()
            self._handles = []

    def _draw(self, session):
        bundles = still_form(session.shown.audit, applied=session.shown.retiming)
        for handle, bundle in zip(self._handles, bundles):
            handle.update(bundle, raw=True)
