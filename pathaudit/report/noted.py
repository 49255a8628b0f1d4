"""Placed notes as words and plain values: what text, tables, JSON and the live timeline say of them."""

import re

from .scene import clock_offset, significant

LONGEST = 1000  # signs of a text that are shown where there is little room

_UNSEEN = re.compile("[\0-\x08\x0b-\x1f\x7f-\x9f\u061c\u200b\u200e\u200f\u2028-\u202e\u2060-\u206f\ufeff\ufff9-\ufffb]")


def visible(text) -> str:
    """Text in which nothing acts on a terminal or turns a line around: signs that do not show become their escapes; line breaks stay."""
    return _UNSEEN.sub(lambda found: found[0].encode("unicode_escape").decode(), text.replace("\r\n", "\n").replace("\r", "\n"))


def json_text(text) -> str:
    """The same for JSON text, where such signs stand in strings only."""
    return _UNSEEN.sub(lambda found: f"\\u{ord(found[0]):04x}", text)


def shortened(text, most=LONGEST) -> str:
    """The beginning of a long text, and how much more there is."""
    return text if len(text) <= most else f"{text[:most]} … ({len(text) - most:,} more signs)"


def where(placed, audit) -> str:
    """ "12.34 s, 296.2 mm": the note's place now, on the clock of the audit on show, which may be a retimed one"""
    return f"{audit.time[placed.sample] - audit.time[0] + clock_offset(audit):.2f} s, {placed.at_mm:.1f} mm"


def day(date) -> str:
    """ "2026-12-01 09:30 UTC" """
    return f"{date[:10]} {date[11:16]} UTC" if date else ""


def signed(by, date) -> str:
    """ "Ann, 2026-12-01 09:30 UTC" """
    return ", ".join(filter(None, (by or "unnamed", day(date))))


def pinned(pin) -> str:
    """The finding that a note belongs to, as it was: "fail: joint speed, j4, 712 deg/s (limit 410)"; '' for none."""
    if pin is None:
        return ""
    worst = f"{significant(pin.value)} {pin.unit}".strip() + (f" (limit {significant(pin.limit)})" if significant(pin.limit) else "")
    return f"{pin.severity}: " + ", ".join(filter(None, (pin.kind, pin.joint, worst if significant(pin.value) else "")))


def state(note) -> str:
    """ "open", or who settled it and when"""
    status = note.status
    if not status.date:
        return "settled" if status.settled else "open"
    return f"{'settled' if status.settled else 'reopened'} by {signed(status.by, status.date)}"


def to_decide(note) -> str:
    """What a merge has kept and somebody has to decide, in one sentence; '' for nothing."""
    if not note.marked:
        return ""
    writers, removers = [[f"{v.by or 'somebody'} ({day(v.date)})" if v.date else v.by or "somebody" for v in found]
                         for found in ((note.newest, *note.others), note.deletions)]
    said = [f"Written by {' and by '.join(writers)} without knowing of each other: all texts are kept."] if note.others else []
    if removers:
        said.append(f"Deleted by {' and by '.join(removers)}, edited by {writers[0]}: kept.")
    return " ".join(said)


def note_values(number, placed, audit) -> dict:
    """A placed note for JSON. at_s, at_mm, sample: where it stands now; noted_s, noted_mm: where it was written."""
    note, newest, pin = placed.note, placed.note.newest, placed.note.finding
    return {
        "number": number, "id": note.id, "status": "settled" if note.status.settled else "open", "status_by": note.status.by or None,
        "status_date": note.status.date or None, "author": note.author, "date": note.date or None, "text": note.text,
        "text_by": newest.by, "text_date": newest.date or None, "at_s": placed.time_s, "at_mm": placed.at_mm, "sample": placed.sample,
        "noted_s": note.place.at_s if note.place else None, "noted_mm": note.at_mm, "stale": placed.stale,
        "finding": {key: getattr(pin, key) for key in ("kind", "severity", "joint", "value", "limit", "unit")} if pin else None,
        "to_decide": to_decide(note), "other_texts": [{"by": v.by, "date": v.date or None, "text": v.text} for v in note.others],
    }  # fmt: skip


def for_view(placed, audit) -> dict:
    """A placed note for the live timeline."""
    note, newest = placed.note, placed.note.newest
    edited = f"edited by {signed(newest.by, newest.date)}" if (newest.by, newest.date) != (note.author, note.date) else ""
    return {
        "id": note.id, "sample": placed.sample, "where": where(placed, audit), "finding": pinned(note.finding), "author": note.author or "unnamed",
        "date": day(note.date), "text": note.text, "edited": edited, "settled": note.status.settled, "status": state(note), "stale": placed.stale,
        "mark": to_decide(note), "others": [{"by": signed(v.by, v.date), "text": v.text} for v in note.others],
    }  # fmt: skip


def counted(notes) -> str:
    """ "3 notes, 1 settled, 2 stale" """
    marks = (("settled", sum(p.note.status.settled for p in notes)), ("stale", sum(bool(p.stale) for p in notes)),
             ("to decide", sum(p.note.marked for p in notes)))
    return ", ".join([f"{len(notes)} note{'' if len(notes) == 1 else 's'}", *(f"{count} {what}" for what, count in marks if count)])


def head(number, placed, audit=None) -> str:
    """A note's first line: number, status, place, author, finding."""
    note = placed.note
    place = where(placed, audit) if audit else f"{note.at_mm:.1f} mm"
    said = [state(note), place, signed(note.author, note.date), pinned(note.finding)]
    return f"{number}  " + visible("; ".join(filter(None, said)))


def body(placed, most=LONGEST) -> list:
    """The lines below a note's first line: its text, other texts, what is to decide, what has changed."""
    note = placed.note
    parts = [("", shortened(note.text, most)), *((f"or, by {signed(v.by, v.date)}: ", shortened(v.text, most)) for v in note.others)]
    parts += [(f"{what}: ", text) for what, text in (("To decide", to_decide(note)), ("Stale", placed.stale)) if text]
    return visible("\n".join(what + text for what, text in parts)).split("\n")
