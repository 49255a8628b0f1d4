"""The file of notes: what is written comes back, what people and version control do to it, and what is never overwritten."""

import os
import subprocess
import tomllib

import pytest
from hands import copies, fresh, texts
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from test_values import note

from pathaudit.errors import ReadError, WriteError
from pathaudit.notes import Notes, merge, notes_text, read_notes, write_notes
from pathaudit.notes.from_toml import notes_from
from pathaudit.notes.to_toml import HEAD

MANY = settings(max_examples=40, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture, HealthCheck.too_slow])


def back(text):
    return Notes(notes_from("x.notes.toml", text))


@MANY
@given(copies(2))
def test_whatever_was_written_comes_back(drawn):
    base, (ours, theirs) = drawn
    for notes in (base, ours, merge(ours, theirs)):
        text = notes_text(notes)
        assert back(text) == notes and notes_text(back(text)) == text
        assert back(text.replace("\n", "\r\n")) == notes if "\r" not in text else True


@settings(deadline=None)
@given(texts)
def test_any_text_comes_back(text):
    written = notes_text(Notes((note(text),)))
    assert back(written).items[0].text == text
    shown = written[len(HEAD):]
    assert all(sign.isprintable() or sign in "\n\u200d\u200c" or ord(sign) >= 0xA0 for sign in shown.replace("\t", ""))
    assert not any(sign in shown for sign in "\x1b\0\r\x7f\u202e\u2028\ufeff")
    assert not any(line.endswith((" ", "\t")) for line in shown.split("\n")[:-1])


def test_it_reads_well():
    text = notes_text(Notes((note('Tip the torch 2 degrees\nbefore the "corner".'), note("Gas: 14 l/min", 20.0, "n2"))))
    assert text == HEAD + '''
k7f3mq.at_mm = 10.0
k7f3mq.author = "Ann"
k7f3mq.date = 2026-12-01T09:00:00Z
k7f3mq.status = "open"
k7f3mq.text = """
Tip the torch 2 degrees
before the "corner"."""

n2.at_mm = 20.0
n2.author = "Ann"
n2.date = 2026-12-01T09:00:00Z
n2.status = "open"
n2.text = "Gas: 14 l/min"
'''


def test_a_long_text_has_a_margin_which_may_be_edited_by_hand():
    notes = Notes((note("one\ntwo\n\n  four\nfive"),))
    text = notes_text(notes)
    assert "k7f3mq | one\nk7f3mq | two\nk7f3mq |\nk7f3mq |   four\n" in text
    assert back(text.replace("k7f3mq | two", "zwei")).items[0].text == "one\nzwei\n\n  four\nfive"


def test_a_hundred_kilobytes():
    text = ('A line with "quotes", a \\ and an 😀.\n' * 2900)[:100_000]
    assert len(text) > 95_000 and back(notes_text(Notes((note(text),)))).items[0].text == text


def test_what_a_hand_may_write_in_short():
    notes = back('n1.at_mm = 120\nn1.text = "Check here."\n\n[n2]\nat_mm = 80.5\ntext = """\nOn two\nlines"""\nauthor = "Bob"\n')
    assert [(n.id, n.at_mm, n.text, n.author) for n in notes.items] == [("n2", 80.5, "On two\nlines", "Bob"), ("n1", 120.0, "Check here.", "")]
    assert back(notes_text(notes)) == notes


def test_keys_that_are_not_ours_are_handed_through():
    text = notes_text(Notes((note(),))) + 'k7f3mq.photo = ["a.jpg", { at = 2026-12-01, "on the left" = true }]\nk7f3mq.finding.kind = "joint speed"\n' \
        'k7f3mq.finding.severity = "fail"\nk7f3mq.finding.seen = 3\n'
    kept = notes_text(back(text))
    values = tomllib.loads(kept)["k7f3mq"]
    assert values == tomllib.loads(text)["k7f3mq"] and values["finding"]["seen"] == 3


