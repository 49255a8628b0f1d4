"""Machine code: the rows from outside, a second reader, a general-purpose G-code library, and each word that is refused."""

import random
from types import SimpleNamespace

import numpy as np
import outside
import pygcode
import pytest
import second_reader
from damage import assert_refused, assert_timed_or_refused
from hypothesis import given, settings
from hypothesis import strategies as st
from pygcode import transform

import pathaudit as pa
from pathaudit.course import timed
from pathaudit.course.shapes import ARC
from pathaudit.reading.machine_code import read_machine_code

pytestmark = pytest.mark.filterwarnings("error")
HEAD = "G71 G90 G17 G94\nG00 X0 Y0 Z0\nG01 F600\n"


def read(text, axis=(0.0, 0.0, -1.0), **more):
    data = text.encode() if isinstance(text, str) else text
    return read_machine_code(data, "seam.nc", "", SimpleNamespace(**{"axis": axis, "inch_codes": False, "units": None, **more}))


def program(row):
    return "\n".join(outside.inputs(row)["program"])


def at_mm(course, move, t):
    return 1000.0 * course.at(np.array([move]), np.array([t]))[0][0]


def ends_mm(course):
    return [at_mm(course, 0, 0.0), *(at_mm(course, move, 1.0) for move in range(course.moves))]


# values from outside


def test_fmt_001_lines_and_an_arc():
    course = read(program("FMT-001"))
    sweep = np.degrees(course.arcs.sweep[0]) * np.sign(np.cross(course.arcs.first[0], course.arcs.second[0])[2])
    fed = ~course.air
    agreed = [*ends_mm(course), [sweep, 1000.0 * course.length[fed].sum(), (course.length / course.speed)[fed].sum()]]
    outside.agrees("FMT-001", agreed)


def test_fmt_002_an_arc_in_the_zx_plane():
    course = read(program("FMT-002"))
    sweep = np.degrees(course.arcs.sweep[0])
    agreed = [at_mm(course, 0, 0.0), at_mm(course, 0, 1.0), at_mm(course, 0, 0.5), [sweep, 1000.0 * course.length[0], course.length[0] / course.speed[0]]]
    outside.agrees("FMT-002", agreed)


def test_fmt_004_arcs_by_radius_are_refused_and_their_geometry_is_that_of_centres():
    for text, (x, y, sweep) in zip(outside.inputs("FMT-004")["programs"], outside.ROWS["FMT-004"]["expected"], strict=True):
        start = "G71 G90 G17 G94\nG00 X0 Y0 Z0\n"
        with pytest.raises(pa.ReadError, match="found 'R-?10', expected I, J, K from the start point to the centre: the standard has no arcs by radius"):
            read(start + "\n".join(text))
        course = read(f"{start}G02 X10 Y0 I{x} J{y} F600")
        assert np.degrees(course.arcs.sweep[0]) == pytest.approx(-sweep, abs=1e-9) and course.arcs.radius[0] == pytest.approx(0.01, rel=1e-12)


# arcs in all planes and senses


@pytest.mark.parametrize("plane, axes", [("G17", (0, 1, 2)), ("G18", (2, 0, 1)), ("G19", (1, 2, 0))])
@pytest.mark.parametrize("code, sense", [("G02", -1), ("G03", 1)])
@pytest.mark.parametrize("turn", [0.1, 90.0, 179.9, 180.0, 180.1, 270.0, 359.0, 360.0])
def test_arcs_helices_and_full_turns_in_each_plane_and_sense(plane, axes, code, sense, turn):
    first, second, third = axes
    angle = sense * np.radians(turn)
    end = np.zeros(3)
    end[first], end[second], end[third] = 30 * np.cos(angle) - 30, 30 * np.sin(angle), 12
    centre = ["", "", ""]
    centre[first] = f"{'IJK'[first]}-30"
    if turn == 360.0:
        end[first] = end[second] = 0.0
    course = read(f"G71 G90 {plane} G94\nG00 X0 Y0 Z0\n{code} X{end[0]:.12f} Y{end[1]:.12f} Z{end[2]:.12f} {''.join(centre)} F600")
    assert np.degrees(course.arcs.sweep[0]) == pytest.approx(turn, abs=1e-8)
    for share in (0.25, 0.5, 0.75):
        expected = np.zeros(3)
        expected[first], expected[second], expected[third] = 30 * np.cos(share * angle) - 30, 30 * np.sin(share * angle), 12 * share
        np.testing.assert_allclose(at_mm(course, 0, share), expected, atol=1e-9)
    assert 1000 * course.length[0] == pytest.approx(np.hypot(30 * np.radians(turn), 12), rel=1e-11)


