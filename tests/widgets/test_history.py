"""Undo and redo, against the plainest model of it."""

from hypothesis import given
from hypothesis import strategies as st

from pathaudit.widgets.history import History

steps = st.lists(st.one_of(st.integers(0, 5), st.sampled_from(["undo", "redo"])), max_size=60)


@given(steps)
def test_it_walks_like_two_piles(line):
    history, done, undone = History(0), [0], []
    for step in line:
        if step == "undo":
            history.undo()
            if len(done) > 1:
                undone.append(done.pop())
        elif step == "redo":
            history.redo()
            if undone:
                done.append(undone.pop())
        else:
            history.push(step)
            if step != done[-1]:
                done, undone = [*done, step], []
        assert history.now == done[-1]
        assert (history.can_undo, history.can_redo) == (len(done) > 1, bool(undone))


def test_one_drag_is_one_step():
    history = History("a")
    for value in ("b", "c", "d"):
        history.push(value, gesture=5)
    history.push("e", gesture=6)
    history.undo()
    assert history.now == "d"
    history.undo()
    assert history.now == "a" and not history.can_undo


def test_a_drag_after_an_undo_is_a_step_of_its_own():
    history = History("a")
    history.push("b", gesture=5)
    history.push("c", gesture=6)
    history.undo()
    history.push("d", gesture=5)
    history.undo()
    assert history.now == "b"


def test_going_back_to_a_value_forgets_nothing():
    history = History("a")
    for value in "bc":
        history.push(value)
    history.back_to("a")
    assert history.now == "a" and history.can_redo
    history.redo(), history.redo()
    assert history.now == "c"


def test_going_back_to_a_value_that_its_own_gesture_has_replaced():
    history = History("a")
    for value in "bc":
        history.push(value, gesture=5)
    history.back_to("b")
    assert history.now == "b" and history.can_redo
    history.redo()
    assert history.now == "c"
    history.undo(), history.undo()
    assert history.now == "a" and not history.can_undo