WRONG = [
    ("at_mm", "'far'", "line 3, k7f3mq.at_mm: found 'far', expected a number"),
    ("at_mm", "nan", "line 3, k7f3mq.at_mm: found nan, expected a number"),
    ("at_mm", "true", "line 3, k7f3mq.at_mm: found true, expected a number"),
    ("author", "3", "line 4, k7f3mq.author: found 3, expected a text in quotes"),
    ("date", "2026-12-01T09:00:00", "line 5, k7f3mq.date: found 2026-12-01 09:00:00, expected a date and time with its offset"),
    ("date", "'yesterday'", "line 5, k7f3mq.date: found 'yesterday', expected a date and time with its offset"),
    ("date", "0001-01-01T00:00:00+23:00", "line 5, k7f3mq.date: found 0001-01-01 00:00:00+23:00, expected a date and time with its offset"),
    ("status", "'done'", "line 6, k7f3mq.status: found 'done', expected \"open\" or \"settled\""),
    ("text", "['a']", "line 7, k7f3mq.text: found a list of 1, expected a text in quotes"),
    ("text", '"unfinished', "line 7, column"),
]


@pytest.mark.parametrize("key, value, said", WRONG, ids=[f"{key} {value}" for key, value, _ in WRONG])
def test_a_mistake_is_told_with_its_line(key, value, said):
    lines = notes_text(Notes((note(),))).replace("\n\n", "\n# a remark\n").split("\n")
    text = "\n".join(f"k7f3mq.{key} = {value}" if line.startswith(f"k7f3mq.{key} ") else line for line in lines)
    with pytest.raises(ReadError) as caught:
        back(text)
    assert said in str(caught.value) and "\n" not in str(caught.value)


@pytest.mark.parametrize("text, said", [
    ("name = 'Bench 3'\n[arm]\nurdf = 'a.urdf'\n", "line 1, name: found 'Bench 3', expected lines that begin with the id of a note"),
    ("[tool]\nxyz_mm = [0, 0, 1]\n", "line 1, tool: found a note without at_mm, expected tool.at_mm"),
    ("Big.at_mm = 1\nBig.text = ''\n", "line 1, Big: found the id 'Big', expected small letters and digits"),
    ("a.at_mm = 1\n", "line 1, a: found a note without text"),
    ("a.at_mm = 1\na.text = ''\na.position_mm = [1, 2]\n", "line 3, a.position_mm: found a list of 2, expected 3 numbers"),
    ("a.at_mm = 1\na.text = ''\na.finding = 3\n", "line 3, a.finding: found 3, expected a table"),
    ("a.at_mm = 1\na.text = ''\na.finding.kind = 'x'\n", "a.finding: found a finding without severity"),
    ("a.at_mm = 1\na.deleted = [{ who = 'x' }]\n", "line 2, a.deleted: found the key 'who', expected by and date"),
    ("a.at_mm = 1\na.deleted = ['x']\n", "a.deleted: found 'x', expected a table"),
    ("a.at_mm = 1\na.text = ''\na.other.x = { by = 'Bob' }\n", "a.other.x: found no text"),
    ("a.at_mm = 1\na.text = ''\na.text = ''\n", "line 3, column 12: found text that is not TOML (Cannot overwrite a value)"),
])
def test_what_is_no_file_of_notes(text, said):
    with pytest.raises(ReadError) as caught:
        back(text)
    assert said in str(caught.value) and str(caught.value).startswith("x.notes.toml: ")


def test_marks_of_a_merge_are_said_in_one_line():
    text = 'a.at_mm = 1\n<<<<<<< HEAD\na.text = "x"\n=======\na.text = "y"\n>>>>>>> other\n'
    with pytest.raises(ReadError, match="x.notes.toml: line 2: found the marks of an unfinished merge .'<<<<<<< HEAD'., expected notes merged to the end"):
        back(text)
    inside = 'a.at_mm = 1\na.text = """\nfirst\n=======\nsecond"""\n'      # such a file would be TOML
    with pytest.raises(ReadError, match="line 4: found the marks"):
        back(inside)


def git_merge(folder, ours, theirs, base, *options):
    for name, notes in (("ours", ours), ("base", base), ("theirs", theirs)):
        (folder / name).write_text(notes_text(notes) if notes is not None else "", encoding="utf-8")
    run = subprocess.run(["git", "merge-file", "-p", *options, "ours", "base", "theirs"], cwd=folder, capture_output=True)
    return run.returncode, run.stdout.decode()


TEMPLATE = "Torch angle:\nStick-out:\n\nGas:\nWire:\n\n\n\n\nSeen by:"


