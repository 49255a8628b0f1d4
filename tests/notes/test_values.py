"""Notes as values: versions, status, deletion, names."""

import re

import pytest
from hands import copies
from hypothesis import given, settings

from pathaudit.notes import Note, Notes
from pathaudit.notes.values import LONGEST_NAME, Status, Version, name, new_id, now, sound


def note(text="first", at_mm=10.0, id="k7f3mq"):
    return Note(id, at_mm, (Version("Ann", "2026-12-01T09:00:00Z", text),), "Ann", "2026-12-01T09:00:00Z")


def test_an_edit_takes_the_place_of_the_text_and_remembers_which():
    before = note()
    after = before.edit("second", "Bob", "2026-12-01T10:00:00Z")
    assert (after.text, after.newest.by, after.author) == ("second", "Bob", "Ann")
    assert after.past == (before.newest.number,) and len(after.versions) == 1 and not after.marked
    assert before.text == "first"


def test_back_to_an_earlier_text_is_a_version_of_its_own():
    first = note()
    again = first.edit("second", "Ann", "2026-12-01T09:00:00Z").edit("first", "Ann", "2026-12-01T09:00:00Z")
    assert again.text == "first" and again.newest.number not in again.past and len(again.past) == 2


def test_settled_and_reopened_say_who_and_when():
    settled = note().settle(True, " Bob\n ", "2026-12-01T10:00:00Z")
    assert settled.status == Status(True, "Bob", "2026-12-01T10:00:00Z")
    again = settled.settle(False, "Ann", "2026-12-01T09:59:00Z")      # Ann's clock is slow, yet she came later
    assert not again.status.settled and again.status.date > settled.status.date


def test_what_is_left_of_a_deleted_note_has_no_text():
    gone = note("a secret").delete("Bob", "2026-12-01T10:00:00Z")
    assert gone.deleted and gone.at_mm == 10.0 and gone.deletions[0].by == "Bob"
    assert "secret" not in repr(gone) and Notes((gone,)).kept == ()


def test_notes_stand_in_the_order_of_the_path():
    notes = Notes((note(at_mm=5.0, id="b"), note(at_mm=7.0, id="a"), note(at_mm=5.0, id="a2")))
    assert [n.id for n in notes.items] == ["a2", "b", "a"]
    assert [n.text for n in notes.put(note("new", 5.0, "b")).items] == ["first", "new", "first"]


def test_ids_are_short_and_none_that_is_taken():
    made = {new_id() for _ in range(300)}
    assert len(made) == 300 and all(re.fullmatch("[a-z][a-z2-9]{5}", id) for id in made)
    assert new_id(made) not in made


def test_halves_of_a_pair_of_code_units():
    assert sound("\ud83d\ude00") == "😀" and sound("a\ud83db") == "a\ufffdb"
    assert name("  Ann \r\n Lee\t") == "Ann Lee" and len(name("x" * 500)) == LONGEST_NAME


def test_the_date_is_utc():
    assert re.fullmatch(r"\d{4}-\d\d-\d\dT\d\d:\d\d:\d\dZ", now())


def test_a_note_is_never_changed_in_place():
    with pytest.raises(AttributeError):
        note().author = "Bob"


@settings(max_examples=30, deadline=None)
@given(copies(1))
def test_whatever_is_done_to_a_note_the_newest_text_is_shown(drawn):
    for n in drawn[1][0].items:
        assert n.deleted == all(v.text is None for v in n.versions) and not n.marked
        assert n.newest.number not in n.past
