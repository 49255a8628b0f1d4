"""Points with a speed: every form of a row, arcs through a middle point, curves, blends, and each refusal with its line."""

import random
from types import SimpleNamespace

import numpy as np
import pytest
from damage import assert_refused, assert_timed_or_refused
from hypothesis import assume, given, settings
from hypothesis import strategies as st
from scipy.spatial.transform import Rotation

import pathaudit as pa
from pathaudit.course import timed
from pathaudit.course.shapes import ARC, CURVE, LINE, STILL
from pathaudit.kernels.rotations import matrix_from_wxyz
from pathaudit.reading.waypoints import read_waypoints

pytestmark = pytest.mark.filterwarnings("error")
HEADER = "x_mm,y_mm,z_mm,i,j,k,speed_mm_s,move,blend_mm,dwell_s,process,label"
ROWS = [
    "0,0,50,0,0,-1,,,,,0,start",
    "0,0,0,,,,100,,,0.2,0,in",
    "40,0,0,,,,20,line,5,,1,seam",
    "60,20,0,,,,,line,0,,,seam",
    "70,24,0,,,,15,arc,,,,round",
    "80,20,0,,,,,arc,,,,round",
    "90,30,0,0,0.6,-0.8,,curve,,,,bow",
    "100,50,2,0,0,-1,,curve,,0.5,,bow",
    "100,50,60,,,,100,line,,,0,out",
]
SEAM = "\n".join([HEADER, *ROWS]) + "\n"


def read(text, **options):
    return read_waypoints(text.encode() if isinstance(text, str) else text, "points.csv", "", SimpleNamespace(**{"axis": None, **options}))


def axes(course, move, t):
    return matrix_from_wxyz(course.quaternion(np.array([move]), np.array([t])))[0, :, 2]


def test_a_file_with_all_that_a_row_can_say():
    course = read("# points\n\n" + SEAM)
    assert course.kind.tolist() == [LINE, STILL, LINE, LINE, ARC, CURVE, CURVE, STILL, LINE]
    assert course.line.tolist() == [5, 5, 6, 7, 9, 10, 11, 11, 12] and course.first_line == 4
    np.testing.assert_allclose(course.speed, [0.1, np.nan, 0.02, 0.02, 0.015, 0.015, 0.015, np.nan, 0.1])
    np.testing.assert_allclose(course.zone, [np.nan, 0, 0.005, 0, np.nan, np.nan, np.nan, 0, np.nan])
    assert course.dwell.tolist() == [0, 0.2, 0, 0, 0, 0, 0, 0.5, 0] and course.air.tolist() == [True, True, *[False] * 6, True]
    assert course.label == ("in", "in", "seam", "seam", "round", "bow", "bow", "bow", "out")
    np.testing.assert_allclose([axes(course, 5, 0.0), axes(course, 5, 1.0), axes(course, 6, 1.0)], [[0, 0, -1], [0, 0.6, -0.8], [0, 0, -1]], atol=1e-15)
    path = timed(course, acceleration=2.0)
    assert path.label[0] == "in" and path.label[-1] == "out" and path.spin_free


@pytest.mark.parametrize(
    "change",
    [
        lambda text: text.replace("\n", "\r\n"),
        lambda text: text.replace(",", ";"),
        lambda text: text.replace(",", "\t"),
        lambda text: "\ufeff" + text,
        lambda text: text.replace("\n40,", "\n# the seam\n\n40,"),
        lambda text: text.replace("seam", '"seam"').replace("x_mm", '" x_mm "'),
        lambda text: text.replace("line", " line ").replace("curve", "curve "),
    ],
)
def test_every_form_of_the_text_reads_the_same(change):
    one, other = read(change(SEAM)), read(SEAM)
    np.testing.assert_array_equal(one.lines.end, other.lines.end)
    np.testing.assert_array_equal(one.length, other.length)
    assert one.label == other.label


