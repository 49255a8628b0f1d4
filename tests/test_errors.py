"""Every message is one plain line."""

import pickle

import pytest

import pathaudit as pa
from pathaudit.errors import ModelError, PathAuditError, ReadError, WriteError, one_line, quoted

ERRORS = [
    (ReadError("seam.csv", "line 7, column x_mm", "an empty cell", "a number"), "seam.csv: line 7, column x_mm: found an empty cell, expected a number"),
    (ReadError("seam.csv", "", "no such file", "a timed path"), "seam.csv: found no such file, expected a timed path"),
    (ModelError("joint j1", "speed limit 0", "a number above 0"), "joint j1: found speed limit 0, expected a number above 0"),
    (WriteError("out.json", "no space left"), "out.json: cannot be written: no space left"),
]


@pytest.mark.parametrize("error, message", ERRORS)
def test_messages(error, message):
    assert str(error) == message
    assert isinstance(error, PathAuditError) and isinstance(error, pa.PathAuditError)


@pytest.mark.parametrize("error, message", ERRORS)
def test_errors_survive_a_process_border(error, message):
    again = pickle.loads(pickle.dumps(error))
    assert type(again) is type(error) and str(again) == message


@pytest.mark.parametrize("text", ["a\nb", "a\r\n\tb", "a\x0bb", "a\u2028b", "a b", "  a \x85 b "])
def test_line_breaks_become_spaces(text):
    assert one_line(text) == "a b"


def test_unprintable_characters_become_escapes():
    assert one_line("a\x00\x1b[31m\udc80\u202e") == r"a\x00\x1b[31m\udc80\u202e"
    assert one_line("Größe 5 µm 角") == "Größe 5 µm 角"
    str(ReadError("f\udcff\n.csv", "", "x", "y")).encode("utf-8")


def test_long_quotes_are_cut():
    assert len(quoted("x" * 10_000)) < 200
    assert quoted("x y") == "'x y'"
