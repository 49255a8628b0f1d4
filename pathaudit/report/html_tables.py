"""The findings, the retiming and what was given, as plain HTML tables: shared by the one-page report and the notebook's still form.

Only table, tr, td, div, b and inline styles are used: a sanitising export shows any other tag as text, and readers that trust nobody drop it.
"""

from html import escape
from pathlib import PurePath

from ..arm import unit_of
from . import noted, origin
from .scene import clock_offset, significant, worst_text

_LEFT = "text-align:left;vertical-align:top;padding:3px 14px 3px 0"
_NUMBER = _LEFT + ";white-space:nowrap;font-variant-numeric:tabular-nums"
_SHORT = _LEFT + ";white-space:nowrap"
_HEAD = _SHORT + ";opacity:0.7"
_NOTE = "margin-left:2em;white-space:pre-wrap;unicode-bidi:plaintext"
_SEVERITY = {"warn": "WARN", "fail": "FAIL"}

_THRESHOLDS = {      # name in [thresholds]: (what it is, unit)
    "sigma_min_warn": ("sigma_min of the scaled Jacobian, warn below", ""),
    "sigma_min_fail": ("sigma_min of the scaled Jacobian, fail below", ""),
    "speed_share_warn": ("joint speed as share of its limit, warn above", ""),
    "speed_share_fail": ("joint speed as share of its limit, fail above", ""),
    "acceleration_share_warn": ("joint acceleration as share of its limit, warn above", ""),
    "acceleration_share_fail": ("joint acceleration as share of its limit, fail above", ""),
    "travel_warn_deg": ("travel left, turning joints, warn below", "deg"),
    "travel_warn_mm": ("travel left, sliding joints, warn below", "mm"),
    "deviation_mm": ("tool off the path, fail above", "mm"),
    "deviation_deg": ("tool turned off the path, fail above", "deg"),
    "tool_speed_mm_s": ("tool speed, fail above", "mm/s"),
}


def table(head, rows, styles=()):
    """An HTML table of plain text cells; `styles` gives a column its style; no head where it is empty."""
    style = [*styles, *[_LEFT] * len(head or rows[0])]
    first = "<tr>" + "".join(f'<td style="{_HEAD}">{escape(name)}</td>' for name in head) + "</tr>" if head else ""
    body = "".join("<tr>" + "".join(f'<td style="{s}">{_cell(cell)}</td>' for s, cell in zip(style, row)) + "</tr>" for row in rows)
    return f'<table style="border-collapse:collapse;text-align:left">{first}{body}</table>'


def _cell(value):
    return f"<b>{escape(value)}</b>" if value in _SEVERITY.values() else escape(str(value))


def verdict_line(audit):
    path = audit.path
    return (f"<div><b>{escape(audit.verdict.upper())}</b> &nbsp; {escape(audit.cell.name)} &nbsp; {escape(PurePath(path.file).name)}: "
            f"{path.samples:,} samples, {path.duration:.2f} s, {1e3 * path.length:.0f} mm</div>")


def findings_table(audit):
    back = audit.time[0] - clock_offset(audit)
    rows = [(str(k), _SEVERITY.get(f.severity, f.severity), f"{f.kind}, {f.joint}" if f.joint else f.kind,
             f"{f.t_start - back:.2f} - {f.t_end - back:.2f}", f"{f.from_mm:.0f} - {f.to_mm:.0f}", worst_text(f), f"{f.why} {origin.sentence(audit, f)}".strip())
            for k, f in enumerate(audit.finding_list, 1)]
    if not rows:
        return "<div>No findings.</div>"
    head = ("", "", "finding", "from - to, s", "from - to, mm", "worst", "why")
    return table(head, rows, (_NUMBER, _SHORT, _LEFT, _NUMBER, _NUMBER, _LEFT))


def _needed(again):
    return again.feasible and again.slowest < 0.9995


def retiming_table(audit):
    again = audit.suggestion
    if not _needed(again):
        return f"<div>{escape(again.why)}</div>"
    rows = [("duration as programmed", f"{audit.path.duration:.3f} s"), ("duration retimed", f"{again.duration:.3f} s"),
            ("slowest place", f"{100 * again.slowest:.1f} % of the programmed speed"), ("kind", again.style), ("why", again.why)]
    return table((), rows, (_SHORT, _LEFT))


