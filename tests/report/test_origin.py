"""Findings name the lines of the path's own file, and reports say how the path was made; nothing is said where nothing is known."""

import json
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

import pathaudit as pa
from pathaudit.report import origin, tables
from pathaudit.report.html_tables import findings_table, still_tables
from pathaudit.report.page import one_page
from pathaudit.report.text import summary

DEMO = Path(pa.__file__).parent / "demo"


@pytest.fixture(scope="module")
def audits():
    """The demo seam's audit without lines, with a line a sample from line 10 on, and with one line for all."""
    path, cell = pa.read_path(DEMO / "seam.csv"), pa.read_cell(DEMO / "cell.toml")
    many, one = np.arange(path.samples) + 10, np.full(path.samples, 7)
    made = ("Sampled <finely>.",)
    return [pa.audit(replace(path, source_line=lines, made=told), cell) for lines, told in ((None, ()), (many, made), (one, made))]


def test_words_and_keys(audits):
    bare, many, one = audits
    f = max(many.finding_list, key=lambda finding: finding.last - finding.first)
    assert origin.sentence(bare, f) == "" and origin.keys(bare, f) == {} and origin.lines(bare, f) == ""
    assert origin.sentence(many, f) == f"Lines {f.first + 10} to {f.last + 10} of seam.csv, the worst in line {f.worst + 10}."
    assert origin.keys(many, f) == {"line_start": f.first + 10, "line_end": f.last + 10, "line": f.worst + 10}
    assert origin.sentence(one, f) == "Line 7 of seam.csv." and origin.lines(one, f) == "line 7"


def test_every_report_has_them(audits):
    bare, many, one = audits
    for audit in (many, one):
        words = origin.sentence(audit, audit.finding_list[0])
        assert words in summary(audit) and words in findings_table(audit) and words in one_page(audit) and words in still_tables(audit)
        said = json.loads(tables.check_json(audit))
        assert said["findings"][0]["line"] == origin.keys(audit, audit.finding_list[0])["line"] and said["path"]["made"] == ["Sampled <finely>."]
        assert "How the path was made\n      Sampled <finely>." in summary(audit)
        assert "<p>Sampled &lt;finely&gt;.</p>" in one_page(audit) and "Sampled &lt;finely&gt;." in still_tables(audit)
    said = json.loads(tables.check_json(bare))
    assert "line" not in said["findings"][0] and said["path"]["made"] == [] and "How the path" not in summary(bare)