@MANY
@given(st.data())
def test_notes_added_by_two_people_merge_by_lines(tmp_path, data):
    """Real git, both sides' lines kept: at the same place, by the same author in the same second, with the same words."""
    base = Notes(tuple(data.draw(fresh(id)) for id in ["aaaaaa", "bbbbbb"][: data.draw(st.integers(0, 2))]))
    twin = data.draw(fresh("twin1a"))
    if data.draw(st.booleans()):
        twin = twin.edit(TEMPLATE, twin.author, twin.date)
    ours = [twin, *(data.draw(fresh(f"own1{k}x")) for k in range(data.draw(st.integers(0, 2))))]
    theirs = [data.draw(fresh("twin2b")), *(data.draw(fresh(f"own2{k}x")) for k in range(data.draw(st.integers(0, 2))))]
    theirs[0] = twin.__class__(**{**vars(twin), "id": "twin2b"}) if data.draw(st.booleans()) else theirs[0]
    ours, theirs = Notes((*base.items, *ours)), Notes((*base.items, *theirs))
    before = base if base.items or data.draw(st.booleans()) else None
    status, merged = git_merge(tmp_path, ours, theirs, before, "--union")
    assert status == 0 and back(merged) == merge(ours, theirs)


def test_notes_at_different_places_need_no_help_at_all(tmp_path):
    base = Notes(tuple(note(f"note {k}", 10.0 * k, f"n{k}") for k in range(5)))
    ours, theirs = base.put(note("ours", 15.0, "o")), base.put(note("theirs", 35.0, "t").settle(True, "Bob"))
    ours = ours.put(base.by_id["n4"].delete("Ann"))
    status, merged = git_merge(tmp_path, ours, theirs, base)
    assert status == 0 and back(merged) == merge(ours, theirs, base)


def test_what_both_have_edited_is_refused_until_it_is_merged(tmp_path):
    base = Notes((note(),))
    ours, theirs = (base.put(base.items[0].edit(f"by {by}", by)) for by in ("Ann", "Bob"))
    status, merged = git_merge(tmp_path, ours, theirs, base)
    assert status > 0
    with pytest.raises(ReadError, match="the marks of an unfinished merge"):
        back(merged)
    with pytest.raises(ReadError, match="Cannot overwrite a value"):
        back(git_merge(tmp_path, ours, theirs, base, "--union")[1])


def test_saving_and_reading(tmp_path):
    file = tmp_path / "seam.notes.toml"
    notes = write_notes(file, Notes((note("ü 😀"),)))
    assert read_notes(file) == notes and read_notes(file).sha256 == notes.sha256
    before = file.stat().st_mtime_ns
    assert write_notes(file, notes, notes) == notes and file.stat().st_mtime_ns == before


def test_what_somebody_else_has_saved_meanwhile_stays(tmp_path):
    file = tmp_path / "seam.notes.toml"
    base = write_notes(file, Notes((note("old"), note("second", 20.0, "s"))))
    write_notes(file, base.put(note("theirs", 30.0, "t")).put(base.by_id["s"].delete("Bob")), base)
    ours = base.put(note("ours", 5.0, "o")).put(base.by_id["k7f3mq"].edit("new", "Ann"))
    saved = write_notes(file, ours, base)
    assert [n.text for n in saved.kept] == ["ours", "new", "theirs"] and read_notes(file) == saved


def test_a_file_of_the_same_name_that_nobody_has_read_is_merged_too(tmp_path):
    file = tmp_path / "seam.notes.toml"
    write_notes(file, Notes((note("theirs"),)))
    assert [n.text for n in write_notes(file, Notes((note("ours", 5.0, "o"),))).kept] == ["ours", "theirs"]


@pytest.mark.parametrize("content", [b"n1.at_mm = ", b"", b"\xff\xfen", b"n1.at_mm = 1\nn1.text = '\0'", b"name = 'Bench'", b"<<<<<<< HEAD\n"])
def test_a_file_that_cannot_be_understood_is_never_overwritten(tmp_path, content):
    file = tmp_path / "seam.notes.toml"
    file.write_bytes(content)
    for base in (None, Notes((note(),), "0" * 64)):
        with pytest.raises(ReadError, match="seam.notes.toml"):
            write_notes(file, Notes((note(),)), base)
    assert file.read_bytes() == content and os.listdir(tmp_path) == ["seam.notes.toml"]


def test_a_full_disk_leaves_the_old_file(tmp_path, monkeypatch):
    file = tmp_path / "seam.notes.toml"
    base = write_notes(file, Notes((note("old"),)))

    def full(*_):
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(os, "fsync", full)
    with pytest.raises(WriteError, match="seam.notes.toml: cannot be written: No space left on device"):
        write_notes(file, base.put(note("new", 5.0, "n")), base)
    assert read_notes(file) == base and os.listdir(tmp_path) == ["seam.notes.toml"]
