"""The demo's samples of tables, JSON lines and a record: read, audited, and the same path."""

import numpy as np
import pytest
from make_demo import DEMO, TABLES, bead_rows

import pathaudit as pa
from pathaudit.cli import main

pytest.importorskip("pyarrow")


@pytest.mark.parametrize("name", ["bead.jsonl", *TABLES])
def test_every_fourth_sample_of_the_bead(name):
    path, bead = pa.read_path(DEMO / name), np.array(bead_rows()[::4])
    np.testing.assert_allclose(path.time, bead[:, 0], atol=1e-6)
    np.testing.assert_allclose(path.position * 1000, bead[:, 1:4], atol=1e-6)
    assert path.process.tolist() == (bead[:, -1] == 1).tolist() and path.spin_free
    lines = pa.read_path(DEMO / "bead.jsonl")
    assert path.position.tobytes() == lines.position.tobytes() and path.rotation.tobytes() == lines.rotation.tobytes()


def test_the_record_is_the_bead_within_its_noise():
    """The noise is 0.021 mm in each coordinate; the clock is off by up to a few ms at 100 mm/s; where poses were not read anew the straight line cuts a corner."""
    path, bead = pa.read_path(DEMO / "bead-recorded.csv", "recorded"), np.array(bead_rows())
    time = path.time - path.time[0]
    truth = np.column_stack([np.interp(time, bead[:, 0] - bead[0, 0], bead[:, k]) for k in (1, 2, 3)])
    off = np.linalg.norm(path.position * 1000 - truth, axis=1)
    assert np.median(off) < 0.25 and off.max() < 1.2
    said = " ".join(path.made)
    for words in ("694 rows became 696 samples", "1 row without a whole time and pose", "1 row out of order", "1 row with the time and pose of the row before", "4 rows that repeat a pose", "2 drop-outs filled"):
        assert words in said


@pytest.mark.parametrize("arguments", [["bead.jsonl"], ["bead.parquet"], ["bead.feather"], ["bead-recorded.csv", "--format", "recorded"], ["bead-recorded.csv", "--format", "recorded", "--smooth", "80"]])
def test_the_command_line_audits_them(arguments, capsys, monkeypatch):
    monkeypatch.chdir(DEMO)
    assert main(["check", *arguments, "--cell", "cell-bead.toml"]) == 0
    out = capsys.readouterr().out
    assert out.startswith("PASS") and ("How the path was made" in out) == ("recorded" in arguments) and ("Smoothed as asked" in out) == ("--smooth" in arguments)