coordinates = st.integers(-90_000, 90_000).map(lambda n: n / 1000)


@st.composite
def programs(draw):
    """Programs with lines, arcs whose end lies on their circle to 0.001 mm, all planes, both distance modes and units."""
    inch = draw(st.booleans())
    blocks = [f"%\nN1 {'G70' if inch else 'G71'} G90 G17 G94 (start)", "G00 X0 Y0 Z0", "G01 F600"]
    here, digits = np.zeros(3), 5 if inch else 4
    for number in range(draw(st.integers(1, 6))):
        absolute, kind = draw(st.booleans()), draw(st.integers(0, 3))
        if kind < 2:
            step = np.array([draw(coordinates) for _ in range(3)])
            offset = ""
        else:
            plane = draw(st.integers(0, 2))
            first, second, third = [(0, 1, 2), (2, 0, 1), (1, 2, 0)][plane]
            radius, begin = draw(st.floats(1, 50)), draw(st.floats(0, 6.28))
            turn = draw(st.floats(0.05, 6.2)) if draw(st.booleans()) else 2 * np.pi
            turn = turn if kind == 3 else -turn
            step = np.zeros(3)
            step[first], step[second] = radius * (np.cos(begin + turn) - np.cos(begin)), radius * (np.sin(begin + turn) - np.sin(begin))
            step[third] = draw(st.sampled_from([0.0, 5.0]))
            offset = f"G{17 + plane} {'IJK'[first]}{-radius * np.cos(begin):.{digits}f} {'IJK'[second]}{-radius * np.sin(begin):.{digits}f}"
        there = np.round(here + step, digits)
        target = there if absolute else there - here
        blocks.append(f"N{10 * number + 10} G{90 if absolute else 91} G{kind:02d} {offset} " + " ".join(f"{c}{v:.{digits}f}" for c, v in zip("XYZ", target, strict=True)))
        here = there
    return "\n".join([*blocks, "M30", "%"])


@settings(deadline=None)
@given(programs())
def test_a_second_reader_finds_the_same_points(text):
    others = [motion for motion in second_reader.points(text) if not np.allclose(motion[0], motion[0][0], atol=1e-6)]
    if not others:
        return
    course = read(text)
    ours = [k for k in range(course.moves) if course.length[k] > 1e-9]
    assert len(ours) == len(others)
    for k, (theirs, rapid, feed) in zip(ours, others, strict=True):
        here = 1000.0 * course.at(np.full(17, k), np.linspace(0, 1, 17))[0]
        np.testing.assert_allclose(here, theirs, atol=2e-3 if course.kind[k] == ARC else 1e-9)  # theirs ends on the circle, ours where the file says
        assert course.air[k] == rapid and (rapid or course.speed[k] * 60000 == pytest.approx(feed))


@pytest.mark.parametrize("code", ["G02", "G03"])
@pytest.mark.parametrize("end", ["X-20 Y20 Z7 I-20 J0", "X13 Y-3 I5 J-8", "X0.5 Y0 I0.25 J30"])
def test_a_general_purpose_library_draws_the_same_arcs(code, end):
    """In the XY plane: in the others that library (pygcode 0.2.1) loses the sense, and draws a quarter circle of G18 as one chord."""
    text = f"{code} {end}"
    course = read(f"G71 G90 G17 G94 F600\nG00 X0 Y0 Z0\n{text}")
    arc = pygcode.Line(text).block.gcodes[0]
    lines = list(transform.linearize_arc(arc, pygcode.Position(), method_class=transform.ArcLinearizeInside, max_error=0.001))
    place, theirs = dict.fromkeys("XYZ", 0.0), []
    for line in lines:
        place |= {letter: value for letter, value in line.get_param_dict().items() if letter in "XYZ"}
        theirs.append([place[c] for c in "XYZ"])
    count = len(theirs)
    ours = 1000.0 * course.at(np.zeros(count, dtype=int), np.arange(1, count + 1) / count)[0]  # theirs are chords of one length, inside the arc
    np.testing.assert_allclose(ours, theirs, atol=0.002)