@pytest.mark.parametrize("column, value", [("speed_mm_s", 20), ("speed_mm_min", 1200), ("speed_m_min", 1.2), ("speed_m_s", 0.02), ("speed_in_min", 1200 / 25.4)])
def test_the_unit_of_the_speed_stands_in_its_column(column, value):
    course = read(f"x_mm,y_mm,z_mm,i,j,k,{column}\n0,0,0,0,0,-1,{value!r}\n10,0,0,0,0,-1,\n")
    assert course.speed[0] == pytest.approx(0.02, rel=1e-15)


def test_lengths_in_metres_and_inches():
    course = read("x_in,y_m,z_mm,i,j,k,blend_in\n0,0,0,0,0,-1,\n1,0.1,2,0,0,-1,0.5\n0,0,0,0,0,-1,\n")
    np.testing.assert_allclose(course.lines.end[0], [0.0254, 0.1, 0.002], rtol=1e-15)
    assert course.zone[0] == pytest.approx(0.0127)


TURNS = Rotation.from_euler("xyz", [[170, 5, 0], [150, -20, 40]], degrees=True)


def test_every_form_of_the_orientation():
    q, (rx, ry, rz) = TURNS.as_quat(scalar_first=True), TURNS.as_euler("xyz", degrees=True).T
    forms = ["qw,qx,qy,qz\n0,0,0," + ",".join(map(repr, q[0].tolist())) + "\n9,0,0," + ",".join(map(repr, q[1].tolist())),
             f"rx_deg,ry_deg,rz_deg\n0,0,0,{rx[0]!r},{ry[0]!r},{rz[0]!r}\n9,0,0,{rx[1]!r},{ry[1]!r},{rz[1]!r}",
             f"rx_rad,ry_deg,rz_deg\n0,0,0,{np.radians(rx[0])!r},{ry[0]!r},{rz[0]!r}\n9,0,0,{np.radians(rx[1])!r},{ry[1]!r},{rz[1]!r}"]  # fmt: skip
    for form in forms:
        course = read("x_mm,y_mm,z_mm," + form.replace("np.float64(", "").replace(")", ""))
        ends = Rotation.from_quat(course.quaternion(np.zeros(2, dtype=int), np.array([0.0, 1.0])), scalar_first=True)
        assert (TURNS.inv() * ends).magnitude().max() < 1e-14 and not course.spin_free


def test_a_file_without_orientation_asks_for_the_axis():
    bare = "x_mm,y_mm,z_mm\n0,0,0\n10,0,0\n"
    with pytest.raises(pa.ReadError, match=r"points.csv: header: found no orientation, expected .* or axis \(--axis i,j,k\)"):
        read(bare)
    course = read(bare, axis=(0.0, 0.6, -0.8))
    np.testing.assert_allclose(axes(course, 0, 0.5), [0, 0.6, -0.8], atol=1e-15)
    assert "as asked" in course.notes[0]
    with pytest.raises(pa.ReadError, match="header: found an orientation, and the choice axis .* as well, expected one of them"):
        read(SEAM, axis=(0.0, 0.6, -0.8))


# arcs


points = st.tuples(*[st.floats(-0.3, 0.3)] * 3).map(np.array)


def three(start, middle, end, move="arc", orientation=("0,0,-1",) * 3):
    rows = [f"{1000 * p[0]!r},{1000 * p[1]!r},{1000 * p[2]!r},{o}," for p, o in zip([start, middle, end], orientation, strict=True)]
    rows = [row.replace("np.float64(", "").replace(")", "") for row in rows]
    return f"x_mm,y_mm,z_mm,i,j,k,move\n{rows[0]}\n{rows[1]}{move}\n{rows[2]}{move}\n"


