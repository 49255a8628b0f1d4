"""The session on a real audit: trying, undoing, keeping variants; what fails is told and nothing is lost."""

import numpy as np
import pytest
from example_arms import SWAY_TIME, path_of_motion, swaying

import pathaudit as pa
from pathaudit.edits import Edits, Lock, Slow
from pathaudit.widgets.session import Listener, Session


@pytest.fixture(scope="module")
def audit():
    cell, joints = swaying(2)[:2]
    return pa.audit(path_of_motion(cell, SWAY_TIME, joints), cell, start=joints[0])


class Ear(Listener):
    """Writes down what it is told."""

    def __init__(self):
        self.heard = []

    def drawn(self, variant):
        return f"drawing of {len(variant.edits.items)}"

    def shown(self, variant, drawing):
        self.heard.append(("shown", drawing))

    def changed(self):
        self.heard.append(("changed",))

    def told(self, words):
        self.heard.append(("told", words))

    def failed(self, sentence):
        self.heard.append(("failed", sentence))


@pytest.fixture
def session(audit):
    made = Session(audit, Ear())
    yield made
    made.close()


def span(audit, first, last):
    return float(audit.time[first]), float(audit.time[last])


def test_a_change_shows_the_audit_of_other_times(session, audit):
    session.slow(*span(audit, 40, 80), 0.5)
    assert session.edits == Edits((Slow(40, 80, 0.5),)) == session.shown.edits
    assert session.given is audit and session.shown.audit.path.duration > audit.path.duration
    assert session.shown.retiming.factor[60] == pytest.approx(0.5)
    said = [entry[1] for entry in session._listener.heard if entry[0] == "told"]
    assert said == ["", "finding the new times", "following the path", "measuring every sample", "judging", "drawing"]
    assert session._listener.heard[-1] == ("shown", "drawing of 1")


def test_undo_and_redo(session, audit):
    session.slow(*span(audit, 40, 80), 0.5)
    session.lock(*span(audit, 90, 100))
    session.undo().result(10)
    assert session.edits == Edits((Slow(40, 80, 0.5),)) == session.shown.edits and session.steps == (True, True)
    session.undo().result(10)
    assert session.shown.audit is audit and session.shown.retiming is None and session.steps == (False, True)
    session.redo().result(10), session.redo().result(10)
    assert session.edits.items == (Slow(40, 80, 0.5), Lock(90, 100)) and session.steps == (True, False)


def test_variants_are_kept_and_compared(session, audit):
    session.accept()
    session.keep("  as   suggested ")
    session.slow(*span(audit, 10, 30), 0.8)
    frame = session.compared()
    assert list(frame.index) == ["as programmed", "as suggested", "on trial"] and list(frame["shown"]) == [False, False, True]
    assert frame.loc["as suggested", "duration_s"] == pytest.approx(audit.suggestion.duration)
    assert frame.loc["as programmed", "slowest_percent"] == 100.0
    kept = session.variants["as suggested"].audit
    session.show("as suggested").result(10)
    assert session.shown.audit is kept
    session.show("as programmed").result(10)
    assert session.shown.audit is audit
    session.drop("as suggested")
    assert list(session.compared().index) == ["as programmed"]


def test_a_suggestion_piece_by_piece(session, audit):
    session.accept(*span(audit, 0, 60))
    again = audit.suggestion
    np.testing.assert_allclose(session.shown.retiming.factor[:50], again.factor[:50], rtol=1e-6)
    session.free(*span(audit, 0, audit.path.samples - 1))
    assert not session.edits and session.shown.audit is audit


@pytest.mark.parametrize("name", ["", "   ", "as programmed"])
def test_a_name_that_says_nothing_is_refused(session, name):
    with pytest.raises(ValueError, match="expected one of your own"):
        session.keep(name)


@pytest.mark.parametrize("factor", [0.0, -0.5, 1.2, np.nan])
def test_a_factor_that_is_none_is_refused(session, audit, factor):
    with pytest.raises(ValueError, match="expected a fraction"):
        session.slow(*span(audit, 1, 5), factor)
    assert not session.edits


def test_a_stretch_that_is_none_is_refused(session, audit):
    for ends, words in (((5.0, 1.0), "its start first"), ((-9.0, -8.0), "no sample lies between"), ((np.nan, 1.0), "its start first")):
        with pytest.raises(ValueError, match=words):
            session.lock(*ends)


def test_what_fails_leaves_what_was_shown(session, audit, monkeypatch):
    session.slow(*span(audit, 40, 80), 0.5)
    shown = session.shown
    monkeypatch.setattr("pathaudit.widgets.session.by_hand", lambda *_: 1 / 0)
    session.slow(*span(audit, 90, 95), 0.5)
    assert session.shown is shown and session.edits == shown.edits
    assert session._listener.heard[-1] == ("failed", "ZeroDivisionError: division by zero")
    monkeypatch.undo()
    session.redo().result(10)
    assert len(session.shown.edits.items) == 2


def test_cancel_goes_back_to_what_is_shown(session, audit, monkeypatch):
    from threading import Event

    begun, go = Event(), Event()
    make = session._listener.drawn

    def wait(variant):
        begun.set()
        assert go.wait(10)
        return make(variant)

    monkeypatch.setattr(session._listener, "drawn", wait)
    future = session.change(Edits((Slow(3, 9, 0.5),)))
    assert begun.wait(10)
    session.cancel()
    assert not session.edits and session.steps == (False, True)
    go.set()
    future.result(10)
    assert session.shown.audit is audit
    session.redo().result(10)
    assert session.shown.edits == Edits((Slow(3, 9, 0.5),))
