"""Two people's notes made one, without loss."""

from hands import copies, fresh
from hypothesis import given, settings
from hypothesis import strategies as st
from test_values import note

from pathaudit.notes import Notes, merge
from pathaudit.notes.merging import BY_HAND

EARLY, LATE = "2026-12-01T10:00:00Z", "2026-12-01T11:00:00Z"


def texts(notes):
    return sorted(v.text for n in notes.items for v in n.versions if v.text is not None)


@settings(max_examples=30, deadline=None)
@given(copies(2))
def test_the_order_of_the_two_does_not_matter(drawn):
    base, (ours, theirs) = drawn
    assert merge(ours, theirs) == merge(theirs, ours)
    assert merge(ours, theirs, base) == merge(theirs, ours, base)


@settings(max_examples=30, deadline=None)
@given(copies(2))
def test_merging_again_changes_nothing(drawn):
    base, (ours, theirs) = drawn
    both = merge(ours, theirs)
    assert merge(ours, ours) == ours
    assert merge(both, theirs) == both == merge(ours, both)
    assert merge(merge(ours, theirs, base), both) == both


@settings(max_examples=30, deadline=None)
@given(copies(3))
def test_three_people_may_merge_in_any_order(drawn):
    _, (a, b, c) = drawn
    assert merge(merge(a, b), c) == merge(a, merge(b, c)) == merge(merge(c, a), b)


@settings(max_examples=30, deadline=None)
@given(copies(2))
def test_no_text_is_lost(drawn):
    """What stands in a copy stands in the merged notes, unless the other has seen it and put something in its place."""
    base, (ours, theirs) = drawn
    for merged in (merge(ours, theirs), merge(ours, theirs, base)):
        for mine, other in ((ours, theirs), (theirs, ours)):
            for n in mine.items:
                replaced = set(other.by_id[n.id].past) if n.id in other.by_id else set()
                kept = {v.number for v in merged.by_id[n.id].versions}
                assert {v.number for v in n.versions} <= kept | replaced


@settings(max_examples=30, deadline=None)
@given(st.lists(fresh(), max_size=4, unique_by=lambda n: n.id), st.lists(fresh(), max_size=4, unique_by=lambda n: n.id))
def test_notes_added_by_both_are_all_kept(ours, theirs):
    theirs = [n for n in theirs if n.id not in {m.id for m in ours}]
    for base in (None, Notes()):
        assert set(merge(Notes(tuple(ours)), Notes(tuple(theirs)), base).by_id) == {n.id for n in ours + theirs}


def test_an_edit_wins_over_what_it_was_made_on():
    old = Notes((note("old"),))
    new = old.put(old.items[0].edit("new", "Bob", LATE))
    for merged in (merge(old, new), merge(new, old), merge(new, old, old)):
        assert merged == new and not merged.items[0].marked


def test_an_edit_by_both_keeps_both_texts_and_says_whose():
    base = Notes((note("old"),))
    ours, theirs = base.put(base.items[0].edit("ours", "Ann", EARLY)), base.put(base.items[0].edit("theirs", "Bob", LATE))
    for merged in (merge(ours, theirs), merge(ours, theirs, base)):
        both = merged.items[0]
        assert both.marked and both.text == "theirs"
        assert [(v.text, v.by, v.date) for v in both.others] == [("ours", "Ann", EARLY)]
    settled = merged.put(both.edit("agreed", "Ann", LATE))
    assert not settled.items[0].marked and merge(settled, theirs) == settled == merge(ours, settled)


def test_the_same_edit_by_both_is_nothing_to_decide():
    base = Notes((note("old"),))
    ours, theirs = (base.put(base.items[0].edit("same", by, EARLY)) for by in ("Ann", "Bob"))
    assert not merge(ours, theirs).items[0].marked and merge(ours, theirs).items[0].text == "same"


def test_deleted_by_one_and_edited_by_the_other_is_kept_and_marked():
    base = Notes((note("old"),))
    ours, theirs = base.put(base.items[0].delete("Ann", EARLY)), base.put(base.items[0].edit("new", "Bob", LATE))
    for merged in (merge(ours, theirs), merge(theirs, ours, base)):
        kept = merged.items[0]
        assert kept.marked and kept.text == "new" and kept.deletions[0].by == "Ann" and kept.author == "Ann"
    assert merge(merged.put(kept.delete("Bob", LATE)), merged).items[0].deleted


def test_a_deletion_survives_any_number_of_merges():
    base = Notes((note("old"),))
    gone = base.put(base.items[0].delete("Ann", EARLY))
    assert merge(merge(gone, base), merge(base, base, base)).kept == () == merge(base, gone, base).kept
    assert merge(gone, base).items[0].deletions[0].by == "Ann" and "old" not in repr(merge(gone, base))


def test_a_change_by_hand_without_a_trace_is_known_by_the_base():
    base = Notes((note("old"),))
    by_hand = Notes((note("corrected in the editor"),))
    assert texts(merge(by_hand, base)) == ["corrected in the editor", "old"]
    assert texts(merge(by_hand, base, base)) == ["corrected in the editor"]


def test_lines_taken_out_by_hand():
    base = Notes((note("old"), note("other", 20.0, "m")))
    without = Notes(base.items[1:])
    assert merge(without, base, base) == without
    edited = base.put(base.items[0].edit("new", "Bob", LATE))
    kept = merge(without, edited, base).by_id["k7f3mq"]
    assert kept.marked and kept.text == "new" and kept.deletions[0].by == BY_HAND


def test_settled_by_one_and_edited_by_the_other():
    base = Notes((note("old"),))
    ours, theirs = base.put(base.items[0].settle(True, "Ann", EARLY)), base.put(base.items[0].edit("new", "Bob", LATE))
    for merged in (merge(ours, theirs), merge(ours, theirs, base)):
        assert merged.items[0].text == "new" and merged.items[0].status.by == "Ann" and not merged.items[0].marked


def test_a_key_that_is_not_ours_comes_through():
    from dataclasses import replace

    base = Notes((replace(note(), extra=((("photo",), "a.jpg"),)),))
    ours = Notes((replace(base.items[0], extra=((("photo",), "b.jpg"),)),))
    theirs = Notes((replace(base.items[0], extra=((("photo",), "a.jpg"), (("shift",), 2))),))
    assert dict(merge(ours, theirs, base).items[0].extra) == {("photo",): "b.jpg", ("shift",): 2}
    for merged in (merge(Notes((note(),)), theirs, base), merge(theirs, Notes((note(),)), base)):
        assert dict(merged.items[0].extra) == {("shift",): 2}