# Without its kernel JupyterLab says in the first of our three outputs that it has no widget: the other two say more. The picture keeps to the width.
# The rules stand in a comment, which style sheets look through, so that an export that shows the tag as text does not show them.
_STILL_STYLE = ("<style><!-- .jp-OutputArea-child:has(+ .jp-OutputArea-child + .jp-OutputArea-child .pathaudit-tables) "
                "> .jupyter-widgets:not(:has(.pa)) { display: none; } "
                ".jp-OutputArea-child:has(+ .jp-OutputArea-child .pathaudit-tables) .jp-RenderedSVG > img { max-width: 100%; } --></style>")


def still_tables(audit, notes=(), applied=None):
    """The findings, placed notes and what belongs to them for the notebook's still form; the class marks it for the live timeline, which hides it.

    applied: the Retiming that made the audit, where one did. One table only: a sanitising export writes the tag of a table's body before each.
    """
    lines, given = [_retimed_line(audit, applied)], _given(audit)
    lines += [f"<b>{what}</b> &nbsp; {escape(file)}, sha256 {sha256}" for what, file, sha256 in given]
    lines += [f"<b>Path</b> &nbsp; {escape(words)}" for words in audit.path.made]
    lines += [f"<b>Not judged</b> &nbsp; {escape(rule)}: {escape(why)}" for rule, why in audit.not_judged]
    lines += ["<b>Cautions</b>", *map(escape, audit.cautions)]
    shown = f"<div><b>Notes</b> &nbsp; {noted.counted(notes)}</div>{notes_list(audit, notes)}" if notes else ""
    return (f'<div class="pathaudit-tables">{verdict_line(audit)}{findings_table(audit)}{shown}{"".join(f"<div>{line}</div>" for line in lines)}'
            f"{_STILL_STYLE}</div>")


def _retimed_line(audit, applied):
    """The times that the audit has, where they are not the programmed ones; else the suggested ones."""
    again = applied or audit.suggestion
    before = applied.rates.motion.path.duration if applied else audit.path.duration
    times = f"{before:.2f} s becomes {again.duration:.2f} s. " if applied or _needed(again) else ""
    return f"<b>{'Shown at other speeds than programmed' if applied else 'Suggested retiming'}</b> &nbsp; {escape(times + again.why)}"


def notes_list(audit, notes, most=noted.LONGEST):
    """Placed notes, a div for each line: a sanitising export shows the tag of a line break as text. most: signs of a text that are shown."""
    lines = []
    for number, placed in enumerate(notes, 1):
        lines.append(f"<div><b>{escape(noted.head(number, placed, audit))}</b></div>")
        lines += [f'<div style="{_NOTE}">{escape(line).replace("  ", "&nbsp; ") or "&nbsp;"}</div>' for line in noted.body(placed, most)]
    return "".join(lines)


def made_list(audit):
    """How the path came about, a paragraph a sentence."""
    return "".join(f"<p>{escape(words)}</p>" for words in audit.path.made)


def inputs_table(audit):
    return table(("", "file", "sha256"), _given(audit), (_LEFT, _LEFT, _NUMBER + ";font-family:monospace"))


def _given(audit):
    """(what, file name, sha256) of every file that the audit rests on."""
    given = [("path", audit.path.file, audit.path.sha256)]
    given += [("cell" if file == audit.cell.file else "arm", file, sha256) for file, sha256 in audit.cell.sources]
    return [(what, PurePath(file).name, sha256) for what, file, sha256 in given]


def limits_table(audit):
    arm = audit.cell.arm
    rows = []
    for j, name in enumerate(arm.joint_names):
        scale, unit = unit_of(arm, j)
        low, high, speed, acceleration = (significant(scale * values[j]) for values in (arm.lower, arm.upper, arm.speed, arm.acceleration))
        travel = f"{low} to {high} {unit}" if low and high else "unlimited"
        rows.append((name, travel, f"{speed} {unit}/s" if speed else "not given", f"{acceleration} {unit}/s²" if acceleration else "not given"))
    return table(("joint", "travel", "speed", "acceleration"), rows, (_LEFT, _NUMBER, _NUMBER, _NUMBER))


def thresholds_table(audit):
    thresholds = audit.cell.thresholds
    values = [(words, significant(getattr(thresholds, name)), unit) for name, (words, unit) in _THRESHOLDS.items()]
    rows = [(words, f"{value} {unit}" if value else "not used") for words, value, unit in values]
    rows.append(("characteristic length of the scaled Jacobian", f"{1e3 * audit.cell.characteristic_length:.0f} mm"))
    return table((), rows, (_LEFT, _NUMBER))


def not_judged_table(audit):
    return table(("not judged", "because"), audit.not_judged) if audit.not_judged else ""


def cautions_list(audit):
    return "".join(f"<div>{escape(words)}</div>" for words in audit.cautions)