@settings(deadline=None)
@given(st.lists(st.tuples(coordinates, coordinates, coordinates), min_size=2, max_size=20))
def test_points_go_through_a_program_and_back(points):
    text = "G71 G90 G94\nG00 X0 Y0 Z0\nG01 F600\n" + "\n".join(f"X{x!r} Y{y!r} Z{z!r}" for x, y, z in points)
    kept = [p for p, before in zip(points, [(0.0, 0.0, 0.0), *points[:-1]], strict=True) if p != before]
    if kept:
        np.testing.assert_array_equal(read(text).lines.end, np.array(kept) / 1000.0)


# words and their meaning


def test_inches_and_feed_in_inches_a_minute():
    course = read("G70 G90 G94\nG00 X0 Y0 Z0\nG01 X1.5 F60")
    assert course.lines.end[0, 0] == 1.5 * 0.0254 and course.speed[0] == pytest.approx(0.0254)
    assert any("inches a minute" in note for note in course.notes)


def test_fmt_005_a_dialects_unit_codes_need_the_option():
    with pytest.raises(pa.ReadError, match="line 1: found 'G21', expected G71 for millimetres, or the option inch_codes"):
        read("G21 G90 G94\nG00 X0 Y0 Z0\nG01 X1 F60")
    for code, unit in (("G20", 0.0254), ("G21", 0.001)):
        assert read(f"{code} G90 G94\nG00 X0 Y0 Z0\nG01 X1 F60", inch_codes=True).lines.end[0, 0] == unit
    assert read("G90 G94\nG00 X0 Y0 Z0\nG01 X1 F60", units="inch").lines.end[0, 0] == 0.0254


def test_distances_from_the_last_point():
    assert ends_mm(read(HEAD + "G91\nX10\nY5 Z-2\nG90 X0"))[-1].tolist() == [0.0, 5.0, -2.0]


def test_dwells_rapids_and_lines_of_the_file():
    course = read("% \n(seam 1) N1 G71 G90 G94 F600\nG00 Z50\nX0 Y0\n\nZ0\nG04 F1.5\nG01 X10\nG04 X0.5\nm30\n%")
    assert course.first_line == 4 and course.line.tolist() == [6, 7, 8, 9]
    assert course.air.tolist() == [True, True, False, False] and course.dwell.tolist() == [0, 1.5, 0, 0.5]
    path = timed(course, speed=0.5, acceleration=2.0)
    assert set(path.source_line) == {6, 7, 8, 9} and not path.process[path.source_line < 7].any()


def test_what_was_taken_for_granted_is_said():
    notes = read("G71 G90 G17 G94 F600\nG00 X0 Y0 Z0\nG00 X5\nG01 X10.5\nG03 X10.5 Y10.004 I0 J5\nG04 F1").notes
    assert [note.split()[0] for note in notes] == ["The", "G00", "The", "Numbers", "Arcs"] and "line 5" in notes[-1]