@settings(deadline=None)
@given(points, points, points)
def test_an_arc_passes_its_three_points_on_one_circle(start, middle, end):
    a, b = middle - start, end - start
    assume(np.linalg.norm(np.cross(a, b)) > 0.02 * np.linalg.norm(a) * np.linalg.norm(b) and min(map(np.linalg.norm, (a, b, b - a))) > 1e-3)
    course = read(three(start, middle, end))
    arcs, t = course.arcs, np.linspace(0, 1, 2001)
    way = course.at(np.zeros(2001, dtype=int), t)[0]
    np.testing.assert_allclose(np.linalg.norm(way - arcs.centre[0], axis=1), arcs.radius[0], rtol=1e-9)
    for point in (start, middle, end):
        assert np.linalg.norm(way - point, axis=1).min() < 0.51 * course.length[0] / 2000 + 1e-9
    normal = np.cross(a, b) / np.linalg.norm(np.cross(a, b))
    np.testing.assert_allclose((way - start) @ normal, 0.0, atol=1e-12)
    angles = [2 * np.arcsin(min(np.linalg.norm(p - q) / 2 / arcs.radius[0], 1.0)) for p, q in ((start, middle), (middle, end))]
    both = [c for c in (sum(angles), 2 * np.pi - angles[0] + angles[1], 2 * np.pi + angles[0] - angles[1]) if abs(c - arcs.sweep[0]) < 1e-5]
    assert both  # the sweep is put together of those to and from the middle point, one of which may be the long way round


def test_a_half_circle_and_the_long_way_round():
    half = read(three((0, 0, 0), (0.05, 0.05, 0), (0.1, 0, 0)))
    assert half.arcs.sweep[0] == pytest.approx(np.pi) and half.length[0] == pytest.approx(0.05 * np.pi)
    long = read(three((0, 0, 0), (0.1, 0, 0), (0.05, 0.05, 0)))
    assert long.arcs.sweep[0] == pytest.approx(1.5 * np.pi)
    back = read(three((0, 0, 0), (0.05, -0.05, 0), (0.1, 0, 0)))
    np.testing.assert_allclose(back.at(np.array([0]), np.array([0.5]))[0], [[0.05, -0.05, 0]], atol=1e-16)


def test_the_tool_turns_evenly_over_an_arc_or_passes_the_orientation_of_its_middle_point():
    ends = ((0, 0, 0), (0.05, 0.05, 0), (0.1, 0, 0))
    even = read(three(*ends, orientation=("0,0,-1", ",,", "0,0.6,-0.8")))
    np.testing.assert_allclose(axes(even, 0, 0.5), np.array([0, 1, -3]) / np.sqrt(10), atol=1e-15)
    through = read(three(*ends, orientation=("0,0,-1", "0.6,0,-0.8", "0,0,-1")))
    np.testing.assert_allclose([axes(through, 0, t) for t in (0, 0.5, 1)], [[0, 0, -1], [0.6, 0, -0.8], [0, 0, -1]], atol=1e-15)
    held = read(three(*ends))
    np.testing.assert_allclose(axes(held, 0, 0.3), [0, 0, -1], atol=1e-15)
    kept = read(three(*ends, orientation=("0,0,-1", "0.6,0,-0.8", ",,")))
    np.testing.assert_allclose([axes(kept, 0, t) for t in (0.5, 1)], [[0.6, 0, -0.8]] * 2, atol=1e-15)


def test_columns_without_a_use_are_named():
    course = read(SEAM.replace("label", "label,wire_m_min").replace("\n", ",8.5\n").replace("wire_m_min,8.5", "wire_m_min"))
    assert course.notes == ("Columns that points have no use for were left out: wire_m_min.",)


