"""Samples: within the stated tolerances, each with its line, and a path with which all else works as with one from a file."""

import numpy as np
import pytest
from courses import draft
from test_timing import a_bit_of_everything

import pathaudit as pa
from pathaudit.course import Corner, timed
from pathaudit.report.tables import retimed_csv

pytestmark = pytest.mark.filterwarnings("error")
CEILINGS = {"speed": 0.3, "acceleration": 2.0, "turn_speed": 0.8, "turn_acceleration": 3.0}


@pytest.mark.parametrize("chord, angle, step", [(1e-5, np.radians(1), 0.025), (1e-6, np.radians(5), 1.0), (1e-3, np.radians(0.2), 1.0), (1.0, 3.0, 0.004)])
def test_samples_keep_the_stated_tolerances(chord, angle, step):
    course = a_bit_of_everything()
    path = timed(course, **CEILINGS, corner=Corner(radius=0.004), chord=chord, angle=angle, step=step)
    assert np.diff(path.time).max() <= step * (1 + 1e-9)
    turned = np.linalg.norm(np.diff(path.rotation, axis=0), axis=(1, 2)) / np.sqrt(8.0)
    assert 2 * np.arcsin(turned).max() <= angle * (1 + 1e-9)
    fine = timed(course, **CEILINGS, corner=Corner(radius=0.004), chord=chord, angle=angle, step=min(step, 5e-4))
    k = np.clip(np.searchsorted(path.time, fine.time) - 1, 0, path.samples - 2)
    start, along = path.position[k], path.position[k + 1] - path.position[k]
    off = fine.position - start
    share = np.sum(off * along, axis=1) / np.maximum(np.sum(along**2, axis=1), 1e-30)
    assert np.linalg.norm(off - np.clip(share, 0, 1)[:, None] * along, axis=1).max() <= chord * 1.001 + 1e-12


def test_each_sample_knows_its_line_and_whether_the_process_runs():
    path = timed(a_bit_of_everything(), **CEILINGS)
    assert (np.diff(path.source_line) >= 0).all() and set(path.source_line) == set(range(2, 14))
    assert (path.process == (path.source_line < 12)).all()
    assert path.columns == ("t_s", "x_mm", "y_mm", "z_mm", "i", "j", "k", "process", "line")


def test_half_of_a_rounding_belongs_to_each_of_its_lines():
    course = draft()
    course.line_to((0.1, 0, 0), 2, speed=0.1)
    course.line_to((0.1, 0.1, 0), 3, speed=0.1)
    path = timed(course.finish(), acceleration=2.0, corner=Corner(radius=0.01))
    first = np.flatnonzero(path.source_line == 3)[0]
    assert np.linalg.norm(path.position[first] - [0.1 - 0.00255, 0.00255, 0]) < 0.001


def test_what_is_written_is_read_back_as_the_same_path(tmp_path):
    path = timed(a_bit_of_everything(), **CEILINGS)
    cell = pa.read_cell(next(iter(__import__("importlib.resources").resources.files("pathaudit").joinpath("demo").glob("cell-bead.toml"))))
    text = retimed_csv(pa.audit(path, cell).suggestion)
    (tmp_path / "path.csv").write_text(text)
    again = pa.read_path(tmp_path / "path.csv")
    np.testing.assert_array_equal(again.position, path.position)
    np.testing.assert_array_equal(again.rotation, path.rotation)
    np.testing.assert_array_equal(again.process, path.process)


def test_labels_follow_their_moves():
    course = draft()
    course.line_to((0.1, 0, 0), 2, speed=0.1, label="seam 1")
    course.line_to((0.2, 0, 0), 3, speed=0.1)
    path = timed(course.finish(), acceleration=1.0)
    assert {label for label, line in zip(path.label, path.source_line, strict=True) if line == 2} == {"seam 1"} and path.label[-1] == ""


def test_how_it_was_made_is_said_in_full():
    course = draft()
    course.notes.append("Read with care.")
    course.line_to((0.1, 0, 0), 2, speed=0.5)
    made = timed(course.finish(), speed=0.2, acceleration=1.5).made
    assert made == (
        "Read with care.",
        "Timed with at most 1500 mm/s2 of the tool, 200 mm/s.",
        "1 move faster than that in the file, first in line 2, slowed to it.",
        "Sampled so that the path leaves the straight line between two samples by at most 0.01 mm, the tool turns between them by at most 1 deg, "
        "and they are at most 0.025 s apart.",
    )


def test_nothing_is_no_course():
    with pytest.raises(pa.ReadError, match="course: found no move, expected at least one move from a point to another"):
        draft().finish()
    course = draft()
    course.line_to((0.0, 0.0, 0.0), 2)
    with pytest.raises(pa.ReadError, match="found no move"):
        course.finish()
    course.line_to((2e4, 0.0, 0.0), 3)
    with pytest.raises(pa.ReadError, match="line 3: found a tool centre point at 20000 m, expected coordinates within 10000 m"):
        course.finish()


@pytest.mark.parametrize("speed", [1e-10, 2e4, float("inf")])
def test_speeds_that_are_mistakes_in_the_unit_are_refused(speed):
    course = draft()
    course.line_to((0.1, 0.0, 0.0), 2, speed=speed)
    with pytest.raises(pa.ReadError, match="line 2: found a speed of .* mm/s, expected 1e-06 to 1e.07 mm/s"):
        course.finish()