REFUSED = [
    ("", "found no point with X, Y and Z"),
    ("%\n%\nG01", "line 3: found 'G01' after the end of the program"),
    ("% 12", "line 1: found '% 12', expected a line of % alone"),
    ("M30\nG00", "line 2: found 'G00' after the end"),
    ("G41", "line 1: found 'G41', expected one of G00 G01"),
    ("G28", "line 1: found 'G28', expected one of"),
    ("G81", "line 1: found 'G81', expected one of"),
    ("G54", "line 1: found 'G54', expected one of"),
    ("G95", "line 1: found 'G95', expected one of"),
    ("G01.1", "line 1: found 'G01.1'"),
    ("M03", "line 1: found 'M03', expected one of"),
    ("M00", "line 1: found 'M00'"),
    ("T1", "line 1: found 'T1', expected one of"),
    ("S500", "line 1: found 'S500'"),
    ("O100", "line 1: found 'O100'"),
    ("A10", "line 1: found 'A10', expected no rotary axes"),
    ("#1=3", "line 1: found '#1=3', expected numbers; variables"),
    ("X[1+2]", "line 1: found 'X[1+2]', expected numbers; expressions"),
    ("/N10 G00", "line 1: found '/', expected a program without blocks that may be skipped"),
    ("G00 ; up", "line 1: found ';', expected comments in parentheses"),
    ("G00 (up", "line 1: found a parenthesis without its other one"),
    ("G00 ((up))", "line 1: found a parenthesis without its other one, or one inside another"),
    ("G00 up)", "line 1: found a parenthesis"),
    ("X1,5", "line 1: found 'X1,5', expected a decimal point"),
    ("X", "line 1: found 'X' without a number"),
    ("X1E3", "line 1: found 'E3', expected decimal numbers"),
    ("X١", "line 1: found 'X١'"),
    ("G00 G01", "line 1: found 'G01' beside G00"),
    ("G04 G00 F1", "line 1: found 'G00' beside G04"),
    ("G90 G91", "line 1: found 'G91' beside G90"),
    ("G00 N10", "line 1: found 'N10', expected N with a whole number, once, at the start"),
    ("N1.5", "line 1: found 'N1.5', expected N"),
    ("X1 X2", "line 1: found X twice"),
    ("X1", "line 1: found X before any motion word"),
    ("G90 G00 X1", "line 1: found a coordinate before its unit, expected G71"),
    ("G71 G00 X1", "line 1: found a coordinate before G90 or G91"),
    ("G71 G91 G00 X1", "line 1: found X from a point that is not known"),
    ("G71 G90 G01 X1", "line 1: found G01 while Y is not known"),
    ("F100", "line 1: found F before its unit"),
    ("G71 F100", "line 1: found F before G94"),
    ("G71 G94 F0", "line 1: found F0, expected a feed above 0"),
    ("G71 G90 G00 X0 Y0 Z0\nG01 X1", "line 2: found G01 before any F"),
    ("G04", "line 1: found G04 with nothing"),
    ("G04 P5", "line 1: found 'P5'"),
    ("G04 X1 Y2", "line 1: found G04 with X Y"),
    ("G04 X-1", "line 1: found a dwell of -1 s"),
    (HEAD + "X1 I2", "line 4: found I in a block of G01"),
    (HEAD + "G02 X1", "line 4: found G02 without a centre, expected I and J"),
    (HEAD + "G02 X1 K2 I1", "line 4: found K in a plane of G17, expected I and J"),
    (HEAD + "G18 G02 X1", "line 4: found G02 without a centre, expected K and I"),
    (HEAD + "G02 X10 I4", "line 4: found an arc that begins 4 mm from its centre and ends 6 mm from it, expected the same radius, to 0.02 mm"),
    (HEAD + "G02 X0.1 I0.051", "line 4: found an arc that begins 0.051 mm from its centre and ends 0.049 mm from it"),
    (HEAD + "G02 I0", "line 4: found an arc of radius 0"),
    ("G71 G90 G94 F9\nG02 X1 I5", "line 2: found G02 before its plane, expected G17 (XY), G18 (ZX) or G19 (YZ)"),
    ("G71 G90 G94 G17 F9\nG02 X1 I5", "line 2: found G02 from a point that is not known"),
    (HEAD + "X20000000", "line 4: found a tool centre point at 20000 m"),
    ("G71 G90 G00 X0 Y0 Z0", "found no move"),
]


@pytest.mark.parametrize("text, words", REFUSED)
def test_refusals_name_the_line_the_word_and_what_is_allowed(text, words):
    assert_refused(read, text, "seam.nc", words)


def test_the_tools_axis_is_asked_for():
    with pytest.raises(pa.ReadError, match=r"seam.nc: found machine code, which says nothing of how the tool stands, expected axis \(--axis i,j,k\)"):
        read(HEAD + "X1", axis=None)


def test_damaged_programs_are_read_or_refused_in_one_line():
    rng, good = random.Random(5), HEAD + "G02 X10 Y-10 I0 J-10 (round)\nG01 Y-30 F900\nG04 F0.2\nG19 G03 Z4 Y-30 J0 K2\nM30\n%\n"
    pieces = [b"G", b"X", b"(", b")", b"%", b"$", b"-", b".", b"9", b"E9", b"\xff", b"\0", b"G02 ", b" I0", b"\n", b"G91 ", b"F", b"R1"]
    assert_timed_or_refused(lambda content: timed(read(content), speed=1.0, acceleration=5.0, step=1.0, chord=1e-3), good, rng, b"GXYZIJKF0123456789.-+ ()%\n", pieces)
