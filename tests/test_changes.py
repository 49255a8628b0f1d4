"""Findings before and after."""

from dataclasses import replace

import numpy as np
import pytest
from example_arms import swaying_audit

from pathaudit.changes import changes, outline


@pytest.fixture(scope="module")
def audit():
    return swaying_audit(2)


def with_findings(audit, *findings):
    return replace(audit, finding_list=tuple(findings))


def test_nothing_changed(audit):
    assert audit.finding_list and {c.what for c in changes(audit, audit)} == {"same"}
    assert len(changes(audit, audit)) == len(audit.finding_list)


def test_the_retiming_clears_what_fails(audit):
    found = changes(audit, audit.suggestion.audit())
    failed = [c for c in found if c.before and c.before.severity == "fail" and c.before.kind.startswith("joint ")]
    assert failed and all(c.what in ("gone", "better") for c in failed)
    back = changes(audit.suggestion.audit(), audit)
    assert [c.what for c in back].count("new") == [c.what for c in found].count("gone")


def test_each_finding_is_in_one_change(audit):
    after = audit.suggestion.audit()
    found = changes(audit, after)
    assert sorted(c.before.first for c in found if c.before) == sorted(f.first for f in audit.finding_list)
    assert sorted(c.after.first for c in found if c.after) == sorted(f.first for f in after.finding_list)


def test_more_and_less_of_each_kind(audit):
    finding = audit.finding_list[0]
    cases = {
        "joint speed": ((200.0, 180.0), (210.0, 180.0)), "near-singular": ((0.03, 0.06), (0.02, 0.06)), "unreachable": ((2.0, 0.01), (3.0, 0.01)),
    }  # fmt: skip
    for kind, (mild, bad) in cases.items():
        a, b = (replace(finding, kind=kind, value=value, limit=limit) for value, limit in (mild, bad))
        assert changes(with_findings(audit, a), with_findings(audit, b))[0].what == "worse"
        assert changes(with_findings(audit, b), with_findings(audit, a))[0].what == "better"
    near, nearer = (replace(finding, kind="joint travel", severity="warn", value=value, limit=170.0) for value in (166.0, 169.0))
    past = replace(near, severity="fail", value=171.0)
    further = replace(past, value=175.0)
    order = [near, nearer, past, further]
    for i, before in enumerate(order):
        for j, after in enumerate(order):
            wanted = "same" if i == j else "worse" if j > i else "better"
            assert changes(with_findings(audit, before), with_findings(audit, after))[0].what == wanted
            # the same at the lower end of the travel
            low = [replace(f, value=-f.value, limit=-f.limit) for f in (before, after)]
            assert changes(with_findings(audit, low[0]), with_findings(audit, low[1]))[0].what == wanted


def test_findings_of_one_kind_at_two_places_are_told_apart(audit):
    here = replace(audit.finding_list[0], from_mm=10.0, to_mm=20.0)
    there = replace(here, from_mm=300.0, to_mm=310.0)
    found = changes(with_findings(audit, here, there), with_findings(audit, there))
    assert [c.what for c in found] == ["gone", "same"]
    assert f"at {here.worst_t:.2f} s" in found[0].words


def test_the_outline_says_what_an_audit_says(audit):
    said = outline(audit)
    assert said["verdict"] == audit.verdict and said["fail"] + said["warn"] == len(audit.finding_list)
    assert said["busiest_joint_percent"] == pytest.approx(100 * np.nanmax(audit.rates.speed_share))
    assert said["least_sigma_min"] == pytest.approx(np.nanmin(audit.rates.sigma_min))
    assert said["least_reserve"] == pytest.approx(np.nanmin(audit.rates.reserve))
