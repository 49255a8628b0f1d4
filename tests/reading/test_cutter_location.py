"""Cutter-location text: the rows from outside, statements in all their forms, and each word that is refused."""

import random
from types import SimpleNamespace

import numpy as np
import outside
import pytest
from damage import assert_refused, assert_timed_or_refused
from hypothesis import given, settings
from hypothesis import strategies as st

import pathaudit as pa
from pathaudit.course import timed
from pathaudit.kernels.rotations import matrix_from_wxyz
from pathaudit.reading.cutter_location import read_cutter_location

pytestmark = pytest.mark.filterwarnings("error")
HEAD = "UNITS/MM\nMULTAX/ON\nFROM/0,0,50,0,0,1\nFEDRAT/600,MMPM\n"


def read(text, **options):
    return read_cutter_location(text.encode() if isinstance(text, str) else text, "seam.cl", "", SimpleNamespace(**{"axis": None, "units": None, **options}))


def rows(course):
    """x y z i j k rapid feed of each point of the file, as the rows from outside have them."""
    first, last = np.zeros(course.moves, dtype=int), np.arange(course.moves)
    move, t = np.append(first[:1], last), np.append(0.0, np.ones(course.moves))
    holder = -matrix_from_wxyz(course.quaternion(move, t))[:, :, 2]
    air, feed = np.append(False, course.air), np.append(0.0, np.nan_to_num(course.speed) * 60000.0)
    return np.column_stack([1000.0 * course.at(move, t)[0], holder, air, feed])


def test_fmt_010_points_rapid_and_feed():
    outside.agrees("FMT-010", rows(read("\n".join(outside.inputs("FMT-010")["program"]))))


def test_fmt_011_vectors_of_any_length():
    outside.agrees("FMT-011", rows(read("\n".join(outside.inputs("FMT-011")["program"]))))


def test_fmt_013_one_number_moves_along_the_tool_axis():
    outside.agrees("FMT-013", rows(read("\n".join(outside.inputs("FMT-013")["program"]))))


FORMS = HEAD + "GOTO/10,0,0,0,0.6,0.8\nGODLTA/0,5,0\nFINI\n"


@pytest.mark.parametrize(
    "change",
    [
        str.lower,
        lambda text: text.replace("\n", "\r\n"),
        lambda text: text.replace("\n", " $$ a comment, with / and $\n"),
        lambda text: text.replace(",0,0,1", ",$\n  0,0$$ goes on\n,1".replace("$$ goes on\n", "$ $$ goes on\n")),
        lambda text: "$$ only a comment\n\n" + text,
        lambda text: "PARTNO Bracket / 12, $ second issue\nREMARK made by hand $\n" + text,
        lambda text: text.replace("600,MMPM", "MMPM,600"),
        lambda text: text.replace("GOTO/10,0,0,", "GOTO / 10. , +0 , -0.0 , "),
        lambda text: text.replace("MULTAX/ON", "MULTAX"),
        lambda text: text.removesuffix("FINI\n"),
        lambda text: text.replace("MM\n", "CM\n").replace("50,", "5,").replace("GOTO/10", "GOTO/1").replace("5,0\nF", "0.5,0\nF"),
    ],
)
def test_every_form_of_the_text_reads_the_same(change):
    np.testing.assert_allclose(rows(read(change(FORMS))), rows(read(FORMS)), atol=1e-12)


def test_units_and_feeds():
    inches = read("UNITS/INCHES\nFROM/0,0,0\nFEDRAT/60,IPM\nGOTO/1,0,0")
    assert inches.lines.end[0, 0] == 0.0254 and inches.speed[0] == pytest.approx(0.0254)
    assert read("FROM/0,0,0\nFEDRAT/60,MMPM\nGOTO/1,0,0", units="inch").speed[0] == pytest.approx(0.001)
    assert read("UNITS/FEET\nFROM/0,0,0\nFEDRAT/60,MMPM\nGOTO/1,0,0").lines.end[0, 0] == 0.3048


