"""JSON, CSV and text of an audit: units, order, gaps, and files that the package reads again."""

import csv
import io
import json
import re

import numpy as np
import pytest

import pathaudit as pa
from pathaudit.report import tables, text

LIMITS = {"lower_deg": -170, "upper_deg": 170, "speed_deg_s": 60, "acceleration_deg_s2": 900}
ROWS = [
    {"name": "lift", "type": "prismatic", "lower_mm": -500, "upper_mm": 1500, "speed_mm_s": 400, "acceleration_mm_s2": 5000},
    {"name": "base", "d_mm": 300, "alpha_deg": 90, **LIMITS},
    {"name": "upper", "a_mm": 500, **LIMITS},
    {"name": "fore", "a_mm": 30, "alpha_deg": 90, **LIMITS},
    {"name": "roll", "d_mm": 450, "alpha_deg": -90, **LIMITS},
    {"name": "bend", "alpha_deg": 90, **LIMITS},
    {"name": "twist, outer", "d_mm": 90, **LIMITS},
]
ARM = pa.Arm.from_dh(ROWS, name="lift arm")
MIDDLE = np.array([0.2, 0.3, 0.6, 0.5, 0.4, -0.9, 0.2])


def motion(samples=60, far=False):
    s = np.linspace(0, 1, samples)[:, None]
    q = MIDDLE + np.array([0.05, 0.3, 0.2, -0.2, 0.3, 0.25, 0.6]) * np.sin(2.5 * s + np.arange(7))
    poses = ARM.flange_pose(q)
    position = 1000 * poses[:, :3, 3]
    if far:
        position[samples // 2] += 5000.0
    return q, position, poses[:, :3, 2]


def audit(far=False, duration=2.0, unit="t_s", **columns):
    q, position, axis = motion(far=far)
    times = np.linspace(3.0, 3.0 + duration, len(q)) * (1000.0 if unit == "t_ms" else 1.0)
    given = {"note": [f"n{k}" for k in range(len(q))], "x_mm": position[:, 0], "y_in": position[:, 1] / 25.4, "z_m": position[:, 2] / 1000}
    path = pa.path_from({**given, **dict(zip("ijk", axis.T)), unit: times, **columns}, name="seam.csv")
    cell = pa.Cell("bench", ARM, np.eye(4), np.eye(4), np.eye(4), start=q[0])
    return pa.audit(path, cell)


@pytest.fixture(scope="module")
def clean():
    return audit(duration=20.0)


@pytest.fixture(scope="module")
def slow_needed():
    return audit(duration=0.5)


@pytest.fixture(scope="module")
def broken():
    return audit(far=True)


def rows_of(written):
    return list(csv.reader(io.StringIO(written)))


def test_json_has_the_fields_that_others_rely_on(clean, slow_needed, broken):
    for judged in (clean, slow_needed, broken):
        found = json.loads(tables.check_json(judged), parse_constant=lambda name: pytest.fail(f"{name} in JSON"))
        assert found["format"] == "pathaudit.check/1"
        assert found["path"] | {"file": "seam.csv", "sha256": judged.path.sha256, "samples": 60} == found["path"]
        assert found["path"]["length_mm"] == pytest.approx(1000 * judged.path.length) and found["path"]["duration_s"] == judged.path.duration
        assert found["cell"]["name"] == "bench" and found["cell"]["joints"] == list(ARM.joint_names)
        assert found["verdict"] == judged.verdict
        for given, finding in zip(found["findings"], judged.finding_list, strict=True):
            assert {"kind", "severity", "joint", "t_start_s", "t_end_s", "worst_t_s", "value", "limit", "unit", "why"} <= set(given)
            assert given["t_start_s"] == finding.t_start and given["joint"] == finding.joint and given["why"] == finding.why
        assert set(found["retiming"]) >= {"duration_s", "slowest_fraction_of_programmed_speed", "feasible", "why"}
        assert found["retiming"]["feasible"] is bool(judged.suggestion.feasible)


def test_the_cases_are_what_they_are_meant_to_be(clean, slow_needed, broken):
    assert clean.verdict != "fail" and slow_needed.verdict == "fail" and broken.verdict == "fail"
    assert "joint speed" in {f.kind for f in slow_needed.finding_list} and "unreachable" in {f.kind for f in broken.finding_list}


def test_joints_in_their_units(clean):
    header, *rows = rows_of(tables.joints_csv(clean))
    names = ["lift_mm", "base_deg", "upper_deg", "fore_deg", "roll_deg", "bend_deg", "twist, outer_deg"]
    assert header == ["t_s", *names, *(f"{name}_s" for name in names), "sigma_min", "speed_use"]
    values = np.array(rows, dtype=float)
    scale = np.array([1000.0, *[180 / np.pi] * 6])
    np.testing.assert_array_equal(values[:, 0], clean.time)
    np.testing.assert_allclose(values[:, 1:8], clean.joints * scale, rtol=1e-11)
    np.testing.assert_allclose(values[:, 8:15], clean.rates.joint_speed * scale, rtol=1e-11, atol=1e-11)
    np.testing.assert_allclose(values[:, 15], clean.rates.sigma_min, rtol=1e-11)
    np.testing.assert_allclose(values[:, 16], (np.abs(clean.rates.joint_speed) / ARM.speed).max(axis=1), rtol=1e-11)


def test_samples_that_were_not_reached_are_empty_cells(broken):
    rows = rows_of(tables.joints_csv(broken))[1:]
    assert len(rows) == 60
    for row, reached in zip(rows, broken.motion.reached):
        assert row[0] and all(bool(cell) == bool(reached) for cell in row[1:8])


@pytest.mark.parametrize("unit, per_second", [("t_s", 1.0), ("t_ms", 1000.0)])
def test_the_retimed_path_keeps_every_column_and_is_read_again(tmp_path, unit, per_second):
    judged = audit(duration=0.5, unit=unit, process=np.arange(60) > 5, label=["#1", 'a "b"'] * 30)
    written = tables.retimed_csv(judged.suggestion)
    header, *rows = rows_of(written)
    assert header == list(judged.path.columns)
    times = [float(row[header.index(unit)]) for row in rows]
    np.testing.assert_array_equal(times, judged.suggestion.time * per_second)
    assert times[-1] - times[0] > 0.5 * per_second
    assert [row[0] for row in rows] == [f"n{k}" for k in range(60)]
    (tmp_path / "again.csv").write_text(written)
    again = pa.read_path(tmp_path / "again.csv")
    np.testing.assert_array_equal(again.position, judged.path.position)
    np.testing.assert_array_equal(again.process, judged.path.process)
    np.testing.assert_allclose(again.rotation, judged.path.rotation, atol=1e-12)
    assert again.label == judged.path.label


def test_text_of_a_file_is_written_back_untouched(tmp_path):
    source = "#note;t_s;x_mm;y_mm;z_mm;i;j;k;spare\n" "a, b;0;1.500;+0;00;0;0;1;\n" '"#""7""";0.50;2.5e0;-0;0;0;0;1;  x \n'
    (tmp_path / "a.csv").write_text('"#note"' + source[5:])
    path = pa.read_path(tmp_path / "a.csv")

    class Again:
        time = np.array([0.0, 0.75])

        class rates:
            class motion:
                pass

    Again.rates.motion.path = path
    rows = rows_of(tables.retimed_csv(Again))
    assert rows == [["#note", "t_s", "x_mm", "y_mm", "z_mm", "i", "j", "k", "spare"], ["a, b", "0.0", "1.500", "+0", "00", "0", "0", "1", ""], ['#"7"', "0.75", "2.5e0", "-0", "0", "0", "0", "1", "  x "]]
    (tmp_path / "b.csv").write_text(tables.retimed_csv(Again))
    assert pa.read_path(tmp_path / "b.csv").cells[0] == path.cells[0]


def test_the_summary_says_what_where_how_much_and_why(slow_needed):
    said = text.summary(slow_needed)
    assert said.startswith("FAIL  seam.csv in bench: ")
    flat = " ".join(said.split())
    for finding in slow_needed.finding_list:
        who = f"{finding.kind}, {finding.joint}" if finding.joint else finding.kind
        assert f"{finding.severity.upper()} {who}: {finding.t_start:.3f} to {finding.t_end:.3f} s" in flat
        assert " ".join(finding.why.split()) in flat
    worst = max((f for f in slow_needed.finding_list if f.kind == "joint speed"), key=lambda f: f.value / f.limit)
    assert f"{worst.value:.1f} mm/s (limit 400), {100 * (worst.value / worst.limit - 1):.0f} % over at {worst.worst_t:.3f} s" in flat
    assert "Suggested retiming" in flat and f"{slow_needed.suggestion.duration:.3f} s in place of 0.500 s" in flat
    assert all(" ".join(caution.split()) in flat for caution in slow_needed.cautions)
    assert max(map(len, said.splitlines())) <= 200 and not said.endswith("\n\n")


def test_the_summary_of_a_path_that_cannot_be_run(broken):
    flat = " ".join(text.summary(broken).split())
    worst = next(f for f in broken.finding_list if f.kind == "unreachable")
    assert f"off the path by {worst.value:.0f} mm at {worst.worst_t:.3f} s" in flat
    assert re.search(r"\d times the limit at", flat) and "e+" not in flat
    assert "No retiming helps" in flat and " ".join(broken.suggestion.why.split()) in flat


def test_the_summary_of_a_clean_path(clean):
    said = text.summary(clean)
    assert "Suggested retiming" not in said and "No retiming" not in said
    assert all(why in " ".join(said.split()) for _, why in clean.not_judged)
