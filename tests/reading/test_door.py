"""The door: what a file is by its content, what is asked for, and what is refused in words."""

import json

import numpy as np
import pytest

import pathaudit as pa
from pathaudit.reading import door
from pathaudit.reading.options import FORMATS, ReadOptions
from pathaudit.reading.sniffing import sniff

SEAM = "t_s,x_mm,y_mm,z_mm,i,j,k\n0,0,0,0,0,0,-1\n1,5,0,0,0,0,-1\n"
LINES = '{"t_s": 0, "x_mm": 0, "y_mm": 0, "z_mm": 0, "i": 0, "j": 0, "k": -1}\n{"t_s": 1, "x_mm": 5, "y_mm": 0, "z_mm": 0, "i": 0, "j": 0, "k": -1}\n'

SEEN = [
    (SEAM, "timed"),
    ("\ufeff# note\n\n" + SEAM, "timed"),
    (SEAM.replace(",", ";"), "timed"),
    (SEAM.replace("t_s", "time"), "timed"),
    ("# only\n", "timed"),
    ("a,b,c\n1,2,3\n", "timed"),
    ("x_mm,y_mm,z_mm,i,j,k,speed_mm_s,move\n", "waypoints"),
    ("%\nN10 G71 G90\n", "iso6983"),
    ("N10 G00 X0 Y0\n", "iso6983"),
    ("(a part)\nG71 G90 G00 X1.5\n", "iso6983"),
    ("G1X5F100\r\n", "iso6983"),
    ("PARTNO SEAM 3\nUNITS/MM\n", "cutter-location"),
    ("$$ made by hand\nUNITS/MM\n", "cutter-location"),
    ("GOTO/1,2,3\n", "cutter-location"),
    ("rapid\ngoto/1,2,3\n", "cutter-location"),
    (LINES, "json-lines"),
    (b"PAR1\x15\x04", "parquet"),
    (b"ARROW1\0\0\xff\xff", "feather"),
]


@pytest.mark.parametrize("content, kind", SEEN)
def test_the_content_says_what_a_file_is(content, kind):
    assert sniff("a", content if isinstance(content, bytes) else content.encode()) == kind


REFUSED = [
    (b"PK\x03\x04rest", "found a spreadsheet or zip archive, expected the sheet saved as CSV"),
    (b"\xd0\xcf\x11\xe0\xa1\xb1", "found an old spreadsheet"),
    (b"\x1f\x8b\x08\0", "found a gzip archive, expected the file unpacked"),
    (b"FEA1....", "found a Feather table of the first version"),
    (b"%PDF-1.7\n", "found a PDF document"),
    (b"\x7fELF\x02\x01\x01\0\0\0", "line 1: found binary data"),
    ("<?xml version='1.0'?>\n<robot name='a'>", "found XML text (an arm in URDF), expected a path: CSV"),
    ('name = "bench"\n[arm]\n', "found a TOML text such as a cell, expected a path: CSV with"),
    ('[arm]\nurdf = "a"\n', "did the path and the cell change places?"),
    ("[1, 2]\n", "found a JSON document, expected JSON lines"),
    ('{\n "a": 1\n}\n', "found a JSON document, expected JSON lines"),
    ("Dear colleague\n", "found text that begins with 'Dear colleague', expected a path: CSV"),
    ("t_s,j1_deg,j1_deg_s,sigma_min,speed_use\n0,1,2,3,4\n", "header: found the joint motion that --joints writes, which holds no poses, expected the path that was checked"),
    (json.dumps({"format": "pathaudit.check/1", "path": {}}, indent=1), "found the results of a check (JSON), which hold no poses"),
    (json.dumps({"format": "pathaudit.check/1", "path": {}}), "found the results of a check (JSON), which hold no poses"),
]


@pytest.fixture
def file(tmp_path):
    def file(content, name="seam.x"):
        place = tmp_path / name
        place.write_bytes(content if isinstance(content, bytes) else content.encode())
        return place

    return file


def refusal(file, *arguments, **choices):
    with pytest.raises(pa.PathAuditError) as caught:
        pa.read_path(file, *arguments, **choices)
    message = str(caught.value)
    assert "\n" not in message
    return message


@pytest.mark.parametrize("content, words", REFUSED)
def test_what_is_not_known_is_refused_in_one_line(file, content, words):
    assert words in refusal(file(content))


def test_the_name_of_a_file_does_not_matter(file):
    for name in ("seam.csv", "seam.nc", "seam.parquet", "seam"):
        assert pa.read_path(file(SEAM, name)).samples == 2


def test_a_format_is_asked_for_and_the_content_is_another(file):
    assert pa.read_path(file(SEAM), "timed").samples == 2
    words = refusal(file(SEAM), "json-lines")
    assert "line 1: found text that is no JSON object" in words and words.endswith("(the content looks like a timed path (CSV))")
    assert "the content looks like JSON lines" in refusal(file(LINES), format="timed")


def test_what_a_file_was_taken_for_is_told(file):
    assert refusal(file(LINES.replace('"t_s": 1', '"t_s": true'))).endswith("line 2, column t_s: found 'true', expected a number (taken for JSON lines)")
    hole = "line 2, column t_s: found 'null', expected a number (taken for JSON lines; a recorded log with holes is repaired with --format recorded)"
    assert refusal(file(LINES.replace('"t_s": 1', '"t_s": null'))).endswith(hole)


def test_every_format_has_a_reader_and_every_choice_belongs_to_one():
    assert set(door.READERS) == set(FORMATS) >= set(door.USES)
    names = set(ReadOptions.__dataclass_fields__) - {"format"}
    assert set().union(*door.USES.values()) == names


@pytest.mark.parametrize(
    "choices, words",
    [
        ({"format": "xlsx"}, "format: found 'xlsx', expected one of timed, waypoints, iso6983"),
        ({"axis": "0,0"}, "axis: found '0,0', expected three numbers i,j,k"),
        ({"axis": (0, 0, 0)}, "axis: found"),
        ({"units": "cm"}, "units: found 'cm', expected one of mm, inch"),
        ({"speed_mm_s": 0}, "speed_mm_s: found '0', expected a number above 0"),
        ({"smooth_ms": "soft"}, "smooth_ms: found 'soft'"),
        ({"step_s": float("nan")}, "step_s: found 'nan'"),
        ({"smooth_ms": 20}, "smooth_ms: found 20.0, expected no such choice for a timed path (CSV); it belongs to a recorded path"),
        ({"inch_codes": True}, "inch_codes: found True, expected no such choice for a timed path (CSV); it belongs to machine code"),
        ({"axis": "0,0,-1"}, "axis: found (0.0, 0.0, -1.0), expected no such choice"),
    ],
)
def test_choices_that_make_no_sense(file, choices, words):
    assert words in refusal(file(SEAM), **choices)


def test_an_axis_gets_length_1():
    np.testing.assert_allclose(ReadOptions(axis="0, 3, -4").axis, (0, 0.6, -0.8))
