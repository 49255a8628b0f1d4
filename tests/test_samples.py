"""The demo's paths without times are what their geometry says, and the command line audits each of them in a demo cell."""

import json

import make_samples
import numpy as np
import pytest
from make_demo import DEMO, HOUSING, NOTEBOOKS, OVERLAP, seam_length
from make_samples import MADE

import pathaudit as pa
from pathaudit.cli import main

CHECKS = {
    "seam-points.csv": ("cell.toml", ["--acceleration", "500"]),
    "bead.nc": ("cell-bead.toml", ["--axis", "0,0,-1", "--speed", "200", "--acceleration", "1000"]),
    "bead-corner.cl": ("cell-bead.toml", ["--speed", "200", "--acceleration", "1000", "--corner", "1.5mm"]),
}
READ = {
    "seam-points.csv": {"acceleration_mm_s2": 500},
    "bead.nc": {"axis": (0, 0, -1), "speed_mm_s": 200, "acceleration_mm_s2": 1000},
    "bead-corner.cl": {"speed_mm_s": 200, "acceleration_mm_s2": 1000, "corner": "1.5mm"},
}


@pytest.mark.parametrize("name", MADE)
def test_the_samples_are_what_their_geometry_gives(name):
    assert (DEMO / name).read_bytes() == MADE[name]().encode() == (NOTEBOOKS / name).read_bytes()


@pytest.mark.parametrize("name, verdict", [("seam-points.csv", 1), ("bead.nc", 0), ("bead-corner.cl", 0)])
def test_the_command_line_audits_each(tmp_path, name, verdict):
    cell, options = CHECKS[name]
    found = main(["check", str(NOTEBOOKS / name), "--cell", str(NOTEBOOKS / cell), "--json", str(tmp_path / "out.json"), *options])
    assert found == verdict
    said = json.loads((tmp_path / "out.json").read_text("utf-8"))
    assert said["path"]["samples_unreached"] == 0 and said["verdict"] == ("fail" if verdict else "pass")


@pytest.mark.parametrize("name", MADE)
def test_what_is_missing_is_asked_for_in_one_line(name, capsys):
    assert main(["check", str(NOTEBOOKS / name), "--cell", str(NOTEBOOKS / CHECKS[name][0])]) == 2
    said = capsys.readouterr().err
    assert said.count("\n") == 1 and ("--axis" in said if name == "bead.nc" else "--acceleration" in said)


def process_length(path):
    on = np.flatnonzero(path.process)
    return path.distance[on[-1]] - path.distance[on[0]]


def test_the_seam_of_points_is_the_seam_of_times():
    """The same arcs, 24 mm/s; the torch is turned evenly over each arc instead of by an average of the heading."""
    points, timed = pa.read_path(NOTEBOOKS / "seam-points.csv", **READ["seam-points.csv"]), pa.read_path(NOTEBOOKS / "seam.csv")
    assert process_length(points) == pytest.approx(seam_length() / 1000, abs=1e-4)
    burning = timed.position[timed.process]
    apart = np.array([np.linalg.norm(burning - place, axis=1).min() for place in points.position[points.process][::20]])
    assert apart.max() < 4e-4  # between samples 0.6 mm apart
    assert points.duration == pytest.approx(timed.duration, abs=0.5) and not points.spin_free
    inner = points.process & (points.source_line > 6)
    speed = np.linalg.norm(np.diff(points.position[inner], axis=0), axis=1) / np.diff(points.time[inner])
    assert np.quantile(speed, [0.05, 0.95]) == pytest.approx([0.024, 0.024], rel=1e-3)


def test_the_bead_of_machine_code_is_the_bead_of_times():
    coded, timed = pa.read_path(NOTEBOOKS / "bead.nc", **READ["bead.nc"]), pa.read_path(NOTEBOOKS / "bead.csv")
    loop = 2 * sum(HOUSING) - 8 * make_samples.CORNER_RADIUS + 2 * np.pi * make_samples.CORNER_RADIUS + OVERLAP
    assert process_length(coded) == pytest.approx(loop / 1000, abs=1e-4)
    assert process_length(timed) == pytest.approx(loop / 1000, abs=1e-3)
    assert coded.source_line[0] == 5 and coded.source_line[-1] == 17


def test_a_finding_names_the_line_of_the_file(capsys):
    cell, options = CHECKS["seam-points.csv"]
    main(["check", str(NOTEBOOKS / "seam-points.csv"), "--cell", str(NOTEBOOKS / cell), *options])
    said = " ".join(capsys.readouterr().out.split())
    assert "joint speed, j4: " in said and "Line 9 of seam-points.csv." in said