def test_rapid_holds_for_one_motion_and_is_an_air_move():
    course = read(HEAD + "RAPID\nGOTO/0,0,5\nGOTO/0,0,0\nRAPID\nGODLTA/20")
    assert course.air.tolist() == [True, False, True] and np.isnan(course.speed[[0, 2]]).all()
    path = timed(course, speed=0.5, acceleration=2.0)
    assert set(path.source_line[path.process]) == {6, 7} and path.source_line[-1] == 9
    np.testing.assert_allclose(path.position[path.process][[0, -1]], [[0, 0, 0.005], [0, 0, 0]], atol=1e-15)


def test_the_tool_points_from_the_holder_to_the_tip():
    course = read(HEAD + "GOTO/10,0,0,0,0.6,0.8")
    path = timed(course, acceleration=1.0)
    np.testing.assert_allclose(path.rotation[[0, -1], :, 2], [[0, 0, -1], [0, -0.6, -0.8]], atol=1e-15)
    assert path.spin_free


def test_a_file_without_vectors_takes_the_axis_that_is_asked_for():
    plain = "UNITS/MM\nFROM/0,0,0\nFEDRAT/60,MMPM\nGOTO/1,0,0\nGODLTA/2"
    assert rows(read(plain))[-1, :6].tolist() == [1, 0, 2, 0, 0, 1] and "straight above" in read(plain).notes[0]
    tilted = read(plain, axis=(0.6, 0.0, -0.8))
    np.testing.assert_allclose(rows(tilted)[-1, :6], [1 - 1.2, 0, 1.6, -0.6, 0, 0.8], atol=1e-14)
    assert "as asked" in tilted.notes[0]
    with pytest.raises(pa.ReadError, match="line 3: found FROM with a vector, and the choice axis .* as well, expected one of them"):
        read(HEAD, axis=(0.0, 0.0, -1.0))


def test_the_first_goto_begins_a_file_without_from():
    course = read("UNITS/MM\nRAPID\nGOTO/0,0,5\nFEDRAT/600,MMPM\nGOTO/0,0,0")
    assert course.moves == 1 and course.first_line == 3 and not course.air[0]


@settings(deadline=None)
@given(st.lists(st.tuples(*[st.integers(-10**6, 10**6).map(lambda n: n / 1000)] * 3), min_size=2, max_size=20))
def test_points_go_through_a_file_and_back(points):
    text = "UNITS/MM\nFEDRAT/600,MMPM\n" + "\n".join(f"GOTO/{x!r},{y!r},{z!r}" for x, y, z in points)
    kept = [p for p, before in zip(points[1:], points, strict=False) if p != before]
    if kept:
        np.testing.assert_array_equal(read(text).lines.end, np.array(kept) / 1000.0)


