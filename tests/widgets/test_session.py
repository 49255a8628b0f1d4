"""The session on a real audit: what it tells, what fails, what is cancelled. What a person does with it: test_desk.py."""

from threading import Event

import pytest
from example_arms import swaying_audit

from pathaudit.edits import Edits, Slow
from pathaudit.widgets.session import Listener, Session


@pytest.fixture(scope="module")
def audit():
    return swaying_audit(2)


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
def ear():
    return Ear()


@pytest.fixture
def session(audit, ear):
    made = Session(audit, ear)
    yield made
    made.close()


SLOW, SLOWER = Edits((Slow(40, 80, 0.5),)), Edits((Slow(40, 80, 0.4),))


def test_a_change_is_told_step_by_step(session, ear, audit):
    session.change(SLOW).result(10)
    assert session.edits == SLOW == session.shown.edits and session.given is audit
    said = [entry[1] for entry in ear.heard if entry[0] == "told"]
    assert said == ["", "finding the new times", "judging", "looking between the samples", "drawing"]
    assert ear.heard[-1] == ("shown", "drawing of 1") and ("changed",) not in ear.heard


def test_one_drag_is_one_step_and_its_last_value_is_shown(session, audit):
    futures = [session.change(edits, gesture=7) for edits in (SLOW, SLOWER, SLOW, SLOWER)]
    [future.result(10) for future in futures]
    assert session.shown.edits == SLOWER
    session.walk(-1).result(10)
    assert session.shown.audit is audit


def test_what_is_kept_is_not_audited_again(session, ear):
    session.change(SLOW).result(10)
    session.keep("slow")
    kept = session.variants["slow"].audit
    session.walk(-1).result(10)
    ear.heard.clear()
    session.walk(1).result(10)
    assert session.shown.audit is kept
    assert [entry[1] for entry in ear.heard if entry[0] == "told"] == ["", "drawing"]


def test_what_fails_leaves_what_was_shown(session, ear, monkeypatch):
    session.change(SLOW).result(10)
    shown = session.shown
    monkeypatch.setattr("pathaudit.widgets.session.by_hand", lambda *_: 1 / 0)
    session.change(SLOWER).result(10)
    assert session.shown is shown and session.edits == SLOW
    assert ear.heard[-1] == ("failed", "ZeroDivisionError: division by zero")
    monkeypatch.undo()
    session.walk(1).result(10)
    assert session.shown.edits == SLOWER


def test_cancel_goes_back_to_what_is_shown(session, ear, audit, monkeypatch):
    begun, go = Event(), Event()

    def wait(variant):
        begun.set()
        assert go.wait(10)
        return "drawn"

    monkeypatch.setattr(ear, "drawn", wait)
    future = session.change(SLOW)
    assert begun.wait(10)
    session.cancel()
    assert not session.edits and session.steps == (False, True)
    go.set()
    future.result(10)
    assert session.shown.audit is audit
    session.walk(1).result(10)
    assert session.shown.edits == SLOW


def test_cancel_in_a_drag_goes_back_to_what_the_drag_has_shown(session, ear, monkeypatch):
    session.change(SLOW, gesture=1).result(10)
    begun, go = Event(), Event()
    monkeypatch.setattr(ear, "drawn", lambda variant: (begun.set(), go.wait(10)))
    future = session.change(SLOWER, gesture=1)
    assert begun.wait(10) and session.busy
    session.cancel()
    assert session.edits == SLOW and not session.busy and session.steps == (True, True)
    go.set()
    future.result(10)
    assert session.shown.edits == SLOW


@pytest.mark.parametrize("name", ["", "   ", "as programmed"])
def test_a_name_that_says_nothing_is_refused(session, name):
    with pytest.raises(ValueError, match="expected one of your own"):
        session.keep(name)


def test_an_unknown_variant_is_refused(session):
    for act in (session.edits_of, session.drop):
        with pytest.raises(ValueError, match="expected one of as programmed"):
            act("never kept")
