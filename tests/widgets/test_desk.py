"""Trying other speeds from Python."""

import numpy as np
import pytest
from example_arms import swaying_audit

from pathaudit.notes import read_notes
from pathaudit.widgets.desk import Desk
from pathaudit.widgets.noting import Noting
from pathaudit.widgets.session import Session


@pytest.fixture(scope="module")
def audit():
    return swaying_audit(2)


@pytest.fixture
def desk(audit, tmp_path, monkeypatch):
    monkeypatch.setattr("pathaudit.widgets.noting._author_file", lambda: tmp_path / "author.txt")
    session = Session(audit)
    yield Desk(session, Noting(audit, tmp_path / "job.notes.toml", "A. Weber"))
    session.close()


def span(audit, first, last):
    return float(audit.time[first]), float(audit.time[last])


def test_slowing_undoing_redoing(desk, audit):
    desk.slow(*span(audit, 40, 80), 0.5)
    assert desk.retiming.factor[60] == pytest.approx(0.5) and desk.audit.path.duration > audit.path.duration
    desk.lock(*span(audit, 60, 62))
    assert desk.retiming.factor[60:63].min() > 0.999
    desk.undo()
    assert desk.retiming.factor[60] == pytest.approx(0.5)
    desk.undo()
    assert desk.audit is audit and desk.retiming is None
    desk.redo()
    desk.redo()
    assert desk.retiming.factor[60:63].min() > 0.999


def test_variants_are_kept_and_compared(desk, audit):
    desk.accept()
    desk.keep("  as   suggested ")
    desk.slow(*span(audit, 10, 30), 0.8)
    frame = desk.compared()
    assert list(frame.index) == ["as programmed", "as suggested", "on trial"] and list(frame["shown"]) == [False, False, True]
    assert list(desk.variants) == ["as programmed", "as suggested"] and desk.variants["as programmed"] is audit
    assert desk.variants["as suggested"].path.duration == frame.loc["as suggested", "duration_s"]
    assert frame.loc["as suggested", "duration_s"] == pytest.approx(audit.suggestion.duration)
    assert frame.loc["as programmed", "slowest_percent"] == 100.0
    desk.show("as suggested")
    np.testing.assert_allclose(desk.audit.time, audit.suggestion.time, rtol=0, atol=1e-9)
    desk.show("as programmed")
    assert desk.audit is audit
    desk.drop("as suggested")
    assert list(desk.compared().index) == ["as programmed"]


def test_the_suggestion_on_a_stretch_only(desk, audit):
    desk.accept(*span(audit, 0, 60))
    np.testing.assert_allclose(desk.retiming.factor[:50], audit.suggestion.factor[:50], rtol=1e-6)
    desk.free()
    assert desk.audit is audit


@pytest.mark.parametrize("factor", [0.0, -0.5, 1.2, np.nan])
def test_a_factor_that_is_none_is_refused(desk, audit, factor):
    with pytest.raises(ValueError, match="expected a fraction"):
        desk.slow(*span(audit, 1, 5), factor)
    assert desk.audit is audit


def test_a_stretch_that_is_none_is_refused(desk):
    for ends, words in (((5.0, 1.0), "its start first"), ((-9.0, -8.0), "no sample lies between"), ((np.nan, 1.0), "its start first")):
        with pytest.raises(ValueError, match=words):
            desk.lock(*ends)


def test_what_fails_is_raised(desk, audit, monkeypatch):
    monkeypatch.setattr("pathaudit.widgets.session.by_hand", lambda *_: 1 / 0)
    with pytest.raises(RuntimeError, match="ZeroDivisionError: division by zero"):
        desk.slow(*span(audit, 1, 5), 0.5)
    assert desk.audit is audit


def test_notes_are_written_and_listed(desk, audit, tmp_path):
    assert list(desk.notes.columns) == ["where", "by", "date", "settled", "text", "changed since"] and desk.notes.empty
    desk.note("Macro section here.\nKeep the speed.", float(audit.time[40]))
    desk.note("Clamp in the way?", float(audit.time[10]), author="B. Okafor")
    assert list(desk.notes["by"]) == ["B. Okafor", "A. Weber"] and desk.notes["text"][1] == "Macro section here.\nKeep the speed."
    assert not desk.notes["settled"].any() and (desk.notes["changed since"] == "").all()
    stored = read_notes(tmp_path / "job.notes.toml")
    assert [note.text for note in stored.kept] == list(desk.notes["text"])
    desk.slow(*span(audit, 0, 50), 0.5)
    assert len(desk.notes) == 2


def test_a_note_that_cannot_be_kept_is_refused(desk, audit, tmp_path):
    with pytest.raises(ValueError, match="expected a time of the path"):
        desk.note("words", -5.0)
    with pytest.raises(ValueError, match="without words"):
        desk.note("  ", float(audit.time[3]))
    (tmp_path / "job.notes.toml").write_text("this is no TOML")
    with pytest.raises(ValueError, match="kept here"):
        desk.note("words", float(audit.time[3]))
    assert list(desk.notes["text"]) == ["words"] and (tmp_path / "job.notes.toml").read_text() == "this is no TOML"