REFUSED = [
    ("", "found no FROM and no GOTO"),
    ("PARTNO X\nFINI", "found no FROM and no GOTO"),
    ("FROM/0,0,0", "line 1: found FROM before UNITS, expected UNITS/MM or UNITS/INCHES before it, or units"),
    ("UNITS/MM\nGODLTA/1", "line 2: found GODLTA from a point that is not known"),
    ("UNITS/MM\nGOTO/0,0,0\nGOTO/1,0,0", "line 3: found GOTO before any FEDRAT"),
    ("UNITS/MM\nFROM/0,0,0,0,0,1", "line 2: found FROM with 6 numbers, expected 3 numbers, or MULTAX/ON before it"),
    (HEAD + "FROM/0,0,0", "line 5: found FROM after the first point"),
    (HEAD + "GOTO/1,2", "line 5: found GOTO with 2 numbers, expected 3 or 6"),
    (HEAD + "GOTO/P1", "line 5: found 'P1' in GOTO, expected decimal numbers"),
    (HEAD + "GOTO/1,,2", "line 5: found '' in GOTO"),
    (HEAD + "GOTO/1;2;3", "line 5: found '1;2;3' in GOTO"),
    (HEAD + "GOTO", "line 5: found GOTO with 0 numbers"),
    (HEAD + "GOTO/1,2,1E999", "line 5: found GOTO with a number that is too large"),
    (HEAD + "GOTO/1,2,3,0,0,0", "line 5: found GOTO with a vector of length 0"),
    (HEAD + "GOTO/1,2,3,0,0,-1", "line 5: found a tool that turns by 180 deg in one move"),
    (HEAD + "GODLTA/1,2", "line 5: found GODLTA with 2 numbers, expected 1 or 3"),
    (HEAD + "GOTO/1,0,0,0,1,0\nMULTAX/OFF\nGOTO/2,0,0", "line 7: found GOTO after MULTAX/OFF with the tool tilted"),
    ("MULTAX/MAYBE", "line 1: found MULTAX/MAYBE"),
    ("UNITS/MILES", "line 1: found UNITS/MILES, expected UNITS/ with one of MM, CM, INCHES, FEET"),
    ("UNITS", "line 1: found UNITS/, expected"),
    (HEAD + "UNITS/INCHES", "line 5: found UNITS/INCHES after the first point"),
    ("FEDRAT/600", "line 1: found FEDRAT/600, expected a number and its unit"),
    ("FEDRAT/0.2,IPR", "line 1: found FEDRAT a revolution (IPR or MMPR)"),
    ("FEDRAT/-5,MMPM", "line 1: found FEDRAT/-5, expected a feed above 0"),
    ("FEDRAT/x,MMPM", "line 1: found 'X' in FEDRAT"),
    ("RAPID/ON", "line 1: found RAPID/ON, expected RAPID alone"),
    ("FINI/1", "line 1: found FINI/1"),
    ("FINI\nFROM/0,0,0", "line 2: found 'FROM/0,0,0' after FINI"),
    ("CIRCLE/0,0,0,0,0,1,5", "line 1: found 'CIRCLE', expected the arc as GOTO points: each processor"),
    ("MOVARC/0,0,0", "line 1: found 'MOVARC'"),
    ("INDIRV/1,0,0", "line 1: found 'INDIRV'"),
    ("CYCLE/DRILL,5", "line 1: found 'CYCLE', expected the motion of the cycle"),
    ("PPRINT HELLO", "line 1: found 'PPRINT HELLO'"),
    ("PPRINT/HELLO", "line 1: found 'PPRINT', expected a file without PPRINT"),
    ("SPINDL/600", "line 1: found 'SPINDL', expected one of PARTNO REMARK UNITS FROM GOTO"),
    ("LOADTL/1", "line 1: found 'LOADTL', expected one of"),
    ("COOLNT/ON", "line 1: found 'COOLNT'"),
    ("TLAXIS/0,0,1", "line 1: found 'TLAXIS'"),
    ("HELLO", "line 1: found 'HELLO', expected one of"),
    ("GOTO/1,$", "line 1: found a statement that goes on with $ beyond the end"),
    ("GOTO/1,$ and more\n2", "line 1: found 'and more' after $"),
]


@pytest.mark.parametrize("text, words", REFUSED)
def test_refusals_name_the_line_the_word_and_what_is_allowed(text, words):
    assert_refused(read, text, "seam.cl", words)


def test_damaged_files_are_read_or_refused_in_one_line():
    rng, good = random.Random(6), "PARTNO A\n" + HEAD + "RAPID\nGOTO/10,0,5\nGOTO/20,$\n0,0,0.1,0,1 $$ on\nGODLTA/-2.5\nGODLTA/1,1,1\nMULTAX/OFF\nFINI\n"
    pieces = [b"/", b",", b"$", b"$$", b"\n", b"GOTO/", b"1E9", b"-", b"\xff", b"\0", b"MULTAX/OFF\n", b"RAPID\n", b"FINI\n", b"0,0,0,0,0,1"]

    def path_of(content):
        return timed(read(content), speed=1.0, acceleration=5.0, turn_speed=1.0, turn_acceleration=9.0, step=1.0)

    assert_timed_or_refused(path_of, good, rng, b"GOTO/,.0123456789-$\n ", pieces)
