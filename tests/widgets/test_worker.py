"""One worker: the newest request wins, nothing is lost in silence."""

from threading import Event

import pytest

from pathaudit.widgets.worker import Worker


@pytest.fixture
def worker():
    made = Worker()
    yield made
    made.close()


def held():
    """A piece of work that waits: (make, begun, go)."""
    begun, go = Event(), Event()

    def make(told):
        begun.set()
        assert go.wait(5)
        return "slow"

    return make, begun, go


def test_a_result_is_handed_on(worker):
    heard = []
    worker.start(lambda told: 7, heard.append, heard.append).result(5)
    assert heard == [7]


def test_the_newest_request_wins(worker):
    heard = []
    make, begun, go = held()
    first = worker.start(make, heard.append, heard.append)
    assert begun.wait(5)
    skipped = worker.start(lambda told: heard.append("must not run"), heard.append, heard.append)
    last = worker.start(lambda told: "last", heard.append, heard.append)
    go.set()
    for future in (first, skipped, last):
        future.result(5)
    assert heard == ["last"]


def test_cancel_drops_what_is_under_way(worker):
    heard = []
    make, begun, go = held()
    future = worker.start(make, heard.append, heard.append)
    assert begun.wait(5)
    worker.cancel()
    go.set()
    future.result(5)
    assert heard == []


def test_work_ends_at_its_next_step_once_it_is_superseded():
    words, steps = [], []
    worker = Worker(words.append)
    begun, go = Event(), Event()

    def make(told):
        told("first step")
        begun.set()
        assert go.wait(5)
        told("second step")
        steps.append("second")

    future = worker.start(make, steps.append, steps.append)
    assert begun.wait(5)
    worker.cancel()
    go.set()
    future.result(5)
    worker.close()
    assert steps == [] and words == ["", "first step"]


def test_a_failure_is_told_as_a_sentence(worker):
    heard = []
    worker.start(lambda told: 1 / 0, heard.append, lambda sentence: heard.append("failed: " + sentence)).result(5)
    assert heard == ["failed: ZeroDivisionError: division by zero"]


def test_a_failure_of_an_older_request_is_not_told(worker):
    heard, begun, go = [], Event(), Event()

    def fails(told):
        begun.set()
        go.wait(5)
        raise ValueError("late")

    future = worker.start(fails, heard.append, heard.append)
    assert begun.wait(5)
    last = worker.start(lambda told: "new", heard.append, heard.append)
    go.set()
    future.result(5), last.result(5)
    assert heard == ["new"]


def test_a_closed_worker_works_again_when_it_is_asked(worker):
    heard = []
    worker.start(lambda told: 1, heard.append, heard.append).result(5)
    worker.close()
    worker.close()
    worker.start(lambda told: 2, heard.append, heard.append).result(5)
    assert heard == [1, 2]
