"""What changed since an earlier report, in every form."""

import json
from dataclasses import replace
from datetime import UTC, datetime

import numpy as np
import pytest
from example_arms import swaying_audit

import pathaudit as pa
from pathaudit.against import against
from pathaudit.earlier import earlier_from, signed
from pathaudit.report.compared import compared_html, compared_lines, compared_text, compared_values
from pathaudit.report.page import one_page
from pathaudit.report.tables import check_json
from pathaudit.report.text import summary


@pytest.fixture(scope="module")
def audit():
    return swaying_audit(2)


@pytest.fixture(scope="module")
def paper(audit):
    earlier = earlier_from(json.loads(check_json(audit)), "folder/earlier <1>.json")
    return signed(earlier, "A. Weber", "seen <b>\x1b[31m", datetime(2026, 5, 4, 12, 30, tzinfo=UTC))


@pytest.fixture(scope="module")
def other(audit, paper):
    """The comparison with a tool that is 1 mm longer and joints that are slower."""
    tool = np.array(audit.cell.tool)
    tool[2, 3] += 1e-3
    cell = replace(audit.cell, tool=tool, arm=replace(audit.cell.arm, speed=0.5 * audit.cell.arm.speed))
    return against(paper, pa.audit(audit.path, cell, start=audit.joints[0]))


def test_the_worst_news_comes_first(other):
    fronts = [front for front, _ in compared_lines(other)]
    assert fronts[0] == "VOID" and fronts[1] == "Given otherwise"
    order = [front for front in fronts if front in ("New", "Worse", "Better", "Gone")]
    assert order and order == sorted(order, key=("New", "Worse", "Better", "Gone").index)


def test_nothing_changed_is_said_in_one_line(audit, paper):
    assert [front for front, _ in compared_lines(against(paper, audit))] == ["Signed", "Unchanged"]


def test_every_report_tells_it_and_nothing_acts(audit, paper, other):
    judged = audit
    text, page = summary(judged, compared=other), one_page(judged, compared=other)
    assert text.index("FAIL") < text.index("Against earlier <1>.json") < text.index("joint speed, j")
    assert "\x1b" not in text and "\x1b" not in page and "seen &lt;b&gt;" in page and "earlier &lt;1&gt;.json" in page
    values = json.loads(check_json(judged, compared=other))["against"]
    assert values["signed"]["holds"] is False and values["signed"]["void"] == list(other.void) and values["worse"] is True
    assert "against" not in json.loads(check_json(judged))
    assert compared_values(against(paper, audit))["same"] is True
    assert compared_html(other).count("<div>") == compared_text(other).count("\n") + 1
