"""What changed since an earlier report, and when a signature no longer holds."""

import copy
import json
from dataclasses import replace
from datetime import UTC, datetime

import numpy as np
import pytest
from example_arms import swaying_audit

import pathaudit as pa
from pathaudit.against import against, path_words
from pathaudit.earlier import digest, earlier_from, read_earlier, signed
from pathaudit.report.tables import check_json, check_values


@pytest.fixture(scope="module")
def audit():
    return swaying_audit(2)


@pytest.fixture
def earlier(audit):
    return earlier_from(json.loads(check_json(audit)), "earlier.json")


def changed(audit, **parts):
    """The audit of a cell, or of a path, that differs in some parts."""
    path = replace(audit.path, **{k: v for k, v in parts.items() if hasattr(audit.path, k)})
    cell = replace(audit.cell, **{k: v for k, v in parts.items() if hasattr(audit.cell, k) and not hasattr(audit.path, k)})
    return pa.audit(path, cell, start=audit.joints[0])


def test_the_same_job_is_the_same(earlier, audit):
    found = against(earlier, audit)
    assert found.same and not found.worse and found.inputs == () and found.void == () and path_words(found) == ""
    assert {c.what for c in found.findings} == {"same"} and len(found.findings) == len(audit.finding_list)
    assert found.moved_mm < 1e-3


def test_a_tool_that_is_longer_is_named_with_both_numbers(earlier, audit):
    tool = np.array(audit.cell.tool)
    tool[2, 3] += 0.002
    found = against(earlier, changed(audit, tool=tool))
    assert len(found.inputs) == 1 and found.inputs[0].startswith("tool.xyz_mm was (") and not found.same
    assert f"{1e3 * tool[2, 3]:.6g}" in found.inputs[0]


def test_limits_and_thresholds_are_compared_by_key(earlier, audit):
    arm = replace(audit.cell.arm, speed=audit.cell.arm.speed * 0.5)
    found = against(earlier, changed(audit, arm=arm, thresholds=replace(audit.cell.thresholds, sigma_min_warn=0.1)))
    keys = {words.split(" ")[0] for words in found.inputs}
    assert keys == {"thresholds.sigma_min_warn", *(f"joints.{name}.speed_deg_s" for name in arm.joint_names)}
    assert found.worse


@pytest.mark.parametrize("by_mm", [0.01, 0.5, 12.0])
def test_a_path_that_moved_tells_by_how_much(earlier, audit, by_mm):
    aside = np.cross(np.diff(audit.path.position[:2], axis=0)[0], [0.0, 0.0, 1.0])
    position = audit.path.position + by_mm / 1e3 * aside / np.linalg.norm(aside)
    moved = replace(audit.path, position=position, sha256="another")
    found = against(earlier, replace(audit, path=moved))
    nearest = max(np.linalg.norm(1e3 * moved.position - point, axis=1).min() for point in earlier.values["path"]["shape_mm"])
    assert 0.2 * by_mm < found.moved_mm <= min(by_mm, nearest) + 1e-3
    assert "moved by up to" in path_words(found) and "path file is another" in found.inputs[0]


def test_a_longer_and_slower_path_is_told(earlier, audit):
    slower = replace(audit.path, time=audit.path.time * 1.1)
    found = against(earlier, replace(audit, path=slower))
    assert path_words(found).endswith("s longer") and found.duration_s == pytest.approx(0.1 * audit.path.duration)


def test_a_report_without_shape_and_keys_is_compared_by_hash(earlier, audit):
    values = copy.deepcopy(earlier.values)
    values["path"].pop("shape_mm"), values["cell"].pop("given")
    found = against(earlier_from(values), audit)
    assert np.isnan(found.moved_mm) and found.same
    values["path"]["sha256"] = "0" * 64
    assert against(earlier_from(values), audit).inputs == ("the path file is another (its hash differs)",)


# signatures

WHEN = datetime(2026, 5, 4, 12, 30, tzinfo=UTC)


def test_a_signature_holds_until_what_it_covers_changes(earlier, audit):
    paper = signed(earlier, "  A.  Weber ", "checked with the fixture drawing", WHEN)
    assert paper.intact and (paper.signature.by, paper.signature.on) == ("A. Weber", "2026-05-04T12:30:00Z")
    assert against(paper, audit).void == ()
    tool = np.array(audit.cell.tool)
    tool[0, 3] += 1e-4
    void = against(paper, changed(audit, tool=tool)).void
    assert void and void[0].startswith("tool.xyz_mm was")


def test_a_report_edited_after_signing_is_void(earlier, audit):
    values = copy.deepcopy(signed(earlier, "A. Weber", now=WHEN).values)
    values["verdict"] = "pass"
    paper = earlier_from(values)
    assert not paper.intact and against(paper, audit).void[0] == "the report was edited after it was signed"


def test_signing_again_replaces_the_signature_and_covers_the_same(earlier):
    one, two = signed(earlier, "A. Weber", now=WHEN), signed(signed(earlier, "B. Okafor", now=WHEN), "A. Weber", now=WHEN)
    assert one.values == two.values and digest(one.values) == digest(earlier.values)


def test_the_order_of_keys_and_the_layout_of_the_file_do_not_matter(earlier, tmp_path):
    paper = signed(earlier, "A. Weber", now=WHEN)
    file = tmp_path / "report.json"
    file.write_text(json.dumps(dict(reversed(paper.values.items())), indent=7))
    assert read_earlier(file).intact


def test_nobody_cannot_sign(earlier):
    with pytest.raises(ValueError, match="expected the name of the person"):
        signed(earlier, "  ")


# what cannot be read


@pytest.mark.parametrize("text, words", [
    ("", "an empty file"), ("{}", 'key format: found'), ("[1]", "found list"), ('{"format": "other/1"}', "found 'other/1'"),
    ('{"format": "pathaudit.check/1"}', "key path: found NoneType, expected a JSON object"), ("{\n\n x", "line 3"),
])
def test_what_is_no_report_is_refused_in_one_line(tmp_path, text, words):
    file = tmp_path / "earlier.json"
    file.write_text(text)
    with pytest.raises(pa.ReadError) as caught:
        read_earlier(file)
    assert words in str(caught.value) and "\n" not in str(caught.value)


def test_damaged_findings_and_signatures_are_refused(earlier):
    for damage, words in ((lambda v: v["findings"][0].update(value="much"), "a number"), (lambda v: v["findings"].insert(0, 7), "finding 1"),
                          (lambda v: v["findings"][0].update(severity="bad"), "severity"), (lambda v: v.update(signed={"by": "A"}), "not complete")):
        values = copy.deepcopy(earlier.values)
        damage(values)
        with pytest.raises(pa.ReadError, match=words):
            earlier_from(values, "earlier.json")


def test_what_is_written_is_what_is_read(audit, earlier):
    again = earlier_from(json.loads(json.dumps(check_values(audit))))
    assert [(f.kind, f.joint, f.value) for f in again.findings] == [(f.kind, f.joint, f.value) for f in audit.finding_list]


def test_an_audit_compares_itself_with_a_report_in_a_file(audit, tmp_path):
    file = tmp_path / "first.json"
    file.write_text(check_json(audit))
    found = audit.against(file)
    assert found.same and str(found).startswith("Against first.json") and "Unchanged" in found._repr_html_()
    with pytest.raises(pa.ReadError, match="no such file"):
        audit.against(tmp_path / "none.json")
