"""An audit on show in a notebook: the live timeline, and beside it the still form that readers without a kernel see."""

import base64

import anywidget
import traitlets

from ..report.html_tables import still_tables
from ..report.scene import scene
from ..report.script import shared_module, style_sheet
from ..report.still import png_picture, svg_picture
from ..report.text import summary
from .session import Session


class Timeline(anywidget.AnyWidget):
    """The live timeline of an audit. Moving the cursor asks nothing of the kernel; `cursor` is the sample number it stands at.

    facts and block are one Scene (report/scene.py): what is said once, and the columns packed. status: one sentence, shown when not empty.
    """

    _esm = shared_module()
    _css = style_sheet()
    facts = traitlets.Dict().tag(sync=True)
    block = traitlets.Bytes().tag(sync=True)
    status = traitlets.Unicode().tag(sync=True)
    cursor = traitlets.Int().tag(sync=True, echo_update=False)

    def __init__(self, audit, shown=None):
        """shown: the audit's Scene, where it has been made already."""
        self.session = Session(audit)
        super().__init__(**_state(shown or scene(audit)))
        self.on_msg(self._on_message)

    def show_retimed(self, retimed):
        """Show the audit of the suggested retiming, or with False the audit as given again."""
        self.status = "Auditing the suggested retiming ..." if retimed else ""
        return self.session.change(_retimed if retimed else _as_given, self._take, self._tell)

    def close(self):
        self.session.close()
        if self.layout is not None:
            self.layout.close()
        super().close()

    def _take(self, state):
        with self.hold_sync():
            self.set_trait("status", "")
            for name, value in state.items():
                self.set_trait(name, value)

    def _tell(self, sentence):
        self.status = f"That did not work. {sentence}"

    def _on_message(self, _, content, __):
        try:
            if content.get("do") == "show retimed":
                self.show_retimed(bool(content.get("on")))
        except Exception as error:      # a callback's exception would end in a log that nobody reads
            self._tell(f"{type(error).__name__}: {error}")


def _state(shown):
    block, layout = shown.packed()
    return {"facts": {**shown.facts, "layout": layout}, "block": block}


def _as_given(audit):
    return audit, _state(scene(audit))


def _retimed(audit):
    again = audit.suggestion.audit()
    return again, _state(scene(again, applied=audit.suggestion))


def show(audit):
    """Display an audit in the running notebook cell: live timeline, picture and tables; plain text where there is no notebook."""
    from IPython import get_ipython
    from IPython.display import display

    shell = get_ipython()
    if shell is None or not hasattr(shell, "kernel"):
        display({"text/plain": summary(audit)}, raw=True)
        return
    shown = scene(audit)
    timeline = Timeline(audit, shown)
    _replace(shell, timeline)
    display({"application/vnd.jupyter.widget-view+json": {"version_major": 2, "version_minor": 0, "model_id": timeline.model_id},
             "text/plain": _line(audit)}, raw=True)
    for bundle in still_form(audit, shown):
        display(bundle, raw=True)


def _line(audit):
    count = len(audit.finding_list)
    return f"Path audit of {audit.cell.name}: {audit.verdict}, {count or 'no'} finding{'' if count == 1 else 's'}"


def still_form(audit, shown=None):
    """Two mime bundles that need no kernel: the picture and the tables.

    They stay two outputs beside the widget's: in one bundle with it, readers that cannot show the widget would show nothing.
    """
    shown = shown or scene(audit)
    picture = {"image/svg+xml": svg_picture(shown), "image/png": base64.b64encode(png_picture(shown)).decode(),
               "text/plain": "(picture of the timeline)"}
    return picture, {"text/html": still_tables(audit), "text/plain": summary(audit)}


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
