"""An audit as one self-contained HTML page: readable with scripts off, a live timeline with scripts on, nothing fetched from anywhere."""

import base64
import json
from html import escape

from . import html_tables as tables
from .compared import compared_html
from .noted import for_view
from .scene import scene
from .script import joined_modules, style_sheet
from .still import svg_picture
from .studied_html import study_html

_POLICY = "default-src 'none'; script-src 'unsafe-inline'; style-src 'unsafe-inline'; img-src data:; base-uri 'none'; form-action 'none'"

_STYLE = """
html { background: #fff; color: #1b1f24; font: 14px/1.45 system-ui, "Helvetica Neue", Arial, sans-serif; color-scheme: light; }
body { max-width: 1240px; margin: 24px auto; padding: 0 20px; }
h1 { font-size: 20px; margin: 0 0 4px; } h2 { font-size: 15px; margin: 26px 0 6px; }
table { margin: 2px 0; } td { border-top: 1px solid #dfe3e7; } .pa-wide + p { margin-top: 6px; } p { margin: 4px 0; }
.pa-wide { overflow-x: auto; } .pa-picture svg { display: block; width: 100%; height: auto; }
.pa-two { display: flex; flex-wrap: wrap; gap: 0 60px; }
#live:empty { display: none; } .is-live .pa-still { display: none; }
@media print { .pa-keys { display: none; } }
"""

# A model that holds what a notebook's model would hold, and talks to nobody.
_START = """
const held = { facts: JSON.parse(document.getElementById("facts").textContent), status: "", cursor: 0,
               notes: { file: "", writable: false, fault: "", author: "", notes: JSON.parse(document.getElementById("notes").textContent) },
               block: Uint8Array.from(atob(document.getElementById("block").textContent), (c) => c.charCodeAt(0)) };
const model = { get: (name) => held[name], set: (name, value) => { held[name] = value; }, save_changes() {}, on() {}, off() {} };
document.body.classList.add("is-live");
render({ model, el: document.getElementById("live") }).catch(() => document.body.classList.remove("is-live"));
"""


def one_page(audit, notes=(), compared=None, study=None):
    """The whole page as a string. notes: placed notes, all of their texts; compared: the audit Against an earlier report; study: of it under tolerances."""
    shown = scene(audit, study=study)
    block, layout = shown.packed()
    facts, told = _json({**shown.facts, "layout": layout}), _json([for_view(placed, audit) for placed in notes])
    title = f"{audit.verdict.upper()}: {audit.cell.name}"
    return f"""<!DOCTYPE html>
<html lang="en"><head><meta charset="utf-8">
<meta http-equiv="Content-Security-Policy" content="{_POLICY}">
<meta name="viewport" content="width=device-width, initial-scale=1">
<title>{escape(title)}</title>
<style>{_STYLE}{style_sheet()}</style></head>
<body>
<h1>Path audit</h1>
{compared_html(compared) if compared else ""}
<div class="pa-still">{tables.verdict_line(audit)}</div>
<div id="live"></div>
<div class="pa-still pa-picture">{svg_picture(shown, title=False, notes=notes)}</div>
<div class="pa-still"><h2>Findings</h2><div class="pa-wide">{tables.findings_table(audit)}</div></div>
{_notes(audit, notes)}{study_html(study) if study else ""}{_rest(audit)}
<script type="application/json" id="facts">{facts}</script>
<script type="application/json" id="notes">{told}</script>
<script type="text/plain" id="block">{base64.b64encode(block).decode()}</script>
<script type="module">{joined_modules()}{_START}</script>
</body></html>
"""


def _json(values):
    return json.dumps(values, allow_nan=False).replace("<", "\\u003c")


def _notes(audit, notes):
    return f'<div class="pa-still"><h2>Notes</h2>{tables.notes_list(audit, notes, most=1_000_000)}</div>\n' if notes else ""


def _rest(audit):
    return f"""<h2>Suggested retiming</h2><div class="pa-wide">{tables.retiming_table(audit)}</div>
<h2>What was given</h2><div class="pa-wide">{tables.inputs_table(audit)}</div><p>{escape(audit.motion.start_reason)}</p>{tables.made_list(audit)}
<div class="pa-two"><div><h2>Limits used</h2><div class="pa-wide">{tables.limits_table(audit)}</div></div>
<div><h2>Thresholds</h2><div class="pa-wide">{tables.thresholds_table(audit)}</div></div></div>
<h2>Not judged</h2><div class="pa-wide">{tables.not_judged_table(audit) or "<p>Everything that has a rule was judged.</p>"}</div>
<h2>Cautions</h2>{tables.cautions_list(audit)}"""
