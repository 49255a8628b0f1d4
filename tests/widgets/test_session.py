"""The session: one worker, the newest request wins, nothing is lost in silence."""

from threading import Event

import pytest

from pathaudit.widgets.session import Session


@pytest.fixture
def session():
    made = Session("given")
    yield made
    made.close()


def test_a_change_shows_what_it_made(session):
    told = []
    session.change(lambda audit: (audit + " retimed", 7), told.append, told.append).result(5)
    assert told == [7]
    assert session.shown == "given retimed" and session.given == "given"


def test_the_newest_request_wins(session):
    told, begun, go = [], Event(), Event()

    def slow(audit):
        begun.set()
        assert go.wait(5)
        return "slow", "slow"

    first = session.change(slow, told.append, told.append)
    assert begun.wait(5)
    skipped = session.change(lambda audit: told.append("must not run"), told.append, told.append)
    last = session.change(lambda audit: ("last", "last"), told.append, told.append)
    go.set()
    for future in (first, skipped, last):
        future.result(5)
    assert told == ["last"] and session.shown == "last"


def test_cancel_drops_what_is_under_way(session):
    told, begun, go = [], Event(), Event()
    future = session.change(lambda audit: (begun.set(), go.wait(5)), told.append, told.append)
    assert begun.wait(5)
    session.cancel()
    go.set()
    future.result(5)
    assert told == [] and session.shown == "given"


def test_a_failure_is_told_as_a_sentence(session):
    told = []
    session.change(lambda audit: 1 / 0, told.append, lambda sentence: told.append("failed: " + sentence)).result(5)
    assert told == ["failed: ZeroDivisionError: division by zero"]
    assert session.shown == "given"


def test_a_failure_of_an_older_request_is_not_told(session):
    told, begun, go = [], Event(), Event()

    def fails(audit):
        begun.set()
        go.wait(5)
        raise ValueError("late")

    future = session.change(fails, told.append, told.append)
    assert begun.wait(5)
    session.change(lambda audit: ("new", "new"), told.append, told.append)
    go.set()
    future.result(5)
    session.change(lambda audit: ("new", "new"), told.append, told.append).result(5)
    assert set(told) == {"new"}


def test_a_closed_session_works_again_when_it_is_asked(session):
    session.change(lambda audit: ("a", 1), lambda _: None, lambda _: None).result(5)
    session.close()
    session.close()
    told = []
    session.change(lambda audit: ("b", 2), told.append, told.append).result(5)
    assert told == [2]