REFUSED = [
    ("# nothing\n", "found only comments, expected a header row and points"),
    (HEADER, "found 0 points, expected at least 2 points"),
    ("\n".join([HEADER, ROWS[0]]), "found 1 point, expected at least 2"),
    (SEAM.replace("label", "x_mm"), "header: found the column 'x_mm' twice"),
    (SEAM.replace("x_mm", "x"), "header: found a column 'x' without a unit, expected the tool centre point's x as x_mm, x_m or x_in"),
    (SEAM.replace("label", "x_m"), "header: found both x_mm and x_m"),
    (SEAM.replace("label", "t_s"), "header: found a column of times, expected points without times, or format timed"),
    (SEAM.replace("speed_mm_s", "speed"), "header: found a column 'speed' without a unit, expected one of speed_mm_s"),
    (SEAM.replace("label", "speed_m_min"), "header: found both speed_mm_s and speed_m_min, expected the speed once"),
    (SEAM.replace(",k,", ",kk,"), "header: found an orientation of i, j alone, expected all of one form"),
    (SEAM.replace("\n40,", "\n40,1,"), "line 4: found 13 cells, expected 12 as in the header; a decimal comma"),
    (SEAM.replace("40,0,0,", "40,0,"), "line 4: found 11 cells, expected 12"),
    (SEAM.replace("\n40,", "\n,"), "line 4, column x_mm: found an empty cell, expected a number"),
    (SEAM.replace("\n40,", "\nforty,"), "line 4, column x_mm: found 'forty'"),
    (SEAM.replace("\n40,", "\nnan,"), "line 4, column x_mm: found nan, expected a finite number"),
    (SEAM.replace("\n40,", '\n"40,5",'), "line 4, column x_mm: found '40,5', expected a number with a decimal point (write a point"),
    (SEAM.replace("\n40,", "\n4e7,"), "line 4: found a tool centre point at 40000 m, expected coordinates within 10000 m"),
    (SEAM.replace("0,0,50,0,0,-1", "0,0,50,,,"), "line 2: found no orientation in the first row"),
    (SEAM.replace("0.6,-0.8", "0.6,"), "line 8: found a part of an orientation, expected all of i, j, k, or none"),
    (SEAM.replace("0.6,-0.8", "0.6,-0.7"), "line 8: found a tool axis of length 0.921954 (i, j, k), expected length 1"),
    (SEAM.replace("line", "spline"), "line 4: found move 'spline', expected one of line, arc, curve"),
    (SEAM.replace(",20,line", ",0,line"), "line 4: found speed_mm_s = 0, expected a number above 0"),
    (SEAM.replace("line,5", "line,-5"), "line 4: found blend_mm = -5, expected 0 or more"),
    (SEAM.replace(",0.2,", ",-0.2,"), "line 3: found dwell_s = -0.2, expected 0 or more"),
    (SEAM.replace("line,5,,1", "line,5,,2"), "line 4: found process = 2, expected 1 while the process runs or 0"),
    (SEAM.replace("seam", '"seam', 1), "line 4: found quotes that cannot be read"),
    (SEAM.replace("-1,,,,,0,start", "-1,,arc,,,0,start"), "line 2: found a move or a blend in the first row"),
    (SEAM.replace("80,20,0,,,,,arc", "80,20,0,,,,,line"), "line 6: found one row of an arc, expected two rows with move arc: its middle point, then its end"),
    (SEAM.replace("70,24,0,,,,15,arc", "70,20,0,,,,15,arc"), "line 6: found a middle point in line with the ends of its arc"),
    (SEAM.replace("80,20,0,,,,,arc", "60,20,0,,,,,arc"), "line 7: found an arc that ends where it begins, expected two arcs for a full circle"),
    (SEAM.replace("80,20,0,,,,,arc", "80,20,0,,,,9,arc"), "line 7: found another speed or process than at the arc's middle point"),
    (SEAM.replace("15,arc,,", "15,arc,5,"), "line 6: found a dwell or a blend at the middle point of an arc"),
    (SEAM.replace("-0.8,,curve,", "-0.8,,curve,5"), "line 8: found a blend inside a curve"),
    (SEAM.replace("90,30,0,", "80,20,0,"), "line 8: found a point of a curve twice"),
    ("x_mm,y_mm,z_mm,i,j,k\n0,0,0,0,0,-1\n0,0,0,0,0,-1\n", "found no move"),
]


@pytest.mark.parametrize("text, words", REFUSED)
def test_refusals_name_the_line(text, words):
    assert_refused(read, text, "points.csv", words)


def test_damaged_files_are_read_or_refused_in_one_line():
    rng = random.Random(7)
    pieces = [b",", b"\n", b'"', b"#", b";", b"arc", b"curve", b"-", b"e9", b"1e300", b"\xff", b"\0", b"0", b"nan"]

    def path_of(content):
        return timed(read(content), speed=1.0, acceleration=5.0, turn_speed=1.0, turn_acceleration=9.0, step=1.0, chord=1e-3)

    assert_timed_or_refused(path_of, SEAM, rng, b"0123456789,.-\n", pieces)
