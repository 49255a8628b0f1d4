"""Placed notes in every report: as words, tables, JSON and page; hostile text comes out as text."""

import json
import re
from types import SimpleNamespace

import numpy as np
import pytest
from fake_audit import fake_audit
from test_page import text_of

from pathaudit.cell import Thresholds
from pathaudit.notes import Notes, merge, new_note, placed
from pathaudit.report.html_tables import still_tables
from pathaudit.report.noted import LONGEST, counted, for_view, pinned, shortened, state, to_decide, visible
from pathaudit.report.page import one_page
from pathaudit.report.tables import check_json
from pathaudit.report.text import notes_text, summary

DATE, LATER = "2026-12-01T09:30:00Z", "2026-12-02T10:00:00Z"
HOSTILE = '<script>alert(1)</script> "]]> &amp; \x1b[31mred\x1b[0m \x9b2J \0 \u202eevil \u2028 <b>bold</b>'


@pytest.fixture(scope="module")
def audit():
    made = fake_audit(1000)
    made.cell.thresholds = Thresholds()
    return made


def noted(audit, *texts, **options):
    notes = Notes()
    for k, text in enumerate(texts):
        notes = notes.put(new_note(audit, 100 + 50 * k, text, options.get("author", "Ann"), date=DATE, taken=notes.by_id))
    return notes


def test_words(audit):
    notes = noted(audit, "first", "second")
    first = placed(notes.put(notes.items[0].settle(True, "Bob", LATER)), audit)[0]
    shown = for_view(first, audit)
    assert re.fullmatch(r"1\.40 s, \d+\.\d mm", shown["where"]) and shown["sample"] == 100
    assert (shown["author"], shown["date"], shown["text"], shown["settled"]) == ("Ann", "2026-12-01 09:30 UTC", "first", True)
    assert shown["status"] == "settled by Bob, 2026-12-02 10:00 UTC" and shown["edited"] == shown["stale"] == shown["mark"] == ""
    assert counted([first]) == "1 note, 1 settled" and counted(placed(notes, audit)) == "2 notes"
    assert state(notes.items[0].settle(True, "B", DATE).settle(False, "Bob", LATER)) == "reopened by Bob, 2026-12-02 10:00 UTC"


def test_the_clock_of_a_path_that_starts_at_a_date():
    audit = fake_audit(200)
    audit.path.time = audit.time = audit.time + 1.7e9
    assert for_view(placed(noted(audit, "x"), audit)[0], audit)["where"].startswith("7.04 s, ")


def test_the_finding_that_a_note_belongs_to(audit):
    number = next(k for k, f in enumerate(audit.finding_list) if f.kind == "joint speed" and f.severity == "fail")
    note = new_note(audit, None, "x", "Ann", finding=number)
    assert re.fullmatch(r"fail: joint speed, j\d, [\d.]+ deg/s \(limit [\d.]+\)", pinned(note.finding)) and pinned(None) == ""


def test_what_is_to_decide(audit):
    base = noted(audit, "first")
    ours, theirs, gone = (base.put(n) for n in (base.items[0].edit("a", "Ann", DATE), base.items[0].edit("b", "Bob", LATER), base.items[0].delete("Cy", LATER)))
    assert to_decide(merge(ours, theirs).items[0]) \
        == "Written by Bob (2026-12-02 10:00 UTC) and by Ann (2026-12-01 09:30 UTC) without knowing of each other: all texts are kept."
    assert to_decide(merge(ours, gone).items[0]) == "Deleted by Cy (2026-12-02 10:00 UTC), edited by Ann (2026-12-01 09:30 UTC): kept."
    assert to_decide(base.items[0]) == ""
    text = notes_text(placed(merge(ours, theirs), audit), audit)
    assert "\n      b\n      or, by Ann, 2026-12-01 09:30 UTC: a\n      To decide: Written by" in text


def test_hostile_text_is_text_everywhere(audit):
    notes = placed(noted(audit, HOSTILE, "x", author=HOSTILE), audit)
    page, still, text, values = one_page(audit, notes), still_tables(audit, notes), summary(audit, notes), check_json(audit, notes)
    for html in (page, still):
        assert "<script>alert" not in html and "<b>bold" not in html and r"&lt;script&gt;alert(1)&lt;/script&gt; &quot;]]&gt; &amp;amp; \x1b[31mred" in html
    assert page.count("<script") == 4
    for shown in (page, still, text, values):
        assert not any(sign in shown for sign in "\x1b\x9b\0\u202e\u2028")
    assert r"<script>alert(1)</script> " in text and r"\x1b[31mred\x1b[0m \x9b2J \x00 \u202eevil" in text
    assert json.loads(values)["notes"][0]["text"] == HOSTILE
    told = json.loads(re.search(r'id="notes">(.*?)</script>', page, re.DOTALL)[1])
    assert [n["text"] for n in told] == [HOSTILE, "x"]


def test_line_breaks_are_kept(audit):
    notes = placed(noted(audit, "one\r\ntwo\n\n  three"), audit)
    assert re.search(r">one</div><div [^>]*>two</div><div [^>]*>&nbsp;</div><div [^>]*>&nbsp; three</div>", still_tables(audit, notes))
    assert "\n      one\n      two\n\n        three\n" in summary(audit, notes)
    assert visible("a\rb\tc") == "a\nb\tc"


def test_stale_and_number_in_every_report(audit):
    notes = noted(audit, "first", "second")
    moved = SimpleNamespace(**{**vars(audit), "path": SimpleNamespace(**{**vars(audit.path), "position": audit.path.position + np.array([0, 0, 0.004])})})
    found = placed(notes, moved)
    values = json.loads(check_json(moved, found))["notes"]
    assert [v["number"] for v in values] == [1, 2] and values[0]["stale"].startswith("The path has moved by ")
    for shown in (text_of(one_page(moved, found)), text_of(still_tables(moved, found)), summary(moved, found)):
        assert "2 notes, 2 stale" in shown or "Notes 1" in shown and shown.count("Stale: The path has moved by") == 2


def test_without_notes_nothing_is_said_of_them(audit):
    assert "Notes" not in summary(audit) and "Notes" not in still_tables(audit) and "<h2>Notes" not in one_page(audit)
    assert json.loads(check_json(audit))["notes"] == []


def test_a_long_text_is_shortened_where_there_is_little_room(audit):
    long = "word " * 20_000
    notes = placed(noted(audit, long), audit)
    assert len(still_tables(audit, notes)) < 20_000 and "more signs)" in still_tables(audit, notes) and "more signs)" in summary(audit, notes)
    assert json.loads(check_json(audit, notes))["notes"][0]["text"] == long
    assert "word " * 19_999 in one_page(audit, notes)
    assert shortened("x" * LONGEST) == "x" * LONGEST


def test_the_still_form_stays_small_with_twenty_notes():
    from pathaudit.widgets.still_form import still_form

    audit = fake_audit(2000)
    notes = placed(noted(audit, *["A note of some length, as people write them. " * 8] * 20), audit)
    picture, _ = still_form(audit)
    tables = {"text/html": still_tables(audit, notes), "text/plain": summary(audit, notes)}
    assert len(json.dumps(picture)) + len(json.dumps(tables)) <= 200_000
